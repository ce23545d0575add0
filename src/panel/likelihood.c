/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Binomial likelihood of answers under a curve, with exact derivatives. */
#include "panel/panel_private.h"

#include <math.h>
#include <string.h>

enum { M = EF__PARAMETERS };

double ef__likelihood_part(double k, double n, double p) {
  if (k <= 0)
    return 0;
  return p > 0 ? k * log(k / (n * p)) : (double)INFINITY;
}

/* Adds `eta_eta` ... of one level to the upper triangle of a matrix over all
 * parameters: eta = intercept + slope t. */
static void add_products(double t, double eta_eta, double eta_guess,
                         double eta_lapse, double guess_guess,
                         double guess_lapse, double lapse_lapse, double *to) {
  to[M * EF__INTERCEPT + EF__INTERCEPT] += eta_eta;
  to[M * EF__INTERCEPT + EF__SLOPE] += t * eta_eta;
  to[M * EF__SLOPE + EF__SLOPE] += t * t * eta_eta;
  to[M * EF__INTERCEPT + EF__GUESS] += eta_guess;
  to[M * EF__SLOPE + EF__GUESS] += t * eta_guess;
  to[M * EF__INTERCEPT + EF__LAPSE] += eta_lapse;
  to[M * EF__SLOPE + EF__LAPSE] += t * eta_lapse;
  to[M * EF__GUESS + EF__GUESS] += guess_guess;
  to[M * EF__GUESS + EF__LAPSE] += guess_lapse;
  to[M * EF__LAPSE + EF__LAPSE] += lapse_lapse;
}

/* Adds one level's share. With a = d(-ln L)/dp and c = d2(-ln L)/dp2 the chain
 * rule gives gradient a p' and curvature c p' p'^T + a p''; the expected
 * information is n / (p q) p' p'^T. */
static void accumulate(const ef__point *at, double t, double n, double k,
                       double *gradient, double *curvature, double *expected) {
  const double by_p = k > 0 ? k / at->p : 0;
  const double by_q = n - k > 0 ? (n - k) / at->q : 0;
  const double a = by_q - by_p;
  const double c = (k > 0 ? by_p / at->p : 0) + (n - k > 0 ? by_q / at->q : 0);
  const double i = at->p > 0 && at->q > 0 ? n / at->p / at->q : 0;
  const double e = at->p_eta, g = at->p_guess, l = at->p_lapse;
  gradient[EF__INTERCEPT] += a * e;
  gradient[EF__SLOPE] += a * t * e;
  gradient[EF__GUESS] += a * g;
  gradient[EF__LAPSE] += a * l;
  add_products(t, c * e * e + a * at->p_eta_eta,
               c * e * g + a * at->p_eta_guess, c * e * l + a * at->p_eta_lapse,
               c * g * g + a * at->p_guess_guess,
               c * g * l + a * at->p_guess_lapse, c * l * l, curvature);
  add_products(t, i * e * e, i * e * g, i * e * l, i * g * g, i * g * l,
               i * l * l, expected);
}

static void mirror(double *matrix) {
  for (size_t i = 0; i < M; ++i) {
    for (size_t j = 0; j < i; ++j)
      matrix[M * i + j] = matrix[M * j + i];
  }
}

static double value_alone(const ef__likelihood *likelihood,
                          const double *theta) {
  const ef__data *const data = likelihood->data;
  double value = 0;
  for (size_t i = 0; i < data->n; ++i) {
    const double n = data->shown[i], k = data->positive[i];
    double p, q;
    ef__model_share(&likelihood->model,
                    theta[EF__INTERCEPT] + theta[EF__SLOPE] * data->t[i],
                    i == 0 && data->has_blank, theta[EF__GUESS],
                    theta[EF__LAPSE], &p, &q);
    value += ef__likelihood_part(k, n, p) + ef__likelihood_part(n - k, n, q);
  }
  return value;
}

double ef__likelihood_evaluate(const void *ctx, const double *theta,
                               double *gradient, double *curvature,
                               double *expected) {
  const ef__likelihood *const likelihood = ctx;
  const ef__data *const data = likelihood->data;
  if (gradient == NULL)
    return value_alone(likelihood, theta);
  memset(gradient, 0, M * sizeof *gradient);
  memset(curvature, 0, M * M * sizeof *curvature);
  memset(expected, 0, M * M * sizeof *expected);
  double value = 0;
  for (size_t i = 0; i < data->n; ++i) {
    const double t = data->t[i];
    const double n = data->shown[i], k = data->positive[i];
    ef__point at;
    ef__model_point(
        &likelihood->model, theta[EF__INTERCEPT] + theta[EF__SLOPE] * t,
        i == 0 && data->has_blank, theta[EF__GUESS], theta[EF__LAPSE], &at);
    value +=
        ef__likelihood_part(k, n, at.p) + ef__likelihood_part(n - k, n, at.q);
    accumulate(&at, t, n, k, gradient, curvature, expected);
  }
  mirror(curvature);
  mirror(expected);
  return value;
}

ef__objective ef__likelihood_objective(const ef__likelihood *likelihood) {
  ef__objective objective = {
      .m = M, .evaluate = ef__likelihood_evaluate, .ctx = likelihood};
  memcpy(objective.low, likelihood->low, sizeof objective.low);
  memcpy(objective.high, likelihood->high, sizeof objective.high);
  return objective;
}
