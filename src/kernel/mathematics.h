/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Elementary functions of vectors, for finite arguments. The error of each, in
 * units in the last place of the result, is asserted in tests/test_kernel.c.
 * Polynomials are minimax fits of our own (Remez, 50 digits) of the function
 * without its leading terms, which are exact; their own error is below 2^-57
 * unless said. Reductions are those of W. J. Cody & W. Waite, Software Manual
 * for the Elementary Functions, Prentice-Hall 1980 (from memory). */
#ifndef EVENFIELD_KERNEL_MATHEMATICS_H
#define EVENFIELD_KERNEL_MATHEMATICS_H

#include "kernel/vector.h"

/* 1.5 * 2^52: added to a number below 2^51 it rounds it to an integer, which
 * then stands in the low bits. */
#define V_ROUND 6755399441055744.0
#define V_ROUND_BITS 0x4338000000000000

/** The double that is `x`, an integer of up to 51 bits and any sign. */
EF__INLINE v_double v_from_int(v_int x) {
  return (v_double)(x + V_ROUND_BITS) - V_ROUND;
}

/** Cube root for x >= 0, normal or zero. y = x^(-1/3) starts from a third of
 * the exponent and mantissa, off by up to 4 %; with the rest e = 1 - x y^3 it is
 * y (1 - e)^(-1/3), taken to e^3 and then to e: 2e-5, 5e-10. Of x y^2 the upper
 * half of the digits is kept, whose square has no rounding to speak of, and one
 * step of Newton's method gives the lower half. */
EF__INLINE v_double v_cube_root(v_double x) {
  /* The high half of the bits as a number, divided by -3. The constant makes
   * the largest error small; found by search. */
  const v_double high = (v_double)(((v_uint)x >> 32) | 0x4330000000000000) -
                        4503599627370496.0;
  const v_double third = 1430186664.0 - high * (1.0 / 3) + V_ROUND;
  v_double y = (v_double)((v_uint)third << 32);
  v_double e = 1 - x * (y * y) * y;
  y += y * (e * (1.0 / 3 + e * (2.0 / 9 + e * (14.0 / 81))));
  e = 1 - x * (y * y) * y;
  y += y * (e * (1.0 / 3));
  const v_double y2 = y * y;
  const v_int near = (v_int)(x * y2) + (INT64_C(1) << 25);
  const v_double upper = (v_double)(near & -(INT64_C(1) << 26));
  const v_double rest = x - upper * upper * upper;
  return v_keep(x != 0, upper + rest * (y2 * (1.0 / 3)));
}

/** Cube root for x in [2^-100, 2^100], not as exact as v_cube_root but in half
 * the time, and in two steps, so that many roots can be taken in two passes:
 * first y = x^(-1/3) as above but in floats, to 2e-5; with the rest
 * e = 1 - x y^3 the root is x y^2 (1 - e)^(-2/3), taken to e^3 in doubles, where
 * what is left out is 1e-17. */
EF__INLINE v_float v_near_cube_root_seed(v_double a, v_double b) {
  const v_float x = v_narrow(a, b);
  const v_float bits = __builtin_convertvector((v_int32)x, v_float);
  const v_float third = 1419902954.0f - bits * (1.0f / 3);
  const v_float y = (v_float)__builtin_convertvector(third, v_int32);
  const v_float e = 1.0f - x * (y * y) * y;
  return y + y * (e * (1.0f / 3 + e * (2.0f / 9 + e * (14.0f / 81))));
}

EF__INLINE v_double v_near_cube_root(v_double x, v_double seed) {
  const v_double root = x * (seed * seed);
  const v_double e = 1 - root * seed;
  return root + root * (e * (2.0 / 3 + e * (5.0 / 9 + e * (40.0 / 81))));
}

