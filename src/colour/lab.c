/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIELAB (ISO/CIE 11664-4:2019) and CIELUV (ISO/CIE 11664-5:2016) with the
 * exact fractions of the standards instead of 7.787, 0.008856 and 903.3. */
#include <evenfield/colour.h>

#include <math.h>

#include "kernel/kernels.h"

static const double join = 24.0 / 116;   /* f at the end of the straight part */
static const double slope = 841.0 / 108; /* of the straight part */
static const double offset = 16.0 / 116; /* f of 0 */
static const double degree = 57.295779513082320877; /* 180 / pi */
static const double not_a_number = (double)NAN;

/* The function of ISO/CIE 11664-4. */
static double compress(double ratio) {
  return ratio > join * join * join ? cbrt(ratio) : slope * ratio + offset;
}

static double compress_slope(double ratio) {
  if (!(ratio > join * join * join)) return slope;
  const double root = cbrt(ratio);
  return 1 / (3 * root * root);
}

static double expand(double f) {
  return f > join ? f * f * f : (f - offset) / slope;
}

static bool is_white(ef_xyz white) {
  return white.X > 0 && white.Y > 0 && white.Z > 0;
}

ef_lab ef_xyz_to_lab(ef_xyz xyz, ef_xyz white) {
  if (!is_white(white)) {
    return (ef_lab){not_a_number, not_a_number, not_a_number};
  }
  const double fx = compress(xyz.X / white.X);
  const double fy = compress(xyz.Y / white.Y);
  const double fz = compress(xyz.Z / white.Z);
  return (ef_lab){116 * fy - 16, 500 * (fx - fy), 200 * (fy - fz)};
}

ef_xyz ef_lab_to_xyz(ef_lab lab, ef_xyz white) {
  if (!is_white(white)) {
    return (ef_xyz){not_a_number, not_a_number, not_a_number};
  }
  const double fy = (lab.L_star + 16) / 116;
  return (ef_xyz){white.X * expand(fy + lab.a_star / 500),
                  white.Y * expand(fy),
                  white.Z * expand(fy - lab.b_star / 200)};
}

void ef_xyz_to_lab_batch(size_t n, const double *xyz, ef_xyz white,
                         double *lab) {
  if (is_white(white)) {
    const double w[3] = {white.X, white.Y, white.Z};
    ef__kernels()->xyz_to_lab(n, xyz, w, lab);
  } else {
    for (size_t i = 0; i < 3 * n; ++i) lab[i] = not_a_number;
  }
}

void ef_lab_jacobian(ef_xyz xyz, ef_xyz white, double jacobian[9]) {
  const bool known = is_white(white);
  const double dx =
      known ? compress_slope(xyz.X / white.X) / white.X : not_a_number;
  const double dy =
      known ? compress_slope(xyz.Y / white.Y) / white.Y : not_a_number;
  const double dz =
      known ? compress_slope(xyz.Z / white.Z) / white.Z : not_a_number;
  const double rows[9] = {0,        116 * dy,  0,        /* L* */
                          500 * dx, -500 * dy, 0,        /* a* */
                          0,        200 * dy,  -200 * dz /* b* */};
  for (int i = 0; i < 9; ++i) jacobian[i] = rows[i];
}

/* Black has no u', v', and ISO/CIE 11664-5 multiplies by L* = 0 there. */
ef_luv ef_xyz_to_luv(ef_xyz xyz, ef_xyz white) {
  if (!is_white(white)) {
    return (ef_luv){not_a_number, not_a_number, not_a_number};
  }
  if (xyz.Y == 0) return (ef_luv){0, 0, 0};
  const double L_star = 116 * compress(xyz.Y / white.Y) - 16;
  const ef_uv uv = ef_xyz_to_uv(xyz);
  const ef_uv neutral = ef_xyz_to_uv(white);
  return (ef_luv){L_star, 13 * L_star * (uv.u_prime - neutral.u_prime),
                  13 * L_star * (uv.v_prime - neutral.v_prime)};
}

ef_xyz ef_luv_to_xyz(ef_luv luv, ef_xyz white) {
  if (!is_white(white)) {
    return (ef_xyz){not_a_number, not_a_number, not_a_number};
  }
  if (luv.L_star == 0) return (ef_xyz){0, 0, 0};
  const ef_uv neutral = ef_xyz_to_uv(white);
  const double u_prime = luv.u_star / (13 * luv.L_star) + neutral.u_prime;
  const double v_prime = luv.v_star / (13 * luv.L_star) + neutral.v_prime;
  const double Y = white.Y * expand((luv.L_star + 16) / 116);
  if (v_prime == 0) return (ef_xyz){not_a_number, Y, not_a_number};
  return (ef_xyz){Y * 9 * u_prime / (4 * v_prime), Y,
                  Y * (12 - 3 * u_prime - 20 * v_prime) / (4 * v_prime)};
}

static ef_lch to_polar(double L_star, double a, double b) {
  if (a == 0 && b == 0) return (ef_lch){L_star, 0, 0};
  double h_deg = degree * atan2(b, a);
  if (h_deg < 0) h_deg += 360;
  /* A small negative angle rounds up to a whole turn. */
  if (h_deg >= 360) h_deg = 0;
  return (ef_lch){L_star, hypot(a, b), h_deg};
}

ef_lch ef_lab_to_lch(ef_lab lab) {
  return to_polar(lab.L_star, lab.a_star, lab.b_star);
}

ef_lch ef_luv_to_lch(ef_luv luv) {
  return to_polar(luv.L_star, luv.u_star, luv.v_star);
}

ef_lab ef_lch_to_lab(ef_lch lch) {
  const double angle = lch.h_deg / degree;
  return (ef_lab){lch.L_star, lch.C_star * cos(angle),
                  lch.C_star * sin(angle)};
}
