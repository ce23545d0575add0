/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One finish out of many numbers: several angles, repeated readings. */
#include <math.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

static ef_status check_weights(size_t n, const double *weight, double *sum,
                               ef_error *error) {
  *sum = 0;
  for (size_t i = 0; i < n; ++i) {
    const double w = weight != NULL ? weight[i] : 1;
    if (!(w >= 0) || !isfinite(w))
      return ef__error_set(error, EF_INVALID,
                           "the weight of angle %zu is %g, expected a number "
                           "from 0",
                           i + 1, w);
    *sum += w;
  }
  if (*sum > 0 && isfinite(*sum))
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       n == 0 ? "a finish needs at least one angle"
                              : "the weights of the angles sum to %g, expected "
                                "a number above 0",
                       *sum);
}

ef_status ef_angles_combine(size_t n, const double *difference,
                            const double *weight, ef_angles *out,
                            ef_error *error) {
  double sum;
  const ef_status status = check_weights(n, weight, &sum, error);
  if (status != EF_OK)
    return status;
  *out = (ef_angles){.worst = difference[0]};
  for (size_t i = 0; i < n; ++i) {
    const double share = (weight != NULL ? weight[i] : 1) / sum;
    const double d = difference[i];
    out->mean += share * d;
    out->total += share * d * d;
    if (d > out->worst) {
      out->worst = d;
      out->worst_angle = i;
    }
  }
  out->total = sqrt(out->total);
  for (size_t i = n; i-- > 0;) {
    if (!isnan(difference[i]))
      continue;
    out->worst = out->mean = out->total = difference[i];
    out->worst_angle = i;
  }
  return EF_OK;
}

ef_status ef_readings_mean(size_t n, size_t count, const double *value,
                           double *mean, double *sd, ef_error *error) {
  if (n == 0)
    return ef__error_set(error, EF_INVALID, "no reading to take the mean of");
  for (size_t k = 0; k < count; ++k) {
    double sum = 0, squares = 0;
    for (size_t i = 0; i < n; ++i) {
      const double v = value[i * count + k];
      if (!isfinite(v))
        return ef__error_set(error, EF_INVALID,
                             "value %zu of reading %zu is not a finite number",
                             k + 1, i + 1);
      sum += v;
    }
    mean[k] = sum / (double)n;
    if (sd == NULL)
      continue;
    for (size_t i = 0; i < n; ++i) {
      const double off = value[i * count + k] - mean[k];
      squares += off * off;
    }
    sd[k] = sqrt(squares / ((double)n - 1)); /* 0 / 0 is NaN */
  }
  return EF_OK;
}
