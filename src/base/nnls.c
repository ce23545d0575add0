/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Least squares with unknowns that may not be negative, and what reduces to it:
 * the least of a quadratic form under linear inequalities. C. L. Lawson & R. J.
 * Hanson, Solving Least Squares Problems (Prentice-Hall 1974), chapter 23:
 * algorithms NNLS (23.10) and LDP (23.27). */
#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

/* One problem, and the columns that are free (not held at zero), in the order
 * in which they came. */
typedef struct problem {
  size_t n_rows, n_columns;
  const double *a, *b;
  double *factor;   /* n_rows x n_columns, by column: reflected free columns */
  double *right;    /* n_rows, reflected with them */
  double *residual; /* n_rows */
  double diagonal[EF__NNLS_COLUMNS];
  double solution[EF__NNLS_COLUMNS]; /* of the free columns */
  size_t free[EF__NNLS_COLUMNS];
  size_t n_free;
} problem;

/* Rows that stay when many are folded: |A x - b| is that of the triangle and
 * of what it leaves of b. */
static size_t folded_rows(size_t n_rows, size_t n_columns) {
  return n_rows > 2 * (n_columns + 1) ? n_columns + 1 : n_rows;
}

size_t ef__nnls_scratch(size_t n_rows, size_t n_columns) {
  const size_t n_left = folded_rows(n_rows, n_columns);
  const size_t n_folded = n_left < n_rows ? n_rows * (n_columns + 1) : 0;
  return n_folded + n_left * (2 * n_columns + 3);
}

/* ---- Unconstrained least squares on the free columns -------------------- */

/* Reflects `vector` by the Householder vector of column k. */
static void reflect(const problem *p, size_t k, double *vector) {
  const double *v = p->factor + k * p->n_rows;
  double square = 0.0, product = 0.0;
  for (size_t r = k; r < p->n_rows; r++) {
    square += v[r] * v[r];
    product += v[r] * vector[r];
  }
  if (!(square > 0.0))
    return;
  const double twice = 2.0 * product / square;
  for (size_t r = k; r < p->n_rows; r++)
    vector[r] -= twice * v[r];
}

/* Reflects column `column` of A by the k columns before it and makes its own
 * reflection. False when it depends on them: what is left of it is rounding. */
static bool add_column(problem *p, size_t k, size_t column) {
  double *v = p->factor + k * p->n_rows;
  double whole = 0.0, rest = 0.0;
  for (size_t r = 0; r < p->n_rows; r++) {
    v[r] = p->a[r * p->n_columns + column];
    whole = hypot(whole, v[r]);
  }
  for (size_t i = 0; i < k; i++)
    reflect(p, i, v);
  for (size_t r = k; r < p->n_rows; r++)
    rest = hypot(rest, v[r]);
  /* Each of the reflections rounds every element once or twice. */
  const double rounding = 2.0 * (double)(k + 1) * DBL_EPSILON;
  if (k >= p->n_rows || !(rest > rounding * whole))
    return false;
  p->diagonal[k] = v[k] > 0.0 ? -rest : rest;
  v[k] -= p->diagonal[k];
  return true;
}

/* The reflections of column k are in place of what stood above its diagonal;
 * element (i, k) of the triangle for i < k is still there. */
static void solve_free(problem *p) {
  memcpy(p->right, p->b, p->n_rows * sizeof *p->right);
  for (size_t k = 0; k < p->n_free; k++)
    reflect(p, k, p->right);
  for (size_t k = p->n_free; k-- > 0;) {
    double sum = p->right[k];
    for (size_t i = k + 1; i < p->n_free; i++)
      sum -= p->factor[i * p->n_rows + k] * p->solution[i];
    p->solution[k] = sum / p->diagonal[k];
  }
}

static void factor_free(problem *p) {
  for (size_t k = 0; k < p->n_free; k++)
    add_column(p, k, p->free[k]); /* it was independent when it came */
}

/* ---- NNLS --------------------------------------------------------------- */

static bool is_free(const problem *p, size_t column) {
  for (size_t k = 0; k < p->n_free; k++)
    if (p->free[k] == column)
      return true;
  return false;
}

/* Residual b - A x, and its norm. */
static double take_residual(problem *p, const double *x) {
  double norm = 0.0;
  for (size_t r = 0; r < p->n_rows; r++) {
    double sum = p->b[r];
    for (size_t j = 0; j < p->n_columns; j++)
      sum -= p->a[r * p->n_columns + j] * x[j];
    p->residual[r] = sum;
    norm = hypot(norm, sum);
  }
  return norm;
}

