/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A calibration as text, as JSON, or as the CSV that `compare --jnd` reads. */
#ifndef COMMAND_RENDER_PANEL_CALIBRATE_H
#define COMMAND_RENDER_PANEL_CALIBRATE_H

#include "panel_calibrate.h"
#include "text.h"

/** All of the text. */
void panel_calibration_add(text *out, const panel_calibration *c);
ef_status render_panel_calibrate(const panel_calibration *c, ef_output *output,
                                 ef_error *error);
/** The record alone: of --format csv and of --save. */
ef_status render_panel_jnd(const panel_calibration *c, ef_output *output,
                           ef_error *error);

#endif
