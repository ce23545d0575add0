/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The lattice point of least difference. Codes stand on a grid of amounts that
 * is uneven (the tone curve) but separate for each channel.
 *
 * Around a target in gamut, and so near one out of it, the squared difference
 * is
 *   f = f0 + g . d + d' H d / 2
 * with g . d >= 0 everywhere in the box, so every lattice point that is as good
 * as one already known lies in the ellipsoid d' H d / 2 <= f - f0. Its lattice
 * points are walked through channel by channel (the closest-vector search of
 * Fincke & Pohst 1985, doi 10.1090/S0025-5718-1985-0777278-8), each with the
 * true difference. The bound is widened for what the quadratic neglects.
 *
 * Farther from the target the neglected may be all there is: the lattice is
 * then searched cell by cell (cells.c), and where that does not end by bounds
 * on boxes of codes (boxes.c). */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

/* The quadratic's share of the true difference may be this wrong, up to
 * differences of TRUSTED units. With codes of 5 bits and more the tests find no
 * lattice point missed; below, every code is tried. */
#define WIDENING 2.5
#define TRUSTED 2.0
enum { EXHAUSTIVE_CODES = 16, MOST_POINTS = 20000 };

typedef struct walk {
  ef__search *search;
  const ef__lattice *lattice;
  const double *best;   /* minimum in the box */
  double root[9];       /* H / 2 = root' root, upper triangular */
  double gradient[3];
  double floor;         /* f0 */
  double amount[3];     /* of the codes chosen so far, channel 2 first */
  uint32_t code[3];
  uint32_t least_code[3];
  double least;         /* f of least_code */
  int n_points;
} walk;

/* First code whose amount is at least `amount`; n_codes when none is. */
static size_t first_at_least(const double *amounts, size_t n, double amount) {
  size_t low = 0, high = n;
  while (low < high) {
    const size_t middle = low + (high - low) / 2;
    if (amounts[middle] < amount) {
      low = middle + 1;
    } else {
      high = middle;
    }
  }
  return low;
}

static void try_point(walk *w) {
  const double square = ef__search_value(w->search, w->amount);
  ++w->n_points;
  if (!(square < w->least)) return;
  w->least = square;
  memcpy(w->least_code, w->code, sizeof w->least_code);
}

static double bound(const walk *w) {
  const double room = w->least - w->floor;
  return WIDENING * (room > 0 ? room : 0);
}

/* Codes of `channel` in the ellipsoid, given those of the channels above it;
 * `used` is the part of the quadratic that these have used up. */
static void walk_channel(walk *w, int channel, double used) {
  const double *const row = w->root + 3 * channel;
  const double *const amounts = w->lattice->amount[channel];
  double shift = 0;
  for (int k = channel + 1; k < 3; ++k) {
    shift += row[k] * (w->amount[k] - w->best[k]);
  }
  const double center = w->best[channel] - shift / row[channel];
  const double reach = sqrt(fmax(bound(w) - used, 0)) / row[channel];
  const size_t n = w->lattice->n_codes;
  size_t i = first_at_least(amounts, n, center - reach);
  for (; i < n && amounts[i] <= center + reach; ++i) {
    if (w->n_points >= MOST_POINTS) return;
    const double off = row[channel] * (amounts[i] - center);
    const double slope =
        w->gradient[channel] * (amounts[i] - w->best[channel]);
    const double total = used + off * off + fmax(slope, 0);
    if (total > bound(w)) continue; /* the bound shrinks on the way */
    w->amount[channel] = amounts[i];
    w->code[channel] = (uint32_t)i;
    if (channel > 0) {
      walk_channel(w, channel - 1, total);
    } else {
      try_point(w);
    }
  }
}