/* A column's pull on the residual, 0 when it is no more than rounding. */
static double pull(const problem *p, size_t column) {
  double sum = 0.0, sizes = 0.0;
  for (size_t r = 0; r < p->n_rows; r++) {
    const double a = p->a[r * p->n_columns + column];
    sum += a * p->residual[r];
    sizes += fabs(a) * (fabs(p->b[r]) + fabs(p->b[r] - p->residual[r]));
  }
  const double rounding =
      (double)(p->n_rows + p->n_columns) * DBL_EPSILON * sizes;
  return sum > rounding ? sum : 0.0;
}

/* Frees the column with the greatest pull whose coefficient then is positive;
 * false when there is none: the answer stands. */
static bool free_one(problem *p) {
  bool refused[EF__NNLS_COLUMNS] = {false};
  for (;;) {
    size_t best = p->n_columns;
    double greatest = 0.0;
    for (size_t j = 0; j < p->n_columns; j++) {
      if (refused[j] || is_free(p, j))
        continue;
      const double w = pull(p, j);
      if (w > greatest) {
        greatest = w;
        best = j;
      }
    }
    if (best == p->n_columns)
      return false;
    if (add_column(p, p->n_free, best)) {
      p->free[p->n_free++] = best;
      solve_free(p);
      if (p->solution[p->n_free - 1] > 0.0)
        return true;
      p->n_free--;
    }
    refused[best] = true;
  }
}

/* Goes from x towards the solution as far as no free unknown turns negative,
 * and holds at zero those that got there. */
static void step_back(problem *p, double *x) {
  double share = 1.0;
  for (size_t k = 0; k < p->n_free; k++) {
    const double from = x[p->free[k]], to = p->solution[k];
    if (to <= 0.0)
      share = fmin(share, from / (from - to));
  }
  size_t n = 0;
  for (size_t k = 0; k < p->n_free; k++) {
    const size_t j = p->free[k];
    const double from = x[j], to = p->solution[k];
    x[j] = from + share * (to - from);
    const bool at_zero = to <= 0.0 && from / (from - to) <= share;
    if (at_zero || x[j] <= 0.0)
      x[j] = 0.0;
    else
      p->free[n++] = j;
  }
  p->n_free = n;
  factor_free(p);
  solve_free(p);
}

static bool solution_is_positive(const problem *p) {
  for (size_t k = 0; k < p->n_free; k++)
    if (!(p->solution[k] > 0.0))
      return false;
  return true;
}

/* Householder's reflections on the columns of A and on b, which lie in `folded`
 * by column; then the upper rows go to `a` by row and to `b`. */
static void fold_rows(size_t n_rows, size_t n_columns, const double *a,
                      const double *b, double *folded, double *a_out,
                      double *b_out) {
  const size_t n_left = n_columns + 1;
  for (size_t r = 0; r < n_rows; r++) {
    for (size_t j = 0; j < n_columns; j++)
      folded[j * n_rows + r] = a[r * n_columns + j];
    folded[n_columns * n_rows + r] = b[r];
  }
  for (size_t k = 0; k < n_left; k++) {
    double *v = folded + k * n_rows;
    double rest = 0.0;
    for (size_t r = k; r < n_rows; r++)
      rest = hypot(rest, v[r]);
    const double diagonal = v[k] > 0.0 ? -rest : rest;
    v[k] -= diagonal;
    const problem p = {.n_rows = n_rows, .factor = folded};
    for (size_t j = k + 1; j < n_left; j++)
      reflect(&p, k, folded + j * n_rows);
    for (size_t j = 0; j < n_columns; j++)
      a_out[k * n_columns + j] = j < k    ? 0.0
                                 : j == k ? diagonal
                                          : folded[j * n_rows + k];
    b_out[k] = k == n_columns ? diagonal : folded[n_columns * n_rows + k];
  }
}

/* Frees columns one by one until none pulls any more. */
static bool solve(problem *p, double *x, double *norm) {
  memset(x, 0, p->n_columns * sizeof *x);
  *norm = take_residual(p, x);
  /* Each free column lowers the residual, so no set of them comes twice; in
   * exact arithmetic there is an end. The limit is that of the authors. */
  for (size_t n_steps = 0; n_steps < 3 * p->n_columns; n_steps++) {
    if (!free_one(p))
      return true;
    /* Each step back holds one more column, so this ends by itself. */
    while (!solution_is_positive(p))
      step_back(p, x);
    for (size_t k = 0; k < p->n_free; k++)
      x[p->free[k]] = p->solution[k];
    *norm = take_residual(p, x);
  }
  return !free_one(p);
}

