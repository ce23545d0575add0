/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every tone curve, every display and every setup. */
#include <stdlib.h>

#include "device/device_private.h"
#include "gen.h"
#include "invented_display.h"
#include "near.h"

enum { N = INVENTED_SAMPLES, MAX_POINTS = 40 };

/* ---- Random curves ----------------------------------------------------- */

typedef struct ramp {
  size_t n;
  double drive[MAX_POINTS], level[MAX_POINTS];
} ramp;

/* Uneven steps both ways, neighbouring slopes up to some 40 to 1 apart. */
static ramp random_ramp(gen *g) {
  ramp r = {.n = 2 + gen_below(g, MAX_POINTS - 1)};
  for (size_t i = 1; i < r.n; i++) {
    r.drive[i] = r.drive[i - 1] + gen_between(g, 0.15, 1);
    r.level[i] = r.level[i - 1] + gen_between(g, 0.15, 1);
  }
  const double range = r.drive[r.n - 1];
  for (size_t i = 0; i < r.n; i++)
    r.drive[i] /= range;
  return r;
}

static ef_tone_curve *random_curve(gen *g) {
  static const char *const names[] = {"linear", "iec61966-2-1", "romm"};
  char name[64];
  const size_t kind = gen_below(g, 8);
  if (kind < 3)
    return ef_tone_curve_new(names[kind], NULL);
  if (kind < 5) {
    snprintf(name, sizeof name, "power:%.3f", gen_between(g, 0.4, 4));
    return ef_tone_curve_new(name, NULL);
  }
  const ramp r = random_ramp(g);
  return ef_tone_curve_from_ramp(r.n, r.drive, r.level, NULL);
}

static void curves_strictly_rise_from_0_to_1(void **state) {
  (void)state;
  gen g = gen_new(11);
  for (int k = 0; k < 300; k++) {
    ef_tone_curve *curve = random_curve(&g);
    assert_non_null(curve);
    assert_true(ef_tone_curve_amount(curve, 0, NULL) == 0);
    assert_true(ef_tone_curve_amount(curve, 1, NULL) == 1);
    assert_true(ef_tone_curve_drive(curve, 1) == 1);
    double last = 0;
    for (int i = 1; i <= 500; i++) {
      const double amount = ef_tone_curve_amount(curve, i / 500.0, NULL);
      assert_true(amount > last && amount <= 1);
      last = amount;
    }
    ef_tone_curve_free(curve);
  }
}

/* What an amount, rounded, can tell about a drive: 2 units in the last place
 * over the slope, beside the 1e-14 that is promised. */
static double drive_tolerance(double amount, double slope) {
  return 1e-14 + 4.5e-16 * (amount + 1e-3) / slope;
}

static void inverse_undoes_a_curve(void **state) {
  (void)state;
  gen g = gen_new(12);
  double worst = 0;
  for (int k = 0; k < 300; k++) {
    ef_tone_curve *curve = random_curve(&g);
    for (int i = 0; i < 200; i++) {
      const double drive = gen_between(&g, 0.02, 1);
      double slope;
      const double amount = ef_tone_curve_amount(curve, drive, &slope);
      const double back = ef_tone_curve_drive(curve, amount);
      assert_near(back, drive, drive_tolerance(amount, slope));
      worst = fmax(worst, fabs(back - drive));
    }
    ef_tone_curve_free(curve);
  }
  printf("# inverse of curves: largest deviation %.3g\n", worst);
}

static void curve_undoes_its_inverse(void **state) {
  (void)state;
  gen g = gen_new(13);
  for (int k = 0; k < 300; k++) {
    ef_tone_curve *curve = random_curve(&g);
    for (int i = 0; i < 200; i++) {
      /* Above the joint of IEC 61966-2-1, whose gap no drive reaches. */
      const double amount = gen_between(&g, 0.004, 1);
      const double drive = ef_tone_curve_drive(curve, amount);
      assert_true(drive >= 0 && drive <= 1);
      assert_near(ef_tone_curve_amount(curve, drive, NULL), amount, 3e-15);
    }
    ef_tone_curve_free(curve);
  }
}

