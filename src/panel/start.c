/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Where the search for the largest likelihood begins. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

enum { M = EF__PARAMETERS, FOLLOWED = 4 };

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

/* Keeps the best few in order. */
static void offer(candidate *best, const double *theta, double value) {
  size_t place = FOLLOWED;
  while (place > 0 && value < best[place - 1].value)
    --place;
  if (place == FOLLOWED)
    return;
  memmove(best + place + 1, best + place,
          (FOLLOWED - 1 - place) * sizeof *best);
  memcpy(best[place].theta, theta, sizeof best[place].theta);
  best[place].value = value;
}

/* Thresholds across and around the levels, slopes from shallow to steep in
 * standard deviations of the levels, lapses few and many. */
static void offer_grid(const ef__likelihood *likelihood, const double *theta,
                       candidate *best) {
  static const double slope[] = {0.5, 1.5, 4, 12};
  const double lapse_high = likelihood->high[EF__LAPSE];
  for (int place = -3; place <= 3; ++place) {
    for (size_t s = 0; s < sizeof slope / sizeof *slope; ++s) {
      for (int many = 0; many < 2; ++many) {
        double at[M] = {-slope[s] * 0.6 * place, slope[s], theta[EF__GUESS],
                        many ? 0.9 * lapse_high : theta[EF__LAPSE]};
        if (many && !ef__is_estimated(likelihood, EF__LAPSE))
          continue;
        offer(best, at, value_at(likelihood, at));
      }
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

void ef__maximise(const ef__likelihood *likelihood, const double *origin,
                  bool is_quick, double tolerance, ef__minimum *out) {
  const ef__objective objective = ef__likelihood_objective(likelihood);
  *out = (ef__minimum){.value = (double)INFINITY};
  double theta[M];
  start_asymptotes(likelihood, theta);
  start_regression(likelihood, theta);
  const double value = value_at(likelihood, theta);
  if (is_quick || is_concave(likelihood)) {
    const bool given =
        origin != NULL && !(value < value_at(likelihood, origin));
    follow(&objective, given ? origin : theta, tolerance, out);
    if (out->converged)
      return;
  }
  candidate best[FOLLOWED + 1];
  for (size_t i = 0; i <= FOLLOWED; ++i)
    best[i].value = (double)INFINITY;
  offer(best, theta, value);
  if (origin != NULL)
    offer(best, origin, value_at(likelihood, origin));
  offer_grid(likelihood, theta, best);
  for (size_t i = 0; i < FOLLOWED && isfinite(best[i].value); ++i)
    follow(&objective, best[i].theta, tolerance, out);
}
