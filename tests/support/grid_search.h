/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The nearest colour by brute force: every point of a grid, then a compass
 * search from the best of them. Shares nothing with the solver but the
 * difference formula and the mixing. */
#ifndef EVENFIELD_TESTS_GRID_SEARCH_H
#define EVENFIELD_TESTS_GRID_SEARCH_H

#include "match/match_private.h"

typedef struct grid_search {
  const ef__mixing *mixing;
  const ef_metric *metric;
  int side;           /**< points along an edge, even in the cube root */
  double *amount;     /**< side^3 x 3 */
  double *coordinate; /**< side^3 x 3 */
} grid_search;

grid_search grid_search_new(const ef__mixing *mixing, const ef_metric *metric,
                            int side);
void grid_search_free(grid_search *search);
/** Least difference to `target` found, and where. */
double grid_search_nearest(const grid_search *search, const double target[3],
                           double amount[3]);

#endif
