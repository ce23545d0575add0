/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the comparison of a block works on. */
#ifndef COMMAND_JUDGE_WORK_H
#define COMMAND_JUDGE_WORK_H

#include "judge.h"

/** A pair at one angle. */
typedef struct sight {
  const specimen *standard, *sample;
  size_t pair;
} sight;

typedef struct work {
  compare_scene *s;
  const pair *pairs; /**< of the block */
  size_t n_looks, n; /**< sights */
  sight *sight;
  outcome *outcome; /**< n x n_looks */
  double *xyz[2];   /**< of standards and samples under one look, n x 3 */
  double *at[2];    /**< in the metric's coordinates */
  double *difference;
  size_t under;           /**< the look at hand */
  double *other_observer; /**< change-of-observer index of each sight */
  double *spectrum[2];    /**< n x samples of the standard's grid */
} work;

static inline outcome *work_outcome(const work *w, size_t i, size_t under) {
  return &w->outcome[i * w->n_looks + under];
}

/** Leaves what is told apart open. */
void judge_nothing(work *w);
/** Observers alike but for their JND. */
ef_status judge_standard(work *w, ef_error *error);
/** The people of the scene, under the looks of the first observer. */
ef_status judge_people(work *w, ef_error *error);

#endif
