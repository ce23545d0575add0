/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A look over the whole gamut before the descents: a difference has basins that
 * no rule about its formula foresees, most of all where the gamut is bent and
 * where the target is far away. */
#include "match/match_private.h"

#include <assert.h>
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

/* Points along each amount, fewer where a difference costs ten times as much as
 * others and a formula names its decoys. Where colours do not add: of 600
 * targets for prints and paints that lie all over the colours, descents from
 * the low points of 3 along each amount miss the nearest colour of a grid of 21
 * for 11, from 5 for 2, from 7 for none. */
enum { SIDE = 9, COSTLY_SIDE = 6, MOST_POINTS = SIDE * SIDE * SIDE };

/* The points of the costly grid on the faces of the cube. A minimum inside lies
 * near a decoy of the formula, so that these are enough for a formula that
 * names them and has rough squares. */
enum {
  INNER = COSTLY_SIDE - 2,
  N_FACED = COSTLY_SIDE * COSTLY_SIDE * COSTLY_SIDE - INNER * INNER * INNER,
  N_BLOCKS = N_FACED / EF__METRIC_BLOCK,
  MOST_NEAR = 16
};
static_assert(N_FACED % EF__METRIC_BLOCK == 0, "whole blocks");

typedef struct faces {
  int point[N_FACED];
  int n_near[N_FACED];
  unsigned char near[N_FACED][MOST_NEAR]; /* neighbours, across corners too */
  float sample[3 * N_FACED];              /* coordinates, block by block */
} faces;

struct ef__scout {
  int side, n_points;
  bool is_faced;
  faces faces;
  double along[SIDE];                 /* amounts of the grid */
  double coordinate[3 * MOST_POINTS]; /* in the metric, colour of each point */
};

static void point_amounts(const ef__scout *scout, int point, double amount[3]) {
  const int side = scout->side;
  amount[0] = scout->along[point / (side * side)];
  amount[1] = scout->along[point / side % side];
  amount[2] = scout->along[point % side];
}

/* ---- Setting up ---------------------------------------------------------- */

static bool are_near(const int a[3], const int b[3]) {
  return abs(a[0] - b[0]) <= 1 && abs(a[1] - b[1]) <= 1 &&
         abs(a[2] - b[2]) <= 1;
}

static void place_of(const ef__scout *scout, int point, int at[3]) {
  const int side = scout->side;
  at[0] = point / (side * side);
  at[1] = point / side % side;
  at[2] = point % side;
}

static void set_faces(ef__scout *scout) {
  faces *const f = &scout->faces;
  const int last = scout->side - 1;
  int n = 0;
  for (int p = 0; p < scout->n_points; ++p) {
    int at[3];
    place_of(scout, p, at);
    if (at[0] % last != 0 && at[1] % last != 0 && at[2] % last != 0)
      continue;
    float *const block =
        f->sample + 3 * EF__METRIC_BLOCK * (n / EF__METRIC_BLOCK);
    for (int i = 0; i < 3; ++i) {
      block[EF__METRIC_BLOCK * i + n % EF__METRIC_BLOCK] =
          (float)scout->coordinate[3 * p + i];
    }
    f->point[n++] = p;
  }
  for (int p = 0; p < N_FACED; ++p) {
    f->n_near[p] = 0;
    for (int q = 0; q < N_FACED; ++q) {
      int a[3], b[3];
      place_of(scout, f->point[p], a);
      place_of(scout, f->point[q], b);
      if (p != q && are_near(a, b))
        f->near[p][f->n_near[p]++] = (unsigned char)q;
    }
  }
}

/* Lights by the cube of even steps, which is even in lightness. */
ef__scout *ef__scout_new(const ef__mixing *mixing, const ef_metric *metric,
                         ef_error *error) {
  ef__scout *const scout = ef__allocate(1, sizeof *scout);
  if (scout == NULL) {
    ef__error_memory(error, "a look over the gamut");
    return NULL;
  }
  const bool is_costly = mixing->affine && metric->jumps_at_opposite_hue;
  const int side = is_costly ? COSTLY_SIDE : SIDE;
  scout->side = side;
  scout->n_points = side * side * side;
  for (int i = 0; i < side; ++i) {
    const double step = (double)i / (side - 1);
    scout->along[i] = mixing->affine ? step * step * step : step;
  }
  for (int p = 0; p < scout->n_points; ++p) {
    double amount[3];
    point_amounts(scout, p, amount);
    const ef_xyz xyz = ef__mixing_xyz(mixing, amount, NULL);
    scout->coordinate[3 * p] = xyz.X;
    scout->coordinate[3 * p + 1] = xyz.Y;
    scout->coordinate[3 * p + 2] = xyz.Z;
  }
  ef_metric_coordinates_batch(metric, (size_t)scout->n_points,
                              scout->coordinate, &mixing->conditions, 1,
                              scout->coordinate);
  scout->is_faced = is_costly && metric->rough != NULL;
  if (scout->is_faced)
    set_faces(scout);
  return scout;
}

