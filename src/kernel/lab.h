/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * CIELAB (ISO/CIE 11664-4:2019) of a block of colours, shared by what ends
 * there. */
#ifndef EVENFIELD_KERNEL_LAB_H
#define EVENFIELD_KERNEL_LAB_H

#include "kernel/mathematics.h"
#include "kernel/pairs.h"

/** f: the cube root above (24/116)^3 and its straight part below. */
EF__INLINE v_double v_compress(v_double ratio) {
  const double join = 24.0 / 116;
  const v_double straight = ratio * (841.0 / 108) + 16.0 / 116;
  return v_select(ratio > join * join * join, v_cube_root(ratio), straight);
}

/** X / Xn, Y / Yn, Z / Zn become L*, a*, b*. The roots are taken number by
 * number: each is a chain of operations, and there are three to a colour. */
EF__INLINE void v_lab_block(size_t vectors, double *block) {
  for (size_t i = 0; i < 3 * vectors; ++i) {
    double *const at = block + EF__LANES * i;
    v_store(at, v_compress(v_load(at)));
  }
  for (size_t i = 0; i < vectors; ++i) {
    double *const at = block + 3 * EF__LANES * i;
    const v_point f = v_load_point(at);
    v_store_triplets(at, 116 * f.y - 16, 500 * (f.x - f.y), 200 * (f.y - f.z));
  }
}

#endif
