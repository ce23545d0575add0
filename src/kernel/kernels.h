/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The batch kernels: arrays in, arrays out, no allocation, no threads. Each is
 * built once for every target and called through ef__kernels(), which chooses
 * once. All targets give the same bits, and an item the same whatever its place
 * in the batch: the last, short vector is filled up and takes the same path.
 * Outputs may be inputs of the same shape. Not for values that are not finite
 * unless said; NaN gives NaN. */
#ifndef EVENFIELD_KERNEL_KERNELS_H
#define EVENFIELD_KERNEL_KERNELS_H

#include <stddef.h>
#include <stdint.h>

/** What xyz_to_ucs takes: first the nine coefficients from XYZ to responses
 * before compression. */
enum {
  EF__UCS_SHARE = 9, /**< N_bb / A_w */
  EF__UCS_POWER,     /**< c z */
  EF__UCS_CHROMA,    /**< M of sqrt(J / 100) (e_t r / u)^0.9 */
  EF__UCS_C1,
  EF__UCS_C2,
  EF__UCS_CONSTANTS
};

/** Samples of ciede2000_rough come by so many: their L*, their a*, their b*. */
enum { EF__ROUGH_BLOCK = 8 };

/** X(name, arguments) of every kernel. Pairs are n x 3 each. */
#define EF__KERNEL_LIST(X)                                                     \
  /* mathematics.c: functions of n numbers, domains as in mathematics.h. */    \
  X(cube_root, (size_t n, const double *x, double *out))                       \
  X(near_cube_root, (size_t n, const double *x, double *out))                  \
  X(exp, (size_t n, const double *x, double *out))                             \
  X(log, (size_t n, const double *x, double *out))                             \
  X(power, (size_t n, const double *x, double y, double *out))                 \
  X(share_power, (size_t n, const double *x, double y, double *out))           \
  X(sin_cos, (size_t n, const double *x, double *sine, double *cosine))        \
  X(atan2, (size_t n, const double *y, const double *x, double *out))          \
  /* spectra.c: out[i][c] = sum over j of matrix[c][j] sample[i][j], n spectra, \
   * as eight partial sums p0 ... p7 over j = 0, 8, 16 ..., 1, 9, 17 ... and so  \
   * on, ((p0 + p4) + (p1 + p5)) + ((p2 + p6) + (p3 + p7)). */                 \
  X(apply, (size_t n_samples, size_t n_channels, const double *matrix,         \
            size_t n, const double *sample, double *out))                      \
  X(apply_float, (size_t n_samples, size_t n_channels, const double *matrix,   \
                  size_t n, const float *sample, double *out))                 \
  /* bands.c: the same sums to the bit, of three channels and samples that lie   \
   * band by band: sample j of pixel i at sample[j step + i]. */                 \
  X(bands_float, (size_t n_samples, const double *matrix, size_t n,            \
                  const float *sample, size_t step, double *out))              \
  X(bands_int16, (size_t n_samples, const double *matrix, size_t n,            \
                  const int16_t *sample, size_t step, double *out))            \
  X(bands_uint16, (size_t n_samples, const double *matrix, size_t n,           \
                   const uint16_t *sample, size_t step, double *out))          \
  /* colours.c, appearance.c: n colours, n x 3 each. `matrix` leads from levels \
   * to X / Xn, Y / Yn, Z / Zn or to XYZ; `tone` is gamma, offset, slope, joint \
   * of a tone curve in closed form. */                                        \
  X(xyz_to_lab, (size_t n, const double *xyz, const double white[3],           \
                 double *lab))                                                 \
  X(codes_to_lab, (size_t n, const uint8_t *rgb, const double level[256],      \
                   const double matrix[9], double *lab))                       \
  X(rgb_to_xyz, (size_t n, const float *rgb, const double tone[4],             \
                 const double matrix[9], double *xyz))                         \
  X(xyz_to_ucs, (size_t n, const double *xyz, const double *constant,          \
                 double *ucs))                                                 \
  /* cielab.c, cie94.c, cmc.c, ciede2000.c: differences of n pairs. */         \
  X(ciede2000, (size_t n, const double *reference, const double *sample,       \
                const double factor[3], double *out))                          \
  /* ciede2000_rough.c: squared differences of one reference to n blocks of   \
   * samples; the difference is known to 0.002 of 1 + itself. */               \
  X(ciede2000_rough, (size_t n, const float reference[3],                      \
                      const float factor[3], const float *sample,              \
                      float *square))                                          \
  X(cie94, (size_t n, const double *reference, const double *sample,           \
            const double factor[5], double *out))                              \
  X(cmc, (size_t n, const double *reference, const double *sample,             \
          const double factor[2], double *out))                                \
  /* The distance, coordinate 0 over factor[0], the others over factor[1]. */  \
  X(distance, (size_t n, const double *reference, const double *sample,        \
               const double factor[2], double *out))

typedef struct ef__kernel_table {
  const char *target; /**< "avx2", "baseline" */
#define EF__KERNEL_MEMBER(name, arguments) void(*name) arguments;
  EF__KERNEL_LIST(EF__KERNEL_MEMBER)
#undef EF__KERNEL_MEMBER
} ef__kernel_table;

/** The best that this processor has. */
const ef__kernel_table *ef__kernels(void);

/** Those that this build has and this processor can run, the best first; NULL
 * beyond the last. */
const ef__kernel_table *ef__kernels_at(size_t i);

#endif
