/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `panel calibrate`: the answers over the formula's
 * difference, how people differ, how well each formula orders the pairs. */
#ifndef COMMAND_PANEL_CALIBRATE_CHART_H
#define COMMAND_PANEL_CALIBRATE_CHART_H

#include "panel_calibrate.h"

/** To the file of --chart: answers and curves over the difference. */
ef_status panel_calibration_chart_write(const panel_calibration *c,
                                        const ef_notes *notes, ef_error *error);
/** To the file of --report. */
ef_status panel_calibration_report_write(const panel_calibration *c,
                                         const ef_notes *notes,
                                         ef_error *error);

#endif
