/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "spectrum/spectrum_private.h"

#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

enum { SPLINE_SAMPLES = 3, BANDPASS_SAMPLES = 2 };

/* ---- Choosing the rule ------------------------------------------------- */

static ef_interpolation resolve(ef_interpolation wanted, const ef_grid *from) {
  if (wanted != EF_INTERPOLATE_AUTO)
    return wanted;
  const bool is_even = from->wavelength_nm == NULL;
  if (is_even && from->count >= EF__SPRAGUE_WIDTH) {
    return EF_INTERPOLATE_SPRAGUE;
  }
  return from->count >= SPLINE_SAMPLES ? EF_INTERPOLATE_SPLINE
                                       : EF_INTERPOLATE_LINEAR;
}

static ef_status check_rule(ef_interpolation rule, const ef_grid *from,
                            bool correct_bandpass, ef_error *error) {
  const bool is_even = from->wavelength_nm == NULL;
  if (rule == EF_INTERPOLATE_SPRAGUE && !is_even) {
    return ef__error_set(error, EF_INVALID,
                         "Sprague interpolation needs even steps; use spline");
  }
  if (rule == EF_INTERPOLATE_SPRAGUE && from->count < EF__SPRAGUE_WIDTH) {
    return ef__error_set(error, EF_INVALID,
                         "Sprague interpolation needs 6 samples, not %zu",
                         from->count);
  }
  if (rule == EF_INTERPOLATE_SPLINE && from->count < SPLINE_SAMPLES) {
    return ef__error_set(error, EF_INVALID,
                         "spline interpolation needs 3 samples, not %zu",
                         from->count);
  }
  if (correct_bandpass && (!is_even || from->count < BANDPASS_SAMPLES)) {
    return ef__error_set(
        error, EF_INVALID,
        "bandpass correction needs 2 samples or more at even steps");
  }
  return EF_OK;
}

/* ---- Rows -------------------------------------------------------------- */

/* Coefficients of the six samples around an interval for the value at share
 * t of it: CIE 167:2005 (Sprague 1880), value = sum of a_k t^k with a_k from
 * these, divided by 24. The figures are from memory; they are checked by their
 * properties in the tests. */
static void sprague_coefficients(double t, double c[EF__SPRAGUE_WIDTH]) {
  static const double a[6][EF__SPRAGUE_WIDTH] = {
      {0, 0, 24, 0, 0, 0},           {2, -16, 0, 16, -2, 0},
      {-1, 16, -30, 16, -1, 0},      {-9, 39, -70, 66, -33, 7},
      {13, -64, 126, -124, 61, -12}, {-5, 25, -50, 50, -25, 5}};
  for (size_t j = 0; j < EF__SPRAGUE_WIDTH; ++j) {
    double sum = a[5][j];
    for (size_t k = 5; k-- > 0;)
      sum = sum * t + a[k][j];
    c[j] = sum / 24;
  }
}

/* Value at share t between samples i and i + 1. Near the ends the two samples
 * that do not exist are replaced by their extrapolation, which again is a sum
 * of the six samples at that end. */
static void sprague_row(ef__operator *op, size_t row, size_t i, double t) {
  const size_t n = op->n_in;
  const size_t start = i < 2 ? 0 : i - 2;
  const size_t first =
      start + EF__SPRAGUE_WIDTH > n ? n - EF__SPRAGUE_WIDTH : start;
  double *const out = op->coefficient + row * EF__SPRAGUE_WIDTH;
  double c[EF__SPRAGUE_WIDTH];
  sprague_coefficients(t, c);
  op->first[row] = first;
  for (size_t j = 0; j < EF__SPRAGUE_WIDTH; ++j) {
    const size_t at = i + j; /* sample number plus 2 */
    if (at < 2) {
      for (size_t k = 0; k < EF__SPRAGUE_WIDTH; ++k) {
        out[k] += c[j] * ef__sprague_end[1 - at][k];
      }
    } else if (at - 2 >= n) {
      for (size_t k = 0; k < EF__SPRAGUE_WIDTH; ++k) {
        out[EF__SPRAGUE_WIDTH - 1 - k] += c[j] * ef__sprague_end[at - 2 - n][k];
      }
    } else {
      out[at - 2 - first] += c[j];
    }
  }
}

/* Straight line, and for the spline the share of the second derivatives. */
static void local_row(ef__operator *op, size_t row, size_t i, double t,
                      double interval_nm) {
  const double s = 1 - t;
  op->first[row] = i;
  op->coefficient[2 * row] = s;
  op->coefficient[2 * row + 1] = t;
  if (!op->has_curvature)
    return;
  const double scale = interval_nm * interval_nm / 6;
  op->curvature[2 * row] = (s * s * s - s) * scale;
  op->curvature[2 * row + 1] = (t * t * t - t) * scale;
}

/* At a sample every rule gives that sample. */
static void sample_row(ef__operator *op, size_t row, size_t i) {
  const size_t first = i + op->width > op->n_in ? op->n_in - op->width : i;
  op->first[row] = first;
  op->coefficient[row * op->width + (i - first)] = 1;
}

static void fill_rows(ef__operator *op, const ef_grid *from, const ef_grid *to,
                      ef_interpolation rule, ef_extension extension) {
  for (size_t row = 0; row < op->n_out; ++row) {
    const double at = ef_grid_wavelength(to, row);
    size_t i;
    const ef__place place = ef__grid_locate(from, at, &i);
    if (place == EF__AT) {
      sample_row(op, row, i);
      continue;
    }
    if (place != EF__WITHIN) {
      ef__extend_row(op, row, place, extension);
      continue;
    }
    const double left = ef_grid_wavelength(from, i);
    const double interval = ef_grid_wavelength(from, i + 1) - left;
    const double t = (at - left) / interval;
    if (rule == EF_INTERPOLATE_SPRAGUE) {
      sprague_row(op, row, i, t);
    } else {
      local_row(op, row, i, t, interval);
    }
  }
}

