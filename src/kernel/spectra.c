/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Weights times samples. Every value is one sum of eight parts in a fixed order
 * (v_eight_store_totals), whatever the tile it is computed in: enough parts that
 * no addition waits for the one before. */
#include "kernel/target.h"
#include "kernel/vector.h"

enum {
  MOST_CHANNELS = 6, /* at a time: two vectors of sums each fill the registers */
  MOST_TOTALS = 8,
  PACKED_SAMPLES = 512, /* 24 kB: what the first-level cache holds */
  LEAST_PACKED = 8,     /* spectra that packing pays for */
  /* Spectra whose samples stay in the second-level cache while the channels
   * pass by. */
  BLOCK_BYTES = 512 * 1024,
  LEAST_BLOCK = 32
};

/* Samples are doubles or floats: what differs. */
EF__INLINE v_eight load_samples(const void *sample, size_t i, int is_float) {
  if (is_float) return v_eight_load_float((const float *)sample + i);
  return v_eight_load((const double *)sample + i);
}

EF__INLINE v_eight load_last_samples(const void *sample, size_t i, size_t n,
                                     int is_float) {
  if (is_float) return v_eight_load_some_float((const float *)sample + i, n);
  return v_eight_load_some((const double *)sample + i, n);
}

EF__INLINE const void *spectrum_at(const void *sample, size_t i, int is_float) {
  if (is_float) return (const float *)sample + i;
  return (const double *)sample + i;
}

/* One row by one spectrum: for few spectra, or long ones. */
EF__INLINE double dot(int is_float, size_t n, const double *w, const void *x) {
  v_eight sum = v_eight_zero();
  size_t i = 0;
  for (; i + 8 <= n; i += 8) {
    sum = v_eight_add_product(sum, v_eight_load(w + i),
                              load_samples(x, i, is_float));
  }
  if (i < n) {
    sum = v_eight_add_product(sum, v_eight_load_some(w + i, n - i),
                              load_last_samples(x, i, n - i, is_float));
  }
  double total[4];
  v_eight_store_totals(total, sum, sum, sum, sum);
  return total[0];
}

/* Rows of weights, eight samples of each side by side, with zeros after the
 * last: read from start to end, in whole cache lines, for every spectrum. */
typedef struct packed {
  double w[PACKED_SAMPLES * MOST_CHANNELS] __attribute__((aligned(64)));
} packed;

EF__INLINE void pack(int channels, size_t n, const double *w, packed *out) {
  double *to = out->w;
  for (size_t i = 0; i < n; i += 8) {
    for (size_t c = 0; c < (size_t)channels; ++c, to += 8) {
      const double *const from = w + c * n + i;
      const v_eight eight =
          n - i < 8 ? v_eight_load_some(from, n - i) : v_eight_load(from);
      EF__UNROLL for (int k = 0; k < V_PARTS; ++k)
        v_store(to + k * EF__LANES, eight.part[k]);
    }
  }
}

/* `channels`, a constant where this is called, rows by one spectrum. `total`
 * receives theirs, and zeros up to a multiple of four. */
EF__INLINE void packed_tile(int channels, int is_float, size_t n,
                            const packed *w, const void *x, double *total) {
  v_eight sum[MOST_TOTALS];
  EF__UNROLL for (int k = 0; k < MOST_TOTALS; ++k) sum[k] = v_eight_zero();
  const double *at = w->w;
  size_t i = 0;
  for (; i + 32 <= n; i += 32, at += 32 * channels) { /* four at a time */
    EF__UNROLL for (int u = 0; u < 4; ++u) {
      const v_eight samples = load_samples(x, i + 8 * (size_t)u, is_float);
      EF__UNROLL for (int c = 0; c < channels; ++c) {
        sum[c] = v_eight_add_product(
            sum[c], v_eight_load(at + 8 * (u * channels + c)), samples);
      }
    }
  }
  for (; i + 8 <= n; i += 8, at += 8 * channels) {
    const v_eight samples = load_samples(x, i, is_float);
    EF__UNROLL for (int c = 0; c < channels; ++c) {
      sum[c] = v_eight_add_product(sum[c], v_eight_load(at + 8 * c), samples);
    }
  }
  if (i < n) {
    const v_eight samples = load_last_samples(x, i, n - i, is_float);
    EF__UNROLL for (int c = 0; c < channels; ++c) {
      sum[c] = v_eight_add_product(sum[c], v_eight_load(at + 8 * c), samples);
    }
  }
  v_eight_store_totals(total, sum[0], sum[1], sum[2], sum[3]);
  if (channels > 4)
    v_eight_store_totals(total + 4, sum[4], sum[5], sum[6], sum[7]);
}

/* Every spectrum for `channels` adjoining ones of channels `out_step` apart. */
EF__INLINE void stripe(int channels, int is_float, size_t n_samples,
                       const double *w, size_t n, const void *x,
                       size_t out_step, double *out) {
  packed block;
  const int is_packed = n_samples <= PACKED_SAMPLES && n >= LEAST_PACKED;
  if (is_packed) pack(channels, n_samples, w, &block);
  for (size_t i = 0; i < n; ++i) {
    const void *const at = spectrum_at(x, i * n_samples, is_float);
    double total[MOST_TOTALS];
    if (is_packed) {
      packed_tile(channels, is_float, n_samples, &block, at, total);
    } else {
      for (int c = 0; c < channels; ++c) {
        const double *const row = w + (size_t)c * n_samples;
        total[c] = dot(is_float, n_samples, row, at);
      }
    }
    memcpy(out + i * out_step, total, (size_t)channels * sizeof *out);
  }
}

EF__INLINE void apply_block(int is_float, size_t n_samples, size_t n_channels,
                            const double *matrix, size_t n, const void *x,
                            double *out) {
  size_t c = 0;
  for (; c + 6 <= n_channels; c += 6) {
    stripe(6, is_float, n_samples, matrix + c * n_samples, n, x, n_channels,
           out + c);
  }
  for (; c + 3 <= n_channels; c += 3) {
    stripe(3, is_float, n_samples, matrix + c * n_samples, n, x, n_channels,
           out + c);
  }
  for (; c < n_channels; ++c) {
    stripe(1, is_float, n_samples, matrix + c * n_samples, n, x, n_channels,
           out + c);
  }
}

EF__INLINE void apply_any(int is_float, size_t n_samples, size_t n_channels,
                          const double *matrix, size_t n, const void *sample,
                          double *out) {
  if (n_channels == 3) { /* in one go, however many spectra */
    stripe(3, is_float, n_samples, matrix, n, sample, 3, out);
    return;
  }
  const size_t bytes = n_samples * (is_float ? sizeof(float) : sizeof(double));
  const size_t block =
      bytes * LEAST_BLOCK > BLOCK_BYTES ? LEAST_BLOCK : BLOCK_BYTES / bytes;
  for (size_t first = 0; first < n; first += block) {
    const size_t count = n - first < block ? n - first : block;
    apply_block(is_float, n_samples, n_channels, matrix, count,
                spectrum_at(sample, first * n_samples, is_float),
                out + first * n_channels);
  }
}

void EF__KERNEL(apply)(size_t n_samples, size_t n_channels,
                       const double *matrix, size_t n, const double *sample,
                       double *out) {
  apply_any(0, n_samples, n_channels, matrix, n, sample, out);
}

void EF__KERNEL(apply_float)(size_t n_samples, size_t n_channels,
                             const double *matrix, size_t n,
                             const float *sample, double *out) {
  apply_any(1, n_samples, n_channels, matrix, n, sample, out);
}
