/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Just-noticeable differences: criteria by name, records, the default ones. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

#define UNKNOWN ((double)NAN)

/* ---- Criteria ---------------------------------------------------------- */

static ef_status bad_criterion(const char *text, ef_error *error) {
  return ef__error_set(error, EF_INVALID,
                       "'%s' is no criterion; expected 50%%, 75%%, 84%%, "
                       "d-prime:NUMBER, or a task with its share of positive "
                       "answers as in 2ifc:80%% or yes-no:60%%:20%%",
                       text);
}

/* A part of `text` up to a colon or the end; moves `text` behind it. */
static size_t cut(const char **text, const char **part) {
  *part = *text;
  const size_t length = strcspn(*text, ":");
  *text += length + ((*text)[length] == ':');
  return length;
}

/* "80%" as 0.8. */
static bool read_share(const char *part, size_t length, double *share) {
  if (length < 2 || part[length - 1] != '%' ||
      !ef_number_parse(part, length - 1, '.', share))
    return false;
  *share /= 100;
  return true;
}

static ef_status read_task(const char *name, size_t length, const char *rest,
                           const char *text, ef_criterion *out,
                           ef_error *error) {
  char task[32];
  if (length >= sizeof task)
    return bad_criterion(text, error);
  memcpy(task, name, length);
  task[length] = '\0';
  const ef_status status = ef_task_find(task, &out->task, error);
  if (status != EF_OK)
    return status;
  const char *part;
  size_t n = cut(&rest, &part);
  if (!read_share(part, n, &out->proportion))
    return bad_criterion(text, error);
  if (*rest == '\0')
    return EF_OK;
  n = cut(&rest, &part);
  return read_share(part, n, &out->false_alarms) && *rest == '\0'
             ? EF_OK
             : bad_criterion(text, error);
}

static bool is_short(const char *text, ef_criterion *out) {
  if (strcmp(text, "50%") == 0)
    *out = (ef_criterion){EF_TASK_YES_NO, 0.5, UNKNOWN, EF_JND_D_PRIME};
  else if (strcmp(text, "75%") == 0)
    *out = (ef_criterion){EF_TASK_2IFC, 0.75, UNKNOWN, UNKNOWN};
  else if (strcmp(text, "84%") == 0)
    *out = (ef_criterion){EF_TASK_2IFC, ef__normal(1), UNKNOWN, UNKNOWN};
  else
    return false;
  return true;
}

ef_status ef_criterion_find(const char *text, ef_criterion *out,
                            ef_error *error) {
  ef_criterion found = {EF_TASK_2IFC, UNKNOWN, UNKNOWN, UNKNOWN};
  const char *rest = text, *name;
  ef_status status = EF_OK;
  if (!is_short(text, &found)) {
    const size_t length = cut(&rest, &name);
    if (name[length] != ':')
      return bad_criterion(text, error);
    if (length == 7 && strncmp(name, "d-prime", 7) == 0)
      status = ef_number_parse(rest, strlen(rest), '.', &found.d_prime)
                   ? EF_OK
                   : bad_criterion(text, error);
    else
      status = read_task(name, length, rest, text, &found, error);
  }
  if (status != EF_OK)
    return status;
  const double d_prime = ef_criterion_d_prime(&found);
  if (!(d_prime > 0) || !isfinite(d_prime))
    return ef__error_set(error, EF_INVALID,
                         "the criterion '%s' has no d' above 0: give a share "
                         "above chance and below 100 %%; yes-no and "
                         "same-different also need the false alarms, as in "
                         "yes-no:60%%:20%%",
                         text);
  *out = found;
  return EF_OK;
}

/* ---- Records ----------------------------------------------------------- */

static ef_status check_range(const char *what, double value, double low,
                             double high, ef_error *error) {
  if (value >= low && value <= high)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the %s of the JND is %g, expected %g to %g", what,
                       value, low, high);
}

ef_status ef_jnd_record_check(const ef_jnd_record *record, ef_error *error) {
  const double v = record->value;
  if (!(v > 0) || !isfinite(v))
    return ef__error_set(error, EF_INVALID,
                         "the JND is %g, expected a number above 0", v);
  ef_status status =
      check_range("exponent", record->exponent, 0.1, 10, error);
  if (status == EF_OK)
    status = check_range("spread over observers", record->observer_log_sd, 0, 3,
                         error);
  if (status != EF_OK)
    return status;
  const double d_prime = ef_criterion_d_prime(&record->criterion);
  if (!(d_prime > 0) || !isfinite(d_prime))
    return ef__error_set(error, EF_INVALID,
                         "the criterion of the JND has no d' above 0 (found "
                         "%g): give a share above chance and below 1",
                         d_prime);
  const bool is_open = isnan(record->low) && isnan(record->high);
  if (!is_open && !(record->low > 0 && record->low <= v && v <= record->high &&
                    isfinite(record->high)))
    return ef__error_set(error, EF_INVALID,
                         "the interval of the JND is %g to %g, expected one "
                         "above 0 that holds the JND, %g",
                         record->low, record->high, v);
  return EF_OK;
}

static void note_default(const ef_metric *metric, const ef_jnd *jnd,
                         const ef_notes *notes) {
  char value[EF_NUMBER_TEXT];
  ef_number_format(jnd->value, value);
  ef__note(notes,
           "JND taken as %s %s (%s; %s); size, gap, surround and light of the "
           "samples change it, a panel of your own gives yours",
           value, ef_metric_symbol(metric), jnd->criterion, jnd->source);
  ef__note(notes,
           "JNDs taken to spread over observers by 28 %% (median of the "
           "judgements in Berns et al., Color Res. Appl. 16 (1991) 297-316); "
           "the uncertainty of the JND itself is not published and not in the "
           "interval");
}

ef_status ef_jnd_record_default(const ef_metric *metric, ef_jnd_record *out,
                                const ef_notes *notes, ef_error *error) {
  const ef_jnd jnd = ef_metric_jnd(metric);
  if (isnan(jnd.value))
    return ef__error_set(error, EF_NO_ANSWER,
                         "no JND is published for %s: give one, or use a "
                         "formula that has one (cielab, ciede2000, itp)",
                         ef_metric_name(metric));
  *out = (ef_jnd_record){.value = jnd.value,
                         .exponent = 1,
                         .observer_log_sd = 0.28,
                         .low = UNKNOWN,
                         .high = UNKNOWN};
  is_short("50%", &out->criterion);
  snprintf(out->metric, sizeof out->metric, "%s", ef_metric_name(metric));
  snprintf(out->source, sizeof out->source, "%s", jnd.source);
  note_default(metric, &jnd, notes);
  return EF_OK;
}

ef_status ef_jnd_record_convert(const ef_jnd_record *record,
                                const ef_criterion *criterion,
                                ef_jnd_record *out, ef_error *error) {
  double value;
  const ef_status status =
      ef_threshold_convert(record->value, record->exponent, &record->criterion,
                           criterion, &value, error);
  if (status != EF_OK)
    return status;
  const double factor = value / record->value;
  *out = *record;
  out->value = value;
  out->low *= factor;
  out->high *= factor;
  out->criterion = *criterion;
  return EF_OK;
}
