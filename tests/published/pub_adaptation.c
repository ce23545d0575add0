/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Chromatic adaptation: the published Bradford matrix from D65 to D50, and
 * corresponding colours computed elsewhere (sources in the CSV files). */
#include <evenfield/colour.h>

#include "figures.h"
#include "near.h"

static ef_adaptation adaptation_of(const figures *f, size_t row) {
  ef_adaptation adaptation;
  assert_int_equal(
      ef_adaptation_find(figures_text(f, row, 0), &adaptation, NULL), EF_OK);
  return adaptation;
}

static ef_xyz xyz_at(const figures *f, size_t row, size_t column) {
  return (ef_xyz){figures_number(f, row, column),
                  figures_number(f, row, column + 1),
                  figures_number(f, row, column + 2)};
}

/* Seven decimals: half a unit. */
static void d65_to_d50(void **state) {
  (void)state;
  const ef_xyz d65 = {0.95047, 1, 1.08883}, d50 = {0.96422, 1, 0.82521};
  figures f = figures_read("published", "adaptation-d65-d50.csv");
  deviation off = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    double matrix[9];
    assert_int_equal(ef_adaptation_matrix(adaptation_of(&f, row), d65, d50,
                                          matrix, NULL),
                     EF_OK);
    for (size_t c = 0; c < 3; ++c) {
      deviation_add(&off, matrix[row % 3 * 3 + c],
                    figures_number(&f, row, 2 + c), figures_text(&f, row, 0));
    }
  }
  assert_int_equal(f.n_rows, 6);
  deviation_print(&off, "matrices from D65 to D50");
  assert_near(off.largest, 0, 0.5e-7 + 1e-15);
  figures_free(&f);
}

/* Six decimals: half a unit. */
static void corresponding_colours(void **state) {
  (void)state;
  figures f = figures_read("published", "adaptation-examples.csv");
  deviation off = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    double matrix[9];
    assert_int_equal(
        ef_adaptation_matrix(adaptation_of(&f, row), xyz_at(&f, row, 4),
                             xyz_at(&f, row, 7), matrix, NULL),
        EF_OK);
    const ef_xyz actual = ef_xyz_transform(matrix, xyz_at(&f, row, 1));
    const ef_xyz expected = xyz_at(&f, row, 10);
    const char *const where = figures_text(&f, row, 0);
    deviation_add(&off, actual.X, expected.X, where);
    deviation_add(&off, actual.Y, expected.Y, where);
    deviation_add(&off, actual.Z, expected.Z, where);
  }
  assert_int_equal(f.n_rows, 4);
  deviation_print(&off, "corresponding colours");
  assert_near(off.largest, 0, 0.5e-6 + 1e-12);
  figures_free(&f);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(d65_to_d50),
      cmocka_unit_test(corresponding_colours),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
