/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The global minimum in the box: descents from a few starts chosen so that
 * each basin that the formula and the shape of the gamut can make has one.
 * tests/laws/law_nearest.c compares with a dense grid. */
#include "match/match_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* How far a basin may lead down: from the point of the look over the gamut that
 * lies in it, from a decoy of the formula, and from the colour nearest to that
 * decoy which the gamut has. With 4 instead of 8 for the first, 26 of 4000 far
 * targets miss the nearest colour (srgb); with 5 instead of 7 for the second,
 * 1 of 4000 for three displays. */
#define DEPTH 8.0
#define DEPTH_OF_DECOY 7.0
#define DEPTH_AFTER_CLIPPING 16.0

enum { MOST_ENDS = 6 };

/* Descents that meet end closer to each other than this. */
static bool is_same(const double a[3], const double b[3]) {
  const double near = 1e-5;
  return fabs(a[0] - b[0]) < near && fabs(a[1] - b[1]) < near &&
         fabs(a[2] - b[2]) < near;
}

/* Where descents ended, with slope and bend there: others that come near one of
 * them need not go on. */
typedef struct trail {
  ef__search *search;
  ef__minima *minima;
  size_t n_ends;
  ef__place end[MOST_ENDS];
} trail;

static void keep(ef__minima *minima, const ef__place *place) {
  size_t i = minima->n;
  for (size_t k = 0; k < minima->n; ++k) {
    if (!is_same(minima->at[k].amount, place->amount))
      continue;
    if (!(place->square < minima->at[k].square))
      return;
    /* Makes way for the better one. */
    for (i = --minima->n; k < i; ++k)
      minima->at[k] = minima->at[k + 1];
    break;
  }
  if (minima->n == EF__MAX_MINIMA) {
    if (!(place->square < minima->at[i - 1].square))
      return;
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
    if (!inside || !long_enough)
      continue;
    const double square = ef__search_value(search, to);
    if (!(square < least))
      continue;
    least = square;
    memcpy(best, to, sizeof best);
    found = true;
  }
  if (found)
    memcpy(place->amount, best, sizeof best);
  return found;
}

/* A long look sees over small bends, a short one finds minima that lie near. */
static bool nudge(ef__search *search, ef__place *place) {
  return look_around(search, 1e-5, place) || look_around(search, 1e-7, place);
}

static bool on_neutral_axis(const ef__search *search, const double amount[3]) {
  double c[3];
  coordinates_at(search, amount, c);
  return c[1] * c[1] + c[2] * c[2] < 1e-6;
}

static void descend_from(trail *t, const double amount[3]) {
  enum { MOST_NUDGES = 4 };
  ef__search *const search = t->search;
  ef__place place;
  for (int i = 0; i < 3; ++i)
    place.amount[i] = ef__clamp(amount[i], 0, 1);
  /* Where colours do not add, ways may lead over folds. */
  const size_t n_known = search->mixing->affine ? t->n_ends : 0;
  const ef__descent how = ef__descend_beside(search, n_known, t->end, &place);
  if (how == EF__DESCENT_KNOWN)
    return;
  bool smooth = how == EF__DESCENT_SMOOTH;
  if (!smooth && search->metric->jumps_at_opposite_hue) {
    smooth = ef__descend_edge(search, &place);
  }
  for (int i = 0; i < MOST_NUDGES; ++i) {
    if (smooth && !(search->metric->kinked_axis &&
                    on_neutral_axis(search, place.amount))) {
      break;
    }
    ef__place next = place;
    if (!nudge(search, &next))
      break;
    smooth = ef__descend(search, &next);
    if (!(next.square < place.square))
      break;
    place = next;
  }
  keep(t->minima, &place);
  if (t->n_ends < MOST_ENDS)
    t->end[t->n_ends++] = place;
}

/* Where the way from a grey of the target's lightness to the exact amounts
 * leaves the box: about the colour of least loss of chroma. */
