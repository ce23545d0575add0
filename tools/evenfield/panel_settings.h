/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Options that panel verbs share, as settings of the library. */
#ifndef COMMAND_PANEL_SETTINGS_H
#define COMMAND_PANEL_SETTINGS_H

#include "answers.h"
#include "option.h"

/** --model; else the Weibull function for 2ifc and triangle, where there is
 * nothing to see at level 0; detection for yes-no and same-different with
 * trials at level 0, which give d'; else the Gaussian. */
ef_shape panel_shape(const command_options *options, const answers *a);
/** The same for a task of which it is known whether blanks are shown. */
ef_shape panel_shape_for(const command_options *options, ef_task task,
                         bool has_blanks);
/** --axis, or the one that the shape is made for. */
ef_axis panel_axis(const command_options *options, ef_shape shape);
/** Levels below 0 have no place on a logarithmic axis: names the row. */
ef_status panel_check_levels(const answers *a, ef_axis axis, ef_error *error);
/** --criterion as a share of answers: "75%", "0.75", "d-prime:1"; NaN when not
 * given. */
ef_status panel_criterion(const command_options *options, ef_task task,
                          double *criterion, ef_error *error);
/** --intervals, --samples, --seed and --jobs. */
ef_interval_settings panel_intervals(const command_options *options);

#endif
