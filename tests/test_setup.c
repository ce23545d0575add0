/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Setups: devices of any kind seen by an observer. */
#include <stdlib.h>

#include "device/device_private.h"
#include "invented_display.h"
#include "must.h"
#include "near.h"

enum { N = INVENTED_SAMPLES };

/* cd/m2, from the spectrum alone. */
static double luminance_at_full_drive(const ef_device *device,
                                      const ef_observer *observer) {
  double spectrum[N], xyz[3];
  const double full[3] = {1, 1, 1};
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = true;
  ef_weights *weights = ef_observer_weights(
      observer, EF_TRISTIMULUS, ef_device_grid(device), &viewing, NULL, NULL);
  assert_int_equal(ef_device_spectrum(device, full, spectrum, NULL, NULL),
                   EF_OK);
  assert_int_equal(ef_weights_apply(weights, 1, spectrum, 1, xyz, NULL), EF_OK);
  ef_weights_free(weights);
  assert_true(xyz[1] > 50);
  return xyz[1];
}

static void setup_is_scaled_to_white(void **state) {
  (void)state;
  static const char *const names[] = {"cie-1931", "cie-1964", "cie-2015-2",
                                      "cie-2015-10"};
  ef_device *device = invented_display(true);
  for (size_t i = 0; i < 4; i++) {
    ef_observer *observer = must_observer(names[i]);
    ef_setup *setup = must_setup(device, observer);
    assert_ptr_equal(ef_setup_device(setup), device);
    assert_ptr_equal(ef_setup_observer(setup), observer);
    assert_true(ef_setup_affine(setup));
    const double full[3] = {1, 1, 1}, none[3] = {0, 0, 0};
    double jacobian[9];
    const ef_xyz white = ef_setup_xyz(setup, full, jacobian);
    assert_near(white.Y, 100, 1e-12);
    assert_near(ef_setup_white(setup).X, white.X, 1e-12);
    assert_near(ef_setup_white(setup).Z, white.Z, 1e-12);
    const ef_xyz black = ef_setup_xyz(setup, none, NULL);
    assert_true(black.Y == ef_setup_black(setup).Y && black.Y > 0);
    assert_near(black.Z + jacobian[6] + jacobian[7] + jacobian[8], white.Z,
                1e-12);
    assert_near(ef_setup_luminance_cd_m2(setup) * ef_setup_scale(setup), 100,
                1e-12);
    assert_near(ef_setup_luminance_cd_m2(setup),
                luminance_at_full_drive(device, observer), 1e-11);
    ef_setup_free(setup);
    ef_observer_free(observer);
  }
  ef_device_free(device);
  ef_setup_free(NULL);
}

static void lights_beside_a_setup(void **state) {
  (void)state;
  ef_device *device = invented_display(true);
  ef_observer *observer = must_observer("cie-1964");
  ef_setup *setup = must_setup(device, observer);
  double light[4 * N], xyz[12];
  invented_lights(light);
  const ef_grid grid = invented_grid();
  assert_int_equal(ef_setup_light_xyz(setup, &grid, 4, light, NULL, xyz, NULL),
                   EF_OK);
  for (int i = 0; i < 4; i++) {
    const double amount[3] = {i == 1, i == 2, i == 3};
    const ef_xyz own = ef_setup_xyz(setup, amount, NULL);
    assert_near(xyz[3 * i], own.X, 1e-12);
    assert_near(xyz[3 * i + 1], own.Y, 1e-12);
    assert_near(xyz[3 * i + 2], own.Z, 1e-12);
  }
  ef_error error;
  const ef_grid bad = {N, 380, -5, NULL};
  assert_int_equal(ef_setup_light_xyz(setup, &bad, 4, light, NULL, xyz, &error),
                   EF_INVALID);
  assert_int_equal(error.status, EF_INVALID);
  assert_int_equal(ef_setup_light_xyz(setup, &bad, 4, light, NULL, xyz, NULL),
                   EF_INVALID);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
}

