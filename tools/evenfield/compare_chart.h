/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `compare`: how samples part from their standards. */
#ifndef COMMAND_COMPARE_CHART_H
#define COMMAND_COMPARE_CHART_H

#include "compare_kept.h"
#include "diagram.h"

/** The differences of the kept pairs in a* and b* (PLANE_AB) or in C* and L*
 * (PLANE_LC), a series for each look. Free with diagram_free in every case. */
ef_status compare_chart_draw(const compare_text *t, const compare_scene *s,
                             ef_chart_settings settings, diagram_plane plane,
                             diagram *out, ef_error *error);
/** What the clouds of people in the plane of a*, b* are; where there are some. */
void compare_chart_people_words(text *about, const compare_scene *s);
/** To the file of --chart. */
ef_status compare_chart_write(const compare_text *t, const compare_scene *s,
                              ef_error *error);
/** To the file of --report. */
ef_status compare_report_write(compare_text *t, const compare_scene *s,
                               const compare_count *count, ef_error *error);

#endif
