/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Linear programmes: small ones worked by hand, and random ones whose answer
 * proves itself by its prices. */
#include "base/base_private.h"

#include <stdlib.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

enum { MOST_COLUMNS = 120 };

typedef struct case_of {
  size_t m, n;
  double column[MOST_COLUMNS * EF__PROGRAMME_ROWS];
  double right[EF__PROGRAMME_ROWS];
  double low[MOST_COLUMNS], high[MOST_COLUMNS], cost[MOST_COLUMNS];
} case_of;

static ef__programme programme_of(const case_of *c) {
  return (ef__programme){.n_rows = c->m,
                         .n_columns = c->n,
                         .column = c->column,
                         .right = c->right,
                         .low = c->low,
                         .high = c->high};
}

/* x1 + x2 = 1.5, x1 - x3 = 0.25 with 0 <= x <= 1: of x1 + 2 x2 + 4 x3 the
 * greatest is at x1 = 1, x2 = 0.5, x3 = 0.75. */
static void worked_by_hand(void **state) {
  (void)state;
  const double column[] = {1, 1, 1, 0, 0, -1}, right[] = {1.5, 0.25};
  const double low[3] = {0}, high[] = {1, 1, 1}, cost[] = {1, 2, 4};
  const ef__programme p = {2, 3, column, right, low, high};
  ef__simplex *const s = ef__simplex_new(2, 3);
  double x[3], dual[2];
  assert_int_equal(ef__simplex_maximise(s, &p, cost, x, dual),
                   EF__SIMPLEX_BEST);
  assert_near(x[0], 1, 0);
  assert_near(x[1], 0.5, 1e-15);
  assert_near(x[2], 0.75, 1e-15);
  /* Other way round, from where that ended: x3 least is 0.25, at x2 = 1. */
  const double less[] = {0, 0, -1};
  assert_int_equal(ef__simplex_maximise(s, &p, less, x, NULL),
                   EF__SIMPLEX_BEST);
  assert_near(x[0], 0.5, 1e-15);
  assert_near(x[1], 1, 1e-15);
  assert_near(x[2], 0.25, 1e-15);
  ef__simplex_free(s);
}

static void no_rows_and_no_room(void **state) {
  (void)state;
  const double low[] = {-1, 2, 0}, high[] = {3, 2, 5}, cost[] = {1, 1, -1};
  const ef__programme p = {0, 3, NULL, NULL, low, high};
  ef__simplex *const s = ef__simplex_new(0, 3);
  double x[3];
  assert_int_equal(ef__simplex_maximise(s, &p, cost, x, NULL),
                   EF__SIMPLEX_BEST);
  assert_true(x[0] == 3 && x[1] == 2 && x[2] == 0);
  ef__simplex_free(s);
  assert_null(ef__simplex_new(EF__PROGRAMME_ROWS + 1, 3));
  ef__simplex_free(NULL);
}

static void rows_that_cannot_be_kept(void **state) {
  (void)state;
  const double column[] = {1, 1, 1, 1}, low[2] = {0}, high[] = {1, 1};
  const double too_much[] = {2.001, 2.001}, unequal[] = {1, 1.001};
  const double enough[] = {2, 2}, cost[] = {1, 3};
  ef__programme p = {2, 2, column, too_much, low, high};
  ef__simplex *const s = ef__simplex_new(2, 2);
  double x[2] = {7, 7};
  assert_int_equal(ef__simplex_maximise(s, &p, cost, x, NULL),
                   EF__SIMPLEX_INFEASIBLE);
  p.right = unequal;
  assert_int_equal(ef__simplex_maximise(s, &p, cost, x, NULL),
                   EF__SIMPLEX_INFEASIBLE);
  assert_true(x[0] == 7);
  /* The same rows twice, and just room for it. */
  p.right = enough;
  assert_int_equal(ef__simplex_maximise(s, &p, cost, x, NULL),
                   EF__SIMPLEX_BEST);
  assert_true(x[0] == 1 && x[1] == 1);
  ef__simplex_free(s);
}

/* Rows that random x within the limits keeps; some columns alike, some fixed,
 * some x at their limits, so that many bases are degenerate. */
