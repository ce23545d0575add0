/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "difference/range.h"

#include <stdbool.h>

static const double turn = 6.283185307179586477; /* 2 pi */

ef__range ef__range_chroma(ef__range a, ef__range b) {
  const double x = ef__range_nearest(a, 0), y = ef__range_nearest(b, 0);
  const double far_x = fmax(fabs(a.low), fabs(a.high));
  const double far_y = fmax(fabs(b.low), fabs(b.high));
  return (ef__range){sqrt(x * x + y * y), sqrt(far_x * far_x + far_y * far_y)};
}

/* A rectangle beside the origin is seen from it under less than half a turn,
 * between two of its corners. */
ef__range ef__range_hue(ef__range a, ef__range b, double from_a,
                        double from_b) {
  if (a.low <= 0 && a.high >= 0 && b.low <= 0 && b.high >= 0) {
    return (ef__range){-turn / 2, turn / 2};
  }
  const double x = (a.low + a.high) / 2, y = (b.low + b.high) / 2;
  ef__range off = {0, 0};
  for (int corner = 0; corner < 4; ++corner) {
    const double p = corner & 1 ? a.high : a.low;
    const double q = corner & 2 ? b.high : b.low;
    const double angle = atan2(x * q - y * p, x * p + y * q);
    off.low = fmin(off.low, angle);
    off.high = fmax(off.high, angle);
  }
  const double middle = atan2(from_a * y - from_b * x, from_a * x + from_b * y);
  return (ef__range){middle + off.low, middle + off.high};
}

double ef__range_least_half_sine(ef__range h) {
  double least = 1;
  for (int turns = -1; turns <= 1; ++turns) {
    const double off = ef__range_nearest(h, turns * turn) - turns * turn;
    if (fabs(off) < turn / 2)
      least = fmin(least, sin(fabs(off) / 2));
  }
  return least;
}
