/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --worst-case: how far any surface that matches a standard in the first light
 * may part from it under the other looks. */
#ifndef COMMAND_WORST_CASE_H
#define COMMAND_WORST_CASE_H

#include <evenfield/match.h>

#include "finish.h"

/** Under one look at one angle. */
typedef struct worst_case {
  double angle_deg;
  double difference;   /**< from the standard, at most; NaN: see reason */
  ef_xyz standard;     /**< its colour there */
  double volume_lab;   /**< of all colours that its metamers take, CIELAB */
  ef_metamer_set *set; /**< owned; NULL: none, or it was not to be kept */
  char reason[200];
} worst_case;

/** Fills `out`, which is zeroed, angle by angle: the first look's is zero, and
 * behind the looks stands the other observer's. What cannot be told has its
 * reason. `keeps_sets`: with the sets. */
ef_status worst_case_find(const looks *l, const finish *standard,
                          const ef_metric *metric, bool keeps_sets, int jobs,
                          worst_case *out, ef_error *error);
void worst_case_free(worst_case *all, size_t n);
/** Entries of `out`. */
size_t worst_case_count(const looks *l, const finish *standard);

#endif
