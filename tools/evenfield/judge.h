/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A block of pairs, compared under every look. */
#ifndef COMMAND_JUDGE_H
#define COMMAND_JUDGE_H

#include "compare.h"

/** Two samples to be compared, or why they cannot be. */
typedef struct pair {
  finish *standard, *sample; /**< NULL: not there */
  const char *standard_name, *sample_name;
  size_t line;
  char reason[COMPARE_REASON_ROOM]; /**< "" when both are there */
} pair;

/** The answers to a block; owns what they point to. */
typedef struct judged {
  compared *pair;
  outcome *outcome;
  double *angle_deg, *other_observer;
  ef_spectral_index *spectral;
  ef_angles *finish;
} judged;

/** Compares n pairs. Free with judged_free in every case. */
ef_status judge_pairs(compare_scene *s, size_t n, const pair *pairs,
                      judged *out, ef_error *error);
void judged_free(judged *j);

#endif
