/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Weights times samples that lie band by band: a vector holds pixels, and each of
 * the eight parts of their sums is a walk over every eighth band, so that a value
 * has the bits that spectra.c gives it. */
#include "kernel/target.h"
#include "kernel/vector.h"

enum {
  CHANNELS = 3,
  VECTORS = 4, /* of pixels at a time: 12 sums, which the registers hold */
  GROUP = VECTORS * EF__LANES,
  PARTS = 8
};

typedef enum sample_type { FLOATS, WHOLES, UNSIGNED } sample_type;

/* A vector of doubles of a type that is a constant where this is called. */
EF__INLINE v_double load_pixels(sample_type type, const void *sample, size_t i) {
  if (type == FLOATS) return v_load_floats((const float *)sample + i);
  if (type == WHOLES) return v_load_int16((const int16_t *)sample + i);
  return v_load_uint16((const uint16_t *)sample + i);
}

EF__INLINE double load_pixel(sample_type type, const void *sample, size_t i) {
  if (type == FLOATS) return (double)((const float *)sample)[i];
  if (type == WHOLES) return (double)((const int16_t *)sample)[i];
  return (double)((const uint16_t *)sample)[i];
}

EF__INLINE void prefetch_pixels(sample_type type, const void *sample,
                                size_t i) {
  const size_t size = type == FLOATS ? sizeof(float) : sizeof(int16_t);
  v_prefetch((const char *)sample + i * size);
}

EF__INLINE void sum_group(sample_type type, size_t n_samples,
                          const double *matrix, const void *sample, size_t at,
                          size_t step, double *out) {
  v_double part[PARTS][CHANNELS][VECTORS];
  for (size_t j = 0; j < PARTS; ++j) {
    v_double sum[CHANNELS][VECTORS];
    EF__UNROLL for (int c = 0; c < CHANNELS; ++c) {
      EF__UNROLL for (int v = 0; v < VECTORS; ++v) sum[c][v] = v_all(0);
    }
    for (size_t k = j; k < n_samples; k += PARTS) {
      const v_double w0 = v_all(matrix[k]);
      const v_double w1 = v_all(matrix[n_samples + k]);
      const v_double w2 = v_all(matrix[2 * n_samples + k]);
      prefetch_pixels(type, sample, at + k * step + 2 * GROUP);
      EF__UNROLL for (int v = 0; v < VECTORS; ++v) {
        const v_double x =
            load_pixels(type, sample, at + k * step + (size_t)v * EF__LANES);
        sum[0][v] += w0 * x;
        sum[1][v] += w1 * x;
        sum[2][v] += w2 * x;
      }
    }
    memcpy(part[j], sum, sizeof sum);
  }
  EF__UNROLL for (int v = 0; v < VECTORS; ++v) {
    v_double total[CHANNELS];
    EF__UNROLL for (int c = 0; c < CHANNELS; ++c) {
      total[c] = ((part[0][c][v] + part[4][c][v]) +
                  (part[1][c][v] + part[5][c][v])) +
                 ((part[2][c][v] + part[6][c][v]) +
                  (part[3][c][v] + part[7][c][v]));
    }
    v_store_triplets(out + CHANNELS * EF__LANES * v, total[0], total[1],
                     total[2]);
  }
}

/* What is left of less than a group. */
EF__INLINE void sum_pixel(sample_type type, size_t n_samples,
                          const double *matrix, const void *sample, size_t at,
                          size_t step, double *out) {
  for (size_t c = 0; c < CHANNELS; ++c) {
    double p[PARTS] = {0};
    for (size_t k = 0; k < n_samples; ++k)
      p[k % PARTS] +=
          matrix[c * n_samples + k] * load_pixel(type, sample, at + k * step);
    out[c] = ((p[0] + p[4]) + (p[1] + p[5])) + ((p[2] + p[6]) + (p[3] + p[7]));
  }
}

EF__INLINE void sum_all(sample_type type, size_t n_samples,
                        const double *matrix, size_t n, const void *sample,
                        size_t step, double *out) {
  size_t i = 0;
  for (; i + GROUP <= n; i += GROUP) {
    sum_group(type, n_samples, matrix, sample, i, step, out + CHANNELS * i);
  }
  for (; i < n; ++i) {
    sum_pixel(type, n_samples, matrix, sample, i, step, out + CHANNELS * i);
  }
}

void EF__KERNEL(bands_float)(size_t n_samples, const double *matrix, size_t n,
                             const float *sample, size_t step, double *out) {
  sum_all(FLOATS, n_samples, matrix, n, sample, step, out);
}

void EF__KERNEL(bands_int16)(size_t n_samples, const double *matrix, size_t n,
                             const int16_t *sample, size_t step, double *out) {
  sum_all(WHOLES, n_samples, matrix, n, sample, step, out);
}

void EF__KERNEL(bands_uint16)(size_t n_samples, const double *matrix, size_t n,
                              const uint16_t *sample, size_t step,
                              double *out) {
  sum_all(UNSIGNED, n_samples, matrix, n, sample, step, out);
}
