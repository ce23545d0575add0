/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --worst-case: how far any surface that matches a standard in the first light
 * may part from it under the other looks. */
#ifndef COMMAND_WORST_CASE_H
#define COMMAND_WORST_CASE_H

#include "finish.h"

/** Under one look at one angle. */
typedef struct worst_case {
  double angle_deg;
  double difference; /**< from the standard, at most; NaN: see reason */
  double volume_lab; /**< of all colours that its metamers take, CIELAB */
  char reason[200];
} worst_case;

/** Fills `out` angle by angle: the first look's is zero, and behind the looks
 * stands the other observer's. What cannot be told has its reason. */
ef_status worst_case_find(const looks *l, const finish *standard,
                          const ef_metric *metric, int jobs, worst_case *out,
                          ef_error *error);
/** Entries of `out`. */
size_t worst_case_count(const looks *l, const finish *standard);

#endif
