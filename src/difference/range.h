/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Ranges of values, for bounds that hold over whole boxes of colours. */
#ifndef EVENFIELD_RANGE_H
#define EVENFIELD_RANGE_H

#include <math.h>

typedef struct ef__range {
  double low, high;
} ef__range;

/** The value of the range that is nearest to `at`. */
static inline double ef__range_nearest(ef__range r, double at) {
  return at < r.low ? r.low : at > r.high ? r.high : at;
}

/** Lengths of the vectors with these components. */
ef__range ef__range_chroma(ef__range a, ef__range b);

/** Their hue angles in radians less that of (from_a, from_b), within -2 pi and
 * 2 pi, by turns where that keeps the range whole; -pi to pi when the neutral
 * point is among them. */
ef__range ef__range_hue(ef__range a, ef__range b, double from_a, double from_b);

/** Least |sin(h / 2)| of angles in a range of ef__range_hue. */
double ef__range_least_half_sine(ef__range h);

#endif
