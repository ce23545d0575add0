/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What all commands do around their work: checks of options that belong
 * together, and the output that appears whole or not at all. */
#ifndef COMMAND_RESULT_H
#define COMMAND_RESULT_H

#include <evenfield/exchange.h>

#include "message.h"
#include "option.h"

/** EXIT_USAGE with its message when options contradict each other or a
 * command got more than `most_files` files. */
exit_code result_check_usage(const command_options *options, size_t most_files);
/** --output. */
ef_output *result_open(const command_options *options, ef_error *error);
/** The same where all went well so far; a failure goes to `status`. */
ef_output *result_begin(const command_options *options, ef_status *status,
                        ef_error *error);
/** A further file, which an option or operand names. */
ef_output *result_open_at(const char *path, bool overwrite, ef_error *error);
/** Commits the output when `status` is EF_OK, drops it else. Returns the exit
 * code, with the error's message written. */
exit_code result_close(ef_output *output, ef_status status, ef_error *error);

#endif
