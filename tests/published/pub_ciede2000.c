/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The 34 pairs of Sharma, Wu & Dalal (2005), Table 1: achromatic colours, the
 * branches of the mean hue, the rotation term, and large differences. */
#include "figures.h"
#include "near.h"

#include <evenfield/difference.h>

static ef_lab lab_at(const figures *f, size_t row, size_t first_column) {
  return (ef_lab){figures_number(f, row, first_column),
                  figures_number(f, row, first_column + 1),
                  figures_number(f, row, first_column + 2)};
}

static void pairs_agree_to_four_decimals(void **state) {
  (void)state;
  figures f = figures_read("published", "ciede2000_pairs.csv");
  assert_int_equal(f.n_rows, 34);
  deviation worst = {0, ""};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const ef_lab a = lab_at(&f, row, 0), b = lab_at(&f, row, 3);
    const double published = figures_number(&f, row, 6);
    const double there = ef_delta_e_ciede2000(a, b, 1, 1, 1);
    const double back = ef_delta_e_ciede2000(b, a, 1, 1, 1);
    char where[32];
    snprintf(where, sizeof where, "pair %zu", row + 1);
    deviation_add(&worst, there, published, where);
    /* Half a unit of the fourth decimal. */
    assert_near(there, published, 0.5e-4);
    assert_near(back, published, 0.5e-4);
  }
  deviation_print(&worst, "CIEDE2000, 34 published pairs");
  figures_free(&f);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(pairs_agree_to_four_decimals),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
