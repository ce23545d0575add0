/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the people of --population see of targets and of what is shown for
 * them. */
#ifndef COMMAND_SEEN_H
#define COMMAND_SEEN_H

#include <evenfield/match.h>

#include "device.h"
#include "people.h"
#include "targets.h"

typedef struct seen {
  people people; /**< its population is NULL: none was asked for */
  ef_spread_settings settings;
  const ef_device *device; /**< borrowed */
  ef_grid grid;            /**< of the targets */
  ef_side target, match;   /**< their samples are those of the last block */
  bool has_sides;          /**< spectra of both are there, and wanted */
  bool is_light;           /**< targets are lights beside the display's white */
  /* Owned: whites and samples of both sides; lights on the standard grid. */
  double *white, *shown, *light_white, *light;
  const ef_notes *notes; /**< for the first block */
} seen;

/** --population, or --categories of one. */
bool seen_is_asked(const command_options *options);

/** What it rests on; all borrowed. */
typedef struct seen_basis {
  const command_options *options;
  const ef_setup *setup;
  const chosen_device *chosen;
  const targets *targets;
  const ef_reader_head *head; /**< of the targets */
  const ef_illuminant *illuminant;
  const ef_metric *metric;
  double jnd; /**< beyond which two are told apart; NaN: not known */
} seen_basis;

/** For blocks of at most `most_rows` targets. EF_NO_ANSWER without spectra of
 * display and targets when people were asked for; a report wants both sides
 * where they have spectra. Free with seen_free in every case. */
ef_status seen_init(seen *s, const seen_basis *basis, size_t most_rows,
                    const ef_notes *notes, ef_error *error);
void seen_free(seen *s);

/** The drives of what is shown for target `row` of the next block. */
ef_status seen_show(seen *s, size_t row, const double *drive, ef_error *error);
/** The next block: n targets, whose matches seen_show got. */
ef_status seen_take(seen *s, size_t n, const double *value, ef_error *error);
/** What the people see of it. */
ef_status seen_rows(seen *s, size_t n, int jobs, ef_spread *out,
                    ef_error *error);

#endif
