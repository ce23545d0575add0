/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The ellipses of D. L. MacAdam, J. Opt. Soc. Am. 32 (1942) 247-274, doi
 * 10.1364/JOSA.32.000247 (observer PGN, 2 degrees, about 48 cd/m2), as listed
 * in Wyszecki & Stiles, Color Science, 2nd ed. (1982), table 2(5.4.1), and
 * between the centres.
 *
 * MacAdam drew contour maps of the coefficients by hand. Here the ellipses are
 * carried to u', v', where they differ less, the logarithms of their matrices
 * are averaged with weights 1 / distance^4 in u', v', and the result is carried
 * back: it is an ellipse everywhere, smooth, and MacAdam's own at the centres.
 * Leaving out one centre at a time it gives that centre's ellipse with a root
 * mean square factor of 1.40 in area and 1.25 in axis ratio, and 9 degrees in
 * angle (tests/published/pub_ellipses.c). */
#include <math.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

typedef struct observation {
  double xy[2];
  double semi_major, semi_minor; /* 0.001 of x, y: one standard deviation */
  double angle_deg;
} observation;

static const observation observed[] = {
    {{0.160, 0.057}, 0.85, 0.35, 62.5},  {{0.187, 0.118}, 2.20, 0.55, 77.0},
    {{0.253, 0.125}, 2.50, 0.50, 55.5},  {{0.150, 0.680}, 9.60, 2.30, 105.0},
    {{0.131, 0.521}, 4.70, 2.00, 112.5}, {{0.212, 0.550}, 5.80, 2.30, 100.0},
    {{0.258, 0.450}, 5.00, 2.00, 92.0},  {{0.152, 0.365}, 3.80, 1.90, 110.0},
    {{0.280, 0.385}, 4.00, 1.50, 75.5},  {{0.380, 0.498}, 4.40, 1.20, 70.0},
    {{0.160, 0.200}, 2.10, 0.95, 104.0}, {{0.228, 0.250}, 3.10, 0.90, 72.0},
    {{0.305, 0.323}, 2.30, 0.90, 58.0},  {{0.385, 0.393}, 3.80, 1.60, 65.5},
    {{0.472, 0.399}, 3.20, 1.40, 51.0},  {{0.527, 0.350}, 2.60, 1.30, 20.0},
    {{0.475, 0.300}, 2.90, 1.10, 28.5},  {{0.510, 0.236}, 2.40, 1.20, 29.5},
    {{0.596, 0.283}, 2.60, 1.30, 13.0},  {{0.344, 0.284}, 2.30, 0.90, 60.0},
    {{0.390, 0.237}, 2.50, 1.00, 47.0},  {{0.441, 0.198}, 2.80, 0.95, 34.5},
    {{0.278, 0.223}, 2.40, 0.55, 57.5},  {{0.300, 0.163}, 2.90, 0.60, 54.0},
    {{0.365, 0.153}, 3.60, 0.95, 40.0},
};
enum { N_CENTERS = sizeof observed / sizeof *observed };

size_t ef_macadam_count(void) {
  return N_CENTERS;
}

ef_ellipse ef_macadam_at(size_t i) {
  if (i >= N_CENTERS) {
    const double none[2] = {(double)NAN, (double)NAN};
    return ef_ellipse_of_form(none, none[0], none[0], none[0]);
  }
  const observation *const o = &observed[i];
  return ef_ellipse_of_axes(o->xy, o->semi_major * 1e-3, o->semi_minor * 1e-3,
                            o->angle_deg);
}

/* d(u', v') / d(x, y). */
static void uv_by_xy(const double xy[2], double j[4]) {
  const double w = 3 - 2 * xy[0] + 12 * xy[1];
  j[0] = (4 * w + 8 * xy[0]) / (w * w);
  j[1] = -48 * xy[0] / (w * w);
  j[2] = 18 * xy[1] / (w * w);
  j[3] = (9 * w - 108 * xy[1]) / (w * w);
}

static void inverse_2x2(const double m[4], double out[4]) {
  const double det = m[0] * m[3] - m[1] * m[2];
  out[0] = m[3] / det;
  out[1] = -m[1] / det;
  out[2] = -m[2] / det;
  out[3] = m[0] / det;
}

