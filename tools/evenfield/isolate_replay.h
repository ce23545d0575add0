/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --replay of `isolate`: the record of a stimulus, and whether what comes of it
 * is what was recorded. */
#ifndef COMMAND_ISOLATE_REPLAY_H
#define COMMAND_ISOLATE_REPLAY_H

#include <evenfield/exchange.h>

#include "isolate_frames.h"
#include "kept.h"
#include "option.h"

typedef struct replay {
  const char *name; /**< of the record's file */
  ef_document *document;
  size_t n_arguments;
  char **argument; /**< options as they were given; owned */
  kept_files kept; /**< the texts of all files; closed */
} replay;

/** EXIT_USAGE with its message for options that a replay cannot change. */
exit_code replay_check_usage(const command_options *options);
/** Free with replay_free in every case. */
ef_status replay_open(replay *r, const char *path, ef_error *error);
void replay_free(replay *r);
/** EXIT_CHECK_FAILED with its message when a picture is not as recorded, else a
 * note. */
exit_code replay_check_pictures(const replay *r, const isolate_show *show,
                                const ef_notes *notes);

#endif