static void slopes_are_those_of_the_curve(void **state) {
  (void)state;
  gen g = gen_new(14);
  for (int k = 0; k < 300; k++) {
    ef_tone_curve *curve = random_curve(&g);
    for (int i = 0; i < 50; i++) {
      const double h = 1e-6, drive = gen_between(&g, 0.05, 1 - h);
      double slope, below, above;
      ef_tone_curve_amount(curve, drive, &slope);
      const double rise = ef_tone_curve_amount(curve, drive + h, &above) -
                          ef_tone_curve_amount(curve, drive - h, &below);
      /* Rounding over 2 h, and where a knot of a ramp lies within the step the
       * bend there. */
      assert_near(rise / (2 * h), slope, 3e-10 + 2 * fabs(above - below));
    }
    ef_tone_curve_free(curve);
  }
}

static void ramps_pass_through_their_points(void **state) {
  (void)state;
  gen g = gen_new(15);
  for (int k = 0; k < 300; k++) {
    const ramp r = random_ramp(&g);
    ef_tone_curve *curve = ef_tone_curve_from_ramp(r.n, r.drive, r.level, NULL);
    for (size_t i = 0; i < r.n; i++) {
      const double amount = r.level[i] / r.level[r.n - 1];
      assert_near(ef_tone_curve_amount(curve, r.drive[i], NULL), amount, 3e-16);
      assert_near(ef_tone_curve_drive(curve, amount), r.drive[i], 1e-14);
    }
    ef_tone_curve_free(curve);
  }
}

static void pooled_readings_strictly_rise(void **state) {
  (void)state;
  gen g = gen_new(16);
  for (int k = 0; k < 2000; k++) {
    ef__ramp_point point[MAX_POINTS];
    size_t n = 0, n_pooled;
    point[n++] = (ef__ramp_point){1, 1, 1};
    point[n++] = (ef__ramp_point){0, 0, 1};
    double drives[MAX_POINTS];
    const size_t n_inner = gen_below(&g, MAX_POINTS - 2);
    for (size_t i = 0; i < n_inner; i++) {
      drives[i] = (1 + (double)gen_below(&g, 30)) / 32;
      const double noise = 0.3 * gen_normal(&g);
      point[n++] = (ef__ramp_point){drives[i], drives[i] + noise, 1};
    }
    n = ef__ramp_make_monotone(n, point, &n_pooled);
    assert_true(n >= 2 && point[0].drive == 0 && point[n - 1].drive == 1);
    assert_true(point[0].level == 0 && point[n - 1].level == 1);
    for (size_t i = 1; i < n; i++) {
      assert_true(point[i].drive > point[i - 1].drive);
      assert_true(point[i].level > point[i - 1].level);
    }
  }
}

/* ---- Displays ---------------------------------------------------------- */

