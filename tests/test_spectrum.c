/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "base/base_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "near.h"
#include "spectrum/spectrum_private.h"

/* ---- Grids ------------------------------------------------------------- */

static void standard_grid_is_360_to_830(void **state) {
  (void)state;
  const ef_grid grid = ef_grid_standard();
  assert_int_equal(grid.count, 471);
  assert_near(ef_grid_wavelength(&grid, 0), 360, 0);
  assert_near(ef_grid_wavelength(&grid, 470), 830, 0);
  assert_int_equal(ef_grid_check(&grid, NULL), EF_OK);
}

static void check_bad_grid(ef_grid grid, const char *part) {
  ef_error error;
  assert_int_equal(ef_grid_check(&grid, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, part);
}

static void bad_grids_are_refused(void **state) {
  (void)state;
  check_bad_grid((ef_grid){0}, "at least one sample");
  check_bad_grid((ef_grid){3, 0, 10, NULL}, "sample 1 is at 0 nm");
  check_bad_grid((ef_grid){3, NOT_A_NUMBER, 10, NULL}, "sample 1 is at nan nm");
  check_bad_grid((ef_grid){3, INFINITE, 10, NULL}, "sample 1 is at inf nm");
  check_bad_grid((ef_grid){3, 400, 0, NULL}, "step is 0 nm");
  check_bad_grid((ef_grid){3, 400, -10, NULL}, "step is -10 nm");
  check_bad_grid((ef_grid){3, 400, NOT_A_NUMBER, NULL}, "step is nan nm");
  check_bad_grid((ef_grid){3, 400, 1e-20, NULL}, "does not reach sample 3");
  check_bad_grid((ef_grid){3, 400, 1e308, NULL}, "does not reach sample 3");
  const double falling[] = {400, 420, 410};
  check_bad_grid((ef_grid){3, 0, 0, falling},
                 "sample 3 is at 410 nm after 420");
  const double twice[] = {400, 400, 410};
  check_bad_grid((ef_grid){3, 0, 0, twice}, "sample 2 is at 400 nm after 400");
  const double negative[] = {-400, 400};
  check_bad_grid((ef_grid){2, 0, 0, negative}, "sample 1 is at -400 nm");
  const double infinite[] = {400, INFINITE};
  check_bad_grid((ef_grid){2, 0, 0, infinite}, "sample 2 is at inf nm");
  const ef_grid one = {1, 555, 0, NULL};
  assert_int_equal(ef_grid_check(&one, NULL), EF_OK);
}

static void grids_are_compared_and_simplified(void **state) {
  (void)state;
  double list[31];
  for (size_t i = 0; i < 31; ++i)
    list[i] = 400 + 10 * (double)i;
  const ef_grid even = {31, 400, 10, NULL};
  const ef_grid listed = {31, 0, 0, list};
  assert_true(ef_grid_equal(&even, &listed));
  const ef_grid simple = ef_grid_simplify(&listed);
  assert_null(simple.wavelength_nm);
  assert_near(simple.start_nm, 400, 0);
  assert_near(simple.step_nm, 10, 0);
  list[17] += 9e-6; /* of a step of 10 nm: still even */
  assert_null(ef_grid_simplify(&listed).wavelength_nm);
  assert_false(ef_grid_equal(&even, &listed));
  list[17] += 2e-6;
  assert_ptr_equal(ef_grid_simplify(&listed).wavelength_nm, list);
  const ef_grid shorter = {30, 400, 10, NULL};
  assert_false(ef_grid_equal(&even, &shorter));
  const ef_grid single = {1, 0, 0, list};
  assert_ptr_equal(ef_grid_simplify(&single).wavelength_nm, list);
}

static void wavelengths_are_located(void **state) {
  (void)state;
  const double list[] = {400, 405, 420, 450, 451};
  const ef_grid grid = {5, 0, 0, list};
  size_t i = 99;
  assert_int_equal(ef__grid_locate(&grid, 399.9, &i), EF__BELOW);
  assert_int_equal(i, 0);
  assert_int_equal(ef__grid_locate(&grid, 400 - 1e-8, &i), EF__AT);
  assert_int_equal(i, 0);
  assert_int_equal(ef__grid_locate(&grid, 404.9, &i), EF__WITHIN);
  assert_int_equal(i, 0);
  assert_int_equal(ef__grid_locate(&grid, 420 - 1e-8, &i), EF__AT);
  assert_int_equal(i, 2);
  assert_int_equal(ef__grid_locate(&grid, 420 + 1e-8, &i), EF__AT);
  assert_int_equal(i, 2);
  assert_int_equal(ef__grid_locate(&grid, 450.7, &i), EF__WITHIN);
  assert_int_equal(i, 3);
  assert_int_equal(ef__grid_locate(&grid, 451 + 1e-8, &i), EF__AT);
  assert_int_equal(i, 4);
  assert_int_equal(ef__grid_locate(&grid, 451.1, &i), EF__ABOVE);
  assert_int_equal(i, 4);
}

/* ---- Sets of spectra --------------------------------------------------- */

static void spectra_are_copied(void **state) {
  (void)state;
  double list[] = {400, 500, 700};
  double value[] = {0.1, 0.2, 0.3, 0.4, 0.5, 0.6};
  char red[] = "hull red";
  const char *names[] = {red, "mast"};
  const ef_grid grid = {3, 0, 0, list};
  ef_spectra *const s =
      ef_spectra_new(2, names, &grid, EF_SURFACE, value, NULL);
  assert_non_null(s);
  red[0] = '#';
  names[1] = NULL;
  list[0] = value[0] = -7;
  assert_int_equal(ef_spectra_count(s), 2);
  assert_int_equal(ef_spectra_kind(s), EF_SURFACE);
  assert_string_equal(ef_spectra_name(s, 0), "hull red");
  assert_string_equal(ef_spectra_name(s, 1), "mast");
  assert_near(ef_grid_wavelength(ef_spectra_grid(s), 0), 400, 0);
  assert_near(ef_spectra_values(s)[0], 0.1, 0);
  assert_near(ef_spectra_values(s)[5], 0.6, 0);
  assert_false(ef_spectra_absolute(s));
  ef_spectra_set_absolute(s, true);
  assert_true(ef_spectra_absolute(s));
  size_t index = 99;
  assert_int_equal(ef_spectra_find(s, "mast", &index, NULL), EF_OK);
  assert_int_equal(index, 1);
  ef_error error;
  assert_int_equal(ef_spectra_find(s, "masts", &index, &error),
                   EF_UNKNOWN_NAME);
  assert_error(&error, EF_UNKNOWN_NAME,
               "no spectrum is called 'masts'; near names: mast");
  ef_spectra_free(s);
  ef_spectra_free(NULL);
}

static void spectra_without_names_are_numbered(void **state) {
  (void)state;
  const ef_grid grid = {1, 555, 0, NULL};
  double value[120] = {0};
  ef_spectra *const s = ef_spectra_new(120, NULL, &grid, EF_LIGHT, value, NULL);
  assert_non_null(s);
  assert_string_equal(ef_spectra_name(s, 0), "1");
  assert_string_equal(ef_spectra_name(s, 119), "120");
  ef_spectra_free(s);
  ef_spectra *const empty =
      ef_spectra_new(0, NULL, &grid, EF_LIGHT, NULL, NULL);
  assert_non_null(empty);
  assert_int_equal(ef_spectra_count(empty), 0);
  ef_spectra_free(empty);
}

static void bad_spectra_are_refused(void **state) {
  (void)state;
  ef_error error;
  const ef_grid grid = {2, 400, 10, NULL};
  const double bad[] = {1, 2, 3, NOT_A_NUMBER};
  const char *const names[] = {"deck", "rail"};
  assert_null(ef_spectra_new(2, names, &grid, EF_LIGHT, bad, &error));
  assert_error(&error, EF_INVALID, "'rail' is not a number at 410 nm");
  const double infinite[] = {-INFINITE, 2, 3, 4};
  assert_null(ef_spectra_new(2, NULL, &grid, EF_LIGHT, infinite, &error));
  assert_error(&error, EF_INVALID, "spectrum 1 is infinite at 400 nm");
  const ef_grid none = {0};
  assert_null(ef_spectra_new(1, NULL, &none, EF_LIGHT, bad, &error));
  assert_error(&error, EF_INVALID, "at least one sample");
  assert_null(ef_spectra_new(SIZE_MAX / 2, NULL, &grid, EF_LIGHT, bad, &error));
  assert_error(&error, EF_NO_MEMORY, "out of memory");
}

/* ---- Interpolation ----------------------------------------------------- */

static double resample_one(const ef_grid *from, const double *value, double at,
                           ef_interpolation rule, ef_extension extension) {
  const ef_grid to = {1, at, 0, NULL};
  double out = NOT_A_NUMBER;
  assert_int_equal(
      ef_resample(from, 1, value, &to, rule, extension, &out, NULL), EF_OK);
  return out;
}

static void ends_are_held_or_zero(void **state) {
  (void)state;
  const double value[] = {0.3, 0.5, 0.2, 0.6, 0.7, 0.4, 0.9};
  const ef_grid grid = {7, 400, 20, NULL};
  const ef_interpolation rules[] = {
      EF_INTERPOLATE_SPRAGUE, EF_INTERPOLATE_SPLINE, EF_INTERPOLATE_LINEAR};
  for (size_t r = 0; r < 3; ++r) {
    assert_near(resample_one(&grid, value, 380, rules[r], EF_EXTEND_HOLD), 0.3,
                0);
    assert_near(resample_one(&grid, value, 600, rules[r], EF_EXTEND_HOLD), 0.9,
                0);
    assert_near(resample_one(&grid, value, 600, rules[r], EF_EXTEND_AUTO), 0.9,
                0);
    assert_near(resample_one(&grid, value, 399.9, rules[r], EF_EXTEND_ZERO), 0,
                0);
    assert_near(resample_one(&grid, value, 520.1, rules[r], EF_EXTEND_ZERO), 0,
                0);
    /* The end samples themselves are inside. */
    assert_near(resample_one(&grid, value, 400, rules[r], EF_EXTEND_ZERO), 0.3,
                0);
    assert_near(resample_one(&grid, value, 520, rules[r], EF_EXTEND_ZERO), 0.9,
                0);
  }
}

static void every_rule_keeps_the_samples(void **state) {
  (void)state;
  gen g = gen_new(21);
  double value[9], out[9];
  const ef_grid grid = {9, 393.7, 11.3, NULL};
  gen_fill(&g, 9, -1, 1, value);
  for (int rule = EF_INTERPOLATE_AUTO; rule <= EF_INTERPOLATE_LINEAR; ++rule) {
    assert_int_equal(ef_resample(&grid, 1, value, &grid, (ef_interpolation)rule,
                                 EF_EXTEND_ZERO, out, NULL),
                     EF_OK);
    assert_same_bits(out, value, 9);
  }
}

static void automatic_rule_follows_the_samples(void **state) {
  (void)state;
  const double value[] = {0.3, 0.5, 0.2, 0.6, 0.7, 0.4};
  const double list[] = {400, 420, 440, 460, 481, 500};
  const ef_grid six = {6, 400, 20, NULL};
  const ef_grid five = {5, 400, 20, NULL};
  const ef_grid uneven = {6, 0, 0, list};
  const ef_grid two = {2, 400, 20, NULL};
  const ef_grid one = {1, 400, 20, NULL};
  const ef_extension hold = EF_EXTEND_HOLD;
  const ef_interpolation automatic = EF_INTERPOLATE_AUTO;
  assert_near(resample_one(&six, value, 447, automatic, hold),
              resample_one(&six, value, 447, EF_INTERPOLATE_SPRAGUE, hold), 0);
  assert_near(resample_one(&five, value, 447, automatic, hold),
              resample_one(&five, value, 447, EF_INTERPOLATE_SPLINE, hold), 0);
  assert_near(resample_one(&uneven, value, 447, automatic, hold),
              resample_one(&uneven, value, 447, EF_INTERPOLATE_SPLINE, hold),
              0);
  assert_near(resample_one(&two, value, 405, automatic, hold), 0.35, 1e-16);
  assert_near(resample_one(&one, value, 400, automatic, hold), 0.3, 0);
  assert_near(resample_one(&one, value, 700, automatic, hold), 0.3, 0);
  assert_near(resample_one(&one, value, 700, automatic, EF_EXTEND_ZERO), 0, 0);
}

static void check_refused(const ef_grid *from, ef_interpolation rule,
                          const char *part) {
  const double value[8] = {0};
  const ef_grid to = {1, 410, 0, NULL};
  double out;
  ef_error error;
  assert_int_equal(
      ef_resample(from, 1, value, &to, rule, EF_EXTEND_HOLD, &out, &error),
      EF_INVALID);
  assert_error(&error, EF_INVALID, part);
  assert_int_equal(
      ef_resample(from, 1, value, &to, rule, EF_EXTEND_HOLD, &out, NULL),
      EF_INVALID);
}

static void rules_say_what_they_need(void **state) {
  (void)state;
  const double list[] = {400, 420, 440, 460, 481, 500};
  const ef_grid five = {5, 400, 20, NULL};
  const ef_grid uneven = {6, 0, 0, list};
  const ef_grid two = {2, 400, 20, NULL};
  const ef_grid bad = {2, 400, -1, NULL};
  check_refused(&five, EF_INTERPOLATE_SPRAGUE, "needs 6 samples, not 5");
  check_refused(&uneven, EF_INTERPOLATE_SPRAGUE, "needs even steps");
  check_refused(&two, EF_INTERPOLATE_SPLINE, "needs 3 samples, not 2");
  check_refused(&bad, EF_INTERPOLATE_LINEAR, "step is -1 nm");
}

/* The spline through three points, by hand: samples 0, 1, 0 at 0, 1, 2 have
 * the second derivative -3 in the middle; at 0.5: 0.5 + (0.125 - 0.5) (-3)/6.
 */
static void spline_of_three_points(void **state) {
  (void)state;
  const double value[] = {0, 1, 0};
  const ef_grid grid = {3, 500, 1, NULL};
  assert_near(
      resample_one(&grid, value, 500.5, EF_INTERPOLATE_SPLINE, EF_EXTEND_HOLD),
      0.6875, 1e-15);
  assert_near(
      resample_one(&grid, value, 501.5, EF_INTERPOLATE_SPLINE, EF_EXTEND_HOLD),
      0.6875, 1e-15);
}

/* ---- Bandpass ---------------------------------------------------------- */

static void bandpass_uses_the_published_weights(void **state) {
  (void)state;
  const double in[] = {1, 2, 4, 8};
  double out[4];
  ef__bandpass_apply(4, in, out);
  assert_near(out[0], 1.083 * 1 - 0.083 * 2, 1e-15);
  assert_near(out[1], -0.083 * 1 + 1.166 * 2 - 0.083 * 4, 1e-15);
  assert_near(out[2], -0.083 * 2 + 1.166 * 4 - 0.083 * 8, 1e-15);
  assert_near(out[3], -0.083 * 4 + 1.083 * 8, 1e-15);
}

/* <B x, y> = <x, B' y> for random x and y. */
static void bandpass_transposed_is_the_transposed(void **state) {
  (void)state;
  gen g = gen_new(22);
  double x[9], y[9], bx[9], ty[9], left = 0, right = 0;
  gen_fill(&g, 9, -1, 1, x);
  gen_fill(&g, 9, -1, 1, y);
  ef__bandpass_apply(9, x, bx);
  ef__bandpass_apply_transposed(9, y, ty);
  for (size_t i = 0; i < 9; ++i) {
    left += bx[i] * y[i];
    right += x[i] * ty[i];
  }
  assert_near(left, right, 1e-14);
}

/* ---- Folding and applying ---------------------------------------------- */

/* Two channels over 400, 401 ... 410 nm. */
static ef_fold_settings small_settings(void) {
  ef_fold_settings settings = ef_fold_settings_default();
  settings.working = (ef_grid){11, 400, 1, NULL};
  settings.interpolation = EF_INTERPOLATE_LINEAR;
  return settings;
}

static void folded_weights_by_hand(void **state) {
  (void)state;
  ef_fold_settings settings = small_settings();
  const ef_grid samples = {3, 402, 4, NULL}; /* 402, 406, 410 */
  double channel[22];
  for (size_t i = 0; i < 11; ++i) {
    channel[i] = 1;
    channel[11 + i] = i == 3 ? 8 : 0; /* at 403: 3/4 and 1/4 of neighbours */
  }
  const double scale[] = {0.5, 2};
  ef_weights *w =
      ef_weights_fold(&samples, 2, channel, NULL, scale, &settings, NULL);
  assert_non_null(w);
  assert_int_equal(ef_weights_channels(w), 2);
  assert_int_equal(ef_weights_samples(w), 3);
  assert_true(ef_grid_equal(ef_weights_grid(w), &samples));
  /* 400 and 401 hold the first sample: 2 + 1 + 3/4 + 2/4 + 1/4 of it. */
  const double held[] = {2.25, 2, 1.25, 12, 4, 0};
  assert_same_bits(ef_weights_matrix(w), held, 6);
  assert_near(ef_weights_outside(w, 0), 2.0 / 11, 1e-16);
  assert_near(ef_weights_outside(w, 1), 0, 0);
  ef_weights_free(w);
  settings.kind = EF_LIGHT; /* zero outside; and an illuminant */
  double light[11];
  for (size_t i = 0; i < 11; ++i)
    light[i] = i < 2 ? 100 : 2;
  w = ef_weights_fold(&samples, 2, channel, light, scale, &settings, NULL);
  assert_non_null(w);
  const double cut[] = {2.5, 4, 2.5, 24, 8, 0};
  assert_same_bits(ef_weights_matrix(w), cut, 6);
  assert_near(ef_weights_outside(w, 0), 200.0 / 218, 1e-16);
  ef_weights_free(w);
  ef_weights_free(NULL);
}

static void weights_of_nothing_have_no_outside(void **state) {
  (void)state;
  const ef_fold_settings settings = small_settings();
  const ef_grid samples = {3, 402, 4, NULL};
  const double channel[11] = {0};
  const double scale = 1;
  ef_weights *const w =
      ef_weights_fold(&samples, 1, channel, NULL, &scale, &settings, NULL);
  assert_non_null(w);
  assert_near(ef_weights_outside(w, 0), 0, 0);
  ef_weights_free(w);
}

static void weights_keep_their_own_grid(void **state) {
  (void)state;
  const ef_fold_settings settings = small_settings();
  double list[] = {401, 405, 409.5};
  const ef_grid samples = {3, 0, 0, list};
  const double channel[11] = {1};
  const double scale = 1;
  ef_weights *const w =
      ef_weights_fold(&samples, 1, channel, NULL, &scale, &settings, NULL);
  assert_non_null(w);
  list[0] = 0;
  assert_near(ef_grid_wavelength(ef_weights_grid(w), 0), 401, 0);
  ef_weights_free(w);
}

static void check_fold_refused(const ef_grid *samples, const double *channel,
                               const double *light, const double *scale,
                               const ef_fold_settings *settings,
                               const char *part) {
  ef_error error;
  assert_null(
      ef_weights_fold(samples, 1, channel, light, scale, settings, &error));
  assert_error(&error, EF_INVALID, part);
}

static void folding_says_what_it_needs(void **state) {
  (void)state;
  ef_fold_settings settings = small_settings();
  const ef_grid samples = {3, 402, 4, NULL};
  const ef_grid bad = {3, 402, 0, NULL};
  const double list[] = {400, 403, 410};
  const ef_grid uneven = {3, 0, 0, list};
  const ef_grid one = {1, 402, 4, NULL};
  double channel[11] = {1};
  double light[11] = {1};
  double scale = 1;
  check_fold_refused(&bad, channel, light, &scale, &settings, "step is 0 nm");
  channel[4] = NOT_A_NUMBER;
  check_fold_refused(&samples, channel, light, &scale, &settings,
                     "value 5 of the channels");
  channel[4] = 0;
  light[10] = INFINITE;
  check_fold_refused(&samples, channel, light, &scale, &settings,
                     "value 11 of the illuminant");
  light[10] = 0;
  scale = NOT_A_NUMBER;
  check_fold_refused(&samples, channel, light, &scale, &settings,
                     "value 1 of the scales");
  scale = 1;
  settings.interpolation = EF_INTERPOLATE_SPRAGUE;
  check_fold_refused(&samples, channel, light, &scale, &settings,
                     "needs 6 samples, not 3");
  settings.interpolation = EF_INTERPOLATE_LINEAR;
  settings.correct_bandpass = true;
  check_fold_refused(&uneven, channel, light, &scale, &settings,
                     "bandpass correction needs");
  check_fold_refused(&one, channel, light, &scale, &settings,
                     "bandpass correction needs");
  settings.working.count = 0;
  check_fold_refused(&samples, channel, light, &scale, &settings,
                     "at least one sample");
  settings = small_settings();
  ef_error error;
  assert_null(ef_weights_fold(&samples, SIZE_MAX / 2, channel, NULL, &scale,
                              &settings, &error));
  assert_error(&error, EF_INVALID, "too many");
}

static void applying_by_hand(void **state) {
  (void)state;
  const ef_fold_settings settings = small_settings();
  const ef_grid samples = {3, 402, 4, NULL};
  double channel[11];
  for (size_t i = 0; i < 11; ++i)
    channel[i] = 1;
  const double scale = 0.5;
  ef_weights *const w =
      ef_weights_fold(&samples, 1, channel, NULL, &scale, &settings, NULL);
  assert_non_null(w);
  const double sample[] = {4, 2, 8, 0, 0, 1};
  double out[2];
  assert_int_equal(ef_weights_apply(w, 2, sample, 1, out, NULL), EF_OK);
  const double expected[] = {23, 1.25};
  assert_same_bits(out, expected, 2);
  assert_int_equal(ef_weights_apply(w, 0, NULL, 0, NULL, NULL), EF_OK);
  ef_error error;
  assert_int_equal(ef_weights_apply(w, 2, sample, -1, out, &error), EF_INVALID);
  float narrow[sizeof sample / sizeof *sample];
  for (size_t i = 0; i < sizeof sample / sizeof *sample; ++i)
    narrow[i] = (float)sample[i];
  double same[sizeof out / sizeof *out];
  assert_int_equal(ef_weights_apply_float(w, 2, narrow, 1, same, NULL), EF_OK);
  assert_same_bits(same, out, sizeof out / sizeof *out);
  assert_int_equal(ef_weights_apply_float(w, 2, narrow, -1, same, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "-1 jobs");
  ef_weights_free(w);
}

/* ---- Memory ------------------------------------------------------------ */

static bool make_everything(void *context) {
  (void)context;
  static const double list[] = {400, 403, 409.5};
  static const double value[] = {1, 2, 3};
  static const double channel[11] = {1};
  static const double scale = 1;
  const ef_grid grid = {3, 0, 0, list};
  const ef_fold_settings settings = small_settings();
  ef_error error = {.status = EF_OK};
  double out[11];
  ef_illuminant *light = NULL;
  ef_illuminant *lamp = NULL;
  ef_weights *weights = NULL;
  bool done = false;
  ef_spectra *const spectra =
      ef_spectra_new(1, NULL, &grid, EF_LIGHT, value, &error);
  if (spectra != NULL) {
    light = ef_illuminant_new("daylight:5000", &error);
    lamp = ef_illuminant_from_spectra(spectra, 0, &error);
  }
  if (light != NULL && lamp != NULL &&
      ef_illuminant_sample(light, &settings.working, out, &error) == EF_OK) {
    weights =
        ef_weights_fold(&grid, 1, channel, out, &scale, &settings, &error);
  }
  if (weights != NULL) {
    done = ef_weights_apply(weights, 1, value, 1, out, &error) == EF_OK;
  }
  assert_int_equal(error.status, done ? EF_OK : EF_NO_MEMORY);
  ef_weights_free(weights);
  ef_illuminant_free(lamp);
  ef_illuminant_free(light);
  ef_spectra_free(spectra);
  return done;
}

static void failing_allocations_are_reported(void **state) {
  (void)state;
  /* Set, two lights, operator and scratch of the sampling, operator, work and
   * weights of the folding; none for applying. */
  assert_int_equal(fail_alloc_each(make_everything, NULL), 8);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(standard_grid_is_360_to_830),
      cmocka_unit_test(bad_grids_are_refused),
      cmocka_unit_test(grids_are_compared_and_simplified),
      cmocka_unit_test(wavelengths_are_located),
      cmocka_unit_test(spectra_are_copied),
      cmocka_unit_test(spectra_without_names_are_numbered),
      cmocka_unit_test(bad_spectra_are_refused),
      cmocka_unit_test(ends_are_held_or_zero),
      cmocka_unit_test(every_rule_keeps_the_samples),
      cmocka_unit_test(automatic_rule_follows_the_samples),
      cmocka_unit_test(rules_say_what_they_need),
      cmocka_unit_test(spline_of_three_points),
      cmocka_unit_test(bandpass_uses_the_published_weights),
      cmocka_unit_test(bandpass_transposed_is_the_transposed),
      cmocka_unit_test(folded_weights_by_hand),
      cmocka_unit_test(weights_of_nothing_have_no_outside),
      cmocka_unit_test(weights_keep_their_own_grid),
      cmocka_unit_test(folding_says_what_it_needs),
      cmocka_unit_test(applying_by_hand),
      cmocka_unit_test(failing_allocations_are_reported),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
