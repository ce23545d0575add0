/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Intervals of a fit, and whether the curve fits at all. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_sort.h>

#define LN_10 2.30258509299404568402

enum { M = EF__PARAMETERS };

ef_interval_settings ef_interval_settings_default(void) {
  return (ef_interval_settings){.method = EF_INTERVAL_PROFILE,
                                .level = 0.95,
                                .n_samples = 2000,
                                .seed = 1,
                                .widen = true,
                                .jobs = 0};
}

/* All that the two methods need. */
typedef struct task {
  const ef__likelihood *likelihood;
  const ef__minimum *best;
  const ef__reading *reading;
  const ef_interval_settings *settings;
  double stretch; /* of distances, against the normal quantile */
  ef_fit *fit;
} task;

/* ---- Goodness ------------------------------------------------------------ */

static void judge(const ef_fit *fit, const ef__samples *samples,
                  ef_goodness *out) {
  *out = (ef_goodness){.p_value = (double)NAN,
                       .dispersion = (double)NAN,
                       .widened_by = 1,
                       .n_samples = samples->n,
                       .n_failed = samples->n_failed};
  if (fit->degrees == 0)
    return;
  const double degrees = (double)fit->degrees;
  out->dispersion = fit->pearson / degrees;
  if (samples->n == 0) {
    out->p_value = gsl_cdf_chisq_Q(fit->deviance, degrees);
  } else {
    size_t n_above = 0;
    /* Equal but for rounding is "at least as large". */
    const double bar = fit->deviance - 1e-9 * (1 + fit->deviance);
    for (size_t i = 0; i < samples->n; ++i)
      n_above += samples->deviance[i] >= bar;
    out->p_value = (double)(n_above + 1) / (double)(samples->n + 1);
  }
  out->is_overdispersed = out->p_value < 0.05 && out->dispersion > 1;
}

static double normal_quantile(double level) {
  return gsl_cdf_ugaussian_Pinv(0.5 * (1 + level));
}

static double widening(const ef_fit *fit, double level,
                       const ef_goodness *goodness) {
  const double t = gsl_cdf_tdist_Pinv(0.5 * (1 + level), (double)fit->degrees);
  return sqrt(goodness->dispersion) * t / normal_quantile(level);
}

/* ---- Profile ------------------------------------------------------------- */

static void profile(const task *t, const ef__profile *what, double estimate,
                    double se, double *low, double *high) {
  const double z = t->stretch * normal_quantile(t->settings->level);
  ef__profile_limits(t->likelihood, t->best, what, t->reading->axis, estimate,
                     z * se, 0.5 * z * z, low, high);
}

/* Level where F^-1 is eta. */
static void profile_level(const task *t, double eta, ef_estimate *out) {
  const ef__data *const data = t->likelihood->data;
  const ef_axis axis = t->reading->axis;
  const ef__profile what = {.what = EF__PROFILE_ETA, .eta = eta};
  const double at =
      (ef__axis_value(axis, out->value) - data->centre) / data->scale;
  const double by_level = axis == EF_AXIS_LOG ? 1 / (LN_10 * out->value) : 1;
  profile(t, &what, at, out->se * by_level / data->scale, &out->low,
          &out->high);
  out->low = ef__axis_level(axis, data->centre + data->scale * out->low);
  out->high = ef__axis_level(axis, data->centre + data->scale * out->high);
}

static void profile_range(const task *t, ef_estimate *out) {
  const ef__profile what = {.what = EF__PROFILE_RANGE,
                            .eta_low = t->reading->eta_low,
                            .eta_high = t->reading->eta_high};
  profile(t, &what, log(out->value), out->se / out->value, &out->low,
          &out->high);
  out->low = exp(out->low);
  out->high = exp(out->high);
}

/* Limits of the slope, and of what is proportional to it or its inverse. A
 * slope at its bound is a step: infinite. */
