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

/* Adds one level's share. With a = d(-ln L)/dp and c = d2(-ln L)/dp2 the chain
 * rule gives gradient a p' and curvature c p' p'^T + a p''; the expected
 * information is n / (p q) p' p'^T. */
static void accumulate(const ef__point *at, double t, double n, double k,
                       double *gradient, double *curvature, double *expected) {
  const double by_p = k > 0 ? k / at->p : 0;
  const double by_q = n - k > 0 ? (n - k) / at->q : 0;
  const double a = by_q - by_p;
  const double c = (k > 0 ? by_p / at->p : 0) + (n - k > 0 ? by_q / at->q : 0);
  const double information = at->p > 0 && at->q > 0 ? n / at->p / at->q : 0;
  const double d[M] = {at->p_eta, t * at->p_eta, at->p_guess, at->p_lapse};
  const double dd[M * M] = {at->p_eta_eta,       t * at->p_eta_eta,
                            at->p_eta_guess,     at->p_eta_lapse,
                            t * at->p_eta_eta,   t * t * at->p_eta_eta,
                            t * at->p_eta_guess, t * at->p_eta_lapse,
                            at->p_eta_guess,     t * at->p_eta_guess,
                            at->p_guess_guess,   at->p_guess_lapse,
                            at->p_eta_lapse,     t * at->p_eta_lapse,
                            at->p_guess_lapse,   0};
  for (size_t i = 0; i < M; ++i) {
    gradient[i] += a * d[i];
    for (size_t j = 0; j < M; ++j) {
      const double product = d[i] * d[j];
      curvature[M * i + j] += c * product + a * dd[M * i + j];
      expected[M * i + j] += information * product;
    }
  }
}

double ef__likelihood_evaluate(const void *ctx, const double *theta,
                               double *gradient, double *curvature,
                               double *expected) {
  const ef__likelihood *const likelihood = ctx;
  const ef__data *const data = likelihood->data;
  if (gradient != NULL) {
    memset(gradient, 0, M * sizeof *gradient);
    memset(curvature, 0, M * M * sizeof *curvature);
    memset(expected, 0, M * M * sizeof *expected);
  }
  double value = 0;
  for (size_t i = 0; i < data->n; ++i) {
    const bool is_blank = i == 0 && data->has_blank;
    const double t = is_blank ? 0 : data->t[i];
    const double n = data->shown[i], k = data->positive[i];
    ef__point at;
    ef__model_point(&likelihood->model,
                    theta[EF__INTERCEPT] + theta[EF__SLOPE] * t, is_blank,
                    theta[EF__GUESS], theta[EF__LAPSE], &at);
    value +=
        ef__likelihood_part(k, n, at.p) + ef__likelihood_part(n - k, n, at.q);
    if (gradient != NULL)
      accumulate(&at, t, n, k, gradient, curvature, expected);
  }
  return value;
}

ef__objective ef__likelihood_objective(const ef__likelihood *likelihood) {
  ef__objective objective = {
      .m = M, .evaluate = ef__likelihood_evaluate, .ctx = likelihood};
  memcpy(objective.low, likelihood->low, sizeof objective.low);
  memcpy(objective.high, likelihood->high, sizeof objective.high);
  return objective;
}
