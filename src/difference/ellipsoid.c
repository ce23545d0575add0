/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A form carried to a space, as an ellipsoid and its plane figures: the tensor
 * of a formula, or what an experiment found. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

/* out = m' g m */
static void congruent(const double g[9], const double m[9], double out[9]) {
  double transposed[9], gm[9];
  ef__mat3_transpose(m, transposed);
  ef__mat3_multiply(g, m, gm);
  ef__mat3_multiply(transposed, gm, out);
  /* Symmetric to the last bit. */
  out[3] = out[1] = (out[1] + out[3]) / 2;
  out[6] = out[2] = (out[2] + out[6]) / 2;
  out[7] = out[5] = (out[5] + out[7]) / 2;
}

/* One rotation of the cyclic Jacobi method (Golub & Van Loan, Matrix
 * Computations, 4th ed., 8.5.2) in the plane p, q. */
static void rotate(double a[9], double axes[9], int p, int q) {
  const double apq = a[3 * p + q];
  if (apq == 0)
    return;
  const double theta = (a[4 * q] - a[4 * p]) / (2 * apq);
  const double t = copysign(1, theta) / (fabs(theta) + sqrt(theta * theta + 1));
  const double c = 1 / sqrt(t * t + 1), s = t * c;
  for (int k = 0; k < 3; ++k) { /* columns */
    const double u = a[3 * k + p], v = a[3 * k + q];
    a[3 * k + p] = c * u - s * v;
    a[3 * k + q] = s * u + c * v;
  }
  for (int k = 0; k < 3; ++k) { /* rows, and the vectors as rows */
    const double u = a[3 * p + k], v = a[3 * q + k];
    a[3 * p + k] = c * u - s * v;
    a[3 * q + k] = s * u + c * v;
    const double x = axes[3 * p + k], y = axes[3 * q + k];
    axes[3 * p + k] = c * x - s * y;
    axes[3 * q + k] = s * x + c * y;
  }
  a[3 * p + q] = a[3 * q + p] = 0;
}

void ef__symmetric_axes(const double form[9], double value[3], double axis[9]) {
  double a[9], axes[9] = {1, 0, 0, 0, 1, 0, 0, 0, 1};
  memcpy(a, form, sizeof a);
  /* Converges quadratically: six sweeps are more than doubles can use. */
  for (int sweep = 0; sweep < 6; ++sweep) {
    rotate(a, axes, 0, 1);
    rotate(a, axes, 0, 2);
    rotate(a, axes, 1, 2);
  }
  bool used[3] = {false, false, false};
  for (int i = 0; i < 3; ++i) {
    int least = -1;
    for (int k = 0; k < 3; ++k) {
      if (!used[k] && (least < 0 || a[4 * k] < a[4 * least]))
        least = k;
    }
    used[least] = true;
    value[i] = a[4 * least];
    memcpy(axis + 3 * i, axes + 3 * least, 3 * sizeof *axes);
  }
}

/* By the leading minors (Sylvester); false for NaN. */
static bool is_positive_definite(const double g[9]) {
  for (int i = 0; i < 9; ++i) {
    if (!isfinite(g[i]))
      return false;
  }
  return g[0] > 0 && g[0] * g[4] - g[1] * g[1] > 0 &&
         ef__mat3_determinant(g) > 0;
}

ef_status ef__ellipsoid_carry(const char *name, const double form[9],
                              const double jacobian[9], double size, ef_xyz xyz,
                              const ef_conditions *conditions,
                              const ef_frame *frame, ef_ellipsoid *out,
                              ef_error *error) {
  ef_ellipsoid e;
  double to_space[9], back[9], slopes[9], value[3];
  const ef_status status =
      ef_frame_coordinates(frame, xyz, conditions, e.center, to_space, error);
  if (status != EF_OK)
    return status;
  const bool regular = ef__mat3_inverse(to_space, back);
  if (regular) {
    ef__mat3_multiply(jacobian, back, slopes);
    congruent(form, slopes, e.tensor);
    for (int i = 0; i < 9; ++i)
      e.tensor[i] /= size * size;
  }
  if (!regular || !is_positive_definite(e.tensor)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "%s has no ellipse in %s at X %g, Y %g, Z %g", name,
                         ef_space_name(frame->space), xyz.X, xyz.Y, xyz.Z);
  }
  ef__symmetric_axes(e.tensor, value, e.direction);
  for (int i = 0; i < 3; ++i)
    e.semi_axis[i] = 1 / sqrt(value[i]);
  *out = e;
  return EF_OK;
}

bool ef__is_ellipse_size(double size, ef_error *error) {
  if (size > 0 && isfinite(size))
    return true;
  ef__error_set(error, EF_INVALID,
                "an ellipse of size %g; it must be above zero", size);
  return false;
}

ef_status ef_metric_ellipsoid(const ef_metric *metric, ef_xyz xyz,
                              const ef_conditions *conditions,
                              const ef_frame *frame, double size,
                              ef_ellipsoid *out, ef_error *error) {
  double coordinate[3], j[9], tensor[9];
  if (!ef__is_ellipse_size(size, error))
    return EF_INVALID;
  metric->coordinates(metric, xyz, conditions, coordinate);
  if (metric->chord != NULL) {
    metric->chord(metric, xyz, conditions, size, j);
  } else {
    metric->jacobian(metric, xyz, conditions, j);
  }
  metric->tensor(metric, coordinate, tensor);
  return ef__ellipsoid_carry(metric->name, tensor, j, size, xyz, conditions,
                             frame, out, error);
}

/* The section leaves the third row and column out; the projection is its Schur
 * complement, the form minimised over the third coordinate. */
ef_ellipse ef_ellipsoid_figure(const ef_ellipsoid *ellipsoid,
                               ef_ellipse_kind kind) {
  const double *const g = ellipsoid->tensor;
  if (kind == EF_ELLIPSE_SECTION)
    return ef_ellipse_of_form(ellipsoid->center, g[0], g[1], g[4]);
  return ef_ellipse_of_form(ellipsoid->center, g[0] - g[2] * g[2] / g[8],
                            g[1] - g[2] * g[5] / g[8],
                            g[4] - g[5] * g[5] / g[8]);
}

ef_status ef_metric_ellipse(const ef_metric *metric, ef_xyz xyz,
                            const ef_conditions *conditions,
                            const ef_frame *frame, ef_ellipse_kind kind,
                            double size, ef_ellipse *out, ef_error *error) {
  if (kind != EF_ELLIPSE_SECTION && kind != EF_ELLIPSE_PROJECTION) {
    return ef__error_set(error, EF_INVALID, "figure %d is not defined",
                         (int)kind);
  }
  ef_ellipsoid solid;
  const ef_status status =
      ef_metric_ellipsoid(metric, xyz, conditions, frame, size, &solid, error);
  if (status == EF_OK)
    *out = ef_ellipsoid_figure(&solid, kind);
  return status;
}
