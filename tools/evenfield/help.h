/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The first screen and the help of a command. */
#ifndef COMMAND_HELP_H
#define COMMAND_HELP_H

#include <stdio.h>

#include "command.h"

/** What Evenfield answers, each command in a line, three commands to try. */
void help_first_screen(FILE *out);
void help_command(FILE *out, const command_entry *command);
void help_version(FILE *out);

/** Writes `text` broken at blanks before column 79; the cursor stands at
 * `indent`, and so do the lines that follow. */
void help_wrap(FILE *out, const char *text, size_t indent);

#endif
