/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Displays from tables of measurements. */
#include <stdlib.h>

#include "base/base_private.h"
#include "device/device_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "invented_display.h"
#include "near.h"

enum { N = INVENTED_SAMPLES, MAX_ROWS = 64 };

/* A table that grows row by row, measured on the invented display. */
typedef struct table {
  size_t n_rows;
  double drive[3 * MAX_ROWS];
  double spectrum[N * MAX_ROWS];
  double xyz[3 * MAX_ROWS];
  size_t line[MAX_ROWS];
  char notes[2000];
  ef_notes sink;
  ef_device *truth;
} table;

static void keep_note(void *cookie, const char *line) {
  char *text = cookie;
  const size_t used = strlen(text);
  snprintf(text + used, 2000 - used, "%s\n", line);
}

static table *new_table(void) {
  table *t = calloc(1, sizeof *t);
  t->truth = invented_display(true);
  t->sink = (ef_notes){keep_note, t->notes};
  return t;
}

static void free_table(table *t) {
  ef_device_free(t->truth);
  free(t);
}

static void add(table *t, double red, double green, double blue) {
  const size_t r = t->n_rows++;
  const double drive[3] = {red, green, blue};
  memcpy(t->drive + 3 * r, drive, sizeof drive);
  t->line[r] = r + 11;
  ef_device_spectrum(t->truth, drive, t->spectrum + N * r, NULL, NULL);
  const ef_grid grid = invented_grid();
  ef__light_xyz_1931(&grid, true, 1, t->spectrum + N * r, t->xyz + 3 * r, NULL);
}

/* Multiplies the light of the last row. */
static void scale_last(table *t, double factor) {
  const size_t r = t->n_rows - 1;
  for (size_t s = 0; s < N; s++)
    t->spectrum[N * r + s] *= factor;
  for (size_t c = 0; c < 3; c++)
    t->xyz[3 * r + c] *= factor;
}

/* Black, primaries, white. */
static void add_corners(table *t) {
  add(t, 1, 0, 0);
  add(t, 0, 0, 0);
  add(t, 0, 1, 0);
  add(t, 0, 0, 1);
  add(t, 1, 1, 1);
}

static void add_ramps(table *t) {
  for (int k = 1; k < 8; k++) {
    add(t, k / 8.0, 0, 0);
    add(t, 0, k / 8.0, 0);
    add(t, 0, 0, k / 8.0);
  }
}

static void add_greys(table *t) {
  for (int k = 1; k < 8; k++)
    add(t, k / 8.0, k / 8.0, k / 8.0);
}

static ef_measurements measured(const table *t, bool spectral) {
  const ef_measurements m = {
      .n_rows = t->n_rows,
      .n_drives = 3,
      .drive = t->drive,
      .xyz = spectral ? NULL : t->xyz,
      .spectrum = spectral ? t->spectrum : NULL,
      .grid = invented_grid(),
      .absolute = true,
      .line = t->line,
  };
  return m;
}

