/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_fit.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "panel_settings.h"

static const char demo_answers[] = "demo:panel-responses";
static const char demo_task[] = "2ifc";

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the curves");
}

/* ---- One curve --------------------------------------------------------- */

static bool is_of(const answers *a, size_t row, const panel_fit *f) {
  return a->condition[row] == f->condition &&
         (f->is_pooled || a->observer[row] == f->observer);
}

static int compare_levels(const void *x, const void *y) {
  const double a = *(const double *)x, b = *(const double *)y;
  return (a > b) - (a < b);
}

static size_t level_index(const panel_fit *f, double level) {
  const double *found =
      bsearch(&level, f->level, f->n_points, sizeof level, compare_levels);
  return (size_t)(found - f->level);
}

static void set_levels(const answers *a, panel_fit *f) {
  size_t n = 0;
  for (size_t i = 0; i < a->n; ++i) {
    if (is_of(a, i, f))
      f->level[n++] = a->level[i];
  }
  qsort(f->level, n, sizeof *f->level, compare_levels);
  f->n_points = 0;
  for (size_t i = 0; i < n; ++i) {
    if (i == 0 || f->level[i] > f->level[i - 1])
      f->level[f->n_points++] = f->level[i];
  }
}

static ef_status count(const answers *a, panel_fit *f, ef_error *error) {
  size_t n = 0;
  for (size_t i = 0; i < a->n; ++i)
    n += is_of(a, i, f);
  f->level = malloc((n > 0 ? n : 1) * sizeof *f->level);
  f->shown = calloc(n > 0 ? n : 1, sizeof *f->shown);
  f->positive = calloc(n > 0 ? n : 1, sizeof *f->positive);
  if (f->level == NULL || f->shown == NULL || f->positive == NULL)
    return out_of_memory(error);
  set_levels(a, f);
  for (size_t i = 0; i < a->n; ++i) {
    if (!is_of(a, i, f))
      continue;
    const size_t at = level_index(f, a->level[i]);
    f->shown[at] += a->shown[i];
    f->positive[at] += a->positive[i];
    f->n_trials += a->shown[i];
  }
  return EF_OK;
}

/* Level 0 shows no difference: what is answered there are false alarms. */
static ef_status see_apart(const answers *a, panel_fit *f, ef_error *error) {
  const bool is_yes_no = a->task == EF_TASK_YES_NO;
  if (!is_yes_no && a->task != EF_TASK_SAME_DIFFERENT)
    return EF_OK;
  size_t blank = 0;
  while (blank < f->n_points && f->level[blank] != 0.0)
    ++blank;
  if (blank == f->n_points)
    return EF_OK;
  f->sensitivity = calloc(f->n_points, sizeof *f->sensitivity);
  if (f->sensitivity == NULL)
    return out_of_memory(error);
  ef_status status = EF_OK;
  for (size_t i = 0; i < f->n_points && status == EF_OK; ++i) {
    status = is_yes_no
                 ? ef_sensitivity_yes_no(f->shown[i], f->positive[i],
                                         f->shown[blank], f->positive[blank],
                                         &f->sensitivity[i], error)
                 : ef_sensitivity_same_different(
                       f->shown[i], f->positive[i], f->shown[blank],
                       f->positive[blank], &f->sensitivity[i], error);
  }
  return status;
}

/* Leaning to one of two places; nothing to say where places are not known. */
static ef_status see_bias(const answers *a, panel_fit *f, ef_error *error) {
  if (!a->has_place || a->task != EF_TASK_2IFC)
    return EF_OK;
  const size_t n = f->n_points;
  size_t *all = calloc(4 * n, sizeof *all);
  if (all == NULL)
    return out_of_memory(error);
  for (size_t i = 0; i < a->n; ++i) {
    if (!is_of(a, i, f))
      continue;
    size_t *at = all + level_index(f, a->level[i]);
    at += a->place[i] == PLACE_SECOND ? 2 * n : 0;
    at[0] += a->shown[i];
    at[n] += a->positive[i];
  }
  ef_error reason;
  f->has_bias = ef_place_bias_measure(n, all, all + n, all + 2 * n, all + 3 * n,
                                      &f->bias, &reason) == EF_OK;
  free(all);
  return EF_OK;
}

