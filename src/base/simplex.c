/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The simplex method for few rows and limits on every variable (Dantzig 1963,
 * ch. 18): variables off the basis rest at one of their limits, and one that
 * reaches its other limit first changes sides without a change of the basis.
 * Each row has a variable of its own that is fixed at zero, so that the search
 * can begin anywhere: as long as some basic variable is outside its limits, the
 * sum of what they are outside by is made small instead of the cost. */
#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { ROWS = EF__PROGRAMME_ROWS, RENEW = 20 /* steps between inversions */ };

static const double usual_slack = 1e-10; /* of the distance of the limits */

enum { AT_LOW, AT_HIGH, BASIC };

struct ef__simplex {
  size_t n_rows, n_columns;
  unsigned char *place; /* of columns, then of the rows' own variables */
  size_t basis[ROWS];
  double inverse[ROWS * ROWS]; /* of the basis' columns */
  double value[ROWS];          /* of the basic variables */
  double slack[ROWS];          /* a basic variable may be outside by */
  double size[ROWS];           /* of the terms that sum to each row */
  size_t age;                  /* steps since the last inversion */
  size_t n_idle;               /* steps without progress, one after another */
  double least_slack, slack_share; /* of the distance of the limits */
  double worth; /* gain, relative to its terms, from which a step is taken */
};

ef__simplex *ef__simplex_new(size_t n_rows, size_t n_columns) {
  ef__simplex *s;
  unsigned char *place;
  const ef__part parts[] = {{&s, 1, sizeof *s},
                            {&place, n_columns + ROWS, sizeof *place}};
  if (n_rows > ROWS || ef__allocate_block(2, parts) == NULL)
    return NULL;
  s->n_rows = n_rows;
  s->n_columns = n_columns;
  s->place = place;
  s->least_slack = s->slack_share = usual_slack;
  ef__simplex_restart(s);
  return s;
}

void ef__simplex_free(ef__simplex *simplex) {
  free(simplex);
}

void ef__simplex_set_slack(ef__simplex *simplex, double share) {
  simplex->least_slack = share;
}

void ef__simplex_restart(ef__simplex *s) {
  memset(s->place, AT_LOW, s->n_columns);
  memset(s->place + s->n_columns, BASIC, s->n_rows);
  for (size_t i = 0; i < s->n_rows; ++i)
    s->basis[i] = s->n_columns + i;
}

/* ---- Columns and limits, the rows' own variables included -------------- */

static double low_of(const ef__programme *p, size_t j) {
  return j < p->n_columns ? p->low[j] : 0;
}

static double high_of(const ef__programme *p, size_t j) {
  return j < p->n_columns ? p->high[j] : 0;
}

static double entry_of(const ef__programme *p, size_t j, size_t i) {
  if (j < p->n_columns)
    return p->column[j * p->n_rows + i];
  return j - p->n_columns == i ? 1 : 0;
}

/* ---- The basis --------------------------------------------------------- */

/* right - the part of the variables off the basis; sets the sizes of rows. */
static void remainder_of(ef__simplex *s, const ef__programme *p, double *out) {
  const size_t m = p->n_rows;
  for (size_t i = 0; i < m; ++i) {
    out[i] = p->right[i];
    s->size[i] = fabs(p->right[i]);
  }
  for (size_t j = 0; j < p->n_columns; ++j) {
    if (s->place[j] == BASIC)
      continue;
    const double x = s->place[j] == AT_LOW ? p->low[j] : p->high[j];
    for (size_t i = 0; i < m && x != 0; ++i) {
      out[i] -= p->column[j * m + i] * x;
      s->size[i] += fabs(p->column[j * m + i] * x);
    }
  }
}

/* A ten-billionth of what it varies by, and what the rounding of the rows comes
 * to in it: much, where its column is small. */
