/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `panel next`: what is known of the threshold, and
 * what each level in hand would tell. */
#ifndef COMMAND_PANEL_NEXT_CHART_H
#define COMMAND_PANEL_NEXT_CHART_H

#include "panel_next.h"

/** To the file of --chart: the thresholds that are possible, observer by
 * observer, with the levels in hand. */
ef_status panel_next_chart_write(const panel_next *p, const ef_notes *notes,
                                 ef_error *error);
/** To the file of --report. */
ef_status panel_next_report_write(const panel_next *p, const ef_notes *notes,
                                  ef_error *error);

#endif