static ef_status fit_one(panel_fits *p, panel_fit *f, ef_error *error) {
  const answers *a = &p->answers;
  ef_status status = count(a, f, error);
  if (status == EF_OK)
    status = see_apart(a, f, error);
  if (status == EF_OK)
    status = see_bias(a, f, error);
  if (status != EF_OK)
    return status;
  const ef_responses responses = {f->n_points, f->level, f->shown, f->positive};
  ef_error reason;
  f->status = ef_fit_responses(&responses, &p->settings, &f->fit, &reason);
  if (f->status == EF_OK) {
    f->status = ef_fit_intervals(&responses, &p->settings, &p->intervals,
                                 &f->fit, &f->goodness, &reason);
  }
  if (f->status == EF_OK) {
    p->n_found++;
    return EF_OK;
  }
  snprintf(f->reason, sizeof f->reason, "%s", reason.message);
  if (f->status == EF_NO_ANSWER)
    return EF_OK;
  /* What does not go together are the options: wrong usage. */
  return message_fail(error,
                      f->status == EF_INVALID ? EF_UNKNOWN_NAME : f->status,
                      "%s", reason.message);
}

/* ---- All curves -------------------------------------------------------- */

static bool has_rows(const answers *a, const panel_fit *f) {
  for (size_t i = 0; i < a->n; ++i) {
    if (is_of(a, i, f))
      return true;
  }
  return false;
}

static ef_status add_fit(panel_fits *p, panel_fit f, ef_error *error) {
  if (!has_rows(&p->answers, &f))
    return EF_OK;
  panel_fit *kept = &p->fit[p->n++];
  *kept = f;
  return fit_one(p, kept, error);
}

static ef_status fit_condition(panel_fits *p, size_t condition,
                               ef_error *error) {
  const size_t n_observers =
      p->answers.observers.n > 0 ? p->answers.observers.n : 1;
  const size_t before = p->n;
  ef_status status = EF_OK;
  for (size_t i = 0; i < n_observers && status == EF_OK; ++i) {
    status = add_fit(p, (panel_fit){.observer = i, .condition = condition},
                     error);
  }
  if (status == EF_OK && p->n - before > 1) {
    status = add_fit(
        p, (panel_fit){.condition = condition, .is_pooled = true}, error);
  }
  return status;
}

/* ---- Groups ------------------------------------------------------------ */

/* Values of the observers of a condition, with standard errors behind. */
static size_t gather(const panel_fits *p, size_t condition, panel_figure figure,
                     double *value, double *se) {
  size_t n = 0;
  for (size_t i = 0; i < p->n; ++i) {
    const panel_fit *f = &p->fit[i];
    if (f->condition != condition || f->is_pooled || f->status != EF_OK)
      continue;
    const ef_estimate e = figure == PANEL_THRESHOLD ? f->fit.threshold
                          : figure == PANEL_JND     ? f->fit.jnd
                                                    : f->fit.equality;
    if (!isfinite(e.value))
      continue;
    value[n] = e.value;
    se[n++] = e.se;
  }
  return n;
}

static ef_status summarise(panel_fits *p, size_t condition, ef_error *error) {
  panel_summary *s = &p->summary[p->n_summaries++];
  *s = (panel_summary){.condition = condition};
  double *value = malloc(2 * p->n * sizeof *value);
  if (value == NULL)
    return out_of_memory(error);
  double *se = value + p->n;
  ef_error reason;
  for (size_t i = 0; i < p->n; ++i) {
    s->n_observers +=
        p->fit[i].condition == condition && !p->fit[i].is_pooled ? 1 : 0;
  }
  const double level = p->intervals.level;
  size_t n = gather(p, condition, PANEL_THRESHOLD, value, se);
  s->has_threshold = ef_group_summary(n, value, se, EF_GROUP_RESTRICTED, level,
                                      NULL, &s->threshold, &reason) == EF_OK;
  n = gather(p, condition, PANEL_JND, value, se);
  s->has_jnd = ef_group_summary(n, value, se, EF_GROUP_RESTRICTED, level, NULL,
                                &s->jnd, &reason) == EF_OK;
  n = gather(p, condition, PANEL_EQUALITY, value, se);
  s->has_equality =
      n > 1 && ef_adjustment_summary(n, value, 0.0, &s->equality, &reason) ==
                   EF_OK;
  free(value);
  return EF_OK;
}

const panel_fit *panel_fits_whole(const panel_fits *p, size_t condition) {
  const panel_fit *whole = NULL;
  for (size_t i = 0; i < p->n; ++i) {
    if (p->fit[i].condition == condition)
      whole = &p->fit[i]; /* the pooled one comes last */
  }
  return whole;
}

