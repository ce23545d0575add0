/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "jnd.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "message.h"
#include "source.h"
#include "words.h"

/* ---- Records ----------------------------------------------------------- */

enum {
  METRIC,
  VALUE,
  CRITERION,
  N_NEEDED,
  EXPONENT = N_NEEDED,
  OBSERVER_LOG_SD,
  LOW,
  HIGH,
  N_OBSERVERS,
  SOURCE,
  N_FIELDS
};
static const char *const columns[N_FIELDS] = {
    "metric", "value", "criterion",   "exponent", "observer_log_sd",
    "low",    "high",  "n_observers", "source"};

/* A number that may be left out. */
static ef_status read_optional(ef_fields *fields, const char *const *texts,
                               size_t i, double *value, ef_error *error) {
  return texts[i][0] == '\0' ? EF_OK
                             : ef_fields_number(fields, i, value, error);
}

static ef_status read_record(ef_fields *fields, const char *path, jnd *j,
                             ef_error *error) {
  const char *const *texts;
  size_t line;
  ef_status status = ef_fields_next(fields, &texts, &line, error);
  if (status == EF_OK && texts == NULL) {
    message_fail(error, EF_MALFORMED, "there is a header and no JND below it");
    return message_place(error, path);
  }
  if (status != EF_OK)
    return status;
  ef_jnd_record *r = &j->record;
  double n_observers = 0.0;
  *r = (ef_jnd_record){.exponent = 1.0,
                       .observer_log_sd = (double)NAN,
                       .low = (double)NAN,
                       .high = (double)NAN};
  snprintf(r->metric, sizeof r->metric, "%s", texts[METRIC]);
  snprintf(r->source, sizeof r->source, "%s", texts[SOURCE]);
  snprintf(j->criterion, JND_ROOM, "%s", texts[CRITERION]);
  status = ef_fields_number(fields, VALUE, &r->value, error);
  double *const optional[] = {&r->exponent, &r->observer_log_sd, &r->low,
                              &r->high, &n_observers};
  for (size_t i = 0; i < 5 && status == EF_OK; ++i)
    status = read_optional(fields, texts, EXPONENT + i, optional[i], error);
  if (status == EF_OK)
    status = ef_criterion_find(j->criterion, &r->criterion, error);
  if (status == EF_OK && n_observers >= 0.0)
    r->n_observers = (size_t)n_observers;
  ef_jnd_record whole = *r;
  if (isnan(whole.observer_log_sd))
    whole.observer_log_sd = 0.0; /* not said: see assume_spread */
  if (status == EF_OK)
    status = ef_jnd_record_check(&whole, error);
  if (status != EF_OK && error->line == 0) {
    error->line = line;
    message_place(error, path);
  }
  return status;
}

static ef_status read_file(const char *path, const ef_notes *notes, jnd *j,
                           ef_error *error) {
  ef_fields *fields =
      ef_fields_open(path, N_FIELDS, N_NEEDED, columns, notes, error);
  if (fields == NULL)
    return error->status;
  ef_status status = read_record(fields, path, j, error);
  const char *const *texts = NULL;
  if (status == EF_OK)
    status = ef_fields_next(fields, &texts, NULL, error);
  if (status == EF_OK && texts != NULL)
    message_note(notes, "%s: the first JND is taken, the others are not", path);
  ef_fields_free(fields);
  return status;
}

/* ---- VALUE, VALUE:CRITERION -------------------------------------------- */

static bool is_value(const char *typed, double *value) {
  return ef_number_parse(typed, strcspn(typed, ":"), '.', value);
}

static ef_status read_value(const char *typed, double value,
                            const ef_metric *metric, jnd *j, ef_error *error) {
  ef_jnd_record *r = &j->record;
  const char *colon = strchr(typed, ':');
  *r = (ef_jnd_record){.value = value,
                       .exponent = 1.0,
                       .observer_log_sd = (double)NAN,
                       .low = (double)NAN,
                       .high = (double)NAN,
                       .source = "--jnd"};
  snprintf(r->metric, sizeof r->metric, "%s", ef_metric_name(metric));
  snprintf(j->criterion, JND_ROOM, "%s", colon != NULL ? colon + 1 : "75%");
  return ef_criterion_find(j->criterion, &r->criterion, error);
}