static void set_slack(ef__simplex *s, const ef__programme *p) {
  const size_t m = p->n_rows;
  for (size_t i = 0; i < m; ++i) {
    double rounding = 0;
    for (size_t k = 0; k < m; ++k)
      rounding += fabs(s->inverse[i * m + k]) * s->size[k];
    const size_t j = s->basis[i];
    s->slack[i] = s->slack_share * (high_of(p, j) - low_of(p, j)) +
                  64 * DBL_EPSILON * rounding;
  }
}

/* Inverts the basis anew; false when it is singular. */
static bool renew(ef__simplex *s, const ef__programme *p) {
  const size_t m = p->n_rows;
  double matrix[ROWS * ROWS];
  memset(s->inverse, 0, sizeof s->inverse);
  for (size_t i = 0; i < m; ++i) {
    s->inverse[i * m + i] = 1;
    for (size_t k = 0; k < m; ++k)
      matrix[i * m + k] = entry_of(p, s->basis[k], i);
  }
  s->age = 0;
  if (m > 0 && !ef__solve(m, matrix, m, s->inverse))
    return false;
  double rest[ROWS];
  remainder_of(s, p, rest);
  for (size_t i = 0; i < m; ++i) {
    s->value[i] = 0;
    for (size_t k = 0; k < m; ++k)
      s->value[i] += s->inverse[i * m + k] * rest[k];
  }
  set_slack(s, p);
  return true;
}

/* ---- One step ---------------------------------------------------------- */

/* -1 below its limits, 1 above, 0 within. */
static int side_of(const ef__simplex *s, const ef__programme *p, size_t i) {
  const size_t j = s->basis[i];
  if (s->value[i] < low_of(p, j) - s->slack[i])
    return -1;
  return s->value[i] > high_of(p, j) + s->slack[i];
}

/* Prices of the rows, and how large the terms were that they are sums of.
 * Returns true while some basic variable is outside. */
static bool price(const ef__simplex *s, const ef__programme *p,
                  const double *cost, double *dual, double *terms) {
  const size_t m = p->n_rows;
  bool outside = false;
  for (size_t i = 0; i < m; ++i)
    outside = outside || side_of(s, p, i) != 0;
  for (size_t k = 0; k < m; ++k)
    dual[k] = terms[k] = 0;
  for (size_t i = 0; i < m; ++i) {
    const size_t j = s->basis[i];
    const double c = outside              ? -side_of(s, p, i)
                     : j < p->n_columns ? cost[j]
                                          : 0;
    for (size_t k = 0; k < m && c != 0; ++k) {
      dual[k] += c * s->inverse[i * m + k];
      terms[k] += fabs(c * s->inverse[i * m + k]);
    }
  }
  return outside;
}

/* The column whose move pays most, n_columns when none does. After many idle
 * steps the first that pays (Bland 1977): no circle of steps is then left. */
static size_t entering(const ef__simplex *s, const ef__programme *p,
                       const double *cost, const double *dual,
                       const double *terms, bool first) {
  const size_t m = p->n_rows;
  size_t best = p->n_columns;
  double most = 0;
  for (size_t j = 0; j < p->n_columns; ++j) {
    if (s->place[j] == BASIC || p->low[j] == p->high[j])
      continue;
    const double *const column = p->column + j * m;
    double gain = cost != NULL ? cost[j] : 0, size = fabs(gain);
    for (size_t i = 0; i < m; ++i) {
      gain -= dual[i] * column[i];
      size += terms[i] * fabs(column[i]);
    }
    if (s->place[j] == AT_HIGH)
      gain = -gain;
    if (!(gain > s->worth * size) || !(gain > most))
      continue;
    best = j;
    most = gain;
    if (first)
      break;
  }
  return best;
}

/* How far basic variable i lets the step go at this rate; INFINITY when it does
 * not end it. One outside ends it where it comes to its limit. */
