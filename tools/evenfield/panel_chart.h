/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `panel fit`: the answers and the curve through them.
 */
#ifndef COMMAND_PANEL_CHART_H
#define COMMAND_PANEL_CHART_H

#include "panel_fit.h"

/** To the file of --chart: the curve of all observers of each condition. */
ef_status panel_chart_write(const panel_fits *p, const ef_notes *notes,
                            ef_error *error);
/** To the file of --report. */
ef_status panel_report_write(const panel_fits *p, const ef_notes *notes,
                             ef_error *error);

#endif
