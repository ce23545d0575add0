/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Whiteness, tint and yellowness. */
#include <math.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

#define NONE ((double)NAN)

/* Whiteness and tint: CIE 015:2018 for D65 and ASTM E313 for all, from memory.
 * Yellowness: ASTM E313, editions from 1996 on. White points: CIE 015:2018 to
 * four digits, as the formulas are defined with. */
static const ef_white_scale scales[] = {
    {"cie-1931", "C", {0.3101, 0.3161}, 800, 1700, 1000, 650, 1.2769, 1.0592,
     false},
    {"cie-1931", "D50", {0.3457, 0.3585}, 800, 1700, 1000, 650, NONE, NONE,
     false},
    {"cie-1931", "D65", {0.3127, 0.3290}, 800, 1700, 1000, 650, 1.2985, 1.1335,
     true},
    {"cie-1964", "C", {0.3104, 0.3191}, 800, 1700, 900, 650, 1.2871, 1.0781,
     false},
    {"cie-1964", "D50", {0.3477, 0.3595}, 800, 1700, 900, 650, NONE, NONE,
     false},
    {"cie-1964", "D65", {0.3138, 0.3310}, 800, 1700, 900, 650, 1.3013, 1.1498,
     true},
};

const ef_white_scale *ef_white_scale_find(const char *observer,
                                          const char *illuminant,
                                          ef_error *error) {
  for (size_t i = 0; i < sizeof scales / sizeof scales[0]; ++i) {
    if (ef__name_equal(observer, scales[i].observer) &&
        ef__name_equal(illuminant, scales[i].illuminant))
      return &scales[i];
  }
  ef__error_set(error, EF_NO_ANSWER,
                "whiteness is defined for cie-1931 and cie-1964 under C, D50 "
                "and D65, not for %s under %s",
                observer, illuminant);
  return NULL;
}

ef_whiteness ef_whiteness_of(ef_xyz xyz, const ef_white_scale *scale) {
  const ef_xyy seen = ef_xyz_to_xyy(xyz);
  const double dx = scale->white.x - seen.x, dy = scale->white.y - seen.y;
  ef_whiteness out = {
      .whiteness = seen.Y + scale->per_x * dx + scale->per_y * dy,
      .tint = scale->tint_x * dx - scale->tint_y * dy,
      .yellowness =
          seen.Y > 0
              ? 100 * (scale->yellow_x * xyz.X - scale->yellow_z * xyz.Z) /
                    xyz.Y
              : NONE};
  out.is_white = out.whiteness > 40 && out.whiteness < 5 * xyz.Y - 280 &&
                 out.tint > -4 && out.tint < 2;
  return out;
}