static void profile_slope(const task *t, double *low, double *high) {
  const ef_fit *const fit = t->fit;
  const ef__profile what = {.what = EF__PROFILE_SLOPE};
  const double slope = t->best->x[EF__SLOPE];
  profile(t, &what, log(slope), fit->se_slope / fit->slope, low, high);
  *high = *high >= log(t->likelihood->high[EF__SLOPE]) ? (double)INFINITY
                                                       : exp(*high);
  *low = exp(*low);
  *low /= t->likelihood->data->scale;
  *high /= t->likelihood->data->scale;
}

static void profile_asymptotes(const task *t) {
  ef_fit *const fit = t->fit;
  const ef__model *const model = &t->likelihood->model;
  if (fit->lapse_estimated) {
    const ef__profile what = {.what = EF__PROFILE_LAPSE};
    profile(t, &what, fit->lapse.value, fit->lapse.se, &fit->lapse.low,
            &fit->lapse.high);
  }
  if (!fit->guess_estimated)
    return;
  const ef__profile what = {.what = EF__PROFILE_GUESS};
  double low, high;
  profile(t, &what, t->best->x[EF__GUESS], 0.1, &low, &high);
  low = ef__model_guess_rate(model, low);
  high = ef__model_guess_rate(model, high);
  fit->guess.low = fmin(low, high); /* the rate falls as the criterion grows */
  fit->guess.high = fmax(low, high);
}

static void profile_all(const task *t) {
  ef_fit *const fit = t->fit;
  const ef__reading *const reading = t->reading;
  const bool is_log = reading->axis == EF_AXIS_LOG;
  profile_level(t, reading->eta_threshold, &fit->threshold);
  if (!isnan(reading->eta_equality))
    profile_level(t, reading->eta_equality, &fit->equality);
  profile_asymptotes(t);
  double low = fit->slope, high = fit->slope;
  if (ef__is_estimated(t->likelihood, EF__SLOPE)) {
    profile_slope(t, &low, &high);
    const double deviation = ef__shape_deviation(fit->curve.shape);
    fit->sigma.low = deviation / high; /* NaN for detection */
    fit->sigma.high = deviation / low;
    if (!isnan(fit->exponent.value)) {
      fit->exponent.low = low / LN_10;
      fit->exponent.high = high / LN_10;
    }
  }
  if (reading->jnd == EF__JND_AT_ETA) {
    profile_level(t, reading->eta_jnd, &fit->jnd);
  } else if (reading->jnd == EF__JND_RANGE) {
    const double half = 0.5 * (reading->eta_high - reading->eta_low);
    fit->jnd.low = half / high;
    fit->jnd.high = half / low;
    if (is_log && fit->support == EF_SUPPORT_FULL)
      profile_range(t, &fit->jnd);
  }
}

/* ---- Bootstrap ------------------------------------------------------------
 */

/* Value of rank `rank` (1 to n_good, between two of them in proportion) of
 * sorted values; beyond them infinite when some failed, else the end. */
static double at_rank(const double *value, size_t n_good, size_t n_failed,
                      double rank) {
  if (rank < 1)
    return n_failed > 0 ? -(double)INFINITY : value[0];
  if (rank > (double)n_good)
    return n_failed > 0 ? (double)INFINITY : value[n_good - 1];
  const size_t i = (size_t)rank;
  const double part = rank - (double)i;
  const double below = value[i - 1];
  /* Equal neighbours may both be infinite. */
  if (!(part > 0) || i == n_good || value[i] == below)
    return below;
  return below + part * (value[i] - below);
}

/* How far the estimate stands from the middle of its samples, as a normal
 * deviate: 0 for no bias. */
static double bias_of(const double *value, size_t n_good, double estimate) {
  double below = 0;
  for (size_t i = 0; i < n_good; ++i)
    below += value[i] < estimate ? 1 : value[i] == estimate ? 0.5 : 0;
  const double share = (below + 0.5) / ((double)n_good + 1);
  return gsl_cdf_ugaussian_Pinv(share);
}

/* Bias-corrected percentiles (Efron, Can. J. Statist. 9 (1981) 139) of n values
 * of which the last n_failed are NaN; these count half at either end. */
