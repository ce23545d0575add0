/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_convert.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "record.h"
#include "text.h"
#include "words.h"

static bool is_judged(const conversion *c) {
  return c->given != NULL && (c->from == NULL || c->asked != NULL);
}

/* ---- CSV and JSON -------------------------------------------------------- */

typedef struct data {
  ef_csv *csv;
  ef_json *json;
} data;

static void record_row(record *r, const conversion *c, const converted *row) {
  record_begin(r, NULL);
  record_text(r, "name", row->name);
  if (r->json != NULL) {
    record_number(r, "line", (double)row->line);
    record_numbers(r, "input", c->n_in, c->in_name, row->in);
    record_numbers(r, "output", c->n_out, c->out_name, row->out);
  } else { /* so that the file reads back */
    for (size_t i = 0; i < c->n_out; ++i)
      record_number(r, c->out_name[i], row->out[i]);
  }
  if (is_judged(c)) {
    record_number(r, "difference", row->difference);
    record_number(r, "jnds", row->difference / c->measure.jnd);
  }
  record_end(r);
}

static ef_status put_data(void *self, const conversion *c, size_t n,
                          const converted *row, ef_error *error) {
  data *d = self;
  (void)error;
  for (size_t i = 0; i < n; ++i) {
    record r =
        d->csv != NULL ? record_of_csv(d->csv, false) : record_of_json(d->json);
    record_row(&r, c, &row[i]);
  }
  return EF_OK;
}

