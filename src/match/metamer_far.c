/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How far metamers part. A difference is greatest at a corner of the body, and
 * corners are what sampling the directions misses: from the best points found,
 * the search goes on to the metamer furthest along the slope of the difference,
 * as long as that is better (each step is one more linear programme). */
#include <math.h>
#include <stdlib.h>

#include "match/match_private.h"
#include "match/metamer_private.h"

enum {
  STARTS = 8,      /* points that the search sets out from */
  MOST_STEPS = 50, /* some five are ever taken */
  CHUNK = 32       /* standards a thread takes */
};

static ef_conditions conditions_of(const ef_metamer_set *set,
                                   const ef_conditions *base) {
  ef_conditions conditions =
      base != NULL ? *base : ef_conditions_default(set->body.white);
  conditions.white = set->body.white;
  return conditions;
}

/* A search for the sample that is furthest from a standard, or for the
 * standard that is furthest from a sample. */
typedef struct search {
  const ef_metamer_set *set;
  const ef_metric *metric;
  ef_conditions conditions;
  bool for_standard;
} search;

static double difference_of(const search *s, ef_xyz from, ef_xyz to) {
  double a[3], b[3];
  ef_metric_coordinates(s->metric, from, &s->conditions, a);
  ef_metric_coordinates(s->metric, to, &s->conditions, b);
  return s->for_standard ? ef_metric_difference(s->metric, b, a)
                         : ef_metric_difference(s->metric, a, b);
}

/* d (squared difference) / d XYZ of `to`. For a standard that is sought, whose
 * weights change with it, the slope is that of the other side: good enough for
 * a direction. */
static void slope_of(const search *s, ef_xyz from, ef_xyz to, double out[3]) {
  double a[3], b[3];
  ef__expansion in_coordinates, in_xyz;
  ef_metric_coordinates(s->metric, from, &s->conditions, a);
  ef_metric_coordinates(s->metric, to, &s->conditions, b);
  ef__metric_expand(s->metric, a, b, &in_coordinates);
  ef__metric_carry(s->metric, to, b, &s->conditions, &in_coordinates, &in_xyz);
  for (size_t k = 0; k < 3; ++k)
    out[k] = in_xyz.gradient[k];
}

/* From `at`, uphill; `at` and `difference` become what was reached. */
static void climb(const search *s, ef__metamer_bench *bench, ef_xyz from,
                  ef_xyz *at, double *difference) {
  for (int step = 0; step < MOST_STEPS; ++step) {
    double slope[3], point[3], plane[4];
    slope_of(s, from, *at, slope);
    if (ef__metamer_touch(s->set, bench, slope, point, plane) !=
        EF__SIMPLEX_BEST)
      return;
    const ef_xyz next = {point[0], point[1], point[2]};
    const double d = difference_of(s, from, next);
    if (!(d > *difference * (1 + 1e-9)))
      return;
    *at = next;
    *difference = d;
  }
}

/* The STARTS points that differ most, the most different first. */
static void best_points(const search *s, ef_xyz from, size_t *n,
                        ef_xyz at[STARTS], double difference[STARTS]) {
  *n = 0;
  for (size_t i = 0; i < s->set->n_points; ++i) {
    const ef_xyz point = ef_metamer_set_point(s->set, i);
    const double d = difference_of(s, from, point);
    size_t place = *n;
    while (place > 0 && d > difference[place - 1])
      --place;
    if (place == STARTS || !isfinite(d))
      continue;
    if (*n < STARTS)
      ++*n;
    for (size_t k = *n - 1; k > place; --k) {
      at[k] = at[k - 1];
      difference[k] = difference[k - 1];
    }
    at[place] = point;
    difference[place] = d;
  }
}

static double farthest(const search *s, ef__metamer_bench *bench, ef_xyz from,
                       ef_xyz *out) {
  ef_xyz at[STARTS];
  double difference[STARTS], most = (double)NAN;
  size_t n;
  best_points(s, from, &n, at, difference);
  for (size_t i = 0; i < n; ++i) {
    climb(s, bench, from, &at[i], &difference[i]);
    if (difference[i] <= most)
      continue;
    most = difference[i];
    *out = at[i];
  }
  return most;
}

