/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Standard error: one line for an error, one for each note, and progress. */
#ifndef COMMAND_MESSAGE_H
#define COMMAND_MESSAGE_H

#include <evenfield/base.h>

#include "exit.h"

/** "evenfield: ..." for wrong usage; returns EXIT_USAGE. */
exit_code message_usage(const char *format, ...) EF_PRINTF(1, 2);
/** "evenfield: ..." for a failed call; returns the code for its status. */
exit_code message_error(const ef_error *error);

/** Remembers the last note, so that one read twice is said once. */
typedef struct message_sink {
  bool quiet;
  char last[512];
} message_sink;
/** Notes as "note: ..." lines, or dropped when the sink is quiet. */
ef_notes message_notes(message_sink *sink);
/** A note of the command's own; none where `notes` is NULL. */
void message_note(const ef_notes *notes, const char *format, ...)
    EF_PRINTF(2, 3);

/** Fills an error of the command's own; returns `status`. */
ef_status message_fail(ef_error *error, ef_status status, const char *format,
                       ...) EF_PRINTF(3, 4);
/** Puts "--OPTION: " before the message of an error about an option's value:
 * a name that is not known or not allowed, which is wrong usage. */
ef_status message_option(ef_error *error, const char *option,
                         const char *after);
/** The same with "WHAT: ", for an argument that is no option's. */
ef_status message_argument(ef_error *error, const char *what,
                           const char *after);
/** Names the file in an error that names none; returns its status. */
ef_status message_place(ef_error *error, const char *file);

/** Rows, or what `unit` names, done so far, on a terminal and once a second has passed. */
typedef struct message_progress {
  bool on_terminal, shown;
  const char *unit; /**< NULL: rows */
  double start_s, last_s;
} message_progress;
message_progress message_progress_start(bool quiet);
void message_progress_show(message_progress *progress, size_t n);
void message_progress_end(message_progress *progress);

#endif
