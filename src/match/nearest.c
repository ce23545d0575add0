/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The global minimum in the box: descents from a few starts chosen so that
 * each basin that the formula and the shape of the gamut can make has one.
 * tests/laws/law_nearest.c compares with a dense grid. */
#include "match/match_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Descents that meet end closer to each other than this. */
static bool is_same(const double a[3], const double b[3]) {
  const double near = 1e-5;
  return fabs(a[0] - b[0]) < near && fabs(a[1] - b[1]) < near &&
         fabs(a[2] - b[2]) < near;
}

static void keep(ef__minima *minima, const ef__place *place) {
  size_t i = minima->n;
  for (size_t k = 0; k < minima->n; ++k) {
    if (!is_same(minima->at[k].amount, place->amount)) continue;
    if (!(place->square < minima->at[k].square)) return;
    /* Makes way for the better one. */
    for (i = --minima->n; k < i; ++k) minima->at[k] = minima->at[k + 1];
    break;
  }
  if (minima->n == EF__MAX_MINIMA) {
    if (!(place->square < minima->at[i - 1].square)) return;
    --i;
  } else {
    ++minima->n;
  }
  for (; i > 0 && minima->at[i - 1].square > place->square; --i) {
    minima->at[i] = minima->at[i - 1];
  }
  memcpy(minima->at[i].amount, place->amount, sizeof place->amount);
  minima->at[i].square = place->square;
}

static void coordinates_at(const ef__search *search, const double amount[3],
                           double coordinate[3]) {
  ef_metric_coordinates(search->metric,
                        ef__mixing_xyz(search->mixing, amount, NULL),
                        &search->mixing->conditions, coordinate);
}

/* At a kink the slope is another one in every direction. Looks around, 98
 * directions as far as they lead into the box, for one that goes down. */
static bool look_around(ef__search *search, double reach, ef__place *place) {
  double best[3] = {0, 0, 0};
  double least = place->square * (1 - 1e-12);
  bool found = false;
  for (int code = 0; code < 125; ++code) {
    const int digit[3] = {code % 5 - 2, code / 5 % 5 - 2, code / 25 - 2};
    double to[3];
    bool inside = true, long_enough = false;
    for (int i = 0; i < 3; ++i) {
      to[i] = place->amount[i] + reach * digit[i];
      inside = inside && to[i] >= 0 && to[i] <= 1;
      long_enough = long_enough || abs(digit[i]) == 2;
    }
    if (!inside || !long_enough) continue;
    const double square = ef__search_value(search, to);
    if (!(square < least)) continue;
    least = square;
    memcpy(best, to, sizeof best);
    found = true;
  }
  if (found) memcpy(place->amount, best, sizeof best);
  return found;
}

/* A long look sees over small bends, a short one finds minima that lie near. */
static bool nudge(ef__search *search, ef__place *place) {
  return look_around(search, 1e-5, place) || look_around(search, 1e-7, place);
}

static bool on_neutral_axis(const ef__search *search,
                            const double amount[3]) {
  double c[3];
  coordinates_at(search, amount, c);
  return c[1] * c[1] + c[2] * c[2] < 1e-6;
}

static void descend_from(ef__search *search, const double amount[3],
                         ef__minima *minima) {
  enum { MOST_NUDGES = 4 };
  ef__place place;
  for (int i = 0; i < 3; ++i) place.amount[i] = ef__clamp(amount[i], 0, 1);
  bool smooth = ef__descend(search, &place);
  if (!smooth && search->metric->jumps_at_opposite_hue) {
    smooth = ef__descend_edge(search, &place);
  }
  for (int i = 0; i < MOST_NUDGES; ++i) {
    if (smooth && !(search->metric->kinked_axis &&
                    on_neutral_axis(search, place.amount))) {
      break;
    }
    ef__place next = place;
    if (!nudge(search, &next)) break;
    smooth = ef__descend(search, &next);
    if (!(next.square < place.square)) break;
    place = next;
  }
  keep(minima, &place);
}

/* Where the way from a grey of the target's lightness to the exact amounts
 * leaves the box: about the colour of least loss of chroma. */
static void leave_box(const ef__search *search, const double exact[3],
                      double amount[3]) {
  const double grey[3] = {ef__clamp(search->target[0], 1, 99), 0, 0};
  double from[3];
  ef__exact(
      search->mixing,
      ef_metric_xyz(search->metric, grey, &search->mixing->conditions), from);
  double share = 1;
  for (int i = 0; i < 3; ++i) {
    from[i] = ef__clamp(from[i], 0, 1);
    const double way = exact[i] - from[i];
    const double room = way > 0 ? 1 - from[i] : -from[i];
    if (fabs(share * way) > fabs(room)) share = room / way;
  }
  for (int i = 0; i < 3; ++i) {
    amount[i] = from[i] + share * (exact[i] - from[i]);
  }
}

static void search_decoys(ef__search *search, ef__minima *out) {
  double start[EF__MAX_DECOYS][3], amount[3];
  const size_t n = search->metric->decoys(search->metric, search->target, start);
  for (size_t i = 0; i < n; ++i) {
    /* Near black and white there is no room for chroma. */
    start[i][0] = ef__clamp(start[i][0], 5, 96);
    ef__exact(
        search->mixing,
        ef_metric_xyz(search->metric, start[i], &search->mixing->conditions),
        amount);
    descend_from(search, amount, out);
  }
}

/* Where colours do not add: from the low points of a look over the gamut. */
static void search_scouted(ef__search *search, ef__minima *out) {
  double start[EF__MAX_SCOUTED][3];
  const size_t n = ef__scout_starts(search->mixing->scout, search->metric,
                                    search->target, start);
  for (size_t i = 0; i < n; ++i) descend_from(search, start[i], out);
}

/* The two best of the 27 points with amounts 0, 1/2 and 1: where the target is
 * far away, the basin of the least difference need not be the one that either
 * of the usual starts lies in. */
static void search_lattice(ef__search *search, ef__minima *out) {
  enum { N_STARTS = 2 };
  double start[N_STARTS][3] = {{0}};
  double least[N_STARTS] = {(double)INFINITY, (double)INFINITY};
  for (int code = 0; code < 27; ++code) {
    const double at[3] = {code % 3 / 2.0, code / 3 % 3 / 2.0, code / 9 / 2.0};
    const double square = ef__search_value(search, at);
    const int place = square < least[0] ? 0 : square < least[1] ? 1 : N_STARTS;
    if (place == N_STARTS) continue;
    if (place == 0) {
      least[1] = least[0];
      memcpy(start[1], start[0], sizeof start[0]);
    }
    least[place] = square;
    memcpy(start[place], at, sizeof at);
  }
  for (int i = 0; i < N_STARTS; ++i) descend_from(search, start[i], out);
}

void ef__nearest(ef__search *search, const double exact[3], ef__minima *out) {
  double left[3], clipped[3];
  for (int i = 0; i < 3; ++i) clipped[i] = ef__clamp(exact[i], 0, 1);
  leave_box(search, exact, left);
  const bool left_first =
      ef__search_value(search, left) < ef__search_value(search, clipped);
  out->n = 0;
  if (search->mixing->scout != NULL) search_scouted(search, out);
  descend_from(search, left_first ? left : clipped, out);
  /* The law test finds other basins only beyond some such difference. */
  if (out->at[0].square < 49) return;
  descend_from(search, left_first ? clipped : left, out);
  const double least = search->metric->decoy_difference;
  if (search->metric->decoys != NULL && out->at[0].square > least * least) {
    search_decoys(search, out);
  }
  search_lattice(search, out);
}