ef_estimate panel_fits_value(const panel_fits *p, size_t condition,
                             panel_figure figure, bool *is_group) {
  const panel_summary *s = &p->summary[condition];
  const panel_fit *whole = panel_fits_whole(p, s->condition);
  const bool has = figure == PANEL_THRESHOLD ? s->has_threshold
                   : figure == PANEL_JND     ? s->has_jnd
                                             : s->has_equality;
  const size_t n = figure == PANEL_THRESHOLD ? s->threshold.n
                   : figure == PANEL_JND     ? s->jnd.n
                                             : s->equality.n;
  *is_group = has && n >= PANEL_LEAST_OBSERVERS;
  if (*is_group) {
    return figure == PANEL_THRESHOLD ? s->threshold.mean
           : figure == PANEL_JND     ? s->jnd.mean
                                     : s->equality.equality;
  }
  if (whole == NULL || whole->status != EF_OK) {
    return (ef_estimate){(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  }
  return figure == PANEL_THRESHOLD ? whole->fit.threshold
         : figure == PANEL_JND     ? whole->fit.jnd
                                   : whole->fit.equality;
}

/* ---- Loading ----------------------------------------------------------- */

static ef_status set_fit(panel_fits *p, ef_error *error) {
  const command_options *o = p->options;
  p->settings = ef_fit_settings_default(p->answers.task);
  p->settings.shape = panel_shape(o, &p->answers);
  p->settings.axis = panel_axis(o, p->settings.shape);
  p->settings.lapse = o->lapse;
  p->intervals = panel_intervals(o);
  const ef_status status =
      panel_check_levels(&p->answers, p->settings.axis, error);
  return status == EF_OK ? panel_criterion(o, p->answers.task,
                                           &p->settings.criterion, error)
                         : status;
}

static void note_task(const panel_fits *p, const ef_notes *notes) {
  const ef_task task = p->answers.task;
  const answers *a = &p->answers;
  if (isnan(ef_task_chance(task)) && p->settings.shape != EF_SHAPE_DETECTION) {
    message_note(notes,
                 "a %s threshold moves with the observer's criterion: compare "
                 "d', not thresholds, between observers or conditions",
                 ef_task_name(task));
  }
  if (a->has_place && task != EF_TASK_2IFC) {
    message_note(notes,
                 "%s: the column place is used for 2ifc only, where there are "
                 "two places",
                 a->file);
  }
}

/* When nothing has a threshold, the whole's reason is the answer. */
static ef_status refuse(const panel_fits *p, ef_error *error) {
  const panel_fit *whole = panel_fits_whole(p, p->fit[0].condition);
  message_fail(error, EF_NO_ANSWER, "no threshold: %.400s", whole->reason);
  return message_place(error, p->answers.file);
}

ef_status panel_fits_load(panel_fits *p, const command_options *options,
                          const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *p = (panel_fits){.options = options, .is_demo = o->n_files < 2};
  const char *task = o->task == NULL && p->is_demo ? demo_task : o->task;
  const answers_need need = {.task = task};
  ef_status status =
      answers_read(&p->answers, p->is_demo ? demo_answers : o->files[1], &need,
                   false, notes, error);
  if (status == EF_OK)
    status = set_fit(p, error);
  if (status != EF_OK)
    return status;
  const answers *a = &p->answers;
  const size_t n_conditions = a->conditions.n > 0 ? a->conditions.n : 1;
  const size_t n_observers = a->observers.n > 0 ? a->observers.n : 1;
  p->fit = calloc(n_conditions * (n_observers + 1), sizeof *p->fit);
  p->summary = calloc(n_conditions, sizeof *p->summary);
  if (p->fit == NULL || p->summary == NULL)
    return out_of_memory(error);
  note_task(p, notes);
  for (size_t c = 0; c < n_conditions && status == EF_OK; ++c)
    status = fit_condition(p, c, error);
  for (size_t c = 0; c < n_conditions && status == EF_OK; ++c)
    status = summarise(p, c, error);
  if (status == EF_OK && p->n_found == 0)
    status = refuse(p, error);
  return status;
}

void panel_fits_free(panel_fits *p) {
  for (size_t i = 0; i < p->n; ++i) {
    free(p->fit[i].level);
    free(p->fit[i].shown);
    free(p->fit[i].positive);
    free(p->fit[i].sensitivity);
  }
  free(p->fit);
  free(p->summary);
  answers_free(&p->answers);
}
