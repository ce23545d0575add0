/* SPDX-License-Identifier: GPL-3.0-or-later */
/* DIN99o (DIN 6176:2018; G. Cui, M. R. Luo, B. Rigg, G. Roesler, K. Witt, Color
 * Res. Appl. 27 (2002) 282-290): CIELAB stretched so that its own distance is
 * the difference. Coordinates are those for k_E = k_CH = 1; the factors divide
 * the difference. */
#include <math.h>

#include "difference/difference_private.h"

#define COS_26 0.89879404629916699
#define SIN_26 0.43837114678907740

static const double lightness_scale = 303.67, lightness_rate = 0.0039;
static const double narrowing = 0.83;
static const double chroma_rate = 0.075, chroma_unit = 0.0435;

enum { K_E, K_CH };

/* e and f: a*, b* turned by 26 degrees, and f narrowed. */
static void turned(ef_lab lab, double *e, double *f) {
  *e = lab.a_star * COS_26 + lab.b_star * SIN_26;
  *f = narrowing * (lab.b_star * COS_26 - lab.a_star * SIN_26);
}

/* C99o / G, with its limit on the neutral axis. */
static double stretch(double length) {
  return length > 0 ? log1p(chroma_rate * length) / (chroma_unit * length)
                    : chroma_rate / chroma_unit;
}

static void coordinates(const ef_metric *self, ef_xyz xyz,
                        const ef_conditions *conditions, double coordinate[3]) {
  (void)self;
  const ef_lab lab = ef_xyz_to_lab(xyz, conditions->white);
  double e, f;
  turned(lab, &e, &f);
  const double q = stretch(hypot(e, f));
  /* The hue angle is turned back by 26 degrees. */
  coordinate[0] = lightness_scale * log1p(lightness_rate * lab.L_star);
  coordinate[1] = q * (e * COS_26 - f * SIN_26);
  coordinate[2] = q * (e * SIN_26 + f * COS_26);
}

static ef_xyz inverse(const ef_metric *self, const double coordinate[3],
                      const ef_conditions *conditions) {
  (void)self;
  const double chroma = hypot(coordinate[1], coordinate[2]);
  const double length = expm1(chroma_unit * chroma) / chroma_rate;
  const double q = chroma > 0 ? length / chroma : chroma_unit / chroma_rate;
  const double e = q * (coordinate[1] * COS_26 + coordinate[2] * SIN_26);
  const double f =
      q * (coordinate[2] * COS_26 - coordinate[1] * SIN_26) / narrowing;
  const ef_lab lab = {expm1(coordinate[0] / lightness_scale) / lightness_rate,
                      e * COS_26 - f * SIN_26, e * SIN_26 + f * COS_26};
  return ef_lab_to_xyz(lab, conditions->white);
}

static void jacobian(const ef_metric *self, ef_xyz xyz,
                     const ef_conditions *conditions, double j[9]) {
  (void)self;
  const ef_lab lab = ef_xyz_to_lab(xyz, conditions->white);
  double d_lab[9], e, f;
  ef_lab_jacobian(xyz, conditions->white, d_lab);
  turned(lab, &e, &f);
  const double length = hypot(e, f), q = stretch(length);
  /* Along (e, f) the stretch has another slope than across. */
  const double radial =
      chroma_rate / (chroma_unit * (1 + chroma_rate * length));
  const double p = length > 0 ? e / length : 1;
  const double s = length > 0 ? f / length : 0;
  const double over = length > 0 ? radial - q : 0;
  const double ee = q + over * p * p, ef = over * p * s, ff = q + over * s * s;
  const double light =
      lightness_scale * lightness_rate / (1 + lightness_rate * lab.L_star);
  for (int k = 0; k < 3; ++k) {
    const double d_a = d_lab[3 + k], d_b = d_lab[6 + k];
    const double d_e = d_a * COS_26 + d_b * SIN_26;
    const double d_f = narrowing * (d_b * COS_26 - d_a * SIN_26);
    const double u = ee * d_e + ef * d_f, v = ef * d_e + ff * d_f;
    j[k] = light * d_lab[k];
    j[3 + k] = u * COS_26 - v * SIN_26;
    j[6 + k] = u * SIN_26 + v * COS_26;
  }
}

static ef__scale scale(const ef_metric *self) {
  const double k_e = self->parameter[K_E].value;
  return (ef__scale){k_e, k_e * self->parameter[K_CH].value};
}

const ef_metric ef__metric_din99o = {
    .name = "din99o",
    .title = "DIN99o",
    .symbol = "Delta E 99o",
    .source = "DIN 6176:2018",
    .jnd = {(double)NAN, "", ""},
    .parameter = {{"ke", 1, "divides the difference"},
                  {"kch", 1, "divides the chroma and hue differences"}},
    .coordinates = coordinates,
    .inverse = inverse,
    .jacobian = jacobian,
    .scale = scale,
    .difference = ef__euclidean_difference,
    .differences = ef__euclidean_differences,
    .components = ef__euclidean_components,
    .tensor = ef__euclidean_tensor,
    .expand = ef__euclidean_expand,
};
