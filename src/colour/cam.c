/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIECAM02 (CIE 159:2004) and CIECAM16 (CIE 248:2022; Li et al., Color Res.
 * Appl. 42 (2017) 703-718, doi 10.1002/col.22131). Both are the same but for
 * the responses that adapt and compress: CIECAM02 adapts in CAT02 and
 * compresses Hunt-Pointer-Estevez responses, CIECAM16 does both in CAT16. */
#include <evenfield/colour.h>

#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "colour/cam_private.h"

static const double radian = 0.017453292519943295; /* pi / 180 */
static const double not_a_number = (double)NAN;

static const double cat02[9] = {/* CIE 159:2004 */
                                0.7328, 0.4296, -0.1624, -0.7036, 1.6975,
                                0.0061, 0.0030, 0.0136,  0.9834};
static const double cat16[9] = {/* Li et al. 2017 */
                                0.401288,  0.650173, -0.051461,
                                -0.250268, 1.204414, 0.045854,
                                -0.002079, 0.048952, 0.953127};
/* Hunt-Pointer-Estevez, equal-energy normalisation (CIE 159:2004). */
static const double hpe[9] = {0.38971, 0.68898, -0.07868, -0.22981, 1.18340,
                              0.04641, 0,       0,        1};

const double ef__cam_opponent[4][3] = {
    {1, -12.0 / 11, 1.0 / 11},
    {1.0 / 9, 1.0 / 9, -2.0 / 9},
    {2, 1, 1.0 / 20},
    {1, 1, 21.0 / 20},
};

/* F, c, N_c of the surrounds (CIE 159:2004, table 1). */
static const double surround_table[][3] = {
    [EF_SURROUND_AVERAGE] = {1, 0.69, 1},
    [EF_SURROUND_DIM] = {0.9, 0.59, 0.9},
    [EF_SURROUND_DARK] = {0.8, 0.525, 0.8},
};
static const char *const surround_names[] = {
    [EF_SURROUND_AVERAGE] = "average",
    [EF_SURROUND_DIM] = "dim",
    [EF_SURROUND_DARK] = "dark",
};
enum { N_SURROUNDS = sizeof surround_names / sizeof *surround_names };

const char *ef_surround_name(ef_surround surround) {
  return (size_t)surround < N_SURROUNDS ? surround_names[surround] : "unknown";
}

ef_status ef_surround_find(const char *name, ef_surround *out,
                           ef_error *error) {
  for (size_t i = 0; i < N_SURROUNDS; ++i) {
    if (name == NULL || !ef__name_equal(name, surround_names[i]))
      continue;
    *out = (ef_surround)i;
    return EF_OK;
  }
  return ef__error_unknown(error, "surround", name != NULL ? name : "",
                           surround_names, N_SURROUNDS);
}

ef_cam_viewing ef_cam_viewing_default(ef_xyz white) {
  return (ef_cam_viewing){.white = white,
                          .adapting_luminance_cd_m2 = 63.66197723675813,
                          .background_Y = white.Y / 5,
                          .surround = EF_SURROUND_AVERAGE,
                          .discount_illuminant = false};
}

double ef__cam_compress(double p) {
  const double q = pow(fabs(p), 0.42);
  return copysign(400 * q / (q + 27.13), p);
}

double ef__cam_compress_slope(double p) {
  const double size = fmax(fabs(p), 1e-9);
  const double q = pow(size, 0.42);
  return 400 * 0.42 * 27.13 * q / (size * (q + 27.13) * (q + 27.13));
}

static double stretch(double r) {
  const double size = fabs(r);
  if (!(size < 400))
    return not_a_number; /* above any stimulus */
  return copysign(pow(27.13 * size / (400 - size), 1 / 0.42), r);
}

double ef__cam_eccentricity(double h_rad, double *slope) {
  if (slope != NULL)
    *slope = -sin(h_rad + 2) / 4;
  return (cos(h_rad + 2) + 3.8) / 4;
}

/* ---- A model in a viewing ---------------------------------------------- */

static ef_status check_viewing(ef_cam_version version, const ef_cam_viewing *v,
                               ef_error *error) {
  if (version != EF_CAM_02 && version != EF_CAM_16) {
    return ef__error_set(error, EF_INVALID,
                         "appearance model %d is not defined", (int)version);
  }
  if ((size_t)v->surround >= N_SURROUNDS) {
    return ef__error_set(error, EF_INVALID, "surround %d is not defined",
                         (int)v->surround);
  }
  const struct {
    const char *what;
    double value;
  } positive[] = {
      {"X of the white", v->white.X},
      {"Y of the white", v->white.Y},
      {"Z of the white", v->white.Z},
      {"the adapting luminance in cd/m2", v->adapting_luminance_cd_m2},
      {"Y of the background", v->background_Y},
  };
  for (size_t i = 0; i < sizeof positive / sizeof *positive; ++i) {
    if (positive[i].value > 0 && isfinite(positive[i].value))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "%s is %g; the appearance model needs a finite value "
                         "above zero",
                         positive[i].what, positive[i].value);
  }
  return EF_OK;
}

