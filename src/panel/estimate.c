/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A maximum of the likelihood in the user's terms: curve, thresholds, standard
 * errors, deviance. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include <gsl/gsl_sf_gamma.h>

#define LN_10 2.30258509299404568402

enum { M = EF__PARAMETERS };

ef_psychometric ef__curve(const ef__likelihood *likelihood, ef_axis axis,
                          const double *theta) {
  const ef__data *const data = likelihood->data;
  const double slope = theta[EF__SLOPE] / data->scale;
  const double intercept =
      theta[EF__INTERCEPT] - theta[EF__SLOPE] * data->centre / data->scale;
  return (ef_psychometric){
      .shape = likelihood->model.shape,
      .axis = axis,
      .task = likelihood->model.task,
      .location = -intercept / slope,
      .width = 1 / slope,
      .guess = likelihood->model.lapses_both_ways
                   ? theta[EF__LAPSE]
                   : ef__model_guess_rate(&likelihood->model, theta[EF__GUESS]),
      .lapse = theta[EF__LAPSE]};
}

/* Covariance from the expected information at the maximum, in the user's axis:
 * slope = slope' / scale, intercept = intercept' - slope' centre / scale. */
static void covariance(const ef__likelihood *likelihood, const double *theta,
                       ef_fit *out) {
  double gradient[M], curvature[M * M], expected[M * M], scaled[M * M];
  ef__likelihood_evaluate(likelihood, theta, gradient, curvature, expected);
  bool is_free[M];
  for (size_t i = 0; i < M; ++i) {
    is_free[i] =
        theta[i] > likelihood->low[i] && theta[i] < likelihood->high[i];
  }
  if (!ef__invert_free(M, expected, is_free, scaled)) {
    for (size_t i = 0; i < M * M; ++i)
      out->covariance[i] = (double)NAN;
    return;
  }
  const double scale = likelihood->data->scale;
  const double shift = -likelihood->data->centre / scale;
  const double by[M * M] = {1, shift, 0, 0, 0, 1 / scale, 0, 0,
                            0, 0,     1, 0, 0, 0,         0, 1};
  for (size_t i = 0; i < M; ++i) {
    for (size_t j = 0; j < M; ++j) {
      double sum = 0;
      for (size_t k = 0; k < M; ++k) {
        for (size_t m = 0; m < M; ++m)
          sum += by[M * i + k] * scaled[M * k + m] * by[M * j + m];
      }
      out->covariance[M * i + j] = sum;
    }
  }
}

static ef_estimate estimate(double value, double se) {
  return (ef_estimate){value, se, (double)NAN, (double)NAN};
}

/* Standard error of a function of intercept and slope. */
static double se_of(const ef_fit *fit, double by_intercept, double by_slope) {
  const double *const c = fit->covariance;
  return sqrt(by_intercept * by_intercept * c[0] +
              2 * by_intercept * by_slope * c[1] +
              by_slope * by_slope * c[M + 1]);
}

/* Level where F^-1 is eta; its derivatives are -1/b and -(eta - a)/b^2 in t. */
static ef_estimate level_at(const ef_fit *fit, double eta) {
  const double t = (eta - fit->intercept) / fit->slope;
  const double level = ef__axis_level(fit->curve.axis, t);
  const double by_t = fit->curve.axis == EF_AXIS_LOG ? LN_10 * level : 1;
  return estimate(level,
                  se_of(fit, -by_t / fit->slope, -by_t * t / fit->slope));
}

/* Half of the level at 75 % minus the level at 25 %. */
static ef_estimate half_range(const ef_fit *fit, const ef__reading *reading) {
  const double eta[2] = {reading->eta_low, reading->eta_high};
  double value = 0, by_intercept = 0, by_slope = 0;
  for (size_t i = 0; i < 2; ++i) {
    const double half = i == 0 ? -0.5 : 0.5;
    const double t = (eta[i] - fit->intercept) / fit->slope;
    const double level = ef__axis_level(fit->curve.axis, t);
    const double by_t = fit->curve.axis == EF_AXIS_LOG ? LN_10 * level : 1;
    value += half * level;
    by_intercept -= half * by_t / fit->slope;
    by_slope -= half * by_t * t / fit->slope;
  }
  return estimate(value, se_of(fit, by_intercept, by_slope));
}

static ef_estimate jnd_of(const ef__likelihood *likelihood, const ef_fit *fit,
                          const ef__reading *reading, const double *theta) {
  switch (reading->jnd) {
  case EF__JND_AT_ETA:
    return level_at(fit, reading->eta_jnd);
  case EF__JND_RANGE:
    return half_range(fit, reading);
  case EF__JND_BY_ALARMS:
    /* The false-alarm rate is an estimate too; the bootstrap knows. */
    return estimate(ef__reading_jnd(reading, likelihood, theta), (double)NAN);
  case EF__JND_NONE:
    break;
  }
  return estimate((double)NAN, (double)NAN);
}

