/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <evenfield/observer.h>

#include "near.h"

static double residual_of(const char *name, double matrix[9]) {
  ef_error error = {0};
  ef_observer *const observer = ef_observer_new(name, &error);
  if (observer == NULL)
    fail_msg("%s", error.message);
  double residual = -1;
  assert_int_equal(ef_observer_cone_matrix(observer, matrix, &residual, &error),
                   EF_OK);
  ef_observer_free(observer);
  printf("# %s: largest deviation of a cone function %.3g\n", name, residual);
  return residual;
}

/* Their XYZ are transforms of their cones (CIE 170-2:2015, table 1 for 2
 * degrees: X = 1.94735469 L - 1.41445123 M + 0.36476327 S, and so on). */
static void functions_that_belong_together(void **state) {
  (void)state;
  double m[9];
  assert_true(residual_of("cie-2015-2", m) < 1e-12);
  const double x[3] = {1.94735469, 0.68990272, 0};
  const double y[3] = {-1.41445123, 0.34832189, 0};
  const double z[3] = {0.36476327, 0, 1.93485343};
  for (int i = 0; i < 3; ++i) {
    for (int k = 0; k < 3; ++k) {
      const double column = m[3 * i] * (k == 0   ? x[0]
                                        : k == 1 ? y[0]
                                                 : z[0]) +
                            m[3 * i + 1] * (k == 0   ? x[1]
                                            : k == 1 ? y[1]
                                                     : z[1]) +
                            m[3 * i + 2] * (k == 0   ? x[2]
                                            : k == 1 ? y[2]
                                                     : z[2]);
      assert_near(column, i == k, 1e-8); /* digits of the table */
    }
  }
  assert_true(residual_of("cie-2015-10", m) < 1e-12);
  assert_true(residual_of("model:age=45,field=4", m) < 1e-12);
}

/* The CIE 1931 functions are not those of the CIE 2006 cones, above all below
 * 460 nm, but near them. */
static void borrowed_cones_are_fitted(void **state) {
  (void)state;
  double m[9];
  const double of_1931 = residual_of("cie-1931", m);
  assert_true(of_1931 > 0.05 && of_1931 < 0.25);
  const double of_1964 = residual_of("cie-1964", m);
  assert_true(of_1964 > 1e-4 && of_1964 < 0.05);
}

static void two_dimensions_are_too_few(void **state) {
  (void)state;
  ef_error error = {0};
  ef_observer *const observer =
      ef_observer_new("protanope", &error);
  if (observer == NULL)
    fail_msg("%s", error.message);
  double m[9] = {37.23};
  assert_int_equal(ef_observer_cone_matrix(observer, m, NULL, &error),
                   EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "three dimensions");
  assert_true(m[0] == 37.23);
  ef_observer_free(observer);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(functions_that_belong_together),
      cmocka_unit_test(borrowed_cones_are_fitted),
      cmocka_unit_test(two_dimensions_are_too_few),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
