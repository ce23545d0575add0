/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tasks, thresholds from one criterion to another, sensitivity and bias. */
#include <evenfield/panel.h>

#include "near.h"

static void assert_refused(const ef_error *error, ef_status status,
                           const char *message) {
  assert_string_equal(error->message, message);
  assert_int_equal(error->status, status);
}

static void names(void **state) {
  (void)state;
  assert_int_equal(ef_task_count(), 5);
  for (size_t i = 0; i < ef_task_count(); ++i) {
    ef_task task;
    ef_error error;
    assert_int_equal(ef_task_find(ef_task_name((ef_task)i), &task, &error),
                     EF_OK);
    assert_int_equal(task, i);
  }
  assert_string_equal(ef_task_positive(EF_TASK_SAME_DIFFERENT), "different");
  assert_near(ef_task_chance(EF_TASK_TRIANGLE), 1.0 / 3, 0);
  assert_true(isnan(ef_task_chance(EF_TASK_YES_NO)));
  ef_task task;
  ef_error error;
  assert_int_equal(ef_task_find("yesno", &task, &error), EF_UNKNOWN_NAME);
  assert_refused(&error, EF_UNKNOWN_NAME,
                 "no task is called 'yesno'; near names: yes-no");
}

static void outside_the_domain(void **state) {
  (void)state;
  assert_true(isnan(ef_task_proportion(EF_TASK_2IFC, 0, -0.1)));
  assert_true(isnan(ef_task_proportion(EF_TASK_YES_NO, 0, 1)));
  assert_true(isnan(ef_task_proportion(EF_TASK_SAME_DIFFERENT, 1, 1)));
  assert_true(isnan(ef_task_d_prime(EF_TASK_2IFC, 0, 0.49)));
  assert_true(isnan(ef_task_d_prime(EF_TASK_2IFC, 0, 1)));
  assert_true(isnan(ef_task_d_prime(EF_TASK_TRIANGLE, 0, 0.33)));
  assert_true(isnan(ef_task_d_prime(EF_TASK_YES_NO, 0.2, 0.1)));
  assert_true(isnan(ef_task_best_d_prime(EF_TASK_SAME_DIFFERENT, 0.4)));
  assert_near(ef_task_d_prime(EF_TASK_2IFC, 0, 0.5), 0, 0);
  assert_near(ef_task_d_prime(EF_TASK_TRIANGLE, 0, 1.0 / 3), 0, 0);
  assert_near(ef_task_d_prime(EF_TASK_SAME_DIFFERENT, 0.2, 0.2), 0, 0);
  assert_near(ef_task_best_d_prime(EF_TASK_SAME_DIFFERENT, 0.5), 0, 0);
  assert_near(ef_task_best_correct(EF_TASK_SAME_DIFFERENT, 0), 0.5, 0);
  /* Greater-less has both sides. */
  assert_near(ef_task_d_prime(EF_TASK_GREATER_LESS, 0, 0.25), -EF_JND_D_PRIME,
              1e-15);
}

/* 75 % in 2IFC is d' = 0.9539, 84.13 % is d' = sqrt 2, 76.02 % is d' = 1. */
static void thresholds_converted(void **state) {
  (void)state;
  const ef_criterion at_75 = {EF_TASK_2IFC, 0.75, 0, NOT_A_NUMBER};
  const ef_criterion at_84 = {EF_TASK_2IFC, 0.84134474606854293, 0,
                              NOT_A_NUMBER};
  const ef_criterion at_1 = {EF_TASK_2IFC, 0, 0, 1};
  const ef_criterion odd_one = {EF_TASK_TRIANGLE, 0.418047, 0, NOT_A_NUMBER};
  const ef_criterion seen = {EF_TASK_YES_NO, 0.5, 0.15865525393145705,
                             NOT_A_NUMBER};
  assert_near(ef_criterion_d_prime(&at_75), EF_JND_D_PRIME, 1e-15);
  assert_near(ef_criterion_d_prime(&at_84), sqrt(2), 1e-14);
  assert_near(ef_criterion_d_prime(&seen), 1, 1e-14);
  double to;
  ef_error error;
  assert_int_equal(ef_threshold_convert(0.9, 1, &at_75, &at_1, &to, &error),
                   EF_OK);
  assert_near(to, 0.9 / EF_JND_D_PRIME, 1e-15);
  assert_int_equal(ef_threshold_convert(0.9, 2, &at_75, &at_84, &to, &error),
                   EF_OK);
  assert_near(to, 0.9 * sqrt(sqrt(2) / EF_JND_D_PRIME), 1e-14);
  /* d' = 1 in the published triangle column: six digits of the share */
  assert_int_equal(ef_threshold_convert(2, 1, &odd_one, &seen, &to, &error),
                   EF_OK);
  assert_near(to, 2, 1e-5);
}

