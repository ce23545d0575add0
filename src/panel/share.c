/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include <evenfield/panel.h>

/* Normal quantile of 97.5 %. */
#define Z 1.959963984540054

ef_estimate ef_share_estimate(size_t shown, size_t positive) {
  const double none = (double)NAN;
  ef_estimate e = {.value = none, .se = none, .low = none, .high = none};
  if (shown == 0 || positive > shown)
    return e;
  const double n = (double)shown, p = (double)positive / n;
  const double middle = (p + Z * Z / (2.0 * n)) / (1.0 + Z * Z / n);
  const double half =
      Z * sqrt(p * (1.0 - p) / n + Z * Z / (4.0 * n * n)) / (1.0 + Z * Z / n);
  e.value = p;
  e.se = sqrt(p * (1.0 - p) / n);
  e.low = positive == 0 ? 0.0 : middle - half;
  e.high = positive == shown ? 1.0 : middle + half;
  return e;
}
