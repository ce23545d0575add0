/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Weights times samples, spread over threads; the sums and their order are the
 * kernel's. */
#include "base/base_private.h"
#include "kernel/kernels.h"
#include "spectrum/spectrum_private.h"

/* Products worth a thread of their own, some tenths of a millisecond. */
enum { CHUNK_PRODUCTS = 1 << 19, FEWEST = 8, MANY = 160 };

typedef struct batch {
  const ef_weights *weights;
  const double *sample;
  const float *sample_float; /* or these */
  double *out;
} batch;

static void apply_range(void *context, size_t begin, size_t end) {
  const batch *const b = context;
  const ef_weights *const w = b->weights;
  const size_t at = begin * w->n_samples;
  double *const out = b->out + begin * w->n_channels;
  if (b->sample != NULL) {
    ef__kernels()->apply(w->n_samples, w->n_channels, w->matrix, end - begin,
                         b->sample + at, out);
  } else {
    ef__kernels()->apply_float(w->n_samples, w->n_channels, w->matrix,
                               end - begin, b->sample_float + at, out);
  }
}

/* For many channels enough spectra to be worth packing their weights, yet work
 * for eight threads. A value does not depend on it: each is one sum. */
static size_t chunk_size(size_t n, size_t products) {
  const size_t chunk = CHUNK_PRODUCTS / products;
  size_t least = n / 8;
  least = least < FEWEST ? FEWEST : least > MANY ? MANY : least;
  return chunk < least ? least : chunk;
}

static ef_status apply(batch *b, size_t n, int jobs, ef_error *error) {
  if (jobs < 0) {
    return ef__error_set(error, EF_INVALID, "%d jobs; 0 or more are possible",
                         jobs);
  }
  const size_t products = b->weights->n_channels * b->weights->n_samples;
  if (products == 0)
    return EF_OK;
  ef__parallel_for(n, chunk_size(n, products), jobs, apply_range, b);
  return EF_OK;
}

ef_status ef_weights_apply(const ef_weights *weights, size_t n,
                           const double *sample, int jobs, double *out,
                           ef_error *error) {
  batch b = {weights, sample, NULL, out};
  return apply(&b, n, jobs, error);
}

ef_status ef_weights_apply_float(const ef_weights *weights, size_t n,
                                 const float *sample, int jobs, double *out,
                                 ef_error *error) {
  batch b = {weights, NULL, sample, out};
  return apply(&b, n, jobs, error);
}
