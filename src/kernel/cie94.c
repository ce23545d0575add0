/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIE94 (CIE 116-1995). Factors k_L, k_C, k_H, K_1, K_2. */
#include "kernel/polar.h"
#include "kernel/target.h"

EF__INLINE v_double difference(v_point reference, v_point sample,
                               const double *factor) {
  const v_double chroma =
      v_sqrt(reference.y * reference.y + reference.z * reference.z);
  return v_polar(reference, sample, chroma, v_all(factor[0]),
                 factor[1] * (1 + factor[3] * chroma),
                 factor[2] * (1 + factor[4] * chroma));
}

void EF__KERNEL(cie94)(size_t n, const double *reference, const double *sample,
                       const double factor[5], double *out) {
  v_each_pair(n, reference, sample, difference, factor, out);
}
