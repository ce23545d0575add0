/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "tally.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static int by_value(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

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
  qsort(scratch, n, sizeof *scratch, by_value);
  const double at = 0.95 * (double)(n - 1);
  const size_t i = (size_t)at;
  t.p95 = i + 1 < n
              ? scratch[i] + (at - (double)i) * (scratch[i + 1] - scratch[i])
              : scratch[n - 1];
  return t;
}
