/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "message.h"
#include "panel_adjust.h"
#include "panel_words.h"
#include "record.h"
#include "words.h"

enum { DIGITS = 3 };

static const char *name_of(const panel_adjust *p, const adjust_group *g) {
  return p->has_names ? p->people.name[g->person] : "the observer";
}

/* ---- Text -------------------------------------------------------------- */

static void add_group(text *out, const panel_adjust *p, const adjust_group *g) {
  char number[EF_NUMBER_TEXT];
  text line = {0};
  if (g->status != EF_OK) {
    text_format(&line, "%s: no JND: %s.", name_of(p, g), g->reason);
    text_paragraph(out, &line, 0);
    return;
  }
  const ef_adjustment *s = &g->summary;
  text_format(&line, "To %s equal is ", name_of(p, g));
  panel_add_estimate(&line, s->equality, p->unit);
  if (!isnan(g->standard)) {
    const bool is_off = s->error.low > 0.0 || s->error.high < 0.0;
    ef_number_format(g->standard, number);
    text_format(&line, ", the standard being %s (%s)", number,
                !is_off                ? "no constant error shows"
                : s->error.value > 0.0 ? "set too high"
                                       : "set too low");
  }
  text_add(&line, "; the JND is ");
  panel_add_number(&line, s->jnd, words_decimals(s->jnd, DIGITS));
  text_add(&line, ".");
  text_paragraph(out, &line, 0);
}

static void add_table(text *out, const panel_adjust *p) {
  double least = (double)INFINITY;
  for (size_t i = 0; i < p->n_groups; ++i) {
    if (p->group[i].status == EF_OK)
      least = fmin(least, p->group[i].summary.jnd);
  }
  const int decimals = words_decimals(least, DIGITS);
  text_table t = table_new();
  table_column(&t, "Observer", "", true);
  if (p->has_standard)
    table_column(&t, "Standard", "", false);
  table_column(&t, "Settings", "", false);
  table_column(&t, "Mean", "", false);
  if (p->has_standard) {
    table_column(&t, "Constant error", "", false);
    table_column(&t, "95 %", "from", false);
    table_column(&t, NULL, "to", false);
  }
  table_column(&t, "Scatter", "SD", false);
  table_column(&t, "95 %", "from", false);
  table_column(&t, NULL, "to", false);
  table_column(&t, "JND", "", false);
  for (size_t i = 0; i < p->n_groups; ++i) {
    const adjust_group *g = &p->group[i];
    const ef_adjustment *s = &g->summary;
    if (g->status != EF_OK)
      continue;
    table_cell(&t, name_of(p, g));
    if (p->has_standard)
      table_number(&t, g->standard, decimals);
    table_format(&t, "%zu", s->n);
    table_number(&t, s->equality.value, decimals);
    if (p->has_standard) {
      table_number(&t, s->error.value, decimals);
      table_number(&t, s->error.low, decimals);
      table_number(&t, s->error.high, decimals);
    }
    table_number(&t, s->spread.value, decimals);
    table_number(&t, s->spread.low, decimals);
    table_number(&t, s->spread.high, decimals);
    table_number(&t, s->jnd, decimals);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

static ef_status write_text(const panel_adjust *p, ef_output *output,
                            ef_error *error) {
  text out = {0}, line = {0};
  for (size_t i = 0; i < p->n_groups; ++i)
    add_group(&out, p, &p->group[i]);
  add_table(&out, p);
  text_add(&out, "\nWhat this rests on:\n");
  text_format(&line,
              "%s: each is where an observer left a control when both sides "
              "looked alike%s",
              p->path,
              p->has_standard ? ""
                              : "; without a column standard nothing is known "
                                "of a constant error");
  text_label(&out, "Settings", &line);
  text_add(&line, "0.6745 standard deviations, the probable error: half of the "
                  "settings lie within it (common practice, no source). It "
                  "mixes what is seen with the skill of the hand, and is no "
                  "JND of forced choice");
  text_label(&out, "JND", &line);
  text_add(&line, "95 %, Student's t for means, chi-square for standard "
                  "deviations, of settings that scatter normally");
  text_label(&out, "Intervals", &line);
  text_add(&out, "\n");
  text_wrap(&out, panel_caution, 0);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

/* ---- Data -------------------------------------------------------------- */

static void record_estimate(record *r, const char *key, ef_estimate e) {
  record_begin(r, key);
  record_number(r, "value", e.value);
  record_number(r, "se", e.se);
  record_number(r, "low", e.low);
  record_number(r, "high", e.high);
  record_end(r);
}

static void record_group(record *r, const panel_adjust *p,
                         const adjust_group *g) {
  const double no = (double)NAN;
  const ef_estimate none = {no, no, no, no};
  const bool found = g->status == EF_OK;
  const ef_adjustment *s = &g->summary;
  record_begin(r, NULL);
  record_text(r, "observer", p->people.name[g->person]);
  record_number(r, "standard", g->standard);
  record_number(r, "n", found ? (double)s->n : no);
  record_estimate(r, "pse", found ? s->equality : none);
  record_estimate(r, "constant_error",
                  found && !isnan(g->standard) ? s->error : none);
  record_estimate(r, "sd", found ? s->spread : none);
  record_number(r, "jnd", found ? s->jnd : no);
  record_text(r, "reason", g->reason);
  record_end(r);
}

static ef_status write_csv(const panel_adjust *p, ef_output *output,
                           ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record head = record_of_csv(csv, true);
  record_group(&head, p, &p->group[0]);
  for (size_t i = 0; i < p->n_groups; ++i) {
    record r = record_of_csv(csv, false);
    record_group(&r, p, &p->group[i]);
  }
  return ef_csv_finish(csv, error);
}

static ef_status write_json(const panel_adjust *p, ef_output *output,
                            ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "file", p->path);
  ef_json_text(j, "unit", p->unit);
  ef_json_begin_array(j, "settings");
  for (size_t i = 0; i < p->n_groups; ++i) {
    record r = record_of_json(j);
    record_group(&r, p, &p->group[i]);
  }
  ef_json_end_array(j);
  ef_json_end_object(j);
  return ef_json_finish(j, error);
}

ef_status render_panel_adjust(const panel_adjust *p, ef_output *output,
                              ef_error *error) {
  switch (p->options->format) {
  case FORMAT_CSV:
    return write_csv(p, output, error);
  case FORMAT_JSON:
    return write_json(p, output, error);
  default:
    return write_text(p, output, error);
  }
}
