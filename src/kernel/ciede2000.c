/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIEDE2000 (ISO/CIE 11664-6:2014) of many pairs; the lanes of a vector go
 * through the cases of the formula side by side. Equation numbers are those of
 * G. Sharma, W. Wu, E. N. Dalal, Color Res. Appl. 30 (2005) 21-30. What is not
 * explained here is in src/difference/ciede2000.c. */
#include "kernel/mathematics.h"
#include "kernel/pairs.h"
#include "kernel/target.h"

/* cos and sin of the angles in eq. 15, degrees. */
#define COS_30 0.86602540378443865
#define SIN_30 0.5
#define COS_6 0.99452189536827333
#define SIN_6 0.10452846326765347
#define COS_63 0.45399049973954675
#define SIN_63 0.89100652418836786
/* The direction that eq. 16 counts hues from. */
#define COS_275 0.087155742747658174
#define SIN_275 (-0.99619469809174553)
#define DEGREES_PER_RADIAN 57.295779513082321

/* sqrt(C^7 / (C^7 + 25^7)) of eq. 4 and 17. */
EF__INLINE v_double saturation(v_double chroma) {
  const v_double c2 = chroma * chroma;
  const v_double c7 = c2 * c2 * c2 * chroma;
  return v_sqrt(c7 / (c7 + 6103515625.0));
}

/* T of eq. 15, the multiple angles by the addition theorems. */
EF__INLINE v_double hue_weight(v_double c, v_double s) {
  const v_double c2 = c * c - s * s, s2 = 2 * s * c;
  const v_double c3 = c2 * c - s2 * s, s3 = s2 * c + c2 * s;
  const v_double c4 = c2 * c2 - s2 * s2, s4 = 2 * s2 * c2;
  return 1 - (0.17 * COS_30 * c + 0.17 * SIN_30 * s) + 0.24 * c2 +
         (0.32 * COS_6 * c3 - 0.32 * SIN_6 * s3) -
         (0.20 * COS_63 * c4 + 0.20 * SIN_63 * s4);
}

/* R_T of eq. 16, 17 and 21 for the mean hue with this cosine and sine. From 0
 * to 125 degrees it is 0 beside the 1 it is added to. */
EF__INLINE v_double rotation(v_double c, v_double s, v_double mean_c) {
  const v_int turned = ~((s >= 0) & (c > -0.57));
  if (!v_any(turned)) return v_all(0);
  const v_double from_275 =
      v_atan2(s * COS_275 - c * SIN_275, c * COS_275 + s * SIN_275);
  const v_double u = from_275 * (DEGREES_PER_RADIAN / 25);
  /* 2 Delta theta, up to a third of pi: beyond the pi / 4 that the polynomial
   * is fitted for, so that half of it is taken. */
  const v_double angle = (30 / DEGREES_PER_RADIAN) * v_exp(-(u * u));
  const v_double sine = 2 * v_sin_reduced(angle) * v_cos_reduced(angle);
  return v_keep(turned, -2 * sine * saturation(mean_c));
}

/* What goes from stage to stage. */
typedef struct terms {
  v_double a1, b1, a2, b2;   /* a', b' of both, eq. 5 */
  v_double chroma1, chroma2; /* C', eq. 6 */
  v_double delta_h;          /* Delta H', eq. 11 */
  v_double cos_h, sin_h;     /* of the mean hue, eq. 14 */
  v_double r_t;              /* eq. 21 */
} terms;

EF__INLINE void set_chromas(v_point reference, v_point sample, terms *t) {
  const v_double b1 = reference.z, b2 = sample.z;
  const v_double b1_b1 = b1 * b1, b2_b2 = b2 * b2;
  const v_double c1 = v_sqrt(reference.y * reference.y + b1_b1);
  const v_double c2 = v_sqrt(sample.y * sample.y + b2_b2);
  const v_double g = 1.5 - 0.5 * saturation(0.5 * (c1 + c2)); /* 1 + G, eq. 4 */
  t->a1 = g * reference.y;
  t->a2 = g * sample.y;
  t->b1 = b1;
  t->b2 = b2;
  t->chroma1 = v_sqrt(t->a1 * t->a1 + b1_b1);
  t->chroma2 = v_sqrt(t->a2 * t->a2 + b2_b2);
}