static void thresholds_not_converted(void **state) {
  (void)state;
  const ef_criterion good = {EF_TASK_2IFC, 0.75, 0, NOT_A_NUMBER};
  const ef_criterion chance = {EF_TASK_2IFC, 0.5, 0, NOT_A_NUMBER};
  const ef_criterion unknown = {EF_TASK_YES_NO, 0.5, NOT_A_NUMBER,
                                NOT_A_NUMBER};
  double to = 5;
  ef_error error;
  assert_int_equal(ef_threshold_convert(0, 1, &good, &good, &to, &error),
                   EF_INVALID);
  assert_refused(&error, EF_INVALID,
                 "threshold is 0, expected a number above 0");
  assert_int_equal(ef_threshold_convert(1, -1, &good, &good, &to, &error),
                   EF_INVALID);
  assert_refused(&error, EF_INVALID,
                 "exponent is -1, expected a number above 0");
  assert_int_equal(ef_threshold_convert(1, 1, &chance, &good, &to, &error),
                   EF_NO_ANSWER);
  assert_refused(&error, EF_NO_ANSWER,
                 "the criterion to convert from has no d' above 0 (found 0): "
                 "give a proportion above chance and below 1; yes-no and "
                 "same-different also need the false-alarm rate");
  assert_int_equal(ef_threshold_convert(1, 1, &good, &unknown, &to, &error),
                   EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "convert to has no d' above 0");
  assert_near(to, 5, 0);
}

/* By hand with the normal distribution of another library (Python's): z of
 * 15.5/21 is 0.637484, its density there 0.325585. */
static void yes_no_sensitivity(void **state) {
  (void)state;
  ef_sensitivity s;
  ef_error error;
  assert_int_equal(ef_sensitivity_yes_no(20, 15, 20, 5, &s, &error), EF_OK);
  assert_near(s.hit_rate, 15.5 / 21, 1e-15);
  assert_near(s.d_prime.value, 2 * 0.637484, 2e-6);
  assert_near(s.criterion.value, 0, 1e-15);
  /* rate variance 0.0092053 over the squared density, twice */
  assert_near(s.d_prime.se, sqrt(2 * 0.086838), 2e-6);
  assert_near(s.d_prime.high - s.d_prime.low, 2 * 1.959964 * s.d_prime.se,
              1e-6);
  /* Nothing but "no" to the blanks and "yes" to the rest stays finite. */
  assert_int_equal(ef_sensitivity_yes_no(20, 20, 20, 0, &s, &error), EF_OK);
  assert_true(isfinite(s.d_prime.value) && s.d_prime.value > 3);
  /* Reluctant to say yes: c above 0. */
  assert_int_equal(ef_sensitivity_yes_no(50, 20, 50, 1, &s, &error), EF_OK);
  assert_true(s.criterion.low > 0);
}

static void same_different_sensitivity(void **state) {
  (void)state;
  ef_sensitivity s;
  ef_error error;
  assert_int_equal(ef_sensitivity_same_different(99, 69, 199, 19, &s, &error),
                   EF_OK);
  assert_near(s.hit_rate, 0.695, 1e-15);
  assert_near(s.false_alarm_rate, 0.0975, 1e-15);
  assert_near(
      ef_task_proportion(EF_TASK_SAME_DIFFERENT, 0.0975, s.d_prime.value),
      0.695, 1e-12);
  /* The standard error by moving the rates a little. */
  const double h = 1e-6;
  const double by_h =
      (ef_task_d_prime(EF_TASK_SAME_DIFFERENT, 0.0975, 0.695 + h) -
       ef_task_d_prime(EF_TASK_SAME_DIFFERENT, 0.0975, 0.695 - h)) /
      (2 * h);
  const double by_f =
      (ef_task_d_prime(EF_TASK_SAME_DIFFERENT, 0.0975 + h, 0.695) -
       ef_task_d_prime(EF_TASK_SAME_DIFFERENT, 0.0975 - h, 0.695)) /
      (2 * h);
  const double variance =
      by_h * by_h * 0.695 * 0.305 / 100 + by_f * by_f * 0.0975 * 0.9025 / 200;
  assert_near_relative(s.d_prime.se, sqrt(variance), 1e-6);
  assert_int_equal(ef_sensitivity_same_different(20, 4, 20, 5, &s, &error),
                   EF_OK);
  assert_near(s.d_prime.value, 0, 0);
  assert_true(isnan(s.d_prime.se));
}

static void sensitivity_refused(void **state) {
  (void)state;
  ef_sensitivity s;
  ef_error error;
  assert_int_equal(ef_sensitivity_yes_no(20, 15, 0, 0, &s, &error),
                   EF_NO_ANSWER);
  assert_refused(&error, EF_NO_ANSWER,
                 "no trials without signal: d' and criterion need both kinds");
  assert_int_equal(ef_sensitivity_yes_no(0, 0, 4, 0, &s, &error), EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "no trials with signal");
  assert_int_equal(ef_sensitivity_same_different(20, 21, 5, 0, &s, &error),
                   EF_MALFORMED);
  assert_refused(&error, EF_MALFORMED,
                 "21 positive answers in 20 trials with signal");
}

