/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Halftone prints: from primaries, from characterisations, and what is refused
 * or noted on the way. */
#include <stdlib.h>

#include <evenfield/difference.h>
#include <evenfield/exchange.h>

#include "fail_alloc.h"
#include "gen.h"
#include "invented_print.h"
#include "near.h"

enum { N = PRINT_SAMPLES };

static ef_device *print_of(print_table *t, bool spectral,
                           ef_halftone_settings settings,
                           ef_print_residual *residual, size_t *n_residuals) {
  const ef_measurements m = print_table_view(t, spectral);
  ef_error error;
  settings.notes = &t->sink;
  ef_device *device = ef_halftone_from_measurements(
      "leaflet", &m, &settings, residual, n_residuals, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  return device;
}

static void refuse(const ef_measurements *m, ef_halftone_settings settings,
                   ef_status status, const char *message, size_t line) {
  ef_error error = {0};
  assert_null(ef_halftone_from_measurements("leaflet", m, &settings, NULL, NULL,
                                            &error));
  assert_int_equal(error.status, status);
  assert_string_equal(error.message, message);
  assert_int_equal(error.line, line);
}

/* ---- From primaries ----------------------------------------------------- */

static void names_and_limits(void **state) {
  (void)state;
  double primary[8 * N];
  const ef_grid grid = print_grid();
  print_primaries(3, primary);
  ef_device *device =
      ef_halftone_new("leaflet", NULL, &grid, primary, NULL, NULL);
  assert_string_equal(ef_device_kind(device), "halftone");
  assert_string_equal(ef_device_name(device), "leaflet");
  assert_int_equal(ef_device_n_drives(device), 3);
  assert_string_equal(ef_device_drive_name(device, 1), "magenta");
  assert_string_equal(ef_device_limit_name(device, 0, false), "cyan at 0 %");
  assert_string_equal(ef_device_limit_name(device, 2, true), "yellow at 100 %");
  assert_true(ef_device_reflects(device));
  assert_true(ef_device_has_spectra(device));
  assert_false(ef_device_absolute(device));
  assert_near(ef_halftone_n(device), 1, 0);
  assert_string_equal(ef_device_curve_about(device, 0), "linear");
  ef_device_free(device);
}

static void curves_and_n_of_the_settings(void **state) {
  (void)state;
  double primary[8 * N], spectrum[N];
  const ef_grid grid = print_grid();
  ef_tone_curve *curve = ef_tone_curve_new("power:0.8", NULL);
  const ef_tone_curve *const curves[1] = {curve};
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = 1.7;
  settings.n_curves = 1;
  settings.curve = curves;
  static const char *const inks[3] = {"blue", "pink", "lemon"};
  print_primaries(3, primary);
  ef_device *device =
      ef_halftone_new("leaflet", inks, &grid, primary, &settings, NULL);
  assert_string_equal(ef_device_drive_name(device, 2), "lemon");
  const double drive[3] = {0.37, 0, 0};
  const double area = pow(0.37, 0.8);
  assert_int_equal(ef_device_spectrum(device, drive, spectrum, NULL, NULL),
                   EF_OK);
  for (size_t s = 0; s < N; s++) {
    const double sum = (1 - area) * pow(primary[s], 1 / 1.7) +
                       area * pow(primary[N + s], 1 / 1.7);
    assert_near(spectrum[s], pow(sum, 1.7), 1e-14);
  }
  assert_near(ef_halftone_n(device), 1.7, 0);
  ef_device_free(device);
  ef_tone_curve_free(curve);
}

static void refuse_new(const double *primary, ef_halftone_settings settings,
                       const char *message) {
  const ef_grid grid = print_grid();
  ef_error error = {0};
  assert_null(
      ef_halftone_new("leaflet", NULL, &grid, primary, &settings, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_string_equal(error.message, message);
}

static void settings_at_fault(void **state) {
  (void)state;
  double primary[8 * N];
  const ef_tone_curve *const none[3] = {NULL, NULL, NULL};
  const ef_halftone_settings plain = ef_halftone_settings_default();
  ef_halftone_settings settings = plain;
  print_primaries(3, primary);
  settings.n = 0.9;
  refuse_new(primary, settings,
             "Yule-Nielsen factor 0.9; expected 1 to 10, or 0 to have it "
             "fitted");
  settings = plain;
  settings.n_curves = 2;
  refuse_new(primary, settings,
             "2 tone curves for 3 inks; give one for each, one for all, or "
             "none");
  settings.n_curves = 3;
  settings.curve = none;
  refuse_new(primary, settings, "tone curve 1 is missing");
  settings = plain;
  settings.black = 40;
  refuse_new(primary, settings,
             "black fixed at 40; expected a drive from 0 to 1");
  primary[3 * N + 4] = NOT_A_NUMBER;
  refuse_new(primary, plain, "Neugebauer primary 4: value 5 is not finite");
  print_primaries(3, primary);
  memcpy(primary + 2 * N, primary, N * sizeof *primary);
  refuse_new(primary, plain, "magenta at 100 % is not darker than the paper");
}

static void noise_below_zero(void **state) {
  (void)state;
  double primary[8 * N], spectrum[N];
  print_table *t = print_table_new(1, 3);
  const ef_grid grid = print_grid();
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = 2;
  settings.notes = &t->sink;
  print_primaries(3, primary);
  primary[7 * N + 2] = -0.002;
  ef_device *device =
      ef_halftone_new("leaflet", NULL, &grid, primary, &settings, NULL);
  assert_string_equal(
      t->notes, "leaflet: 1 values of primaries below zero count as zero\n");
  const double full[3] = {1, 1, 1};
  ef_device_spectrum(device, full, spectrum, NULL, NULL);
  assert_near(spectrum[2], 0, 0);
  ef_device_free(device);
  print_table_free(t);
}

/* ---- Seen --------------------------------------------------------------- */

static void tristimulus_values_have_one_light(void **state) {
  (void)state;
  print_table *t = print_table_new(1.6, 3);
  print_table_fill(t);
  ef_device *device =
      print_of(t, false, ef_halftone_settings_default(), NULL, NULL);
  ef_observer *standard = ef_observer_new("cie-1931", NULL);
  ef_observer *large = ef_observer_new("cie-1964", NULL);
  ef_illuminant *d50 = ef_illuminant_new("d50", NULL);
  ef_illuminant *a = ef_illuminant_new("A", NULL);
  ef_error error;
  ef_setup *setup = ef_setup_new(device, standard, d50, NULL, &error);
  assert_non_null(setup);
  const double none[3] = {0};
  const ef_xyz paper = ef_setup_xyz(setup, none, NULL);
  assert_near(paper.X, t->xyz[0], 1e-12);
  assert_near(ef_setup_white(setup).Y, 100, 0);
  ef_setup_free(setup);
  assert_null(ef_setup_new(device, standard, a, NULL, &error));
  assert_int_equal(error.status, EF_NO_ANSWER);
  assert_string_equal(
      error.message,
      "'leaflet' is known by tristimulus values of the observer cie-1931 under "
      "D50 only; observer cie-1931 under A needs the spectra of its patches");
  assert_null(ef_setup_new(device, large, d50, NULL, &error));
  assert_null(ef_setup_new(device, standard, NULL, NULL, &error));
  assert_string_equal(error.message,
                      "'leaflet' (halftone) reflects light; say which "
                      "illuminant it stands in");
  double spectrum[N];
  assert_int_equal(ef_device_spectrum(device, none, spectrum, NULL, &error),
                   EF_NO_ANSWER);
  ef_illuminant_free(a);
  ef_illuminant_free(d50);
  ef_observer_free(large);
  ef_observer_free(standard);
  ef_device_free(device);
  print_table_free(t);
}

/* ---- Characterisations -------------------------------------------------- */

/* The fit undoes what made the patches: n to the 1e-4 that is promised, areas
 * to the same error times their slope with n. */
static void check_fit(double n, bool spectral) {
  print_table *t = print_table_new(n, 3);
  ef_print_residual residual[PRINT_ROWS];
  size_t n_residuals;
  print_table_fill(t);
  print_table_add(t, 0.3, 0.7, 0.2, 0);
  print_table_add(t, 0.9, 0, 0.6, 0);
  ef_device *device = print_of(t, spectral, ef_halftone_settings_default(),
                               residual, &n_residuals);
  assert_near(ef_halftone_n(device), n, 1e-4);
  static const double drive[] = {0.1, 0.25, 0.5, 0.75, 0.9};
  for (size_t i = 0; i < 3; i++)
    for (size_t k = 0; k < 5; k++)
      assert_near(ef_device_amount(device, i, drive[k], NULL),
                  print_area(i, drive[k]), 1e-4);
  assert_int_equal(n_residuals, t->n_rows);
  size_t n_tests = 0;
  for (size_t k = 0; k < n_residuals; k++) {
    assert_int_equal(residual[k].row, k);
    n_tests += residual[k].is_test;
    assert_int_equal(residual[k].is_test, k >= 23);
    assert_near(residual[k].measured.Y, t->xyz[3 * k + 1], 1e-12);
    /* The two mixtures lie between points of the curves. */
    assert_near(residual[k].predicted.Y, residual[k].measured.Y,
                residual[k].is_test ? 0.2 : 2e-3);
    assert_int_equal(isnan(residual[k].spectral_rms), !spectral);
    assert_near(residual[k].white.Y, 100, 0);
  }
  assert_int_equal(n_tests, 2);
  assert_string_equal(t->notes, "");
  ef_device_free(device);
  print_table_free(t);
}

static void fit_finds_n_and_curves_of_spectra(void **state) {
  (void)state;
  check_fit(1, true);
  check_fit(1.73, true);
  check_fit(3.4, true);
}

static void set_n_is_kept(void **state) {
  (void)state;
  print_table *t = print_table_new(1.7, 3);
  print_table_fill(t);
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = 2;
  ef_device *device = print_of(t, true, settings, NULL, NULL);
  assert_near(ef_halftone_n(device), 2, 0);
  ef_device_free(device);
  print_table_free(t);
}

/* Given curves take part in the fit of n: the areas are then theirs. */
static void set_curves_are_kept(void **state) {
  (void)state;
  print_table *t = print_table_new(1.7, 3);
  ef_tone_curve *curve[3];
  double drive[101], level[101];
  for (size_t i = 0; i < 3; i++) {
    for (size_t k = 0; k < 101; k++) {
      drive[k] = (double)k / 100;
      level[k] = print_area(i, drive[k]);
    }
    curve[i] = ef_tone_curve_from_ramp(101, drive, level, NULL);
  }
  print_table_fill(t);
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n_curves = 3;
  settings.curve = (const ef_tone_curve *const *)curve;
  ef_device *device = print_of(t, true, settings, NULL, NULL);
  assert_near(ef_halftone_n(device), 1.7, 1e-4);
  assert_string_equal(ef_device_curve_about(device, 0),
                      "measured ramp of 101 points");
  ef_device_free(device);
  for (size_t i = 0; i < 3; i++)
    ef_tone_curve_free(curve[i]);
  print_table_free(t);
}

static void nothing_between_paper_and_solid(void **state) {
  (void)state;
  print_table *t = print_table_new(1.5, 3);
  for (int set = 0; set < 8; set++)
    print_table_add(t, set & 1, set >> 1 & 1, set >> 2, 0);
  ef_device *device =
      print_of(t, true, ef_halftone_settings_default(), NULL, NULL);
  assert_near(ef_halftone_n(device), 1, 0);
  assert_near(ef_device_amount(device, 1, 0.31, NULL), 0.31, 0);
  assert_string_equal(
      t->notes,
      "leaflet: no row shows one ink between 0 and 100 %, so nothing tells the "
      "Yule-Nielsen factor; it is taken as 1\n"
      "leaflet: no row shows cyan between 0 and 100 %, so its curve is taken "
      "as linear\n"
      "leaflet: no row shows magenta between 0 and 100 %, so its curve is "
      "taken "
      "as linear\n"
      "leaflet: no row shows yellow between 0 and 100 %, so its curve is taken "
      "as linear\n");
  ef_device_free(device);
  print_table_free(t);
}

static void ramps_that_ask_for_more_than_ten(void **state) {
  (void)state;
  print_table *t = print_table_new(60, 3);
  print_table_fill(t);
  ef_device *device =
      print_of(t, true, ef_halftone_settings_default(), NULL, NULL);
  assert_near(ef_halftone_n(device), 10, 0);
  assert_string_equal(t->notes,
                      "leaflet: the ramps ask for a Yule-Nielsen factor of 10 "
                      "or more; 10 is taken\n");
  ef_device_free(device);
  print_table_free(t);
}

/* Swaps the patches of two rows. */
static void swap_rows(print_table *t, size_t a, size_t b) {
  for (size_t s = 0; s < N; s++) {
    const double kept = t->spectrum[a * N + s];
    t->spectrum[a * N + s] = t->spectrum[b * N + s];
    t->spectrum[b * N + s] = kept;
  }
}

static void small_falls_are_pooled(void **state) {
  (void)state;
  print_table *t = print_table_new(1.5, 3);
  print_table_fill(t);
  print_table_add(t, 0, 0.51, 0, 0);
  swap_rows(t, 8 + 5 + 2, t->n_rows - 1); /* 50 % and 51 % */
  ef_device *device =
      print_of(t, true, ef_halftone_settings_default(), NULL, NULL);
  assert_string_equal(t->notes,
                      "leaflet: the ramp of magenta does not rise everywhere; "
                      "points pooled with a neighbour: 1\n");
  assert_string_equal(ef_device_curve_about(device, 1),
                      "measured ramp of 7 points");
  ef_device_free(device);
  print_table_free(t);
}

static void ramps_that_go_backwards(void **state) {
  (void)state;
  print_table *t = print_table_new(1, 3);
  print_table_fill(t);
  swap_rows(t, 9, 10); /* 25 % and 50 % of cyan */
  ef_measurements m = print_table_view(t, true);
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = 1;
  refuse(&m, settings, EF_INVALID,
         "row 10: the ramp of cyan goes backwards: 56.1 % of area at 25 %, and "
         "29.6 % at 50 %; measure it again",
         20);
  swap_rows(t, 9, 10);
  swap_rows(t, 12, 1); /* 90 % of cyan, and its solid */
  refuse(&m, settings, EF_INVALID,
         "row 13: the ramp of cyan goes backwards: 108.5 % of area at 90 %, "
         "and 100.0 % at 100 %; measure it again",
         23);
  print_table_free(t);
}

static void tables_at_fault(void **state) {
  (void)state;
  print_table *t = print_table_new(1.5, 3);
  print_table_fill(t);
  const ef_halftone_settings plain = ef_halftone_settings_default();
  ef_measurements m = print_table_view(t, true);
  m.n_rows = 0;
  refuse(&m, plain, EF_INVALID, "a characterisation without rows", 0);
  m = print_table_view(t, true);
  m.xyz = t->xyz;
  refuse(&m, plain, EF_INVALID,
         "measurements are either tristimulus values or spectra; found both",
         0);
  m.spectrum = NULL;
  m.n_drives = 5;
  refuse(&m, plain, EF_INVALID,
         "found 5 ink values a row; a halftone print has 3, or 4 with the last "
         "one fixed",
         0);
  m = print_table_view(t, true);
  ef_halftone_settings settings = plain;
  settings.black = 0.4;
  refuse(&m, settings, EF_INVALID,
         "black is fixed at 0.4, but the rows have no black", 0);
  t->drive[3 * 9 + 1] = 1.5;
  refuse(&m, plain, EF_INVALID,
         "row 10: ink value 1.5 of magenta, expected 0 to 1", 20);
  t->drive[3 * 9 + 1] = 0;
  t->spectrum[N * 3 + 7] = INFINITE;
  refuse(&m, plain, EF_INVALID, "row 4: measured value 8 is not finite", 14);
  print_table_free(t);
}

static void missing_primaries(void **state) {
  (void)state;
  static const char *const shown[8] = {
      "bare paper (all inks at 0 %)",
      "cyan alone at 100 %",
      "magenta alone at 100 %",
      "cyan and magenta alone at 100 %",
      "yellow alone at 100 %",
      "cyan and yellow alone at 100 %",
      "magenta and yellow alone at 100 %",
      "cyan, magenta and yellow alone at 100 %"};
  for (int missing = 0; missing < 8; missing++) {
    print_table *t = print_table_new(1.5, 3);
    char message[512];
    for (int set = 0; set < 8; set++)
      if (set != missing)
        print_table_add(t, set & 1, set >> 1 & 1, set >> 2, 0);
    snprintf(message, sizeof message,
             "a Neugebauer primary is missing: no row shows %s; the model "
             "needs all 8 of them",
             shown[missing]);
    const ef_measurements m = print_table_view(t, false);
    refuse(&m, ef_halftone_settings_default(), EF_NO_ANSWER, message, 0);
    print_table_free(t);
  }
}

static void solid_as_light_as_paper(void **state) {
  (void)state;
  print_table *t = print_table_new(1.5, 3);
  print_table_fill(t);
  swap_rows(t, 0, 4);
  const ef_measurements m = print_table_view(t, true);
  refuse(&m, ef_halftone_settings_default(), EF_INVALID,
         "yellow at 100 % is not darker than the paper", 0);
  print_table_free(t);
}

/* Repeated patches count by their mean. */
static void repeated_patches_are_averaged(void **state) {
  (void)state;
  print_table *t = print_table_new(1.5, 3);
  print_table_fill(t);
  print_table_add(t, 0, 0, 0, 0);
  for (size_t s = 0; s < N; s++) {
    t->spectrum[s] += 0.01;
    t->spectrum[(t->n_rows - 1) * N + s] -= 0.01;
  }
  ef_device *device =
      print_of(t, true, ef_halftone_settings_default(), NULL, NULL);
  double primary[8 * N], spectrum[N];
  const double none[3] = {0};
  print_primaries(3, primary);
  ef_device_spectrum(device, none, spectrum, NULL, NULL);
  for (size_t s = 0; s < N; s++)
    assert_near(spectrum[s], primary[s], 1e-14);
  ef_device_free(device);
  print_table_free(t);
}

/* ---- Black -------------------------------------------------------------- */

static void rows_with_black_are_left_out(void **state) {
  (void)state;
  print_table *t = print_table_new(1.7, 4);
  ef_print_residual residual[PRINT_ROWS];
  size_t n_residuals;
  print_table_fill(t);
  ef_device *device =
      print_of(t, true, ef_halftone_settings_default(), residual, &n_residuals);
  assert_int_equal(ef_device_n_drives(device), 3);
  assert_near(ef_halftone_n(device), 1.7, 1e-4);
  assert_int_equal(n_residuals, 8 + 15);
  assert_string_equal(t->notes, "leaflet: black is fixed at 0 %; 13 rows with "
                                "another black are left out\n");
  ef_device_free(device);
  print_table_free(t);
}

static void fixed_black_is_printed(void **state) {
  (void)state;
  print_table *t = print_table_new(1.7, 4);
  ef_print_residual residual[PRINT_ROWS];
  size_t n_residuals;
  print_table_fill(t);
  print_table_add(t, 0.25, 0.5, 0.75, 0.25);
  print_table_add(t, 0.25, 0.5, 0.75, 0.5);
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.black = 0.25;
  ef_device *device = print_of(t, true, settings, residual, &n_residuals);
  assert_string_equal(t->notes, "leaflet: black is fixed at 25 %; 1 rows with "
                                "another black are left out\n");
  assert_int_equal(n_residuals, 16 + 20 + 1);
  assert_true(residual[n_residuals - 1].is_test);
  assert_near(residual[n_residuals - 1].spectral_rms, 0, 1e-4);
  const double drive[3] = {0.25, 0.5, 0.75};
  double spectrum[N];
  ef_device_spectrum(device, drive, spectrum, NULL, NULL);
  for (size_t s = 0; s < N; s++)
    assert_near(spectrum[s], t->spectrum[(t->n_rows - 2) * N + s], 1e-4);
  ef_device_free(device);
  print_table_free(t);
}

/* ---- The demo ----------------------------------------------------------- */

static const char *demo_text(const char *name, size_t *length) {
  for (size_t i = 0; i < ef_demo_count(); i++)
    if (strcmp(ef_demo_name(i), name) == 0)
      return ef_demo_text(i, length);
  fail_msg("no demo file %s", name);
  return NULL;
}

/* The generator prints with n = 1.7, areas grown by 5.1, 5.3 and 6.2 % at 50 %,
 * and lets every patch vary by 0.2 % of area and 0.4 % of ink. */
static void leaflet_press(void **state) {
  (void)state;
  size_t length;
  ef_error error;
  const char *text = demo_text("leaflet-press", &length);
  ef_reader *reader =
      ef_reader_from_text("leaflet-press", text, length, NULL, &error);
  ef_block block;
  assert_int_equal(ef_reader_next(reader, 200, &block, &error), EF_OK);
  const ef_reader_head *head = ef_reader_get_head(reader);
  const ef_measurements m = {.n_rows = block.n,
                             .n_drives = head->n_device,
                             .drive = block.device,
                             .spectrum = block.value,
                             .grid = head->grid,
                             .line = block.line,
                             .drive_name = head->device_name};
  ef_print_residual residual[200];
  size_t n;
  ef_device *device = ef_halftone_from_measurements("leaflet press", &m, NULL,
                                                    residual, &n, &error);
  assert_non_null(device);
  printf("# leaflet press: n = %.3f\n", ef_halftone_n(device));
  assert_near(ef_halftone_n(device), 1.7, 0.1);
  assert_near(ef_device_amount(device, 0, 0.5, NULL), 0.551, 0.01);
  assert_near(ef_device_amount(device, 1, 0.5, NULL), 0.553, 0.01);
  assert_near(ef_device_amount(device, 2, 0.5, NULL), 0.562, 0.01);
  assert_int_equal(n, block.n);
  double sum = 0, largest = 0;
  size_t n_tests = 0;
  for (size_t i = 0; i < n; i++) {
    if (!residual[i].is_test)
      continue;
    const double off = ef_delta_e_ciede2000(
        ef_xyz_to_lab(residual[i].measured, residual[i].white),
        ef_xyz_to_lab(residual[i].predicted, residual[i].white), 1, 1, 1);
    sum += off;
    largest = fmax(largest, off);
    n_tests++;
  }
  printf("# leaflet press: %zu mixtures, CIEDE2000 mean %.3f, largest %.3f\n",
         n_tests, sum / (double)n_tests, largest);
  assert_int_equal(n_tests, 30);
  /* 0.4 % of ink is some 0.3 of a unit. */
  assert_true(sum / (double)n_tests < 0.5);
  assert_true(largest < 1.5);
  ef_device_free(device);
  ef_reader_free(reader);
}

/* ---- Memory ------------------------------------------------------------- */

static bool attempt(void *context) {
  print_table *t = context;
  const ef_measurements m = print_table_view(t, true);
  ef_error error = {0};
  ef_device *device =
      ef_halftone_from_measurements("leaflet", &m, NULL, NULL, NULL, &error);
  if (device == NULL) {
    assert_int_equal(error.status, EF_NO_MEMORY);
    return false;
  }
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  ef_setup *setup = NULL;
  if (d65 != NULL && observer != NULL)
    setup = ef_setup_new(device, observer, d65, NULL, NULL);
  const bool whole = setup != NULL;
  ef_setup_free(setup);
  ef_observer_free(observer);
  ef_illuminant_free(d65);
  ef_device_free(device);
  return whole;
}

static void no_memory(void **state) {
  (void)state;
  print_table *t = print_table_new(1.5, 3);
  print_table_fill(t);
  assert_true(fail_alloc_each(attempt, t) > 10);
  print_table_free(t);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(names_and_limits),
      cmocka_unit_test(curves_and_n_of_the_settings),
      cmocka_unit_test(settings_at_fault),
      cmocka_unit_test(noise_below_zero),
      cmocka_unit_test(tristimulus_values_have_one_light),
      cmocka_unit_test(fit_finds_n_and_curves_of_spectra),
      cmocka_unit_test(set_n_is_kept),
      cmocka_unit_test(set_curves_are_kept),
      cmocka_unit_test(nothing_between_paper_and_solid),
      cmocka_unit_test(ramps_that_ask_for_more_than_ten),
      cmocka_unit_test(small_falls_are_pooled),
      cmocka_unit_test(ramps_that_go_backwards),
      cmocka_unit_test(tables_at_fault),
      cmocka_unit_test(missing_primaries),
      cmocka_unit_test(solid_as_light_as_paper),
      cmocka_unit_test(repeated_patches_are_averaged),
      cmocka_unit_test(rows_with_black_are_left_out),
      cmocka_unit_test(fixed_black_is_printed),
      cmocka_unit_test(leaflet_press),
      cmocka_unit_test(no_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
