/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart of `isolate`: the spectra of the background and of the extremes. */
#ifndef COMMAND_ISOLATE_CHART_H
#define COMMAND_ISOLATE_CHART_H

#include "isolate.h"

/** To the file of --chart, as the codes show them. */
ef_status isolate_chart_write(const isolate_scene *s, const isolate_result *r,
                              const ef_notes *notes, ef_error *error);

#endif
