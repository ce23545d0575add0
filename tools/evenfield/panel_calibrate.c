/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_calibrate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "panel_settings.h"

static const char demo_answers[] = "demo:pair-answers";
static const char demo_pairs[] = "demo:colour-pairs";

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the calibration");
}

/* ---- Pairs of the answers ---------------------------------------------- */

static ef_status unknown_pair(const panel_calibration *c, size_t row,
                              ef_error *error) {
  const answers *a = &c->answers;
  message_fail(error, EF_MALFORMED, "%.100s has no pair called '%.60s'",
               c->pairs_path, a->pairs.name[a->pair[row]]);
  error->line = a->line[row];
  snprintf(error->field, sizeof error->field, "pair");
  return message_place(error, a->file);
}

/* Pairs of the answers become those of the list. */
static ef_status join_pairs(panel_calibration *c, const ef_notes *notes,
                            ef_error *error) {
  answers *a = &c->answers;
  const size_t n_known = c->pairs.n;
  size_t *place = malloc((a->pairs.n + 1) * sizeof *place);
  if (place == NULL)
    return out_of_memory(error);
  for (size_t i = 0; i < a->pairs.n; ++i) {
    place[i] = name_list_place(&c->pairs.names, a->pairs.name[i]);
  }
  ef_status status = EF_OK;
  for (size_t i = 0; i < a->n && status == EF_OK; ++i) {
    const size_t at = place[a->pair[i]];
    if (at >= n_known)
      status = unknown_pair(c, i, error);
    else
      a->pair[i] = at;
  }
  free(place);
  if (status == EF_OK && a->pairs.n < n_known) {
    message_note(notes, "%s: %zu of %zu pairs have no answers and are not used",
                 c->pairs_path, n_known - a->pairs.n, n_known);
  }
  return status;
}

static ef_status set_levels(panel_calibration *c, ef_error *error) {
  answers *a = &c->answers;
  double *difference = malloc(c->pairs.n * sizeof *difference);
  if (difference == NULL)
    return out_of_memory(error);
  const ef_status status =
      pair_list_differences(&c->pairs, c->metric, difference, error);
  for (size_t i = 0; i < a->n && status == EF_OK; ++i)
    a->level[i] = difference[a->pair[i]];
  free(difference);
  return status;
}

/* ---- Formulas ---------------------------------------------------------- */

/* Answers pair by pair, of the pairs that have some. */
typedef struct pair_counts {
  size_t n, *pair, *shown, *positive;
  double *difference; /* n_formulas x n */
} pair_counts;

static void pair_counts_free(pair_counts *p) {
  free(p->pair);
  free(p->shown);
  free(p->positive);
  free(p->difference);
}

static ef_status count_pairs(const panel_calibration *c, pair_counts *out,
                             ef_error *error) {
  const size_t room = c->pairs.n;
  const answers *a = &c->answers;
  out->pair = malloc(room * sizeof *out->pair);
  out->shown = calloc(room, sizeof *out->shown);
  out->positive = calloc(room, sizeof *out->positive);
  out->difference =
      malloc((ef_metric_count() + 1) * room * sizeof *out->difference);
  if (out->pair == NULL || out->shown == NULL || out->positive == NULL ||
      out->difference == NULL)
    return out_of_memory(error);
  for (size_t i = 0; i < a->n; ++i) {
    out->shown[a->pair[i]] += a->shown[i];
    out->positive[a->pair[i]] += a->positive[i];
  }
  for (size_t i = 0; i < room; ++i) {
    if (out->shown[i] == 0)
      continue;
    out->shown[out->n] = out->shown[i];
    out->positive[out->n] = out->positive[i];
    out->pair[out->n++] = i;
  }
  return EF_OK;
}

/* A formula that is not defined for every pair is left out. */
static ef_status add_formula(panel_calibration *c, const ef_metric *metric,
                             bool is_asked, pair_counts *p, double *all,
                             const ef_notes *notes, ef_error *error) {
  const ef_status status = pair_list_differences(&c->pairs, metric, all, error);
  double *own = p->difference + c->n_formulas * p->n;
  for (size_t i = 0; i < p->n && status == EF_OK; ++i) {
    own[i] = all[p->pair[i]];
    if (isfinite(own[i]))
      continue;
    message_note(notes, "%s has no difference for pair %s and is left out",
                 ef_metric_title(metric), c->pairs.names.name[p->pair[i]]);
    return EF_OK;
  }
  c->formula[c->n_formulas++] =
      (panel_formula){.metric = metric, .is_asked = is_asked};
  return status;
}

static int by_stress(const void *a, const void *b) {
  const double x = ((const panel_formula *)a)->score.stress;
  const double y = ((const panel_formula *)b)->score.stress;
  return (x > y) - (x < y);
}

static ef_status score(panel_calibration *c, const pair_counts *p,
                       ef_error *error) {
  ef_formula_score *out = malloc(c->n_formulas * sizeof *out);
  if (out == NULL)
    return out_of_memory(error);
  size_t best;
  ef_error reason;
  const ef_status status =
      ef_formulas_score(p->n, c->n_formulas, p->difference, p->shown,
                        p->positive, &c->settings, out, &best, &reason);
  for (size_t i = 0; i < c->n_formulas && status == EF_OK; ++i)
    c->formula[i].score = out[i];
  free(out);
  if (status != EF_OK) {
    c->n_formulas = 0; /* one pair has no order */
    return EF_OK;
  }
  for (size_t i = 0; i < p->n; ++i) {
    bool differs = false;
    for (size_t f = 0; f < c->n_formulas; ++f)
      differs = differs || p->difference[f * p->n + i] != 0.0;
    c->n_scored += differs ? 1 : 0;
  }
  qsort(c->formula, c->n_formulas, sizeof *c->formula, by_stress);
  return EF_OK;
}

