/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Linear programmes of this folder. One by itself is solved on a tableau, with
 * proof. One of a series, and what could not be proved, goes to the solver of
 * src/base, whose answer is brought back onto the rows: it lets a variable be
 * outside its limits by a little and then puts it on them, which a silent
 * receptor would hear. */
#include <float.h>
#include <math.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

/* right - A x, and the largest of it relative to the terms it is a sum of. */
static double residual_of(const ef__table *t, const double *x, double *out) {
  double worst = 0;
  for (size_t i = 0; i < t->n_rows; ++i) {
    double size = fabs(t->right[i]);
    out[i] = t->right[i];
    for (size_t j = 0; j < t->n_columns; ++j) {
      const double term = t->row[i * t->n_columns + j] * x[j];
      out[i] -= term;
      size += fabs(term);
    }
    if (size > 0)
      worst = fmax(worst, fabs(out[i]) / size);
  }
  return worst;
}

/* A correction of x in proportion to each variable's distance from its limits,
 * so that what stands at one stays there: W A' (A W A')^-1 residual. */
static bool correct(const ef__table *t, const double *residual, double *x) {
  const size_t m = t->n_rows, n = t->n_columns;
  double weight[EF__TABLE_COLUMNS], price[EF__TABLE_ROWS];
  double square[EF__TABLE_ROWS * EF__TABLE_ROWS];
  for (size_t j = 0; j < n; ++j)
    weight[j] = fmin(x[j] - t->low[j], t->high[j] - x[j]);
  for (size_t i = 0; i < m; ++i) {
    for (size_t k = 0; k < m; ++k) {
      square[i * m + k] = 0;
      for (size_t j = 0; j < n; ++j)
        square[i * m + k] += t->row[i * n + j] * weight[j] * t->row[k * n + j];
    }
  }
  memcpy(price, residual, m * sizeof *price);
  if (!ef__solve(m, square, 1, price))
    return false;
  for (size_t j = 0; j < n; ++j) {
    for (size_t i = 0; i < m; ++i)
      x[j] += weight[j] * t->row[i * n + j] * price[i];
    x[j] = fmin(fmax(x[j], t->low[j]), t->high[j]);
  }
  return true;
}

void ef__table_bring_onto_rows(const ef__table *t, double *x) {
  enum { MOST_PASSES = 3 };
  double residual[EF__TABLE_ROWS], better[EF__TABLE_COLUMNS];
  double worst = residual_of(t, x, residual);
  for (int pass = 0; pass < MOST_PASSES && worst > 2 * DBL_EPSILON; ++pass) {
    memcpy(better, x, t->n_columns * sizeof *better);
    if (!correct(t, residual, better))
      return;
    const double now = residual_of(t, better, residual);
    if (!(now < worst))
      return;
    worst = now;
    memcpy(x, better, t->n_columns * sizeof *x);
  }
}

static double gain_of(const ef__table *t, const double *x) {
  double sum = 0;
  for (size_t j = 0; j < t->n_columns; ++j)
    sum += t->gain[j] * x[j];
  return sum;
}

ef__simplex_end ef__table_solve_next(const ef__table *t, ef__simplex *simplex,
                                     double *x, double *value) {
  double column[EF__TABLE_ROWS * EF__TABLE_COLUMNS];
  for (size_t i = 0; i < t->n_rows; ++i) {
    for (size_t j = 0; j < t->n_columns; ++j)
      column[j * t->n_rows + i] = t->row[i * t->n_columns + j];
  }
  const ef__programme programme = {.n_rows = t->n_rows,
                                   .n_columns = t->n_columns,
                                   .column = column,
                                   .right = t->right,
                                   .low = t->low,
                                   .high = t->high};
  ef__simplex_set_slack(simplex, 1e-13);
  const ef__simplex_end end =
      ef__simplex_maximise(simplex, &programme, t->gain, x, NULL);
  if (end != EF__SIMPLEX_BEST)
    return end;
  ef__table_bring_onto_rows(t, x);
  *value = gain_of(t, x);
  return end;
}

ef__simplex_end ef__table_solve(const ef__table *t, ef__simplex *simplex,
                                double *x, double *value) {
  if (ef__tableau_solve(t, x)) {
    *value = gain_of(t, x);
    return EF__SIMPLEX_BEST;
  }
  ef__simplex_restart(simplex);
  return ef__table_solve_next(t, simplex, x, value);
}