static ef_device *display_of(table *t, bool spectral, ef_residual *residual,
                             size_t *n_residuals) {
  const ef_measurements m = measured(t, spectral);
  ef_display_settings settings = ef_display_settings_default();
  settings.notes = &t->sink;
  ef_error error;
  ef_device *device = ef_display_from_measurements(
      "kiosk", &m, &settings, residual, n_residuals, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  return device;
}

/* The amounts at the measured drives are those of the true curves. */
static void check_curves(const ef_device *device, const ef_device *truth) {
  for (size_t i = 0; i < 3; i++) {
    assert_string_equal(ef_device_curve_about(device, i),
                        "measured ramp of 9 points");
    for (int k = 0; k <= 8; k++) {
      const double drive = k / 8.0;
      /* Three unknowns from dependent spectra lose two digits. */
      assert_near(ef_device_amount(device, i, drive, NULL),
                  ef_device_amount(truth, i, drive, NULL), 1e-13);
    }
  }
}

/* ---- What is derived --------------------------------------------------- */

static void ramps_give_black_primaries_and_curves(void **state) {
  (void)state;
  for (int spectral = 0; spectral < 2; spectral++) {
    table *t = new_table();
    add_ramps(t);
    add_corners(t);
    add(t, 0.25, 0.5, 0);
    add(t, 0.125, 0.875, 0.75);
    ef_residual residual[MAX_ROWS];
    size_t n_residuals = 99;
    ef_device *device = display_of(t, spectral, residual, &n_residuals);
    assert_string_equal(t->notes, "");
    assert_true(ef_device_has_spectra(device) == (bool)spectral);
    assert_true(ef_device_absolute(device));
    check_curves(device, t->truth);
    assert_int_equal(n_residuals, 3); /* white and two mixtures */
    assert_int_equal(residual[0].row, 25);
    assert_int_equal(residual[2].row, 27);
    for (size_t i = 0; i < n_residuals; i++) {
      const ef_residual *r = &residual[i];
      assert_near(r->predicted.X, r->measured.X, 1e-11);
      assert_near(r->predicted.Y, r->measured.Y, 1e-11);
      assert_near(r->predicted.Z, r->measured.Z, 1e-11);
      assert_near(r->white.Y, 100, 2e-14);
    }
    assert_near(residual[0].measured.Y, 100, 2e-14);
    ef_device_free(device);
    free_table(t);
  }
}

static void residuals_show_what_does_not_add(void **state) {
  (void)state;
  table *t = new_table();
  add_ramps(t);
  add_corners(t);
  scale_last(t, 0.95); /* the white */
  add(t, 0.5, 0.5, 0.5);
  scale_last(t, 1.04);
  ef_residual residual[MAX_ROWS];
  size_t n_residuals;
  ef_device *device = display_of(t, false, residual, &n_residuals);
  assert_int_equal(n_residuals, 2);
  assert_near(residual[0].measured.Y, 100, 2e-14);
  assert_near(residual[0].predicted.Y, 100 / 0.95, 1e-11);
  assert_near(residual[1].measured.X / residual[1].predicted.X, 1.04, 1e-12);
  ef_additivity additivity;
  ef_display_additivity(device, &additivity, NULL);
  assert_true(additivity.known);
  assert_near(additivity.luminance_ratio, 0.95, 1e-13);
  ef_device_free(device);
  free_table(t);
}

static void grey_ramp_stands_in(void **state) {
  (void)state;
  for (int spectral = 0; spectral < 2; spectral++) {
    table *t = new_table();
    add_corners(t);
    add_greys(t);
    ef_device *device = display_of(t, spectral, NULL, NULL);
    check_curves(device, t->truth);
    assert_non_null(strstr(t->notes, "kiosk: green has no ramp of its own, its "
                                     "curve is read off the grey ramp\n"));
    ef_device_free(device);
    free_table(t);
  }
}

/* The white is 3 % too dark, evenly: the grey ramp is taken relative to it. */
static void grey_ramp_ends_at_the_white(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  scale_last(t, 0.97);
  const double black[3] = {t->xyz[3], t->xyz[4], t->xyz[5]};
  add_greys(t);
  for (size_t r = 5; r < t->n_rows; r++)
    for (size_t c = 0; c < 3; c++)
      t->xyz[3 * r + c] = black[c] + (t->xyz[3 * r + c] - black[c]) * 0.97;
  for (size_t c = 0; c < 3; c++) /* white likewise: black kept */
    t->xyz[12 + c] = black[c] + (t->xyz[12 + c] / 0.97 - black[c]) * 0.97;
  ef_device *device = display_of(t, false, NULL, NULL);
  check_curves(device, t->truth);
  ef_device_free(device);
  free_table(t);
}

static void repeated_rows_are_averaged(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  add(t, 0, 1, 0);
  scale_last(t, 1.1);
  add(t, 0, 0, 0);
  scale_last(t, 3);
  ef_device *device = display_of(t, true, NULL, NULL);
  double spectrum[N], light[4 * N];
  invented_lights(light);
  const double green[3] = {0, 1, 0}, none[3] = {0, 0, 0};
  ef_device_spectrum(device, green, spectrum, NULL, NULL);
  assert_near(spectrum[31], 1.05 * light[2 * N + 31], 1e-17);
  ef_device_spectrum(device, none, spectrum, NULL, NULL);
  assert_near(spectrum[31], 2 * light[31], 1e-19);
  assert_non_null(strstr(t->notes, "kiosk: no row shows blue between zero and "
                                   "full drive, so its curve is taken as "
                                   "linear\n"));
  ef_device_free(device);
  free_table(t);
}

static void falling_steps_are_pooled_and_noted(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  add_ramps(t);
  add(t, 0.55, 0, 0);
  scale_last(t, 0.5);
  ef_device *device = display_of(t, false, NULL, NULL);
  assert_string_equal(t->notes,
                      "kiosk: the single-channel ramp of red does not rise "
                      "everywhere; points pooled with a neighbour: 1\n");
  assert_string_equal(ef_device_curve_about(device, 0),
                      "measured ramp of 9 points");
  double last = -1;
  for (int k = 0; k <= 1000; k++) {
    const double amount = ef_device_amount(device, 0, k / 1000.0, NULL);
    assert_true(amount > last);
    last = amount;
  }
  ef_device_free(device);
  free_table(t);
}

static void missing_black_is_noted(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  t->drive[3] = 0.1; /* the black row */
  ef_residual residual[MAX_ROWS];
  size_t n_residuals;
  ef_device *device = display_of(t, false, residual, &n_residuals);
  assert_non_null(strstr(t->notes, "kiosk: no row has all device values 0, so "
                                   "the black is taken as zero\n"));
  ef_device_free(device);
  free_table(t);
}

static void without_a_white_the_models_is_the_scale(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  t->n_rows--;
  add(t, 0, 1, 1);
  ef_residual residual[MAX_ROWS];
  size_t n_residuals;
  ef_device *device = display_of(t, true, residual, &n_residuals);
  assert_int_equal(n_residuals, 1);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  assert_near(residual[0].white.X, ef_setup_white(setup).X, 1e-12);
  assert_near(residual[0].white.Y, 100, 1e-12);
  ef_additivity additivity;
  ef_display_additivity(device, &additivity, NULL);
  assert_false(additivity.known);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
  free_table(t);
}

static void curves_of_the_settings_come_first(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  add_ramps(t);
  ef_tone_curve *curve = ef_tone_curve_new("iec61966-2-1", NULL);
  const ef_tone_curve *const one[1] = {curve};
  ef_display_settings settings = ef_display_settings_default();
  settings.n_curves = 1;
  settings.curve = one;
  const ef_measurements m = measured(t, false);
  ef_device *device =
      ef_display_from_measurements("kiosk", &m, &settings, NULL, NULL, NULL);
  assert_string_equal(ef_device_curve_about(device, 2),
                      "IEC 61966-2-1 (power 2.4 with a linear toe)");
  ef_device_free(device);
  ef_tone_curve_free(curve);
  free_table(t);
}

/* Four primaries, tristimulus values: the grey ramp cannot tell them apart, so
 * its luminance serves all. */
static void four_primaries_share_a_grey_ramp(void **state) {
  (void)state;
  static const char *const names[] = {"red", "yellow", "green", "blue"};
  static const double light[4][3] = {
      {41.2, 21.3, 1.9}, {20.1, 22.7, 3.1}, {35.8, 71.5, 11.9}, {18, 7.2, 95}};
  double drive[7 * 4] = {0}, xyz[7 * 3] = {0};
  for (int i = 0; i < 4; i++) {
    drive[4 * i + i] = 1;
    memcpy(xyz + 3 * i, light[i], sizeof light[i]);
  }
  for (int row = 4; row < 7; row++) { /* 0.25, 0.5, 1 */
    const double level = row == 4 ? 0.25 : row == 5 ? 0.5 : 1.0;
    for (int i = 0; i < 4; i++) {
      drive[4 * row + i] = level;
      for (int c = 0; c < 3; c++)
        xyz[3 * row + c] += pow(level, 1.8) * light[i][c];
    }
  }
  const ef_measurements m = {.n_rows = 7,
                             .n_drives = 4,
                             .drive = drive,
                             .xyz = xyz,
                             .drive_name = names};
  ef_residual residual[7];
  size_t n_residuals;
  ef_device *device = ef_display_from_measurements("sign", &m, NULL, residual,
                                                   &n_residuals, NULL);
  assert_non_null(device);
  for (size_t i = 0; i < 4; i++)
    assert_near(ef_device_amount(device, i, 0.25, NULL), pow(0.25, 1.8), 1e-14);
  assert_int_equal(n_residuals, 3);
  assert_string_equal(ef_device_drive_name(device, 1), "yellow");
  ef_device_free(device);
}

static void room_light_falls_on_it_too(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  ef_illuminant *d50 = ef_illuminant_new("D50", NULL);
  ef_display_settings settings = ef_display_settings_default();
  settings.ambient_lux = 500;
  settings.screen_reflectance = 0.02;
  settings.ambient_illuminant = d50;
  const ef_measurements m = measured(t, false);
  ef_device *device =
      ef_display_from_measurements("kiosk", &m, &settings, NULL, NULL, NULL);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  const double k = 1 / ef_setup_scale(setup);
  const ef_xyz black = ef_setup_black(setup);
  /* 500 lux * 0.02 / pi, and D50: X = 96.42, Z = 82.51 (CIE 015:2018, T.3) for
   * sums at 5 nm over 380 to 780 nm; ours are at 1 nm over all. */
  assert_near(black.Y * k - t->xyz[4], 10 / 3.14159265358979324, 1e-12);
  assert_near((black.X * k - t->xyz[3]) / (black.Y * k - t->xyz[4]), 0.9642,
              1e-4);
  assert_near((black.Z * k - t->xyz[5]) / (black.Y * k - t->xyz[4]), 0.8251,
              1e-4);
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_device_free(device);
  ef_illuminant_free(d50);
  free_table(t);
}

/* ---- What is refused --------------------------------------------------- */

static void check_refused(const ef_measurements *m, ef_status status,
                          size_t line, const char *part) {
  ef_error error;
  ef_residual residual[MAX_ROWS];
  size_t n_residuals;
  assert_null(ef_display_from_measurements("kiosk", m, NULL, residual,
                                           &n_residuals, &error));
  assert_error(&error, status, part);
  assert_int_equal(error.line, line);
  assert_null(ef_display_from_measurements("kiosk", m, NULL, NULL, NULL, NULL));
}

static void tables_at_fault(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  ef_measurements m = measured(t, true);
  m.n_rows = 0;
  check_refused(&m, EF_INVALID, 0, "a table of measurements without rows");
  m = measured(t, true);
  m.xyz = t->xyz;
  check_refused(&m, EF_INVALID, 0, "values or spectra; found both");
  m.xyz = m.spectrum = NULL;
  check_refused(&m, EF_INVALID, 0, "values or spectra; found neither");
  m = measured(t, true);
  m.n_drives = 2;
  check_refused(&m, EF_INVALID, 0, "found 2 device values a row; a display");
  m.n_drives = 9;
  check_refused(&m, EF_INVALID, 0, "found 9 device values a row; a display");
  m.n_drives = 4;
  check_refused(&m, EF_INVALID, 0, "4 device values a row need names");
  m = measured(t, true);
  m.grid.step_nm = 0;
  check_refused(&m, EF_INVALID, 0, "");
  ef_error error;
  assert_null(ef_display_from_measurements(NULL, &m, NULL, NULL, NULL, &error));
  assert_error(&error, EF_INVALID, "a display needs a name and measurements");
  free_table(t);
}

static void values_at_fault(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  const ef_measurements m = measured(t, false);
  t->drive[7] = 255;
  check_refused(&m, EF_INVALID, 13,
                "row 3: device value 255 of green, expected 0 to 1");
  t->drive[7] = NOT_A_NUMBER;
  check_refused(&m, EF_INVALID, 13, "row 3: device value nan of green");
  t->drive[7] = 1;
  t->xyz[11] = INFINITE;
  check_refused(&m, EF_INVALID, 14, "row 4: measured value 3 is not finite");
  free_table(t);
}

static void corners_at_fault(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  ef_measurements m = measured(t, false);
  t->drive[7] = 0.99;
  check_refused(&m, EF_NO_ANSWER, 0,
                "no row shows green alone at full drive; measure one with "
                "green 1 and all others 0");
  t->drive[7] = 1;
  t->xyz[13] = 0.5 * t->xyz[4];
  check_refused(&m, EF_INVALID, 0, "the white (Y = ");
  m.n_rows = 4;
  memcpy(t->xyz + 9, t->xyz + 3, 3 * sizeof(double));
  check_refused(&m, EF_INVALID, 0,
                "primary 'blue' adds no light to the black (Y = ");
  memcpy(t->xyz + 9, t->xyz, 3 * sizeof(double));
  check_refused(&m, EF_NO_ANSWER, 0, "the primaries are linearly dependent");
  free_table(t);
}

/* ---- Out of memory ----------------------------------------------------- */

static bool try_table(void *context) {
  const table *t = context;
  const ef_measurements m = measured(t, true);
  ef_residual residual[MAX_ROWS];
  size_t n_residuals;
  ef_error error = {0};
  ef_device *device = ef_display_from_measurements("kiosk", &m, NULL, residual,
                                                   &n_residuals, &error);
  if (device == NULL)
    assert_int_equal(error.status, EF_NO_MEMORY);
  ef_device_free(device);
  return device != NULL;
}

static void tables_survive_lack_of_memory(void **state) {
  (void)state;
  table *t = new_table();
  add_corners(t);
  add_ramps(t);
  assert_true(fail_alloc_each(try_table, t) > 20);
  free_table(t);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(ramps_give_black_primaries_and_curves),
      cmocka_unit_test(residuals_show_what_does_not_add),
      cmocka_unit_test(grey_ramp_stands_in),
      cmocka_unit_test(grey_ramp_ends_at_the_white),
      cmocka_unit_test(repeated_rows_are_averaged),
      cmocka_unit_test(falling_steps_are_pooled_and_noted),
      cmocka_unit_test(missing_black_is_noted),
      cmocka_unit_test(without_a_white_the_models_is_the_scale),
      cmocka_unit_test(curves_of_the_settings_come_first),
      cmocka_unit_test(four_primaries_share_a_grey_ramp),
      cmocka_unit_test(room_light_falls_on_it_too),
      cmocka_unit_test(tables_at_fault),
      cmocka_unit_test(values_at_fault),
      cmocka_unit_test(corners_at_fault),
      cmocka_unit_test(tables_survive_lack_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