EF__INLINE void set_hues(terms *t) {
  const v_double a1 = t->a1, b1 = t->b1, a2 = t->a2, b2 = t->b2;
  const v_double product = t->chroma1 * t->chroma2;
  /* The side of the hue triangle, as ef__delta_hue takes it. */
  const v_double dot = a1 * a2 + b1 * b2, cross = a1 * b2 - b1 * a2;
  const v_int apart = dot < 0, achromatic = product == 0;
  const v_double side =
      v_sqrt(v_select(apart, 2 * (product - dot), v_all(2)) /
             v_select(apart | achromatic, v_all(1), product + dot));
  const v_int below = (b1 < 0) | ((b1 == 0) & (a1 < 0));
  const v_double sign =
      v_select(cross == 0, v_select(below, v_all(-1), v_all(1)), cross);
  t->delta_h = v_keep(~achromatic,
                      v_select(apart, v_copysign(side, sign), cross * side));
  /* The direction of the mean hue, as in src/difference/ciede2000.c. */
  const v_double p = a1 * t->chroma2, q = a2 * t->chroma1;
  const v_double r = b1 * t->chroma2, s = b2 * t->chroma1;
  const v_double turn = v_select(t->delta_h > 0, v_all(1), v_all(-1));
  v_double x = v_select(apart, (s - r) * turn, p + q);
  v_double y = v_select(apart, (p - q) * turn, r + s);
  x = v_select(achromatic, a1 + a2, x);
  y = v_select(achromatic, b1 + b2, y);
  const v_double length = v_sqrt(x * x + y * y);
  const v_int neutral = length == 0;
  const v_double scale = 1 / v_select(neutral, v_all(1), length);
  t->cos_h = v_select(neutral, v_all(1), x * scale);
  t->sin_h = y * scale;
}

/* Eq. 18 to 20 and 22. */
EF__INLINE v_double total(v_double l1, v_double l2, const terms *t,
                          const double *factor) {
  const v_double mean_c = 0.5 * (t->chroma1 + t->chroma2); /* eq. 13 */
  /* Delta L' / S_L with the root in S_L brought above the line. */
  const v_double from_50 = 0.5 * (l1 + l2) - 50;
  const v_double square_50 = from_50 * from_50;
  const v_double root = v_sqrt(20 + square_50);
  const v_double lightness =
      (l2 - l1) * root / (factor[0] * (root + 0.015 * square_50));
  const v_double chroma =
      (t->chroma2 - t->chroma1) / (factor[1] * (1 + 0.045 * mean_c));
  const v_double weight = hue_weight(t->cos_h, t->sin_h);
  const v_double hue =
      t->delta_h / (factor[2] * (1 + 0.015 * mean_c * weight));
  const v_double square = lightness * lightness + chroma * chroma + hue * hue +
                          t->r_t * chroma * hue;
  /* |R_T| < 2, so the form is not negative but for rounding. */
  return v_sqrt(v_select(square < 0, v_all(0), square));
}

static void differences(size_t n, const double *reference,
                        const double *sample, const double *factor,
                        double *out) {
  enum { STEP = 3 * EF__LANES };
  terms t[V_BLOCK];
  for (size_t i = 0; i < n; ++i) {
    set_chromas(v_load_point(reference + STEP * i),
                v_load_point(sample + STEP * i), &t[i]);
  }
  for (size_t i = 0; i < n; ++i) set_hues(&t[i]);
  for (size_t i = 0; i < n; ++i) {
    t[i].r_t = rotation(t[i].cos_h, t[i].sin_h,
                        0.5 * (t[i].chroma1 + t[i].chroma2));
  }
  for (size_t i = 0; i < n; ++i) {
    const v_point r = v_load_point(reference + STEP * i);
    const v_point s = v_load_point(sample + STEP * i);
    v_store(out + EF__LANES * i, total(r.x, s.x, &t[i], factor));
  }
}

void EF__KERNEL(ciede2000)(size_t n, const double *reference,
                           const double *sample, const double factor[3],
                           double *out) {
  v_each_block(n, reference, sample, differences, factor, out);
}
