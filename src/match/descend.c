/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Newton's method in the unit box. Second derivatives are exact (formula,
 * coordinates, mixing), so that some five steps do; amounts that sit at a bound
 * and are pushed against it are left out of a step (the active face). */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

/* Gain of a step, as a share of the square, from which on no other follows: a
 * step of Newton's leaves about the square of that share. */
#define LAST 1e-7

double ef__search_value(ef__search *search, const double amount[3]) {
  double coordinate[3];
  const ef__mixing *const mixing = search->mixing;
  const ef_xyz xyz = ef__mixing_xyz(mixing, amount, NULL);
  ef_metric_coordinates(search->metric, xyz, &mixing->conditions, coordinate);
  const double d = ef_metric_difference(search->metric, search->target, coordinate);
  ++search->n_values;
  return d * d;
}

void ef__search_expand(ef__search *search, ef__place *place) {
  double coordinate[3], j[9], hj[9];
  ef__expansion in, out;
  const ef__mixing *const mixing = search->mixing;
  const ef_xyz xyz = ef__mixing_xyz(mixing, place->amount, j);
  ef_metric_coordinates(search->metric, xyz, &mixing->conditions, coordinate);
  ef__metric_expand(search->metric, search->target, coordinate, &in);
  ef__metric_carry(search->metric, xyz, coordinate, &mixing->conditions, &in,
                   &out);
  const double *const h = out.hessian, *const g = out.gradient;
  for (int i = 0; i < 3; ++i) {
    for (int k = 0; k < 3; ++k) {
      hj[3 * i + k] =
          h[3 * i] * j[k] + h[3 * i + 1] * j[3 + k] + h[3 * i + 2] * j[6 + k];
    }
  }
  for (int i = 0; i < 3; ++i) {
    place->gradient[i] = j[i] * g[0] + j[3 + i] * g[1] + j[6 + i] * g[2];
    for (int k = i; k < 3; ++k) {
      place->hessian[3 * i + k] = place->hessian[3 * k + i] =
          j[i] * hj[k] + j[3 + i] * hj[3 + k] + j[6 + i] * hj[6 + k];
    }
  }
  place->square = in.square;
  ++search->n_expansions;
}

/* Solves (H + shift * diag |H|) step = right by Cholesky for the first n rows;
 * false when that is not safely positive definite. */
static bool solve_shifted(int n, const double h[9], double shift,
                          const double right[3], double step[3]) {
  double root[9];
  for (int i = 0; i < n; ++i) {
    for (int k = 0; k <= i; ++k) {
      double sum = h[3 * i + k];
      if (i == k) sum += shift * fabs(h[4 * i]);
      for (int q = 0; q < k; ++q) sum -= root[3 * i + q] * root[3 * k + q];
      if (i > k) {
        root[3 * i + k] = sum / root[4 * k];
      } else {
        if (!(sum > 1e-10 * fabs(h[4 * i]))) return false;
        root[4 * i] = sqrt(sum);
      }
    }
  }
  for (int i = 0; i < n; ++i) {
    double sum = right[i];
    for (int q = 0; q < i; ++q) sum -= root[3 * i + q] * step[q];
    step[i] = sum / root[4 * i];
  }
  for (int i = n; i-- > 0;) {
    double sum = step[i];
    for (int q = i + 1; q < n; ++q) sum -= root[3 * q + i] * step[q];
    step[i] = sum / root[4 * i];
  }
  return true;
}

/* Newton's step of the amounts that are not `fixed`, those that are moving by
 * `step`. Where the curvature is not positive it is made so. */
static void solve_free(const ef__place *place, const int index[3], int n,
                       const double step[3], double free_step[3]) {
  double h[9], right[3];
  for (int i = 0; i < n; ++i) {
    const double *const row = place->hessian + 3 * index[i];
    right[i] = -place->gradient[index[i]] -
               (row[0] * step[0] + row[1] * step[1] + row[2] * step[2]);
    for (int k = 0; k < n; ++k) h[3 * i + k] = row[index[k]];
  }
  /* With shift s the diagonal grows to at least (s - 1) |H_ii|; s above 3
   * dominates any row of a matrix whose off-diagonal elements are at most the
   * geometric mean of its diagonal ones. */
  double shift = 0;
  for (int tries = 0; tries < 20; ++tries) {
    if (solve_shifted(n, h, shift, right, free_step)) return;
    shift = shift == 0 ? 2.1 : 4 * shift;
  }
  for (int i = 0; i < n; ++i) free_step[i] = 0;
}

/* Room from `at` to the bound ahead as a share of the way. */
static double share_to_bound(double at, double way) {
  if (way > 0) return (1 - at) / way;
  return way < 0 ? at / -way : (double)INFINITY;
}

/* The step to the minimum of the quadratic model in the box, or nearly: as long
 * as it would leave the box, the amount that leaves first stays at the bound
 * and the others are solved again. */