static void leaning_to_one_place(void **state) {
  (void)state;
  /* Right in 95 of 100 when first, 60 of 100 when second. */
  const size_t first[] = {100, 50}, second[] = {100, 50};
  const size_t first_right[] = {95, 49}, second_right[] = {60, 40};
  ef_place_bias b;
  ef_error error;
  assert_int_equal(ef_place_bias_measure(1, first, first_right, second,
                                         second_right, &b, &error),
                   EF_OK);
  assert_near(b.share, (95 + 40) / 200.0, 1e-15);
  assert_near(b.expected, 0.5, 1e-15);
  /* z(95.5/101) = 1.603108, z(60.5/101) = 0.250785: half their difference */
  assert_near(b.bias.value, 0.676161, 1e-6);
  assert_near(b.d_prime.value, 1.853893 / sqrt(2), 2e-6);
  assert_true(b.p_value < 1e-6 && b.bias.low > 0);
  /* Two levels agree better than one. */
  ef_place_bias both;
  assert_int_equal(ef_place_bias_measure(2, first, first_right, second,
                                         second_right, &both, &error),
                   EF_OK);
  assert_true(both.bias.se < b.bias.se);
  /* Exchanged places: the sign changes, nothing else. */
  ef_place_bias other;
  assert_int_equal(ef_place_bias_measure(2, second, second_right, first,
                                         first_right, &other, &error),
                   EF_OK);
  assert_near(other.bias.value, -both.bias.value, 1e-15);
  assert_near(other.d_prime.value, both.d_prime.value, 1e-15);
  assert_near(other.p_value, both.p_value, 1e-15);
}

static void leaning_refused(void **state) {
  (void)state;
  const size_t first[] = {10, 0}, second[] = {0, 12}, right[] = {5, 0};
  const size_t too_many[] = {0, 13};
  ef_place_bias b;
  ef_error error;
  assert_int_equal(
      ef_place_bias_measure(2, first, right, second, second, &b, &error),
      EF_NO_ANSWER);
  assert_refused(&error, EF_NO_ANSWER,
                 "no level was shown in both places: a leaning to one of them "
                 "shows only against the other");
  assert_int_equal(
      ef_place_bias_measure(2, first, right, second, too_many, &b, &error),
      EF_MALFORMED);
  assert_refused(&error, EF_MALFORMED, "row 2: 13 right answers in 12 trials");
  assert_int_equal(error.line, 2);
}

/* t(0.975, 3) = 3.18245, chi-square(0.975 and 0.025, 3) = 9.34840, 0.215795
 * (tables). */
static void adjustment(void **state) {
  (void)state;
  const double setting[] = {10, 12, 11, 15};
  ef_adjustment a;
  ef_error error;
  assert_int_equal(ef_adjustment_summary(4, setting, 11, &a, &error), EF_OK);
  assert_near(a.equality.value, 12, 1e-15);
  assert_near(a.error.value, 1, 1e-15);
  assert_near(a.spread.value, sqrt(14.0 / 3), 1e-15);
  const double se = sqrt(14.0 / 12);
  assert_near(a.equality.se, se, 1e-15);
  assert_near(a.equality.high, 12 + 3.18245 * se, 1e-5);
  assert_near(a.error.low, 1 - 3.18245 * se, 1e-5);
  assert_near(a.spread.low, sqrt(14 / 9.34840), 1e-5);
  assert_near(a.spread.high, sqrt(14 / 0.215795), 1e-4);
  assert_near(a.jnd, 0.674490 * a.spread.value, 1e-5);
}

static void adjustment_refused(void **state) {
  (void)state;
  const double equal[] = {0.1, 0.1, 0.1}, broken[] = {1, INFINITE};
  ef_adjustment a;
  ef_error error;
  assert_int_equal(ef_adjustment_summary(1, equal, 0, &a, &error),
                   EF_NO_ANSWER);
  assert_refused(&error, EF_NO_ANSWER,
                 "1 setting: a spread needs at least two");
  assert_int_equal(ef_adjustment_summary(3, equal, 0, &a, &error),
                   EF_NO_ANSWER);
  assert_refused(&error, EF_NO_ANSWER,
                 "all 3 settings are 0.1: no spread to take a JND from; record "
                 "them with more digits");
  assert_int_equal(ef_adjustment_summary(2, broken, 0, &a, &error),
                   EF_MALFORMED);
  assert_refused(&error, EF_MALFORMED, "setting 2 is not a number");
  assert_int_equal(error.line, 2);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(names),
      cmocka_unit_test(outside_the_domain),
      cmocka_unit_test(thresholds_converted),
      cmocka_unit_test(thresholds_not_converted),
      cmocka_unit_test(yes_no_sensitivity),
      cmocka_unit_test(same_different_sensitivity),
      cmocka_unit_test(sensitivity_refused),
      cmocka_unit_test(leaning_to_one_place),
      cmocka_unit_test(leaning_refused),
      cmocka_unit_test(adjustment),
      cmocka_unit_test(adjustment_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
