/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Second derivatives m of the natural cubic spline at samples y, distances h:
 * m_0 = m_{n-1} = 0 and, for the samples between,
 *   h_{i-1}/6 m_{i-1} + (h_{i-1}+h_i)/3 m_i + h_i/6 m_{i+1}
 *     = (y_{i+1} - y_i)/h_i - (y_i - y_{i-1})/h_{i-1}.
 * The matrix is symmetric and positive definite, so it is factored as L D L'
 * once, without pivoting, and serves the transposed direction as it is. */
#include "spectrum/spectrum_private.h"

void ef__spline_factor(ef__operator *op, const ef_grid *from) {
  for (size_t i = 0; i + 1 < op->n_in; ++i) {
    op->interval[i] =
        ef_grid_wavelength(from, i + 1) - ef_grid_wavelength(from, i);
  }
  for (size_t i = 0; i + 2 < op->n_in; ++i) {
    const double before = op->interval[i];
    op->pivot[i] = (before + op->interval[i + 1]) / 3;
    if (i > 0)
      op->pivot[i] -= before * before / 36 / op->pivot[i - 1];
  }
}

/* Solves for the n_in - 2 inner unknowns, in place. */
static void solve(const ef__operator *op, double *inner) {
  const size_t n = op->n_in - 2;
  for (size_t i = 1; i < n; ++i) {
    inner[i] -= op->interval[i] / 6 / op->pivot[i - 1] * inner[i - 1];
  }
  for (size_t i = n; i-- > 0;) {
    inner[i] /= op->pivot[i];
    if (i + 1 < n) {
      inner[i] -= op->interval[i + 1] / 6 / op->pivot[i] * inner[i + 1];
    }
  }
}

void ef__spline_curvature(const ef__operator *op, const double *sample,
                          double *curvature) {
  const size_t n = op->n_in;
  curvature[0] = 0;
  curvature[n - 1] = 0;
  for (size_t i = 1; i + 1 < n; ++i) {
    curvature[i] = (sample[i + 1] - sample[i]) / op->interval[i] -
                   (sample[i] - sample[i - 1]) / op->interval[i - 1];
  }
  solve(op, curvature + 1);
}

void ef__spline_curvature_transposed(const ef__operator *op, double *curvature,
                                     double *sample) {
  solve(op, curvature + 1);
  for (size_t i = 1; i + 1 < op->n_in; ++i) {
    const double down = curvature[i] / op->interval[i - 1];
    const double up = curvature[i] / op->interval[i];
    sample[i - 1] += down;
    sample[i] -= down + up;
    sample[i + 1] += up;
  }
}