static double room_of(const ef__simplex *s, const ef__programme *p, size_t i,
                      double rate, double slack) {
  const size_t j = s->basis[i];
  const int side = side_of(s, p, i);
  if (rate > 0) {
    if (side > 0)
      return (double)INFINITY;
    const double limit = side < 0 ? low_of(p, j) : high_of(p, j);
    return (limit + slack - s->value[i]) / rate;
  }
  if (side < 0)
    return (double)INFINITY;
  const double limit = side > 0 ? high_of(p, j) : low_of(p, j);
  return (limit - slack - s->value[i]) / rate;
}

/* Row that ends the step, n_rows when the variable's other limit does; Harris'
 * two passes: of the rows that end it within the slack the one with the largest
 * rate, which keeps the basis well conditioned. */
static size_t leaving(const ef__simplex *s, const ef__programme *p,
                      const double *rate, double own_room, bool first,
                      double *length) {
  const size_t m = p->n_rows;
  double largest = 0, furthest = (double)INFINITY;
  for (size_t i = 0; i < m; ++i)
    largest = fmax(largest, fabs(rate[i]));
  const double least_rate = 1e-11 * largest;
  for (size_t i = 0; i < m; ++i) {
    if (fabs(rate[i]) > least_rate)
      furthest = fmin(furthest,
                      room_of(s, p, i, rate[i], first ? 0 : s->slack[i]));
  }
  size_t row = m;
  for (size_t i = 0; i < m; ++i) {
    if (!(fabs(rate[i]) > least_rate) ||
        !(room_of(s, p, i, rate[i], 0) <= furthest))
      continue;
    const bool better =
        row == m || (first ? s->basis[i] < s->basis[row]
                           : fabs(rate[i]) > fabs(rate[row]));
    if (better)
      row = i;
  }
  *length = row < m ? fmax(0, room_of(s, p, row, rate[row], 0)) : own_room;
  if (own_room <= *length) {
    *length = own_room;
    return m;
  }
  return row;
}

/* Column j takes the place of basis[row]. */
static void exchange(ef__simplex *s, const ef__programme *p, size_t j,
                     size_t row, const double *in_basis, bool to_high,
                     double value) {
  const size_t m = p->n_rows;
  for (size_t k = 0; k < m; ++k)
    s->inverse[row * m + k] /= in_basis[row];
  for (size_t i = 0; i < m; ++i) {
    if (i == row)
      continue;
    for (size_t k = 0; k < m; ++k)
      s->inverse[i * m + k] -= in_basis[i] * s->inverse[row * m + k];
  }
  s->place[s->basis[row]] = to_high ? AT_HIGH : AT_LOW;
  s->place[j] = BASIC;
  s->basis[row] = j;
  s->value[row] = value;
  set_slack(s, p);
}

/* Moves column j from its limit. */
static void move(ef__simplex *s, const ef__programme *p, size_t j,
                 bool first) {
  const size_t m = p->n_rows;
  const double *const column = p->column + j * m;
  const double way = s->place[j] == AT_LOW ? 1 : -1;
  double in_basis[ROWS], rate[ROWS], length;
  for (size_t i = 0; i < m; ++i) {
    in_basis[i] = 0;
    for (size_t k = 0; k < m; ++k)
      in_basis[i] += s->inverse[i * m + k] * column[k];
    rate[i] = -way * in_basis[i];
  }
  const double own_room = p->high[j] - p->low[j];
  const size_t row = leaving(s, p, rate, own_room, first, &length);
  s->n_idle = length > 1e-12 * own_room ? 0 : s->n_idle + 1;
  const int side = row < m ? side_of(s, p, row) : 0;
  ++s->age;
  for (size_t i = 0; i < m; ++i)
    s->value[i] += length * rate[i];
  if (row == m) {
    s->place[j] = s->place[j] == AT_LOW ? AT_HIGH : AT_LOW;
    return;
  }
  const bool to_high = rate[row] > 0 ? side >= 0 : side > 0;
  const double from = way > 0 ? p->low[j] : p->high[j];
  exchange(s, p, j, row, in_basis, to_high, from + way * length);
}

