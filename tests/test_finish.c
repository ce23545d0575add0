/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Whiteness, several angles, repeated readings, and what noise leaves open. */
#include <evenfield/difference.h>

#include "gen.h"
#include "near.h"

/* The formulas worked in another language's arithmetic. */
static void white_paper(void **state) {
  (void)state;
  const ef_white_scale *const scale =
      ef_white_scale_find("CIE-1964", "d65", NULL);
  assert_non_null(scale);
  assert_true(scale->is_cie);
  const ef_whiteness paper =
      ef_whiteness_of((ef_xyz){84.2, 88.0, 103.5}, scale);
  assert_near(paper.whiteness, 114.79767138193685, 1e-11);
  assert_near(paper.tint, -0.12209285455205077, 1e-11);
  assert_near(paper.yellowness, -10.721409090909084, 1e-12);
  assert_true(paper.is_white);
}

static void limits_of_white(void **state) {
  (void)state;
  const ef_white_scale *const scale =
      ef_white_scale_find("cie-1931", "D65", NULL);
  const struct {
    ef_xyy colour;
    bool is_white;
  } rows[] = {
      {{0.3127, 0.3290, 100}, true},  /* W 100, T 0 */
      {{0.3127, 0.3290, 70.1}, true}, /* 5 Y - 280 = 70.5 */
      {{0.3127, 0.3290, 69.9}, false}, /* W is above 5 Y - 280 */
      {{0.3127, 0.3290, 40}, false},
      {{0.3127, 0.3660, 95}, false},  /* W 32 */
      {{0.3158, 0.3285, 95}, true},   /* T -3.4 */
      {{0.3164, 0.3285, 95}, false},  /* T -4.03 */
      {{0.3112, 0.3293, 95}, true},   /* T 1.7 */
      {{0.3105, 0.3292, 95}, false},  /* T 2.3 */
  };
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    const ef_whiteness w =
        ef_whiteness_of(ef_xyy_to_xyz(rows[i].colour), scale);
    assert_int_equal(w.is_white, rows[i].is_white);
  }
  const ef_whiteness black = ef_whiteness_of((ef_xyz){0, 0, 0}, scale);
  assert_true(isnan(black.whiteness) && isnan(black.yellowness));
  assert_false(black.is_white);
}

static void no_whiteness(void **state) {
  (void)state;
  ef_error error;
  assert_null(ef_white_scale_find("cie-2015-10", "D65", &error));
  assert_int_equal(error.status, EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "whiteness is defined for cie-1931 and cie-1964 under C, "
                      "D50 and D65, not for cie-2015-10 under D65");
  assert_null(ef_white_scale_find("cie-1931", "FL11", NULL));
  const ef_white_scale *const d50 =
      ef_white_scale_find("cie-1931", "D50", NULL);
  assert_false(d50->is_cie);
  const ef_whiteness paper =
      ef_whiteness_of((ef_xyz){84.2, 88.0, 73.5}, d50);
  assert_true(isnan(paper.yellowness) && isfinite(paper.whiteness));
}

static void angles(void **state) {
  (void)state;
  const double difference[] = {0.6, 2.5, 0.5, 2.5}, weight[] = {2, 1, 1, 0};
  ef_angles a;
  ef_error error;
  assert_int_equal(ef_angles_combine(4, difference, weight, &a, &error), EF_OK);
  assert_near(a.worst, 2.5, 0);
  assert_int_equal(a.worst_angle, 1);
  assert_near(a.mean, (1.2 + 2.5 + 0.5) / 4, 1e-15);
  assert_near(a.total, sqrt((0.72 + 6.25 + 0.25) / 4), 1e-15);
  /* One difference everywhere is the difference of the finish. */
  const double even[] = {1.3, 1.3, 1.3};
  assert_int_equal(ef_angles_combine(3, even, NULL, &a, &error), EF_OK);
  assert_near(a.total, 1.3, 1e-15);
  assert_near(a.mean, 1.3, 1e-15);
  const double broken[] = {1, NOT_A_NUMBER, 3};
  assert_int_equal(ef_angles_combine(3, broken, NULL, &a, &error), EF_OK);
  assert_true(isnan(a.worst) && isnan(a.mean) && isnan(a.total));
  assert_int_equal(a.worst_angle, 1);
}

