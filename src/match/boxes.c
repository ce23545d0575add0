/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The best code values by halving boxes of them: a box of codes whose colours
 * are all known to differ by more than codes at hand is left out. The colours
 * of a box of amounts have L*, a*, b* in ranges that follow from the signs of
 * their slopes; the formula bounds its difference over such ranges. That much
 * is proved. Where the formula is smooth over the box a bound to second order
 * is closer; it allows for BEND times the second derivatives in the middle.
 * tests/laws/law_match_codes.c has tried both on random boxes. */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

#include "difference/range.h"

/* ---- Colours of a box --------------------------------------------------- */

/* The function of ISO/CIE 11664-4. */
static double compress(double ratio) {
  const double join = 24.0 / 116;
  return ratio > join * join * join ? cbrt(ratio)
                                    : 841.0 / 108 * ratio + 16.0 / 116;
}

/* Its slope where it has this value; it falls with the value. */
static double slope_at(double f) {
  return f > 24.0 / 116 ? 1 / (3 * f * f) : 841.0 / 108;
}

/* X / X_n, Y / Y_n or Z / Z_n as a function of the amounts. */
typedef struct ratio {
  double black, slope[3];
} ratio;

static ratio ratio_of(const ef__mixing *mixing, int row, double white) {
  ratio r = {.black = mixing->black[row] / white};
  for (int c = 0; c < 3; ++c) {
    r.slope[c] = mixing->vector[3 * row + c] / white;
  }
  return r;
}

static double ratio_at(const ratio *r, const double a[3]) {
  return r->black + r->slope[0] * a[0] + r->slope[1] * a[1] +
         r->slope[2] * a[2];
}

/* f of the ratio over the box. */
static ef__range compressed_range(const ratio *r, const double from[3],
                                  const double to[3]) {
  double low[3], high[3];
  for (int c = 0; c < 3; ++c) {
    const bool up = r->slope[c] >= 0;
    low[c] = up ? from[c] : to[c];
    high[c] = up ? to[c] : from[c];
  }
  return (ef__range){compress(ratio_at(r, low)), compress(ratio_at(r, high))};
}

/* f(u) - f(w). Along an amount in which its slope has one sign over the box it
 * runs from end to end; along others it is within the largest slope, to both
 * sides, of its value in the middle. */
static ef__range difference_range(const ratio *u, ef__range f_u, const ratio *w,
                                  ef__range f_w, const double from[3],
                                  const double to[3]) {
  const ef__range u_slope = {slope_at(f_u.high), slope_at(f_u.low)};
  const ef__range w_slope = {slope_at(f_w.high), slope_at(f_w.low)};
  double low[3], high[3], either = 0;
  for (int c = 0; c < 3; ++c) {
    const double p = u->slope[c], q = w->slope[c];
    const double least = p * (p > 0 ? u_slope.low : u_slope.high) -
                         q * (q > 0 ? w_slope.high : w_slope.low);
    const double most = p * (p > 0 ? u_slope.high : u_slope.low) -
                        q * (q > 0 ? w_slope.low : w_slope.high);
    low[c] = most <= 0 ? to[c] : from[c];
    high[c] = most <= 0 ? from[c] : to[c];
    if (least < 0 && most > 0) {
      low[c] = high[c] = (from[c] + to[c]) / 2;
      either += fmax(-least, most) * (to[c] - from[c]) / 2;
    }
  }
  return (ef__range){
      compress(ratio_at(u, low)) - compress(ratio_at(w, low)) - either,
      compress(ratio_at(u, high)) - compress(ratio_at(w, high)) + either};
}

typedef struct colours {
  ratio x, y, z;
} colours;

static colours colours_of(const ef__mixing *mixing) {
  const ef_xyz white = mixing->conditions.white;
  return (colours){ratio_of(mixing, 0, white.X), ratio_of(mixing, 1, white.Y),
                   ratio_of(mixing, 2, white.Z)};
}

static void lab_ranges(const colours *k, const double from[3],
                       const double to[3], double low[3], double high[3]) {
  const ef__range f_x = compressed_range(&k->x, from, to);
  const ef__range f_y = compressed_range(&k->y, from, to);
  const ef__range f_z = compressed_range(&k->z, from, to);
  const ef__range a = difference_range(&k->x, f_x, &k->y, f_y, from, to);
  const ef__range b = difference_range(&k->y, f_y, &k->z, f_z, from, to);
  low[0] = 116 * f_y.low - 16;
  high[0] = 116 * f_y.high - 16;
  low[1] = 500 * a.low;
  high[1] = 500 * a.high;
  low[2] = 200 * b.low;
  high[2] = 200 * b.high;
}

/* ---- Bounds ------------------------------------------------------------- */

/* What a bound to second order allows for: so many times the second derivatives
 * in the middle of the box, and, where these happen to vanish, such a share of
 * the square for the square of the angle under which half the box is seen from
 * the neutral axis. None of 840 000 random boxes is bounded too high; with half
 * of both, or without the latter, some are. */
#define BEND 2.0
#define TURN 0.25

/* True when second derivatives do not change much over the box: seen from the
 * neutral axis it is small (`angle`: half of it, radians), and no hue in it is
 * opposite to the target's. */
