/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cloud.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "text.h"

void clouds_free(clouds *c) {
  for (size_t i = 0; i < c->n_pairs; ++i)
    free(c->pair[i].target);
  free(c->seen);
  *c = (clouds){0};
}

/* ---- Keeping ----------------------------------------------------------- */

/* The place of a pair among those kept: that of its id, a new one, or that of
 * the pair that is seen to differ least; NULL where it need not be kept. */
static cloud_pair *place_for(clouds *c, const cloud_pair *pair) {
  cloud_pair *least = NULL;
  for (size_t i = 0; i < c->n_pairs; ++i) {
    cloud_pair *p = &c->pair[i];
    if (p->id == pair->id)
      return pair->p95 > p->p95 ? p : NULL;
    if (least == NULL || p->p95 < least->p95)
      least = p;
  }
  if (c->n_pairs < CLOUD_MOST_PAIRS) {
    cloud_pair *next = &c->pair[c->n_pairs];
    next->target = malloc(3 * c->n_people * sizeof *next->target);
    if (next->target == NULL)
      return NULL;
    ++c->n_pairs;
    return next;
  }
  return pair->p95 > least->p95 ? least : NULL;
}

static bool begin(clouds *c, size_t n_all) {
  if (c->seen != NULL)
    return true;
  c->n_all = n_all;
  c->n_people = n_all < CLOUD_MOST_PEOPLE ? n_all : CLOUD_MOST_PEOPLE;
  c->seen = malloc(3 * n_all * sizeof *c->seen);
  return c->seen != NULL;
}

ef_status clouds_offer(clouds *c, ef_crowd *crowd, size_t n_all,
                       const cloud_pair *pair, const double *target,
                       const double *match, int jobs, ef_error *error) {
  ++c->n_offered;
  if (!isfinite(pair->p95))
    return EF_OK;
  if (!begin(c, n_all))
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  cloud_pair *at = place_for(c, pair);
  if (at == NULL)
    return EF_OK;
  ef_xyz *const seen[3] = {c->seen, c->seen + n_all, c->seen + 2 * n_all};
  const ef_status status = ef_crowd_colours(crowd, 1, target, match, jobs,
                                            seen[0], seen[1], seen[2], error);
  ef_xyz *const kept = at->target;
  *at = *pair;
  at->target = kept;
  at->match = kept + c->n_people;
  at->white = kept + 2 * c->n_people;
  for (size_t i = 0; i < 3; ++i)
    memcpy(kept + i * c->n_people, seen[i], c->n_people * sizeof *kept);
  return status;
}

static int worst_first(const void *a, const void *b) {
  const cloud_pair *left = a, *right = b;
  if (left->p95 != right->p95)
    return left->p95 > right->p95 ? -1 : 1;
  return left->id < right->id ? -1 : left->id > right->id;
}

void clouds_sort(clouds *c) {
  qsort(c->pair, c->n_pairs, sizeof *c->pair, worst_first);
}

/* ---- Drawing ----------------------------------------------------------- */

static ef_status add_cloud(diagram *d, int look, const char *name, size_t n,
                           const double *x, const double *y, ef_error *error) {
  ef_series cloud = ef_series_default(EF_SERIES_CLOUD);
  cloud.look = look;
  cloud.name = name;
  cloud.n = n;
  cloud.x = x;
  cloud.y = y;
  return ef_chart_add(d->chart, &cloud, error);
}

ef_status clouds_add_seen(diagram *d, const clouds *c, ef_error *error) {
  const size_t n = c->n_pairs * c->n_people;
  double *x = malloc((2 * n + 1) * sizeof *x);
  ef_status status = EF_OK;
  if (x == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  for (int side = 0; side < 2 && status == EF_OK && n > 0; ++side) {
    for (size_t k = 0; k < c->n_pairs; ++k) {
      const cloud_pair *p = &c->pair[k];
      for (size_t i = 0; i < c->n_people; ++i) {
        const ef_xy at = diagram_point(
            d->plane, side == 0 ? p->target[i] : p->match[i], p->white[i]);
        x[k * c->n_people + i] = at.x;
        x[n + k * c->n_people + i] = at.y;
      }
    }
    status = add_cloud(d, side == 0 ? 2 : 5,
                       side == 0 ? "targets as each person sees them"
                                 : "what is shown, likewise",
                       n, x, x + n, error);
  }
  free(x);
  return status;
}

/* What all differences span, zero included. */
typedef struct span {
  double from[2], to[2];
} span;

static void reach(span *all, double x, double y) {
  const double at[2] = {x, y};
  for (size_t i = 0; i < 2; ++i) {
    all->from[i] = fmin(all->from[i], at[i]);
    all->to[i] = fmax(all->to[i], at[i]);
  }
}

static ef_status add_gap(diagram *d, const clouds *c, const cloud_pair *p,
                         double *x, span *all, ef_error *error) {
  for (size_t i = 0; i < c->n_people; ++i) {
    const ef_lab target = ef_xyz_to_lab(p->target[i], p->white[i]);
    const ef_lab match = ef_xyz_to_lab(p->match[i], p->white[i]);
    x[i] = match.a_star - target.a_star;
    x[c->n_people + i] = match.b_star - target.b_star;
    reach(all, x[i], x[c->n_people + i]);
  }
  return add_cloud(d, p->look, p->name, c->n_people, x, x + c->n_people, error);
}

static ef_status add_named(diagram *d, const cloud_pair *p, ef_error *error) {
  if (isnan(p->named.x))
    return EF_OK;
  ef_series mark = ef_series_default(EF_SERIES_MARKS);
  mark.look = p->look;
  mark.n = 1;
  mark.x = &p->named.x;
  mark.y = &p->named.y;
  return ef_chart_add(d->chart, &mark, error);
}

/* Through the middle, where there is no difference. */
static ef_status add_cross(diagram *d, const span *all, ef_error *error) {
  const double x[] = {all->from[0], all->to[0], (double)NAN, 0.0, 0.0};
  const double y[] = {0.0, 0.0, (double)NAN, all->from[1], all->to[1]};
  ef_series cross = ef_series_default(EF_SERIES_LINE);
  cross.look = EF_LOOK_FRAME;
  cross.n = sizeof x / sizeof *x;
  cross.x = x;
  cross.y = y;
  return ef_chart_add(d->chart, &cross, error);
}

ef_status clouds_add_gaps(diagram *d, const clouds *c, size_t n,
                          bool has_cross, ef_error *error) {
  span all = {{0.0, 0.0}, {0.0, 0.0}};
  double *x = malloc((2 * c->n_people + 1) * sizeof *x);
  if (x == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  ef_status status = EF_OK;
  /* Cross and marks lie above all clouds. */
  for (size_t k = 0; k < n && k < c->n_pairs && status == EF_OK; ++k)
    status = add_gap(d, c, &c->pair[k], x, &all, error);
  if (status == EF_OK && has_cross)
    status = add_cross(d, &all, error);
  for (size_t k = 0; k < n && k < c->n_pairs && status == EF_OK; ++k)
    status = add_named(d, &c->pair[k], error);
  free(x);
  return status;
}
