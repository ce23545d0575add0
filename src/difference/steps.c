/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Steps of the lighting trade: circles in u', v' and ellipses about the
 * standard colours of lamps. */
#include <math.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

static const double step_radius = 0.0011; /* CIE TN 001:2014 */

ef_ellipse ef_step_circle(ef_uv center, double n_steps) {
  return ef_ellipse_of_axes((double[2]){center.u_prime, center.v_prime},
                            step_radius * n_steps, step_radius * n_steps, 0);
}

double ef_step_count(ef_uv center, ef_uv at) {
  return hypot(at.u_prime - center.u_prime, at.v_prime - center.v_prime) /
         step_radius;
}

/* IEC 60081 and ANSI C78.376: centres, and coefficients in 1e4, g12 being half
 * the published 2 g12. The coefficients are from memory; semi-axes and angles
 * remembered separately agree to 1.1 % and 0.01 degrees but for F2700, whose
 * coefficients nothing confirms. */
static const ef_lamp_colour lamps[] = {
    {"F6500", {0.313, 0.337}, 86e4, -40e4, 45e4},
    {"F5000", {0.346, 0.359}, 56e4, -25e4, 28e4},
    {"F4000", {0.380, 0.380}, 39.5e4, -21.5e4, 26e4},
    {"F3500", {0.409, 0.394}, 38e4, -20e4, 25e4},
    {"F3000", {0.440, 0.403}, 39e4, -19.5e4, 27.5e4},
    {"F2700", {0.463, 0.420}, 44e4, -18.6e4, 27e4},
};
enum { N_LAMPS = sizeof lamps / sizeof *lamps };

size_t ef_lamp_count(void) {
  return N_LAMPS;
}

const ef_lamp_colour *ef_lamp_at(size_t i) {
  return i < N_LAMPS ? &lamps[i] : NULL;
}

const ef_lamp_colour *ef_lamp_find(const char *name, ef_error *error) {
  const char *known[N_LAMPS];
  for (size_t i = 0; i < N_LAMPS; ++i) {
    known[i] = lamps[i].name;
    if (name != NULL && ef__name_equal(name, known[i]))
      return &lamps[i];
  }
  ef__error_unknown(error, "standard lamp colour", name != NULL ? name : "",
                    known, N_LAMPS);
  return NULL;
}

ef_ellipse ef_lamp_ellipse(const ef_lamp_colour *lamp, double n_steps) {
  const double unit = 1 / (n_steps * n_steps);
  return ef_ellipse_of_form((double[2]){lamp->center.x, lamp->center.y},
                            lamp->g11 * unit, lamp->g12 * unit,
                            lamp->g22 * unit);
}