/* F_L, luminance-level adaptation (CIE 159, 5.1). */
static double luminance_level(double adapting_luminance_cd_m2) {
  const double k = 1 / (5 * adapting_luminance_cd_m2 + 1);
  const double k4 = k * k * k * k;
  const double rest = 1 - k4;
  return 0.2 * k4 * 5 * adapting_luminance_cd_m2 +
         0.1 * rest * rest * cbrt(5 * adapting_luminance_cd_m2);
}

/* Everything before the compression is linear: adaptation by the factors of
 * CIE 159, 5.2, the change to cones in CIECAM02, and F_L / 100. */
static ef_status set_linear_part(ef_cam_version version,
                                 const ef_cam_viewing *v, ef_cam_model *out,
                                 ef_error *error) {
  const double *const sharp = version == EF_CAM_02 ? cat02 : cat16;
  const double white[3] = {v->white.X, v->white.Y, v->white.Z};
  double white_response[3];
  ef__mat3_apply(sharp, white, white_response);
  double adapted[9];
  for (int i = 0; i < 3; ++i) {
    if (!(white_response[i] > 0)) {
      return ef__error_set(error, EF_INVALID,
                           "white X %g, Y %g, Z %g has a cone response that "
                           "is not positive, so nothing can be adapted to it",
                           white[0], white[1], white[2]);
    }
    const double factor = out->D * white[1] / white_response[i] + 1 - out->D;
    for (int k = 0; k < 3; ++k) {
      adapted[3 * i + k] = sharp[3 * i + k] * factor * out->F_L / 100;
    }
  }
  if (version == EF_CAM_02) {
    double back[9], to_cones[9];
    ef__mat3_inverse(cat02, back); /* well conditioned */
    ef__mat3_multiply(hpe, back, to_cones);
    ef__mat3_multiply(to_cones, adapted, out->response);
  } else {
    memcpy(out->response, adapted, sizeof adapted);
  }
  ef__mat3_inverse(out->response, out->stimulus);
  return EF_OK;
}

/* Row `row` of the opponent responses to an XYZ. */
static void opponent(const ef_cam_model *model, ef_xyz xyz, double out[4]) {
  const double v[3] = {xyz.X, xyz.Y, xyz.Z};
  double p[3];
  ef__mat3_apply(model->response, v, p);
  for (int i = 0; i < 3; ++i)
    p[i] = ef__cam_compress(p[i]);
  for (int i = 0; i < 4; ++i) {
    const double *const row = ef__cam_opponent[i];
    out[i] = row[0] * p[0] + row[1] * p[1] + row[2] * p[2];
  }
}

ef_status ef_cam_model_set(ef_cam_version version,
                           const ef_cam_viewing *viewing, ef_cam_model *out,
                           ef_error *error) {
  ef_cam_model m = {0};
  ef_status status = check_viewing(version, viewing, error);
  if (status != EF_OK)
    return status;
  const double *const surround = surround_table[viewing->surround];
  const double L_A = viewing->adapting_luminance_cd_m2;
  const double n = viewing->background_Y / viewing->white.Y;
  m.F_L = luminance_level(L_A);
  m.D = surround[0] * (1 - exp((-L_A - 42) / 92) / 3.6);
  if (m.D < 0)
    m.D = 0;
  if (m.D > 1 || viewing->discount_illuminant)
    m.D = 1;
  m.c = surround[1];
  m.N_c = surround[2];
  m.N_bb = 0.725 * pow(n, -0.2);
  m.z = 1.48 + sqrt(n);
  /* Positive for every background: 0.29^n < 1. */
  m.chroma_factor = pow(1.64 - pow(0.29, n), 0.73);
  status = set_linear_part(version, viewing, &m, error);
  if (status != EF_OK)
    return status;
  double white[4];
  opponent(&m, viewing->white, white);
  m.A_w = m.N_bb * white[2];
  *out = m;
  return EF_OK;
}

/* ---- Forward ----------------------------------------------------------- */

/* Unique hues: angle, eccentricity (CIE 159, table 3); 100 H units each. */
static const double hue_table[5][2] = {
    {20.14, 0.8}, {90.00, 0.7}, {164.25, 1.0}, {237.53, 1.2}, {380.14, 0.8}};

static double quadrature(double h_deg) {
  const double h = h_deg < hue_table[0][0] ? h_deg + 360 : h_deg;
  int i = 0;
  while (i < 3 && h >= hue_table[i + 1][0])
    ++i;
  const double from = (h - hue_table[i][0]) / hue_table[i][1];
  const double to = (hue_table[i + 1][0] - h) / hue_table[i + 1][1];
  const double H = 100 * i + 100 * from / (from + to);
  return H < 400 ? H : 0; /* just short of the first unique hue */
}

