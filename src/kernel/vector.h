/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Vectors of doubles: the one place for the compiler's extensions that kernels
 * stand on. A vector is as wide as the registers of the target the file is
 * built for, and every operation works lane by lane with the rounding of the
 * scalar one. Nothing is fused or reordered, so that a kernel gives the same
 * bits on every target, and a lane the same whatever stands in the others.
 * Operators, also with a double on one side, are those of C. */
#ifndef EVENFIELD_KERNEL_VECTOR_H
#define EVENFIELD_KERNEL_VECTOR_H

#include <stddef.h>
#include <stdint.h>
#include <string.h>

#if defined(__AVX2__)
#include <immintrin.h>
#define EF__LANES 4
#elif defined(__SSE2__)
#include <emmintrin.h>
#define EF__LANES 2
#else
#define EF__LANES 2
#endif

typedef double v_double __attribute__((vector_size(8 * EF__LANES)));
/** Integers as wide as the doubles; of a comparison, all bits set for true. */
typedef int64_t v_int __attribute__((vector_size(8 * EF__LANES)));
typedef uint64_t v_uint __attribute__((vector_size(8 * EF__LANES)));

/** Blocks that must become part of the loop around them. */
#define EF__INLINE static inline __attribute__((always_inline))

EF__INLINE v_double v_all(double x) {
#if EF__LANES == 4
  return (v_double){x, x, x, x};
#else
  return (v_double){x, x};
#endif
}

EF__INLINE v_int v_all_int(int64_t x) {
#if EF__LANES == 4
  return (v_int){x, x, x, x};
#else
  return (v_int){x, x};
#endif
}

EF__INLINE v_double v_load(const double *from) {
  v_double x;
  memcpy(&x, from, sizeof x);
  return x;
}

EF__INLINE void v_store(double *to, v_double x) {
  memcpy(to, &x, sizeof x);
}

EF__INLINE v_double v_sqrt(v_double x) {
#if defined(__AVX2__)
  return (v_double)_mm256_sqrt_pd((__m256d)x);
#elif defined(__SSE2__)
  return (v_double)_mm_sqrt_pd((__m128d)x);
#else
  for (int i = 0; i < EF__LANES; ++i) x[i] = __builtin_sqrt(x[i]);
  return x;
#endif
}

/** `yes` where `mask` (of a comparison) is true, else `no`. */
EF__INLINE v_double v_select(v_int mask, v_double yes, v_double no) {
#if defined(__AVX2__)
  return (v_double)_mm256_blendv_pd((__m256d)no, (__m256d)yes, (__m256d)mask);
#else
  return (v_double)((mask & (v_int)yes) | (~mask & (v_int)no));
#endif
}

/** `x` where `mask` is true, else 0. */
EF__INLINE v_double v_keep(v_int mask, v_double x) {
  return (v_double)(mask & (v_int)x);
}

EF__INLINE int v_any(v_int mask) {
#if defined(__AVX2__)
  return _mm256_movemask_pd((__m256d)mask) != 0;
#elif defined(__SSE2__)
  return _mm_movemask_pd((__m128d)mask) != 0;
#else
  return (mask[0] | mask[1]) != 0;
#endif
}

EF__INLINE v_double v_abs(v_double x) {
  return (v_double)((v_int)x & INT64_MAX);
}

/** The size of one and the sign of the other. */
EF__INLINE v_double v_copysign(v_double size, v_double sign) {
  return (v_double)(((v_int)size & INT64_MAX) | ((v_int)sign & INT64_MIN));
}

/** EF__LANES triplets that follow each other in memory, and back. */
EF__INLINE void v_load_triplets(const double *from, v_double *x, v_double *y,
                                v_double *z) {
  const v_double r = v_load(from), s = v_load(from + EF__LANES),
                 t = v_load(from + 2 * EF__LANES);
#if EF__LANES == 4
  /* r = x0 y0 z0 x1, s = y1 z1 x2 y2, t = z2 x3 y3 z3 */
  const v_double u = __builtin_shufflevector(r, s, 0, 1, 6, 7);
  const v_double v = __builtin_shufflevector(r, t, 2, 3, 4, 5);
  const v_double w = __builtin_shufflevector(s, t, 0, 1, 6, 7);
  *x = __builtin_shufflevector(u, v, 0, 5, 2, 7);
  *y = __builtin_shufflevector(u, w, 1, 4, 3, 6);
  *z = __builtin_shufflevector(v, w, 0, 5, 2, 7);
#else
  *x = __builtin_shufflevector(r, s, 0, 3);
  *y = __builtin_shufflevector(r, t, 1, 2);
  *z = __builtin_shufflevector(s, t, 0, 3);
#endif
}

EF__INLINE void v_store_triplets(double *to, v_double x, v_double y,
                                 v_double z) {
#if EF__LANES == 4
  const v_double u = __builtin_shufflevector(x, y, 0, 4, 2, 6);
  const v_double v = __builtin_shufflevector(z, x, 0, 5, 2, 7);
  const v_double w = __builtin_shufflevector(y, z, 1, 5, 3, 7);
  v_store(to, __builtin_shufflevector(u, v, 0, 1, 4, 5));
  v_store(to + 4, __builtin_shufflevector(w, u, 0, 1, 6, 7));
  v_store(to + 8, __builtin_shufflevector(v, w, 2, 3, 6, 7));
#else
  v_store(to, __builtin_shufflevector(x, y, 0, 2));
  v_store(to + 2, __builtin_shufflevector(z, x, 0, 3));
  v_store(to + 4, __builtin_shufflevector(y, z, 1, 3));
#endif
}

#endif