static void angles_refused(void **state) {
  (void)state;
  const double difference[] = {1, 2}, negative[] = {1, -0.5}, none[] = {0, 0};
  ef_angles a;
  ef_error error;
  assert_int_equal(ef_angles_combine(2, difference, negative, &a, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "the weight of angle 2 is -0.5, expected a number from "
                      "0");
  assert_int_equal(ef_angles_combine(2, difference, none, &a, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "the weights of the angles sum to 0, "
                                     "expected a number above 0");
  assert_int_equal(ef_angles_combine(0, difference, NULL, &a, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "a finish needs at least one angle");
}

static void readings(void **state) {
  (void)state;
  const double value[] = {1, 5, 3, 5, 8, 5};
  double mean[2], sd[2];
  ef_error error;
  assert_int_equal(ef_readings_mean(3, 2, value, mean, sd, &error), EF_OK);
  assert_near(mean[0], 4, 1e-15);
  assert_near(sd[0], sqrt(13), 1e-15); /* (9 + 1 + 16) / 2 */
  assert_near(mean[1], 5, 0);
  assert_near(sd[1], 0, 0);
  assert_int_equal(ef_readings_mean(1, 2, value, mean, sd, &error), EF_OK);
  assert_true(mean[0] == 1 && isnan(sd[0]) && isnan(sd[1]));
  const double broken[] = {1, 2, 3, INFINITE};
  assert_int_equal(ef_readings_mean(2, 2, broken, mean, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "value 2 of reading 2 is not a finite number");
  assert_int_equal(ef_readings_mean(0, 2, value, mean, sd, &error), EF_INVALID);
  assert_string_equal(error.message, "no reading to take the mean of");
}

static void scatter_of_readings(void **state) {
  (void)state;
  const double xyz[] = {10, 20, 30, 12, 20, 27, 14, 26, 27};
  ef_scatter s;
  ef_error error;
  assert_int_equal(ef_scatter_of_readings(3, xyz, &s, &error), EF_OK);
  const double expected[] = {4, 6, -3, 6, 12, -3, -3, -3, 3};
  for (size_t k = 0; k < 9; ++k)
    assert_near(s.covariance[k], expected[k], 1e-14);
  assert_int_equal(ef_scatter_of_readings(1, xyz, &s, &error), EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "1 reading: a scatter needs at least two");
}

static void noise_refused(void **state) {
  (void)state;
  const ef_grid grid = {.count = 31, .start_nm = 400, .step_nm = 10};
  ef_observer *const observer = ef_observer_new("cie-1931", NULL);
  const ef_viewing viewing = ef_viewing_default(NULL);
  ef_weights *const xyz = ef_observer_weights(observer, EF_TRISTIMULUS, &grid,
                                              &viewing, NULL, NULL);
  ef_weights *const receptors = ef_observer_weights(
      observer, EF_RECEPTORS, &grid, &viewing, NULL, NULL);
  double sd[31] = {0};
  sd[30] = -0.1;
  ef_scatter s;
  ef_error error;
  assert_int_equal(ef_scatter_of_noise(xyz, sd, &s, &error), EF_INVALID);
  assert_string_equal(error.message, "the standard deviation of sample 31 is "
                                     "-0.1, expected a number from 0");
  assert_int_equal(ef_scatter_of_noise(receptors, sd, &s, &error), EF_INVALID);
  assert_string_equal(error.message, "the scatter of a colour needs weights of "
                                     "3 channels, found 5");
  ef_weights_free(receptors);
  ef_weights_free(xyz);
  ef_observer_free(observer);
}

/* A lightness difference of CIELAB whose X, Y, Z scatter as one: by hand. */
static void uncertainty_by_hand(void **state) {
  (void)state;
  const ef_conditions conditions =
      ef_conditions_default((ef_xyz){100, 100, 100});
  const ef_xyz grey = {20, 20, 20}, lighter = {22, 22, 22};
  ef_scatter s;
  for (size_t k = 0; k < 9; ++k)
    s.covariance[k] = 0.01; /* 0.1 in each, all alike */
  const ef_metric *const metric = ef_metric_find("cielab", NULL);
  const ef_uncertain u =
      ef_metric_uncertainty(metric, grey, lighter, &conditions, NULL, &s);
  assert_near(u.difference, 116 * (cbrt(0.22) - cbrt(0.20)), 1e-12);
  /* dL / dY = 116 / 3 (Y / 100)^(-2/3) / 100, times 0.1 */
  assert_near_relative(u.sd, 116. / 3 * pow(0.22, -2. / 3) / 1000, 1e-9);
  assert_near_relative(u.noise_alone, u.sd, 1e-9);
  const ef_uncertain both =
      ef_metric_uncertainty(metric, grey, lighter, &conditions, &s, &s);
  const double of_grey = 116. / 3 * pow(0.20, -2. / 3) / 1000;
  assert_near_relative(both.sd, hypot(u.sd, of_grey), 1e-9);
  const ef_uncertain none =
      ef_metric_uncertainty(metric, grey, lighter, &conditions, NULL, NULL);
  assert_true(none.sd == 0 && none.noise_alone == 0);
  /* No difference: no slope, the mean over directions. */
  const ef_uncertain equal =
      ef_metric_uncertainty(metric, grey, grey, &conditions, &s, NULL);
  assert_near(equal.difference, 0, 0);
  assert_near_relative(equal.noise_alone, of_grey, 1e-9);
  assert_near_relative(equal.sd, of_grey / sqrt(3), 1e-9);
  const ef_uncertain unknown = ef_metric_uncertainty(
      metric, grey, (ef_xyz){NOT_A_NUMBER, 1, 1}, &conditions, &s, NULL);
  assert_true(isnan(unknown.difference) && isnan(unknown.sd) &&
              isnan(unknown.noise_alone));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(white_paper),
      cmocka_unit_test(limits_of_white),
      cmocka_unit_test(no_whiteness),
      cmocka_unit_test(angles),
      cmocka_unit_test(angles_refused),
      cmocka_unit_test(readings),
      cmocka_unit_test(scatter_of_readings),
      cmocka_unit_test(noise_refused),
      cmocka_unit_test(uncertainty_by_hand),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
