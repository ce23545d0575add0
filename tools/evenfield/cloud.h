/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Where the people of --population see pairs, for charts. */
#ifndef COMMAND_CLOUD_H
#define COMMAND_CLOUD_H

#include <evenfield/match.h>

#include "diagram.h"

/** Pairs that are kept, those seen to differ most; and people of each, the
 * first ones drawn, who are as good a sample as any. */
enum { CLOUD_MOST_PAIRS = 24, CLOUD_MOST_PEOPLE = 1000 };

typedef struct cloud_pair {
  size_t id;        /**< of pairs with one id the worst seen is kept */
  char name[128];
  int look;         /**< of its marks */
  double p95;       /**< difference */
  ef_xyz *target, *match, *white; /**< a person each; one block, owned */
  ef_xy named;      /**< match minus target for the observer named, a*, b*;
                         NaN: not drawn */
} cloud_pair;

typedef struct clouds {
  size_t n_pairs, n_offered;
  size_t n_people, n_all; /**< kept and asked */
  cloud_pair pair[CLOUD_MOST_PAIRS];
  ef_xyz *seen; /**< room for all; owned */
} clouds;

void clouds_free(clouds *c);
/** One pair as `crowd` of n_all sees it; spectra as for ef_crowd_spread. What
 * `pair` points to is not looked at. Passed over when others are seen to differ
 * more. */
ef_status clouds_offer(clouds *c, ef_crowd *crowd, size_t n_all,
                       const cloud_pair *pair, const double *target,
                       const double *match, int jobs, ef_error *error);
/** The worst seen one first. */
void clouds_sort(clouds *c);

/** Two series in the diagram's plane: each pair's target and its match, as
 * everybody sees them. */
ef_status clouds_add_seen(diagram *d, const clouds *c, ef_error *error);
/** How match and target differ for everybody, of the first `n` pairs: a named
 * cloud each, and a mark for the observer named. In the plane of differences of
 * a*, b*, with a cross through its middle if wanted. */
ef_status clouds_add_gaps(diagram *d, const clouds *c, size_t n,
                          bool has_cross, ef_error *error);

#endif
