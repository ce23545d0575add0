/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --part K/N: one share of the rows of a large job. The files that are shared
 * out are taken as one, and its bytes are divided; a row belongs to the part in
 * which it begins. */
#ifndef COMMAND_PART_H
#define COMMAND_PART_H

#include <evenfield/exchange.h>

#include "option.h"

/** Says what is wrong with --part, if anything is. */
exit_code part_check_usage(const command_options *options);
/** False for parts behind the first: the header row is there already. */
bool part_has_header(const command_options *options);

/** A range of bytes of one file. */
typedef struct part_range {
  size_t first_byte, end_byte; /**< both 0: all */
  bool is_empty;               /**< nothing of this file is in the part */
  bool reads_others;           /**< the rows outside come as well */
} part_range;

/** Goes over the files that are shared out, in their order. */
typedef struct part_walk {
  bool is_asked;
  bool is_first;         /**< part 1 */
  size_t first, end, at; /**< of all files as one */
} part_walk;

ef_status part_begin(part_walk *walk, const command_options *options, size_t n,
                     const char *const *files, ef_error *error);
ef_status part_next(part_walk *walk, const char *file, part_range *range,
                    ef_error *error);
/** The range of a single file. */
ef_status part_of_file(const command_options *options, const char *file,
                       part_range *range, ef_error *error);
/** True when a row that begins at `offset` is in the range. */
bool part_holds(const part_range *range, size_t offset);

#endif
