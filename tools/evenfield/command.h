/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The commands. */
#ifndef COMMAND_COMMAND_H
#define COMMAND_COMMAND_H

#include "exit.h"
#include "option.h"

typedef struct command_entry {
  const char *name;
  command_bit bit;
  const char *operands; /**< what follows the options in usage */
  const char *summary;  /**< one line of the first screen */
  const char *about[2]; /**< paragraphs of --help above the options */
  exit_code (*run)(const command_options *options);
  const char *examples[6]; /**< command lines that need no files, then NULL */
} command_entry;

exit_code command_describe(const command_options *options);
exit_code command_compare(const command_options *options);
exit_code command_ellipse(const command_options *options);
exit_code command_isolate(const command_options *options);
exit_code command_match(const command_options *options);
exit_code command_observer(const command_options *options);
exit_code command_panel(const command_options *options);
exit_code command_profile(const command_options *options);
exit_code command_image(const command_options *options);
exit_code command_swatch(const command_options *options);
exit_code command_tables(const command_options *options);

/** All commands; returns how many. */
size_t command_all(const command_entry **commands);
/** NULL when there is none of that name. */
const command_entry *command_find(const char *name);

#endif
