/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "near.h"

#include <evenfield/spectrum.h>

/* ---- Illuminants ------------------------------------------------------- */

static double power_at(const char *name, double wavelength_nm) {
  ef_error error;
  ef_illuminant *const light = ef_illuminant_new(name, &error);
  if (light == NULL)
    fail_msg("%s: %s", name, error.message);
  const ef_grid grid = {1, wavelength_nm, 0, NULL};
  double power = NOT_A_NUMBER;
  assert_int_equal(ef_illuminant_sample(light, &grid, &power, NULL), EF_OK);
  ef_illuminant_free(light);
  return power;
}

static void every_named_illuminant_can_be_made(void **state) {
  (void)state;
  const char *const *names;
  const size_t n = ef_illuminant_names(&names);
  assert_int_equal(n, 44);
  const ef_grid grid = ef_grid_standard();
  double *const power = malloc(grid.count * sizeof *power);
  assert_non_null(power);
  for (size_t i = 0; i < n; ++i) {
    ef_illuminant *const light = ef_illuminant_new(names[i], NULL);
    assert_non_null(light);
    assert_string_equal(ef_illuminant_name(light), names[i]);
    assert_int_equal(ef_illuminant_sample(light, &grid, power, NULL), EF_OK);
    double sum = 0;
    for (size_t k = 0; k < grid.count; ++k) {
      assert_true(power[k] >= 0);
      sum += power[k];
    }
    assert_true(sum > 0);
    ef_illuminant_free(light);
  }
  free(power);
  ef_illuminant_free(NULL);
}

static void illuminants_follow_formula_or_table(void **state) {
  (void)state;
  assert_near(power_at("E", 123.4), 100, 0);
  assert_near(power_at("A", 560), 100, 0);
  assert_near(power_at("planck:2856", 560), 100, 0);
  assert_near(power_at("daylight:5003", 560), 100, 0);
  assert_near(power_at("d65", 560), 100, 0);
  /* Linear between 5 nm rows: the value at 527 lies two fifths of the way. */
  const double left = power_at("C", 525);
  const double right = power_at("C", 530);
  assert_near(power_at("C", 527), left + 0.4 * (right - left), 1e-12);
  assert_near(power_at("FL2", 379), 0, 0);
  assert_near(power_at("FL2", 781), 0, 0);
  assert_true(power_at("FL2", 380) > 0);
  assert_near(power_at("D65", 831), 0, 0);
  /* Wien's law: the peak of 5000 K lies at 2897.77 um K / 5000 K. */
  assert_true(power_at("planck:5000", 579.554) > power_at("planck:5000", 578));
  assert_true(power_at("planck:5000", 579.554) > power_at("planck:5000", 581));
}

static void check_unknown(const char *name, ef_status status,
                          const char *part) {
  ef_error error;
  assert_null(ef_illuminant_new(name, &error));
  assert_error(&error, status, part);
  assert_null(ef_illuminant_new(name, NULL));
}

static void bad_illuminant_names_are_answered(void **state) {
  (void)state;
  check_unknown("FL13", EF_UNKNOWN_NAME,
                "near names: FL1, FL3, FL10, FL11, FL12");
  check_unknown("D56", EF_UNKNOWN_NAME, "near names: D50, D55, D65");
  check_unknown("daylight6504", EF_UNKNOWN_NAME, "near names: daylight:6504");
  check_unknown("", EF_UNKNOWN_NAME, "no illuminant is called ''");
  check_unknown("daylight:3999", EF_INVALID, "from 4000 to 25000 K");
  check_unknown("daylight:25001", EF_INVALID, "from 4000 to 25000 K");
  check_unknown("daylight:", EF_INVALID, "'daylight:'");
  check_unknown("daylight:65oo", EF_INVALID, "'daylight:65oo'");
  check_unknown("planck:499", EF_INVALID, "from 500 to 100000 K");
  check_unknown("planck:nan", EF_INVALID, "from 500 to 100000 K");
}

static void names_with_temperatures_are_kept(void **state) {
  (void)state;
  ef_illuminant *const light = ef_illuminant_new("DayLight:6504.0", NULL);
  assert_non_null(light);
  assert_string_equal(ef_illuminant_name(light), "daylight:6504");
  ef_illuminant_free(light);
}

static void illuminant_from_a_measured_light(void **state) {
  (void)state;
  const double value[] = {1, 2, 4, 8, 16, 32, 5, 5, 5, 5, 5, 5};
  const char *const names[] = {"lamp", "other"};
  const ef_grid grid = {6, 400, 10, NULL};
  ef_spectra *const lights =
      ef_spectra_new(2, names, &grid, EF_LIGHT, value, NULL);
  ef_spectra *const surfaces =
      ef_spectra_new(2, names, &grid, EF_SURFACE, value, NULL);
  assert_non_null(lights);
  assert_non_null(surfaces);
  ef_illuminant *const lamp = ef_illuminant_from_spectra(lights, 0, NULL);
  assert_non_null(lamp);
  assert_string_equal(ef_illuminant_name(lamp), "lamp");
  const double at[] = {395, 400, 433, 450, 451};
  const ef_grid to = {5, 0, 0, at};
  double power[5];
  assert_int_equal(ef_illuminant_sample(lamp, &to, power, NULL), EF_OK);
  assert_near(power[0], 0, 0);
  assert_near(power[1], 1, 0);
  double expected[5];
  assert_int_equal(ef_resample(&grid, 1, value, &to, EF_INTERPOLATE_SPRAGUE,
                               EF_EXTEND_ZERO, expected, NULL),
                   EF_OK);
  assert_near(power[2], expected[2], 0);
  assert_near(power[3], 32, 0);
  assert_near(power[4], 0, 0);
  ef_error error;
  assert_null(ef_illuminant_from_spectra(lights, 2, &error));
  assert_error(&error, EF_INVALID, "no spectrum 3 in a set of 2");
  assert_null(ef_illuminant_from_spectra(surfaces, 0, &error));
  assert_error(&error, EF_INVALID, "'lamp' is a surface");
  ef_illuminant_free(lamp);
  ef_spectra_free(lights);
  ef_spectra_free(surfaces);
}

static void bad_grid_for_an_illuminant_is_refused(void **state) {
  (void)state;
  const ef_grid bad = {2, 400, -5, NULL};
  const char *const names[] = {"E", "D65", "planck:3000"};
  for (size_t i = 0; i < 3; ++i) {
    ef_illuminant *const light = ef_illuminant_new(names[i], NULL);
    assert_non_null(light);
    double power[2];
    ef_error error;
    assert_int_equal(ef_illuminant_sample(light, &bad, power, &error),
                     EF_INVALID);
    assert_error(&error, EF_INVALID, "step is -5 nm");
    ef_illuminant_free(light);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(every_named_illuminant_can_be_made),
      cmocka_unit_test(illuminants_follow_formula_or_table),
      cmocka_unit_test(bad_illuminant_names_are_answered),
      cmocka_unit_test(names_with_temperatures_are_kept),
      cmocka_unit_test(illuminant_from_a_measured_light),
      cmocka_unit_test(bad_grid_for_an_illuminant_is_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
