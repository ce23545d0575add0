/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The correction for the surface of a layer (Saunderson 1942), and its
 * constants by Fresnel's equations. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>

static const double greatest_index = 3.0;

ef_surface ef_surface_none(void) {
  return (ef_surface){.k1 = 0.0, .k2 = 0.0, .specular_included = true};
}

/* Reflection of diffuse light at a surface from outside: the integral of
 * Fresnel's equations for unpolarised light over the half space, in closed form
 * (Walsh 1926, as in Judd 1942; typed from memory, checked against a numerical
 * integral in the tests). */
static double diffuse_reflection(double n) {
  const double square = n * n, fourth = square * square;
  const double plus = square + 1.0, minus = fourth - 1.0;
  return 0.5 + (n - 1.0) * (3.0 * n + 1.0) / (6.0 * (n + 1.0) * (n + 1.0)) +
         square * (square - 1.0) * (square - 1.0) / (plus * plus * plus) *
             log((n - 1.0) / (n + 1.0)) -
         2.0 * n * square * (square + 2.0 * n - 1.0) / (plus * minus) +
         8.0 * fourth * (fourth + 1.0) / (plus * minus * minus) * log(n);
}

ef_status ef_surface_from_index(double refractive_index, bool specular_included,
                                ef_surface *out, double *r_diffuse,
                                ef_error *error) {
  const double n = refractive_index;
  if (!(n >= 1.0 && n <= greatest_index))
    return ef__error_set(error, EF_INVALID,
                         "refractive index %g; expected 1 to 3", n);
  /* Closer to 1 the closed form loses its digits: at 1.001 six are left. The
   * reflection goes there as 0.33 (n - 1). */
  const double r = n < 1.001 ? (n - 1.0) * diffuse_reflection(1.001) / 0.001
                             : diffuse_reflection(n);
  const double step = (n - 1.0) / (n + 1.0);
  out->k1 = step * step;
  out->k2 = 1.0 - (1.0 - r) / (n * n);
  out->specular_included = specular_included;
  if (r_diffuse != NULL)
    *r_diffuse = r;
  return EF_OK;
}

double ef_surface_outside(const ef_surface *surface, double inside,
                          double *slope) {
  const double through = (1.0 - surface->k1) * (1.0 - surface->k2);
  const double left = 1.0 - surface->k2 * inside;
  if (slope != NULL)
    *slope = through / (left * left);
  return (surface->specular_included ? surface->k1 : 0.0) +
         through * inside / left;
}

double ef_surface_inside(const ef_surface *surface, double outside) {
  const double through = (1.0 - surface->k1) * (1.0 - surface->k2);
  const double net = outside - (surface->specular_included ? surface->k1 : 0.0);
  return net / (through + surface->k2 * net);
}

ef_status ef__surface_check(const ef_surface *surface, ef_error *error) {
  if (surface->k1 >= 0.0 && surface->k1 < 1.0 && surface->k2 >= 0.0 &&
      surface->k2 < 1.0)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "surface constants k1 = %g, k2 = %g; expected 0 or more "
                       "and below 1",
                       surface->k1, surface->k2);
}
