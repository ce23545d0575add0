/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the exit status of the command means. */
#ifndef COMMAND_EXIT_H
#define COMMAND_EXIT_H

typedef enum exit_code {
  EXIT_DONE = 0,
  EXIT_CHECK_FAILED = 1, /**< done, and --check found too large a difference */
  EXIT_USAGE = 2,        /**< unknown or contradictory arguments */
  EXIT_INPUT = 3,        /**< a file is unreadable or not what it should be */
  EXIT_NO_ANSWER = 4,    /**< the question has none */
  EXIT_OUTPUT = 5        /**< an output could not be written */
} exit_code;

#endif
