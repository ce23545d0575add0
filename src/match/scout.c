/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A look over the whole gamut before the descents: a difference has basins that
 * no rule about its formula foresees, most of all where the gamut is bent and
 * where the target is far away. */
#include "match/match_private.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

/* Points along each amount, fewer where a difference costs ten times as much as
 * others and a formula names its decoys. Where colours do not add: of 600
 * targets for prints and paints that lie all over the colours, descents from
 * the low points of 3 along each amount miss the nearest colour of a grid of 21
 * for 11, from 5 for 2, from 7 for none. */
enum { SIDE = 9, COSTLY_SIDE = 6, MOST_POINTS = SIDE * SIDE * SIDE };

struct ef__scout {
  int side, n_points;
  double along[SIDE];                 /* amounts of the grid */
  double coordinate[3 * MOST_POINTS]; /* in the metric, colour of each point */
};

static void point_amounts(const ef__scout *scout, int point, double amount[3]) {
  const int side = scout->side;
  amount[0] = scout->along[point / (side * side)];
  amount[1] = scout->along[point / side % side];
  amount[2] = scout->along[point % side];
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
  return scout;
}

void ef__scout_free(ef__scout *scout) {
  free(scout);
}

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

size_t ef__scout_nearest(const ef__scout *scout, const ef_metric *metric,
                         const double target[3], size_t most,
                         ef__start *start) {
  double difference[MOST_POINTS];
  size_t n = 0;
  all_differences(scout, metric, target, difference);
  for (int p = 0; p < scout->n_points; ++p) {
    if (n == most && !(difference[p] < start[n - 1].difference))
      continue;
    size_t i = n < most ? n++ : n - 1;
    for (; i > 0 && start[i - 1].difference > difference[p]; --i)
      start[i] = start[i - 1];
    start[i].difference = difference[p];
    point_amounts(scout, p, start[i].amount);
  }
  return n;
}

size_t ef__scout_starts(const ef__scout *scout, const ef_metric *metric,
                        const double target[3], double limit,
                        ef__start start[EF__MAX_SCOUTED]) {
  double difference[MOST_POINTS];
  int low[EF__MAX_SCOUTED];
  size_t n = 0;
  all_differences(scout, metric, target, difference);
  for (int p = 0; p < scout->n_points; ++p) {
    if (!(difference[p] <= limit))
      continue;
    if (n == EF__MAX_SCOUTED && !(difference[p] < difference[low[n - 1]])) {
      continue;
    }
    if (!is_low(scout, difference, p))
      continue;
    size_t i = n < EF__MAX_SCOUTED ? n++ : n - 1;
    for (; i > 0 && difference[low[i - 1]] > difference[p]; --i) {
      low[i] = low[i - 1];
    }
    low[i] = p;
  }
  for (size_t i = 0; i < n; ++i) {
    point_amounts(scout, low[i], start[i].amount);
    start[i].difference = difference[low[i]];
  }
  return n;
}
