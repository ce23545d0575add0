/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How many trials, how many observers. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_sort.h>

static const char *const procedure_names[] = {
    [EF_PROCEDURE_CONSTANT] = "constant",
    [EF_PROCEDURE_UP_DOWN] = "up-down",
    [EF_PROCEDURE_ADAPTIVE] = "adaptive",
};

const char *ef_procedure_name(ef_procedure procedure) {
  return procedure <= EF_PROCEDURE_ADAPTIVE ? procedure_names[procedure]
                                            : "unknown";
}

static bool is_signed(ef_task task) {
  return task == EF_TASK_GREATER_LESS;
}

ef_plan_settings ef_plan_settings_default(ef_task task, double jnd) {
  /* Where three or two pairs are looked at, d' of 1 leaves most answers wrong:
   * the curve lies at larger differences. */
  const bool is_late =
      task == EF_TASK_TRIANGLE || task == EF_TASK_SAME_DIFFERENT;
  return (ef_plan_settings){
      .task = task,
      .shape = is_signed(task) ? EF_SHAPE_GAUSSIAN : EF_SHAPE_DETECTION,
      .axis = is_signed(task) ? EF_AXIS_LINEAR : EF_AXIS_LOG,
      .jnd = jnd,
      .exponent = 1,
      .lapse = 0.01,
      .false_alarms = 0.1,
      .uncertainty = 0.3,
      .spread = 0.3,
      .n_levels = 7,
      .n_in_hand = 15,
      .lowest = is_signed(task) ? -2.5
                : is_late       ? 0.7
                                : 0.4,
      .highest = is_signed(task) ? 2.5
                 : is_late       ? 5
                                 : 3,
      .rule = ef_up_down_default(),
      .other_jnd = (double)NAN,
      .n_experiments = 1000,
      .seed = 1};
}

/* ---- Checks -------------------------------------------------------------- */

static bool has_alarms(ef_task task) {
  return task == EF_TASK_YES_NO || task == EF_TASK_SAME_DIFFERENT;
}

static ef_status check_task(const ef_plan_settings *s, ef_procedure procedure,
                            ef_error *error) {
  const char *const name = ef_task_name(s->task);
  if (s->axis != (is_signed(s->task) ? EF_AXIS_LINEAR : EF_AXIS_LOG)) {
    return ef__error_set(error, EF_INVALID, "plans of %s are made on a %s axis",
                         name, is_signed(s->task) ? "linear" : "logarithmic");
  }
  if (has_alarms(s->task) && s->shape != EF_SHAPE_DETECTION) {
    return ef__error_set(error, EF_INVALID,
                         "plans of %s use the detection curve: other "
                         "thresholds move with the criterion",
                         name);
  }
  if (procedure != EF_PROCEDURE_UP_DOWN)
    return EF_OK;
  if (has_alarms(s->task) || is_signed(s->task)) {
    return ef__error_set(error, EF_INVALID,
                         "an up-down run needs answers that are right or "
                         "wrong: 2ifc or triangle, not %s",
                         name);
  }
  const double target = ef_up_down_target(&s->rule);
  if (!(target > ef_task_chance(s->task))) {
    return ef__error_set(error, EF_INVALID,
                         "the up-down rule rests at %.3g right answers, "
                         "expected above chance; counts are at least 1, steps "
                         "above 1",
                         target);
  }
  return EF_OK;
}

static ef_status check_numbers(const ef_plan_settings *s, ef_error *error) {
  if (!(s->jnd > 0) || !isfinite(s->jnd)) {
    return ef__error_set(error, EF_INVALID,
                         "expected JND is %g, expected a number above 0",
                         s->jnd);
  }
  const bool is_range =
      s->lowest < s->highest && (is_signed(s->task) || s->lowest > 0);
  if (s->n_levels < 2 || s->n_in_hand < 2 || !is_range) {
    return ef__error_set(error, EF_INVALID,
                         "%zu levels (%zu in hand) from %g to %g JND: expected "
                         "at least two, the lowest first%s",
                         s->n_levels, s->n_in_hand, s->lowest, s->highest,
                         is_signed(s->task) ? "" : " and above 0");
  }
  const bool is_observer = s->lapse >= 0 && s->lapse <= 0.06 &&
                           s->exponent > 0 && s->uncertainty >= 0 &&
                           s->false_alarms > 0 && s->false_alarms < 0.9;
  if (!is_observer) {
    return ef__error_set(error, EF_INVALID,
                         "observers with lapses %g (0 to 0.06), exponent %g "
                         "(above 0), uncertainty %g (at least 0), false alarms "
                         "%g (between 0 and 0.9)",
                         s->lapse, s->exponent, s->uncertainty,
                         s->false_alarms);
  }
  if (s->n_experiments < 40) {
    return ef__error_set(error, EF_INVALID,
                         "%zu experiments, expected at least 40 for a middle "
                         "95 %%",
                         s->n_experiments);
  }
  return EF_OK;
}

/* ---- Rows ---------------------------------------------------------------- */

static double at_rank(const double *sorted, size_t n, double rank) {
  if (rank < 1)
    return 0;
  if (rank > (double)n)
    return (double)INFINITY;
  const size_t i = (size_t)rank;
  const double part = rank - (double)i;
  if (i == n || !(part > 0))
    return sorted[i - 1];
  return sorted[i - 1] + part * (sorted[i] - sorted[i - 1]);
}

