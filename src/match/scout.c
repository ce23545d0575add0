/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A look over the whole gamut before the descents, for setups whose colours do
 * not add. Their gamut may be folded and bent, so that a difference has basins
 * that no rule about its formula foresees. */
#include "match/match_private.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

/* Points along each amount. Of 600 targets for prints and paints that lie all
 * over the colours, descents from the low points of 3 along each amount miss
 * the nearest colour of a grid of 21 for 11, from 5 for 2, from 7 for none. */
enum { SIDE = 9, POINTS = SIDE * SIDE * SIDE };

struct ef__scout {
  double coordinate[3 * POINTS]; /* in the metric, colour of each point */
};

static void point_amounts(int point, double amount[3]) {
  amount[0] = (double)(point / (SIDE * SIDE)) / (SIDE - 1);
  amount[1] = (double)(point / SIDE % SIDE) / (SIDE - 1);
  amount[2] = (double)(point % SIDE) / (SIDE - 1);
}

ef__scout *ef__scout_new(const ef__mixing *mixing, const ef_metric *metric,
                         ef_error *error) {
  ef__scout *const scout = ef__allocate(1, sizeof *scout);
  if (scout == NULL) {
    ef__error_memory(error, "a look over the gamut");
    return NULL;
  }
  for (int p = 0; p < POINTS; ++p) {
    double amount[3];
    point_amounts(p, amount);
    ef_metric_coordinates(metric, ef__mixing_xyz(mixing, amount, NULL),
                          &mixing->conditions, scout->coordinate + 3 * p);
  }
  return scout;
}

void ef__scout_free(ef__scout *scout) {
  free(scout);
}

/* No neighbour, not even across a corner, has less. */
static bool is_low(const double *difference, int point) {
  const int at[3] = {point / (SIDE * SIDE), point / SIDE % SIDE, point % SIDE};
  for (int i = -1; i <= 1; ++i) {
    for (int j = -1; j <= 1; ++j) {
      for (int k = -1; k <= 1; ++k) {
        const int x = at[0] + i, y = at[1] + j, z = at[2] + k;
        if (x < 0 || y < 0 || z < 0 || x >= SIDE || y >= SIDE || z >= SIDE) {
          continue;
        }
        const int other = (x * SIDE + y) * SIDE + z;
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

size_t ef__scout_starts(const ef__scout *scout, const ef_metric *metric,
                        const double target[3],
                        double place[EF__MAX_SCOUTED][3]) {
  double difference[POINTS];
  int low[EF__MAX_SCOUTED];
  size_t n = 0;
  for (int p = 0; p < POINTS; ++p) {
    difference[p] =
        ef_metric_difference(metric, target, scout->coordinate + 3 * p);
  }
  for (int p = 0; p < POINTS; ++p) {
    if (n == EF__MAX_SCOUTED && !(difference[p] < difference[low[n - 1]])) {
      continue;
    }
    if (!is_low(difference, p))
      continue;
    size_t i = n < EF__MAX_SCOUTED ? n++ : n - 1;
    for (; i > 0 && difference[low[i - 1]] > difference[p]; --i) {
      low[i] = low[i - 1];
    }
    low[i] = p;
  }
  for (size_t i = 0; i < n; ++i)
    point_amounts(low[i], place[i]);
  return n;
}
