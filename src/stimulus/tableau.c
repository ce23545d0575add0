/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The dual simplex method on a whole table (Lemke 1954), which suits programmes
 * of a few rows: since all limits are finite, any basis is optimal once each
 * column off it rests at the limit that its gain favours, and what is left is
 * to bring the basic columns within theirs. On the way columns may change sides
 * in passing (the long step of Fourer 1994), so that two or three exchanges do.
 * What comes out is checked by its prices: no x gains more than they allow. */
#include <float.h>
#include <math.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

enum {
  ROWS = EF__TABLE_ROWS,
  LANES = 4, /* rows are padded to a multiple of this with zeros */
  STRIDE = (EF__TABLE_COLUMNS + 1 + LANES - 1) / LANES * LANES
};

/* Rows solved for their basic columns; the right sides follow the columns. */
typedef struct tableau {
  const ef__table *table;
  size_t m, n, stride;
  double row[(ROWS + 1) * STRIDE]; /* the last is the gains */
  double x[EF__TABLE_COLUMNS];     /* off the basis; 0 in it */
  double value[ROWS];              /* of basic columns */
  size_t basis[ROWS];
} tableau;

/* Solves row r for column j. */
static void exchange(tableau *t, size_t r, size_t j) {
  double *const pivot = t->row + r * t->stride;
  const double scale = 1 / pivot[j];
  for (size_t k = 0; k < t->stride; k += LANES) {
    for (size_t c = 0; c < LANES; ++c)
      pivot[k + c] *= scale;
  }
  pivot[j] = 1;
  for (size_t i = 0; i <= t->m; ++i) {
    double *const row = t->row + i * t->stride;
    const double factor = row[j];
    if (i == r || factor == 0)
      continue;
    for (size_t k = 0; k < t->stride; k += LANES) {
      for (size_t c = 0; c < LANES; ++c)
        row[k + c] -= factor * pivot[k + c];
    }
    row[j] = 0;
  }
  t->basis[r] = j;
}

static void copy_rows(const ef__table *table, tableau *t) {
  const size_t m = table->n_rows, n = table->n_columns;
  t->table = table;
  t->m = m;
  t->n = n;
  t->stride = (n + LANES) / LANES * LANES;
  for (size_t i = 0; i <= m; ++i) {
    double *const row = t->row + i * t->stride;
    memcpy(row, i < m ? table->row + i * n : table->gain, n * sizeof *row);
    memset(row + n, 0, (t->stride - n) * sizeof *row);
    row[n] = i < m ? table->right[i] : 0;
  }
}

/* Each row for the column that can move it most, which needs no other to come
 * within its limits soon. False when a row is all but the sum of others. */
static bool choose_basis(tableau *t) {
  for (size_t i = 0; i < t->m; ++i) {
    const double *const row = t->row + i * t->stride;
    double most = 0;
    size_t best = t->n;
    for (size_t j = 0; j < t->n; ++j) {
      const double range = t->table->high[j] - t->table->low[j];
      const double move = fabs(row[j]) * range;
      if (!(move > most))
        continue;
      most = move;
      best = j;
    }
    if (best == t->n || !(fabs(row[best]) > 1e-9))
      return false;
    exchange(t, i, best);
  }
  return true;
}

/* Puts the columns off the basis where their gains want them. */
static void settle(tableau *t) {
  const ef__table *const p = t->table;
  const double *const gain = t->row + t->m * t->stride;
  for (size_t j = 0; j < t->n; ++j)
    t->x[j] = gain[j] > 0 ? p->high[j] : p->low[j];
  for (size_t i = 0; i < t->m; ++i)
    t->x[t->basis[i]] = 0;
  for (size_t i = 0; i < t->m; ++i) {
    const double *const row = t->row + i * t->stride;
    double sum = row[t->n];
    for (size_t j = 0; j < t->n; ++j)
      sum -= row[j] * t->x[j];
    t->value[i] = sum;
  }
}

/* The row whose basic column is outside its limits by most, m when none is; by
 * how much, negative below. */
static size_t leaving(const tableau *t, double *off) {
  size_t worst = t->m;
  double most = 0;
  for (size_t i = 0; i < t->m; ++i) {
    const size_t j = t->basis[i];
    const double low = t->table->low[j], high = t->table->high[j];
    const double out = t->value[i] < low ? t->value[i] - low
                                         : fmax(0, t->value[i] - high);
    if (!(fabs(out) > most) || !(fabs(out) > 1e-14 * (high - low)))
      continue;
    most = fabs(out);
    worst = i;
    *off = out;
  }
  return worst;
}

static void flip(tableau *t, size_t j) {
  const double low = t->table->low[j], high = t->table->high[j];
  const double to = t->x[j] == low ? high : low, way = to - t->x[j];
  for (size_t i = 0; i < t->m; ++i)
    t->value[i] -= t->row[i * t->stride + j] * way;
  t->x[j] = to;
}

