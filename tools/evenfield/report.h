/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --report: what every report has, whatever the command. */
#ifndef COMMAND_REPORT_H
#define COMMAND_REPORT_H

#include <evenfield/picture.h>

#include "option.h"
#include "text.h"

/** Files that an answer rests on. */
enum { REPORT_MOST_INPUTS = 32 };
/** Width of a pair and of a chart, px. */
enum { REPORT_SWATCH_PX = 160, REPORT_CHART_PX = 400, REPORT_MOST_SWATCHES = 48 };

typedef struct report {
  const command_options *options;
  const ef_notes *notes;
  ef_report *page; /**< owned */
  size_t n_inputs;
  char *input[REPORT_MOST_INPUTS];
  bool has_seed;
  double seed;
} report;

/** The page of --report with this title; the command line's files are its
 * first inputs. Free with report_free in every case. */
ef_status report_begin(report *r, const command_options *options,
                       const ef_notes *notes, const char *title,
                       ef_error *error);
void report_free(report *r);
/** Another file that the answer rests on; NULL and what is known already are
 * passed over. */
void report_input(report *r, const char *path);
/** Text whose parts go to the page. */
text report_text(const report *r);
/** Pairs, of which there are `n_all`, and what could not be shown of them. */
void report_swatches(const report *r, size_t n, size_t n_all,
                     const ef_swatch *swatch,
                     const ef_swatch_settings *settings,
                     const ef_report_halves *halves);
/** Adds how it was made (command line, version, inputs with their digests,
 * seed) and gives the page its name. */
ef_status report_end(report *r, ef_error *error);

#endif