void ef__scout_free(ef__scout *scout) {
  free(scout);
}

/* ---- Looking ------------------------------------------------------------- */

/* No neighbour, not even across a corner, has less. */
static bool is_low(const ef__scout *scout, const double *difference,
                   int point) {
  const int side = scout->side;
  const int at[3] = {point / (side * side), point / side % side, point % side};
  for (int i = -1; i <= 1; ++i) {
    for (int j = -1; j <= 1; ++j) {
      for (int k = -1; k <= 1; ++k) {
        const int x = at[0] + i, y = at[1] + j, z = at[2] + k;
        if (x < 0 || y < 0 || z < 0 || x >= side || y >= side || z >= side) {
          continue;
        }
        const int other = (x * side + y) * side + z;
        if (difference[other] < difference[point])
          return false;
        /* Of equal neighbours one counts. */
        if (difference[other] == difference[point] && other < point) {
          return false;
        }
      }
    }
  }
  return true;
}

static void all_differences(const ef__scout *scout, const ef_metric *metric,
                            const double target[3], double *difference) {
  double reference[3 * MOST_POINTS];
  for (int p = 0; p < scout->n_points; ++p) {
    for (int i = 0; i < 3; ++i)
      reference[3 * p + i] = target[i];
  }
  ef_metric_difference_batch(metric, (size_t)scout->n_points, reference,
                             scout->coordinate, 1, difference);
}

static void set_start(const ef__scout *scout, int point, double square,
                      ef__start *start) {
  int at[3];
  place_of(scout, point, at);
  start->square = square;
  for (int i = 0; i < 3; ++i)
    start->amount[i] = scout->along[at[i]];
}

size_t ef__scout_nearest(const ef__scout *scout, const ef_metric *metric,
                         const double target[3], size_t most,
                         ef__start *start) {
  double difference[MOST_POINTS];
  size_t n = 0;
  all_differences(scout, metric, target, difference);
  for (int p = 0; p < scout->n_points; ++p) {
    const double square = difference[p] * difference[p];
    if (n == most && !(square < start[n - 1].square))
      continue;
    size_t i = n < most ? n++ : n - 1;
    for (; i > 0 && start[i - 1].square > square; --i)
      start[i] = start[i - 1];
    set_start(scout, p, square, &start[i]);
  }
  return n;
}

/* The low points found so far, the lowest first. */
typedef struct lows {
  size_t n;
  int point[EF__MAX_SCOUTED];
  double square[EF__MAX_SCOUTED];
} lows;

static bool has_place(const lows *l, double square) {
  return l->n < EF__MAX_SCOUTED || square < l->square[l->n - 1];
}

static void insert(lows *l, int point, double square) {
  size_t i = l->n < EF__MAX_SCOUTED ? l->n++ : l->n - 1;
  for (; i > 0 && l->square[i - 1] > square; --i) {
    l->point[i] = l->point[i - 1];
    l->square[i] = l->square[i - 1];
  }
  l->point[i] = point;
  l->square[i] = square;
}

static void find_lows(const ef__scout *scout, const ef_metric *metric,
                      const double target[3], double limit, lows *out) {
  double difference[MOST_POINTS];
  all_differences(scout, metric, target, difference);
  for (int p = 0; p < scout->n_points; ++p) {
    const double square = difference[p] * difference[p];
    if (difference[p] <= limit && has_place(out, square) &&
        is_low(scout, difference, p))
      insert(out, p, square);
  }
}

static bool is_low_on_face(const faces *f, const float *square, int p) {
  for (int k = 0; k < f->n_near[p]; ++k) {
    const int other = f->near[p][k];
    if (square[other] < square[p] ||
        (square[other] == square[p] && other < p))
      return false;
  }
  return true;
}

static void find_lows_on_faces(const faces *f, const ef_metric *metric,
                               const double target[3], double limit,
                               lows *out) {
  float square[N_FACED];
  const float reference[3] = {(float)target[0], (float)target[1],
                              (float)target[2]};
  const float bound = (float)(limit * limit);
  metric->rough(metric, N_BLOCKS, reference, f->sample, square);
  for (int p = 0; p < N_FACED; ++p) {
    if (square[p] <= bound && has_place(out, (double)square[p]) &&
        is_low_on_face(f, square, p))
      insert(out, f->point[p], (double)square[p]);
  }
}

size_t ef__scout_starts(const ef__scout *scout, const ef_metric *metric,
                        const double target[3], double limit,
                        ef__start start[EF__MAX_SCOUTED]) {
  lows found = {.n = 0};
  if (scout->is_faced) {
    find_lows_on_faces(&scout->faces, metric, target, limit, &found);
  } else {
    find_lows(scout, metric, target, limit, &found);
  }
  for (size_t i = 0; i < found.n; ++i)
    set_start(scout, found.point[i], found.square[i], &start[i]);
  return found.n;
}
