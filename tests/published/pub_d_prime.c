/* SPDX-License-Identifier: GPL-3.0-or-later */
/* d' and answers, task by task, beside tables of the models (sources in the CSV
 * files). */
#include <stdlib.h>

#include <evenfield/difference.h>

#include "figures.h"
#include "near.h"

/* Six decimals: half a unit of the last, and rounding. */
#define PRINTED 5.01e-7

static void share_of_right_answers(void **state) {
  (void)state;
  figures f = figures_read("published", "dprime-correct.csv");
  deviation largest = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const double d = figures_number(&f, row, 0);
    const double value[] = {
        ef_task_proportion(EF_TASK_2IFC, 0, d),
        ef_task_proportion(EF_TASK_TRIANGLE, 0, d),
        ef_independent_best_correct(d),
    };
    for (size_t i = 0; i < 3; ++i) {
      const double printed = figures_number(&f, row, i + 1);
      deviation_add(&largest, value[i], printed, f.column[i + 1]);
      assert_near(value[i], printed, PRINTED);
    }
  }
  assert_int_equal(f.n_rows, 21);
  deviation_print(&largest, "share right at d'");
  figures_free(&f);
}

static void d_prime_of_a_share(void **state) {
  (void)state;
  figures f = figures_read("published", "dprime-inverse.csv");
  deviation largest = {0};
  size_t n = 0;
  for (size_t row = 0; row < f.n_rows; ++row) {
    const double p = figures_number(&f, row, 0);
    const double value[] = {
        ef_task_d_prime(EF_TASK_2IFC, 0, p),
        ef_task_d_prime(EF_TASK_TRIANGLE, 0, p),
        /* hits and false alarms without bias */
        ef_independent_d_prime(p, 1 - p),
    };
    for (size_t i = 0; i < 3; ++i) {
      const double printed = figures_number(&f, row, i + 1);
      if (isnan(printed)) {
        /* at chance the table has no figure and we have 0 */
        assert_true(isnan(value[i]) || value[i] == 0);
        continue;
      }
      deviation_add(&largest, value[i], printed, f.column[i + 1]);
      assert_near(value[i], printed, PRINTED);
      n++;
    }
  }
  assert_int_equal(n, 12 + 17 + 12);
  deviation_print(&largest, "d' of a share right");
  figures_free(&f);
}

/* As printed in ASTM E1885. */
static void triangle_as_published(void **state) {
  (void)state;
  assert_near(ef_task_d_prime(EF_TASK_TRIANGLE, 0, 0.50), 1.47, 0.005);
  assert_near(ef_task_d_prime(EF_TASK_TRIANGLE, 0, 0.60), 1.98, 0.005);
  assert_near(ef_task_d_prime(EF_TASK_TRIANGLE, 0, 0.70), 2.50, 0.005);
}

static void same_different(void **state) {
  (void)state;
  figures f = figures_read("published", "dprime-same-different.csv");
  deviation largest = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const double alarms = figures_number(&f, row, 0);
    const double hits = figures_number(&f, row, 1);
    /* k_diff of the table through F = 2 Phi(-k / sqrt 2) */
    const double k = figures_number(&f, row, 2);
    assert_near(erfc(k / 2), alarms, 2e-7);
    const double value[] = {
        ef_task_d_prime(EF_TASK_SAME_DIFFERENT, alarms, hits),
        ef_independent_d_prime(hits, alarms),
        ef_task_d_prime(EF_TASK_YES_NO, alarms, hits),
    };
    for (size_t i = 0; i < 3; ++i) {
      const double printed = figures_number(&f, row, i + 3);
      deviation_add(&largest, value[i], printed, f.column[i + 3]);
      assert_near(value[i], printed, PRINTED);
    }
  }
  assert_true(f.n_rows > 70);
  deviation_print(&largest, "same-different d'");
  figures_free(&f);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(share_of_right_answers),
      cmocka_unit_test(d_prime_of_a_share),
      cmocka_unit_test(triangle_as_published),
      cmocka_unit_test(same_different),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
