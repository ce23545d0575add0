/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_next.h"

#include <math.h>
#include <stdio.h>

#include "message.h"
#include "panel_words.h"
#include "record.h"
#include "text.h"
#include "words.h"

enum { NAME_ROOM = 160 };

void panel_next_level(const panel_next *p, size_t level, char *name,
                      size_t room) {
  char number[EF_NUMBER_TEXT];
  ef_number_format(p->level[level], number);
  if (p->has_names)
    snprintf(name, room, "%s (level %s)", p->names.name[level], number);
  else
    snprintf(name, room, "level %s", number);
}

void panel_next_name(const panel_next *p, const next_step *s, char *name,
                     size_t room) {
  const char *condition = answers_condition(&p->answers, s->condition);
  const char *observer = s->is_new ? "a new observer"
                         : p->answers.has_observer
                             ? answers_observer(&p->answers, s->observer)
                             : "the observer";
  snprintf(name, room, "%s%s%s", observer,
           condition[0] != '\0' && !s->is_new ? ", " : "",
           s->is_new ? "" : condition);
}

ef_estimate panel_next_aim(const next_step *s) {
  return isnan(s->next.jnd.value) ? s->next.threshold : s->next.jnd;
}

const char *panel_next_aim_words(const next_step *s) {
  return isnan(s->next.jnd.value) ? "threshold" : "JND";
}

/* ---- Text -------------------------------------------------------------- */

static void add_step(text *out, const panel_next *p, const next_step *s) {
  char name[NAME_ROOM], level[NAME_ROOM];
  text line = {0};
  panel_next_name(p, s, name, sizeof name);
  panel_next_level(p, s->next.choice, level, sizeof level);
  if (s->is_new) {
    text_format(&line, "A new observer begins at %s.", level);
  } else if (s->next.is_done) {
    text_format(&line, "%s: done after %zu trials; the %s is ", name,
                s->next.n_trials, panel_next_aim_words(s));
    panel_add_estimate(&line, panel_next_aim(s), p->answers.unit);
    text_format(&line, "%s.",
                s->next.is_precise ? ""
                                   : ", which is not as precise as wanted");
  } else {
    text_format(&line, "Show %s %s next.", name, level);
  }
  text_paragraph(out, &line, 0);
}

static size_t count_going(const panel_next *p) {
  size_t n = 0;
  for (size_t i = 0; i < p->n; ++i)
    n += !p->step[i].is_new && !p->step[i].next.is_done;
  return n;
}

static void add_answer(text *out, const panel_next *p) {
  enum { MOST_LINES = 3 };
  const size_t n_old = p->n - 1;
  if (n_old > MOST_LINES) {
    text line = {0};
    char number[WORDS_ROOM];
    words_count(count_going(p), "observer goes on", "observers go on", number);
    text_format(&line, "%s, %zu done; what to show next stands below.", number,
                n_old - count_going(p));
    text_paragraph(out, &line, 0);
  }
  for (size_t i = 0; i < n_old && n_old <= MOST_LINES; ++i)
    add_step(out, p, &p->step[i]);
  add_step(out, p, &p->step[n_old]);
}

