/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Formulas that divide the lightness, chroma and hue parts of a CIELAB
 * difference by weights of the reference. */
#ifndef EVENFIELD_KERNEL_POLAR_H
#define EVENFIELD_KERNEL_POLAR_H

#include "kernel/pairs.h"

/** The root of (dL / w_l)^2 + (dC / w_c)^2 + (dH / w_h)^2, with `chroma` that of
 * the reference. dH^2 is 2 cross^2 / (C1 C2 + dot) for hues up to a right angle
 * apart, which does not cancel, and 2 (C1 C2 - dot) beyond; written as n / d,
 * so that one division serves the plane. */
EF__INLINE v_double v_polar(v_point reference, v_point sample, v_double chroma,
                            v_double w_l, v_double w_c, v_double w_h) {
  const v_double dot = reference.y * sample.y + reference.z * sample.z;
  const v_double cross = reference.y * sample.z - reference.z * sample.y;
  const v_double chroma2 = v_sqrt(sample.y * sample.y + sample.z * sample.z);
  const v_double product = chroma * chroma2;
  const v_int apart = dot < 0, achromatic = product == 0;
  const v_double n = v_select(apart, 2 * (product - dot), 2 * cross * cross);
  const v_double d = v_select(apart | achromatic, v_all(1), product + dot);
  const v_double delta_l = (sample.x - reference.x) / w_l;
  const v_double delta_c = chroma2 - chroma;
  const v_double c_h = w_c * w_h;
  const v_double plane =
      (delta_c * delta_c * d * (w_h * w_h) + n * (w_c * w_c)) /
      (d * (c_h * c_h));
  return v_sqrt(delta_l * delta_l + plane);
}

#endif
