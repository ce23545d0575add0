/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Delta E ITP (Recommendation ITU-R BT.2124-0, on the IC_TC_P of ITU-R
 * BT.2100-2 with the perceptual quantiser): coordinates 720 I, 720 T, 720 P
 * with T = C_T / 2, P = C_P, so that their distance is the difference. Colours
 * count with their luminance in cd/m2; nothing is adapted, so that the neutral
 * axis is at T = P = 0 for a white of D65 only. */
#include <math.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

static const double not_a_number = (double)NAN;
static const double scale = 720; /* BT.2124, eq. for Delta E ITP */
static const double peak_cd_m2 = 10000;

/* XYZ in cd/m2 to cone-like responses: the matrix of BT.2100 (in 4096ths) times
 * the one from XYZ to the linear R, G, B of BT.2020 (primaries 0.708 0.292,
 * 0.170 0.797, 0.131 0.046; white 0.3127 0.3290). */
static const double to_lms[9] = {
    0.35928325901212155,  0.69760511477795,    -0.035891593232028875,
    -0.1920808463704994,  1.100476797037432,   0.07537486585191189,
    0.007079784460747815, 0.07483966621863648, 0.8433265453898765};

/* Compressed responses to I, C_T, C_P (BT.2100, table 7). */
static const double to_ictcp[9] = {0.5,
                                   0.5,
                                   0,
                                   6610 / 4096.0,
                                   -13613 / 4096.0,
                                   7003 / 4096.0,
                                   17933 / 4096.0,
                                   -17390 / 4096.0,
                                   -543 / 4096.0};

/* Perceptual quantiser (BT.2100, table 4; SMPTE ST 2084). */
static const double m_1 = 2610 / 16384.0, m_2 = 2523 / 4096.0 * 128;
static const double c_1 = 3424 / 4096.0, c_2 = 2413 / 4096.0 * 32;
static const double c_3 = 2392 / 4096.0 * 32;

static double quantise_positive(double share) {
  const double p = pow(share, m_1);
  return pow((c_1 + c_2 * p) / (1 + c_3 * p), m_2);
}

/* The value at zero is not zero (7e-7); below, the curve goes on point
 * symmetric about it. */
static double quantise(double share) {
  const double value = quantise_positive(fabs(share));
  return share < 0 ? 2 * quantise_positive(0) - value : value;
}

/* The slope has no limit at zero: below 1e-8 cd/m2, a hundredth of a unit of
 * the difference, that of there. */
static double quantise_slope(double share) {
  const double size = fmax(fabs(share), 1e-12);
  const double p = pow(size, m_1);
  const double top = c_1 + c_2 * p, bottom = 1 + c_3 * p;
  return m_2 * pow(top / bottom, m_2) * (c_2 / top - c_3 / bottom) * m_1 * p /
         size;
}

static double expand_code(double code) {
  const double zero = quantise_positive(0);
  if (code < zero)
    return -expand_code(2 * zero - code);
  const double root = pow(code, 1 / m_2);
  const double top = fmax(root - c_1, 0), bottom = c_2 - c_3 * root;
  return bottom > 0 ? pow(top / bottom, 1 / m_1) : not_a_number;
}

/* XYZ to shares of the peak. */
static double share_of_peak(const ef_conditions *conditions) {
  return ef__white_luminance_cd_m2(conditions) /
         (conditions->white.Y * peak_cd_m2);
}

static void responses(ef_xyz xyz, const ef_conditions *conditions,
                      double lms[3]) {
  const double unit = share_of_peak(conditions);
  const double v[3] = {unit * xyz.X, unit * xyz.Y, unit * xyz.Z};
  ef__mat3_apply(to_lms, v, lms);
}

static void coordinates(const ef_metric *self, ef_xyz xyz,
                        const ef_conditions *conditions, double coordinate[3]) {
  (void)self;
  double lms[3], ictcp[3];
  responses(xyz, conditions, lms);
  for (int i = 0; i < 3; ++i)
    lms[i] = quantise(lms[i]);
  ef__mat3_apply(to_ictcp, lms, ictcp);
  coordinate[0] = scale * ictcp[0];
  coordinate[1] = scale / 2 * ictcp[1];
  coordinate[2] = scale * ictcp[2];
}

static ef_xyz inverse(const ef_metric *self, const double coordinate[3],
                      const ef_conditions *conditions) {
  (void)self;
  const double ictcp[3] = {coordinate[0] / scale, 2 * coordinate[1] / scale,
                           coordinate[2] / scale};
  double from_ictcp[9], from_lms[9], lms[3], v[3];
  ef__mat3_inverse(to_ictcp, from_ictcp); /* both are well conditioned */
  ef__mat3_inverse(to_lms, from_lms);
  ef__mat3_apply(from_ictcp, ictcp, lms);
  for (int i = 0; i < 3; ++i)
    lms[i] = expand_code(lms[i]);
  ef__mat3_apply(from_lms, lms, v);
  const double unit = share_of_peak(conditions);
  return (ef_xyz){v[0] / unit, v[1] / unit, v[2] / unit};
}

static void jacobian(const ef_metric *self, ef_xyz xyz,
                     const ef_conditions *conditions, double j[9]) {
  (void)self;
  double lms[3], slopes[9];
  responses(xyz, conditions, lms);
  const double unit = share_of_peak(conditions);
  for (int i = 0; i < 3; ++i) {
    const double slope = unit * quantise_slope(lms[i]);
    for (int k = 0; k < 3; ++k)
      slopes[3 * i + k] = slope * to_lms[3 * i + k];
  }
  ef__mat3_multiply(to_ictcp, slopes, j);
  for (int k = 0; k < 3; ++k) {
    j[k] *= scale;
    j[3 + k] *= scale / 2;
    j[6 + k] *= scale;
  }
}

const ef_metric ef__metric_itp = {
    .name = "itp",
    .title = "ITP",
    .symbol = "Delta E ITP",
    .source = "Recommendation ITU-R BT.2124-0 (01/2019)",
    .jnd = {1, "just noticeable in the most critical state of adaptation",
            "Recommendation ITU-R BT.2124-0 (01/2019)"},
    .coordinates = coordinates,
    .inverse = inverse,
    .jacobian = jacobian,
    .difference = ef__euclidean_difference,
    .differences = ef__euclidean_differences,
    .components = ef__euclidean_components,
    .tensor = ef__euclidean_tensor,
    .expand = ef__euclidean_expand,
};
