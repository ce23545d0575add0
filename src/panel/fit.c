/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Maximum-likelihood fit of a psychometric curve. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { M = EF__PARAMETERS };

ef_fit_settings ef_fit_settings_default(ef_task task) {
  return (ef_fit_settings){.task = task,
                           .shape = EF_SHAPE_GAUSSIAN,
                           .axis = EF_AXIS_LINEAR,
                           .guess = (double)NAN,
                           .lapse = (double)NAN,
                           .lapse_max = 0.06,
                           .width = (double)NAN,
                           .criterion = (double)NAN};
}

double ef__criterion(const ef_fit_settings *settings) {
  if (!isnan(settings->criterion))
    return settings->criterion;
  switch (settings->task) {
  case EF_TASK_2IFC:
    return EF_JND_PROPORTION;
  case EF_TASK_TRIANGLE:
    return 2.0 / 3; /* halfway between chance and perfect, as 3/4 in 2IFC */
  default:
    return 0.5;
  }
}

bool ef__is_estimated(const ef__likelihood *likelihood, size_t parameter) {
  return likelihood->low[parameter] < likelihood->high[parameter];
}

size_t ef__parameter_count(const ef__likelihood *likelihood) {
  size_t n = 0;
  for (size_t i = 0; i < M; ++i)
    n += ef__is_estimated(likelihood, i);
  return n;
}

/* ---- Settings ------------------------------------------------------------ */

static ef_status check_model(const ef_fit_settings *s, ef_error *error) {
  if ((size_t)s->task >= ef_task_count() || s->shape > EF_SHAPE_DETECTION ||
      s->axis > EF_AXIS_LOG) {
    return ef__error_set(error, EF_INVALID, "unknown task, shape or axis");
  }
  if (s->shape != EF_SHAPE_DETECTION)
    return EF_OK;
  if (s->task == EF_TASK_GREATER_LESS) {
    return ef__error_set(error, EF_INVALID,
                         "the detection curve is about differences without a "
                         "sign; greater-less has one: use gaussian");
  }
  if (s->axis != EF_AXIS_LOG) {
    return ef__error_set(error, EF_INVALID,
                         "the detection curve needs a logarithmic axis");
  }
  if (!isnan(s->guess) && !isnan(ef_task_chance(s->task))) {
    return ef__error_set(error, EF_INVALID,
                         "the detection curve of %s begins at chance: leave "
                         "the guess rate open",
                         ef_task_name(s->task));
  }
  return EF_OK;
}

/* NaN passes: it stands for "estimated" or "by the task". */
static ef_status check_share(const char *name, double value, double below,
                             ef_error *error) {
  if (isnan(value) || (value >= 0 && value < below))
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "%s is %g, expected at least 0 and below %g", name,
                       value, below);
}

static ef_status check_settings(const ef_fit_settings *s, double guess,
                                ef_error *error) {
  ef_status status = check_model(s, error);
  if (status == EF_OK)
    status = check_share("guess rate", s->guess, 1, error);
  /* In greater-less without a guess rate lapses stand at both ends. */
  const bool is_both = s->task == EF_TASK_GREATER_LESS && isnan(s->guess);
  const double room = is_both ? 0.5 : 1 - guess;
  if (status == EF_OK)
    status = check_share("lapse rate", s->lapse, room, error);
  if (status == EF_OK && isnan(s->lapse))
    status = check_share("largest lapse rate", s->lapse_max, room, error);
  if (status != EF_OK)
    return status;
  if (isnan(s->lapse) && isnan(s->lapse_max)) {
    return ef__error_set(error, EF_INVALID,
                         "the lapse rate is estimated, and has no limit");
  }
  if (!isnan(s->width) && !(s->width > 0 && isfinite(s->width))) {
    return ef__error_set(error, EF_INVALID,
                         "width is %g, expected a number above 0", s->width);
  }
  const double criterion = ef__criterion(s);
  const double lowest = ef_task_chance(s->task) > 0 ? guess : 0;
  if (!(criterion > lowest && criterion < 1)) {
    return ef__error_set(error, EF_INVALID,
                         "criterion is %g, expected a proportion above %g and "
                         "below 1",
                         criterion, lowest);
  }
  return EF_OK;
}

/* Guess rate by the task; NaN where it is to be estimated. */
static double guess_of(const ef_fit_settings *s, const ef__data *data) {
  if (!isnan(s->guess))
    return s->guess;
  const double chance = ef_task_chance(s->task);
  if (!isnan(chance))
    return chance;
  return data->has_blank ? (double)NAN : 0;
}

/* False-alarm rates of the criteria: yes-no 0.98 to 1e-9, same-different 0.97
 * to 1e-8. */
static void limit_guess(const ef__model *model, ef__likelihood *out) {
  out->low[EF__GUESS] = 0;
  out->high[EF__GUESS] = 0.95;
  if (!ef__model_has_criterion(model))
    return;
  out->low[EF__GUESS] = model->task == EF_TASK_YES_NO ? -2 : 0.05;
  out->high[EF__GUESS] = model->task == EF_TASK_YES_NO ? 6 : 8;
}

