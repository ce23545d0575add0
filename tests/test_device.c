/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Devices: displays from spectra and from encodings. */
#include <stdlib.h>

#include "base/base_private.h"
#include "device/device_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "invented_display.h"
#include "must.h"
#include "near.h"

enum { N = INVENTED_SAMPLES };

static const double pi = 3.14159265358979323846;

/* Keeps the notes that came, one a line. */
static void keep_note(void *cookie, const char *line) {
  char *text = cookie;
  const size_t used = strlen(text);
  snprintf(text + used, 1000 - used, "%s\n", line);
}

/* ---- The interface ----------------------------------------------------- */

static void names_and_limits(void **state) {
  (void)state;
  ef_device *device = invented_display(true);
  assert_string_equal(ef_device_kind(device), "display");
  assert_string_equal(ef_device_name(device), "kiosk");
  assert_int_equal(ef_device_n_drives(device), 3);
  assert_string_equal(ef_device_drive_name(device, 1), "green");
  assert_string_equal(ef_device_limit_name(device, 0, true),
                      "red at full drive");
  assert_string_equal(ef_device_limit_name(device, 2, false), "blue at zero");
  assert_null(ef_device_drive_name(device, 3));
  assert_null(ef_device_limit_name(device, 3, true));
  assert_null(ef_device_curve_about(device, 3));
  double slope = 0;
  assert_true(isnan(ef_device_amount(device, 3, 0.5, &slope)) && isnan(slope));
  assert_true(isnan(ef_device_drive(device, 3, 0.5)));
  assert_string_equal(ef_device_curve_about(device, 2), "power 2.3");
  assert_true(ef_device_has_spectra(device));
  assert_true(ef_device_absolute(device));
  assert_int_equal(ef_device_grid(device)->count, N);
  ef_device_free(device);
  ef_device_free(NULL);
}

static void spectrum_is_black_and_shares_of_primaries(void **state) {
  (void)state;
  ef_device *device = invented_display(false);
  double light[4 * N], spectrum[N], jacobian[3 * N];
  invented_lights(light);
  const double drive[3] = {0.3723, 0.81, 0.05};
  assert_int_equal(ef_device_spectrum(device, drive, spectrum, jacobian, NULL),
                   EF_OK);
  for (size_t s = 0; s < N; s++) {
    const double black = light[s];
    const double net[3] = {light[N + s] - black, light[2 * N + s] - black,
                           light[3 * N + s] - black};
    const double expected = black + pow(0.3723, 2.2) * net[0] +
                            pow(0.81, 2.1) * net[1] + pow(0.05, 2.3) * net[2];
    assert_near(spectrum[s], expected, 1e-17); /* of 5e-3: 2e-15 relative */
    assert_near(jacobian[3 * s + 1], 2.1 * pow(0.81, 1.1) * net[1], 1e-17);
  }
  assert_near(ef_device_amount(device, 1, 0.81, NULL), pow(0.81, 2.1), 2e-16);
  assert_near(ef_device_drive(device, 1, pow(0.81, 2.1)), 0.81, 3e-16);
  ef_device_free(device);
}

