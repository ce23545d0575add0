/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Where the search for the largest likelihood begins. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

enum { M = EF__PARAMETERS };

/* Guess and lapse to begin with: the corrected share of positive answers to
 * blanks, a hundredth of lapses. */
static void start_asymptotes(const ef__likelihood *likelihood, double *theta) {
  const ef__data *const data = likelihood->data;
  theta[EF__GUESS] = likelihood->low[EF__GUESS];
  if (ef__is_estimated(likelihood, EF__GUESS)) {
    const double rate = data->has_blank
                            ? (data->positive[0] + 0.5) / (data->shown[0] + 1)
                            : 0.02;
    theta[EF__GUESS] = ef__model_guess(&likelihood->model, rate);
  }
  theta[EF__LAPSE] = likelihood->low[EF__LAPSE];
  if (ef__is_estimated(likelihood, EF__LAPSE))
    theta[EF__LAPSE] = fmin(0.01, 0.5 * likelihood->high[EF__LAPSE]);
}

/* eta of a level's share of positive answers, moved inside what the asymptotes
 * leave. */
static double empirical_eta(const ef__likelihood *likelihood,
                            const double *theta, size_t row) {
  const double n = likelihood->data->shown[row];
  const double share = (likelihood->data->positive[row] + 0.5) / (n + 1);
  const double guess =
      ef__model_guess_rate(&likelihood->model, theta[EF__GUESS]);
  const double edge = fmax(0.5 / (n + 1), 0.005) * (1 - guess);
  const double inside =
      fmin(fmax(share / (1 - theta[EF__LAPSE]), guess + edge), 1 - edge);
  return ef__model_eta(&likelihood->model, theta[EF__GUESS], inside);
}

/* Straight line through the empirical eta. */
static void start_regression(const ef__likelihood *likelihood, double *theta) {
  const ef__data *const data = likelihood->data;
  double total = 0, sum = 0, product = 0, square = 0;
  for (size_t i = data->has_blank ? 1 : 0; i < data->n; ++i) {
    const double eta = empirical_eta(likelihood, theta, i);
    total += data->shown[i];
    sum += data->shown[i] * eta;
    product += data->shown[i] * eta * data->t[i]; /* t has mean 0 */
    square += data->shown[i] * data->t[i] * data->t[i];
  }
  const double slope = square > 0 ? product / square : 0;
  theta[EF__INTERCEPT] = total > 0 ? sum / total : 0;
  theta[EF__SLOPE] = slope > 0.2 ? slope : 0.2;
}

static double value_at(const ef__likelihood *likelihood, const double *theta) {
  double inside[M];
  for (size_t i = 0; i < M; ++i)
    inside[i] = fmin(fmax(theta[i], likelihood->low[i]), likelihood->high[i]);
  return ef__likelihood_evaluate(likelihood, inside, NULL, NULL, NULL);
}

typedef struct candidate {
  double theta[M], value;
} candidate;

/* For each slope, from shallow to steep in standard deviations of the levels,
 * the best of thresholds at and between the levels (at most some 60) and of few
 * and many lapses: where the likelihood has several maxima, they differ in
 * their slopes. */
static const double slopes[] = {0.5, 1.5, 4, 12, 36};
enum { SLOPES = sizeof slopes / sizeof slopes[0] };

static void best_of_slope(const ef__likelihood *likelihood, const double *theta,
                          double slope, candidate *best) {
  const ef__data *const data = likelihood->data;
  const size_t from = data->has_blank ? 1 : 0;
  const size_t n_places = 2 * (data->n - from) - 1;
  const size_t stride = n_places / 60 + 1;
  const int n_lapses = ef__is_estimated(likelihood, EF__LAPSE) ? 2 : 1;
  best->value = (double)INFINITY;
  for (size_t i = 0; i < n_places; i += stride) {
    const size_t row = from + i / 2;
    const double t =
        i % 2 == 0 ? data->t[row] : 0.5 * (data->t[row] + data->t[row + 1]);
    for (int many = 0; many < n_lapses; ++many) {
      const double at[M] = {-slope * t, slope, theta[EF__GUESS],
                            many ? 0.9 * likelihood->high[EF__LAPSE]
                                 : theta[EF__LAPSE]};
      const double value = value_at(likelihood, at);
      if (value >= best->value)
        continue;
      memcpy(best->theta, at, sizeof at);
      best->value = value;
    }
  }
}

/* One maximum, whatever the data: ln F and ln(1 - F) are concave in eta. */
static bool is_concave(const ef__likelihood *likelihood) {
  return likelihood->model.shape != EF_SHAPE_DETECTION &&
         likelihood->low[EF__GUESS] == 0 && likelihood->high[EF__GUESS] == 0 &&
         likelihood->low[EF__LAPSE] == 0 && likelihood->high[EF__LAPSE] == 0;
}

static void follow(const ef__objective *objective, const double *theta,
                   double tolerance, ef__minimum *best) {
  ef__minimum found;
  ef__minimise(objective, theta, tolerance, &found);
  found.iterations += best->iterations;
  const bool better =
      found.converged > best->converged ||
      (found.converged == best->converged && found.value < best->value);
  if (better)
    *best = found;
  else
    best->iterations = found.iterations;
}

/* Steep maxima between levels are what the two other starts miss: in 27 of 2000
 * seven-level 2IFC data sets (tests/bench/bench_fit.c), in 1 with them. */
static void follow_steep(const ef__likelihood *likelihood,
                         const ef__objective *objective, double *theta,
                         double tolerance, ef__minimum *best) {
  const ef__data *const data = likelihood->data;
  const double bar = best->value + 8;
  double at[M], least = (double)INFINITY;
  memcpy(at, theta, sizeof at);
  for (size_t i = data->has_blank ? 2 : 1; i < data->n; ++i) {
    const double t = 0.5 * (data->t[i - 1] + data->t[i]);
    theta[EF__SLOPE] = 1.2 / (data->t[i] - t);
    theta[EF__INTERCEPT] = -theta[EF__SLOPE] * t;
    const double value = value_at(likelihood, theta);
    if (value >= least)
      continue;
    least = value;
    memcpy(at, theta, sizeof at);
  }
  if (least < bar)
    follow(objective, at, tolerance, best);
}

void ef__maximise(const ef__likelihood *likelihood, const double *origin,
                  bool is_quick, double tolerance, ef__minimum *out) {
  const ef__objective objective = ef__likelihood_objective(likelihood);
  *out = (ef__minimum){.value = (double)INFINITY};
  double theta[M];
  start_asymptotes(likelihood, theta);
  start_regression(likelihood, theta);
  follow(&objective, theta, tolerance, out);
  if (is_concave(likelihood) && out->converged)
    return;
  if (origin != NULL)
    follow(&objective, origin, tolerance, out);
  if (is_quick && out->converged) {
    theta[EF__LAPSE] = 0.5 * likelihood->high[EF__LAPSE];
    follow_steep(likelihood, &objective, theta, tolerance, out);
    return;
  }
  for (size_t i = 0; i < SLOPES; ++i) {
    candidate best;
    best_of_slope(likelihood, theta, slopes[i], &best);
    if (isfinite(best.value))
      follow(&objective, best.theta, tolerance, out);
  }
}