static void setups_at_fault(void **state) {
  (void)state;
  ef_error error;
  ef_device *srgb = ef_display_from_encoding("srgb", NULL, NULL);
  ef_observer *standard = must_observer("cie-1931");
  ef_observer *large = must_observer("cie-1964");
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  assert_null(ef_setup_new(NULL, standard, NULL, NULL, &error));
  assert_error(&error, EF_INVALID, "a setup needs a device and an observer");
  assert_null(ef_setup_new(srgb, large, NULL, NULL, &error));
  assert_error(&error, EF_NO_ANSWER, "observer cie-1964 needs the spectra");
  assert_null(ef_setup_new(srgb, standard, d65, NULL, &error));
  assert_error(&error, EF_INVALID,
               "'srgb' (display) is a light itself and takes no illuminant");
  ef_setup *setup = must_setup(srgb, standard);
  const ef_grid grid = invented_grid();
  double light[4 * N], xyz[3];
  invented_lights(light);
  assert_int_equal(
      ef_setup_light_xyz(setup, &grid, 1, light, NULL, xyz, &error),
      EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "'srgb' (display) has no spectra");
  ef_setup_free(setup);
  ef_illuminant_free(d65);
  ef_observer_free(large);
  ef_observer_free(standard);
  ef_device_free(srgb);
}

/* A kind of device that no display is: it reflects, and its amounts do not
 * add. X = 20 a^2, Y = 50 - 30 a b, Z = 10 + 7 b^3, white 200. */
static void filter_xyz(const void *data, const double *amount, double xyz[3],
                       double *jacobian) {
  const double a = amount[0], b = amount[1], unit = *(const double *)data;
  xyz[0] = unit * 20 * a * a;
  xyz[1] = unit * (50 - 30 * a * b);
  xyz[2] = unit * (10 + 7 * b * b * b);
  if (jacobian == NULL)
    return;
  const double slopes[6] = {40 * a, 0, -30 * b, -30 * a, 0, 21 * b * b};
  for (int i = 0; i < 6; i++)
    jacobian[i] = unit * slopes[i];
}

static ef_status filter_see(const ef_device *device,
                            const ef_observer *observer,
                            const ef_illuminant *illuminant,
                            const ef_notes *notes, ef__colour_map *map,
                            ef_error *error) {
  (void)device, (void)observer, (void)illuminant, (void)notes, (void)error;
  double *unit = malloc(sizeof *unit);
  if (unit == NULL)
    return EF_NO_MEMORY;
  *unit = strcmp(ef_device_name(device), "dark") == 0 ? 0.0 : 1.0;
  map->xyz = filter_xyz;
  map->data = unit;
  map->release = free;
  map->white[0] = map->white[2] = 200 * *unit;
  map->white[1] = 200 * *unit;
  return EF_OK;
}

static ef_device *filter_named(const char *name) {
  static const ef__device_class filter = {
      .kind = "filter", .reflects = true, .see = filter_see};
  static const char *const names[] = {"upper", "lower"};
  ef_tone_curve *linear = ef_tone_curve_new("linear", NULL);
  const ef_tone_curve *const curves[] = {linear, linear};
  ef_device *device = calloc(1, sizeof *device);
  assert_int_equal(
      ef__device_set_up(device, &filter, name, 2, names, NULL, curves, NULL),
      EF_OK);
  ef_tone_curve_free(linear);
  return device;
}

static void other_kinds_of_device(void **state) {
  (void)state;
  ef_error error;
  ef_observer *observer = must_observer("cie-1931");
  ef_illuminant *d50 = ef_illuminant_new("D50", NULL);
  ef_device *device = filter_named("sheet");
  assert_null(ef_setup_new(device, observer, NULL, NULL, &error));
  assert_error(&error, EF_INVALID, "'sheet' (filter) reflects light; say");
  ef_setup *setup = ef_setup_new(device, observer, d50, NULL, &error);
  assert_non_null(setup);
  assert_false(ef_setup_affine(setup));
  assert_near(ef_setup_scale(setup), 0.5, 0);
  assert_near(ef_setup_black(setup).Y, 25, 0);
  double jacobian[6];
  const double amount[2] = {0.3, 0.8};
  const ef_xyz xyz = ef_setup_xyz(setup, amount, jacobian);
  assert_near(xyz.X, 0.9, 1e-15);
  assert_near(xyz.Y, 25 - 15 * 0.24, 1e-14);
  assert_near(xyz.Z, 5 + 3.5 * 0.512, 1e-14);
  assert_near(jacobian[0], 6, 1e-14);
  assert_near(jacobian[2], -12, 1e-14);
  assert_near(jacobian[5], 10.5 * 0.64, 1e-14);
  ef_setup_free(setup);
  ef_device_free(device);
  device = filter_named("dark");
  assert_null(ef_setup_new(device, observer, d50, NULL, &error));
  assert_error(&error, EF_NO_ANSWER, "the white of 'dark' has no luminance");
  ef_device_free(device);
  ef_illuminant_free(d50);
  ef_observer_free(observer);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(setup_is_scaled_to_white),
      cmocka_unit_test(lights_beside_a_setup),
      cmocka_unit_test(setups_at_fault),
      cmocka_unit_test(other_kinds_of_device),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
