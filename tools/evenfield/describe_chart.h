/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart of `describe`: where colours and spectra lie. */
#ifndef COMMAND_DESCRIBE_CHART_H
#define COMMAND_DESCRIBE_CHART_H

#include "describe.h"

/** Keeps what is described on its way to another sink. */
typedef struct describe_chart describe_chart;
/** NULL without memory. */
describe_chart *describe_chart_new(const describe_sink *next);
void describe_chart_free(describe_chart *c);
describe_sink describe_chart_sink(describe_chart *c);
/** To the file of --chart. */
ef_status describe_chart_write(const describe_chart *c, const describe_scene *s,
                               const ef_notes *notes, ef_error *error);

#endif
