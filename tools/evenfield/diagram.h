/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart: colours in a plane, with what belongs there (spectrum locus,
 * gamut), ready for the library's charts. */
#ifndef COMMAND_DIAGRAM_H
#define COMMAND_DIAGRAM_H

#include <evenfield/device.h>
#include <evenfield/picture.h>

#include "option.h"

/** The planes of --plane, in the order of its choices. */
typedef enum diagram_plane {
  PLANE_UV, /**< u', v' */
  PLANE_XY,
  PLANE_AB,    /**< a*, b* */
  PLANE_LC,    /**< C*, L* */
  PLANE_PEOPLE /**< differences of a*, b*, as people see them; of match */
} diagram_plane;

/** Titles of the axes and equal scales where the plane has them. */
ef_chart_settings diagram_settings(diagram_plane plane);
/** Titles of the axes for differences in a*, b* or in C*, L*. */
void diagram_set_differences(ef_chart_settings *settings, diagram_plane plane);
/** "u', v'" ... Static. */
const char *diagram_plane_name(diagram_plane plane);
bool diagram_is_chromaticity(diagram_plane plane);
/** Where a colour lies; `white` is that of CIELAB. NaN for chromaticities far
 * from those that light can have. */
ef_xy diagram_point(diagram_plane plane, ef_xyz xyz, ef_xyz white);

/** Where a diagram is wanted. */
typedef struct diagram {
  ef_chart *chart; /**< owned */
  diagram_plane plane;
  ef_xyz white;
  bool has_empty_section; /**< nothing lies at the lightness asked for */
} diagram;

/** Free with diagram_free in every case. */
ef_status diagram_init(diagram *d, const ef_chart_settings *settings,
                       diagram_plane plane, ef_xyz white, ef_error *error);
void diagram_free(diagram *d);
/** The spectrum locus with its wavelengths, closed by the purple line: in
 * planes of chromaticity, and nothing in others. */
ef_status diagram_add_locus(diagram *d, const ef_observer *observer,
                            ef_error *error);
/** What a setup of three drives can show: the polygon of its primaries in
 * planes of chromaticity where colours add, else the outline of all it can show
 * as seen from its white; nothing in the plane of L* and C*. */
ef_status diagram_add_gamut(diagram *d, const ef_setup *setup, ef_error *error);
/** What a setup of three drives can show at one lightness, in the plane of a*,
 * b*. */
ef_status diagram_add_section(diagram *d, const ef_setup *setup, double L_star,
                              ef_error *error);
/** A mark in the middle of differences. */
ef_status diagram_add_origin(diagram *d, const char *name, ef_error *error);
/** The white. */
ef_status diagram_add_white(diagram *d, const char *name, ef_error *error);
/** To the file of --chart, with notes about what it could not show. */
ef_status diagram_write(const diagram *d, const char *path,
                        const ef_notes *notes, ef_error *error);
/** EXIT_USAGE with its message when --chart names no kind of file that there
 * is. */
exit_code diagram_check_usage(const command_options *options);

#endif
