/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --report of `match`. */
#ifndef COMMAND_MATCH_REPORT_H
#define COMMAND_MATCH_REPORT_H

#include "match.h"

/** Keeps what a page shows and writes it at the end. */
typedef struct match_report match_report;
/** NULL without memory. */
match_report *match_report_new(const ef_notes *notes);
void match_report_free(match_report *r);
match_sink match_report_sink(match_report *r);

#endif