/* ---- The operator ------------------------------------------------------ */

static ef__operator *allocate(size_t n_in, size_t n_out,
                              ef_interpolation rule) {
  const bool spline = rule == EF_INTERPOLATE_SPLINE;
  size_t width = EF__LOCAL_WIDTH;
  if (rule == EF_INTERPOLATE_SPRAGUE)
    width = EF__SPRAGUE_WIDTH;
  if (width > n_in)
    width = n_in;
  ef__operator *op = NULL;
  ef__operator part = {
      .n_in = n_in, .n_out = n_out, .width = width, .has_curvature = spline};
  size_t n_coefficients;
  if (!ef__size_multiply(n_out, width, &n_coefficients))
    return NULL;
  const ef__part parts[] = {
      {&op, 1, sizeof *op},
      {&part.first, n_out, sizeof *part.first},
      {&part.coefficient, n_coefficients, sizeof *part.coefficient},
      {&part.outside, n_out, sizeof *part.outside},
      {&part.curvature, spline ? n_out : 0, 2 * sizeof *part.curvature},
      {&part.interval, spline ? n_in : 0, sizeof *part.interval},
      {&part.pivot, spline ? n_in : 0, sizeof *part.pivot}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    return NULL;
  }
  *op = part;
  return op;
}

ef__operator *ef__operator_new(const ef_grid *from, const ef_grid *to,
                               ef_interpolation interpolation,
                               ef_extension extension, bool correct_bandpass,
                               ef_error *error) {
  if (ef_grid_check(from, error) != EF_OK)
    return NULL;
  if (ef_grid_check(to, error) != EF_OK)
    return NULL;
  const ef_grid grid = ef_grid_simplify(from);
  const ef_interpolation rule = resolve(interpolation, &grid);
  if (check_rule(rule, &grid, correct_bandpass, error) != EF_OK)
    return NULL;
  ef__operator *const op = allocate(grid.count, to->count, rule);
  if (op == NULL) {
    ef__error_memory(error, "interpolating spectra");
    return NULL;
  }
  op->corrects_bandpass = correct_bandpass;
  if (op->has_curvature)
    ef__spline_factor(op, &grid);
  fill_rows(op, &grid, to, rule, extension);
  return op;
}

size_t ef__operator_scratch(const ef__operator *op) {
  return 2 * op->n_in;
}

void ef__operator_apply(const ef__operator *op, const double *in,
                        double *scratch, double *out) {
  const double *sample = in;
  if (op->corrects_bandpass) {
    ef__bandpass_apply(op->n_in, in, scratch);
    sample = scratch;
  }
  double *const curvature = scratch + op->n_in;
  if (op->has_curvature)
    ef__spline_curvature(op, sample, curvature);
  for (size_t row = 0; row < op->n_out; ++row) {
    const double *const c = op->coefficient + row * op->width;
    const size_t first = op->first[row];
    double sum = 0;
    for (size_t j = 0; j < op->width; ++j)
      sum += c[j] * sample[first + j];
    if (op->has_curvature) {
      sum += op->curvature[2 * row] * curvature[first] +
             op->curvature[2 * row + 1] * curvature[first + 1];
    }
    out[row] = sum;
  }
}

void ef__operator_apply_transposed(const ef__operator *op, const double *in,
                                   double *scratch, double *out) {
  double *const sample = op->corrects_bandpass ? scratch : out;
  double *const curvature = scratch + op->n_in;
  for (size_t i = 0; i < op->n_in; ++i) {
    sample[i] = 0;
    curvature[i] = 0;
  }
  for (size_t row = 0; row < op->n_out; ++row) {
    const double *const c = op->coefficient + row * op->width;
    const size_t first = op->first[row];
    for (size_t j = 0; j < op->width; ++j)
      sample[first + j] += c[j] * in[row];
    if (op->has_curvature) {
      curvature[first] += op->curvature[2 * row] * in[row];
      curvature[first + 1] += op->curvature[2 * row + 1] * in[row];
    }
  }
  if (op->has_curvature) {
    ef__spline_curvature_transposed(op, curvature, sample);
  }
  if (op->corrects_bandpass) {
    ef__bandpass_apply_transposed(op->n_in, sample, out);
  }
}

ef_status ef_resample(const ef_grid *from, size_t n, const double *value,
                      const ef_grid *to, ef_interpolation interpolation,
                      ef_extension extension, double *out, ef_error *error) {
  const ef_extension ends =
      extension == EF_EXTEND_AUTO ? EF_EXTEND_HOLD : extension;
  ef_error local;
  if (error == NULL)
    error = &local; /* its status is needed below */
  ef__operator *const op =
      ef__operator_new(from, to, interpolation, ends, false, error);
  if (op == NULL)
    return error->status;
  double *const scratch =
      ef__allocate(ef__operator_scratch(op), sizeof *scratch);
  if (scratch == NULL) {
    free(op);
    return ef__error_memory(error, "interpolating spectra");
  }
  for (size_t i = 0; i < n; ++i) {
    ef__operator_apply(op, value + i * op->n_in, scratch, out + i * op->n_out);
  }
  free(scratch);
  free(op);
  return EF_OK;
}
