/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Grades that standards define: of daylight simulators by the pairs compared,
 * and of a pair by its contrast in daylight. */
#ifndef COMMAND_GRADES_H
#define COMMAND_GRADES_H

#include "compare.h"

/** A light graded as a simulator of the first one. */
typedef struct simulator_grade {
  double mean_difference; /**< CIELAB, over all pairs */
  double distance;        /**< of the whites in u', v' */
  const char *grade;      /**< NULL: too far away for one */
} simulator_grade;

/** Of look `k`, which is not the first. */
simulator_grade grade_simulator(const compare_scene *s,
                                const compare_count *count, size_t k);
/** Step of the grey scale for change in colour under a look that it is defined
 * for, NULL under others. */
const char *grade_contrast(const look *l, const outcome *o);

#endif
