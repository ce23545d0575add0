/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A colour typed as an option's value: lab:L,a,b, xyz:X,Y,Z, xyy:x,y,Y,
 * xy:x,y, or three numbers alone. */
#ifndef COMMAND_POINT_H
#define COMMAND_POINT_H

#include <evenfield/colour.h>

typedef struct point {
  ef_xyz xyz; /**< Y = 100 for the white; NaN without luminance */
  ef_xy xy;   /**< NaN for black */
  bool has_luminance;
} point;

/** Reads `text`, which stands behind --`option`; L*a*b* is relative to `white`.
 * What three numbers alone are taken as is noted. EF_UNKNOWN_NAME with its
 * message otherwise. */
ef_status point_parse(const char *option, const char *text, ef_xyz white,
                      const ef_notes *notes, point *out, ef_error *error);
/** Of a colour known by its tristimulus values, in any unit when
 * `has_luminance` is false. */
point point_of_xyz(ef_xyz xyz, bool has_luminance);

#endif
