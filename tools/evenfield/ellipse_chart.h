/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `ellipse`. */
#ifndef COMMAND_ELLIPSE_CHART_H
#define COMMAND_ELLIPSE_CHART_H

#include "diagram.h"
#include "render_ellipse.h"

/** The kept ellipses in their plane, as often as large as --magnification says,
 * or as it takes to see them; of one ellipse its own surroundings. To the file
 * of --chart. */
ef_status ellipse_chart_write(const ellipse_text *t, const ellipse_scene *s,
                              const ellipse_count *n, const ef_notes *notes,
                              ef_error *error);
/** To the file of --report. */
ef_status ellipse_report_write(ellipse_text *t, const ellipse_scene *s,
                               const ellipse_count *n, const ef_notes *notes,
                               ef_error *error);

#endif
