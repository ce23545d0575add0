/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIEDE2000 (ISO/CIE 11664-6:2014) of one reference to many samples in floats,
 * for a look over many colours of which few are then taken up: the exponential
 * and the angles of the rotation term by short polynomials, no last root.
 * Equation numbers as in ciede2000.c. */
#include "kernel/target.h"
#include "kernel/vector.h"

#define COS_30 0.8660254f
#define SIN_30 0.5f
#define COS_6 0.9945219f
#define SIN_6 0.10452846f
#define COS_63 0.45399050f
#define SIN_63 0.8910065f
#define COS_275 0.08715574f
#define SIN_275 (-0.9961947f)

/* sqrt(C^7 / (C^7 + 25^7)) of eq. 4 and 17. */
EF__INLINE v_float saturation(v_float chroma) {
  const v_float c = chroma * (1.0f / 25), c2 = c * c;
  const v_float c7 = c2 * c2 * c2 * c;
  return v_sqrt_float(c7 / (c7 + 1));
}

/* 2^x for x <= 0, as 0 below -120; error below 1e-5. */
EF__INLINE v_float power_of_2(v_float x) {
  const float to_integer = 12582912.0f; /* 1.5 * 2^23: has no fraction left */
  const v_int32 tiny = x < -120.0f;
  x = v_select_float(tiny, x * 0 - 120.0f, x);
  const v_float shifted = x + to_integer;
  const v_float f = x - (shifted - to_integer);
  const v_float p =
      1 + f * (0.6931472f +
               f * (0.2402265f + f * (0.0555041f + f * 0.0096181f)));
  return (v_float)((v_int32)p + ((v_int32)shifted << 23));
}

/* -R_T without its chroma, eq. 16 and 21, from the cosine of the angle between
 * the mean hue and 275 degrees: its square in powers of 1 - cos. Near 180
 * degrees off, where they fail, the exponential is nothing. */
EF__INLINE v_float rotation(v_float cosine) {
  const v_float q = 1 - cosine;
  const v_float square =
      q * (2 + q * (0.3333333f + q * (0.0888889f + q * (0.0285714f +
                                                        q * 0.0101587f))));
  /* (180 / pi / 25)^2 / ln 2 */
  const v_float e = power_of_2(square * -7.5778f);
  const v_float angle = 1.0471976f * e, a2 = angle * angle;
  return 2 * angle * (1 - a2 * (0.1666667f - a2 * (0.0083333f -
                                                   a2 * 0.0001984f)));
}

/* T of eq. 15. */
EF__INLINE v_float hue_weight(v_float c, v_float s) {
  const v_float c2 = c * c - s * s, s2 = 2 * s * c;
  const v_float c3 = c2 * c - s2 * s, s3 = s2 * c + c2 * s;
  const v_float c4 = c2 * c2 - s2 * s2, s4 = 2 * s2 * c2;
  return 1 - (0.17f * COS_30 * c + 0.17f * SIN_30 * s) + 0.24f * c2 +
         (0.32f * COS_6 * c3 - 0.32f * SIN_6 * s3) -
         (0.20f * COS_63 * c4 + 0.20f * SIN_63 * s4);
}

/* What goes from stage to stage: a formula so long is done for many vectors
 * stage by stage, see V_BLOCK. */
typedef struct terms {
  v_float a1, a2;           /* a', eq. 5 */
  v_float chroma1, chroma2; /* C', eq. 6 */
  v_float delta_h;          /* Delta H', eq. 11 */
  v_float cos_h, sin_h;     /* of the mean hue, eq. 14 */
} terms;

EF__INLINE void set_chromas(const float *reference, const float *sample,
                            terms *t) {
  const float a1 = reference[1], b1 = reference[2];
  const v_float a2 = v_float_load(sample + EF__ROUGH_BLOCK);
  const v_float b2 = v_float_load(sample + 2 * EF__ROUGH_BLOCK);
  const v_float b2_b2 = b2 * b2, b1_b1 = a2 * 0 + b1 * b1;
  const v_float c1 = v_sqrt_float(b1_b1 + a1 * a1);
  const v_float c2 = v_sqrt_float(a2 * a2 + b2_b2);
  const v_float g = 1.5f - 0.5f * saturation(0.5f * (c1 + c2));
  t->a1 = g * a1;
  t->a2 = g * a2;
  t->chroma1 = v_sqrt_float(t->a1 * t->a1 + b1_b1);
  t->chroma2 = v_sqrt_float(t->a2 * t->a2 + b2_b2);
}

