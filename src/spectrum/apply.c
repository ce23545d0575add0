/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The batch kernel: weights times samples. Every value is the sum, in this
 * order, of four partial sums over the samples 0, 4, 8 ..., 1, 5, 9 ... and so
 * on, (p0 + p1) + (p2 + p3), whatever the batch, the tile or the thread it is
 * computed in. The four partial sums also keep the adders busy. */
#include "spectrum/spectrum_private.h"

#include "base/base_private.h"

enum {
  LANES = 4,
  /* A tile of channels whose weights stay in the second-level cache while the
   * spectra of a block pass by. */
  TILE_BYTES = 128 * 1024,
  BLOCK_SPECTRA = 32,
  /* Products worth a thread of their own: some tenths of a millisecond. */
  CHUNK_PRODUCTS = 1 << 19
};

typedef struct batch {
  const ef_weights *weights;
  const double *sample;
  double *out;
} batch;

static double total(const double partial[LANES]) {
  return (partial[0] + partial[1]) + (partial[2] + partial[3]);
}

/* The next four products of one channel; written out because compilers then
 * pair them into vectors at -O2. */
static inline void add_four(const double *restrict w, const double *restrict x,
                            double partial[LANES]) {
  partial[0] += w[0] * x[0];
  partial[1] += w[1] * x[1];
  partial[2] += w[2] * x[2];
  partial[3] += w[3] * x[3];
}

/* One spectrum, one channel. */
static double dot_1(size_t n, const double *restrict w,
                    const double *restrict x) {
  double a[LANES] = {0};
  size_t i = 0;
  for (; i + LANES <= n; i += LANES)
    add_four(w + i, x + i, a);
  for (size_t k = 0; i + k < n; ++k)
    a[k] += w[i + k] * x[i + k];
  return total(a);
}

/* One spectrum, three channels in adjoining rows: samples are loaded once. */
static void dot_3(size_t n, const double *restrict w, const double *restrict x,
                  double *restrict out) {
  const double *restrict const v = w + n;
  const double *restrict const u = v + n;
  double a[LANES] = {0}, b[LANES] = {0}, c[LANES] = {0};
  size_t i = 0;
  for (; i + LANES <= n; i += LANES) {
    add_four(w + i, x + i, a);
    add_four(v + i, x + i, b);
    add_four(u + i, x + i, c);
  }
  for (size_t k = 0; i + k < n; ++k) {
    a[k] += w[i + k] * x[i + k];
    b[k] += v[i + k] * x[i + k];
    c[k] += u[i + k] * x[i + k];
  }
  out[0] = total(a);
  out[1] = total(b);
  out[2] = total(c);
}

/* Channels [begin, end) of one spectrum. */
static void apply_row(const ef_weights *weights, size_t begin, size_t end,
                      const double *sample, double *out) {
  const size_t n = weights->n_samples;
  size_t c = begin;
  for (; c + 3 <= end; c += 3) {
    dot_3(n, weights->matrix + c * n, sample, out + c);
  }
  for (; c < end; ++c)
    out[c] = dot_1(n, weights->matrix + c * n, sample);
}

static size_t tile_channels(const ef_weights *weights) {
  const size_t row_bytes = weights->n_samples * sizeof *weights->matrix;
  const size_t fitting = TILE_BYTES / row_bytes;
  return fitting < 3 ? 3 : fitting - fitting % 3;
}

static void apply_range(void *ctx, size_t begin, size_t end) {
  const batch *const b = ctx;
  const ef_weights *const weights = b->weights;
  const size_t n_channels = weights->n_channels;
  const size_t tile = tile_channels(weights);
  for (size_t block = begin; block < end; block += BLOCK_SPECTRA) {
    const size_t stop =
        end - block > BLOCK_SPECTRA ? block + BLOCK_SPECTRA : end;
    for (size_t first = 0; first < n_channels; first += tile) {
      const size_t last = n_channels - first > tile ? first + tile : n_channels;
      for (size_t i = block; i < stop; ++i) {
        apply_row(weights, first, last, b->sample + i * weights->n_samples,
                  b->out + i * n_channels);
      }
    }
  }
}

ef_status ef_weights_apply(const ef_weights *weights, size_t n,
                           const double *sample, int jobs, double *out,
                           ef_error *error) {
  if (jobs < 0) {
    return ef__error_set(error, EF_INVALID, "%d jobs; 0 or more are possible",
                         jobs);
  }
  const size_t products = weights->n_channels * weights->n_samples;
  if (products == 0)
    return EF_OK;
  batch b = {weights, sample, out};
  const size_t chunk =
      products < CHUNK_PRODUCTS ? CHUNK_PRODUCTS / products : 1;
  ef__parallel_for(n, chunk, jobs, apply_range, &b);
  return EF_OK;
}