static void random_case(gen *g, case_of *c) {
  c->m = gen_below(g, EF__PROGRAMME_ROWS) + 1;
  c->n = c->m + gen_below(g, MOST_COLUMNS - EF__PROGRAMME_ROWS);
  double right[EF__PROGRAMME_ROWS] = {0};
  const bool is_coarse = gen_below(g, 2) == 0;
  for (size_t j = 0; j < c->n; ++j) {
    c->low[j] = gen_between(g, -1, 0);
    c->high[j] = gen_below(g, 8) == 0 ? c->low[j] : gen_between(g, 0, 2);
    c->cost[j] = gen_between(g, -1, 1);
    double x = gen_between(g, c->low[j], c->high[j]);
    if (is_coarse) {
      c->cost[j] = (double)gen_below(g, 3) - 1;
      x = gen_below(g, 2) == 0 ? c->low[j] : c->high[j];
    }
    for (size_t i = 0; i < c->m; ++i) {
      double *const entry = &c->column[j * c->m + i];
      *entry = is_coarse ? (double)gen_below(g, 3) - 1 : gen_normal(g);
      if (j > 0 && gen_below(g, 10) == 0)
        *entry = c->column[(j - 1) * c->m + i];
      right[i] += *entry * x;
    }
  }
  memcpy(c->right, right, sizeof right);
}

/* No x can do better than the bound that the prices give, and this one reaches
 * it: nothing about the method enters. */
static void assert_best(const case_of *c, const double *x,
                        const double *dual) {
  double reached = 0, bound = 0, size = 1;
  for (size_t i = 0; i < c->m; ++i) {
    double sum = 0, terms = 1;
    for (size_t j = 0; j < c->n; ++j) {
      sum += c->column[j * c->m + i] * x[j];
      terms += fabs(c->column[j * c->m + i] * x[j]);
    }
    assert_near(sum, c->right[i], 1e-12 * terms);
    bound += dual[i] * c->right[i];
    size += fabs(dual[i] * c->right[i]);
  }
  for (size_t j = 0; j < c->n; ++j) {
    assert_true(x[j] >= c->low[j] && x[j] <= c->high[j]);
    double gain = c->cost[j];
    for (size_t i = 0; i < c->m; ++i)
      gain -= dual[i] * c->column[j * c->m + i];
    bound += gain > 0 ? gain * c->high[j] : gain * c->low[j];
    reached += c->cost[j] * x[j];
    size += fabs(c->cost[j] * x[j]);
  }
  /* Prices are right to the condition of the basis, some 1e3 here. */
  assert_near(reached, bound, 1e-11 * size);
}

static void random_ones_prove_themselves(void **state) {
  (void)state;
  gen g = gen_new(41);
  static case_of c;
  for (int i = 0; i < 2000; ++i) {
    random_case(&g, &c);
    const ef__programme p = programme_of(&c);
    ef__simplex *const s = ef__simplex_new(c.m, c.n);
    double x[MOST_COLUMNS], dual[EF__PROGRAMME_ROWS];
    for (int again = 0; again < 3; ++again) {
      assert_int_equal(ef__simplex_maximise(s, &p, c.cost, x, dual),
                       EF__SIMPLEX_BEST);
      assert_best(&c, x, dual);
      /* Next: other costs, then a changed column, from where this ended. */
      for (size_t j = 0; j < c.n && again == 0; ++j)
        c.cost[j] += gen_between(&g, -0.3, 0.3);
      for (size_t r = 0; r < c.m && again == 1; ++r) {
        const double change = gen_between(&g, -0.2, 0.2);
        c.column[r] += change;
        c.right[r] += change * x[0];
      }
    }
    ef__simplex_free(s);
  }
}

static bool make(void *context) {
  (void)context;
  ef__simplex *const s = ef__simplex_new(3, 10);
  ef__simplex_free(s);
  return s != NULL;
}

static void without_memory(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(make, NULL), 1);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(worked_by_hand),
      cmocka_unit_test(no_rows_and_no_room),
      cmocka_unit_test(rows_that_cannot_be_kept),
      cmocka_unit_test(random_ones_prove_themselves),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
