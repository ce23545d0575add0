/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Expected shares of right answers over observers whose JNDs are log-normal,
 * as curves that are quick to look up. */
#ifndef EVENFIELD_ANSWERS_H
#define EVENFIELD_ANSWERS_H

#include <stddef.h>

/** The tasks that there are curves of. */
typedef enum ef__answer {
  EF__ANSWER_2IFC,
  EF__ANSWER_SAME_DIFFERENT, /**< with the best criterion */
  EF__ANSWER_TRIANGLE,
  EF__ANSWERS
} ef__answer;

/** Owns its memory. */
typedef struct ef__answers ef__answers;

/** Curves over y = ln d' of the median observer, when ln d' of the others
 * departs from it normally with the standard deviation `spread` (0 to 30). NULL
 * without memory. */
ef__answers *ef__answers_new(double spread);
void ef__answers_free(ef__answers *answers);

/** Expected share of right answers, from chance for y = -INFINITY to 1; right
 * to 2e-8. Its slope too unless NULL. */
double ef__answers_share(const ef__answers *answers, ef__answer task, double y,
                         double *slope);
/** y of a share; infinite where it is chance or 1. */
double ef__answers_place(const ef__answers *answers, ef__answer task,
                         double share);

#endif