double ef_cam_hue_deg(double H) {
  if (!isfinite(H))
    return not_a_number;
  double turn = fmod(H, 400);
  if (turn < 0)
    turn += 400;
  const int i = turn < 400 ? (int)(turn / 100) : 0;
  const double share = turn / 100 - i;
  const double near = share * hue_table[i][1];
  const double far = (1 - share) * hue_table[i + 1][1];
  /* from / (from + to) = share, solved for the angle. */
  const double h =
      (hue_table[i + 1][0] * near + hue_table[i][0] * far) / (near + far);
  return h >= 360 ? h - 360 : h;
}

static double signed_power(double base, double exponent) {
  return copysign(pow(fabs(base), exponent), base);
}

/* Q, M, s and H from J, C and h_deg. */
static void complete(ef_cam *cam, const ef_cam_model *model) {
  const double root = signed_power(cam->J / 100, 0.5);
  const double level = pow(model->F_L, 0.25);
  cam->Q = 4 / model->c * root * (model->A_w + 4) * level;
  cam->M = cam->C * level;
  cam->s = cam->M == 0 ? 0 : 100 * sqrt(cam->M / cam->Q);
  cam->H = isfinite(cam->h_deg) ? quadrature(cam->h_deg) : not_a_number;
}

/* Factor of (e_t r / u)^0.9 at lightness J. */
static double chroma_scale(double J, const ef_cam_model *model) {
  return sqrt(fabs(J) / 100) * model->chroma_factor *
         pow(50000.0 / 13 * model->N_c * model->N_bb, 0.9);
}

static double hue_angle(double a, double b) {
  const double h_deg = atan2(b, a) / radian;
  return h_deg < 0 ? (h_deg + 360 < 360 ? h_deg + 360 : 0) : h_deg;
}

ef_cam ef_xyz_to_cam(ef_xyz xyz, const ef_cam_model *model) {
  double o[4];
  opponent(model, xyz, o);
  ef_cam cam = {.J = 100 * signed_power(model->N_bb * o[2] / model->A_w,
                                        model->c * model->z)};
  const double r = hypot(o[0], o[1]), u = o[3] + EF__CAM_NOISE;
  if (u > 0) {
    const double h_rad = atan2(o[1], o[0]);
    const double e_t = ef__cam_eccentricity(h_rad, NULL);
    cam.h_deg = r > 0 ? hue_angle(o[0], o[1]) : 0;
    cam.C = chroma_scale(cam.J, model) * pow(e_t * r / u, 0.9);
  } else {
    cam.h_deg = cam.C = not_a_number;
  }
  complete(&cam, model);
  return cam;
}

/* ---- Inverse ----------------------------------------------------------- */

/* With A known and the direction (cos h, sin h) of (a, b) given, t fixes the
 * length r: u = A / N_bb - (671 a + 6588 b) / 1403 is linear in it. */
ef_xyz ef_cam_to_xyz(ef_cam cam, const ef_cam_model *model) {
  const double nothing = not_a_number;
  const double sum = model->A_w / model->N_bb *
                     signed_power(cam.J / 100, 1 / (model->c * model->z));
  double length = 0;
  const double h_rad = cam.h_deg * radian;
  const double cos_h = cos(h_rad), sin_h = sin(h_rad);
  if (cam.C != 0) {
    const double share = pow(cam.C / chroma_scale(cam.J, model), 1 / 0.9) /
                         ef__cam_eccentricity(h_rad, NULL);
    const double below = 1 + share * (671 * cos_h + 6588 * sin_h) / 1403;
    length = share * (sum + EF__CAM_NOISE) / below;
    if (!(below > 0 && length >= 0))
      return (ef_xyz){nothing, nothing, nothing};
  }
  const double a = length * cos_h, b = length * sin_h;
  const double p[3] = {stretch((460 * sum + 451 * a + 288 * b) / 1403),
                       stretch((460 * sum - 891 * a - 261 * b) / 1403),
                       stretch((460 * sum - 220 * a - 6300 * b) / 1403)};
  double v[3];
  ef__mat3_apply(model->stimulus, p, v);
  return (ef_xyz){v[0], v[1], v[2]};
}

ef_cam ef_cam_from_jch(double J, double C, double h_deg,
                       const ef_cam_model *model) {
  double turn = fmod(h_deg, 360);
  if (turn < 0)
    turn += 360;
  ef_cam cam = {.J = J, .C = C, .h_deg = turn < 360 ? turn : 0};
  if (isnan(turn))
    cam.h_deg = not_a_number;
  complete(&cam, model);
  return cam;
}

ef_cam ef_cam_from_qmh(double Q, double M, double h_deg,
                       const ef_cam_model *model) {
  const double level = pow(model->F_L, 0.25);
  const double root = Q * model->c / (4 * (model->A_w + 4) * level);
  return ef_cam_from_jch(100 * root * fabs(root), M / level, h_deg, model);
}