ef_status ef_metamer_set_farthest(const ef_metamer_set *set,
                                  const ef_metric *metric,
                                  const ef_conditions *conditions, ef_xyz from,
                                  ef_xyz *farthest_xyz, double *difference,
                                  ef_error *error) {
  const search s = {.set = set,
                    .metric = metric,
                    .conditions = conditions_of(set, conditions)};
  ef__metamer_bench bench;
  *farthest_xyz = from;
  if (ef__metamer_bench_set(set, false, &bench))
    *difference = farthest(&s, &bench, from, farthest_xyz);
  else
    ef__error_memory(error, "the farthest metamer");
  const bool done = bench.simplex != NULL && bench.block != NULL;
  ef__metamer_bench_clear(&bench);
  return done ? EF_OK : EF_NO_MEMORY;
}

/* ---- Pairs ------------------------------------------------------------- */

typedef struct pairs {
  const ef_metric *metric;
  size_t n;
  double *coordinate; /* n x 3 */
  double *most;       /* of each standard, and the sample it is with */
  size_t *with;
} pairs;

static void widest_range(void *context, size_t begin, size_t end) {
  const pairs *const p = context;
  for (size_t i = begin; i < end; ++i) {
    p->most[i] = -1;
    for (size_t j = 0; j < p->n; ++j) {
      const double d = ef_metric_difference(p->metric, p->coordinate + 3 * i,
                                            p->coordinate + 3 * j);
      if (d <= p->most[i])
        continue;
      p->most[i] = d;
      p->with[i] = j;
    }
  }
}

/* The widest pair of the points. */
static bool widest_points(const search *s, int jobs, ef_xyz pair[2],
                          double *difference) {
  pairs p = {.metric = s->metric, .n = s->set->n_points};
  const ef__part parts[] = {{&p.coordinate, 3 * p.n, sizeof(double)},
                            {&p.most, p.n, sizeof(double)},
                            {&p.with, p.n, sizeof(size_t)}};
  void *const block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  if (block == NULL)
    return false;
  for (size_t i = 0; i < p.n; ++i)
    ef_metric_coordinates(s->metric, ef_metamer_set_point(s->set, i),
                          &s->conditions, p.coordinate + 3 * i);
  ef__parallel_for(p.n, CHUNK, jobs, widest_range, &p);
  *difference = -1;
  for (size_t i = 0; i < p.n; ++i) {
    if (p.most[i] <= *difference)
      continue;
    *difference = p.most[i];
    pair[0] = ef_metamer_set_point(s->set, i);
    pair[1] = ef_metamer_set_point(s->set, p.with[i]);
  }
  free(block);
  return true;
}

ef_status ef_metamer_set_widest(const ef_metamer_set *set,
                                const ef_metric *metric,
                                const ef_conditions *conditions, int jobs,
                                ef_xyz *standard, ef_xyz *sample,
                                double *difference, ef_error *error) {
  search s = {.set = set,
              .metric = metric,
              .conditions = conditions_of(set, conditions)};
  ef__metamer_bench bench;
  ef_xyz pair[2] = {set->body.center, set->body.center};
  double widest = 0;
  const bool done = ef__metamer_bench_set(set, false, &bench) &&
                    widest_points(&s, jobs, pair, &widest);
  /* One side after the other moves on, until neither does. */
  for (int idle = 0; idle < 2 && done; s.for_standard = !s.for_standard) {
    const double before = widest;
    climb(&s, &bench, pair[s.for_standard], &pair[!s.for_standard], &widest);
    idle = widest > before ? 0 : idle + 1;
  }
  ef__metamer_bench_clear(&bench);
  if (!done)
    return ef__error_memory(error, "the widest pair of metamers");
  *standard = pair[0];
  *sample = pair[1];
  *difference = widest;
  return EF_OK;
}
