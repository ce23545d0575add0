/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tristimulus values and their chromaticities (CIE 015:2018).
 * Sums that are not positive have no chromaticity; the comparisons are
 * written so that NaN falls on that side too. */
#include <evenfield/colour.h>

#include <math.h>

static const double not_a_number = (double)NAN;

ef_xyy ef_xyz_to_xyy(ef_xyz xyz) {
  const double sum = xyz.X + xyz.Y + xyz.Z;
  if (!(sum > 0)) return (ef_xyy){not_a_number, not_a_number, xyz.Y};
  return (ef_xyy){xyz.X / sum, xyz.Y / sum, xyz.Y};
}

ef_xyz ef_xyy_to_xyz(ef_xyy xyy) {
  if (xyy.Y == 0) return (ef_xyz){0, 0, 0};
  if (xyy.y == 0) return (ef_xyz){not_a_number, xyy.Y, not_a_number};
  return (ef_xyz){xyy.x / xyy.y * xyy.Y, xyy.Y,
                  (1 - xyy.x - xyy.y) / xyy.y * xyy.Y};
}

ef_uv ef_xyz_to_uv(ef_xyz xyz) {
  const double sum = xyz.X + 15 * xyz.Y + 3 * xyz.Z;
  if (!(sum > 0)) return (ef_uv){not_a_number, not_a_number};
  return (ef_uv){4 * xyz.X / sum, 9 * xyz.Y / sum};
}

ef_uv ef_xy_to_uv(ef_xy xy) {
  /* The sum of ef_xyz_to_uv for X + Y + Z = 1. */
  const double sum = 3 - 2 * xy.x + 12 * xy.y;
  if (!(sum > 0)) return (ef_uv){not_a_number, not_a_number};
  return (ef_uv){4 * xy.x / sum, 9 * xy.y / sum};
}

ef_xy ef_uv_to_xy(ef_uv uv) {
  const double sum = 6 * uv.u_prime - 16 * uv.v_prime + 12;
  if (!(sum > 0)) return (ef_xy){not_a_number, not_a_number};
  return (ef_xy){9 * uv.u_prime / sum, 4 * uv.v_prime / sum};
}

ef_xyz ef_xyz_transform(const double matrix[9], ef_xyz xyz) {
  const double *const m = matrix;
  return (ef_xyz){m[0] * xyz.X + m[1] * xyz.Y + m[2] * xyz.Z,
                  m[3] * xyz.X + m[4] * xyz.Y + m[5] * xyz.Z,
                  m[6] * xyz.X + m[7] * xyz.Y + m[8] * xyz.Z};
}