bool ef__nnls(size_t n_rows, size_t n_columns, const double *a, const double *b,
              double *scratch, double *x, double *residual_norm) {
  const size_t n_left = folded_rows(n_rows, n_columns);
  problem p = {.n_rows = n_left, .n_columns = n_columns, .a = a, .b = b};
  double *at = scratch;
  if (n_left < n_rows) {
    double *folded = at;
    double *a_out = folded + n_rows * (n_columns + 1);
    double *b_out = a_out + n_left * n_columns;
    fold_rows(n_rows, n_columns, a, b, folded, a_out, b_out);
    p.a = a_out;
    p.b = b_out;
    at = b_out + n_left;
  }
  p.factor = at;
  p.right = at + n_left * n_columns;
  p.residual = p.right + n_left;
  double norm;
  const bool found = solve(&p, x, &norm);
  if (residual_norm != NULL)
    *residual_norm = norm;
  return found;
}

/* ---- Quadratic form under inequalities ---------------------------------- */

/* Upper R with R' R = matrix; false unless positive definite. */
static bool cholesky(size_t n, const double *matrix, double *r) {
  memset(r, 0, n * n * sizeof *r);
  for (size_t i = 0; i < n; i++) {
    for (size_t j = i; j < n; j++) {
      double sum = matrix[i * n + j];
      for (size_t k = 0; k < i; k++)
        sum -= r[k * n + i] * r[k * n + j];
      if (i == j && !(sum > DBL_EPSILON * matrix[i * n + i]))
        return false;
      r[i * n + j] = i == j ? sqrt(sum) : sum / r[i * n + i];
    }
  }
  return true;
}

/* x = R^-T v. */
static void solve_transposed(size_t n, const double *r, const double *v,
                             double *x) {
  for (size_t i = 0; i < n; i++) {
    double sum = v[i];
    for (size_t k = 0; k < i; k++)
      sum -= r[k * n + i] * x[k];
    x[i] = sum / r[i * n + i];
  }
}

/* x = R^-1 v; x may be v. */
static void solve_upper(size_t n, const double *r, const double *v, double *x) {
  for (size_t i = n; i-- > 0;) {
    double sum = v[i];
    for (size_t k = i + 1; k < n; k++)
      sum -= r[i * n + k] * x[k];
    x[i] = sum / r[i * n + i];
  }
}

bool ef__least_quadratic(size_t n, const double *matrix, const double *linear,
                         size_t n_limits, const double *limit,
                         const double *bound, double *x) {
  enum { MOST = EF__QUADRATIC_UNKNOWNS, LIMITS = EF__NNLS_COLUMNS };
  double r[MOST * MOST], start[MOST], row[MOST];
  double a[(MOST + 1) * LIMITS], b[MOST + 1] = {0.0}, u[LIMITS], y[MOST + 1];
  double scratch[(MOST + 1) * (2 * LIMITS + 3)];
  if (!cholesky(n, matrix, r))
    return false;
  /* With y = R x + R^-T g the form is |y|^2 / 2 and a constant. */
  solve_transposed(n, r, linear, start);
  double farthest = 0.0;
  for (size_t i = 0; i < n_limits; i++) {
    solve_transposed(n, r, limit + i * n, row);
    double raised = bound[i], length = 0.0;
    for (size_t k = 0; k < n; k++) {
      a[k * n_limits + i] = row[k];
      raised += row[k] * start[k];
      length = hypot(length, row[k]);
    }
    a[n * n_limits + i] = raised;
    farthest = fmax(farthest, raised / length);
  }
  /* The least y is as far as the farthest limit it breaks, or farther. In units
   * of that distance the residual below keeps its digits. */
  const double unit = farthest > 0.0 ? farthest : 1.0;
  for (size_t i = 0; i < n_limits; i++)
    a[n * n_limits + i] /= unit;
  b[n] = 1.0;
  double norm;
  if (!ef__nnls(n + 1, n_limits, a, b, scratch, u, &norm))
    return false;
  for (size_t k = 0; k <= n; k++) {
    y[k] = -b[k];
    for (size_t i = 0; i < n_limits; i++)
      y[k] += a[k * n_limits + i] * u[i];
  }
  /* Nothing left of the residual: no point keeps all limits. */
  if (!(fabs(y[n]) > (double)(n + n_limits) * DBL_EPSILON))
    return false;
  for (size_t k = 0; k < n; k++)
    row[k] = -unit * y[k] / y[n] - start[k];
  solve_upper(n, r, row, x);
  return true;
}
