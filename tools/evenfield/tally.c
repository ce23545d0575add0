/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "tally.h"

#include <math.h>
#include <string.h>

#include <evenfield/base.h>

tally tally_of(size_t n, const double *value, double *scratch) {
  tally t = {
      .n = n, .mean = (double)NAN, .p95 = (double)NAN, .worst = (double)NAN};
  if (n == 0)
    return t;
  double sum = 0.0;
  for (size_t i = 0; i < n; ++i) {
    sum += value[i];
    if (value[i] > value[t.worst_at])
      t.worst_at = i;
  }
  t.mean = sum / (double)n;
  t.worst = value[t.worst_at];
  memcpy(scratch, value, n * sizeof *scratch);
  t.p95 = ef_quantile(n, scratch, 0.95);
  return t;
}
