/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The trichromat with the eyes of a dichromat: of the many amounts that match
 * for the dichromat those are taken that come nearest to matching for this
 * observer as well. */
#ifndef COMMAND_COMPANION_H
#define COMMAND_COMPANION_H

#include <evenfield/match.h>

#include "targets.h"

typedef struct companion {
  ef_observer *observer; /**< NULL: the observer is none of two dimensions */
  ef_setup *setup;
  colour_basis basis;
  targets targets;
  ef_match_settings settings;
  double *xyz;
  ef_match *match;
  double *amount;
} companion;

/** For blocks of at most `most_rows` targets; does nothing for observers of
 * three dimensions. Free with companion_free in every case. */
ef_status companion_init(companion *c, const command_options *options,
                         const ef_setup *setup, const colour_basis *basis,
                         const ef_reader_head *head,
                         const ef_match_settings *settings, size_t most_rows,
                         ef_error *error);
void companion_free(companion *c);
/** *amount: n x 3 amounts that match for the companion, borrowed until the next
 * call. */
ef_status companion_match(companion *c, size_t n, const double *value, int jobs,
                          const double **amount, ef_error *error);

#endif