static void spectrum_at_fault(void **state) {
  (void)state;
  ef_error error;
  double spectrum[N];
  ef_device *device = invented_display(false);
  const double drive[3] = {0.2, 0.4, NOT_A_NUMBER};
  assert_int_equal(ef_device_spectrum(device, drive, spectrum, NULL, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "the drive of blue is not finite");
  ef_device_free(device);
  device = ef_display_from_encoding("srgb", NULL, NULL);
  ef_device_spectrum(device, drive, spectrum, NULL, &error);
  assert_error(&error, EF_NO_ANSWER,
               "'srgb' is known by tristimulus values only");
  ef_device_free(device);
}

static void uneven_grid_is_copied(void **state) {
  (void)state;
  double wavelength_nm[N], light[4 * N];
  static const char *const names[] = {"black", "red", "green", "blue"};
  for (size_t s = 0; s < N; s++)
    wavelength_nm[s] = 380 + 5 * (double)s + (s % 2 ? 0.4 : 0.0);
  const ef_grid grid = {N, 0, 0, wavelength_nm};
  invented_lights(light);
  ef_spectra *spectra = ef_spectra_new(4, names, &grid, EF_LIGHT, light, NULL);
  ef_device *device = ef_display_from_spectra("kiosk", spectra, NULL, NULL);
  assert_non_null(device);
  ef_spectra_free(spectra);
  memset(wavelength_nm, 0, sizeof wavelength_nm);
  assert_near(ef_grid_wavelength(ef_device_grid(device), 7), 415.4, 1e-12);
  ef_device_free(device);
}

/* ---- Displays from spectra: errors and notes --------------------------- */

typedef struct bad_display {
  size_t n;
  const char *names[11];
  const double *light[11];
  ef_status status;
  const char *part;
} bad_display;

static void check_bad_display(const bad_display *bad) {
  double value[11 * N];
  for (size_t i = 0; i < bad->n; i++)
    memcpy(value + i * N, bad->light[i], N * sizeof *value);
  const ef_grid grid = invented_grid();
  ef_spectra *spectra =
      ef_spectra_new(bad->n, bad->names, &grid, EF_LIGHT, value, NULL);
  ef_error error;
  assert_null(ef_display_from_spectra("kiosk", spectra, NULL, &error));
  assert_error(&error, bad->status, bad->part);
  assert_null(ef_display_from_spectra("kiosk", spectra, NULL, NULL));
  ef_spectra_free(spectra);
}

static void lights_at_fault(void **state) {
  (void)state;
  double light[4 * N], mixed[N], faint[N], dark[N] = {0};
  invented_lights(light);
  const double *k = light, *r = light + N, *g = light + 2 * N,
               *b = light + 3 * N;
  for (size_t s = 0; s < N; s++) {
    mixed[s] = 0.3 * r[s] + 0.7 * g[s];
    faint[s] = 0.4 * k[s];
  }
  const bad_display cases[] = {
      {2,
       {"red", "green"},
       {r, g},
       EF_INVALID,
       "found 2 primaries; a display has 3 to 8"},
      {9,
       {"1", "2", "3", "4", "5", "6", "7", "8", "9"},
       {r, g, b, r, g, b, r, g, b},
       EF_INVALID,
       "found 9 primaries; a display has 3 to 8"},
      {5,
       {"black", "red", "green", "blue", "BLACK"},
       {k, r, g, b, k},
       EF_INVALID,
       "two spectra are named 'black'"},
      {4,
       {"black", "red", "green", "blue"},
       {k, r, dark, b},
       EF_INVALID,
       "primary 'green' adds no light to the black"},
      {4,
       {"black", "red", "green", "blue"},
       {k, r, k, b},
       EF_INVALID,
       "primary 'green' adds no light to the black"},
      {5,
       {"black", "white", "red", "green", "blue"},
       {k, faint, r, g, b},
       EF_INVALID,
       "the white (Y = "},
      {4,
       {"black", "red", "green", "blue"},
       {b, faint, faint, faint},
       EF_INVALID,
       "the sum of the primaries (Y = "},
      {3,
       {"red", "green", "blue"},
       {r, g, r},
       EF_NO_ANSWER,
       "the primaries are linearly dependent: one is a mixture of the others "
       "(condition number "},
      {3,
       {"red", "green", "yellow"},
       {r, g, mixed},
       EF_NO_ANSWER,
       "the primaries are linearly dependent"},
  };
  for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
    check_bad_display(&cases[i]);
}

static void surfaces_make_no_display(void **state) {
  (void)state;
  double value[3 * N];
  ef_error error;
  const ef_grid grid = invented_grid();
  gen g = gen_new(7);
  gen_fill(&g, 3 * N, 0, 1, value);
  ef_spectra *spectra = ef_spectra_new(3, NULL, &grid, EF_SURFACE, value, NULL);
  assert_null(ef_display_from_spectra("kiosk", spectra, NULL, &error));
  assert_error(&error, EF_INVALID, "these spectra are surfaces");
  ef_spectra_free(spectra);
  assert_null(ef_display_from_spectra("kiosk", NULL, NULL, &error));
  assert_error(&error, EF_INVALID, "a display needs a name and spectra");
}

static void check_settings(const ef_display_settings *settings, bool absolute,
                           const char *part) {
  ef_error error;
  ef_spectra *spectra = invented_spectra(absolute);
  assert_null(ef_display_from_spectra("kiosk", spectra, settings, &error));
  assert_error(&error, EF_INVALID, part);
  ef_spectra_free(spectra);
}

static void settings_at_fault(void **state) {
  (void)state;
  ef_tone_curve *linear = ef_tone_curve_new("linear", NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  const ef_tone_curve *const curves[3] = {linear, NULL, linear};
  ef_display_settings s = ef_display_settings_default();
  s.n_curves = 2;
  s.curve = curves;
  check_settings(&s, true, "2 tone curves for 3 primaries; give one for each");
  s.n_curves = 3;
  check_settings(&s, true, "tone curve 2 is missing");
  s.n_curves = 1;
  s.curve = NULL;
  check_settings(&s, true, "tone curve 1 is missing");
  s = ef_display_settings_default();
  s.ambient_lux = -37.2;
  check_settings(&s, true, "room light of -37.2 lux; expected 0 or more");
  s.ambient_lux = INFINITE;
  check_settings(&s, true, "room light of inf lux");
  s.ambient_lux = 200;
  check_settings(&s, true, "room light of 200 lux needs its illuminant");
  s.ambient_illuminant = d65;
  s.screen_reflectance = 4.1;
  check_settings(&s, true, "screen reflectance 4.1; expected a ratio");
  s.screen_reflectance = NOT_A_NUMBER;
  check_settings(&s, true, "screen reflectance nan");
  s.screen_reflectance = 0.041;
  check_settings(&s, false, "room light in lux needs a display measured in");
  ef_illuminant_free(d65);
  ef_tone_curve_free(linear);
}

static void notes_say_what_was_assumed(void **state) {
  (void)state;
  char text[1000] = "";
  const ef_notes notes = {keep_note, text};
  ef_display_settings settings = ef_display_settings_default();
  settings.notes = &notes;
  double light[4 * N];
  invented_lights(light);
  const ef_grid grid = invented_grid();
  ef_spectra *spectra =
      ef_spectra_new(3, NULL, &grid, EF_LIGHT, light + N, NULL);
  ef_device *device = ef_display_from_spectra("desk", spectra, &settings, NULL);
  assert_non_null(device);
  assert_non_null(strstr(text, "desk: no spectrum is named 'black', so the "
                               "black is taken as zero\n"));
  assert_non_null(strstr(text, "desk: no tone curve given, drives are taken"));
  assert_string_equal(ef_device_curve_about(device, 0), "linear");
  ef_device_free(device);
  ef_spectra_free(spectra);
  text[0] = '\0';
  device = ef_display_from_encoding("p3-d65", &settings, NULL);
  assert_string_equal(text, "");
  ef_device_free(device);
}

/* ---- Room light -------------------------------------------------------- */

static ef_display_settings room(const ef_illuminant *illuminant) {
  ef_display_settings settings = ef_display_settings_default();
  settings.ambient_lux = 320;
  settings.screen_reflectance = 0.041;
  settings.ambient_illuminant = illuminant;
  return settings;
}

static void room_light_adds_its_luminance(void **state) {
  (void)state;
  ef_illuminant *a = ef_illuminant_new("A", NULL);
  ef_observer *observer = must_observer("cie-1931");
  const ef_display_settings settings = room(a);
  ef_spectra *spectra = invented_spectra(true);
  ef_device *dark = ef_display_from_spectra("kiosk", spectra, NULL, NULL);
  ef_device *lit = ef_display_from_spectra("kiosk", spectra, &settings, NULL);
  ef_setup *in_dark = must_setup(dark, observer),
           *in_room = must_setup(lit, observer);
  const ef_xyz black = ef_setup_black(in_dark),
               raised = ef_setup_black(in_room);
  const double k = 1 / ef_setup_scale(in_room),
               k0 = 1 / ef_setup_scale(in_dark);
  const ef_xyz added = {raised.X * k - black.X * k0,
                        raised.Y * k - black.Y * k0,
                        raised.Z * k - black.Z * k0};
  /* E rho / pi, cd/m2; the last digits of numbers near 4.2. */
  assert_near(added.Y, 320 * 0.041 / pi, 1e-13);
  assert_near(ef_setup_luminance_cd_m2(in_room),
              ef_setup_luminance_cd_m2(in_dark) + added.Y, 1e-11);
  /* Illuminant A, x = 0.44757, y = 0.40745 (CIE 015:2018, table T.3); the
   * 5 nm grid of the display ends at 780 nm. */
  const ef_xyy xyy = ef_xyz_to_xyy(added);
  assert_near(xyy.x, 0.44757, 2e-5);
  assert_near(xyy.y, 0.40745, 2e-5);
  ef_setup_free(in_dark);
  ef_setup_free(in_room);
  ef_device_free(dark);
  ef_device_free(lit);
  ef_spectra_free(spectra);
  ef_observer_free(observer);
  ef_illuminant_free(a);
}

static void room_light_outside_the_spectra_is_refused(void **state) {
  (void)state;
  double value[N];
  const ef_grid far = {N, 800, 5, NULL};
  invented_bell(1.0, 500, 50, value);
  ef_spectra *infrared = ef_spectra_new(1, NULL, &far, EF_LIGHT, value, NULL);
  ef_illuminant *light = ef_illuminant_from_spectra(infrared, 0, NULL);
  const ef_display_settings settings = room(light);
  check_settings(&settings, true,
                 "has no luminance in the range of the "
                 "display's spectra");
  ef_illuminant_free(light);
  ef_spectra_free(infrared);
}

static void measured_room_light(void **state) {
  (void)state;
  static const char *const names[] = {"red", "green", "blue", "ambient"};
  double light[4 * N], value[4 * N], spectrum[N];
  invented_lights(light);
  memcpy(value, light + N, 3 * N * sizeof *value);
  memcpy(value + 3 * N, light, N * sizeof *value);
  const ef_grid grid = invented_grid();
  ef_spectra *spectra = ef_spectra_new(4, names, &grid, EF_LIGHT, value, NULL);
  ef_spectra_set_absolute(spectra, true);
  ef_device *device = ef_display_from_spectra("kiosk", spectra, NULL, NULL);
  const double off[3] = {0, 0, 0}, red[3] = {1, 0, 0};
  ef_device_spectrum(device, off, spectrum, NULL, NULL);
  assert_same_bits(spectrum, light, N);
  ef_device_spectrum(device, red, spectrum, NULL, NULL);
  assert_near(spectrum[46], light[N + 46] + light[46], 1e-18);
  ef_device_free(device);
  ef_error error;
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  const ef_display_settings settings = room(d65);
  assert_null(ef_display_from_spectra("kiosk", spectra, &settings, &error));
  assert_error(&error, EF_INVALID, "room light is given twice");
  ef_illuminant_free(d65);
  ef_spectra_free(spectra);
}

/* ---- Additivity -------------------------------------------------------- */

static void additivity_against_a_measured_white(void **state) {
  (void)state;
  static const char *const names[] = {"black", "red", "green", "blue", "white"};
  double light[5 * N];
  invented_lights(light);
  for (size_t s = 0; s < N; s++)
    light[4 * N + s] = 0.97 * (light[N + s] + light[2 * N + s] +
                               light[3 * N + s] - 2 * light[s]);
  const ef_grid grid = invented_grid();
  ef_spectra *spectra = ef_spectra_new(5, names, &grid, EF_LIGHT, light, NULL);
  ef_device *device = ef_display_from_spectra("kiosk", spectra, NULL, NULL);
  ef_additivity a;
  assert_int_equal(ef_display_additivity(device, &a, NULL), EF_OK);
  assert_true(a.known);
  assert_near(a.luminance_ratio, 0.97, 1e-14);
  assert_near(a.measured.Y, 100, 2e-14);
  assert_near(a.summed.Y, 100 / 0.97, 2e-12);
  assert_near(a.summed.X, a.measured.X / 0.97, 2e-12);
  assert_near(a.summed.Z, a.measured.Z / 0.97, 2e-12);
  ef_device_free(device);
  ef_spectra_free(spectra);
}

static void additivity_without_a_white(void **state) {
  (void)state;
  ef_additivity a;
  ef_error error;
  ef_device *device = invented_display(true);
  assert_int_equal(ef_display_additivity(device, &a, NULL), EF_OK);
  assert_false(a.known);
  assert_true(isnan(a.luminance_ratio) && isnan(a.summed.Y));
  ef_device_free(device);
  assert_int_equal(ef_display_additivity(NULL, &a, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "additivity is a question to a display");
}

/* ---- Encodings as displays --------------------------------------------- */

static void encodings_become_displays(void **state) {
  (void)state;
  ef_observer *observer = must_observer("cie-1931");
  for (size_t e = 0; e < ef_encoding_count(); e++) {
    const ef_encoding *encoding = ef_encoding_at(e);
    ef_error error;
    ef_device *device = ef_display_from_encoding(encoding->name, NULL, &error);
    if (device == NULL)
      fail_msg("%s: %s", encoding->name, error.message);
    ef_setup *setup = must_setup(device, observer);
    const ef_xyy white = ef_xyz_to_xyy(ef_setup_white(setup));
    assert_near(white.x, encoding->white.x, 1e-15);
    assert_near(white.y, encoding->white.y, 1e-15);
    assert_near(white.Y, 100, 1e-13);
    const double green[3] = {0, 1, 0};
    const ef_xyy xyy = ef_xyz_to_xyy(ef_setup_xyz(setup, green, NULL));
    assert_near(xyy.x, encoding->green.x, 1e-15);
    assert_near(xyy.y, encoding->green.y, 1e-15);
    assert_true(ef_setup_black(setup).Y == 0);
    assert_true(isnan(ef_setup_luminance_cd_m2(setup)));
    assert_false(ef_device_has_spectra(device));
    assert_int_equal(ef_device_grid(device)->count, 0);
    ef_setup_free(setup);
    ef_device_free(device);
  }
  ef_observer_free(observer);
}

static void curves_of_settings_replace_an_encodings_own(void **state) {
  (void)state;
  ef_tone_curve *curve = ef_tone_curve_new("power:1.9", NULL);
  const ef_tone_curve *const one[1] = {curve};
  ef_display_settings settings = ef_display_settings_default();
  ef_device *device = ef_display_from_encoding("oprgb", &settings, NULL);
  assert_string_equal(ef_device_curve_about(device, 0), "power 2.19921875");
  ef_device_free(device);
  settings.n_curves = 1;
  settings.curve = one;
  device = ef_display_from_encoding("oprgb", &settings, NULL);
  ef_tone_curve_free(curve);
  for (size_t i = 0; i < 3; i++)
    assert_string_equal(ef_device_curve_about(device, i), "power 1.9");
  ef_device_free(device);
}

static void encodings_at_fault(void **state) {
  (void)state;
  ef_error error;
  assert_null(ef_display_from_encoding("p3", NULL, &error));
  assert_error(&error, EF_UNKNOWN_NAME, "near names: p3-dci, p3-d65");
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  const ef_display_settings settings = room(d65);
  assert_null(ef_display_from_encoding("srgb", &settings, &error));
  assert_error(&error, EF_INVALID, "this one has relative values only");
  ef_illuminant_free(d65);
}

/* ---- Out of memory ----------------------------------------------------- */

static bool try_display(void *context) {
  const ef_spectra *spectra = context;
  ef_error error = {0};
  ef_device *device = ef_display_from_spectra("kiosk", spectra, NULL, &error);
  if (device == NULL)
    assert_int_equal(error.status, EF_NO_MEMORY);
  ef_device_free(device);
  return device != NULL;
}

static void displays_survive_lack_of_memory(void **state) {
  (void)state;
  ef_spectra *spectra = invented_spectra(false);
  assert_true(fail_alloc_each(try_display, spectra) > 10);
  ef_spectra_free(spectra);
}

/* Every encoding, codes and floats, beside the curve, the matrix and the Lab of
 * one pixel. */
static void pixels_are_decoded(void **state) {
  (void)state;
  enum { PIXELS = 40000 };
  uint8_t *const code = malloc(3 * PIXELS);
  float *const rgb = malloc(3 * PIXELS * sizeof *rgb);
  double *const lab = malloc(3 * PIXELS * sizeof *lab);
  double *const xyz = malloc(3 * PIXELS * sizeof *xyz);
  assert_true(code != NULL && rgb != NULL && lab != NULL && xyz != NULL);
  gen g = gen_new(31);
  for (size_t i = 0; i < 3 * PIXELS; ++i) {
    code[i] = (uint8_t)gen_below(&g, 256);
    rgb[i] = (float)code[i] / 255;
  }
  rgb[0] = -0.5f; /* clamped */
  rgb[1] = 1.5f;
  code[0] = 0;
  code[1] = 255;
  for (size_t e = 0; e < ef_encoding_count(); ++e) {
    const ef_encoding *const encoding = ef_encoding_at(e);
    double matrix[9];
    ef_tone_curve *const curve = ef_tone_curve_new(encoding->tone, NULL);
    assert_non_null(curve);
    assert_int_equal(ef_encoding_matrix(encoding, matrix, NULL), EF_OK);
    assert_int_equal(
        ef_encoding_codes_to_lab(encoding, PIXELS, code, 2, lab, NULL), EF_OK);
    assert_int_equal(ef_encoding_rgb_to_xyz(encoding, PIXELS, rgb, 2, xyz, NULL),
                     EF_OK);
    const ef_xyz one = {1, 1, 1};
    const ef_xyz white = ef_xyz_transform(matrix, one);
    for (size_t i = 0; i < 1000; ++i) {
      double a[3], b[3];
      for (size_t c = 0; c < 3; ++c) {
        a[c] = ef_tone_curve_amount(curve, code[3 * i + c] / 255.0, NULL);
        b[c] = ef_tone_curve_amount(curve, (double)rgb[3 * i + c], NULL);
      }
      const ef_lab expected = ef_xyz_to_lab(
          ef_xyz_transform(matrix, (ef_xyz){a[0], a[1], a[2]}), white);
      assert_near(lab[3 * i], expected.L_star, 1e-11);
      assert_near(lab[3 * i + 1], expected.a_star, 1e-11);
      assert_near(lab[3 * i + 2], expected.b_star, 1e-11);
      const ef_xyz v = ef_xyz_transform(matrix, (ef_xyz){b[0], b[1], b[2]});
      assert_near(xyz[3 * i], 100 * v.X, 1e-11);
      assert_near(xyz[3 * i + 1], 100 * v.Y, 1e-11);
      assert_near(xyz[3 * i + 2], 100 * v.Z, 1e-11);
    }
    /* Whatever the batch and the threads. */
    double few[15];
    assert_int_equal(ef_encoding_codes_to_lab(encoding, 5, code + 3 * 30001, 1,
                                              few, NULL),
                     EF_OK);
    assert_same_bits(few, lab + 3 * 30001, 15);
    assert_int_equal(
        ef_encoding_rgb_to_xyz(encoding, 5, rgb + 3 * 30001, 1, few, NULL),
        EF_OK);
    assert_same_bits(few, xyz + 3 * 30001, 15);
    ef_tone_curve_free(curve);
  }
  free(code);
  free(rgb);
  free(lab);
  free(xyz);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(names_and_limits),
      cmocka_unit_test(spectrum_is_black_and_shares_of_primaries),
      cmocka_unit_test(spectrum_at_fault),
      cmocka_unit_test(uneven_grid_is_copied),
      cmocka_unit_test(lights_at_fault),
      cmocka_unit_test(surfaces_make_no_display),
      cmocka_unit_test(settings_at_fault),
      cmocka_unit_test(notes_say_what_was_assumed),
      cmocka_unit_test(room_light_adds_its_luminance),
      cmocka_unit_test(room_light_outside_the_spectra_is_refused),
      cmocka_unit_test(measured_room_light),
      cmocka_unit_test(additivity_against_a_measured_white),
      cmocka_unit_test(additivity_without_a_white),
      cmocka_unit_test(encodings_become_displays),
      cmocka_unit_test(pixels_are_decoded),
      cmocka_unit_test(curves_of_settings_replace_an_encodings_own),
      cmocka_unit_test(encodings_at_fault),
      cmocka_unit_test(displays_survive_lack_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
