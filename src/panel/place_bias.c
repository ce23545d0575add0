/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Leaning to one side or one interval in forced choice. */
#include "panel/panel_private.h"

#include <math.h>

#define SQRT_2 1.4142135623730950488
#define Z_95 1.9599639845400542355 /* z(0.975) */

/* z of a log-linear corrected rate and its variance (delta method). */
static double z_of(size_t k, size_t n, double *variance) {
  const double rate = ((double)k + 0.5) / ((double)n + 1);
  const double z = ef__normal_inverse(rate);
  *variance = rate * (1 - rate) / ((double)n + 1) / (ef__phi(z) * ef__phi(z));
  return z;
}

/* Weighted mean as it grows. */
typedef struct mean {
  double sum, weight;
} mean;

static void mean_add(mean *m, double value, double variance) {
  m->sum += value / variance;
  m->weight += 1 / variance;
}

static ef_estimate mean_estimate(const mean *m, double factor) {
  const double value = factor * m->sum / m->weight;
  const double se = factor / sqrt(m->weight);
  return (ef_estimate){value, se, value - Z_95 * se, value + Z_95 * se};
}

ef_status ef_place_bias_measure(size_t n_rows, const size_t *first,
                                const size_t *first_right, const size_t *second,
                                const size_t *second_right, ef_place_bias *out,
                                ef_error *error) {
  ef__gsl_ready();
  size_t n_first = 0, n_trials = 0, n_named = 0;
  mean bias = {0, 0}, d_prime = {0, 0};
  for (size_t i = 0; i < n_rows; ++i) {
    if (first_right[i] > first[i] || second_right[i] > second[i]) {
      const bool in_first = first_right[i] > first[i];
      ef__error_set(error, EF_MALFORMED,
                    "row %zu: %zu right answers in %zu trials", i + 1,
                    in_first ? first_right[i] : second_right[i],
                    in_first ? first[i] : second[i]);
      return ef__error_row(error, EF_MALFORMED, i + 1, "k");
    }
    n_first += first[i];
    n_trials += first[i] + second[i];
    n_named += first_right[i] + (second[i] - second_right[i]);
    if (first[i] == 0 || second[i] == 0)
      continue;
    /* Named first: Phi(d'/sqrt 2 + b) when it was, Phi(-d'/sqrt 2 + b) else. */
    double var_first, var_second;
    const double z_first = z_of(first_right[i], first[i], &var_first);
    const double z_second = z_of(second_right[i], second[i], &var_second);
    const double variance = 0.25 * (var_first + var_second);
    mean_add(&bias, 0.5 * (z_first - z_second), variance);
    mean_add(&d_prime, 0.5 * (z_first + z_second), variance);
  }
  if (!(bias.weight > 0)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "no level was shown in both places: a leaning to one "
                         "of them shows only against the other");
  }
  out->share = (double)n_named / (double)n_trials;
  out->expected = (double)n_first / (double)n_trials;
  out->bias = mean_estimate(&bias, 1);
  out->d_prime = mean_estimate(&d_prime, SQRT_2);
  out->p_value = erfc(fabs(out->bias.value / out->bias.se) / SQRT_2);
  return EF_OK;
}
