/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sensitivity apart from the criterion, from hits and false alarms. */
#include "panel/panel_private.h"

#include <math.h>

#define SQRT_2 1.4142135623730950488
#define Z_95 1.9599639845400542355 /* z(0.975) */

/* Log-linear correction (Hautus, Behav. Res. Meth. Instrum. Comput. 27 (1995)
 * 46-51). */
static double corrected(size_t positive, size_t shown) {
  return ((double)positive + 0.5) / ((double)shown + 1);
}

/* Variance of a corrected rate. */
static double rate_variance(double rate, size_t shown) {
  return rate * (1 - rate) / ((double)shown + 1);
}

static ef_estimate with_limits(double value, double se) {
  return (ef_estimate){value, se, value - Z_95 * se, value + Z_95 * se};
}

static ef_status check_counts(const char *kind, size_t shown, size_t positive,
                              ef_error *error) {
  if (shown == 0) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "no trials %s: d' and criterion need both kinds",
                         kind);
  }
  if (positive > shown) {
    return ef__error_set(error, EF_MALFORMED,
                         "%zu positive answers in %zu trials %s", positive,
                         shown, kind);
  }
  return EF_OK;
}

static ef_status take_rates(size_t shown, size_t positive, size_t blanks,
                            size_t blank_positive, ef_sensitivity *out,
                            ef_error *error) {
  ef_status status = check_counts("with signal", shown, positive, error);
  if (status == EF_OK)
    status = check_counts("without signal", blanks, blank_positive, error);
  if (status != EF_OK)
    return status;
  ef__gsl_ready();
  out->hit_rate = corrected(positive, shown);
  out->false_alarm_rate = corrected(blank_positive, blanks);
  return EF_OK;
}

ef_status ef_sensitivity_yes_no(size_t shown, size_t yes, size_t blanks,
                                size_t blank_yes, ef_sensitivity *out,
                                ef_error *error) {
  const ef_status status =
      take_rates(shown, yes, blanks, blank_yes, out, error);
  if (status != EF_OK)
    return status;
  const double z_h = ef__normal_inverse(out->hit_rate);
  const double z_f = ef__normal_inverse(out->false_alarm_rate);
  /* Gourevitch & Galanter, Psychometrika 32 (1967) 25-33: z has the variance
   * of the rate over the squared density. */
  const double variance =
      rate_variance(out->hit_rate, shown) / (ef__phi(z_h) * ef__phi(z_h)) +
      rate_variance(out->false_alarm_rate, blanks) /
          (ef__phi(z_f) * ef__phi(z_f));
  out->d_prime = with_limits(z_h - z_f, sqrt(variance));
  out->criterion = with_limits(-0.5 * (z_h + z_f), 0.5 * sqrt(variance));
  return EF_OK;
}

ef_status ef_sensitivity_same_different(size_t pairs, size_t different,
                                        size_t same_pairs,
                                        size_t same_different,
                                        ef_sensitivity *out, ef_error *error) {
  const ef_status status =
      take_rates(pairs, different, same_pairs, same_different, out, error);
  if (status != EF_OK)
    return status;
  const double f = out->false_alarm_rate;
  const double k = -SQRT_2 * ef__normal_inverse(0.5 * f);
  /* F = 2 Phi(-k / sqrt 2) */
  const double f_by_k = -SQRT_2 * ef__phi(k / SQRT_2);
  const double f_variance = rate_variance(f, same_pairs);
  out->criterion = with_limits(k, sqrt(f_variance) / fabs(f_by_k));
  if (out->hit_rate <= f) {
    out->d_prime = with_limits(0, (double)NAN);
    return EF_OK;
  }
  const double d = ef_task_d_prime(EF_TASK_SAME_DIFFERENT, f, out->hit_rate);
  const double phi_a = ef__phi((d - k) / SQRT_2);
  const double phi_b = ef__phi((-d - k) / SQRT_2);
  const double h_by_d = (phi_a - phi_b) / SQRT_2;
  const double h_by_k = -(phi_a + phi_b) / SQRT_2;
  /* d'(H, F): dd'/dH = 1 / H_d, dd'/dF = -H_k / (H_d F_k). */
  const double by_f = -h_by_k / (h_by_d * f_by_k);
  const double variance =
      rate_variance(out->hit_rate, pairs) / (h_by_d * h_by_d) +
      by_f * by_f * f_variance;
  out->d_prime = with_limits(d, sqrt(variance));
  if (out->d_prime.low < 0)
    out->d_prime.low = 0;
  return EF_OK;
}