ef_status ef__likelihood_setup(const ef_fit_settings *s, const ef__data *data,
                               ef__likelihood *out, ef_error *error) {
  const double guess = guess_of(s, data);
  const ef_status status = check_settings(s, isnan(guess) ? 0 : guess, error);
  if (status != EF_OK)
    return status;
  out->model = (ef__model){s->shape, s->task,
                           s->task == EF_TASK_GREATER_LESS && isnan(s->guess)};
  out->data = data;
  /* eta beyond 1e4 is as good as infinite for every shape. */
  out->low[EF__INTERCEPT] = -1e4;
  out->high[EF__INTERCEPT] = 1e4;
  out->low[EF__SLOPE] = 0;
  /* Neighbouring levels 25 apart in eta: a step for every shape. */
  out->high[EF__SLOPE] = data->least_gap > 0 ? 25 / data->least_gap : 25;
  if (!isnan(s->width))
    out->low[EF__SLOPE] = out->high[EF__SLOPE] = data->scale / s->width;
  limit_guess(&out->model, out);
  if (!isnan(guess)) {
    if (ef__model_has_criterion(&out->model) && !(guess > 0)) {
      return ef__error_set(
          error, EF_NO_ANSWER,
          "no blanks: %s gives d' only when the answers to level 0 (no "
          "difference) are known; show blanks, or give the false-alarm rate",
          ef_task_name(s->task));
    }
    out->low[EF__GUESS] = out->high[EF__GUESS] =
        ef__model_guess(&out->model, guess);
  }
  out->low[EF__LAPSE] = isnan(s->lapse) ? 0 : s->lapse;
  out->high[EF__LAPSE] = isnan(s->lapse) ? s->lapse_max : s->lapse;
  return EF_OK;
}

/* ---- Fit ----------------------------------------------------------------- */

static void note_step(const ef_fit_settings *s, const ef_fit *fit) {
  if (fit->bracket_low < fit->bracket_high) {
    ef__note(s->notes,
             "the answers are separated: they change all at once between "
             "levels %.6g and %.6g, so the slope has no finite estimate and "
             "the threshold may lie anywhere between; show levels there",
             fit->bracket_low, fit->bracket_high);
  } else {
    ef__note(s->notes,
             "the answers are separated: they change all at once at level "
             "%.6g, so the slope has no finite estimate; show levels close to "
             "it on both sides",
             fit->bracket_low);
  }
}

static void note_fit(const ef_fit_settings *s, const ef_fit *fit) {
  if (fit->support == EF_SUPPORT_STEP)
    note_step(s, fit);
  if (s->shape != EF_SHAPE_DETECTION &&
      (s->task == EF_TASK_YES_NO || s->task == EF_TASK_SAME_DIFFERENT)) {
    ef__note(s->notes,
             "a %s threshold moves with the observer's criterion: compare d', "
             "not thresholds, between observers or conditions",
             ef_task_name(s->task));
    if (isnan(fit->jnd.value)) {
      ef__note(s->notes,
               "no blanks were shown (level 0): no false-alarm rate, so no d' "
               "and no JND");
    }
  }
  if (fit->guess_estimated) {
    ef__note(s->notes, "guess rate estimated from the blanks: %.4g",
             fit->guess.value);
  }
  if (fit->lapse_at_limit) {
    ef__note(s->notes,
             "the lapse rate is at its limit %g: the observer may not have "
             "attended, or the curve has another shape",
             s->lapse_max);
  }
  if (fit->extrapolated) {
    ef__note(s->notes,
             "the threshold %.4g lies outside the levels shown: it rests on "
             "the shape of the curve",
             fit->threshold.value);
  }
}

static ef_status fit_data(const ef__likelihood *likelihood,
                          const ef_fit_settings *settings, ef_fit *out,
                          ef_error *error) {
  ef__verdict verdict = ef__support_before(likelihood);
  out->support = verdict.support;
  if (verdict.support != EF_SUPPORT_FULL)
    return ef__support_error(likelihood, settings, &verdict, error);
  ef__minimum best;
  ef__maximise(likelihood, NULL, false, EF__TOLERANCE, &best);
  verdict = ef__support_after(likelihood, &best);
  ef__fit_describe(likelihood, settings, &best, out);
  out->support = verdict.support;
  if (verdict.support == EF_SUPPORT_STEP)
    ef__fit_describe_step(likelihood, &verdict, out);
  else if (verdict.support != EF_SUPPORT_FULL)
    return ef__support_error(likelihood, settings, &verdict, error);
  note_fit(settings, out);
  return EF_OK;
}

static void clear_fit(ef_fit *out) {
  const ef_estimate none = {(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  memset(out, 0, sizeof *out);
  out->curve.location = out->curve.width = (double)NAN;
  out->curve.guess = out->curve.lapse = (double)NAN;
  out->bracket_low = out->bracket_high = (double)NAN;
  out->intercept = out->slope = (double)NAN;
  out->se_intercept = out->se_slope = (double)NAN;
  out->threshold = out->equality = out->jnd = out->sigma = none;
  out->exponent = out->guess = out->lapse = none;
  out->log_likelihood = out->deviance = out->pearson = (double)NAN;
}

ef_status ef_fit_responses(const ef_responses *responses,
                           const ef_fit_settings *settings, ef_fit *out,
                           ef_error *error) {
  ef__gsl_ready();
  clear_fit(out);
  ef_status status = check_model(settings, error);
  if (status != EF_OK)
    return status;
  ef__data data;
  void *block;
  status = ef__data_new(responses, settings->axis, &data, &block, error);
  if (status != EF_OK)
    return status;
  ef__likelihood likelihood;
  status = ef__likelihood_setup(settings, &data, &likelihood, error);
  if (status == EF_OK)
    status = fit_data(&likelihood, settings, out, error);
  free(block);
  return status;
}