static ef_status compare_formulas(panel_calibration *c, const ef_notes *notes,
                                  ef_error *error) {
  pair_counts p = {0};
  double *all = malloc(c->pairs.n * sizeof *all);
  c->formula = calloc(ef_metric_count() + 1, sizeof *c->formula);
  ef_status status = all == NULL || c->formula == NULL
                         ? out_of_memory(error)
                         : count_pairs(c, &p, error);
  if (status == EF_OK)
    status = add_formula(c, c->metric, true, &p, all, notes, error);
  for (size_t i = 0; i < ef_metric_count() && status == EF_OK; ++i) {
    const ef_metric *metric = ef_metric_at(i);
    if (strcmp(ef_metric_name(metric), ef_metric_name(c->metric)) == 0)
      continue;
    status = add_formula(c, metric, false, &p, all, notes, error);
  }
  if (status == EF_OK)
    status = score(c, &p, error);
  pair_counts_free(&p);
  free(all);
  return status;
}

/* ---- The JND ----------------------------------------------------------- */

static ef_status set_settings(panel_calibration *c, ef_error *error) {
  const command_options *o = c->options;
  c->settings = ef_calibration_settings_default(c->answers.task);
  c->settings.intervals = panel_intervals(o);
  c->settings.lapse = o->lapse;
  if (o->exponent_text == NULL)
    return EF_OK;
  double value;
  if (strcmp(o->exponent_text, "fitted") == 0) {
    c->settings.exponent = (double)NAN;
    return EF_OK;
  }
  if (ef_number_parse(o->exponent_text, strlen(o->exponent_text), '.',
                      &value) &&
      value >= 0.1 && value <= 10.0) {
    c->settings.exponent = value;
    return EF_OK;
  }
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--exponent is a number from 0.1 to 10, or fitted, not "
                      "\"%.100s\"",
                      o->exponent_text);
}

static void name_source(const panel_calibration *c, char *out, size_t room) {
  snprintf(out, room, "panel: %.100s, %s", c->answers.file,
           ef_task_name(c->answers.task));
}

/* What the metric's unit needs: sizes, and for some tasks the same pairs. */
static ef_status calibrate(panel_calibration *c, ef_error *error) {
  const answers *a = &c->answers;
  c->n_observers = a->observers.n > 0 ? a->observers.n : 1;
  c->each = calloc(c->n_observers, sizeof *c->each);
  if (c->each == NULL)
    return out_of_memory(error);
  const ef_status status =
      ef_calibrate(a->n, a->level, a->observer, a->shown, a->positive,
                   c->n_observers, &c->settings, &c->result, c->each, error);
  if (status == EF_INVALID) {
    error->status = EF_UNKNOWN_NAME; /* the task has no JND */
    return error->status;
  }
  if (status == EF_NO_ANSWER) {
    ef_error whole;
    message_fail(&whole, status, "no JND: %.450s", error->message);
    *error = whole;
    return message_place(error, a->file);
  }
  if (status != EF_OK) {
    if (error->line > 0)
      error->line = a->line[error->line - 1];
    return message_place(error, a->file);
  }
  char source[200];
  name_source(c, source, sizeof source);
  ef_calibration_record(&c->result, ef_metric_name(c->metric), source,
                        &c->record);
  return EF_OK;
}

/* ---- Loading ----------------------------------------------------------- */

static ef_status check_levels(const panel_calibration *c, const ef_notes *notes,
                              ef_error *error) {
  const ef_status status = panel_check_levels(&c->answers, EF_AXIS_LOG, error);
  if (status == EF_OK) {
    message_note(notes,
                 "%s: levels are taken as differences by %s%s%s; with --pairs "
                 "the formulas can be compared",
                 c->answers.file, ef_metric_title(c->metric),
                 c->answers.unit[0] != '\0' ? ", and the file's unit is " : "",
                 c->answers.unit);
  }
  return status;
}

ef_status panel_calibration_load(panel_calibration *c,
                                 const command_options *options,
                                 const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *c = (panel_calibration){.options = options, .is_demo = o->n_files < 2};
  c->pairs_path = c->is_demo ? demo_pairs : o->pairs;
  c->samples_path = o->n_files > 2 ? o->files[2] : NULL;
  c->metric = ef_metric_new(o->metric != NULL ? o->metric : "ciede2000", error);
  if (c->metric == NULL)
    return message_option(error, "metric", "");
  const answers_need need = {.task = o->task == NULL && c->is_demo ? "2ifc"
                                                                   : o->task,
                             .by_pair = c->pairs_path != NULL};
  ef_status status =
      answers_read(&c->answers, c->is_demo ? demo_answers : o->files[1], &need,
                   false, notes, error);
  if (status == EF_OK)
    status = set_settings(c, error);
  if (status == EF_OK && c->pairs_path != NULL) {
    status = pair_list_read(&c->pairs, o, c->pairs_path, c->samples_path, notes,
                            error);
    if (status == EF_OK)
      status = join_pairs(c, notes, error);
    if (status == EF_OK)
      status = set_levels(c, error);
  } else if (status == EF_OK) {
    status = check_levels(c, notes, error);
  }
  if (status == EF_OK)
    status = calibrate(c, error);
  if (status == EF_OK && c->pairs_path != NULL)
    status = compare_formulas(c, notes, error);
  return status;
}

void panel_calibration_free(panel_calibration *c) {
  answers_free(&c->answers);
  pair_list_free(&c->pairs);
  ef_metric_free(c->metric);
  free(c->each);
  free(c->formula);
}