/* People differ, also where nobody has said by how much: as in the published
 * default. */
static ef_status assume_spread(jnd *j, ef_error *error) {
  ef_jnd_record published;
  const ef_status status = ef_jnd_record_default(
      ef_metric_find("ciede2000", NULL), &published, NULL, error);
  if (status != EF_OK)
    return status;
  j->record.observer_log_sd = published.observer_log_sd;
  j->spread_is_assumed = true;
  return EF_OK;
}

/* As ef_jnd_record_default takes it. */
static const char published_criterion[] = "50%";

/* ---- Which ------------------------------------------------------------- */

ef_metric *jnd_metric(const command_options *options, const ef_notes *notes,
                      ef_error *error) {
  const command_options *o = options;
  double value;
  jnd j = {0};
  const char *name = o->metric;
  if (name == NULL && o->jnd_text != NULL && !is_value(o->jnd_text, &value) &&
      source_is_file(o, o->jnd_text)) {
    if (read_file(o->jnd_text, NULL, &j, error) != EF_OK)
      return NULL;
    name = j.record.metric;
    message_note(notes,
                 "%s holds a JND of %s, so the differences are of that metric",
                 o->jnd_text, name);
  }
  ef_metric *metric = ef_metric_new(name != NULL ? name : "ciede2000", error);
  if (metric == NULL)
    message_option(error, o->metric != NULL ? "metric" : "jnd", "");
  return metric;
}

static ef_status load_own(const command_options *o, const ef_metric *metric,
                          const ef_notes *notes, jnd *out, ef_error *error) {
  double value;
  out->is_known = out->is_own = true;
  if (is_value(o->jnd_text, &value)) {
    const ef_status status = read_value(o->jnd_text, value, metric, out, error);
    return status == EF_OK ? EF_OK : message_option(error, "jnd", "");
  }
  if (!source_is_file(o, o->jnd_text)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--jnd is a number, NUMBER:CRITERION, or a file with a "
                        "JND; \"%.100s\" is none of them",
                        o->jnd_text);
  }
  const ef_status status = read_file(o->jnd_text, notes, out, error);
  if (status != EF_OK ||
      strcmp(out->record.metric, ef_metric_name(metric)) == 0)
    return status;
  message_fail(error, EF_INVALID,
               "the JND is one of %.60s and the differences are of %.60s: give "
               "one of that metric, or --metric %.60s",
               out->record.metric, ef_metric_name(metric), out->record.metric);
  return message_place(error, o->jnd_text);
}

static ef_status load_published(const ef_metric *metric, jnd *out,
                                ef_error *error) {
  const ef_status status =
      ef_jnd_record_default(metric, &out->record, NULL, error);
  if (status == EF_NO_ANSWER)
    return EF_OK;
  if (status != EF_OK)
    return status;
  out->is_known = true;
  char value[EF_NUMBER_TEXT];
  ef_number_format(out->record.value, value);
  snprintf(out->converted, JND_ROOM, "%s, at which ", value);
  snprintf(out->criterion, JND_ROOM, "%s", published_criterion);
  snprintf(out->published, JND_ROOM, "%s", ef_metric_jnd(metric).criterion);
  return EF_OK;
}

static ef_status convert(const command_options *o, jnd *out, ef_error *error) {
  ef_criterion criterion;
  ef_status status = ef_criterion_find(o->criterion, &criterion, error);
  if (status == EF_OK && out->is_known) {
    status =
        ef_jnd_record_convert(&out->record, &criterion, &out->record, error);
  }
  if (status != EF_OK)
    return message_option(error, "criterion", "");
  snprintf(out->criterion, JND_ROOM, "%s", o->criterion);
  return EF_OK;
}