static void leave_box(const ef__search *search, const double exact[3],
                      double amount[3]) {
  const double grey[3] = {ef__clamp(search->target[0], 1, 99), 0, 0};
  double from[3];
  ef__exact(search->mixing,
            ef_metric_xyz(search->metric, grey, &search->mixing->conditions),
            from);
  double share = 1;
  for (int i = 0; i < 3; ++i) {
    from[i] = ef__clamp(from[i], 0, 1);
    const double way = exact[i] - from[i];
    const double room = way > 0 ? 1 - from[i] : -from[i];
    if (fabs(share * way) > fabs(room))
      share = room / way;
  }
  for (int i = 0; i < 3; ++i) {
    amount[i] = from[i] + share * (exact[i] - from[i]);
  }
}

/* From the low points of a look over the gamut that promise something; where
 * colours do not add the gamut may be folded, and all are tried. */
static void search_scouted(trail *t) {
  ef__search *const search = t->search;
  const ef__minima *const out = t->minima;
  ef__start start[EF__MAX_SCOUTED];
  const bool affine = search->mixing->affine;
  const double limit =
      affine ? sqrt(out->at[0].square) + DEPTH : (double)INFINITY;
  const size_t n = ef__scout_starts(search->mixing->scout, search->metric,
                                    search->target, limit, start);
  for (size_t i = 0; i < n; ++i)
    descend_from(t, start[i].amount);
}

static void search_decoys(trail *t) {
  ef__search *const search = t->search;
  const ef__minima *const out = t->minima;
  double start[EF__MAX_DECOYS][3], amount[3];
  const double limit = sqrt(out->at[0].square) + DEPTH_OF_DECOY;
  const size_t n =
      search->metric->decoys(search->metric, search->target, limit, start);
  for (size_t i = 0; i < n; ++i) {
    ef__exact(
        search->mixing,
        ef_metric_xyz(search->metric, start[i], &search->mixing->conditions),
        amount);
    for (int k = 0; k < 3; ++k)
      amount[k] = ef__clamp(amount[k], 0, 1);
    const double difference = sqrt(ef__search_value(search, amount));
    if (difference > sqrt(out->at[0].square) + DEPTH_AFTER_CLIPPING)
      continue;
    descend_from(t, amount);
  }
}

/* A table bends at each of its points, and its slopes, taken over some way,
 * lead nowhere there; between its points it is nearly straight. So the exact
 * amounts are sought from each of the nearest points of the look over the
 * gamut. */
static void search_table(ef__search *search, ef__minima *minima) {
  enum { MOST = 16 };
  ef__start start[MOST];
  const ef_xyz target = ef_metric_xyz(search->metric, search->target,
                                      &search->mixing->conditions);
  const size_t n = ef__scout_nearest(search->mixing->scout, search->metric,
                                     search->target, MOST, start);
  for (size_t i = 0; i < n; ++i) {
    ef__place place;
    memcpy(place.amount, start[i].amount, sizeof place.amount);
    const bool found = ef__exact_from(search->mixing, target, place.amount);
    place.square = ef__search_value(search, place.amount);
    keep(minima, &place);
    if (found)
      return;
  }
}

void ef__nearest(ef__search *search, const double exact[3], ef__minima *out) {
  double left[3], clipped[3];
  for (int i = 0; i < 3; ++i)
    clipped[i] = ef__clamp(exact[i], 0, 1);
  leave_box(search, exact, left);
  const bool left_is_better =
      ef__search_value(search, left) < ef__search_value(search, clipped);
  trail t = {.search = search, .minima = out};
  out->n = 0;
  descend_from(&t, left_is_better ? left : clipped);
  /* The law test finds other basins only beyond some such difference. */
  if (search->mixing->affine && out->at[0].square < 49)
    return;
  if (!search->mixing->affine)
    descend_from(&t, left_is_better ? clipped : left);
  search_scouted(&t);
  if (search->metric->decoys != NULL)
    search_decoys(&t);
  if (search->mixing->has_kinks)
    search_table(search, out);
}

void ef__nearest_from(ef__search *search, const double amount[3],
                      ef__minima *minima) {
  trail t = {.search = search, .minima = minima};
  descend_from(&t, amount);
}