static void add_table(text *out, const panel_next *p) {
  text_table t = table_new();
  double least = (double)INFINITY;
  for (size_t i = 0; i + 1 < p->n; ++i)
    least = fmin(least, fabs(panel_next_aim(&p->step[i]).value));
  const int decimals = words_decimals(least, 3);
  table_column(&t, "Observer", "", true);
  if (p->answers.has_condition)
    table_column(&t, "Condition", "", true);
  table_column(&t, "Trials", "", false);
  table_column(
      &t,
      p->n > 1 ? (isnan(p->step[0].next.jnd.value) ? "Threshold" : "JND") : "",
      "", false);
  table_column(&t, "95 %", "from", false);
  table_column(&t, NULL, "to", false);
  table_column(&t, "Show next", "", true);
  table_column(&t, "Gain", "bits", false);
  for (size_t i = 0; i + 1 < p->n; ++i) {
    const next_step *s = &p->step[i];
    const ef_estimate e = panel_next_aim(s);
    char name[NAME_ROOM];
    panel_next_level(p, s->next.choice, name, sizeof name);
    table_cell(&t, p->answers.has_observer
                       ? answers_observer(&p->answers, s->observer)
                       : "all answers");
    if (p->answers.has_condition)
      table_cell(&t, answers_condition(&p->answers, s->condition));
    table_format(&t, "%zu", s->next.n_trials);
    table_number(&t, e.value, decimals);
    table_number(&t, e.low, decimals);
    table_number(&t, e.high, decimals);
    table_cell(&t, s->next.is_done ? "done" : name);
    table_number(&t, s->next.gain_bits, 3);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

const next_step *panel_next_told(const panel_next *p) {
  return &p->step[p->n > 2 ? p->n - 1 : 0];
}

/* What each level in hand would tell; for one observer alone. */
static void add_gains(text *out, const panel_next *p) {
  const next_step *s = panel_next_told(p);
  char name[NAME_ROOM];
  text_table t = table_new();
  table_column(&t, "Level", "", false);
  if (p->has_names)
    table_column(&t, "Name", "", true);
  table_column(&t, "Gain", "bits", false);
  for (size_t i = 0; i < p->n_levels; ++i) {
    char number[EF_NUMBER_TEXT];
    ef_number_format(p->level[i], number);
    table_cell(&t, number);
    if (p->has_names)
      table_cell(&t, p->names.name[i]);
    table_number(&t, s->gain[i], 3);
  }
  panel_next_name(p, s, name, sizeof name);
  text_format(out, "\nWhat an answer would tell about %s:\n", name);
  table_finish(&t, out);
}

static void add_basis(text *out, const panel_next *p) {
  const ef_next_settings *s = &p->settings;
  char number[EF_NUMBER_TEXT], lapses[EF_NUMBER_TEXT];
  text line = {0};
  ef_number_format(100.0 * s->lapse_max, lapses);
  text_add(out, "\nWhat this rests on:\n");
  text_format(&line,
              "%s: everything known stands in that file; the same answers give "
              "the same choice",
              p->answers.file);
  text_label(out, "Answers", &line);
  text_format(&line,
              "%s, %s curve on a %s axis; all thresholds around the levels in "
              "hand, widths, and lapses up to %s %% are held possible "
              "beforehand, and weighed by the answers",
              ef_task_name(p->answers.task), ef_shape_name(s->shape),
              s->axis == EF_AXIS_LOG ? "logarithmic" : "linear", lapses);
  text_label(out, "Curve", &line);
  text_add(&line, "the level whose answer is expected to narrow the threshold "
                  "down most (least expected entropy)");
  text_label(out, "Choice", &line);
  ef_number_format(100.0 * s->precision, number);
  text_format(&line,
              "half of the threshold's 95 %% interval is %s %% of the JND or "
              "less",
              number);
  if (s->most_trials > 0)
    text_format(&line, ", or after %zu trials", s->most_trials);
  text_label(out, "Done when", &line);
}

void panel_next_add(text *out, const panel_next *p) {
  add_answer(out, p);
  if (p->is_demo) {
    text_wrap(out,
              "No file was named, so this is the built-in demo: how the panel "
              "of seats would go on (demo:panel-responses).",
              0);
  }
  if (p->n > 1)
    add_table(out, p);
  add_gains(out, p);
  add_basis(out, p);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out,
            "Between the pairs that are asked for show others now and then, so "
            "that observers cannot tell how near their threshold they are; "
            "every answer that is written down counts.",
            0);
}

static ef_status write_text(const panel_next *p, ef_output *output,
                            ef_error *error) {
  text out = {0};
  panel_next_add(&out, p);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

/* ---- Data -------------------------------------------------------------- */

static void record_estimate(record *r, const char *key, ef_estimate e) {
  record_begin(r, key);
  record_number(r, "value", e.value);
  record_number(r, "sd", e.se);
  record_number(r, "low", e.low);
  record_number(r, "high", e.high);
  record_end(r);
}

static void record_step(record *r, const panel_next *p, const next_step *s) {
  const ef_next *n = &s->next;
  record_begin(r, NULL);
  record_text(r, "observer",
              s->is_new ? "" : answers_observer(&p->answers, s->observer));
  record_text(r, "condition",
              s->is_new ? "" : answers_condition(&p->answers, s->condition));
  record_boolean(r, "is_new", s->is_new);
  record_boolean(r, "is_done", n->is_done);
  record_boolean(r, "is_precise", n->is_precise);
  record_number(r, "level", p->level[n->choice]);
  record_text(r, "name", p->has_names ? p->names.name[n->choice] : "");
  record_number(r, "gain_bits", n->gain_bits);
  record_number(r, "n_trials", (double)n->n_trials);
  record_estimate(r, "threshold", n->threshold);
  record_estimate(r, "jnd", n->jnd);
  record_estimate(r, "width", n->width);
  record_number(r, "lapse", n->lapse);
  record_number(r, "entropy_bits", n->entropy_bits);
  record_number(r, "edge_share", n->edge_share);
  if (r->json != NULL) {
    ef_json_begin_array(r->json, "gains_bits");
    for (size_t i = 0; i < p->n_levels; ++i)
      ef_json_number(r->json, NULL, s->gain[i]);
    ef_json_end_array(r->json);
  }
  record_end(r);
}

static ef_status write_csv(const panel_next *p, ef_output *output,
                           ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record head = record_of_csv(csv, true);
  record_step(&head, p, &p->step[0]);
  for (size_t i = 0; i < p->n; ++i) {
    record r = record_of_csv(csv, false);
    record_step(&r, p, &p->step[i]);
  }
  return ef_csv_finish(csv, error);
}

static ef_status write_json(const panel_next *p, ef_output *output,
                            ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "file", p->answers.file);
  ef_json_text(j, "task", ef_task_name(p->answers.task));
  ef_json_text(j, "model", ef_shape_name(p->settings.shape));
  ef_json_number(j, "precision", p->settings.precision);
  ef_json_begin_array(j, "levels");
  for (size_t i = 0; i < p->n_levels; ++i)
    ef_json_number(j, NULL, p->level[i]);
  ef_json_end_array(j);
  ef_json_begin_array(j, "next");
  for (size_t i = 0; i < p->n; ++i) {
    record r = record_of_json(j);
    record_step(&r, p, &p->step[i]);
  }
  ef_json_end_array(j);
  ef_json_end_object(j);
  return ef_json_finish(j, error);
}

ef_status render_panel_next(const panel_next *p, ef_output *output,
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
