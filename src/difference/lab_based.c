/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIE 1976 L*a*b* difference (ISO/CIE 11664-4), and what the other formulas on
 * CIELAB share with it. */
#include "difference/difference_private.h"

#include <math.h>

/* True when the hue angle of (a, b) in [0, 360) is 180 degrees or more. */
static bool in_lower_half(double a, double b) {
  return b < 0 || (b == 0 && a < 0);
}

double ef__delta_hue(double a1, double b1, double a2, double b2,
                     double chroma_product) {
  const double dot = a1 * a2 + b1 * b2;
  const double cross = a1 * b2 - b1 * a2;
  if (chroma_product == 0) return 0;
  /* 2 sqrt(C1 C2) sin(h/2), with sin(h/2) = sin h / (2 cos(h/2)) and
   * cos(h/2)^2 = (1 + cos h) / 2. */
  if (dot >= 0) return cross * sqrt(2 / (chroma_product + dot));
  const double size = sqrt(2 * (chroma_product - dot));
  if (cross == 0) return in_lower_half(a1, b1) ? -size : size;
  return copysign(size, cross);
}

void ef__lab_coordinates(const ef_metric *self, ef_xyz xyz,
                         const ef_conditions *conditions,
                         double coordinate[3]) {
  (void)self;
  const ef_lab lab = ef_xyz_to_lab(xyz, conditions->white);
  coordinate[0] = lab.L_star;
  coordinate[1] = lab.a_star;
  coordinate[2] = lab.b_star;
}

void ef__lab_coordinates_of_many(const ef_metric *self, size_t n,
                                 const double *xyz,
                                 const ef_conditions *conditions,
                                 double *coordinate) {
  (void)self;
  ef_xyz_to_lab_batch(n, xyz, conditions->white, coordinate);
}

ef_xyz ef__lab_inverse(const ef_metric *self, const double coordinate[3],
                       const ef_conditions *conditions) {
  (void)self;
  const ef_lab lab = {coordinate[0], coordinate[1], coordinate[2]};
  return ef_lab_to_xyz(lab, conditions->white);
}

void ef__lab_jacobian(const ef_metric *self, ef_xyz xyz,
                      const ef_conditions *conditions, double jacobian[9]) {
  (void)self;
  ef_lab_jacobian(xyz, conditions->white, jacobian);
}

/* First and second derivative of f(t / white), f the cube root above 24/116
 * and its tangent below, from the value f. */
static void slopes(double f, double white, double *first, double *second) {
  if (f > 24.0 / 116) {
    *first = 1 / (3 * f * f * white);
    *second = -2 * *first / (3 * f * f * f * white);
  } else {
    *first = 841.0 / 108 / white;
    *second = 0;
  }
}

/* With L* = 116 fY - 16, a* = 500 (fX - fY), b* = 200 (fY - fZ): each f
 * depends on one tristimulus value, so that the second derivatives of the
 * coordinates only fill the diagonal. */
void ef__lab_carry(const ef_metric *self, const double coordinate[3],
                   const ef_conditions *conditions, const ef__expansion *in,
                   ef__expansion *out) {
  (void)self;
  const ef_xyz white = conditions->white;
  const double f_y = (coordinate[0] + 16) / 116;
  const double f_x = f_y + coordinate[1] / 500;
  const double f_z = f_y - coordinate[2] / 200;
  double d[3], dd[3];
  slopes(f_x, white.X, &d[0], &dd[0]);
  slopes(f_y, white.Y, &d[1], &dd[1]);
  slopes(f_z, white.Z, &d[2], &dd[2]);
  const double *const g = in->gradient, *const h = in->hessian;
  const double g_f[3] = {500 * g[1], 116 * g[0] - 500 * g[1] + 200 * g[2],
                         -200 * g[2]};
  /* With L* = 116 fY - 16, a* = 500 (fX - fY), b* = 200 (fY - fZ). */
  const double x_x = 250000 * h[4], x_z = -100000 * h[5], z_z = 40000 * h[8];
  const double x_y = 58000 * h[1] - x_x - x_z;
  const double y_z = -23200 * h[2] - x_z - z_z;
  const double y_y = 13456 * h[0] - 116000 * h[1] + 46400 * h[2] + x_x +
                     2 * x_z + z_z;
  double *const k = out->hessian;
  k[0] = x_x * d[0] * d[0] + g_f[0] * dd[0];
  k[1] = k[3] = x_y * d[0] * d[1];
  k[2] = k[6] = x_z * d[0] * d[2];
  k[4] = y_y * d[1] * d[1] + g_f[1] * dd[1];
  k[5] = k[7] = y_z * d[1] * d[2];
  k[8] = z_z * d[2] * d[2] + g_f[2] * dd[2];
  for (int i = 0; i < 3; ++i)
    out->gradient[i] = g_f[i] * d[i];
  out->square = in->square;
}

double ef_delta_e_cielab(ef_lab reference, ef_lab sample) {
  const double r[3] = {reference.L_star, reference.a_star, reference.b_star};
  const double s[3] = {sample.L_star, sample.a_star, sample.b_star};
  return ef__euclidean_difference(&ef__metric_cielab, r, s);
}

const ef_metric ef__metric_cielab = {
    .name = "cielab",
    .title = "CIE 1976 L*a*b*",
    .symbol = "Delta E*ab",
    .source = "ISO/CIE 11664-4:2019",
    .jnd = {2.3, "just noticeable, mean over the colour space",
            "Mahy, Van Eycken, Oosterlinck, Color Res. Appl. 19 (1994) "
            "105-121"},
    .coordinates = ef__lab_coordinates,
    .coordinates_of_many = ef__lab_coordinates_of_many,
    .inverse = ef__lab_inverse,
    .jacobian = ef__lab_jacobian,
    .difference = ef__euclidean_difference,
    .differences = ef__euclidean_differences,
    .components = ef__euclidean_components,
    .tensor = ef__euclidean_tensor,
    .expand = ef__euclidean_expand,
    .carry = ef__lab_carry,
    .least = ef__euclidean_least,
};
