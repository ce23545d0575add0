/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Yellowness and whiteness of whites, steps of the grey scale. No worked example
 * of whiteness was at hand. */
#include <evenfield/difference.h>

#include "figures.h"
#include "near.h"

/* A perfect white is not yellow: coefficients of five digits leave 0.0007. Its
 * whiteness is 100 and its tint 0 but for the four digits of the white's x, y:
 * half a unit of the fourth times the coefficients. */
static void whites_are_white(void **state) {
  (void)state;
  figures f = figures_read("published", "yellowness-whites.csv");
  const size_t x = figures_column(&f, "X"), cx = figures_column(&f, "cx");
  deviation largest = {0};
  assert_int_equal(f.n_rows, 4);
  for (size_t row = 0; row < f.n_rows; ++row) {
    const ef_white_scale *const scale = ef_white_scale_find(
        figures_text(&f, row, 0), figures_text(&f, row, 1), NULL);
    assert_non_null(scale);
    assert_near(scale->yellow_x, figures_number(&f, row, cx), 0);
    assert_near(scale->yellow_z, figures_number(&f, row, cx + 1), 0);
    const ef_xyz white = {figures_number(&f, row, x),
                          figures_number(&f, row, x + 1),
                          figures_number(&f, row, x + 2)};
    const ef_whiteness w = ef_whiteness_of(white, scale);
    deviation_add(&largest, w.yellowness, 0, figures_text(&f, row, 1));
    assert_near(w.yellowness, 0, 0.0007);
    assert_near(w.whiteness, 100, 0.5e-4 * (800 + 1700) + 0.01);
    assert_near(w.tint, 0, 0.5e-4 * (1000 + 650) + 0.01);
  }
  deviation_print(&largest, "yellowness of whites");
  figures_free(&f);
}

/* Each published difference is of its own step, also within half of what its
 * tolerance allows, and the step changes halfway to the next. */
static void grey_scale(void **state) {
  (void)state;
  figures f = figures_read("published", "grey-scale.csv");
  assert_int_equal(f.n_rows, 9);
  for (size_t row = 0; row < f.n_rows; ++row) {
    const char *const step = figures_text(&f, row, 0);
    const double d = figures_number(&f, row, 1);
    const double allowed = figures_number(&f, row, 2);
    assert_string_equal(ef_grey_scale_grade(d), step);
    assert_string_equal(ef_grey_scale_grade(d + allowed), step);
    if (row > 0)
      assert_string_equal(ef_grey_scale_grade(d - allowed), step);
    if (row + 1 == f.n_rows)
      break;
    const double halfway = 0.5 * (d + figures_number(&f, row + 1, 1));
    assert_string_equal(ef_grey_scale_grade(halfway - 1e-9), step);
    assert_string_equal(ef_grey_scale_grade(halfway + 1e-9),
                        figures_text(&f, row + 1, 0));
  }
  assert_null(ef_grey_scale_grade(-0.1));
  assert_null(ef_grey_scale_grade(NOT_A_NUMBER));
  figures_free(&f);
}

/* ISO/CIE 23603 (CIE S 012): B reaches from 0.25 to 0.50, as a second text has
 * it; the other limits are from memory. */
static void simulators(void **state) {
  (void)state;
  assert_string_equal(ef_simulator_grade(0.2500001), "B");
  assert_string_equal(ef_simulator_grade(0.5), "B");
  assert_string_equal(ef_simulator_grade(0), "A");
  assert_string_equal(ef_simulator_grade(0.25), "A");
  assert_string_equal(ef_simulator_grade(0.7), "C");
  assert_string_equal(ef_simulator_grade(1.5), "D");
  assert_string_equal(ef_simulator_grade(2.1), "E");
  assert_null(ef_simulator_grade(NOT_A_NUMBER));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(whites_are_white),
      cmocka_unit_test(grey_scale),
      cmocka_unit_test(simulators),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