static void describe_asymptotes(const ef__likelihood *likelihood,
                                const double *theta, ef_fit *out) {
  const double none = (double)NAN;
  const double var_guess = out->covariance[M * EF__GUESS + EF__GUESS];
  const double var_lapse = out->covariance[M * EF__LAPSE + EF__LAPSE];
  out->guess_estimated = ef__is_estimated(likelihood, EF__GUESS);
  out->lapse_estimated = ef__is_estimated(likelihood, EF__LAPSE);
  double se_guess = var_guess > 0 ? sqrt(var_guess) : none;
  if (ef__model_has_criterion(&likelihood->model)) {
    ef__point blank;
    ef__model_point(&likelihood->model, 0, true, theta[EF__GUESS], 0, &blank);
    se_guess *= fabs(blank.p_guess);
  }
  out->guess = estimate(out->curve.guess, se_guess);
  out->lapse =
      estimate(out->curve.lapse, var_lapse > 0 ? sqrt(var_lapse) : none);
  out->lapse_at_limit =
      out->lapse_estimated && theta[EF__LAPSE] >= likelihood->high[EF__LAPSE];
}

static void describe_quality(const ef__likelihood *likelihood,
                             const ef__minimum *minimum, ef_fit *out) {
  const ef__data *const data = likelihood->data;
  const double *const theta = minimum->x;
  double saturated = 0, pearson = 0, n_trials = 0;
  for (size_t i = 0; i < data->n; ++i) {
    const double n = data->shown[i], k = data->positive[i];
    const bool is_blank = i == 0 && data->has_blank;
    double p, q;
    ef__model_share(&likelihood->model,
                    theta[EF__INTERCEPT] + theta[EF__SLOPE] * data->t[i],
                    is_blank, theta[EF__GUESS], theta[EF__LAPSE], &p, &q);
    n_trials += n;
    saturated += gsl_sf_lngamma(n + 1) - gsl_sf_lngamma(k + 1) -
                 gsl_sf_lngamma(n - k + 1) + ef__likelihood_part(k, n, 1) +
                 ef__likelihood_part(n - k, n, 1);
    if (p > 0 && q > 0)
      pearson += (k - n * p) * (k - n * p) / (n * p * q);
  }
  out->deviance = 2 * minimum->value;
  out->pearson = pearson;
  out->log_likelihood = saturated - minimum->value;
  out->n_levels = data->n;
  out->n_trials = (size_t)n_trials;
  out->n_parameters = ef__parameter_count(likelihood);
  out->degrees = data->n > out->n_parameters ? data->n - out->n_parameters : 0;
  out->iterations = minimum->iterations;
}

static bool is_outside(const ef__data *data, double t) {
  const double first = data->t[data->has_blank ? 1 : 0];
  const double place = (t - data->centre) / data->scale;
  return place < first || place > data->t[data->n - 1];
}

void ef__fit_describe(const ef__likelihood *likelihood,
                      const ef_fit_settings *settings,
                      const ef__minimum *minimum, ef_fit *out) {
  const ef__model *const model = &likelihood->model;
  const double *const theta = minimum->x;
  const ef_estimate none = {(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  out->curve = ef__curve(likelihood, settings->axis, theta);
  out->slope = 1 / out->curve.width;
  out->intercept = -out->curve.location / out->curve.width;
  covariance(likelihood, theta, out);
  out->se_intercept = sqrt(out->covariance[0]);
  out->se_slope = sqrt(out->covariance[M + 1]);
  const ef__reading reading = ef__reading_new(likelihood, settings);
  out->criterion =
      ef__model_has_criterion(model) ? (double)NAN : ef__criterion(settings);
  out->threshold = level_at(out, reading.eta_threshold);
  out->equality = none;
  if (settings->task == EF_TASK_GREATER_LESS)
    out->equality = level_at(out, reading.eta_equality);
  out->jnd = jnd_of(likelihood, out, &reading, theta);
  const double slope = out->slope;
  const double deviation = ef__shape_deviation(model->shape);
  out->sigma =
      estimate(deviation / slope, deviation * out->se_slope / (slope * slope));
  out->exponent = none;
  if (model->shape == EF_SHAPE_DETECTION)
    out->exponent = estimate(slope / LN_10, out->se_slope / LN_10);
  describe_asymptotes(likelihood, theta, out);
  describe_quality(likelihood, minimum, out);
  out->extrapolated = is_outside(
      likelihood->data, (reading.eta_threshold - out->intercept) / slope);
}

static void without_error(ef_estimate *estimate) {
  estimate->se = (double)NAN;
}

void ef__fit_describe_step(const ef__likelihood *likelihood,
                           const ef__verdict *verdict, ef_fit *out) {
  const ef__data *const data = likelihood->data;
  const ef_axis axis = out->curve.axis;
  const double middle = data->centre + 0.5 * data->scale *
                                           (data->t[verdict->row_low] +
                                            data->t[verdict->row_high]);
  out->bracket_low = ef__row_level(data, axis, verdict->row_low);
  out->bracket_high = ef__row_level(data, axis, verdict->row_high);
  /* At a level of its own the search has found where on the steep curve the
   * level stands; between two levels any place is as good. */
  if (verdict->row_low < verdict->row_high) {
    out->curve.location = middle;
    out->intercept = -middle / out->curve.width;
  }
  const double level = ef__axis_level(axis, middle);
  out->threshold.value = level;
  if (!isnan(out->equality.value))
    out->equality.value = level;
  if (!isnan(out->jnd.value))
    out->jnd.value = likelihood->model.task == EF_TASK_GREATER_LESS ? 0 : level;
  if (!isnan(out->sigma.value))
    out->sigma.value = 0;
  if (!isnan(out->exponent.value))
    out->exponent.value = (double)INFINITY;
  out->se_intercept = out->se_slope = (double)NAN;
  without_error(&out->threshold);
  without_error(&out->equality);
  without_error(&out->jnd);
  without_error(&out->sigma);
  without_error(&out->exponent);
  out->extrapolated = false;
}
