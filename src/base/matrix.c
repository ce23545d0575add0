/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include <gsl/gsl_linalg.h>

void ef__mat3_multiply(const double a[9], const double b[9], double out[9]) {
  double product[9];
  for (size_t i = 0; i < 3; ++i) {
    for (size_t j = 0; j < 3; ++j) {
      product[3 * i + j] =
          a[3 * i] * b[j] + a[3 * i + 1] * b[3 + j] + a[3 * i + 2] * b[6 + j];
    }
  }
  memcpy(out, product, sizeof product);
}

void ef__mat3_apply(const double m[9], const double v[3], double out[3]) {
  const double x = v[0], y = v[1], z = v[2];
  for (size_t i = 0; i < 3; ++i) {
    out[i] = m[3 * i] * x + m[3 * i + 1] * y + m[3 * i + 2] * z;
  }
}

void ef__mat3_transpose(const double m[9], double out[9]) {
  const double t[9] = {m[0], m[3], m[6], m[1], m[4], m[7], m[2], m[5], m[8]};
  memcpy(out, t, sizeof t);
}

double ef__mat3_determinant(const double m[9]) {
  return m[0] * (m[4] * m[8] - m[5] * m[7]) -
         m[1] * (m[3] * m[8] - m[5] * m[6]) +
         m[2] * (m[3] * m[7] - m[4] * m[6]);
}

bool ef__mat3_inverse(const double m[9], double out[9]) {
  double volume = 1; /* of the box with the rows' lengths as sides */
  for (size_t i = 0; i < 3; ++i) {
    volume *= hypot(hypot(m[3 * i], m[3 * i + 1]), m[3 * i + 2]);
  }
  const double determinant = ef__mat3_determinant(m);
  /* Written so that NaN counts as singular. */
  if (!(fabs(determinant) > 9 * DBL_EPSILON * volume))
    return false;
  if (!isfinite(determinant))
    return false;
  const double adjugate[9] = {
      m[4] * m[8] - m[5] * m[7], m[2] * m[7] - m[1] * m[8],
      m[1] * m[5] - m[2] * m[4], m[5] * m[6] - m[3] * m[8],
      m[0] * m[8] - m[2] * m[6], m[2] * m[3] - m[0] * m[5],
      m[3] * m[7] - m[4] * m[6], m[1] * m[6] - m[0] * m[7],
      m[0] * m[4] - m[1] * m[3]};
  for (size_t i = 0; i < 9; ++i)
    out[i] = adjugate[i] / determinant;
  return true;
}

static void swap_rows(double *a, size_t n, size_t i, size_t j) {
  for (size_t k = 0; k < n; ++k) {
    const double kept = a[i * n + k];
    a[i * n + k] = a[j * n + k];
    a[j * n + k] = kept;
  }
}

/* Divides each row of the system by its largest coefficient, so that the size
 * of a pivot says how dependent the rows are. False for a row of zeros. */
static bool scale_rows(size_t n, double *a, size_t n_right, double *b) {
  for (size_t i = 0; i < n; ++i) {
    double largest = 0;
    for (size_t j = 0; j < n; ++j)
      largest = fmax(largest, fabs(a[i * n + j]));
    if (!(largest > 0) || !isfinite(largest))
      return false;
    for (size_t j = 0; j < n; ++j)
      a[i * n + j] /= largest;
    for (size_t j = 0; j < n_right; ++j)
      b[i * n_right + j] /= largest;
  }
  return true;
}

static void substitute_back(size_t n, const double *a, size_t n_right,
                            double *b) {
  for (size_t i = n; i-- > 0;) {
    for (size_t j = 0; j < n_right; ++j) {
      double sum = b[i * n_right + j];
      for (size_t k = i + 1; k < n; ++k) {
        sum -= a[i * n + k] * b[k * n_right + j];
      }
      b[i * n_right + j] = sum / a[i * n + i];
    }
  }
}

bool ef__solve(size_t n, double *a, size_t n_right, double *b) {
  if (!scale_rows(n, a, n_right, b))
    return false;
  for (size_t step = 0; step < n; ++step) {
    size_t pivot = step;
    for (size_t i = step + 1; i < n; ++i) {
      if (fabs(a[i * n + step]) > fabs(a[pivot * n + step]))
        pivot = i;
    }
    /* Rows have a largest element of 1: elimination leaves about n epsilon of
     * rounding in place of an exact zero. */
    const double size = fabs(a[pivot * n + step]);
    if (!(size > (double)n * DBL_EPSILON))
      return false;
    if (pivot != step) {
      swap_rows(a, n, pivot, step);
      swap_rows(b, n_right, pivot, step);
    }
    for (size_t i = step + 1; i < n; ++i) {
      const double factor = a[i * n + step] / a[step * n + step];
      for (size_t k = step; k < n; ++k)
        a[i * n + k] -= factor * a[step * n + k];
      for (size_t k = 0; k < n_right; ++k) {
        b[i * n_right + k] -= factor * b[step * n_right + k];
      }
    }
  }
  substitute_back(n, a, n_right, b);
  return true;
}

size_t ef__condition_scratch(size_t n_rows, size_t n_columns) {
  const size_t small = n_rows < n_columns ? n_rows : n_columns;
  return n_rows * n_columns + small * small + small;
}

ef_status ef__condition(size_t n_rows, size_t n_columns, const double *a,
                        double *scratch, double *singular, double *condition,
                        ef_error *error) {
  const bool wide = n_columns > n_rows;
  const size_t tall = wide ? n_columns : n_rows;
  const size_t small = wide ? n_rows : n_columns;
  if (small == 0) {
    return ef__error_set(error, EF_INVALID, "condition of an empty matrix");
  }
  for (size_t i = 0; i < n_rows; ++i) {
    for (size_t j = 0; j < n_columns; ++j) {
      /* Jacobi wants at least as many rows as columns. */
      scratch[wide ? j * n_rows + i : i * n_columns + j] = a[i * n_columns + j];
    }
  }
  double *const vectors = scratch + n_rows * n_columns;
  double *const values = vectors + small * small;
  ef__gsl_ready();
  gsl_matrix_view left = gsl_matrix_view_array(scratch, tall, small);
  gsl_matrix_view right = gsl_matrix_view_array(vectors, small, small);
  gsl_vector_view diagonal = gsl_vector_view_array(values, small);
  const int code = gsl_linalg_SV_decomp_jacobi(&left.matrix, &right.matrix,
                                               &diagonal.vector);
  const ef_status status = ef__gsl_status(code, "singular values", error);
  if (status != EF_OK)
    return status;
  if (singular != NULL)
    memcpy(singular, values, small * sizeof *values);
  const double smallest = values[small - 1];
  const double floor = (double)tall * DBL_EPSILON * values[0];
  *condition = smallest > floor ? values[0] / smallest : HUGE_VAL;
  return EF_OK;
}
