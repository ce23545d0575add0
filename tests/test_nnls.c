/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Least squares with inequalities. No published example is at hand: small
 * problems solved by hand, and on random ones the conditions that single out
 * the minimum (Kuhn & Tucker 1951). */
#include <float.h>

#include "base/base_private.h"
#include "gen.h"
#include "near.h"

enum { MOST_ROWS = 40, MOST_COLUMNS = 12 };

static double scratch[MOST_ROWS * 3 * (MOST_COLUMNS + 3)];

static void solves_by_hand(void **state) {
  (void)state;
  double x[2], norm;
  /* Free: x = (1, -1); held at zero: the first row alone. */
  const double unit[4] = {1, 0, 0, 1}, target[2] = {1, -1};
  assert_true(ef__nnls(2, 2, unit, target, scratch, x, &norm));
  assert_near(x[0], 1, 0);
  assert_near(x[1], 0, 0);
  assert_near(norm, 1, 0);
  /* Columns (1,1,0) and (1,0,1) to (3,1,2): x = (1,2) exactly. */
  const double skew[6] = {1, 1, 1, 0, 0, 1}, reached[3] = {3, 1, 2};
  assert_true(ef__nnls(3, 2, skew, reached, scratch, x, &norm));
  assert_near(x[0], 1, 8 * DBL_EPSILON);
  assert_near(x[1], 2, 8 * DBL_EPSILON);
  assert_near(norm, 0, 16 * DBL_EPSILON);
}

static void dependent_columns_share_one_place(void **state) {
  (void)state;
  const double a[6] = {1, 2, 1, 2, 1, 2}, b[3] = {2, 4, 6};
  double x[2], norm;
  assert_true(ef__nnls(3, 2, a, b, scratch, x, &norm));
  assert_near(x[0] + 2 * x[1], 4, 1e-14);
  assert_true(x[0] == 0 || x[1] == 0);
  assert_near(norm, sqrt(8), 1e-14);
}

static void nothing_pulls(void **state) {
  (void)state;
  const double a[4] = {1, 0.5, 0.25, 1}, b[2] = {-1, -2};
  double x[2] = {7, 7};
  assert_true(ef__nnls(2, 2, a, b, scratch, x, NULL));
  assert_near(x[0], 0, 0);
  assert_near(x[1], 0, 0);
  /* More unknowns than rows. */
  const double wide[3] = {1, 2, 3}, one[1] = {6};
  double y[3], norm;
  assert_true(ef__nnls(1, 3, wide, one, scratch, y, &norm));
  assert_near(y[0] + 2 * y[1] + 3 * y[2], 6, 1e-14);
}

/* Gradient zero where x is positive, and no way down where x is zero. */
static void check_optimum(size_t m, size_t n, const double *a, const double *b,
                          const double *x, deviation *off) {
  for (size_t j = 0; j < n; j++) {
    double pull = 0, size = 0;
    for (size_t r = 0; r < m; r++) {
      double left = b[r], sum = fabs(b[r]);
      for (size_t k = 0; k < n; k++) {
        left -= a[r * n + k] * x[k];
        sum += fabs(a[r * n + k] * x[k]);
      }
      pull += a[r * n + j] * left;
      size += fabs(a[r * n + j]) * sum;
    }
    assert_true(x[j] >= 0);
    const double fault = x[j] > 0 ? fabs(pull) : fmax(pull, 0);
    deviation_add(off, fault / size, 0, "a random problem");
  }
}

static void random_problems_end_at_the_optimum(void **state) {
  (void)state;
  gen g = gen_new(3101);
  deviation off = {0};
  size_t n_held = 0, n_free = 0;
  for (int trial = 0; trial < 2000; trial++) {
    double a[MOST_ROWS * MOST_COLUMNS], b[MOST_ROWS], x[MOST_COLUMNS];
    const size_t m = 1 + gen_below(&g, MOST_ROWS);
    const size_t n = 1 + gen_below(&g, MOST_COLUMNS);
    gen_fill(&g, m * n, trial % 2 ? 0 : -1, 1, a);
    gen_fill(&g, m, -0.3, 1, b);
    assert_true(ef__nnls_scratch(m, n) <= sizeof scratch / sizeof *scratch);
    assert_true(ef__nnls(m, n, a, b, scratch, x, NULL));
    check_optimum(m, n, a, b, x, &off);
    for (size_t j = 0; j < n; j++)
      *(x[j] > 0 ? &n_free : &n_held) += 1;
  }
  deviation_print(&off, "pull left, of the size of its terms");
  assert_near(off.largest, 0, 1e-12);
  assert_true(n_held > 2000 && n_free > 2000);
}