/* The column that takes the place of the basic one of row r, which is `off` its
 * limit: those whose gain changes its sign earlier change sides, as long as
 * that does not bring it there. n when all of them do not. */
static size_t entering(tableau *t, size_t r, double off) {
  const ef__table *const p = t->table;
  const double *const row = t->row + r * t->stride;
  const double *const gain = t->row + t->m * t->stride;
  const double side = off < 0 ? 1 : -1;
  double at[EF__TABLE_COLUMNS];
  size_t column[EF__TABLE_COLUMNS], count = 0;
  for (size_t j = 0; j < t->n; ++j) {
    const double pull = side * row[j];
    if (j == t->basis[r] || fabs(pull) < 1e-11 || p->low[j] == p->high[j])
      continue;
    if ((t->x[j] == p->low[j]) != (pull < 0))
      continue;
    at[count] = gain[j] / pull;
    column[count++] = j;
  }
  double room = fabs(off);
  while (count > 0) {
    size_t next = 0;
    for (size_t k = 1; k < count; ++k)
      next = at[k] < at[next] ? k : next;
    const size_t j = column[next];
    const double change = fabs(row[j]) * (p->high[j] - p->low[j]);
    if (change >= room)
      return j;
    room -= change;
    flip(t, j);
    at[next] = at[--count];
    column[next] = column[count];
  }
  return t->n;
}

/* Column j enters; the basic one of row r stays at the limit it is beyond. */
static void step(tableau *t, size_t r, size_t j) {
  const size_t out = t->basis[r];
  const double low = t->table->low[out], high = t->table->high[out];
  const double limit = t->value[r] < low ? low : high;
  const double way = (t->value[r] - limit) / t->row[r * t->stride + j];
  for (size_t i = 0; i < t->m; ++i)
    t->value[i] -= t->row[i * t->stride + j] * way;
  t->value[r] = t->x[j] + way;
  t->x[out] = limit;
  t->x[j] = 0;
  exchange(t, r, j);
}

/* ---- Proof -------------------------------------------------------------- */

/* Prices of the rows, by the basis alone. */
static bool price(const tableau *t, double *dual) {
  const size_t m = t->m;
  double matrix[ROWS * ROWS];
  for (size_t k = 0; k < m; ++k) {
    for (size_t i = 0; i < m; ++i)
      matrix[k * m + i] = t->table->row[i * t->n + t->basis[k]];
    dual[k] = t->table->gain[t->basis[k]];
  }
  return ef__solve(m, matrix, 1, dual);
}

/* True when x keeps the rows and gains what no other can exceed, both to the
 * rounding of the terms that are added. */
static bool is_best(const tableau *t, const double *x) {
  const ef__table *const p = t->table;
  double dual[ROWS], bound = 0, size = 0;
  if (!price(t, dual))
    return false;
  for (size_t i = 0; i < t->m; ++i) {
    double off = p->right[i], terms = fabs(off);
    bound += dual[i] * p->right[i];
    size += fabs(dual[i] * p->right[i]);
    for (size_t j = 0; j < t->n; ++j) {
      const double term = p->row[i * t->n + j] * x[j];
      off -= term;
      terms += fabs(term);
    }
    if (!(fabs(off) <= 8 * DBL_EPSILON * terms))
      return false;
  }
  for (size_t j = 0; j < t->n; ++j) {
    double gain = p->gain[j];
    for (size_t i = 0; i < t->m; ++i)
      gain -= dual[i] * p->row[i * t->n + j];
    const double most = gain > 0 ? p->high[j] : p->low[j];
    bound += gain * most - p->gain[j] * x[j];
    size += fabs(gain * most) + fabs(p->gain[j] * x[j]);
  }
  return bound <= 1e-13 * size;
}

bool ef__tableau_solve(const ef__table *table, double *x) {
  tableau t;
  const size_t most_steps = 10 + 2 * (table->n_rows + table->n_columns);
  if (table->n_rows > ROWS)
    return false;
  copy_rows(table, &t);
  if (!choose_basis(&t))
    return false;
  settle(&t);
  for (size_t steps = 0;; ++steps) {
    double off = 0;
    const size_t r = leaving(&t, &off);
    if (r == t.m)
      break;
    const size_t j = entering(&t, r, off);
    if (j == t.n || steps == most_steps)
      return false;
    step(&t, r, j);
  }
  for (size_t i = 0; i < t.m; ++i) {
    const size_t j = t.basis[i];
    t.x[j] = fmin(fmax(t.value[i], table->low[j]), table->high[j]);
  }
  ef__table_bring_onto_rows(table, t.x);
  if (!is_best(&t, t.x))
    return false;
  memcpy(x, t.x, t.n * sizeof *x);
  return true;
}