static void summarise(const ef__design *d, ef_plan_row *out) {
  const ef_plan_settings *const s = d->settings;
  double *const ratio = d->ratio;
  size_t n = 0;
  for (size_t i = 0; i < s->n_experiments; ++i) {
    if (ratio[i] > 0 && isfinite(ratio[i]))
      ratio[n++] = ratio[i];
  }
  gsl_sort(ratio, 1, n);
  out->procedure = d->procedure;
  out->n_trials = d->n_trials;
  out->n_experiments = s->n_experiments;
  out->n_failed = s->n_experiments - n;
  const double ranks = (double)s->n_experiments + 1;
  const double before = 0.5 * (double)out->n_failed;
  out->median = at_rank(ratio, n, 0.5 * ranks - before);
  out->low = at_rank(ratio, n, 0.025 * ranks - before);
  out->high = at_rank(ratio, n, 0.975 * ranks - before);
  out->half_width = 0.5 * (out->high - out->low);
  /* Phi(-1) and Phi(1) */
  const double lower = at_rank(ratio, n, 0.15865525393145705 * ranks - before);
  const double upper = at_rank(ratio, n, 0.84134474606854293 * ranks - before);
  out->sd_ln = lower > 0 ? 0.5 * log(upper / lower) : (double)INFINITY;
  out->power = (double)NAN;
  if (isnan(s->other_jnd))
    return;
  const double factor = s->other_jnd / s->jnd;
  size_t n_told = 0;
  for (size_t i = 0; i < n; ++i)
    n_told += ratio[i] < factor * out->low || ratio[i] > factor * out->high;
  out->power = (double)n_told / (double)s->n_experiments;
}

ef_status ef_plan_simulate(const ef_plan_settings *settings,
                           ef_procedure procedure, size_t n_trials,
                           ef_plan_row *out, ef_error *error) {
  ef__gsl_ready();
  ef_status status = check_task(settings, procedure, error);
  if (status == EF_OK)
    status = check_numbers(settings, error);
  if (status != EF_OK)
    return status;
  ef__design design;
  void *block[3];
  status =
      ef__design_make(settings, procedure, n_trials, &design, block, error);
  if (status == EF_OK) {
    ef__design_run(&design);
    summarise(&design, out);
  }
  for (size_t i = 0; i < 3; ++i)
    free(block[i]);
  return status;
}

/* ---- Search -------------------------------------------------------------- */

/* Whole rounds of the levels where they are few. */
static size_t rounded(size_t n, size_t round) {
  return n < 20 * round ? (n + round - 1) / round * round : n;
}

ef_status ef_plan_search(const ef_plan_settings *settings,
                         ef_procedure procedure, double precision,
                         size_t most_trials, ef_plan_row *out,
                         ef_error *error) {
  if (!(precision > 0)) {
    return ef__error_set(error, EF_INVALID, "precision is %g, expected above 0",
                         precision);
  }
  const size_t round =
      procedure == EF_PROCEDURE_CONSTANT ? settings->n_levels : 5;
  size_t low = 0, high = 4 * round;
  for (;;) {
    if (high > most_trials)
      high = most_trials;
    const ef_status status =
        ef_plan_simulate(settings, procedure, high, out, error);
    if (status != EF_OK)
      return status;
    if (out->half_width <= precision)
      break;
    if (high == most_trials) {
      return ef__error_set(error, EF_NO_ANSWER,
                           "%zu trials of one observer give a precision of "
                           "%.2g (%s), not %g: allow more trials, or plan for "
                           "more observers",
                           high, out->half_width, ef_procedure_name(procedure),
                           precision);
    }
    low = high;
    high = rounded(2 * high, round);
  }
  while ((double)(high - low) > 0.08 * (double)high) {
    const size_t middle = rounded((low + high) / 2, round);
    if (middle <= low || middle >= high)
      break;
    ef_plan_row row;
    const ef_status status =
        ef_plan_simulate(settings, procedure, middle, &row, error);
    if (status != EF_OK)
      return status;
    if (row.half_width <= precision) {
      high = middle;
      *out = row;
    } else {
      low = middle;
    }
  }
  return EF_OK;
}

size_t ef_plan_observers(double spread, double sd_ln, double precision) {
  const double wanted = log1p(precision);
  const double sd = hypot(spread, sd_ln);
  ef__gsl_ready();
  for (size_t n = 2; n <= 100000; n += n < 1000 ? 1 : n / 1000) {
    const double t = gsl_cdf_tdist_Pinv(0.975, (double)(n - 1));
    if (t * sd <= wanted * sqrt((double)n))
      return n;
  }
  return 0;
}

/* The noncentral t of the test, averaged over the standard deviation that the
 * sample happens to have: chi-square quantiles in the middle of 400 equal
 * parts, exact to some 1e-4. */
double ef_plan_power(double spread, double sd_ln, size_t n_observers,
                     double ratio) {
  enum { PARTS = 400 };
  if (n_observers < 2 || !(ratio > 0))
    return (double)NAN;
  ef__gsl_ready();
  const double degrees = (double)(n_observers - 1);
  const double limit = gsl_cdf_tdist_Pinv(0.975, degrees);
  const double away =
      fabs(log(ratio)) * sqrt((double)n_observers) / hypot(spread, sd_ln);
  double sum = 0;
  for (int i = 0; i < PARTS; ++i) {
    const double share = ((double)i + 0.5) / PARTS;
    const double sd = sqrt(gsl_cdf_chisq_Pinv(share, degrees) / degrees);
    sum += gsl_cdf_ugaussian_P(away - limit * sd) +
           gsl_cdf_ugaussian_P(-away - limit * sd);
  }
  return sum / PARTS;
}

void ef_plan_levels(const ef_plan_settings *settings, size_t n, double *level) {
  for (size_t i = 0; i < n; ++i)
    level[i] = ef__plan_level(settings, n, i);
}
