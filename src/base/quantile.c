/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

static void swap(double *a, double *b) {
  const double kept = *a;
  *a = *b;
  *b = kept;
}

/* Puts the value of place k (from 0) into its place, nothing larger before it
 * and nothing smaller behind (Hoare 1961, the middle of three as pivot). */
static void select_place(size_t n, double *value, size_t k) {
  size_t low = 0, high = n - 1;
  while (low < high) {
    const size_t middle = low + (high - low) / 2;
    if (value[middle] < value[low]) swap(&value[middle], &value[low]);
    if (value[high] < value[low]) swap(&value[high], &value[low]);
    if (value[high] < value[middle]) swap(&value[high], &value[middle]);
    const double pivot = value[middle];
    size_t i = low, j = high;
    while (i <= j) {
      while (value[i] < pivot) ++i;
      while (value[j] > pivot) --j;
      if (i > j) break;
      swap(&value[i++], &value[j]);
      if (j-- == 0) break;
    }
    if (k <= j && j < high) {
      high = j;
    } else if (k >= i) {
      low = i;
    } else {
      return;
    }
  }
}

double ef_quantile(size_t n, double *value, double p) {
  const double place = p * (double)(n - 1);
  const size_t k = (size_t)place;
  const double rest = place - (double)k;
  select_place(n, value, k);
  if (k + 1 >= n)
    return value[k];
  double next = value[k + 1];
  for (size_t i = k + 2; i < n; ++i) {
    if (value[i] < next) next = value[i];
  }
  return value[k] + rest * (next - value[k]);
}
