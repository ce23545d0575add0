/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Halftone formulas against worked examples. Demichel: the figures beside this
 * test. Of Murray & Davies and of Yule & Nielsen no published example with all
 * its figures was at hand; theirs are worked out from the formulas on paper. */
#include "figures.h"
#include "near.h"

#include <evenfield/device.h>

static void shares_of_two_inks(void **state) {
  (void)state;
  figures f = figures_read("published", "demichel-example.csv");
  const double area[2] = {0.4, 0.4};
  double share[4];
  deviation off = {0};
  static const char *const column[4] = {"white", "cyan", "yellow", "green"};
  ef_demichel(2, area, share);
  for (size_t k = 0; k < 4; k++)
    deviation_add(&off, share[k],
                  figures_number(&f, figures_row(&f, "demichel"),
                                 figures_column(&f, column[k])),
                  column[k]);
  deviation_print(&off, "Demichel's shares");
  assert_near(off.largest, 0, 1e-15);
  figures_free(&f);
}

/* Densities 0.30 of the tint and 1.40 of the solid above paper:
 * (1 - 0.501187) / (1 - 0.0398107) = 0.519494, and with n = 1.7
 * (1 - 10^-0.176471) / (1 - 10^-0.823529) = 0.333916 / 0.849870 = 0.392902. */
static void tone_value_of_densities(void **state) {
  (void)state;
  const double tint = pow(10, -0.30), solid = pow(10, -1.40);
  assert_near(ef_tone_value(1, solid, tint, 1), 0.519494, 1e-6);
  assert_near(ef_tone_value(1, solid, tint, 1.7), 0.392902, 1e-6);
  /* The paper's own reflectance takes no part. */
  assert_near(ef_tone_value(0.83, 0.83 * solid, 0.83 * tint, 1.7), 0.392902,
              1e-6);
}

static void tone_value_without_meaning(void **state) {
  (void)state;
  assert_true(isnan(ef_tone_value(0.8, 0.8, 0.5, 1)));
  assert_true(isnan(ef_tone_value(0.8, 0.1, 0.5, 0.7)));
  assert_true(isnan(ef_tone_value(0.8, -0.001, 0.5, 2)));
  assert_near(ef_tone_value(0.8, -0.2, 0.3, 1), 0.5, 1e-15);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(shares_of_two_inks),
      cmocka_unit_test(tone_value_of_densities),
      cmocka_unit_test(tone_value_without_meaning),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
