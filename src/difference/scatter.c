/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the noise of a measurement makes of a colour difference. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

ef_status ef_scatter_of_readings(size_t n, const double *xyz, ef_scatter *out,
                                 ef_error *error) {
  if (n < 2)
    return ef__error_set(error, EF_NO_ANSWER,
                         "%zu reading%s: a scatter needs at least two", n,
                         n == 1 ? "" : "s");
  double mean[3];
  const ef_status status = ef_readings_mean(n, 3, xyz, mean, NULL, error);
  if (status != EF_OK)
    return status;
  *out = (ef_scatter){0};
  for (size_t i = 0; i < n; ++i) {
    for (size_t k = 0; k < 9; ++k)
      out->covariance[k] += (xyz[3 * i + k / 3] - mean[k / 3]) *
                            (xyz[3 * i + k % 3] - mean[k % 3]);
  }
  for (size_t k = 0; k < 9; ++k)
    out->covariance[k] /= (double)(n - 1);
  return EF_OK;
}

ef_status ef_scatter_of_noise(const ef_weights *weights, const double *sd,
                              ef_scatter *out, ef_error *error) {
  const size_t n = ef_weights_samples(weights);
  const double *const w = ef_weights_matrix(weights);
  if (ef_weights_channels(weights) != 3)
    return ef__error_set(error, EF_INVALID,
                         "the scatter of a colour needs weights of 3 channels, "
                         "found %zu",
                         ef_weights_channels(weights));
  ef_scatter sum = {0};
  for (size_t s = 0; s < n; ++s) {
    if (!(sd[s] >= 0) || !isfinite(sd[s]))
      return ef__error_set(error, EF_INVALID,
                           "the standard deviation of sample %zu is %g, "
                           "expected a number from 0",
                           s + 1, sd[s]);
    for (size_t k = 0; k < 9; ++k)
      sum.covariance[k] +=
          w[k / 3 * n + s] * w[k % 3 * n + s] * sd[s] * sd[s];
  }
  *out = sum;
  return EF_OK;
}

/* The covariance in the metric's coordinates: J V J'. */
static void carry(const ef_metric *metric, ef_xyz xyz,
                  const ef_conditions *conditions, const ef_scatter *scatter,
                  double out[9]) {
  memset(out, 0, 9 * sizeof *out);
  if (scatter == NULL)
    return;
  double jacobian[9], transposed[9];
  ef_metric_jacobian(metric, xyz, conditions, jacobian);
  ef__mat3_transpose(jacobian, transposed);
  ef__mat3_multiply(jacobian, scatter->covariance, out);
  ef__mat3_multiply(out, transposed, out);
}

/* Variance of the difference from the scatter of one side, by central
 * differences in coordinate `side[0 .. 2]`, which is one of the two points. */
static double variance_of(const ef_metric *metric, const double reference[3],
                          const double sample[3], double *side, double step,
                          const double covariance[9]) {
  double slope[3];
  for (size_t i = 0; i < 3; ++i) {
    const double kept = side[i];
    side[i] = kept + step;
    const double above = ef_metric_difference(metric, reference, sample);
    side[i] = kept - step;
    const double below = ef_metric_difference(metric, reference, sample);
    side[i] = kept;
    slope[i] = (above - below) / (2 * step);
  }
  double carried[3];
  ef__mat3_apply(covariance, slope, carried);
  return slope[0] * carried[0] + slope[1] * carried[1] + slope[2] * carried[2];
}

ef_uncertain ef_metric_uncertainty(const ef_metric *metric, ef_xyz reference,
                                   ef_xyz sample,
                                   const ef_conditions *conditions,
                                   const ef_scatter *reference_scatter,
                                   const ef_scatter *sample_scatter) {
  double r[3], s[3], of_reference[9], of_sample[9], tensor[9];
  ef_metric_coordinates(metric, reference, conditions, r);
  ef_metric_coordinates(metric, sample, conditions, s);
  carry(metric, reference, conditions, reference_scatter, of_reference);
  carry(metric, sample, conditions, sample_scatter, of_sample);
  ef_uncertain out = {.difference = ef_metric_difference(metric, r, s)};
  ef_metric_tensor(metric, r, tensor);
  double trace = 0; /* both matrices are symmetric */
  for (size_t k = 0; k < 9; ++k)
    trace += tensor[k] * (of_reference[k] + of_sample[k]);
  out.noise_alone = sqrt(trace);
  if (isnan(out.difference)) {
    out.sd = out.noise_alone = out.difference;
    return out;
  }
  /* A thousandth of the difference: the slope is right to its square. No more
   * than a thousandth of a unit, over which weights hardly change. */
  const double step = 1e-3 * fmin(out.difference, 1);
  if (!(step > 0)) {
    out.sd = out.noise_alone / sqrt(3);
    return out;
  }
  out.sd = sqrt(fmax(0, variance_of(metric, r, s, r, step, of_reference) +
                            variance_of(metric, r, s, s, step, of_sample)));
  return out;
}