/* A function of a symmetric 2x2 matrix (m11, m12, m22) by its eigenvalues. */
static void apply(double (*function)(double), const double m[3],
                  double out[3]) {
  const double mean = (m[0] + m[2]) / 2, half = (m[0] - m[2]) / 2;
  const double spread = hypot(half, m[1]);
  const double high = function(mean + spread), low = function(mean - spread);
  const double c = spread > 0 ? half / spread : 1;
  const double s = spread > 0 ? m[1] / spread : 0;
  out[0] = (high + low) / 2 + c * (high - low) / 2;
  out[1] = s * (high - low) / 2;
  out[2] = (high + low) / 2 - c * (high - low) / 2;
}

/* Logarithm of a centre's form in u', v', and where it lies there. */
static ef_uv logarithm(size_t i, double form[3]) {
  double j[4];
  const ef_ellipse in_xy = ef_macadam_at(i);
  const ef_uv uv = ef_xy_to_uv((ef_xy){in_xy.center[0], in_xy.center[1]});
  uv_by_xy(in_xy.center, j);
  const ef_ellipse in_uv =
      ef_ellipse_carry(&in_xy, (double[2]){uv.u_prime, uv.v_prime}, j);
  apply(log, (double[3]){in_uv.g11, in_uv.g12, in_uv.g22}, form);
  return uv;
}

/* Inside the convex hull of the centres: outside it, all of them lie to one
 * side of the line through one of them, and none behind. */
static bool is_surrounded(ef_xy at) {
  for (size_t i = 0; i < N_CENTERS; ++i) {
    if (observed[i].xy[0] == at.x && observed[i].xy[1] == at.y)
      return true;
  }
  for (size_t i = 0; i < N_CENTERS; ++i) {
    const double x = observed[i].xy[0] - at.x, y = observed[i].xy[1] - at.y;
    bool left = false, right = false, behind = false;
    for (size_t k = 0; k < N_CENTERS; ++k) {
      const double p = observed[k].xy[0] - at.x, q = observed[k].xy[1] - at.y;
      const double side = x * q - y * p;
      left = left || side > 0;
      right = right || side < 0;
      behind = behind || (side == 0 && x * p + y * q < 0);
    }
    if (!(left && right) && !behind)
      return false;
  }
  return true;
}

ef_status ef__macadam_without(ef_xy at, double size, size_t left_out,
                              ef_ellipse *out, ef_error *error) {
  const ef_uv uv = ef_xy_to_uv(at);
  if (!(isfinite(uv.u_prime) && isfinite(uv.v_prime) && size > 0 &&
        isfinite(size))) {
    return ef__error_set(error, EF_INVALID,
                         "no MacAdam ellipse of size %g at x %g, y %g", size,
                         at.x, at.y);
  }
  double mean[3] = {0, 0, 0}, weights = 0, form[3];
  for (size_t i = 0; i < N_CENTERS; ++i) {
    if (i == left_out)
      continue;
    double one[3];
    const ef_uv center = logarithm(i, one);
    const double u = uv.u_prime - center.u_prime;
    const double v = uv.v_prime - center.v_prime;
    const double square = u * u + v * v;
    if (square == 0) { /* a centre itself */
      for (int k = 0; k < 3; ++k)
        mean[k] = one[k];
      weights = 1;
      break;
    }
    const double weight = 1 / (square * square);
    for (int k = 0; k < 3; ++k)
      mean[k] += weight * one[k];
    weights += weight;
  }
  const double center[2] = {at.x, at.y};
  const double unit = 1 / (size * size);
  for (int k = 0; k < 3; ++k)
    mean[k] /= weights;
  apply(exp, mean, form);
  const ef_ellipse in_uv =
      ef_ellipse_of_form((double[2]){uv.u_prime, uv.v_prime}, form[0] * unit,
                         form[1] * unit, form[2] * unit);
  double j[4], back[4];
  uv_by_xy(center, j);
  inverse_2x2(j, back);
  *out = ef_ellipse_carry(&in_uv, center, back);
  return EF_OK;
}

ef_status ef_macadam_ellipse(ef_xy at, double size, ef_ellipse *out,
                             bool *between, ef_error *error) {
  const ef_status status = ef__macadam_without(at, size, N_CENTERS, out, error);
  if (status == EF_OK && between != NULL)
    *between = is_surrounded(at);
  return status;
}
