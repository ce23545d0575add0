/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Summary of several observers. Its numbers: published/pub_group.c. */
#include <evenfield/panel.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

/* Exactly known thresholds: the spread is their standard deviation (REML) or
 * sqrt((n - 1) / n) times that (ML), the mean the geometric one, its interval
 * Student's t. t(0.975, 3) = 3.18245. */
static void exactly_known_thresholds(void **state) {
  (void)state;
  const double value[] = {1, 2, 4, 8};
  const double se[] = {1e-9, 1e-9, 1e-9, 1e-9};
  ef_group g;
  ef_error error;
  assert_int_equal(ef_group_summary(4, value, se, EF_GROUP_RESTRICTED, 0.95,
                                    NULL, &g, &error),
                   EF_OK);
  const double sd = log(2) * sqrt(5.0 / 3);
  assert_near(g.mean.value, sqrt(8), 1e-9);
  assert_near_relative(g.spread.value, sd, 1e-6);
  assert_near_relative(g.mean.high, sqrt(8) * exp(3.18245 * sd / 2), 1e-5);
  assert_near_relative(g.mean.low, sqrt(8) * exp(-3.18245 * sd / 2), 1e-5);
  /* t(0.975, 2) = 4.30265 for the next observer */
  assert_near_relative(g.next_high, sqrt(8) * exp(4.30265 * sd * sqrt(1.25)),
                       1e-5);
  assert_true(g.spread.low > 0.3 * sd && g.spread.low < sd);
  assert_true(g.spread.high > 2 * sd && g.spread.high < 6 * sd);
  assert_true(g.q_p_value < 1e-10);
  assert_int_equal(ef_group_summary(4, value, se, EF_GROUP_LIKELIHOOD, 0.95,
                                    NULL, &g, &error),
                   EF_OK);
  assert_near_relative(g.spread.value, sd * sqrt(0.75), 1e-6);
}

/* No more spread than chance: 0, and the interval begins there. */
static void no_spread(void **state) {
  (void)state;
  const double value[] = {1, 1.02, 0.99}, se[] = {0.1, 0.1, 0.1};
  ef_group g;
  ef_error error;
  assert_int_equal(ef_group_summary(3, value, se, EF_GROUP_RESTRICTED, 0.95,
                                    NULL, &g, &error),
                   EF_OK);
  assert_near(g.spread.value, 0, 0);
  assert_near(g.spread.low, 0, 0);
  assert_true(g.spread.high > 0.05 && isfinite(g.spread.high));
  assert_true(g.q_p_value > 0.9);
  /* Equal thresholds too. */
  const double equal[] = {2, 2, 2};
  assert_int_equal(ef_group_summary(3, equal, se, EF_GROUP_RESTRICTED, 0.95,
                                    NULL, &g, &error),
                   EF_OK);
  assert_near(g.mean.value, 2, 1e-12);
  assert_true(g.spread.high > 0 && isfinite(g.spread.high));
}

static void hear(void *cookie, const char *line) {
  strncpy(cookie, line, 511);
}

static void left_out_and_refused(void **state) {
  (void)state;
  char heard[512] = "";
  const ef_notes notes = {hear, heard};
  const double value[] = {1, NOT_A_NUMBER, 2, -1};
  const double se[] = {0.1, 0.1, 0.1, 0.1};
  ef_group g;
  ef_error error;
  assert_int_equal(ef_group_summary(4, value, se, EF_GROUP_RESTRICTED, 0.95,
                                    &notes, &g, &error),
                   EF_OK);
  assert_int_equal(g.n, 2);
  assert_int_equal(g.n_left_out, 2);
  assert_string_equal(heard, "2 of 4 observers left out of the summary: no "
                             "threshold above 0 with a standard error");
  assert_int_equal(ef_group_summary(2, value, se, EF_GROUP_RESTRICTED, 0.95,
                                    NULL, &g, &error),
                   EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "1 of 2 observers have a threshold above 0 with a "
                      "standard error: a spread needs at least two");
  assert_int_equal(
      ef_group_summary(2, value, se, EF_GROUP_RESTRICTED, 1, NULL, &g, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "interval level is 1, expected between 0.5 and 1");
}

/* How often the interval of the mean holds the truth: 8 people, each known to
 * 0.15, who differ by 0.3; 2000 panels. */
static void interval_of_the_mean(void **state) {
  (void)state;
  gen g = gen_new(31);
  enum { PANELS = 2000, PEOPLE = 8 };
  size_t n_mean = 0, n_spread = 0;
  for (int i = 0; i < PANELS; ++i) {
    double value[PEOPLE], se[PEOPLE];
    for (size_t k = 0; k < PEOPLE; ++k) {
      const double ln = 0.3 * gen_normal(&g) + 0.15 * gen_normal(&g);
      value[k] = 1.7 * exp(ln);
      se[k] = 0.15 * value[k];
    }
    ef_group out;
    ef_error error;
    assert_int_equal(ef_group_summary(PEOPLE, value, se, EF_GROUP_RESTRICTED,
                                      0.95, NULL, &out, &error),
                     EF_OK);
    n_mean += out.mean.low <= 1.7 && 1.7 <= out.mean.high;
    n_spread += out.spread.low <= 0.3 && 0.3 <= out.spread.high;
  }
  printf("# 8 people, 2000 panels: mean held in %.1f %%, spread in %.1f %%\n",
         100.0 * (double)n_mean / PANELS, 100.0 * (double)n_spread / PANELS);
  assert_near((double)n_mean / PANELS, 0.95, 0.02);
  assert_near((double)n_spread / PANELS, 0.95, 0.02);
}

static bool attempt(void *context) {
  (void)context;
  const double value[] = {1, 2}, se[] = {0.1, 0.1};
  ef_group g;
  ef_error error;
  if (ef_group_summary(2, value, se, EF_GROUP_RESTRICTED, 0.95, NULL, &g,
                       &error) == EF_OK)
    return true;
  assert_error(&error, EF_NO_MEMORY, "observers");
  return false;
}

static void without_memory(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(attempt, NULL), 1);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(exactly_known_thresholds),
      cmocka_unit_test(no_spread),
      cmocka_unit_test(left_out_and_refused),
      cmocka_unit_test(interval_of_the_mean),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