/** exp(x): 0 below -708, at most exp(709) above. */
EF__INLINE v_double v_exp(v_double x) {
  v_double clamped = v_select(x > 709.0, v_all(709), x);
  clamped = v_select(x < -708.0, v_all(-708), clamped);
  const v_double k = clamped * 1.4426950408889634 + V_ROUND;
  const v_double n = k - V_ROUND;
  /* ln 2 in two parts, the first with zeros enough for any n. */
  const v_double r =
      clamped - n * 6.93147180369123816490e-01 - n * 1.90821492927058770002e-10;
  /* exp(r) = 1 + r + r^2 p(r). */
  const v_double u = r * r;
  const v_double even =
      5.00000000000000000e-01 +
      u * (4.16666666666660815e-02 +
           u * (1.38888888891194580e-03 +
                u * (2.48015869216597329e-05 +
                     u * (2.75575843994894822e-07 +
                          u * 2.08262757656735457e-09))));
  const v_double odd =
      1.66666666666666824e-01 +
      u * (8.33333333331678916e-03 +
           u * (1.98412698970045279e-04 +
                u * (2.75572342279213101e-06 + u * 2.51122621565085947e-08)));
  const v_double value = 1 + (r + u * (even + r * odd));
  const v_double power = (v_double)((v_int)((v_uint)k << 52) + (v_int)v_all(1));
  return v_keep(~(x < -708.0), value * power);
}

/** x = 2^n m, m in [sqrt(1/2), sqrt(2)), x > 0 and normal; n is NaN of NaN. */
EF__INLINE v_double v_split(v_double x, v_double *n) {
  const int64_t root_half = 0x3FE6A09E667F3BCD;
  const v_uint bits = (v_uint)x - (uint64_t)root_half;
  /* Shifted as an unsigned number; below 1 it is negative. */
  const v_int biased =
      (v_int)((bits + UINT64_C(0x4000000000000000)) >> 52);
  *n = v_from_int(biased - 1024) + (x - x);
  return (v_double)((bits & UINT64_C(0x000FFFFFFFFFFFFF)) +
                    (uint64_t)root_half);
}

/** ln x, x > 0 and normal. */
EF__INLINE v_double v_log(v_double x) {
  v_double n;
  const v_double m = v_split(x, &n);
  const v_double f = m - 1;
  const v_double s = f / (2 + f);
  const v_double u = s * s, w = u * u;
  const v_double even = 6.66666666666673513e-01 +
                        w * (2.85714287440733850e-01 +
                             w * (1.81835751281643032e-01 +
                                  w * 1.47991453757198160e-01));
  const v_double odd =
      3.99999999994078925e-01 +
      w * (2.22221983825205138e-01 + w * 1.53137521960037298e-01);
  const v_double rest = u * (even + u * odd);
  /* ln m = 2 s + s rest and 2 s = f - s f = f - (f^2/2 - s f^2/2). */
  const v_double half = 0.5 * f * f;
  return n * 6.93147180369123816490e-01 -
         ((half - (s * (half + rest) + n * 1.90821492927058770002e-10)) - f);
}

/** y ln x, of which v_exp makes x^y, for x >= 0, normal or zero, y > 0. In two
 * steps so that many powers can be taken in two passes: one alone is a chain of
 * so many operations that a processor does not see the next one behind it. */
EF__INLINE v_double v_power_log(v_double x, v_double y) {
  const v_int zero = x == 0;
  return v_select(zero, v_all(-1000), y * v_log(v_select(zero, v_all(1), x)));
}

/** x^y for x in [0, 1], 0 or normal, 0 < y <= 4, as a share of full scale: the
 * error is small beside 1, not beside the power. In two steps as above. */
EF__INLINE v_double v_share_log(v_double x, v_double y) {
  /* log2 m = s p(s^2), s = (m - 1) / (m + 1), to 4e-17. Of 0, -1023. */
  v_double n;
  const v_double m = v_split(x, &n);
  const v_double s = (m - 1) / (m + 1);
  const v_double u = s * s, w = u * u;
  const v_double even = 2.8853900817779308 +
                        w * (0.5770780180954004 +
                             w * (0.3206219977393008 +
                                  w * 0.2445116906317551));
  const v_double odd =
      0.9617966939212144 +
      w * (0.41219830305390887 + w * 0.26129169047870915);
  return y * (n + s * (even + u * odd));
}

EF__INLINE v_double v_share_power(v_double log2) {
  const v_double t = v_select(log2 < -1000.0, v_all(-1000), log2);
  const v_double k = t + V_ROUND;
  const v_double r = t - (k - V_ROUND);
  /* 2^r to 3e-16, exact at 0. */
  const v_double u = r * r;
  const v_double even =
      0.24022650695910075 +
      u * (0.009618129107622468 +
           u * (0.00015403530415698848 +
                u * (1.3215458375405602e-06 + u * 7.069444835887659e-09)));
  const v_double odd =
      0.6931471805599501 +
      u * (0.05550410866443989 +
           u * (0.0013333558231472997 +
                u * (1.5252656467406138e-05 + u * 1.0208847987946566e-07)));
  return (v_double)((v_int)(1 + (u * even + r * odd)) +
                    (v_int)((v_uint)k << 52));
}

