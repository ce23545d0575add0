/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CMC(l:c) (ISO 105-J03:2009). Factors l, c. */
#include "kernel/polar.h"
#include "kernel/target.h"

/* cos and sin of the angles of the hue term, degrees. */
#define COS_35 0.81915204428899178
#define SIN_35 0.57357643635104609
#define COS_168 (-0.97814760073380569)
#define SIN_168 0.20791169081775934
#define COS_164 (-0.96126169593831886)
#define SIN_164 0.27563735581699916
#define COS_345 0.96592582628906831
#define SIN_345 (-0.25881904510252074)

/* T times the chroma, by the addition theorems. Hues beyond 345 and below 164
 * degrees lie less than half a turn from either boundary. */
EF__INLINE v_double hue_term(v_double a, v_double b, v_double chroma) {
  const v_int red_to_green = (COS_345 * b - SIN_345 * a > 0) &
                             (a * SIN_164 - b * COS_164 > 0);
  const v_double here = 0.36 * chroma + 0.4 * v_abs(a * COS_35 - b * SIN_35);
  const v_double there = 0.56 * chroma + 0.2 * v_abs(a * COS_168 - b * SIN_168);
  return v_select(red_to_green | (chroma == 0), here, there);
}

EF__INLINE v_double difference(v_point reference, v_point sample,
                               const double *factor) {
  const v_double L_star = reference.x, a = reference.y, b = reference.z;
  const v_double chroma2 = a * a + b * b, chroma = v_sqrt(chroma2);
  /* S_L = up_l / low_l, S_C = up_c / low_c; S_H = S_C (F T + 1 - F) with
   * F = C^2 / sqrt(C^4 + 1900), so that F T = C (T C) / root. */
  const v_int dark = L_star < 16;
  const v_double up_l = v_select(dark, v_all(0.511), 0.040975 * L_star);
  const v_double low_l = v_select(dark, v_all(1), 1 + 0.01765 * L_star);
  const v_double s_l = up_l / low_l;
  const v_double s_c = 0.0638 * chroma / (1 + 0.0131 * chroma) + 0.638;
  const v_double root = v_sqrt(chroma2 * chroma2 + 1900);
  const v_double s_h =
      s_c * (1 - chroma * (chroma - hue_term(a, b, chroma)) / root);
  return v_polar(reference, sample, chroma, factor[0] * s_l, factor[1] * s_c,
                 s_h);
}

void EF__KERNEL(cmc)(size_t n, const double *reference, const double *sample,
                     const double factor[2], double *out) {
  v_each_pair(n, reference, sample, difference, factor, out);
}