static void percentiles(const task *t, double *value, size_t n, size_t n_failed,
                        double estimate, double *low, double *high) {
  const size_t n_good = n - n_failed;
  *low = -(double)INFINITY;
  *high = (double)INFINITY;
  if (n_good == 0)
    return;
  gsl_sort(value, 1, n_good);
  const double bias = isnan(estimate) ? 0 : bias_of(value, n_good, estimate);
  const double z = normal_quantile(t->settings->level);
  const double before = 0.5 * (double)n_failed;
  const double ranks = (double)n + 1;
  *low = at_rank(value, n_good, n_failed,
                 gsl_cdf_ugaussian_P(2 * bias - z) * ranks - before);
  *high = at_rank(value, n_good, n_failed,
                  gsl_cdf_ugaussian_P(2 * bias + z) * ranks - before);
}

/* Moves failures, which are NaN, to the end. */
static void failures_last(double *value, size_t n) {
  size_t n_good = 0;
  for (size_t i = 0; i < n; ++i) {
    if (!isnan(value[i]))
      value[n_good++] = value[i];
  }
  for (size_t i = n_good; i < n; ++i)
    value[i] = (double)NAN;
}

/* Lapses pile up at their limit, and what is fitted beside them is biased one
 * way below it and another way at it. A correction then does harm (coverage
 * 92 % instead of 94 % in a 2IFC design): plain percentiles. */
static void bounds(const task *t, double *value, const ef__samples *samples,
                   double estimate, double *low, double *high) {
  failures_last(value, samples->n);
  percentiles(t, value, samples->n, samples->n_failed,
              t->fit->lapse_estimated ? (double)NAN : estimate, low, high);
}

static double stretched(double estimate, double limit, double stretch) {
  return isfinite(limit) ? estimate + stretch * (limit - estimate) : limit;
}

/* In the scaled t, then levels. */
static void bootstrap_level(const task *t, double *value,
                            const ef__samples *samples, ef_estimate *out) {
  const ef__data *const data = t->likelihood->data;
  const ef_axis axis = t->reading->axis;
  const double at =
      (ef__axis_value(axis, out->value) - data->centre) / data->scale;
  double low, high;
  bounds(t, value, samples, at, &low, &high);
  low = stretched(at, low, t->stretch);
  high = stretched(at, high, t->stretch);
  out->low = ef__axis_level(axis, data->centre + data->scale * low);
  out->high = ef__axis_level(axis, data->centre + data->scale * high);
}

/* Quantities above 0, stretched as ratios; the failed ones span from 0 to
 * infinity. */
static void bootstrap_ratio(const task *t, double *value, double estimate,
                            const ef__samples *samples, double *low,
                            double *high) {
  bounds(t, value, samples, estimate, low, high);
  *low = fmax(*low, 0);
  if (*low > 0 && estimate > 0)
    *low = estimate * pow(*low / estimate, t->stretch);
  if (isfinite(*high) && estimate > 0)
    *high = estimate * pow(*high / estimate, t->stretch);
}

static void bootstrap_rate(const task *t, double *value,
                           const ef__samples *samples, ef_estimate *out) {
  bounds(t, value, samples, (double)NAN, &out->low, &out->high);
  out->low = fmax(stretched(out->value, out->low, t->stretch), 0);
  out->high = fmin(stretched(out->value, out->high, t->stretch), 1);
}

