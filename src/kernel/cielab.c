/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Distances in coordinates: CIE 1976 L*a*b* (ISO/CIE 11664-4), and every other
 * formula that is one. */
#include "kernel/pairs.h"
#include "kernel/target.h"

EF__INLINE v_double distance(v_point reference, v_point sample,
                             const double *factor) {
  (void)factor;
  const v_double x = sample.x - reference.x;
  const v_double y = sample.y - reference.y;
  const v_double z = sample.z - reference.z;
  return v_sqrt(x * x + y * y + z * z);
}

EF__INLINE v_double scaled_distance(v_point reference, v_point sample,
                                    const double *factor) {
  const v_double x = (sample.x - reference.x) / factor[0];
  const v_double y = (sample.y - reference.y) / factor[1];
  const v_double z = (sample.z - reference.z) / factor[1];
  return v_sqrt(x * x + y * y + z * z);
}

void EF__KERNEL(distance)(size_t n, const double *reference,
                          const double *sample, const double factor[2],
                          double *out) {
  if (factor[0] == 1 && factor[1] == 1)
    v_each_pair(n, reference, sample, distance, factor, out);
  else
    v_each_pair(n, reference, sample, scaled_distance, factor, out);
}
