/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Several observers: random-effects summary of their thresholds.
 *
 * ln threshold of observer i is normal about mu with variance tau^2 + s_i^2:
 * people differ by tau, and each is known to s_i. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_cdf.h>

typedef struct sample {
  size_t n;
  const double *y, *v; /* ln threshold and its variance */
  bool is_restricted;
} sample;

/* Weighted mean with weights 1 / (v + tau^2). */
static double mean_at(const sample *s, double tau, double *weight) {
  double sum = 0;
  *weight = 0;
  for (size_t i = 0; i < s->n; ++i) {
    const double w = 1 / (s->v[i] + tau * tau);
    *weight += w;
    sum += w * s->y[i];
  }
  return sum / *weight;
}

/* Logarithm of the likelihood, or of the restricted one, at the best mean,
 * without constants. */
static double likelihood_at(const sample *s, double tau) {
  double weight, value = 0;
  const double mean = mean_at(s, tau, &weight);
  for (size_t i = 0; i < s->n; ++i) {
    const double variance = s->v[i] + tau * tau;
    const double off = s->y[i] - mean;
    value -= 0.5 * (log(variance) + off * off / variance);
  }
  return s->is_restricted ? value - 0.5 * log(weight) : value;
}

/* A tau that is larger than any the data can ask for. */
static double most_spread(const sample *s) {
  double low = s->y[0], high = s->y[0], variance = 0;
  for (size_t i = 0; i < s->n; ++i) {
    low = fmin(low, s->y[i]);
    high = fmax(high, s->y[i]);
    variance = fmax(variance, s->v[i]);
  }
  return high - low + sqrt(variance);
}

/* Golden section between neighbours of the best of a grid: the likelihood may
 * have more than one maximum when the s_i differ much. */
static double best_tau(const sample *s) {
  enum { GRID = 200 };
  const double top = most_spread(s);
  size_t best = 0;
  double best_value = likelihood_at(s, 0);
  for (size_t i = 1; i <= GRID; ++i) {
    const double value = likelihood_at(s, top * (double)i / GRID);
    if (value <= best_value)
      continue;
    best_value = value;
    best = i;
  }
  double low = best > 0 ? top * (double)(best - 1) / GRID : 0;
  double high = top * (double)(best + 1) / GRID;
  const double golden = 0.61803398874989484820;
  /* 40 steps leave 4e-9 of the interval; the top is flat below 1e-8. */
  for (int i = 0; i < 40; ++i) {
    const double a = high - golden * (high - low);
    const double b = low + golden * (high - low);
    if (likelihood_at(s, a) >= likelihood_at(s, b))
      high = b;
    else
      low = a;
  }
  const double tau = 0.5 * (low + high);
  return likelihood_at(s, tau) > likelihood_at(s, 0) ? tau : 0;
}

/* Where the likelihood has fallen by `drop` from that at `tau`, between the two
 * ends; `far` itself when it has not fallen there. */
static double limit_of_tau(const sample *s, double tau, double far,
                           double drop) {
  const double bar = likelihood_at(s, tau) - drop;
  if (likelihood_at(s, far) > bar)
    return far;
  double inside = tau, outside = far;
  for (int i = 0; i < 60; ++i) {
    const double middle = 0.5 * (inside + outside);
    if (likelihood_at(s, middle) > bar)
      inside = middle;
    else
      outside = middle;
  }
  return 0.5 * (inside + outside);
}

/* Interval of the mean after Hartung & Knapp (Statist. Med. 20 (2001) 3875):
 * the weighted spread of the observers themselves, Student's t. */
static double mean_error(const sample *s, double mean, double tau,
                         double weight) {
  double square = 0;
  for (size_t i = 0; i < s->n; ++i) {
    const double off = s->y[i] - mean;
    square += off * off / (s->v[i] + tau * tau);
  }
  return sqrt(square / (double)(s->n - 1) / weight);
}

static void summarise(const sample *s, double level, ef_group *out) {
  const double degrees = (double)(s->n - 1);
  const double tail = 0.5 * (1 + level);
  const double z = gsl_cdf_ugaussian_Pinv(tail);
  const double t = gsl_cdf_tdist_Pinv(tail, degrees);
  const double tau = best_tau(s);
  double weight;
  const double mean = mean_at(s, tau, &weight);
  const double se = mean_error(s, mean, tau, weight);
  out->mean = (ef_estimate){exp(mean), exp(mean) * se, exp(mean - t * se),
                            exp(mean + t * se)};
  out->mean_ln = mean;
  out->se_ln = 1 / sqrt(weight);
  out->spread =
      (ef_estimate){tau, (double)NAN, limit_of_tau(s, tau, 0, 0.5 * z * z),
                    limit_of_tau(s, tau, 100 * most_spread(s), 0.5 * z * z)};
  const double t_next = gsl_cdf_tdist_Pinv(tail, fmax(degrees - 1, 1));
  const double reach = t_next * sqrt(tau * tau + se * se);
  out->next_low = exp(mean - reach);
  out->next_high = exp(mean + reach);
  double fixed_weight, q = 0;
  const double fixed = mean_at(s, 0, &fixed_weight);
  for (size_t i = 0; i < s->n; ++i)
    q += (s->y[i] - fixed) * (s->y[i] - fixed) / s->v[i];
  out->q = q;
  out->q_p_value = gsl_cdf_chisq_Q(q, degrees);
}

ef_status ef_group_summary(size_t n, const double *threshold, const double *se,
                           ef_group_method method, double level,
                           const ef_notes *notes, ef_group *out,
                           ef_error *error) {
  if (!(level > 0.5 && level < 1)) {
    return ef__error_set(error, EF_INVALID,
                         "interval level is %g, expected between 0.5 and 1",
                         level);
  }
  double *y, *v;
  const ef__part part[] = {{&y, n, sizeof *y}, {&v, n, sizeof *v}};
  void *const block = ef__allocate_block(2, part);
  if (block == NULL)
    return ef__error_memory(error, "the observers");
  ef__gsl_ready();
  size_t kept = 0;
  for (size_t i = 0; i < n; ++i) {
    if (!(threshold[i] > 0) || !isfinite(threshold[i]) || !(se[i] > 0) ||
        !isfinite(se[i]))
      continue;
    y[kept] = log(threshold[i]);
    v[kept] = se[i] / threshold[i] * (se[i] / threshold[i]);
    kept++;
  }
  out->n = kept;
  out->n_left_out = n - kept;
  ef_status status = EF_OK;
  if (kept < 2) {
    status = ef__error_set(error, EF_NO_ANSWER,
                           "%zu of %zu observers have a threshold above 0 with "
                           "a standard error: a spread needs at least two",
                           kept, n);
  } else {
    const sample s = {kept, y, v, method == EF_GROUP_RESTRICTED};
    summarise(&s, level, out);
    if (out->n_left_out > 0) {
      ef__note(notes,
               "%zu of %zu observers left out of the summary: no threshold "
               "above 0 with a standard error",
               out->n_left_out, n);
    }
  }
  free(block);
  return status;
}