/* The direction of the mean hue is that of the sum of both, or where they are
 * more than a right angle apart of their difference, turned. */
EF__INLINE void set_hues(const float *reference, const float *sample,
                         terms *t) {
  const float b1 = reference[2];
  const v_float a1 = t->a1, a2 = t->a2;
  const v_float b2 = v_float_load(sample + 2 * EF__ROUGH_BLOCK);
  const v_float product = t->chroma1 * t->chroma2, none = a2 * 0;
  const v_float dot = a1 * a2 + b1 * b2, cross = a1 * b2 - b1 * a2;
  const v_int32 is_apart = dot < 0, is_right = cross < 0;
  const v_float between =
      v_select_float(product > dot, product - dot, none);
  const v_float side = v_sqrt_float(2 * between);
  t->delta_h = v_select_float(is_right, -side, side);
  const v_float p = a1 * t->chroma2, q = a2 * t->chroma1;
  const v_float r = b1 * t->chroma2, s = b2 * t->chroma1;
  const v_float turn = v_select_float(is_right, none - 1, none + 1);
  const v_float x = v_select_float(is_apart, (s - r) * turn, p + q);
  const v_float y = v_select_float(is_apart, (p - q) * turn, r + s);
  const v_float scale = 1 / (v_sqrt_float(x * x + y * y) + 1e-30f);
  t->cos_h = x * scale;
  t->sin_h = y * scale;
}

/* Eq. 18 to 22; `share` is 1 / k_L, 1 / k_C, 1 / k_H. */
EF__INLINE v_float total(float l1, v_float l2, const float *share,
                         const terms *t) {
  const v_float mean_c = 0.5f * (t->chroma1 + t->chroma2);
  const v_float s_c = 1 + 0.045f * mean_c;
  const v_float s_h = 1 + 0.015f * mean_c * hue_weight(t->cos_h, t->sin_h);
  const v_float both = 1 / (s_c * s_h);
  const v_float chroma = share[1] * (t->chroma2 - t->chroma1) * (both * s_h);
  const v_float hue = share[2] * t->delta_h * (both * s_c);
  const v_float from_50 = 0.5f * (l2 + l1) - 50;
  const v_float square_50 = from_50 * from_50;
  const v_float root = v_sqrt_float(20 + square_50);
  const v_float lightness =
      share[0] * (l2 - l1) * root / (root + 0.015f * square_50);
  const v_float turned = rotation(t->cos_h * COS_275 + t->sin_h * SIN_275) *
                         saturation(mean_c);
  return lightness * lightness + chroma * chroma + hue * hue -
         turned * chroma * hue;
}

enum { STEP = 3 * EF__ROUGH_BLOCK, STAGE = 16 };

/* n blocks, of which each is PARTS vectors. */
enum { PARTS = EF__ROUGH_BLOCK / V_FLOATS };
EF__INLINE void squares(size_t n, const float *reference, const float *share,
                        const float *sample, float *square) {
  terms t[STAGE * PARTS];
  for (size_t i = 0; i < n * PARTS; ++i) {
    const float *const at = sample + i / PARTS * STEP + i % PARTS * V_FLOATS;
    set_chromas(reference, at, &t[i]);
  }
  for (size_t i = 0; i < n * PARTS; ++i) {
    const float *const at = sample + i / PARTS * STEP + i % PARTS * V_FLOATS;
    set_hues(reference, at, &t[i]);
  }
  for (size_t i = 0; i < n * PARTS; ++i) {
    const float *const at = sample + i / PARTS * STEP + i % PARTS * V_FLOATS;
    v_float_store(square + V_FLOATS * i,
                  total(reference[0], v_float_load(at), share, &t[i]));
  }
}

void EF__KERNEL(ciede2000_rough)(size_t n, const float reference[3],
                                 const float factor[3], const float *sample,
                                 float *square) {
  const float share[3] = {1 / factor[0], 1 / factor[1], 1 / factor[2]};
  for (size_t i = 0; i < n; i += STAGE) {
    squares(n - i < STAGE ? n - i : STAGE, reference, share, sample + STEP * i,
            square + EF__ROUGH_BLOCK * i);
  }
}
