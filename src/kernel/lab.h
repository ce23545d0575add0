/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * CIELAB (ISO/CIE 11664-4:2019) of a block of colours, shared by what ends
 * there. */
#ifndef EVENFIELD_KERNEL_LAB_H
#define EVENFIELD_KERNEL_LAB_H

#include <stdbool.h>

#include "kernel/mathematics.h"
#include "kernel/pairs.h"

/** Beyond this ratio to the white the roots take a longer way. */
#define V_FAR_RATIO 0x1p100

/** f: the cube root above (24/116)^3 and its straight part below. */
EF__INLINE v_double v_compress(v_double ratio, v_double root) {
  const double join = 24.0 / 116;
  const v_double straight = ratio * (841.0 / 108) + 16.0 / 116;
  return v_select(ratio > join * join * join, root, straight);
}

/** L*, a*, b* of n colours from X / Xn, Y / Yn, Z / Zn, which are lost.
 * `is_far`: some may lie beyond V_FAR_RATIO. The roots are taken number by
 * number: each is a chain of operations, and there are three to a colour. */
EF__INLINE void v_lab_block(size_t n, bool is_far, v_colours *block,
                            double *lab) {
  const size_t used = v_padded(n), pair = 2 * EF__LANES;
  v_float seed[V_BLOCK / 2];
  for (int c = 0; c < 3; ++c) {
    double *const at = block->part[c];
    for (size_t i = 0; i < used; i += pair) {
      seed[i / pair] =
          v_near_cube_root_seed(v_load(at + i), v_load(at + i + EF__LANES));
    }
    for (size_t i = 0; i < used; i += pair) {
      v_double half[2];
      v_widen(seed[i / pair], &half[0], &half[1]);
      EF__UNROLL for (size_t k = 0; k < 2; ++k) {
        double *const here = at + i + k * EF__LANES;
        const v_double ratio = v_load(here);
        v_double root = v_near_cube_root(ratio, half[k]);
        if (is_far)
          root = v_select(ratio > V_FAR_RATIO, v_cube_root(ratio), root);
        v_store(here, v_compress(ratio, root));
      }
    }
  }
  for (size_t i = 0; i < n; i += EF__LANES) {
    const v_point f = v_colours_at(block, i);
    v_give(n, i,
           (v_point){116 * f.y - 16, 500 * (f.x - f.y), 200 * (f.y - f.z)},
           lab);
  }
}

#endif
