/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "match/metamer_private.h"

bool ef__metamer_bench_set(const ef_metamer_set *set, bool reaches,
                           ef__metamer_bench *out) {
  const size_t n = set->n_samples + (reaches ? 1 : 0);
  const size_t m = set->n_rows + (reaches ? 3 : 0);
  const ef__part parts[] = {{&out->x, n, sizeof(double)},
                            {&out->cost, n, sizeof(double)},
                            {&out->column, reaches ? n * m : 0,
                             sizeof(double)}};
  *out = (ef__metamer_bench){.simplex = ef__simplex_new(m, n)};
  out->block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  if (out->simplex == NULL || out->block == NULL)
    return false;
  for (size_t j = 0; j < set->n_samples && reaches; ++j) {
    memcpy(out->column + j * m, set->column + j * set->n_rows,
           set->n_rows * sizeof *out->column);
    memcpy(out->column + j * m + set->n_rows, set->test + 3 * j,
           3 * sizeof *out->column);
  }
  return true;
}

void ef__metamer_bench_clear(ef__metamer_bench *bench) {
  ef__simplex_free(bench->simplex);
  free(bench->block);
}

/* Scales a plane to a unit normal. */
static void set_plane(const double normal[3], double offset, double out[4]) {
  const double length = hypot(hypot(normal[0], normal[1]), normal[2]);
  for (size_t k = 0; k < 3; ++k)
    out[k] = normal[k] / length;
  out[3] = offset / length;
}

/* What cost . x is at most, for every x within the limits whose rows sum to
 * `right`: prices times rows, and the best that each reflectance can add. */
static double bound_of(const ef_metamer_set *set, const ef__programme *p,
                       const double *cost, const double *dual) {
  double bound = 0;
  for (size_t r = 0; r < p->n_rows; ++r)
    bound += dual[r] * p->right[r];
  for (size_t j = 0; j < set->n_samples; ++j) {
    double gain = cost[j];
    for (size_t r = 0; r < p->n_rows; ++r)
      gain -= dual[r] * p->column[j * p->n_rows + r];
    bound += gain > 0 ? gain * set->high[j] : gain * set->low[j];
  }
  return bound;
}

ef__simplex_end ef__metamer_touch(const ef_metamer_set *set,
                                  ef__metamer_bench *bench,
                                  const double normal[3], double point[3],
                                  double plane[4]) {
  const ef__programme p = {.n_rows = set->n_rows,
                           .n_columns = set->n_samples,
                           .column = set->column,
                           .right = set->right,
                           .low = set->low,
                           .high = set->high};
  for (size_t j = 0; j < set->n_samples; ++j) {
    const double *const t = set->test + 3 * j;
    bench->cost[j] = normal[0] * t[0] + normal[1] * t[1] + normal[2] * t[2];
  }
  double dual[EF__PROGRAMME_ROWS];
  const ef__simplex_end end =
      ef__simplex_maximise(bench->simplex, &p, bench->cost, bench->x, dual);
  if (end != EF__SIMPLEX_BEST)
    return end;
  point[0] = point[1] = point[2] = 0;
  for (size_t j = 0; j < set->n_samples; ++j) {
    for (size_t k = 0; k < 3; ++k)
      point[k] += set->test[3 * j + k] * bench->x[j];
  }
  set_plane(normal, bound_of(set, &p, bench->cost, dual), plane);
  return end;
}

ef__simplex_end ef__metamer_reach(const ef_metamer_set *set,
                                  ef__metamer_bench *bench, const double u[3],
                                  double point[3], double plane[4]) {
  const size_t n = set->n_samples, own = set->n_rows, m = own + 3;
  const ef_xyz c = set->body.center;
  double right[EF__PROGRAMME_ROWS] = {0}, dual[EF__PROGRAMME_ROWS];
  memcpy(right, set->right, own * sizeof *right);
  memcpy(right + own, (double[3]){c.X, c.Y, c.Z}, 3 * sizeof *right);
  memset(bench->cost, 0, n * sizeof *bench->cost);
  bench->cost[n] = 1;
  for (size_t r = 0; r < m; ++r)
    bench->column[n * m + r] = r < own ? 0 : -u[r - own];
  const ef__programme p = {.n_rows = m,
                           .n_columns = n + 1,
                           .column = bench->column,
                           .right = right,
                           .low = set->low,
                           .high = set->high};
  const ef__simplex_end end =
      ef__simplex_maximise(bench->simplex, &p, bench->cost, bench->x, dual);
  if (end != EF__SIMPLEX_BEST)
    return end;
  /* A metamer of colour q is an x with t = 0 whose last rows sum to q: for it 0
   * <= dual . (right, q) + rest, of which bound_of has q = centre. */
  const double *const price = dual + own;
  const double bound = bound_of(set, &p, bench->cost, dual) -
                       (price[0] * c.X + price[1] * c.Y + price[2] * c.Z);
  set_plane((double[3]){-price[0], -price[1], -price[2]}, bound, plane);
  for (size_t k = 0; k < 3; ++k)
    point[k] = right[own + k] + bench->x[n] * u[k];
  return end;
}
