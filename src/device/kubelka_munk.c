/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reflectance of a layer by Kubelka & Munk. With w = K (K + 2 S), z = sqrt(w)
 * X, c = cosh z and a = sinh z / sqrt(w), the hyperbolic form of Kubelka (1948)
 * is R = (S a - Rg ((K + S) a - c)) / ((K + S - Rg S) a + c), in which nothing
 * goes wrong for S = 0, K = 0 or both. For an infinite layer R = S / (K + S +
 * sqrt(w)). */
#include "device/device_private.h"

#include <float.h>
#include <math.h>

double ef_km_ratio(double reflectance) {
  if (!(reflectance >= 0.0 && reflectance <= 1.0))
    return nan("");
  const double absorbed = 1.0 - reflectance;
  return absorbed * absorbed / (2.0 * reflectance);
}

static double opaque(double k, double s, double slope[2]) {
  const double root = sqrt(k * (k + 2.0 * s));
  const double whole = k + s + root;
  const bool is_clear = !(whole > 0.0);
  if (slope != NULL) {
    /* sqrt(w) at K = eps S: below it the slope would go on to infinity. */
    const double least = sqrt(DBL_EPSILON * (DBL_EPSILON + 2.0)) * s;
    const double divisor = fmax(root, least) * whole;
    slope[0] = is_clear ? 0.0 : -s / divisor;
    slope[1] = is_clear ? 0.0 : k / divisor;
  }
  return is_clear ? 0.0 : s / whole;
}

/* c, a, and their slopes with w, all times exp(-z), which leaves ratios of
 * them alone and cannot overflow. */
typedef struct hyperbolic {
  double c, a, c_w, a_w;
} hyperbolic;

static hyperbolic fill(double w, double x) {
  const double z = sqrt(w) * x, shrink = exp(-z);
  hyperbolic h = {.c = 0.5 * (1.0 + shrink * shrink)};
  h.a = z > 0.0 ? -x * expm1(-2.0 * z) / (2.0 * z) : x;
  h.c_w = 0.5 * x * h.a;
  /* Below 0.1 the difference loses digits, and five terms of the series leave
   * less than 1e-14. */
  const double square = z * z;
  if (square < 0.1) {
    const double series =
        1.0 / 6.0 +
        square * (1.0 / 60.0 +
                  square * (1.0 / 1680.0 +
                            square * (1.0 / 90720.0 + square / 7983360.0)));
    h.a_w = x * x * x * series * shrink;
  } else {
    h.a_w = (x * h.c - h.a) / (2.0 * w);
  }
  return h;
}

static double film(double k, double s, double x, double backing,
                   double slope[2]) {
  const hyperbolic h = fill(k * (k + 2.0 * s), x);
  const double both = k + s, rest = k + s - backing * s;
  const double above = s * h.a - backing * (both * h.a - h.c);
  const double below = rest * h.a + h.c;
  const double r = above / below;
  if (slope == NULL)
    return r;
  const double w_of[2] = {2.0 * both, 2.0 * k};
  for (int i = 0; i < 2; i++) {
    const double a = h.a_w * w_of[i], c = h.c_w * w_of[i];
    const double own = i == 1 ? h.a : 0.0; /* d S / d S times a */
    const double above_i = own + s * a - backing * (h.a + both * a - c);
    const double below_i = (i == 1 ? 1.0 - backing : 1.0) * h.a + rest * a + c;
    slope[i] = (above_i - r * below_i) / below;
  }
  return r;
}

double ef_km_reflectance(double absorption, double scattering, double thickness,
                         double backing, double slope[2]) {
  return isinf(thickness)
             ? opaque(absorption, scattering, slope)
             : film(absorption, scattering, thickness, backing, slope);
}
