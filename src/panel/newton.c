/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Newton's method for a few parameters inside limits. A parameter at its limit
 * is held while the gradient presses it there; a step that would pass a limit
 * ends on it; every accepted step goes down. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

enum { M = EF__PARAMETERS, MAX_ITERATIONS = 200, MAX_HALVINGS = 60 };

/* Value and derivatives at a point. */
typedef struct place {
  double x[M], value, gradient[M], curvature[M * M], expected[M * M];
} place;

static void evaluate(const ef__objective *o, place *at) {
  at->value =
      o->evaluate(o->ctx, at->x, at->gradient, at->curvature, at->expected);
}

/* Cholesky of the free part of `matrix` + ridge diag(matrix), lower triangle in
 * `factor` over the free parameters alone. False unless it is positive definite
 * with pivots above the rounding of their diagonal. */
static bool factorise(size_t n, const size_t *index, size_t m,
                      const double *matrix, double ridge, double *factor) {
  for (size_t i = 0; i < n; ++i) {
    for (size_t j = 0; j <= i; ++j) {
      double sum = matrix[index[i] * m + index[j]];
      const double diagonal = sum;
      if (i == j)
        sum += ridge * fabs(diagonal);
      for (size_t k = 0; k < j; ++k)
        sum -= factor[i * M + k] * factor[j * M + k];
      if (i == j) {
        if (!(sum > 16 * DBL_EPSILON * fabs(diagonal)) || !isfinite(sum))
          return false;
        factor[i * M + i] = sqrt(sum);
      } else {
        factor[i * M + j] = sum / factor[j * M + j];
      }
    }
  }
  return true;
}

static void solve(size_t n, const double *factor, double *b) {
  for (size_t i = 0; i < n; ++i) {
    for (size_t k = 0; k < i; ++k)
      b[i] -= factor[i * M + k] * b[k];
    b[i] /= factor[i * M + i];
  }
  for (size_t i = n; i-- > 0;) {
    for (size_t k = i + 1; k < n; ++k)
      b[i] -= factor[k * M + i] * b[k];
    b[i] /= factor[i * M + i];
  }
}

/* The curvature where it is positive definite, else the expected information,
 * else that with a growing ridge. False when even this cannot be factored. */
static bool factorise_any(const place *at, size_t n, const size_t *index,
                          size_t m, double *factor) {
  if (factorise(n, index, m, at->curvature, 0, factor))
    return true;
  for (double ridge = 0; ridge<10; ridge = ridge> 0 ? 100 * ridge : 1e-10) {
    if (factorise(n, index, m, at->expected, ridge, factor))
      return true;
  }
  return false;
}

/* Newton step of the free parameters, those freed of the list that stand on a
 * limit and would go beyond it. Returns the gain that the quadratic promises,
 * negative when there is no step. */
static double newton_step(const ef__objective *o, const place *at,
                          double *step) {
  bool is_free[M];
  for (size_t i = 0; i < o->m; ++i) {
    const bool pressed = (at->x[i] <= o->low[i] && at->gradient[i] > 0) ||
                         (at->x[i] >= o->high[i] && at->gradient[i] < 0);
    is_free[i] = o->low[i] < o->high[i] && !pressed;
  }
  for (;;) {
    size_t index[M], n = 0;
    double factor[M * M], b[M];
    for (size_t i = 0; i < o->m; ++i) {
      step[i] = 0;
      if (!is_free[i])
        continue;
      b[n] = -at->gradient[i];
      index[n++] = i;
    }
    if (n == 0)
      return 0;
    if (!factorise_any(at, n, index, o->m, factor))
      return -1;
    solve(n, factor, b);
    double gain = 0;
    bool is_inside = true;
    for (size_t i = 0; i < n; ++i) {
      const size_t j = index[i];
      step[j] = b[i];
      gain -= 0.5 * at->gradient[j] * b[i];
      const bool leaves = (at->x[j] <= o->low[j] && b[i] < 0) ||
                          (at->x[j] >= o->high[j] && b[i] > 0);
      if (!leaves)
        continue;
      is_free[j] = false;
      is_inside = false;
    }
    if (is_inside)
      return gain;
  }
}

/* Largest part of the step, at most 1, that stays inside the limits. */
static double room_for(const ef__objective *o, const double *x,
                       const double *step) {
  double part = 1;
  for (size_t i = 0; i < o->m; ++i) {
    if (step[i] < 0 && x[i] + part * step[i] < o->low[i])
      part = (o->low[i] - x[i]) / step[i];
    if (step[i] > 0 && x[i] + part * step[i] > o->high[i])
      part = (o->high[i] - x[i]) / step[i];
  }
  return part;
}

static void take_step(const ef__objective *o, const place *from,
                      const double *step, double part, place *to) {
  for (size_t i = 0; i < o->m; ++i) {
    const double x = from->x[i] + part * step[i];
    to->x[i] = fmin(fmax(x, o->low[i]), o->high[i]);
  }
}

/* Backtracks until the value falls by a share of what the slope promises.
 * False when it never does. */
static bool descend(const ef__objective *o, const double *step, double gain,
                    place *at) {
  place next;
  double part = room_for(o, at->x, step);
  for (int i = 0; i < MAX_HALVINGS; ++i, part *= 0.5) {
    take_step(o, at, step, part, &next);
    evaluate(o, &next);
    if (next.value <= at->value - 1e-4 * 2 * gain * part) {
      *at = next;
      return true;
    }
  }
  return false;
}

void ef__minimise(const ef__objective *o, const double *origin,
                  double tolerance, ef__minimum *out) {
  place at;
  for (size_t i = 0; i < o->m; ++i)
    at.x[i] = fmin(fmax(origin[i], o->low[i]), o->high[i]);
  evaluate(o, &at);
  out->converged = false;
  out->iterations = 0;
  while (isfinite(at.value) && out->iterations < MAX_ITERATIONS) {
    out->iterations++;
    double step[M];
    const double gain = newton_step(o, &at, step);
    if (gain < 0)
      break;
    /* The last step is taken unseen: the line search cannot see below the
     * rounding of the value, and the method converges quadratically. */
    const double rounding = 64 * DBL_EPSILON * (1 + fabs(at.value));
    if (gain <= fmax(tolerance, rounding)) {
      place next;
      take_step(o, &at, step, room_for(o, at.x, step), &next);
      evaluate(o, &next);
      if (next.value <= at.value + rounding)
        at = next;
      out->converged = true;
      break;
    }
    if (!descend(o, step, gain, &at))
      break;
  }
  memcpy(out->x, at.x, o->m * sizeof *at.x);
  out->value = at.value;
}

bool ef__invert_free(size_t m, const double *matrix, const bool *is_free,
                     double *inverse) {
  size_t index[M] = {0}, n = 0;
  for (size_t i = 0; i < m; ++i) {
    if (is_free[i])
      index[n++] = i;
  }
  memset(inverse, 0, m * m * sizeof *inverse);
  double factor[M * M];
  if (!factorise(n, index, m, matrix, 0, factor))
    return false;
  for (size_t j = 0; j < n; ++j) {
    double column[M] = {0};
    column[j] = 1;
    solve(n, factor, column);
    for (size_t i = 0; i < n; ++i)
      inverse[index[i] * m + index[j]] = column[i];
  }
  return true;
}