/** Sine and cosine of r, |r| <= pi / 4. */
EF__INLINE v_double v_sin_reduced(v_double r) {
  const v_double u = r * r, w = u * u;
  const v_double even = -1.66666666666666324e-01 +
                        w * (-1.98412698296426972e-04 +
                             w * -2.50507482065531924e-08);
  const v_double odd =
      8.33333333332221884e-03 +
      w * (2.75573136315332407e-06 + w * 1.58961969862626393e-10);
  return r + r * u * (even + u * odd);
}

EF__INLINE v_double v_cos_reduced(v_double r) {
  const v_double u = r * r, w = u * u;
  const v_double even = 4.16666666666665950e-02 +
                        w * (2.48015872893025693e-05 +
                             w * 2.08757155740121646e-09);
  const v_double odd =
      -1.38888888888738515e-03 +
      w * (-2.75573142979624296e-07 + w * -1.13592343366688801e-11);
  return 1 - (0.5 * u - w * (even + u * odd));
}

/** Sine and cosine, |x| up to 1e5. */
EF__INLINE void v_sin_cos(v_double x, v_double *sine, v_double *cosine) {
  const v_double k = x * 0.63661977236758134 + V_ROUND;
  const v_double n = k - V_ROUND;
  /* pi / 2 in three parts; the first two have zeros for n below 2^20. */
  v_double r = x - n * 1.57079632673412561417e+00;
  r -= n * 6.07710050630396597660e-11;
  r -= n * 2.02226624879595063154e-21;
  const v_double s = v_sin_reduced(r), c = v_cos_reduced(r);
  const v_int quarter = (v_int)k;
  const v_int swap = -(quarter & 1);
  const v_int negative_s = (v_int)((v_uint)(quarter & 2) << 62);
  const v_int negative_c = (v_int)((v_uint)((quarter + 1) & 2) << 62);
  *sine = (v_double)((v_int)v_select(swap, c, s) ^ negative_s);
  *cosine = (v_double)((v_int)v_select(swap, s, c) ^ negative_c);
}

/** Angle of (x, y) in [-pi, pi]; 0 at the origin. */
EF__INLINE v_double v_atan2(v_double y, v_double x) {
  const v_double ax = v_abs(x), ay = v_abs(y);
  const v_int steep = ay > ax;
  const v_double low = v_select(steep, ax, ay), high = v_select(steep, ay, ax);
  /* Above tan(pi / 8): atan t = pi / 4 + atan((t - 1) / (t + 1)). */
  const v_int upper = low > 0.41421356237309503 * high;
  const v_double above = v_select(upper, low - high, low);
  v_double below = v_select(upper, low + high, high);
  below = v_select(below == 0, v_all(1), below);
  const v_double t = above / below;
  const v_double u = t * t, w = u * u;
  const v_double even =
      -3.33333333333331983e-01 +
      w * (-1.42857142802395198e-01 +
           w * (-9.09089782256942702e-02 +
                w * (-6.66311740347248355e-02 +
                     w * (-5.03974273974046455e-02 +
                          w * -1.79192946001612910e-02))));
  const v_double odd =
      1.99999999999539962e-01 +
      w * (1.11111107856714367e-01 +
           w * (7.69206138234458242e-02 +
                w * (5.84798665194421127e-02 + w * 3.80756510641650225e-02)));
  /* The large parts of the angle, each with what its rounding leaves. */
  v_double rad = t + (t * u * (even + u * odd) +
                      v_keep(upper, v_all(3.0616169978683830e-17)));
  rad += v_keep(upper, v_all(0.78539816339744831));
  rad = v_select(steep, 1.5707963267948966 - (rad - 6.1232339957367660e-17),
                 rad);
  rad = v_select(x < 0, 3.1415926535897931 - (rad - 1.2246467991473532e-16),
                 rad);
  return v_copysign(rad, y);
}

#endif
