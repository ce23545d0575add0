/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The best code values far from the target, where the amounts S with less than
 * the best squared difference f known have no simple form: long, bent, cut off
 * by a bound. S is filled cell by cell of the lattice, from a minimum in the
 * box. In a cell f differs from the interpolation between its corners by at
 * most
 *   e = sum over the channels of h^2 |d2f/da2| / 8
 * (h: edge of the cell), and likewise in each of its faces, so that a face that
 * meets S has a corner below f + e. Cells that S leads through follow each
 * other by such faces: who looks at all neighbours, across corners too, of
 * every lattice point below f + e passes through all of S. */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

/* Second derivatives in the cells passed through may be this much larger than
 * at the minimum. */
#define MARGIN 2.0

/* Some 23 points are tried on average (srgb, 8 bits, targets anywhere out of
 * gamut); 98 % need no more than FEW. Where MANY do not do, e is too large for
 * the method: its lattice is too coarse for the bends of the formula. */
enum { FEW = 640, FEW_SLOTS = 1024, MANY = 2600, MANY_SLOTS = 4096 };

typedef struct filling {
  ef__search *search;
  const ef__lattice *lattice;
  uint32_t *best; /* codes, and their f */
  double least;
  double bend[3];  /* MARGIN / 8 of the second derivatives */
  double slope[3]; /* left over at a jump or kink */
  bool stays[3];   /* channels in which S does not leave the bound */
  size_t most_points, n_points;
  size_t n_open;
  struct {
    uint16_t code[3];
    double square;
  } open[MANY]; /* to look around from */
  size_t n_slots;
  uint64_t tried[MANY_SLOTS]; /* codes of the points; 0: empty */
} filling;

/* True when the codes were not there yet. */
static bool note_codes(filling *f, const uint32_t code[3]) {
  const uint64_t key =
      ((uint64_t)code[0] << 32 | (uint64_t)code[1] << 16 | code[2]) + 1;
  /* Fibonacci hashing: 2^64 over the golden ratio. */
  size_t slot = (size_t)(key * UINT64_C(0x9E3779B97F4A7C15) >> 32);
  for (slot %= f->n_slots; f->tried[slot] != 0;
       slot = (slot + 1) % f->n_slots) {
    if (f->tried[slot] == key)
      return false;
  }
  f->tried[slot] = key;
  return true;
}

/* Step from these codes to the next ones of a channel, the longer of the two.
 */
static double spacing(const filling *f, int channel, uint32_t code) {
  const double *const a = f->lattice->amount[channel] + code;
  const double below = code > 0 ? a[0] - a[-1] : 0;
  const double above = code + 1 < f->lattice->n_codes ? a[1] - a[0] : 0;
  return below > above ? below : above;
}

/* e at these codes. */
static double slack(const filling *f, const uint32_t code[3]) {
  double sum = 0;
  for (int c = 0; c < 3; ++c) {
    if (f->stays[c])
      continue;
    const double h = spacing(f, c, code[c]);
    sum += (f->bend[c] * h + f->slope[c]) * h;
  }
  return sum;
}

static void try_point(filling *f, const uint32_t code[3]) {
  if (f->n_points == f->most_points || !note_codes(f, code))
    return;
  const double amount[3] = {f->lattice->amount[0][code[0]],
                            f->lattice->amount[1][code[1]],
                            f->lattice->amount[2][code[2]]};
  const double square = ef__search_value(f->search, amount);
  ++f->n_points;
  if (square < f->least) {
    f->least = square;
    memcpy(f->best, code, 3 * sizeof *code);
  }
  if (square > f->least + slack(f, code))
    return;
  for (int c = 0; c < 3; ++c) {
    f->open[f->n_open].code[c] = (uint16_t)code[c];
  }
  f->open[f->n_open++].square = square;
}

static void try_box(filling *f, const uint32_t from[3], const uint32_t to[3]) {
  uint32_t at[3];
  for (at[0] = from[0]; at[0] <= to[0]; ++at[0]) {
    for (at[1] = from[1]; at[1] <= to[1]; ++at[1]) {
      for (at[2] = from[2]; at[2] <= to[2]; ++at[2])
        try_point(f, at);
    }
  }
}

static void try_around(filling *f, const uint32_t code[3]) {
  uint32_t from[3], to[3];
  for (int c = 0; c < 3; ++c) {
    const bool last = code[c] + 1 == f->lattice->n_codes;
    from[c] = f->stays[c] || code[c] == 0 ? code[c] : code[c] - 1;
    to[c] = f->stays[c] || last ? code[c] : code[c] + 1;
  }
  try_box(f, from, to);
}

/* Where an amount sits at a bound and the first step away from it costs more
 * than twice what S has room for, all of S lies within that step, and falls to
 * the bound. */
static bool stays_at_bound(const filling *f, const ef__place *minimum, int c,
                           uint32_t code) {
  const bool at_bound = minimum->amount[c] <= 0 || minimum->amount[c] >= 1;
  const double room = f->least - minimum->square;
  return at_bound && f->slope[c] <= 0 &&
         fabs(minimum->gradient[c]) * spacing(f, c, code) > 2 * room;
}

static void fill(filling *f, const ef__place *minimum) {
  uint32_t from[3], to[3], code[3];
  ef__cell_around(f->lattice, minimum->amount, from, to);
  for (int c = 0; c < 3; ++c) {
    const uint32_t bound = minimum->amount[c] <= 0 ? from[c] : to[c];
    f->stays[c] = stays_at_bound(f, minimum, c, bound);
    if (f->stays[c])
      from[c] = to[c] = bound;
  }
  f->n_points = f->n_open = 0;
  memset(f->tried, 0, f->n_slots * sizeof f->tried[0]);
  try_box(f, from, to);
  while (f->n_open > 0) {
    --f->n_open;
    for (int c = 0; c < 3; ++c)
      code[c] = f->open[f->n_open].code[c];
    /* The best may have become less since. */
    if (f->open[f->n_open].square > f->least + slack(f, code))
      continue;
    try_around(f, code);
  }
}

/* At the edge of a jump S is a wedge that hardly a lattice point comes near. */
static bool is_at_jump(const filling *f, const ef__place *minimum) {
  uint32_t from[3], to[3];
  double climb = 0;
  ef__cell_around(f->lattice, minimum->amount, from, to);
  for (int c = 0; c < 3; ++c)
    climb += f->slope[c] * spacing(f, c, to[c]);
  return climb > f->least - minimum->square;
}

bool ef__search_cells(ef__search *search, const ef__lattice *lattice,
                      const ef__place *minimum, uint32_t code[3],
                      double *square) {
  filling f; /* 75 kB, of which little is touched */
  f.search = search;
  f.lattice = lattice;
  f.best = code;
  f.least = *square;
  for (int c = 0; c < 3; ++c) {
    const double a = minimum->amount[c], slope = minimum->gradient[c];
    const bool held = (a <= 0 && slope >= 0) || (a >= 1 && slope <= 0);
    f.slope[c] = held ? 0 : fabs(slope);
    f.bend[c] = MARGIN / 8 * fabs(minimum->hessian[4 * c]);
  }
  if (ef__boxes_apply(search->mixing, search->metric) &&
      is_at_jump(&f, minimum)) {
    return false;
  }
  f.most_points = FEW;
  f.n_slots = FEW_SLOTS;
  fill(&f, minimum);
  if (f.n_points == FEW) {
    f.most_points = MANY;
    f.n_slots = MANY_SLOTS;
    fill(&f, minimum);
  }
  *square = f.least;
  return f.n_points < f.most_points;
}
