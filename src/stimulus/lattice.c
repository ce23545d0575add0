/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Places of a lattice of code values inside an ellipsoid, one primary after the
 * other (Fincke & Pohst 1985, doi 10.1090/S0025-5718-1985-0777278-8), in each
 * from the middle outwards (Schnorr & Euchner 1994), so that good places come
 * early and the bound shrinks. Steps between codes are uneven (tone curves). */
#include <float.h>
#include <math.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

enum { N = EF_MAX_DRIVES };

/* ---- Amounts of codes ---------------------------------------------------- */

ef_status ef__codes_new(const ef_device *device, int bits, ef__codes **out,
                        ef_error *error) {
  const size_t n = ef_device_n_drives(device);
  const size_t n_codes = (size_t)1 << bits;
  ef__codes *codes = NULL;
  double *amount = NULL;
  const ef__part parts[] = {{&codes, 1, sizeof *codes},
                            {&amount, n * n_codes, sizeof *amount}};
  if (ef__allocate_block(2, parts) == NULL)
    return ef__error_memory(error, "code values");
  for (size_t i = 0; i < n; ++i) {
    for (size_t k = 0; k < n_codes; ++k) {
      const double drive = (double)k / (double)(n_codes - 1);
      amount[i * n_codes + k] = ef_device_amount(device, i, drive, NULL);
    }
  }
  *codes = (ef__codes){n, n_codes, amount};
  *out = codes;
  return EF_OK;
}

/* First code whose amount is at least `amount`; the last when none is. */
static uint32_t first_at_least(const ef__codes *codes, size_t i,
                               double amount) {
  const double *const row = codes->amount + i * codes->n_codes;
  size_t low = 0, high = codes->n_codes - 1;
  while (low < high) {
    const size_t middle = low + (high - low) / 2;
    if (row[middle] < amount) {
      low = middle + 1;
    } else {
      high = middle;
    }
  }
  return (uint32_t)low;
}

uint32_t ef__codes_below(const ef__codes *codes, size_t i, double amount) {
  const double *const row = codes->amount + i * codes->n_codes;
  const uint32_t up = first_at_least(codes, i, amount);
  return up > 0 && row[up] > amount ? up - 1 : up;
}

uint32_t ef__codes_round(const ef__codes *codes, size_t i, double amount) {
  const double *const row = codes->amount + i * codes->n_codes;
  const uint32_t up = first_at_least(codes, i, amount);
  return up > 0 && amount - row[up - 1] < row[up] - amount ? up - 1 : up;
}

/* ---- The walk ------------------------------------------------------------ */

void ef__walk_set_root(ef__walk *walk, const double *matrix) {
  const size_t n = walk->codes->n;
  double *const r = walk->root;
  memset(r, 0, sizeof walk->root);
  for (size_t i = 0; i < n; ++i) {
    for (size_t j = i; j < n; ++j) {
      double sum = matrix[i * n + j];
      for (size_t k = 0; k < i; ++k)
        sum -= r[k * n + i] * r[k * n + j];
      if (i == j) {
        const double least = 16 * DBL_EPSILON * matrix[i * n + i];
        r[i * n + i] = sqrt(fmax(sum, fmax(least, DBL_MIN)));
      } else {
        r[i * n + j] = sum / r[i * n + i];
      }
    }
  }
}

typedef struct place {
  uint32_t code[N];
  double amount[N];
  size_t n_places;
} place;

static void visit(ef__walk *w, place *p, double square) {
  w->bound = w->visit(w->context, p->code, p->amount, square);
}

static void walk_primary(ef__walk *w, place *p, size_t i, double used) {
  const size_t n = w->codes->n;
  const double *const row = w->root + i * n;
  const double *const amount = w->codes->amount + i * w->codes->n_codes;
  double shift = 0;
  for (size_t k = i + 1; k < n; ++k)
    shift += row[k] * (p->amount[k] - w->centre[k]);
  const double middle = w->centre[i] - shift / row[i];
  /* The next code above and below; the nearer one goes first. */
  uint32_t up = first_at_least(w->codes, i, middle);
  if (amount[up] < middle)
    ++up; /* beyond the last */
  if (up < w->first[i])
    up = w->first[i];
  if (up > w->last[i] + 1)
    up = w->last[i] + 1;
  uint32_t down = up; /* one more than the next one below */
  while (p->n_places < w->most_places) {
    const double above =
        up <= w->last[i] ? fabs(amount[up] - middle) : HUGE_VAL;
    const double below =
        down > w->first[i] ? fabs(amount[down - 1] - middle) : HUGE_VAL;
    const double off = row[i] * fmin(above, below);
    const double total = used + off * off;
    if (!(total < w->bound))
      return;
    ++p->n_places;
    p->code[i] = above <= below ? up++ : --down;
    p->amount[i] = amount[p->code[i]];
    if (i > 0) {
      walk_primary(w, p, i - 1, total);
    } else {
      visit(w, p, total);
    }
  }
}

void ef__walk_run(ef__walk *walk) {
  place p = {.n_places = 0};
  walk_primary(walk, &p, walk->codes->n - 1, 0);
}
