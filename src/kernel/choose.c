/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The one place that knows which targets there are and which this processor
 * can run. */
#include "kernel/kernels.h"

#include <stdatomic.h>

extern const ef__kernel_table ef__baseline_table;
#ifdef EF__HAS_AVX2
extern const ef__kernel_table ef__avx2_table;
#endif

const ef__kernel_table *ef__kernels_at(size_t i) {
#ifdef EF__HAS_AVX2
  /* The kernels use no fused multiplication (it would round differently from
   * the baseline), but files built for AVX2 may hold what came with it. */
  if (__builtin_cpu_supports("avx2")) {
    if (i == 0) return &ef__avx2_table;
    --i;
  }
#endif
  return i == 0 ? &ef__baseline_table : NULL;
}

const ef__kernel_table *ef__kernels(void) {
  static _Atomic(const ef__kernel_table *) chosen;
  const ef__kernel_table *table =
      atomic_load_explicit(&chosen, memory_order_relaxed);
  if (table == NULL) {
    table = ef__kernels_at(0);
    atomic_store_explicit(&chosen, table, memory_order_relaxed);
  }
  return table;
}
