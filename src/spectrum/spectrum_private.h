/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Interpolation, ends and bandpass as one linear operator. */
#ifndef EVENFIELD_SPECTRUM_PRIVATE_H
#define EVENFIELD_SPECTRUM_PRIVATE_H

#include <evenfield/spectrum.h>

/* ---- Grids (grid.c) ---------------------------------------------------- */

/** Doubles needed to keep the wavelengths of `grid`: count, or 0 when even. */
size_t ef__grid_storage(const ef_grid *grid);
/** A copy of `grid` that keeps its wavelengths, if any, in `storage`. */
ef_grid ef__grid_copy(const ef_grid *grid, double *storage);

typedef enum ef__place {
  EF__BELOW,  /**< before the first sample */
  EF__AT,     /**< at sample i, to 1e-9 relative */
  EF__WITHIN, /**< between samples i and i + 1 */
  EF__ABOVE   /**< after the last sample */
} ef__place;

/** Where a wavelength lies among the samples. */
ef__place ef__grid_locate(const ef_grid *grid, double wavelength_nm, size_t *i);

/* ---- The operator (interpolate.c) -------------------------------------- */

enum {
  EF__SPRAGUE_WIDTH = 6, /**< samples that make one Sprague value */
  EF__LOCAL_WIDTH = 2    /**< the same for lines and, with two second
                              derivatives, for the spline */
};

/** Samples to values: each value is a sum of coefficients times samples.
 * Row k has `width` coefficients, for the samples from first[k] on. A spline
 * row has two more, for the second derivatives at first[k] and first[k] + 1,
 * which come from the samples through a tridiagonal system. The samples may
 * pass through the bandpass correction before all that. */
typedef struct ef__operator {
  size_t n_in;
  size_t n_out;
  size_t width;
  size_t *first;       /* n_out */
  double *coefficient; /* n_out x width */
  bool *outside;       /* n_out: rests on the end rule */
  bool has_curvature;
  double *curvature; /* n_out x 2 */
  double *interval;  /* n_in - 1: distances of the samples, nm */
  double *pivot;     /* n_in - 2: of the factored tridiagonal matrix */
  bool corrects_bandpass;
} ef__operator;

/** `extension` is EF_EXTEND_HOLD or EF_EXTEND_ZERO. EF_INVALID when the rule
 * needs more samples or even steps. Free with free(): it is one block. */
ef__operator *ef__operator_new(const ef_grid *from, const ef_grid *to,
                               ef_interpolation interpolation,
                               ef_extension extension, bool correct_bandpass,
                               ef_error *error);

/** Doubles of scratch for the two calls below. */
size_t ef__operator_scratch(const ef__operator *op);

/** out (n_out) = operator x in (n_in). */
void ef__operator_apply(const ef__operator *op, const double *in,
                        double *scratch, double *out);

/** out (n_in) = transposed operator x in (n_out): the weights of values become
 * weights of samples. */
void ef__operator_apply_transposed(const ef__operator *op, const double *in,
                                   double *scratch, double *out);

/* ---- Ends and bandpass (extend.c) -------------------------------------- */

/** Row of a value outside the samples: 1 for the end sample or nothing. */
void ef__extend_row(ef__operator *op, size_t row, ef__place place,
                    ef_extension extension);

/** Two values that the fifth-order rule needs beyond an end, as sums of the
 * six samples nearest to it: index 0 is the value next to the end. The samples
 * count from that end inwards. */
extern const double ef__sprague_end[2][EF__SPRAGUE_WIDTH];

/** Stearns & Stearns (1988): `out` (n, may not be `in`) = corrected samples;
 * n at least 2. */
void ef__bandpass_apply(size_t n, const double *in, double *out);
/** The transposed correction. */
void ef__bandpass_apply_transposed(size_t n, const double *in, double *out);

/* ---- Spline derivatives (spline.c) ------------------------------------- */

/** Prepares interval and pivot of a spline operator. */
void ef__spline_factor(ef__operator *op, const ef_grid *from);
/** Second derivatives at the samples, 0 at both ends (natural spline). */
void ef__spline_curvature(const ef__operator *op, const double *sample,
                          double *curvature);
/** Transposed: adds to `sample` what weights on the second derivatives come to;
 * `curvature` is destroyed. */
void ef__spline_curvature_transposed(const ef__operator *op, double *curvature,
                                     double *sample);

/* ---- Weights (fold.c) -------------------------------------------------- */

struct ef_weights {
  size_t n_channels;
  size_t n_samples;
  ef_grid grid;
  double *matrix;  /* n_channels x n_samples */
  double *outside; /* n_channels */
};

#endif
