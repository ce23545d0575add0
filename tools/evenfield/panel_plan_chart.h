/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `panel plan`: what more trials bring. */
#ifndef COMMAND_PANEL_PLAN_CHART_H
#define COMMAND_PANEL_PLAN_CHART_H

#include "panel_plan.h"

/** To the file of --chart: the precision of one observer's JND against the
 * number of trials; with --other-jnd the power. */
ef_status panel_plan_chart_write(const panel_plan *p, const ef_notes *notes,
                                 ef_error *error);
/** To the file of --report. */
ef_status panel_plan_report_write(const panel_plan *p, const ef_notes *notes,
                                  ef_error *error);

#endif
