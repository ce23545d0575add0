/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "spectrum/spectrum_private.h"

/* CIE 167:2005, extrapolation for the Sprague rule at the ends; the figures
 * are from memory. They sum to 209 and keep straight lines. */
const double ef__sprague_end[2][EF__SPRAGUE_WIDTH] = {
    {508.0 / 209, -540.0 / 209, 488.0 / 209, -367.0 / 209, 144.0 / 209,
     -24.0 / 209},
    {884.0 / 209, -1960.0 / 209, 3033.0 / 209, -2648.0 / 209, 1080.0 / 209,
     -180.0 / 209}};

void ef__extend_row(ef__operator *op, size_t row, ef__place place,
                    ef_extension extension) {
  const size_t end = place == EF__BELOW ? 0 : op->n_in - 1;
  const size_t width = op->width;
  const size_t first = end + width > op->n_in ? op->n_in - width : end;
  op->first[row] = first;
  op->outside[row] = true;
  if (extension == EF_EXTEND_HOLD) {
    op->coefficient[row * width + (end - first)] = 1;
  }
}

/* Stearns & Stearns, Color Res. Appl. 13 (1988) 257-259: for a triangular
 * bandpass as wide at half height as the sampling step. */
static const double beside = -0.083;
static const double middle = 1.166;
static const double at_end = 1.083;

void ef__bandpass_apply(size_t n, const double *in, double *out) {
  out[0] = at_end * in[0] + beside * in[1];
  for (size_t i = 1; i + 1 < n; ++i) {
    out[i] = beside * in[i - 1] + middle * in[i] + beside * in[i + 1];
  }
  out[n - 1] = beside * in[n - 2] + at_end * in[n - 1];
}

/* The matrix is symmetric: the end rule keeps the coefficients beside the
 * diagonal and changes the diagonal alone. */
void ef__bandpass_apply_transposed(size_t n, const double *in, double *out) {
  ef__bandpass_apply(n, in, out);
}
