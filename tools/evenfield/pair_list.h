/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The pairs that a panel looked at, as colours, and their differences. */
#ifndef COMMAND_PAIR_LIST_H
#define COMMAND_PAIR_LIST_H

#include <evenfield/difference.h>

#include "answers.h"
#include "colours.h"
#include "option.h"

typedef struct pair_list {
  name_list names;
  size_t n;
  double *xyz[2]; /**< references and samples, n x 3 each, Y = 100 for white */
  char observer[128], illuminant[128]; /**< names, "" where colours were given */
  ef_conditions conditions;
} pair_list;

/** `path` has a column `pair` and the two colours of each (reference_L, _a, _b
 * and sample_L, _a, _b, or X, Y, Z likewise); with `samples`, a file of spectra
 * or colours, the columns reference and sample name rows of it, and rows of one
 * name are averaged. Free with pair_list_free in every case. */
ef_status pair_list_read(pair_list *list, const command_options *options,
                         const char *path, const char *samples,
                         const ef_notes *notes, ef_error *error);
void pair_list_free(pair_list *list);
/** Differences of all pairs by a formula; NaN where it has none. */
ef_status pair_list_differences(const pair_list *list, const ef_metric *metric,
                                double *difference, ef_error *error);

#endif
