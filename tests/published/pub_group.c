/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Random-effects summary of thirteen relative risks (vaccine-trials.csv), whose
 * estimates are printed in many places; the digits here are from memory:
 * REML tau^2 0.3132, ln mean -0.7145, standard error 0.1798; ML 0.2800,
 * -0.7112, 0.1719; Q 152.233. A relative risk is as good a positive number as a
 * threshold. */
#include <stdlib.h>

#include <evenfield/panel.h>

#include "figures.h"
#include "near.h"

enum { TRIALS = 13 };

static void relative_risks(double risk[TRIALS], double se[TRIALS]) {
  figures f = figures_read("published", "vaccine-trials.csv");
  assert_int_equal(f.n_rows, TRIALS);
  for (size_t i = 0; i < TRIALS; ++i) {
    const double a = figures_number(&f, i, 1), b = figures_number(&f, i, 2);
    const double c = figures_number(&f, i, 3), d = figures_number(&f, i, 4);
    risk[i] = a / (a + b) / (c / (c + d));
    se[i] = risk[i] * sqrt(1 / a - 1 / (a + b) + 1 / c - 1 / (c + d));
  }
  figures_free(&f);
}

/* Four decimals: half a unit of the last. */
static void random_effects(void **state) {
  (void)state;
  double risk[TRIALS], se[TRIALS];
  relative_risks(risk, se);
  ef_group g;
  ef_error error;
  assert_int_equal(ef_group_summary(TRIALS, risk, se, EF_GROUP_RESTRICTED, 0.95,
                                    NULL, &g, &error),
                   EF_OK);
  assert_near(g.spread.value * g.spread.value, 0.3132, 5e-5);
  assert_near(g.mean_ln, -0.7145, 5e-5);
  assert_near(g.se_ln, 0.1798, 5e-5);
  assert_near(g.q, 152.233, 5e-4);
  assert_int_equal(ef_group_summary(TRIALS, risk, se, EF_GROUP_LIKELIHOOD, 0.95,
                                    NULL, &g, &error),
                   EF_OK);
  assert_near(g.spread.value * g.spread.value, 0.2800, 5e-5);
  assert_near(g.mean_ln, -0.7112, 5e-5);
  assert_near(g.se_ln, 0.1719, 5e-5);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(random_effects),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