static ef_status as_csv(conversion *c, ef_output *output, convert_summary *sum,
                        ef_error *error) {
  data d = {.csv = ef_csv_new(output, error)};
  if (d.csv == NULL)
    return error->status;
  if (c->target == CONVERT_TO_DEVICE)
    ef_csv_comment(d.csv, "device_max: 1");
  else
    ef_csv_comment(d.csv, "white: D50, CIE 1931 observer, Y = 100");
  record header = record_of_csv(d.csv, true);
  const converted none = {.name = ""};
  record_row(&header, c, &none);
  const convert_sink sink = {&d, put_data};
  const ef_status status = conversion_stream(c, &sink, sum, error);
  ef_error late;
  const ef_status finished =
      ef_csv_finish(d.csv, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

static void write_end(ef_json *j, const char *key, const char *name,
                      const ef_profile_info *info, const char *coordinates,
                      size_t n, const char *const *columns) {
  ef_json_begin_object(j, key);
  ef_json_text(j, "name", name);
  ef_json_text(j, "space", info != NULL ? info->space : coordinates);
  ef_json_begin_array(j, "columns");
  for (size_t i = 0; i < n; ++i)
    ef_json_text(j, NULL, columns[i]);
  ef_json_end_array(j);
  ef_json_end_object(j);
}

static ef_status as_json(conversion *c, ef_output *output, convert_summary *sum,
                         ef_error *error) {
  data d = {.json = ef_json_new(output, error)};
  if (d.json == NULL)
    return error->status;
  ef_json *j = d.json;
  ef_json_begin_object(j, NULL);
  write_end(j, "from", c->from != NULL ? c->options->from : c->file,
            c->from != NULL ? &c->from_info : NULL, ef_content_text(c->content),
            c->n_in, c->in_name);
  write_end(j, "to", c->options->to, c->to != NULL ? &c->to_info : NULL,
            c->target == CONVERT_TO_LAB ? "L,a,b" : "X,Y,Z", c->n_out,
            c->out_name);
  ef_json_text(j, "intent", ef_intent_name(c->settings.intent));
  ef_json_boolean(j, "scales_black", c->settings.black_point_compensation);
  ef_json_text(j, "metric", ef_metric_name(c->measure.metric));
  ef_json_number(j, "jnd", c->measure.jnd);
  ef_json_begin_array(j, "colours");
  const convert_sink sink = {&d, put_data};
  const ef_status status = conversion_stream(c, &sink, sum, error);
  ef_json_end_array(j);
  ef_json_begin_object(j, "summary");
  ef_json_integer(j, "colours", (int64_t)sum->n);
  ef_json_integer(j, "skipped_rows", (int64_t)sum->n_skipped);
  if (sum->n_judged > 0) {
    ef_json_integer(j, "above_one_jnd", (int64_t)sum->n_noticed);
    ef_json_number(j, "mean_difference", sum->mean);
    ef_json_number(j, "worst_difference", sum->worst);
    ef_json_text(j, "worst_name", sum->worst_name);
    if (c->options->check) {
      ef_json_number(j, "tolerance", c->measure.tolerance);
      ef_json_integer(j, "beyond_tolerance", (int64_t)sum->n_beyond);
    }
  }
  ef_json_end_object(j);
  ef_json_end_object(j);
  ef_error late;
  const ef_status finished = ef_json_finish(j, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

/* ---- Text ---------------------------------------------------------------- */

/* A person reads so many rows. */
enum { MOST_ROWS = 200 };

typedef struct kept {
  converted row[MOST_ROWS];
  char *name[MOST_ROWS];
  size_t n;
} kept;

static ef_status keep(void *self, const conversion *c, size_t n,
                      const converted *row, ef_error *error) {
  kept *k = self;
  (void)c;
  for (size_t i = 0; i < n && k->n < MOST_ROWS; ++i) {
    k->name[k->n] = strdup(row[i].name);
    if (k->name[k->n] == NULL)
      return message_fail(error, EF_NO_MEMORY, "out of memory for names");
    k->row[k->n] = row[i];
    k->row[k->n].name = k->name[k->n];
    ++k->n;
  }
  return EF_OK;
}

static const char *target_words(const conversion *c) {
  return c->target == CONVERT_TO_LAB   ? "L*, a*, b* under D50"
         : c->target == CONVERT_TO_XYZ ? "X, Y, Z under D50"
                                       : c->options->to;
}

static void add_judgement(const conversion *c, const convert_summary *sum,
                          text *t) {
  const char *symbol = ef_metric_symbol(c->measure.metric);
  char worst[EF_NUMBER_TEXT];
  words_amount(sum->worst, worst);
  if (isnan(c->measure.jnd)) {
    text_format(t, "; the worst, %.150s, comes out %s %s off", sum->worst_name,
                worst, symbol);
    return;
  }
  if (sum->n_noticed == 0) {
    text_format(t,
                "; all come out as asked for to within one JND, the worst, "
                "%.150s, by %s %s",
                sum->worst_name, worst, symbol);
    return;
  }
  text_format(t,
              "; %zu of them %s more than one JND off what was asked for, "
              "the worst, %.150s, by %s %s (%.1f JND)",
              sum->n_noticed, sum->n_noticed == 1 ? "comes out" : "come out",
              sum->worst_name, worst, symbol, sum->worst / c->measure.jnd);
}

static void add_answer(const conversion *c, const convert_summary *sum,
                       text *out) {
  char n[WORDS_ROOM];
  words_count(sum->n, "colour", "colours", n);
  text t = {0};
  text_format(&t, "%s converted to %.300s", n, target_words(c));
  if (sum->n_judged > 0)
    add_judgement(c, sum, &t);
  text_add(&t, ".");
  text_paragraph(out, &t, 0);
  if (c->options->check && sum->n_judged > 0) {
    char tolerance[EF_NUMBER_TEXT];
    ef_number_format(c->measure.tolerance, tolerance);
    text_format(&t,
                "The check %s: %zu of %zu %s off by more than the "
                "tolerance of %s %s.",
                sum->n_beyond > 0 ? "fails" : "holds", sum->n_beyond,
                sum->n_judged, sum->n_beyond == 1 ? "is" : "are", tolerance,
                ef_metric_symbol(c->measure.metric));
    text_paragraph(out, &t, 0);
  }
}

/* How values are shown: device values in percent. */
static void add_columns(text_table *t, const char *head, bool is_device,
                        size_t n, const char *const *names) {
  for (size_t i = 0; i < n; ++i)
    table_column(t, i > 0 ? NULL : head,
                 is_device                    ? names[i]
                 : strcmp(names[i], "L") == 0 ? "L*"
                 : strcmp(names[i], "a") == 0 ? "a*"
                 : strcmp(names[i], "b") == 0 ? "b*"
                                              : names[i],
                 false);
}

static void add_values(text_table *t, bool is_device, size_t n,
                       const char *const *names, const double *value) {
  for (size_t i = 0; i < n; ++i) {
    const bool is_small =
        strcmp(names[i], "x") == 0 || strcmp(names[i], "y") == 0;
    table_number(t, is_device ? 100.0 * value[i] : value[i], is_small ? 4 : 2);
  }
}

static void add_table(const conversion *c, const kept *k, text *out) {
  const bool from_device = c->from != NULL;
  const bool to_device = c->to != NULL;
  text_add(out, "\n");
  text_table t = table_new();
  table_column(&t, "Colour", "", true);
  add_columns(&t, from_device ? "From, %" : "From", from_device, c->n_in,
              c->in_name);
  add_columns(&t, to_device ? "To, %" : "To", to_device, c->n_out, c->out_name);
  if (is_judged(c))
    table_column(&t, "Off by", ef_metric_symbol(c->measure.metric), false);
  for (size_t i = 0; i < k->n; ++i) {
    const converted *row = &k->row[i];
    table_cell(&t, row->name);
    add_values(&t, from_device, c->n_in, c->in_name, row->in);
    add_values(&t, to_device, c->n_out, c->out_name, row->out);
    if (is_judged(c))
      table_number(&t, row->difference, 2);
  }
  table_finish(&t, out);
}

static void add_profile(const char *label, const char *name,
                        const ef_profile_info *info, text *out) {
  text t = {0};
  text_format(&t, "%s, \"%s\": ", name, info->description);
  profile_file_words(info, &t);
  text_label(out, label, &t);
}

static void add_colours(const conversion *c, text *out) {
  text t = {0};
  const char *light = ef_illuminant_name(c->illuminant);
  const bool is_d50 = strcmp(light, "D50") == 0;
  text_format(&t, "%s (%s), white %s at Y = 100, CIE 1931", c->file,
              ef_content_text(c->content), light);
  if (!is_d50)
    text_format(&t, "; adapted to D50 by %s",
                c->options->adaptation != NULL ? c->options->adaptation
                                               : "bradford");
  else if (c->options->illuminant == NULL)
    text_add(&t, ", which is assumed (--illuminant names another)");
  text_label(out, "From", &t);
}

static void add_basis(const conversion *c, text *out) {
  text_add(out, "\nWhat this rests on:\n");
  if (c->from != NULL)
    add_profile("From", c->options->from, &c->from_info, out);
  else
    add_colours(c, out);
  if (c->to != NULL)
    add_profile("To", c->options->to, &c->to_info, out);
  text t = {0};
  profile_intent_words(c->settings.intent, c->settings.black_point_compensation,
                       &t);
  text_label(out, "Intent", &t);
  if (!is_judged(c))
    return;
  text_add(&t, "the colour that the device values stand for by the profile's "
               "own way back, against the colour asked for, both under D50 "
               "with this intent; how true the profile is to its device, "
               "`evenfield profile check` tells");
  text_label(out, "Off by", &t);
  measure_label(&c->measure, out);
}

static ef_status as_text(conversion *c, ef_output *output, convert_summary *sum,
                         ef_error *error) {
  kept *k = calloc(1, sizeof *k);
  if (k == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for rows");
  const convert_sink sink = {k, keep};
  ef_status status = conversion_stream(c, &sink, sum, error);
  if (status == EF_OK) {
    text out = {0};
    add_answer(c, sum, &out);
    add_table(c, k, &out);
    if (sum->n > k->n)
      text_format(&out, "  ... and %zu more (--format csv or json gives all)\n",
                  sum->n - k->n);
    add_basis(c, &out);
    status = text_write(&out, output, error);
    text_free(&out);
  }
  for (size_t i = 0; i < k->n; ++i)
    free(k->name[i]);
  free(k);
  return status;
}

ef_status render_conversion(conversion *c, ef_output *output,
                            convert_summary *sum, ef_error *error) {
  switch (c->options->format) {
  case FORMAT_CSV:
    return as_csv(c, output, sum, error);
  case FORMAT_JSON:
    return as_json(c, output, sum, error);
  case FORMAT_CGATS:
    return render_conversion_cgats(c, output, sum, error);
  default:
    return as_text(c, output, sum, error);
  }
}