/* The eight codes around the best amounts, or all when there are few. */
static void try_box(walk *w, const uint32_t from[3], const uint32_t to[3]) {
  for (uint32_t i = from[0]; i <= to[0]; ++i) {
    for (uint32_t j = from[1]; j <= to[1]; ++j) {
      for (uint32_t k = from[2]; k <= to[2]; ++k) {
        const uint32_t at[3] = {i, j, k};
        for (int c = 0; c < 3; ++c) {
          w->code[c] = at[c];
          w->amount[c] = w->lattice->amount[c][at[c]];
        }
        try_point(w);
      }
    }
  }
}

void ef__cell_around(const ef__lattice *lattice, const double amount[3],
                     uint32_t from[3], uint32_t to[3]) {
  const size_t last = lattice->n_codes - 1;
  for (int c = 0; c < 3; ++c) {
    to[c] = (uint32_t)first_at_least(lattice->amount[c], last, amount[c]);
    from[c] = to[c] > 0 ? to[c] - 1 : 0;
  }
}

/* root' root = H / 2, with H made positive where it is not. */
static void factor(const double h[9], double root[9]) {
  const double size = fabs(h[0]) + fabs(h[4]) + fabs(h[8]);
  for (double shift = 0;; shift = shift > 0 ? 4 * shift : 1e-9 * size) {
    bool positive = true;
    memset(root, 0, 9 * sizeof *root);
    for (int i = 0; i < 3 && positive; ++i) {
      for (int k = i; k < 3; ++k) {
        double sum = h[3 * i + k] / 2 + (i == k ? shift : 0);
        for (int q = 0; q < i; ++q) sum -= root[3 * q + i] * root[3 * q + k];
        if (i == k) {
          positive = sum > 1e-12 * size;
          root[4 * i] = positive ? sqrt(sum) : 1;
        } else {
          root[3 * i + k] = sum / root[4 * i];
        }
      }
    }
    if (positive) return;
    if (!(size > 0) || !isfinite(size)) {
      memset(root, 0, 9 * sizeof *root);
      root[0] = root[4] = root[8] = 1;
      return;
    }
  }
}

/* Around one local minimum of the difference; false when something may have
 * been missed. */
static bool search_around(walk *w, const double best[3]) {
  ef__place place;
  uint32_t from[3], to[3];
  memcpy(place.amount, best, sizeof place.amount);
  ef__search_expand(w->search, &place);
  w->best = best;
  w->floor = place.square;
  w->n_points = 0;
  ef__cell_around(w->lattice, best, from, to);
  try_box(w, from, to);
  if (w->least > TRUSTED * TRUSTED) {
    return ef__search_cells(w->search, w->lattice, &place, w->least_code,
                            &w->least);
  }
  for (int i = 0; i < 3; ++i) {
    /* At a minimum in the box the slope of a free amount is 0. */
    const bool held = best[i] <= 0 || best[i] >= 1;
    w->gradient[i] = held ? place.gradient[i] : 0;
  }
  factor(place.hessian, w->root);
  walk_channel(w, 2, 0);
  return w->n_points < MOST_POINTS;
}

void ef__quantise(ef__search *search, const ef__lattice *lattice,
                  const ef__minima *minima, uint32_t code[3], double *square) {
  walk w = {.search = search, .lattice = lattice, .least = (double)INFINITY};
  bool whole = true;
  if (lattice->n_codes <= EXHAUSTIVE_CODES) {
    const uint32_t last = (uint32_t)(lattice->n_codes - 1);
    try_box(&w, (uint32_t[3]){0, 0, 0}, (uint32_t[3]){last, last, last});
  } else {
    for (size_t i = 0; i < minima->n; ++i) {
      /* A minimum that is above a lattice point has none below it around. */
      if (minima->at[i].square < w.least) {
        whole = search_around(&w, minima->at[i].amount) && whole;
      }
    }
  }
  /* Of a target darker than black no start is sure to lead into the best of
   * the narrow basins near the axis. */
  const bool is_below_black = search->target[0] < 0;
  if ((!whole || is_below_black) &&
      ef__boxes_apply(search->mixing, search->metric)) {
    ef__search_boxes(search, lattice, w.least_code, &w.least);
  }
  memcpy(code, w.least_code, sizeof w.least_code);
  *square = w.least;
}