/* Three to six bells with a black, and random curves. */
static ef_device *random_display(gen *g, size_t *n_primaries) {
  static const char *const names[] = {"one",  "two", "three", "four",
                                      "five", "six", "black"};
  const char *name[7];
  double light[7 * N];
  ef_tone_curve *curve[6];
  const size_t n = 3 + gen_below(g, 4);
  invented_bell(1e-5, 500, 120, light + n * N);
  for (size_t i = 0; i < n; i++) {
    const double centre = 440 + 200 * (double)i / (double)(n - 1);
    invented_bell(gen_between(g, 1e-3, 1e-2), centre + gen_between(g, -15, 15),
                  gen_between(g, 8, 25), light + i * N);
    for (size_t s = 0; s < N; s++)
      light[i * N + s] += light[n * N + s];
    name[i] = names[i];
    curve[i] = random_curve(g);
  }
  name[n] = names[6];
  const ef_grid grid = invented_grid();
  ef_spectra *spectra =
      ef_spectra_new(n + 1, name, &grid, EF_LIGHT, light, NULL);
  ef_display_settings settings = ef_display_settings_default();
  settings.n_curves = n;
  settings.curve = (const ef_tone_curve *const *)curve;
  ef_error error;
  ef_device *device =
      ef_display_from_spectra("random", spectra, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  for (size_t i = 0; i < n; i++)
    ef_tone_curve_free(curve[i]);
  ef_spectra_free(spectra);
  *n_primaries = n;
  return device;
}

/* What several drives add to the black is the sum of what each adds. */
static void spectra_add(void **state) {
  (void)state;
  gen g = gen_new(21);
  for (int k = 0; k < 60; k++) {
    size_t n;
    ef_device *device = random_display(&g, &n);
    double drive[6], black[N], sum[N], all[N];
    const double none[6] = {0};
    gen_fill(&g, n, 0, 1, drive);
    ef_device_spectrum(device, none, black, NULL, NULL);
    memcpy(sum, black, sizeof sum);
    for (size_t i = 0; i < n; i++) {
      double single[6] = {0}, alone[N];
      single[i] = drive[i];
      ef_device_spectrum(device, single, alone, NULL, NULL);
      for (size_t s = 0; s < N; s++)
        sum[s] += alone[s] - black[s];
    }
    ef_device_spectrum(device, drive, all, NULL, NULL);
    for (size_t s = 0; s < N; s++)
      assert_near(all[s], sum[s], 1e-16); /* of 1e-2, n + 1 roundings */
    ef_device_free(device);
  }
}

static void no_drive_shows_black_and_room_light(void **state) {
  (void)state;
  gen g = gen_new(22);
  ef_illuminant *light = ef_illuminant_new("FL11", NULL);
  const double none[3] = {0, 0, 0};
  ef_spectra *spectra = invented_spectra(true);
  double black[4 * N], shown[N], power[N];
  invented_lights(black);
  const ef_grid grid = invented_grid();
  ef_illuminant_sample(light, &grid, power, NULL);
  for (int k = 0; k < 30; k++) {
    ef_display_settings settings = ef_display_settings_default();
    settings.ambient_lux = gen_between(&g, 0.1, 2000);
    settings.screen_reflectance = gen_unit(&g);
    settings.ambient_illuminant = light;
    ef_device *device =
        ef_display_from_spectra("kiosk", spectra, &settings, NULL);
    ef_device_spectrum(device, none, shown, NULL, NULL);
    /* One factor for all samples, and the luminance E rho / pi. */
    double xyz[3], added[N];
    for (size_t s = 0; s < N; s++)
      added[s] = shown[s] - black[s];
    const double factor = added[34] / power[34];
    for (size_t s = 0; s < N; s++)
      assert_near(added[s], factor * power[s], 1e-13 * factor * power[34]);
    ef__light_xyz_1931(&grid, true, 1, added, xyz, NULL);
    assert_near_relative(xyz[1],
                         settings.ambient_lux * settings.screen_reflectance /
                             3.14159265358979324,
                         1e-12);
    ef_device_free(device);
  }
  ef_spectra_free(spectra);
  ef_illuminant_free(light);
}

static void jacobian_is_the_slope_of_the_spectrum(void **state) {
  (void)state;
  gen g = gen_new(23);
  for (int k = 0; k < 40; k++) {
    size_t n;
    ef_device *device = random_display(&g, &n);
    double drive[6], at[N], below[N], above[N], jacobian[6 * N];
    double slope_before, slope_after;
    gen_fill(&g, n, 0.06, 0.94, drive);
    ef_device_spectrum(device, drive, at, jacobian, NULL);
    for (size_t i = 0; i < n; i++) {
      const double h = 1e-6, middle = drive[i];
      drive[i] = middle - h;
      ef_device_spectrum(device, drive, below, NULL, NULL);
      drive[i] = middle + h;
      ef_device_spectrum(device, drive, above, NULL, NULL);
      drive[i] = middle;
      ef_device_amount(device, i, middle - h, &slope_before);
      ef_device_amount(device, i, middle + h, &slope_after);
      /* As for slopes of curves, times the light (1e-2 at most). */
      const double bend = fabs(slope_after - slope_before);
      for (size_t s = 0; s < N; s++)
        assert_near((above[s] - below[s]) / (2 * h), jacobian[s * n + i],
                    1e-2 * (1e-9 + 2 * bend));
    }
    ef_device_free(device);
  }
}

/* ---- Setups ------------------------------------------------------------ */

/* Seen by an observer, the spectrum at a drive is the colour at its amounts. */
static void setup_agrees_with_the_spectrum(void **state) {
  (void)state;
  static const char *const names[] = {"cie-1931", "cie-1964", "cie-2015-2",
                                      "cie-2015-10"};
  gen g = gen_new(24);
  for (int k = 0; k < 60; k++) {
    size_t n;
    ef_device *device = random_display(&g, &n);
    ef_observer *observer = ef_observer_new(names[k % 4], NULL);
    ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
    assert_non_null(setup);
    double drive[6], amount[6], spectrum[N], seen[3];
    gen_fill(&g, n, 0, 1, drive);
    for (size_t i = 0; i < n; i++)
      amount[i] = ef_device_amount(device, i, drive[i], NULL);
    ef_device_spectrum(device, drive, spectrum, NULL, NULL);
    assert_int_equal(ef_setup_light_xyz(setup, ef_device_grid(device), 1,
                                        spectrum, NULL, seen, NULL),
                     EF_OK);
    const ef_xyz xyz = ef_setup_xyz(setup, amount, NULL);
    assert_near(xyz.X, seen[0], 1e-12);
    assert_near(xyz.Y, seen[1], 1e-12);
    assert_near(xyz.Z, seen[2], 1e-12);
    ef_setup_free(setup);
    ef_observer_free(observer);
    ef_device_free(device);
  }
}

/* Also outside [0, 1]: signed amounts are the classical reading of a match. */
static void setup_is_affine_in_the_amounts(void **state) {
  (void)state;
  gen g = gen_new(25);
  size_t n;
  ef_device *device = random_display(&g, &n);
  ef_observer *observer = ef_observer_new("cie-1964", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  for (int k = 0; k < 2000; k++) {
    double a[6], b[6], mix[6], jacobian[18], other[18];
    gen_fill(&g, n, -2, 3, a);
    gen_fill(&g, n, -2, 3, b);
    const double t = gen_between(&g, -1, 2);
    for (size_t i = 0; i < n; i++)
      mix[i] = a[i] + t * (b[i] - a[i]);
    const ef_xyz xa = ef_setup_xyz(setup, a, jacobian);
    const ef_xyz xb = ef_setup_xyz(setup, b, other);
    const ef_xyz xm = ef_setup_xyz(setup, mix, NULL);
    assert_same_bits(jacobian, other, 3 * n);
    assert_near(xm.X, xa.X + t * (xb.X - xa.X), 1e-11);
    assert_near(xm.Y, xa.Y + t * (xb.Y - xa.Y), 1e-11);
    assert_near(xm.Z, xa.Z + t * (xb.Z - xa.Z), 1e-11);
    double step = 0;
    for (size_t i = 0; i < n; i++)
      step += jacobian[n + i] * (b[i] - a[i]);
    assert_near(xb.Y - xa.Y, step, 1e-11);
  }
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(curves_strictly_rise_from_0_to_1),
      cmocka_unit_test(inverse_undoes_a_curve),
      cmocka_unit_test(curve_undoes_its_inverse),
      cmocka_unit_test(slopes_are_those_of_the_curve),
      cmocka_unit_test(ramps_pass_through_their_points),
      cmocka_unit_test(pooled_readings_strictly_rise),
      cmocka_unit_test(spectra_add),
      cmocka_unit_test(no_drive_shows_black_and_room_light),
      cmocka_unit_test(jacobian_is_the_slope_of_the_spectrum),
      cmocka_unit_test(setup_agrees_with_the_spectrum),
      cmocka_unit_test(setup_is_affine_in_the_amounts),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
