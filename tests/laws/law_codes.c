/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the code values of a display make of a modulation. */
#include <stdlib.h>
#include <time.h>

#include "gen.h"
#include "invented_stimulator.h"
#include "near.h"

enum { MOST = EF_MAX_DRIVES };

static ef_isolation random_isolation(const invented *i, gen *g,
                                     const char *change, const char *silent) {
  ef_isolation out;
  ef_error error;
  ef_isolate_settings settings = ef_isolate_settings_default();
  const ef_direction direction = invented_direction(change, silent);
  gen_fill(g, MOST, 0.2, 0.8, settings.background);
  settings.modulation = gen_unit(g) < 0.5 ? EF_SYMMETRIC : EF_PULSE;
  ef_status status =
      ef_isolate(i->stimulator, &direction, &settings, &out, &error);
  if (status == EF_OK) {
    settings.contrast = out.largest * gen_between(g, 0.05, 1);
    status = ef_isolate(i->stimulator, &direction, &settings, &out, &error);
  }
  if (status != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

static ef_coded code(const invented *i, const ef_isolation *way, int bits) {
  ef_coded out;
  ef_error error;
  ef_codes_settings settings = ef_codes_settings_default();
  settings.bits = bits;
  if (ef_isolation_codes(i->stimulator, way, &settings, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

static void contrasts_of(const invented *i, int bits,
                         const uint32_t *background, const uint32_t *codes,
                         double out[EF_N_RECEPTORS]) {
  double amount[2][MOST], excitation[2][EF_N_RECEPTORS];
  const double last = (1 << bits) - 1;
  for (size_t k = 0; k < ef_stimulator_n_primaries(i->stimulator); k++) {
    amount[0][k] = ef_device_amount(i->device, k, background[k] / last, NULL);
    amount[1][k] = ef_device_amount(i->device, k, codes[k] / last, NULL);
  }
  for (size_t s = 0; s < 2; s++)
    ef_stimulator_excitations(i->stimulator, amount[s], excitation[s]);
  for (size_t r = 0; r < EF_N_RECEPTORS; r++)
    out[r] = excitation[1][r] / excitation[0][r] - 1;
}

/* The sum that the codes make least, without the cost of codes. */
static double error_of(const ef_isolation *way, const double *contrast,
                       double level) {
  double sum = 0;
  for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
    const double off = contrast[r] - level * way->contrast[r];
    if (way->role[r] == EF_RECEPTOR_SILENT)
      sum += 100 * off * off;
    if (way->role[r] == EF_RECEPTOR_CHANGED)
      sum += off * off;
  }
  return sum;
}

static void no_codes_of_all_are_better(void **state) {
  (void)state;
  static const char *const changes[] = {"S", "L,-M", "luminance", "M"};
  gen g = gen_new(31);
  invented i = invented_new(3, "cie-2015-2");
  for (int bits = 1; bits <= 6; bits++) {
    for (size_t k = 0; k < 4; k++) {
      const ef_isolation way = random_isolation(&i, &g, changes[k], "");
      const ef_coded out = code(&i, &way, bits);
      const uint32_t n = 1u << bits;
      double contrast[EF_N_RECEPTORS], least = INFINITE;
      for (uint32_t all = 0; all < n * n * n; all++) {
        const uint32_t codes[3] = {all % n, all / n % n, all / n / n};
        contrasts_of(&i, bits, out.background, codes, contrast);
        least = fmin(least, error_of(&way, contrast, 1));
      }
      contrasts_of(&i, bits, out.background, out.high, contrast);
      assert_near_relative(error_of(&way, contrast, 1), least, 1e-6);
      for (size_t r = 0; r < EF_N_RECEPTORS; r++)
        assert_near(out.contrast_high[r], contrast[r], 1e-12);
    }
  }
  invented_free(&i);
}

/* Of all steps within 12 codes. */
static void no_pure_step_is_smaller(void **state) {
  (void)state;
  enum { REACH = 12 };
  gen g = gen_new(32);
  invented i = invented_new(3, "cie-2015-2");
  static const char *const changes[] = {"S", "L=2,M=-1", "luminance", "L"};
  int n_found = 0;
  for (size_t k = 0; k < 8; k++) {
    const int bits = k < 4 ? 8 : 10;
    const ef_isolation way = random_isolation(&i, &g, changes[k % 4], "");
    const ef_coded out = code(&i, &way, bits);
    double least = INFINITE, size = 0, square = 0, contrast[EF_N_RECEPTORS];
    for (size_t r = 0; r < 3; r++) {
      size = fmax(size, fabs(way.direction[r]));
      square += way.direction[r] * way.direction[r];
    }
    for (int a = 0; a < 25 * 25 * 25; a++) {
      const int step[3] = {a % 25, a / 25 % 25, a / 625};
      uint32_t codes[3];
      double along = 0;
      for (size_t j = 0; j < 3; j++)
        codes[j] = (uint32_t)((int)out.background[j] + step[j] - REACH);
      contrasts_of(&i, bits, out.background, codes, contrast);
      for (size_t r = 0; r < 3; r++)
        along += contrast[r] * way.direction[r] / square;
      bool pure = along > 0;
      for (size_t r = 0; r < 3; r++)
        pure = pure && fabs(contrast[r] - along * way.direction[r]) <=
                           0.1 * along * size;
      if (pure)
        least = fmin(least, along);
    }
    if (isinf(least)) {
      assert_true(isnan(out.smallest_contrast));
      assert_true(out.below_resolution);
      continue;
    }
    n_found++;
    assert_near_relative(out.smallest_contrast, least, 1e-9);
    assert_int_equal(out.below_resolution, way.along < least * (1 - 1e-12));
  }
  printf("# %d of 8 have a step of that purity\n", n_found);
  assert_true(n_found >= 4);
  invented_free(&i);
}

/* Codes to drives to the spectrum to the weights. */
static void spectra_of_the_codes_give_the_residual(void **state) {
  (void)state;
  gen g = gen_new(33);
  invented i = invented_new(5, "cie-2015-10");
  const ef_grid *grid = ef_device_grid(i.device);
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = true;
  ef_weights *weights =
      ef_observer_weights(i.observer, EF_RECEPTORS, grid, &viewing, NULL, NULL);
  double *light = calloc(3 * grid->count, sizeof *light);
  for (int k = 0; k < 10; k++) {
    const ef_isolation way = random_isolation(&i, &g, "S", k % 2 ? "mel" : "");
    const ef_coded out = code(&i, &way, 8);
    const uint32_t *const all[3] = {out.background, out.high, out.low};
    double channel[3 * EF_N_RECEPTORS], residual = 0;
    for (size_t s = 0; s < 3; s++) {
      double drive[MOST];
      for (size_t j = 0; j < 5; j++)
        drive[j] = all[s][j] / 255.0;
      ef_device_spectrum(i.device, drive, light + s * grid->count, NULL, NULL);
    }
    ef_weights_apply(weights, 3, light, 1, channel, NULL);
    for (size_t r = 0; r < EF_N_RECEPTORS; r++) {
      const double high = channel[EF_N_RECEPTORS + r] / channel[r] - 1;
      const double low = channel[2 * EF_N_RECEPTORS + r] / channel[r] - 1;
      assert_near(out.contrast_high[r], high, 1e-12);
      assert_near(out.contrast_low[r], low, 1e-12);
      if (way.role[r] == EF_RECEPTOR_SILENT)
        residual = fmax(residual, fmax(fabs(high), fabs(low)));
    }
    assert_near(out.residual, residual, 1e-12);
  }
  free(light);
  ef_weights_free(weights);
  invented_free(&i);
}

/* Chosen codes against rounded ones, by number of primaries and bits. */
static void chosen_codes_are_quieter_than_rounded_ones(void **state) {
  (void)state;
  enum { CASES = 12 };
  static const int depths[] = {8, 10, 16};
  gen g = gen_new(34);
  for (size_t n = 3; n <= MOST; n++) {
    invented i = invented_new(n, "cie-2015-2");
    double chosen[3] = {0}, rounded[3] = {0};
    const clock_t start = clock();
    for (int k = 0; k < CASES; k++) {
      const ef_isolation way =
          random_isolation(&i, &g, k % 2 ? "S" : "L,-M", n > 4 ? "mel" : "");
      for (size_t b = 0; b < 3; b++) {
        const ef_coded out = code(&i, &way, depths[b]);
        chosen[b] += out.residual / CASES;
        rounded[b] += out.rounded_residual / CASES;
        for (size_t r = 0; r < EF_N_RECEPTORS; r++)
          if (way.role[r] == EF_RECEPTOR_CHANGED)
            assert_near(out.contrast_high[r], way.contrast[r],
                        0.2 / (1 << (depths[b] - 6)));
      }
    }
    printf("# %zu primaries: residual at 8, 10, 16 bits %.1e %.1e %.1e, "
           "rounded %.1e %.1e %.1e; %.1f ms a case\n",
           n, chosen[0], chosen[1], chosen[2], rounded[0], rounded[1],
           rounded[2],
           1e3 * (double)(clock() - start) / CLOCKS_PER_SEC / CASES / 3);
    for (size_t b = 0; b < 3; b++)
      assert_true(chosen[b] < rounded[b] * (n > 3 ? 0.5 : 1));
    for (size_t b = 1; b < 3; b++)
      assert_true(chosen[b] < 0.6 * chosen[b - 1]);
    invented_free(&i);
  }
}

static void a_contrast_below_the_step_is_told(void **state) {
  (void)state;
  invented i = invented_new(3, "cie-2015-2");
  const ef_direction direction = invented_direction("S", "");
  ef_isolate_settings settings = ef_isolate_settings_default();
  ef_isolation way;
  settings.contrast = 0.002; /* a code of blue is some 0.01 */
  assert_int_equal(ef_isolate(i.stimulator, &direction, &settings, &way, NULL),
                   EF_OK);
  ef_coded out = code(&i, &way, 8);
  assert_true(out.smallest_contrast > 0.005);
  assert_true(out.below_resolution);
  assert_memory_equal(out.high, out.background, sizeof out.high);
  settings.contrast = 0.2;
  assert_int_equal(ef_isolate(i.stimulator, &direction, &settings, &way, NULL),
                   EF_OK);
  out = code(&i, &way, 8);
  assert_false(out.below_resolution);
  invented_free(&i);
}

static void bad_settings_are_refused(void **state) {
  (void)state;
  gen g = gen_new(35);
  ef_error error;
  ef_coded out;
  invented i = invented_new(3, "cie-2015-2");
  ef_isolation way = random_isolation(&i, &g, "S", "");
  ef_codes_settings settings = ef_codes_settings_default();
  settings.bits = 17;
  assert_int_equal(
      ef_isolation_codes(i.stimulator, &way, &settings, &out, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "code values of 17 bits; expected 1 to 16");
  settings = ef_codes_settings_default();
  settings.quiet_weight = 0.5;
  assert_int_equal(
      ef_isolation_codes(i.stimulator, &way, &settings, &out, &error),
      EF_INVALID);
  assert_string_equal(error.message, "a weight of 0.5 for silent receptors; "
                                     "expected 1 or more");
  settings = ef_codes_settings_default();
  settings.step_purity = 0;
  assert_int_equal(
      ef_isolation_codes(i.stimulator, &way, &settings, &out, &error),
      EF_INVALID);
  assert_string_equal(error.message, "a purity of 0 for the smallest step; "
                                     "expected more than 0 and at most 1");
  settings = ef_codes_settings_default();
  way.n_primaries = 4;
  assert_int_equal(
      ef_isolation_codes(i.stimulator, &way, &settings, &out, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "a modulation of 4 primaries is shown on 3");
  invented_free(&i);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(no_codes_of_all_are_better),
      cmocka_unit_test(no_pure_step_is_smaller),
      cmocka_unit_test(spectra_of_the_codes_give_the_residual),
      cmocka_unit_test(chosen_codes_are_quieter_than_rounded_ones),
      cmocka_unit_test(a_contrast_below_the_step_is_told),
      cmocka_unit_test(bad_settings_are_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