ef_status jnd_load(const command_options *options, const ef_metric *metric,
                   const ef_notes *notes, jnd *out, ef_error *error) {
  const command_options *o = options;
  *out = (jnd){.record = {.value = (double)NAN}};
  ef_status status = o->jnd_text != NULL
                         ? load_own(o, metric, notes, out, error)
                         : load_published(metric, out, error);
  if (status != EF_OK)
    return status;
  if (!isnan(o->exponent))
    out->record.exponent = o->exponent;
  if (!isnan(o->spread)) {
    out->record.observer_log_sd = o->spread;
  } else if (out->is_known && isnan(out->record.observer_log_sd)) {
    status = assume_spread(out, error);
  }
  if (status == EF_OK && out->is_known)
    status = ef_jnd_record_check(&out->record, error);
  if (status != EF_OK)
    return message_option(error, "jnd", "");
  return o->criterion != NULL ? convert(o, out, error) : EF_OK;
}

void jnd_note(const jnd *j, const ef_metric *metric, const ef_notes *notes) {
  ef_jnd_record published;
  ef_error error = {0};
  if (!j->is_own &&
      ef_jnd_record_default(metric, &published, notes, &error) != EF_OK) {
    message_note(notes, "%s", error.message);
  }
  if (!j->spread_is_assumed)
    return;
  message_note(notes,
               "JNDs are taken to spread over observers by a factor of %.2f "
               "(one standard deviation of %.2f in their logarithm); --spread "
               "says otherwise",
               exp(j->record.observer_log_sd), j->record.observer_log_sd);
}

/* ---- Telling ----------------------------------------------------------- */

void jnd_add(text *out, const jnd *j, const ef_metric *metric) {
  char value[EF_NUMBER_TEXT], number[EF_NUMBER_TEXT];
  const ef_jnd_record *r = &j->record;
  ef_number_format(r->value, value);
  if (strlen(value) > 6)
    words_amount(r->value, value);
  text_format(out, "one JND is %s %s", value, ef_metric_symbol(metric));
  if (!isnan(r->low)) {
    char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
    words_amount(r->low, low);
    words_amount(r->high, high);
    text_format(out, " (%s to %s)", low, high);
  }
  text_format(out, " at the criterion %s", j->criterion);
  if (j->is_own) {
    text_format(out, ", from %s", r->source[0] != '\0' ? r->source : "--jnd");
  } else {
    text_format(out, "; published: %s%s (%s)",
                strcmp(j->criterion, published_criterion) == 0 ? ""
                                                               : j->converted,
                j->published, r->source);
  }
  if (r->exponent != 1.0) {
    ef_number_format(r->exponent, number);
    text_format(out, "; d' grows with power %s of the difference", number);
  }
}

void jnd_write(ef_json *json, const jnd *j) {
  const ef_jnd_record *r = &j->record;
  ef_json_begin_object(json, "jnd");
  ef_json_number(json, "value", r->value);
  ef_json_text(json, "criterion", j->criterion);
  ef_json_number(json, "d_prime",
                 j->is_known ? ef_criterion_d_prime(&r->criterion)
                             : (double)NAN);
  ef_json_number(json, "exponent", r->exponent);
  ef_json_number(json, "observer_log_sd", r->observer_log_sd);
  ef_json_number(json, "low", r->low);
  ef_json_number(json, "high", r->high);
  ef_json_integer(json, "n_observers", (int64_t)r->n_observers);
  ef_json_text(json, "source", r->source);
  ef_json_end_object(json);
}

void jnd_write_csv(ef_csv *csv, const ef_jnd_record *record,
                   const char *criterion) {
  for (size_t i = 0; i < N_FIELDS; ++i)
    ef_csv_text(csv, columns[i]);
  ef_csv_end_row(csv);
  ef_csv_text(csv, record->metric);
  ef_csv_number(csv, record->value);
  ef_csv_text(csv, criterion);
  ef_csv_number(csv, record->exponent);
  ef_csv_number(csv, record->observer_log_sd);
  ef_csv_number(csv, record->low);
  ef_csv_number(csv, record->high);
  ef_csv_number(csv, (double)record->n_observers);
  ef_csv_text(csv, record->source);
  ef_csv_end_row(csv);
}
