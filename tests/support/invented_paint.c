/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "invented_paint.h"

#include "near.h"

const char *const paint_names[PAINTS] = {"white", "red", "yellow", "blue"};

ef_grid paint_grid(void) {
  return (ef_grid){PAINT_SAMPLES, 400, 20, NULL};
}

/* From 1 at short to 0 at long wavelengths. */
static double fall(double nm, double edge_nm, double width_nm) {
  return 1 / (1 + exp((nm - edge_nm) / width_nm));
}

static double bell(double nm, double centre_nm, double width_nm) {
  const double z = (nm - centre_nm) / width_nm;
  return exp(-0.5 * z * z);
}

void paint_constants(double *absorption, double *scattering) {
  for (size_t s = 0; s < PAINT_SAMPLES; s++) {
    const double nm = 400 + 20 * (double)s;
    const double k[PAINTS] = {
        0.0013 + 1.9 * fall(nm, 398, 7), 0.021 + 3.7 * fall(nm, 589, 9),
        0.011 + 3.1 * fall(nm, 503, 10), 0.043 + 4.6 * bell(nm, 619, 47)};
    const double sc[PAINTS] = {
        0.83 + 0.31 * fall(nm, 560, 90), 0.47 - 0.21 * fall(nm, 607, 15),
        0.51 - 0.19 * fall(nm, 517, 16), 0.06 + 0.11 * bell(nm, 468, 39)};
    for (size_t i = 0; i < PAINTS; i++) {
      absorption[i * PAINT_SAMPLES + s] = k[i];
      scattering[i * PAINT_SAMPLES + s] = sc[i];
    }
  }
}

ef_colourants *paint_colourants(bool two_constant) {
  double k[PAINTS * PAINT_SAMPLES], sc[PAINTS * PAINT_SAMPLES];
  const ef_grid grid = paint_grid();
  ef_error error;
  paint_constants(k, sc);
  for (size_t j = 0; !two_constant && j < PAINTS * PAINT_SAMPLES; j++)
    k[j] /= sc[j % PAINT_SAMPLES];
  ef_colourants *set = ef_colourants_new(PAINTS, paint_names, &grid, k,
                                         two_constant ? sc : NULL, &error);
  if (set == NULL)
    fail_msg("%s", error.message);
  return set;
}

void paint_substrate(bool is_light, double *out) {
  for (size_t s = 0; s < PAINT_SAMPLES; s++)
    out[s] = is_light ? 0.83 - 0.004 * (double)s : 0.041 + 0.001 * (double)s;
}