static bool is_smooth(const double target[3], const double low[3],
                      const double high[3], double *angle) {
  const ef__range a = {low[1], high[1]}, b = {low[2], high[2]};
  const ef__range chroma = ef__range_chroma(a, b);
  const double size = sqrt((a.high - a.low) * (a.high - a.low) +
                           (b.high - b.low) * (b.high - b.low));
  if (chroma.low < 4 * size)
    return false;
  *angle = size / (2 * chroma.low);
  int n_left = 0;
  bool is_ahead = false;
  for (int corner = 0; corner < 4; ++corner) {
    const double p = corner & 1 ? a.high : a.low;
    const double q = corner & 2 ? b.high : b.low;
    n_left += target[1] * q - target[2] * p > 0;
    is_ahead = is_ahead || target[1] * p + target[2] * q > 0;
  }
  return n_left == 0 || n_left == 4 || is_ahead;
}

/* From the middle of the box down along every slope, less what bends. */
static double second_order_bound(ef__search *search, const double from[3],
                                 const double to[3], double angle) {
  ef__place middle;
  double half[3];
  for (int c = 0; c < 3; ++c) {
    middle.amount[c] = (from[c] + to[c]) / 2;
    half[c] = (to[c] - from[c]) / 2;
  }
  ef__search_expand(search, &middle);
  double square = middle.square * (1 - TURN * angle * angle);
  for (int c = 0; c < 3; ++c) {
    const double *const row = middle.hessian + 3 * c;
    const double bend = fabs(row[0]) * half[0] + fabs(row[1]) * half[1] +
                        fabs(row[2]) * half[2];
    square -= half[c] * (fabs(middle.gradient[c]) + BEND / 2 * bend);
  }
  return square > 0 ? sqrt(square) : 0;
}

/* What rounding may have added to a bound. */
static double less_rounding(double bound) {
  return bound * (1 - 1e-9) - 1e-9;
}

/* At least `enough` is enough. */
static double bound_over(ef__search *search, const colours *k,
                         const double from[3], const double to[3],
                         double enough) {
  double low[3], high[3];
  const ef_metric *const metric = search->metric;
  lab_ranges(k, from, to, low, high);
  const double bound =
      less_rounding(metric->least(metric, search->target, low, high));
  double angle;
  if (bound >= enough || !is_smooth(search->target, low, high, &angle)) {
    return bound;
  }
  return fmax(bound,
              less_rounding(second_order_bound(search, from, to, angle)));
}

double ef__least_over(ef__search *search, const double from[3],
                      const double to[3], double enough) {
  const colours k = colours_of(search->mixing);
  return bound_over(search, &k, from, to, enough);
}

/* ---- The search --------------------------------------------------------- */

typedef struct box {
  uint32_t from[3], to[3];
} box;

typedef struct halving {
  ef__search *search;
  const ef__lattice *lattice;
  colours colours;
  uint32_t *code;
  double square, least; /* of the best codes, and its root */
} halving;

static void try_codes(halving *h, const box *b) {
  const ef__lattice *const lattice = h->lattice;
  uint32_t at[3];
  for (at[0] = b->from[0]; at[0] <= b->to[0]; ++at[0]) {
    for (at[1] = b->from[1]; at[1] <= b->to[1]; ++at[1]) {
      for (at[2] = b->from[2]; at[2] <= b->to[2]; ++at[2]) {
        const double amount[3] = {lattice->amount[0][at[0]],
                                  lattice->amount[1][at[1]],
                                  lattice->amount[2][at[2]]};
        const double square = ef__search_value(h->search, amount);
        if (!(square < h->square))
          continue;
        h->square = square;
        h->least = sqrt(square);
        memcpy(h->code, at, sizeof at);
      }
    }
  }
}

static double bound_of(const halving *h, const box *b) {
  double from[3], to[3];
  for (int c = 0; c < 3; ++c) {
    from[c] = h->lattice->amount[c][b->from[c]];
    to[c] = h->lattice->amount[c][b->to[c]];
  }
  return bound_over(h->search, &h->colours, from, to, h->least);
}

static void search_box(halving *h, const box *b, double bound) {
  uint32_t side = 0;
  int longest = 0;
  if (bound >= h->least)
    return;
  for (int c = 0; c < 3; ++c) {
    if (b->to[c] - b->from[c] < side)
      continue;
    side = b->to[c] - b->from[c];
    longest = c;
  }
  if (side <= 1) {
    try_codes(h, b);
    return;
  }
  box lower = *b, upper = *b;
  lower.to[longest] = b->from[longest] + side / 2;
  upper.from[longest] = lower.to[longest] + 1;
  const double of_lower = bound_of(h, &lower), of_upper = bound_of(h, &upper);
  if (of_lower <= of_upper) {
    search_box(h, &lower, of_lower);
    search_box(h, &upper, of_upper);
  } else {
    search_box(h, &upper, of_upper);
    search_box(h, &lower, of_lower);
  }
}

bool ef__boxes_apply(const ef__mixing *mixing, const ef_metric *metric) {
  return mixing->affine && metric->least != NULL &&
         metric->coordinates == ef__lab_coordinates;
}

void ef__search_boxes(ef__search *search, const ef__lattice *lattice,
                      uint32_t code[3], double *square) {
  halving h = {.search = search,
               .lattice = lattice,
               .colours = colours_of(search->mixing),
               .code = code,
               .square = *square,
               .least = sqrt(*square)};
  const uint32_t last = (uint32_t)(lattice->n_codes - 1);
  search_box(&h, &(box){{0, 0, 0}, {last, last, last}}, 0);
  *square = h.square;
}
