/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * How kernels of pairs and of single colours pass over their arrays. */
#ifndef EVENFIELD_KERNEL_PAIRS_H
#define EVENFIELD_KERNEL_PAIRS_H

#include "kernel/vector.h"

/** One vector of points, by coordinate. */
typedef struct v_point {
  v_double x, y, z;
} v_point;

EF__INLINE v_point v_load_point(const double *from) {
  v_point p;
  v_load_triplets(from, &p.x, &p.y, &p.z);
  return p;
}

/** n < EF__LANES points, the last lanes filled with zeros. */
EF__INLINE v_point v_load_last(const double *from, size_t n) {
  double whole[3 * EF__LANES] = {0};
  memcpy(whole, from, 3 * n * sizeof *from);
  return v_load_point(whole);
}

/** The difference of one vector of pairs; `factor` is the formula's own. */
typedef v_double v_difference(v_point reference, v_point sample,
                              const double *factor);

EF__INLINE void v_each_pair(size_t n, const double *reference,
                            const double *sample, v_difference *formula,
                            const double *factor, double *out) {
  size_t i = 0;
  for (; i + EF__LANES <= n; i += EF__LANES) {
    v_store(out + i, formula(v_load_point(reference + 3 * i),
                             v_load_point(sample + 3 * i), factor));
  }
  if (i == n) return;
  const v_double d = formula(v_load_last(reference + 3 * i, n - i),
                             v_load_last(sample + 3 * i, n - i), factor);
  memcpy(out + i, &d, (n - i) * sizeof *out);
}

/** A formula so long that the processor does not see the next vector before it
 * is done with one goes through many vectors stage by stage, and keeps what is
 * between the stages in arrays of this many vectors. */
enum { V_BLOCK = 16 };

/** The differences of n <= V_BLOCK vectors of pairs. */
typedef void v_block_difference(size_t n, const double *reference,
                                const double *sample, const double *factor,
                                double *out);

EF__INLINE void v_each_block(size_t n, const double *reference,
                             const double *sample, v_block_difference *formula,
                             const double *factor, double *out) {
  size_t i = 0;
  while (n - i >= EF__LANES) {
    const size_t left = (n - i) / EF__LANES;
    const size_t taken = left < V_BLOCK ? left : V_BLOCK;
    formula(taken, reference + 3 * i, sample + 3 * i, factor, out + i);
    i += taken * EF__LANES;
  }
  if (i == n) return;
  double r[3 * EF__LANES] = {0}, s[3 * EF__LANES] = {0}, d[EF__LANES];
  memcpy(r, reference + 3 * i, 3 * (n - i) * sizeof *r);
  memcpy(s, sample + 3 * i, 3 * (n - i) * sizeof *s);
  formula(1, r, s, factor, d);
  memcpy(out + i, d, (n - i) * sizeof *d);
}

/* ---- Colours ------------------------------------------------------------ */

/** The most colours that pass a stage together, and their numbers. */
enum { V_COLOURS = V_BLOCK * EF__LANES, V_NUMBERS = 3 * V_COLOURS };

/** The first n colours of `from`, and zeros up to a whole vector. Returns how
 * many vectors of colours that makes. */
EF__INLINE size_t v_take_colours(size_t n, const double *from, double *block) {
  const size_t vectors = (n + EF__LANES - 1) / EF__LANES;
  memcpy(block, from, 3 * n * sizeof *block);
  for (size_t i = 3 * n; i < 3 * EF__LANES * vectors; ++i) block[i] = 0;
  return vectors;
}

EF__INLINE size_t v_block_size(size_t n, size_t done) {
  return n - done < V_COLOURS ? n - done : (size_t)V_COLOURS;
}

#endif
