/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart of `match`: targets, and what is shown for them. */
#ifndef COMMAND_MATCH_CHART_H
#define COMMAND_MATCH_CHART_H

#include "diagram.h"
#include "match.h"

/** Collects the colours and draws them at the end. */
typedef struct match_chart match_chart;
/** To the file of --chart. NULL without memory. */
match_chart *match_chart_new(const char *path, const ef_notes *notes);
void match_chart_free(match_chart *c);
match_sink match_chart_sink(match_chart *c);

/** The collected colours in a plane; for reports. Free with diagram_free in
 * every case. */
ef_status match_chart_draw(const match_chart *c, const match_scene *s,
                           const ef_chart_settings *settings,
                           diagram_plane plane, diagram *out, ef_error *error);

#endif
