/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "grid_search.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static void coordinates_at(const grid_search *s, const double amount[3],
                           double coordinate[3]) {
  ef_metric_coordinates(s->metric, ef__mixing_xyz(s->mixing, amount, NULL),
                        &s->mixing->conditions, coordinate);
}

grid_search grid_search_new(const ef__mixing *mixing, const ef_metric *metric,
                            int side) {
  const size_t n = (size_t)side * (size_t)side * (size_t)side;
  grid_search s = {mixing, metric, side, malloc(3 * n * sizeof(double)),
                   malloc(3 * n * sizeof(double))};
  if (s.amount == NULL || s.coordinate == NULL)
    abort();
  for (size_t i = 0; i < n; ++i) {
    size_t rest = i;
    for (int k = 0; k < 3; ++k) {
      const double at = (double)(rest % (size_t)side) / (side - 1);
      s.amount[3 * i + (size_t)k] = at * at * at;
      rest /= (size_t)side;
    }
    coordinates_at(&s, s.amount + 3 * i, s.coordinate + 3 * i);
  }
  return s;
}

void grid_search_free(grid_search *s) {
  free(s->amount);
  free(s->coordinate);
}

/* The 26 neighbours in steps of the cube root of the amounts, halved where none
 * is lower. */
static double polish(const grid_search *s, const double target[3],
                     double amount[3]) {
  double root[3], coordinate[3];
  for (int k = 0; k < 3; ++k)
    root[k] = cbrt(amount[k]);
  coordinates_at(s, amount, coordinate);
  double least = ef_metric_difference(s->metric, target, coordinate);
  for (double step = 1.0 / (s->side - 1); step > 1e-10;) {
    double best_root[3] = {0, 0, 0}, before = least;
    for (int code = 0; code < 27; ++code) {
      const int digit[3] = {code % 3 - 1, code / 3 % 3 - 1, code / 9 - 1};
      double to[3], to_root[3];
      for (int k = 0; k < 3; ++k) {
        to_root[k] = fmin(fmax(root[k] + step * digit[k], 0), 1);
        to[k] = to_root[k] * to_root[k] * to_root[k];
      }
      coordinates_at(s, to, coordinate);
      const double d = ef_metric_difference(s->metric, target, coordinate);
      if (!(d < least))
        continue;
      least = d;
      memcpy(best_root, to_root, sizeof best_root);
      memcpy(amount, to, sizeof to);
    }
    if (least < before)
      memcpy(root, best_root, sizeof root);
    else
      step /= 2;
  }
  return least;
}

/* The best points that lie apart from each other. */
enum { N_STARTS = 4 };
typedef struct start {
  double difference;
  size_t point;
} start;

static bool apart(const grid_search *s, size_t a, size_t b) {
  for (int k = 0; k < 3; ++k) {
    const double off = cbrt(s->amount[3 * a + (size_t)k]) -
                       cbrt(s->amount[3 * b + (size_t)k]);
    if (fabs(off) > 0.1)
      return true;
  }
  return false;
}

static void enter(const grid_search *s, start list[N_STARTS], start candidate) {
  int at = N_STARTS - 1; /* place to give up: a near one, else the worst */
  for (int i = 0; i < N_STARTS; ++i) {
    if (list[i].difference < 1e300 && !apart(s, list[i].point, candidate.point))
      at = i;
  }
  if (!(candidate.difference < list[at].difference))
    return;
  list[at] = candidate;
  for (; at > 0 && list[at].difference < list[at - 1].difference; --at) {
    const start swap = list[at];
    list[at] = list[at - 1];
    list[at - 1] = swap;
  }
}

double grid_search_nearest(const grid_search *s, const double target[3],
                           double amount[3]) {
  const size_t n = (size_t)s->side * (size_t)s->side * (size_t)s->side;
  start list[N_STARTS];
  for (int i = 0; i < N_STARTS; ++i)
    list[i] = (start){1e300, 0};
  for (size_t i = 0; i < n; ++i) {
    const double d =
        ef_metric_difference(s->metric, target, s->coordinate + 3 * i);
    if (d < list[N_STARTS - 1].difference)
      enter(s, list, (start){d, i});
  }
  double least = 1e300;
  for (int i = 0; i < N_STARTS && list[i].difference < 1e300; ++i) {
    double to[3];
    memcpy(to, s->amount + 3 * list[i].point, sizeof to);
    const double d = polish(s, target, to);
    if (!(d < least))
      continue;
    least = d;
    memcpy(amount, to, sizeof to);
  }
  return least;
}
