/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Uniform colour spaces on the appearance models (M. R. Luo, G. Cui, C. Li,
 * Color Res. Appl. 31 (2006) 320-330; with CAM16: Li et al. 2017), and the
 * Jacobian of their coordinates. */
#include <evenfield/colour.h>

#include <math.h>

#include "base/base_private.h"
#include "colour/cam_private.h"
#include "kernel/kernels.h"

static const double radian = 0.017453292519943295; /* pi / 180 */

ef_ucs_shape ef_ucs_shape_default(void) {
  return (ef_ucs_shape){0.007, 0.0228};
}

ef_ucs ef_cam_to_ucs(ef_cam cam, ef_ucs_shape shape) {
  const double m = log1p(shape.c2 * cam.M) / shape.c2;
  const double h_rad = cam.h_deg * radian;
  return (ef_ucs){(1 + 100 * shape.c1) * cam.J / (1 + shape.c1 * fabs(cam.J)),
                  m * cos(h_rad), m * sin(h_rad)};
}

void ef_xyz_to_ucs_batch(size_t n, const double *xyz, const ef_cam_model *model,
                         ef_ucs_shape shape, double *ucs) {
  double constant[EF__UCS_CONSTANTS];
  for (int i = 0; i < 9; ++i) constant[i] = model->response[i];
  constant[EF__UCS_SHARE] = model->N_bb / model->A_w;
  constant[EF__UCS_POWER] = model->c * model->z;
  constant[EF__UCS_CHROMA] = pow(model->F_L, 0.25) * model->chroma_factor *
                             pow(50000.0 / 13 * model->N_c * model->N_bb, 0.9);
  constant[EF__UCS_C1] = shape.c1;
  constant[EF__UCS_C2] = shape.c2;
  ef__kernels()->xyz_to_ucs(n, xyz, constant, ucs);
}

ef_cam ef_ucs_to_cam(ef_ucs ucs, ef_ucs_shape shape,
                     const ef_cam_model *model) {
  const double J = ucs.J_prime / (1 + shape.c1 * (100 - fabs(ucs.J_prime)));
  const double m = hypot(ucs.a_prime, ucs.b_prime);
  const double M = expm1(shape.c2 * m) / shape.c2;
  const double h_deg = m > 0 ? atan2(ucs.b_prime, ucs.a_prime) / radian : 0;
  return ef_cam_from_jch(J, M / pow(model->F_L, 0.25), h_deg, model);
}

/* Rows of d(a, b, A / N_bb, u) / d(X, Y, Z), and the values. */
static void opponent_slopes(ef_xyz xyz, const ef_cam_model *model,
                            double value[4], double slope[4][3]) {
  const double v[3] = {xyz.X, xyz.Y, xyz.Z};
  double p[3], d[9];
  ef__mat3_apply(model->response, v, p);
  for (int i = 0; i < 3; ++i) {
    const double rise = ef__cam_compress_slope(p[i]);
    for (int k = 0; k < 3; ++k)
      d[3 * i + k] = rise * model->response[3 * i + k];
    p[i] = ef__cam_compress(p[i]);
  }
  for (int i = 0; i < 4; ++i) {
    const double *const o = ef__cam_opponent[i];
    value[i] = o[0] * p[0] + o[1] * p[1] + o[2] * p[2];
    for (int k = 0; k < 3; ++k) {
      slope[i][k] = o[0] * d[k] + o[1] * d[3 + k] + o[2] * d[6 + k];
    }
  }
  value[3] += EF__CAM_NOISE;
}

/* a' = (M' / r) a, and b' alike, with r the length of (a, b):
 * M = k sqrt|J| (e_t r / u)^0.9, so that
 * d ln M = 0.9 (d ln e_t + d ln r - d ln u) + d ln|J| / 2. */
void ef_ucs_jacobian(ef_xyz xyz, const ef_cam_model *model, ef_ucs_shape shape,
                     double secant_M, double jacobian[9]) {
  double o[4], d[4][3];
  opponent_slopes(xyz, model, o, d);
  const double a = o[0], b = o[1], u = o[3], r = hypot(a, b);
  /* Lightness; the power has no slope of use below 1e-9 of the white's. */
  const double exponent = model->c * model->z;
  const double share = model->N_bb * o[2] / model->A_w;
  const double level = copysign(fmax(fabs(share), 1e-9), share);
  const double J = 100 * copysign(pow(fabs(level), exponent), level);
  const double below = 1 + shape.c1 * fabs(J);
  const double J_per_sum = J * exponent / level * model->N_bb / model->A_w;
  const double rise = (1 + 100 * shape.c1) / (below * below);

  const double scale = pow(model->F_L, 0.25) * model->chroma_factor *
                       sqrt(fabs(J) / 100) *
                       pow(50000.0 / 13 * model->N_c * model->N_bb, 0.9);
  double turn;
  const double h_rad = atan2(b, a);
  const double e_t = ef__cam_eccentricity(h_rad, &turn);
  const double M = scale * pow(e_t * r / u, 0.9);
  const double least = fmax(secant_M, 1e-6);
  if (M < least) {
    const double length =
        pow(least / scale, 1 / 0.9) * u / EF__CAM_MEAN_ECCENTRICITY;
    const double q = log1p(shape.c2 * least) / shape.c2 / length;
    for (int k = 0; k < 3; ++k) {
      jacobian[k] = rise * J_per_sum * d[2][k];
      jacobian[3 + k] = q * d[0][k];
      jacobian[6 + k] = q * d[1][k];
    }
    return;
  }
  const double m = log1p(shape.c2 * M) / shape.c2;
  const double q = m / r, m_per_log = M / (1 + shape.c2 * M);
  for (int k = 0; k < 3; ++k) {
    const double d_J = J_per_sum * d[2][k];
    const double log_r = (a * d[0][k] + b * d[1][k]) / (r * r);
    const double d_h = (a * d[1][k] - b * d[0][k]) / (r * r);
    const double log_M =
        0.9 * (turn / e_t * d_h + log_r - d[3][k] / u) + 0.5 * d_J / J;
    const double d_q = (m_per_log * log_M - m * log_r) / r;
    jacobian[k] = rise * d_J;
    jacobian[3 + k] = q * d[0][k] + a * d_q;
    jacobian[6 + k] = q * d[1][k] + b * d_q;
  }
}
