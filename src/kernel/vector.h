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
/** Twice as many floats, for first approximations. */
typedef float v_float __attribute__((vector_size(8 * EF__LANES)));
typedef int32_t v_int32 __attribute__((vector_size(8 * EF__LANES)));

/** Blocks that must become part of the loop around them. */
#define EF__INLINE static inline __attribute__((always_inline))

/** Before a short loop over registers: its body as often as it runs. */
#if defined(__clang__)
#define EF__UNROLL _Pragma("clang loop unroll(full)")
#else
#define EF__UNROLL _Pragma("GCC unroll 8")
#endif

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

/** All lanes true, or none. */
EF__INLINE v_int v_truth(int is_true) {
  return v_all_int(is_true ? -1 : 0);
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

/** Two vectors of doubles as one of floats, and back. */
EF__INLINE v_float v_narrow(v_double a, v_double b) {
#if defined(__AVX2__)
  return (v_float)_mm256_set_m128(_mm256_cvtpd_ps((__m256d)b),
                                  _mm256_cvtpd_ps((__m256d)a));
#elif defined(__SSE2__)
  return (v_float)_mm_movelh_ps(_mm_cvtpd_ps((__m128d)a),
                                _mm_cvtpd_ps((__m128d)b));
#else
  return (v_float){(float)a[0], (float)a[1], (float)b[0], (float)b[1]};
#endif
}

EF__INLINE void v_widen(v_float x, v_double *a, v_double *b) {
#if defined(__AVX2__)
  *a = (v_double)_mm256_cvtps_pd(_mm256_castps256_ps128((__m256)x));
  *b = (v_double)_mm256_cvtps_pd(_mm256_extractf128_ps((__m256)x, 1));
#elif defined(__SSE2__)
  *a = (v_double)_mm_cvtps_pd((__m128)x);
  *b = (v_double)_mm_cvtps_pd(_mm_movehl_ps((__m128)x, (__m128)x));
#else
  *a = (v_double){(double)x[0], (double)x[1]};
  *b = (v_double){(double)x[2], (double)x[3]};
#endif
}

/** Floats as doubles. */
EF__INLINE v_double v_load_float(const float *from) {
#if defined(__AVX2__)
  return (v_double)_mm256_cvtps_pd(_mm_loadu_ps(from));
#else
  return (v_double){(double)from[0], (double)from[1]};
#endif
}

/* ---- Floats ------------------------------------------------------------- */

enum { V_FLOATS = 2 * EF__LANES };

EF__INLINE v_float v_float_load(const float *from) {
  v_float x;
  memcpy(&x, from, sizeof x);
  return x;
}

EF__INLINE void v_float_store(float *to, v_float x) {
  memcpy(to, &x, sizeof x);
}

EF__INLINE v_float v_sqrt_float(v_float x) {
#if defined(__AVX2__)
  return (v_float)_mm256_sqrt_ps((__m256)x);
#elif defined(__SSE2__)
  return (v_float)_mm_sqrt_ps((__m128)x);
#else
  for (int i = 0; i < V_FLOATS; ++i) x[i] = __builtin_sqrtf(x[i]);
  return x;
#endif
}

EF__INLINE v_float v_select_float(v_int32 mask, v_float yes, v_float no) {
#if defined(__AVX2__)
  return (v_float)_mm256_blendv_ps((__m256)no, (__m256)yes, (__m256)mask);
#else
  return (v_float)((mask & (v_int32)yes) | (~mask & (v_int32)no));
#endif
}

/* ---- Sums --------------------------------------------------------------- */

/** Eight doubles on every target, for sums of eight parts. */
enum { V_PARTS = 8 / EF__LANES };
typedef struct v_eight {
  v_double part[V_PARTS];
} v_eight;

EF__INLINE v_eight v_eight_zero(void) {
  v_eight q;
  EF__UNROLL for (int i = 0; i < V_PARTS; ++i) q.part[i] = v_all(0);
  return q;
}

EF__INLINE v_eight v_eight_load(const double *from) {
  v_eight q;
  EF__UNROLL for (int i = 0; i < V_PARTS; ++i) {
    q.part[i] = v_load(from + i * EF__LANES);
  }
  return q;
}

/** As many lanes of a vector as there are of n numbers, then zeros; reads no
 * further. */
EF__INLINE v_double v_load_some(const double *from, size_t n) {
#if defined(__AVX2__)
  static const int64_t mask[8] = {-1, -1, -1, -1, 0, 0, 0, 0};
  const __m256i lanes =
      _mm256_loadu_si256((const void *)(mask + 4 - (n < 4 ? n : 4)));
  return (v_double)_mm256_maskload_pd(from, lanes);
#else
  if (n >= EF__LANES) return v_load(from);
  return n > 0 ? (v_double){from[0], 0} : v_all(0);
#endif
}

EF__INLINE v_eight v_eight_load_some(const double *from, size_t n) {
  v_eight q;
  EF__UNROLL for (int i = 0; i < V_PARTS; ++i) {
    const size_t done = (size_t)i * EF__LANES;
    q.part[i] = v_load_some(from + done, n > done ? n - done : 0);
  }
  return q;
}

/** As many as there are lanes, as doubles. */
EF__INLINE v_double v_load_floats(const float *from) {
#if defined(__AVX2__)
  return (v_double)_mm256_cvtps_pd(_mm_loadu_ps(from));
#else
  return (v_double){(double)from[0], (double)from[1]};
#endif
}

EF__INLINE v_double v_load_int16(const int16_t *from) {
#if defined(__AVX2__)
  const __m128i wide = _mm_cvtepi16_epi32(_mm_loadl_epi64((const void *)from));
  return (v_double)_mm256_cvtepi32_pd(wide);
#else
  return (v_double){(double)from[0], (double)from[1]};
#endif
}

EF__INLINE v_double v_load_uint16(const uint16_t *from) {
#if defined(__AVX2__)
  const __m128i wide = _mm_cvtepu16_epi32(_mm_loadl_epi64((const void *)from));
  return (v_double)_mm256_cvtepi32_pd(wide);
#else
  return (v_double){(double)from[0], (double)from[1]};
#endif
}

/** Asks for memory that is read soon; it need not be there. */
EF__INLINE void v_prefetch(const void *at) {
  __builtin_prefetch(at);
}

EF__INLINE v_eight v_eight_load_float(const float *from) {
  v_eight q;
  EF__UNROLL for (int i = 0; i < V_PARTS; ++i) {
    q.part[i] = v_load_float(from + i * EF__LANES);
  }
  return q;
}

EF__INLINE v_eight v_eight_load_some_float(const float *from, size_t n) {
  v_eight q;
  EF__UNROLL for (int i = 0; i < V_PARTS; ++i) {
    const size_t done = (size_t)i * EF__LANES;
    const size_t left = n > done ? n - done : 0;
    const float *const at = from + done;
#if defined(__AVX2__)
    static const int32_t mask[8] = {-1, -1, -1, -1, 0, 0, 0, 0};
    const __m128i lanes =
        _mm_loadu_si128((const void *)(mask + 4 - (left < 4 ? left : 4)));
    q.part[i] = (v_double)_mm256_cvtps_pd(_mm_maskload_ps(at, lanes));
#else
    q.part[i] = (v_double){left > 0 ? (double)at[0] : 0,
                           left > 1 ? (double)at[1] : 0};
#endif
  }
  return q;
}

/** sum + a b, each rounded. */
EF__INLINE v_eight v_eight_add_product(v_eight sum, v_eight a, v_eight b) {
  EF__UNROLL for (int i = 0; i < V_PARTS; ++i) {
    sum.part[i] += a.part[i] * b.part[i];
  }
  return sum;
}

/** ((p0 + p4) + (p1 + p5)) + ((p2 + p6) + (p3 + p7)) of each of four, to memory.
 */
EF__INLINE void v_eight_store_totals(double *to, v_eight a, v_eight b,
                                     v_eight c, v_eight d) {
#if EF__LANES == 4
  const v_double p = a.part[0] + a.part[1], q = b.part[0] + b.part[1];
  const v_double r = c.part[0] + c.part[1], s = d.part[0] + d.part[1];
  /* p0 + p1, q0 + q1, p2 + p3, q2 + q3 */
  const v_double pq = __builtin_shufflevector(p, q, 0, 4, 2, 6) +
                      __builtin_shufflevector(p, q, 1, 5, 3, 7);
  const v_double rs = __builtin_shufflevector(r, s, 0, 4, 2, 6) +
                      __builtin_shufflevector(r, s, 1, 5, 3, 7);
  v_store(to, __builtin_shufflevector(pq, rs, 0, 1, 4, 5) +
                  __builtin_shufflevector(pq, rs, 2, 3, 6, 7));
#else
  const v_eight all[4] = {a, b, c, d};
  EF__UNROLL for (int k = 0; k < 4; k += 2) {
    const v_eight p = all[k], q = all[k + 1];
    const v_double p0 = p.part[0] + p.part[2], p1 = p.part[1] + p.part[3];
    const v_double q0 = q.part[0] + q.part[2], q1 = q.part[1] + q.part[3];
    v_store(to + k, (__builtin_shufflevector(p0, q0, 0, 2) +
                     __builtin_shufflevector(p0, q0, 1, 3)) +
                        (__builtin_shufflevector(p1, q1, 0, 2) +
                         __builtin_shufflevector(p1, q1, 1, 3)));
  }
#endif
}

/** EF__LANES triplets that follow each other in r, s, t, or in memory, and back.
 */
EF__INLINE void v_part_triplets(v_double r, v_double s, v_double t, v_double *x,
                                v_double *y, v_double *z) {
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

EF__INLINE void v_load_triplets(const double *from, v_double *x, v_double *y,
                                v_double *z) {
  v_part_triplets(v_load(from), v_load(from + EF__LANES),
                  v_load(from + 2 * EF__LANES), x, y, z);
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
