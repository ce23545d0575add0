/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ellipses as quadratic forms and as axes. */
#include <math.h>

#include "difference/difference_private.h"

static const double radian = 0.017453292519943295; /* pi / 180 */

ef_ellipse ef_ellipse_of_form(const double center[2], double g11, double g12,
                              double g22) {
  const double mean = (g11 + g22) / 2, half = (g11 - g22) / 2;
  const double spread = hypot(half, g12);
  /* The smaller root by the determinant: without cancellation. */
  const double large = mean + spread;
  const double small = (g11 * g22 - g12 * g12) / large;
  ef_ellipse e = {.center = {center[0], center[1]},
                  .semi_major = (double)NAN,
                  .semi_minor = (double)NAN,
                  .angle_deg = (double)NAN,
                  .g11 = g11,
                  .g12 = g12,
                  .g22 = g22};
  if (!(g11 > 0 && small > 0 && isfinite(large)))
    return e;
  e.semi_major = 1 / sqrt(small);
  e.semi_minor = 1 / sqrt(large);
  /* The form is largest across the major axis. */
  e.angle_deg = spread > 0 ? atan2(-g12, -half) / 2 / radian : 0;
  if (e.angle_deg < 0)
    e.angle_deg += 180;
  if (e.angle_deg >= 180)
    e.angle_deg = 0;
  return e;
}

ef_ellipse ef_ellipse_of_axes(const double center[2], double semi_major,
                              double semi_minor, double angle_deg) {
  const double c = cos(angle_deg * radian), s = sin(angle_deg * radian);
  const double aa = 1 / (semi_major * semi_major);
  const double bb = 1 / (semi_minor * semi_minor);
  return ef_ellipse_of_form(center, c * c * aa + s * s * bb, c * s * (aa - bb),
                            s * s * aa + c * c * bb);
}

ef_ellipse ef_ellipse_carry(const ef_ellipse *ellipse, const double center[2],
                            const double jacobian[4]) {
  const double det = jacobian[0] * jacobian[3] - jacobian[1] * jacobian[2];
  const double i[4] = {jacobian[3] / det, -jacobian[1] / det,
                       -jacobian[2] / det, jacobian[0] / det};
  const double g11 = ellipse->g11, g12 = ellipse->g12, g22 = ellipse->g22;
  const double top[2] = {g11 * i[0] + g12 * i[2], g11 * i[1] + g12 * i[3]};
  const double low[2] = {g12 * i[0] + g22 * i[2], g12 * i[1] + g22 * i[3]};
  return ef_ellipse_of_form(center, i[0] * top[0] + i[2] * low[0],
                            i[0] * top[1] + i[2] * low[1],
                            i[1] * top[1] + i[3] * low[1]);
}

void ef_ellipse_point(const ef_ellipse *ellipse, double turn_deg,
                      double point[2]) {
  const double along = ellipse->semi_major * cos(turn_deg * radian);
  const double across = ellipse->semi_minor * sin(turn_deg * radian);
  const double c = cos(ellipse->angle_deg * radian);
  const double s = sin(ellipse->angle_deg * radian);
  point[0] = ellipse->center[0] + along * c - across * s;
  point[1] = ellipse->center[1] + along * s + across * c;
}

double ef_ellipse_steps(const ef_ellipse *ellipse, const double point[2]) {
  const double x = point[0] - ellipse->center[0];
  const double y = point[1] - ellipse->center[1];
  return sqrt(ellipse->g11 * x * x + 2 * ellipse->g12 * x * y +
              ellipse->g22 * y * y);
}