static void bootstrap_all(const task *t, const ef__samples *samples) {
  ef_fit *const fit = t->fit;
  const double scale = t->likelihood->data->scale;
  bootstrap_level(t, samples->threshold, samples, &fit->threshold);
  if (!isnan(fit->equality.value))
    bootstrap_level(t, samples->equality, samples, &fit->equality);
  if (!isnan(fit->jnd.value)) {
    bootstrap_ratio(t, samples->jnd, fit->jnd.value, samples, &fit->jnd.low,
                    &fit->jnd.high);
  }
  if (fit->guess_estimated)
    bootstrap_rate(t, samples->guess, samples, &fit->guess);
  if (fit->lapse_estimated)
    bootstrap_rate(t, samples->lapse, samples, &fit->lapse);
  if (!ef__is_estimated(t->likelihood, EF__SLOPE))
    return;
  double low, high;
  bootstrap_ratio(t, samples->slope, t->best->x[EF__SLOPE], samples, &low,
                  &high);
  const double deviation = ef__shape_deviation(fit->curve.shape);
  fit->sigma.low = deviation * scale / high;
  fit->sigma.high = deviation * scale / low;
  if (isnan(fit->exponent.value))
    return;
  fit->exponent.low = low / scale / LN_10;
  fit->exponent.high = high / scale / LN_10;
}

/* ---- Both -----------------------------------------------------------------
 */

/* The fit's parameters in the scaled axis. */
static ef__minimum minimum_of(const ef__likelihood *likelihood,
                              const ef_fit *fit) {
  const ef__data *const data = likelihood->data;
  ef__minimum out = {.value = 0.5 * fit->deviance, .converged = true};
  out.x[EF__SLOPE] = fit->slope * data->scale;
  out.x[EF__INTERCEPT] = fit->intercept + fit->slope * data->centre;
  out.x[EF__GUESS] =
      likelihood->model.lapses_both_ways
          ? likelihood->low[EF__GUESS]
          : ef__model_guess(&likelihood->model, fit->curve.guess);
  out.x[EF__LAPSE] = fit->curve.lapse;
  for (size_t i = 0; i < M; ++i)
    out.x[i] = fmin(fmax(out.x[i], likelihood->low[i]), likelihood->high[i]);
  return out;
}

static ef_status intervals_of(const ef__likelihood *likelihood,
                              const ef_fit_settings *settings,
                              const ef_interval_settings *intervals,
                              ef_fit *fit, ef_goodness *out, ef_error *error) {
  const ef__minimum best = minimum_of(likelihood, fit);
  const ef__reading reading = ef__reading_new(likelihood, settings);
  ef__samples samples = {0};
  void *block = NULL;
  if (intervals->n_samples > 0) {
    const ef_status status = ef__samples_new(
        likelihood, &reading, &best, intervals->n_samples, intervals->seed,
        intervals->jobs, &samples, &block, error);
    if (status != EF_OK)
      return status;
  }
  judge(fit, &samples, out);
  if (intervals->widen && out->is_overdispersed)
    out->widened_by = widening(fit, intervals->level, out);
  const task t = {likelihood, &best, &reading, intervals, out->widened_by, fit};
  if (intervals->method == EF_INTERVAL_PROFILE)
    profile_all(&t);
  else
    bootstrap_all(&t, &samples);
  free(block);
  return EF_OK;
}

static ef_status check_intervals(const ef_interval_settings *s,
                                 const ef_fit *fit, ef_error *error) {
  if (!(s->level > 0.5 && s->level < 1)) {
    return ef__error_set(error, EF_INVALID,
                         "interval level is %g, expected between 0.5 and 1",
                         s->level);
  }
  const size_t least = (size_t)ceil(2 / (1 - s->level));
  if (s->method == EF_INTERVAL_BOOTSTRAP && s->n_samples < least) {
    return ef__error_set(error, EF_INVALID,
                         "%zu samples for a bootstrap at level %g, expected at "
                         "least %zu",
                         s->n_samples, s->level, least);
  }
  if (fit->support != EF_SUPPORT_FULL && fit->support != EF_SUPPORT_STEP) {
    return ef__error_set(error, EF_INVALID,
                         "the fit carries no threshold, so it has no interval");
  }
  return EF_OK;
}

ef_status ef_fit_intervals(const ef_responses *responses,
                           const ef_fit_settings *settings,
                           const ef_interval_settings *intervals, ef_fit *fit,
                           ef_goodness *out, ef_error *error) {
  ef__gsl_ready();
  ef_status status = check_intervals(intervals, fit, error);
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
    status = intervals_of(&likelihood, settings, intervals, fit, out, error);
  free(block);
  return status;
}