/* ---- The search -------------------------------------------------------- */

static void read_out(const ef__simplex *s, const ef__programme *p, double *x) {
  for (size_t j = 0; j < p->n_columns; ++j)
    x[j] = s->place[j] == AT_HIGH ? p->high[j] : p->low[j];
  for (size_t i = 0; i < p->n_rows; ++i) {
    const size_t j = s->basis[i];
    if (j < p->n_columns)
      x[j] = fmin(fmax(s->value[i], p->low[j]), p->high[j]);
  }
}

/* cost . x, and the sum of the sizes of its terms. */
static double worth_of(const ef__simplex *s, const ef__programme *p,
                       const double *cost, double *size) {
  double sum = 0;
  *size = 0;
  for (size_t j = 0; j < p->n_columns; ++j) {
    if (s->place[j] == BASIC)
      continue;
    const double term = cost[j] * (s->place[j] == AT_LOW ? p->low[j]
                                                         : p->high[j]);
    sum += term;
    *size += fabs(term);
  }
  for (size_t i = 0; i < p->n_rows; ++i) {
    const size_t j = s->basis[i];
    const double term = j < p->n_columns ? cost[j] * s->value[i] : 0;
    sum += term;
    *size += fabs(term);
  }
  return sum;
}

/* True when the cost has not risen, but for rounding, in many steps: from then
 * on they follow prices that are rounding. */
static bool is_flat(const ef__simplex *s, const ef__programme *p,
                    const double *cost, double *best, size_t *n_flat) {
  const size_t most = 8 * (p->n_rows + 20) + p->n_columns;
  double size;
  const double now = worth_of(s, p, cost, &size);
  if (now > *best + 64 * DBL_EPSILON * size) {
    *best = now;
    *n_flat = 0;
  }
  return ++*n_flat > most;
}

ef__simplex_end ef__simplex_maximise(ef__simplex *s, const ef__programme *p,
                                     const double *cost, double *x,
                                     double *dual) {
  double prices[ROWS], terms[ROWS];
  const size_t most_steps = 1000 + 50 * (p->n_columns + p->n_rows);
  if (!renew(s, p)) {
    ef__simplex_restart(s);
    renew(s, p);
  }
  s->n_idle = 0;
  s->slack_share = s->least_slack;
  set_slack(s, p);
  /* What cancellation leaves of nothing. Where the basis is so badly
   * conditioned that more is left, two columns may take turns for ever: after
   * some ends that did not hold, more counts as nothing. */
  s->worth = 1e-11;
  size_t n_ends = 0, n_flat = 0;
  double best = -(double)INFINITY;
  for (size_t step = 0; step < most_steps; ++step) {
    if (s->age >= RENEW && !renew(s, p)) {
      ef__simplex_restart(s);
      renew(s, p);
    }
    const bool outside = price(s, p, cost, prices, terms);
    const bool first = s->n_idle > 20 + 2 * p->n_rows;
    const size_t j =
        entering(s, p, outside ? NULL : cost, prices, terms, first);
    const bool ends = j == p->n_columns ||
                      (!outside && is_flat(s, p, cost, &best, &n_flat));
    if (!ends) {
      move(s, p, j, first);
      continue;
    }
    if (s->age > 0) { /* the end must hold without what steps have added up */
      s->age = RENEW;
      s->worth = ++n_ends < 4 ? 1e-11 : 1e-9;
      continue;
    }
    if (outside && s->slack_share < usual_slack) {
      s->slack_share *= 10; /* by rounding, perhaps */
      set_slack(s, p);
      continue;
    }
    if (outside)
      return EF__SIMPLEX_INFEASIBLE;
    read_out(s, p, x);
    if (dual != NULL)
      memcpy(dual, prices, p->n_rows * sizeof *dual);
    return EF__SIMPLEX_BEST;
  }
  return EF__SIMPLEX_STALLED;
}