static void box_step(const ef__place *place, double step[3]) {
  bool fixed[3];
  const double *const a = place->amount;
  for (int i = 0; i < 3; ++i) {
    step[i] = 0;
    fixed[i] = (a[i] <= 0 && place->gradient[i] >= 0) ||
               (a[i] >= 1 && place->gradient[i] <= 0);
  }
  for (;;) {
    int index[3], n = 0, first = -1;
    double free_step[3], least = 1;
    for (int i = 0; i < 3; ++i) {
      if (!fixed[i]) index[n++] = i;
    }
    if (n == 0) return;
    solve_free(place, index, n, step, free_step);
    for (int i = 0; i < n; ++i) {
      const double share = share_to_bound(a[index[i]], free_step[i]);
      if (!(share < least)) continue;
      least = share;
      first = i;
    }
    if (first < 0) {
      for (int i = 0; i < n; ++i) step[index[i]] = free_step[i];
      return;
    }
    fixed[index[first]] = true;
    step[index[first]] = (free_step[first] < 0 ? 0 : 1) - a[index[first]];
  }
}

static double slope_along(const ef__place *place, const double step[3]) {
  return place->gradient[0] * step[0] + place->gradient[1] * step[1] +
         place->gradient[2] * step[2];
}

/* Steepest descent, scaled by the curvature of each amount, cut at the box. */
static void gradient_step(const ef__place *place, double step[3]) {
  for (int i = 0; i < 3; ++i) {
    const double bend = fabs(place->hessian[4 * i]);
    const double length = bend > 0 ? -place->gradient[i] / bend : 0;
    step[i] = ef__clamp(place->amount[i] + length, 0, 1) - place->amount[i];
  }
}

static void moved(const ef__place *from, double share, const double step[3],
                  double amount[3]) {
  for (int i = 0; i < 3; ++i) {
    amount[i] = ef__clamp(from->amount[i] + share * step[i], 0, 1);
  }
}

/* Goes along the step as far as it pays (Armijo); false when it never does. */
static bool advance(ef__search *search, ef__place *place, const double step[3],
                    double slope) {
  ef__place next;
  moved(place, 1, step, next.amount);
  ef__search_expand(search, &next);
  if (next.square <= place->square + 1e-4 * slope) {
    *place = next;
    return true;
  }
  for (double share = 0.3; share > 1e-3; share *= 0.3) {
    moved(place, share, step, next.amount);
    if (ef__search_value(search, next.amount) >
        place->square + 1e-4 * share * slope) {
      continue;
    }
    ef__search_expand(search, &next);
    *place = next;
    return true;
  }
  return false;
}

/* One more step, of which the value alone is told; false when it leads up. */
static bool step_last(ef__search *search, ef__place *place,
                      const double step[3]) {
  double amount[3];
  moved(place, 1, step, amount);
  const double square = ef__search_value(search, amount);
  if (!(square <= place->square)) return false;
  memcpy(place->amount, amount, sizeof amount);
  place->square = square;
  return true;
}

/* True when the way from the place straight to the known minimum leads down, by
 * what both ends know of it: slope and bend at each foretell the other's value.
 * A descent from here would then end there. */
static bool leads_to(const ef__place *place, const ef__place *minimum) {
  const double tolerance = 0.1; /* of the way down */
  double way[3], slope[2] = {0, 0}, bend[2] = {0, 0};
  const double fall = place->square - minimum->square;
  if (!(fall > 0))
    return false;
  for (int i = 0; i < 3; ++i)
    way[i] = minimum->amount[i] - place->amount[i];
  for (int i = 0; i < 3; ++i) {
    slope[0] += place->gradient[i] * way[i];
    slope[1] += minimum->gradient[i] * way[i];
    for (int k = 0; k < 3; ++k) {
      bend[0] += place->hessian[3 * i + k] * way[i] * way[k];
      bend[1] += minimum->hessian[3 * i + k] * way[i] * way[k];
    }
  }
  const double from_here = -slope[0] - bend[0] / 2;
  const double from_there = -slope[1] + bend[1] / 2;
  return slope[0] < 0 && fabs(from_here - fall) < tolerance * fall &&
         fabs(from_there - fall) < tolerance * fall;
}

static bool leads_to_any(const ef__place *place, size_t n,
                         const ef__place *known) {
  for (size_t i = 0; i < n; ++i) {
    if (leads_to(place, &known[i]))
      return true;
  }
  return false;
}

ef__descent ef__descend_beside(ef__search *search, size_t n_known,
                               const ef__place *known, ef__place *place) {
  enum { MOST_STEPS = 60 };
  const ef_metric *const metric = search->metric;
  const bool is_exact = metric->expand != NULL && metric->carry != NULL;
  ef__search_expand(search, place);
  for (int i = 0; i < MOST_STEPS; ++i) {
    double step[3];
    if (leads_to_any(place, n_known, known)) return EF__DESCENT_KNOWN;
    box_step(place, step);
    double slope = slope_along(place, step);
    if (slope >= 0) {
      gradient_step(place, step);
      slope = slope_along(place, step);
    }
    /* What is left to gain is about half of -slope: 1e-11 of the square, so
     * 3e-12 of the difference; near the target 1e-20 of squared units. */
    if (!(-slope > 1e-11 * place->square + 1e-20)) return EF__DESCENT_SMOOTH;
    if (is_exact && -slope < LAST * place->square &&
        step_last(search, place, step)) {
      return EF__DESCENT_SMOOTH;
    }
    if (!advance(search, place, step, slope)) return EF__DESCENT_STOPPED;
  }
  return EF__DESCENT_STOPPED;
}

bool ef__descend(ef__search *search, ef__place *place) {
  return ef__descend_beside(search, 0, NULL, place) == EF__DESCENT_SMOOTH;
}
