/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIE 1976 L*u*v* difference (ISO/CIE 11664-5). */
#include <math.h>

#include "difference/difference_private.h"

static void coordinates(const ef_metric *self, ef_xyz xyz,
                        const ef_conditions *conditions, double coordinate[3]) {
  (void)self;
  const ef_luv luv = ef_xyz_to_luv(xyz, conditions->white);
  coordinate[0] = luv.L_star;
  coordinate[1] = luv.u_star;
  coordinate[2] = luv.v_star;
}

static ef_xyz inverse(const ef_metric *self, const double coordinate[3],
                      const ef_conditions *conditions) {
  (void)self;
  const ef_luv luv = {coordinate[0], coordinate[1], coordinate[2]};
  return ef_luv_to_xyz(luv, conditions->white);
}

/* Black has a slope for every direction it is reached from; that along the
 * grey scale is taken: the chromaticity is the white's. */
static void jacobian(const ef_metric *self, ef_xyz xyz,
                     const ef_conditions *conditions, double j[9]) {
  (void)self;
  const ef_xyz white = conditions->white;
  if (xyz.X == 0 && xyz.Y == 0 && xyz.Z == 0) {
    const double dark = 1e-6; /* in the straight part of L* */
    xyz = (ef_xyz){dark * white.X, dark * white.Y, dark * white.Z};
  }
  double lab[9];
  ef_lab_jacobian(xyz, white, lab); /* its first row is d L* */
  const ef_luv luv = ef_xyz_to_luv(xyz, white);
  const ef_uv uv = ef_xyz_to_uv(xyz);
  const double sum = xyz.X + 15 * xyz.Y + 3 * xyz.Z;
  const double share = 13 * luv.L_star / sum;
  /* u' = 4 X / sum, v' = 9 Y / sum. */
  const double d_sum[3] = {1, 15, 3};
  const ef_uv neutral = ef_xyz_to_uv(white);
  const double u = 13 * (uv.u_prime - neutral.u_prime);
  const double v = 13 * (uv.v_prime - neutral.v_prime);
  for (int k = 0; k < 3; ++k) {
    j[k] = lab[k];
    j[3 + k] = share * ((k == 0 ? 4 : 0) - uv.u_prime * d_sum[k]) + u * lab[k];
    j[6 + k] = share * ((k == 1 ? 9 : 0) - uv.v_prime * d_sum[k]) + v * lab[k];
  }
}

const ef_metric ef__metric_cieluv = {
    .name = "cieluv",
    .title = "CIE 1976 L*u*v*",
    .symbol = "Delta E*uv",
    .source = "ISO/CIE 11664-5:2016",
    .jnd = {(double)NAN, "", ""},
    .coordinates = coordinates,
    .inverse = inverse,
    .jacobian = jacobian,
    .difference = ef__euclidean_difference,
    .differences = ef__euclidean_differences,
    .components = ef__euclidean_components,
    .tensor = ef__euclidean_tensor,
    .expand = ef__euclidean_expand,
};
