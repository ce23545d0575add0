/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "difference/answers.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

/* The curves of one observer rise from chance at d' = 1e-9 to 1 at d' = 64, to
 * the last bits of a double. Between nodes a 64th apart in ln d' they are cubic
 * (Lagrange, four nodes): right to 2e-8. */
#define FIRST (-20.723265836946411) /* ln 1e-9 */
#define LAST 4.1588830833596715     /* ln 64 */
#define NODES_A_UNIT 64
/* Over observers: the trapezoidal rule in standard deviations, which for a
 * normal density is right to the last bits from steps of a half on. */
#define FURTHEST 8.5
#define STEP 0.25

typedef struct curve {
  double first, step;
  size_t n;
  double *value; /* EF__ANSWERS x n */
} curve;

struct ef__answers {
  curve c;
};

static const double chance[EF__ANSWERS] = {0.5, 0.5, 1.0 / 3};

static double one_observer(ef__answer task, double d_prime) {
  static const ef_task tasks[EF__ANSWERS] = {
      EF_TASK_2IFC, EF_TASK_SAME_DIFFERENT, EF_TASK_TRIANGLE};
  return ef_task_best_correct(tasks[task], d_prime);
}

static double look_up(const curve *c, ef__answer task, double y,
                      double *slope) {
  const double *const value = c->value + (size_t)task * c->n;
  const double place = (y - c->first) / c->step;
  if (slope != NULL)
    *slope = 0;
  if (!(place >= 0)) /* NaN is no place either: told by the caller */
    return isnan(y) ? y : chance[task];
  if (place >= (double)(c->n - 1))
    return 1;
  size_t k = (size_t)place;
  k = k < 1 ? 1 : k > c->n - 3 ? c->n - 3 : k;
  const double t = place - (double)k;
  const double *const v = value + k - 1;
  /* Newton's form on the nodes -1, 0, 1, 2. */
  const double d1 = v[1] - v[0], d2 = v[2] - 2 * v[1] + v[0];
  const double d3 = v[3] - 3 * v[2] + 3 * v[1] - v[0];
  if (slope != NULL)
    *slope = (d1 + d2 / 2 * (2 * t + 1) + d3 / 6 * (3 * t * t - 1)) / c->step;
  return v[0] + (t + 1) * (d1 + t / 2 * (d2 + (t - 1) / 3 * d3));
}

static bool curve_set(curve *c, double first, double last, double step) {
  c->first = first;
  c->step = step;
  c->n = (size_t)ceil((last - first) / step) + 1;
  c->value = ef__allocate((size_t)EF__ANSWERS * c->n, sizeof *c->value);
  return c->value != NULL;
}

/* The mean over observers of the curves of one. */
static double mean_over(const curve *one, ef__answer task, double y,
                        double spread) {
  double sum = 0, whole = 0;
  /* Steps in ln d' no longer than what the curves of one can bear. */
  const double step = spread > 1 ? STEP / spread : STEP;
  const int n = (int)(FURTHEST / step);
  for (int i = -n; i <= n; ++i) {
    const double z = i * step, weight = ef__phi(z);
    whole += weight;
    sum += weight * look_up(one, task, y + spread * z, NULL);
  }
  return sum / whole;
}

ef__answers *ef__answers_new(double spread) {
  ef__answers *const answers = ef__allocate(1, sizeof *answers);
  curve one = {.value = NULL};
  if (answers == NULL)
    return NULL;
  answers->c.value = NULL;
  const double reach = FURTHEST * spread;
  const double step = fmax(1, spread) / NODES_A_UNIT;
  bool ok = curve_set(&one, FIRST, LAST, 1.0 / NODES_A_UNIT) &&
            curve_set(&answers->c, FIRST - reach, LAST + reach, step);
  for (size_t i = 0; i < (size_t)EF__ANSWERS * one.n && ok; ++i)
    one.value[i] =
        one_observer((ef__answer)(i / one.n),
                     exp(one.first + one.step * (double)(i % one.n)));
  const size_t n = answers->c.n;
  for (size_t i = 0; i < (size_t)EF__ANSWERS * n && ok; ++i)
    answers->c.value[i] =
        mean_over(&one, (ef__answer)(i / n),
                  answers->c.first + step * (double)(i % n), spread);
  free(one.value);
  if (ok)
    return answers;
  ef__answers_free(answers);
  return NULL;
}

void ef__answers_free(ef__answers *answers) {
  if (answers == NULL)
    return;
  free(answers->c.value);
  free(answers);
}

double ef__answers_share(const ef__answers *answers, ef__answer task, double y,
                         double *slope) {
  return look_up(&answers->c, task, y, slope);
}

double ef__answers_place(const ef__answers *answers, ef__answer task,
                         double share) {
  const curve *const c = &answers->c;
  if (!(share > chance[task]))
    return -(double)INFINITY;
  if (share >= 1)
    return (double)INFINITY;
  double low = c->first, high = c->first + c->step * (double)(c->n - 1);
  for (int i = 0; i < 60; ++i) { /* halvings of some 100 units */
    const double middle = 0.5 * (low + high);
    if (look_up(c, task, middle, NULL) < share)
      low = middle;
    else
      high = middle;
  }
  return 0.5 * (low + high);
}
