/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Where on a fitted curve threshold, equality and JND stand. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>

/* A level of 0 is among those of a linear axis. */
static bool has_zero(const ef__data *data) {
  for (size_t i = 0; i < data->n; ++i) {
    const double t = data->centre + data->scale * data->t[i];
    if (fabs(t) <= 8 * DBL_EPSILON * (fabs(data->centre) + data->scale))
      return true;
  }
  return false;
}

/* The JND of tasks whose lower end is the observer's own: whether anything is
 * known about false alarms. */
static void read_alarms(const ef__likelihood *likelihood, ef__reading *out) {
  const ef__data *const data = likelihood->data;
  if (out->axis == EF_AXIS_LOG) {
    if (data->has_blank || likelihood->low[EF__GUESS] > 0)
      out->jnd = EF__JND_BY_ALARMS;
    return;
  }
  if (has_zero(data)) {
    out->jnd = EF__JND_BY_ALARMS;
    out->zero = -data->centre / data->scale;
  }
}

ef__reading ef__reading_new(const ef__likelihood *likelihood,
                            const ef_fit_settings *settings) {
  const ef__model *const model = &likelihood->model;
  ef__reading out = {.axis = settings->axis,
                     .eta_equality = (double)NAN,
                     .eta_low = (double)NAN,
                     .eta_high = (double)NAN,
                     .jnd = EF__JND_NONE,
                     .eta_jnd = (double)NAN,
                     .zero = -(double)INFINITY};
  if (ef__model_has_criterion(model)) {
    out.eta_threshold = 0; /* d' = 1 */
    out.jnd = EF__JND_AT_ETA;
    out.eta_jnd = log(EF_JND_D_PRIME);
    return out;
  }
  const double chance = ef_task_chance(model->task);
  /* Right answers by guessing count in a proportion correct; the lower end of
   * the other tasks is left out, as lapses are. */
  const double guess = chance > 0 ? likelihood->low[EF__GUESS] : 0;
  const double f = (ef__criterion(settings) - guess) / (1 - guess);
  out.eta_threshold = ef__model_core_eta(model, f);
  if (chance > 0) {
    const double share = ef_task_proportion(model->task, 0, EF_JND_D_PRIME);
    out.eta_jnd = ef__model_core_eta(model, (share - guess) / (1 - guess));
    out.jnd = isnan(out.eta_jnd) ? EF__JND_NONE : EF__JND_AT_ETA;
  } else if (model->task == EF_TASK_GREATER_LESS) {
    out.eta_equality = ef__model_core_eta(model, 0.5);
    out.eta_low = ef__model_core_eta(model, 1 - EF_JND_PROPORTION);
    out.eta_high = ef__model_core_eta(model, EF_JND_PROPORTION);
    out.jnd = EF__JND_RANGE;
  } else {
    read_alarms(likelihood, &out);
  }
  return out;
}

static double level_at(const ef__reading *reading, const ef__data *data,
                       const double *theta, double eta) {
  const double t = (eta - theta[EF__INTERCEPT]) / theta[EF__SLOPE];
  return ef__axis_level(reading->axis, data->centre + data->scale * t);
}

/* eta of d' = EF_JND_D_PRIME above the answers to level 0. */
static double eta_above_alarms(const ef__reading *reading,
                               const ef__likelihood *likelihood,
                               const double *theta) {
  const ef__model *const model = &likelihood->model;
  const double guess = theta[EF__GUESS];
  const bool is_blank = isinf(reading->zero);
  const double eta =
      is_blank ? 0 : theta[EF__INTERCEPT] + theta[EF__SLOPE] * reading->zero;
  double alarms, rest;
  ef__model_share(model, eta, is_blank, guess, 0, &alarms, &rest);
  const double share = ef_task_proportion(model->task, alarms, EF_JND_D_PRIME);
  return ef__model_core_eta(model, (share - guess) / (1 - guess));
}

double ef__reading_jnd(const ef__reading *reading,
                       const ef__likelihood *likelihood, const double *theta) {
  const ef__data *const data = likelihood->data;
  switch (reading->jnd) {
  case EF__JND_AT_ETA:
    return level_at(reading, data, theta, reading->eta_jnd);
  case EF__JND_RANGE:
    return 0.5 * (level_at(reading, data, theta, reading->eta_high) -
                  level_at(reading, data, theta, reading->eta_low));
  case EF__JND_BY_ALARMS:
    return level_at(reading, data, theta,
                    eta_above_alarms(reading, likelihood, theta));
  case EF__JND_NONE:
    break;
  }
  return (double)NAN;
}