/* ---- Quadratic form ---------------------------------------------------- */

enum { UNKNOWNS = 5 };

/* x >= 0 and sum x <= most, as limit x >= bound. */
static void simplex(size_t n, double most, double *limit, double *bound) {
  for (size_t i = 0; i <= n; i++) {
    bound[i] = i < n ? 0 : -most;
    for (size_t k = 0; k < n; k++)
      limit[i * n + k] = i == n ? -1 : i == k ? 1 : 0;
  }
}

/* On a convex set x is least when no corner of it lies downhill. `near`: the
 * rounding times the condition of the matrices, up to some thousands. */
static void quadratic_on_a_simplex(void **state) {
  (void)state;
  const double near = 1e-12;
  gen g = gen_new(3102);
  size_t n_inside = 0, n_at_sum = 0;
  for (int trial = 0; trial < 2000; trial++) {
    const size_t n = 1 + gen_below(&g, UNKNOWNS);
    double root[UNKNOWNS * UNKNOWNS], matrix[UNKNOWNS * UNKNOWNS];
    double linear[UNKNOWNS], limit[(UNKNOWNS + 1) * UNKNOWNS];
    double bound[UNKNOWNS + 1], x[UNKNOWNS], slope[UNKNOWNS];
    gen_fill(&g, n * n, -1, 1, root);
    gen_fill(&g, n, -1, 0.5, linear);
    for (size_t i = 0; i < n; i++)
      for (size_t j = 0; j < n; j++) {
        matrix[i * n + j] = i == j ? 0.05 : 0;
        for (size_t k = 0; k < n; k++)
          matrix[i * n + j] += root[k * n + i] * root[k * n + j];
      }
    const double most = gen_between(&g, 0.1, 2);
    simplex(n, most, limit, bound);
    assert_true(ef__least_quadratic(n, matrix, linear, n + 1, limit, bound, x));
    double sum = 0, here = 0, downhill = 0;
    for (size_t i = 0; i < n; i++) {
      slope[i] = linear[i];
      for (size_t k = 0; k < n; k++)
        slope[i] += matrix[i * n + k] * x[k];
      assert_true(x[i] >= -near);
      sum += x[i];
      here += slope[i] * x[i];
      downhill = fmin(downhill, slope[i] * most);
    }
    assert_true(sum <= most * (1 + near));
    assert_near(fmin(downhill - here, 0), 0, near);
    n_at_sum += sum > most * (1 - 1e-12);
    n_inside += sum < most * (1 - 1e-6);
  }
  assert_true(n_at_sum > 200 && n_inside > 200);
}

static void quadratic_refuses(void **state) {
  (void)state;
  const double flat[4] = {1, 1, 1, 1}, round[4] = {1, 0, 0, 1};
  const double linear[2] = {0, 0};
  /* x0 >= 1 and -x0 >= 0 at once. */
  const double limit[4] = {1, 0, -1, 0}, bound[2] = {1, 0};
  double x[2];
  assert_false(ef__least_quadratic(2, flat, linear, 1, limit, bound, x));
  assert_false(ef__least_quadratic(2, round, linear, 2, limit, bound, x));
  assert_true(ef__least_quadratic(2, round, linear, 1, limit, bound, x));
  assert_near(x[0], 1, 1e-15);
  assert_near(x[1], 0, 0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(solves_by_hand),
      cmocka_unit_test(dependent_columns_share_one_place),
      cmocka_unit_test(nothing_pulls),
      cmocka_unit_test(random_problems_end_at_the_optimum),
      cmocka_unit_test(quadratic_on_a_simplex),
      cmocka_unit_test(quadratic_refuses),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
