/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Isolation on two measured displays, which are not part of this repository:
 * EVENFIELD_REFERENCE names their folder. Spectra: R. Mantiuk, K. J. Kim, A. G.
 * Rempel & W. Heidrich, ACM Transactions on Graphics 30(4), 40 (2011). Prints
 * the largest contrasts from half of full drive, what code values leave of the
 * silence, and what 500 people get; checks them against sums over the spectra
 * of the very codes, and that the robust modulation leaves least. */
#include <stdlib.h>

#include <evenfield/exchange.h>
#include <evenfield/stimulus.h>

#include "figures.h"
#include "near.h"

static const char *const ways[] = {"L", "M", "S", "isoluminant red-green"};
enum { N_WAYS = sizeof ways / sizeof ways[0] };

typedef struct scene {
  ef_device *device;
  ef_observer *observer;
  ef_stimulator *stimulator;
  ef_population *people;
} scene;

/* With the curve that most displays are made to have. */
static scene scene_new(const char *file) {
  char path[1024];
  ef_error error;
  scene s = {.observer = ef_observer_new("cie-2015-2", &error)};
  snprintf(path, sizeof path, "%s/surfaces/%s", getenv("EVENFIELD_REFERENCE"),
           file);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.kind = EF_KIND_LIGHT;
  ef_spectra *spectra = ef_spectra_read(path, &settings, &error);
  ef_tone_curve *curve = ef_tone_curve_new("power:2.2", &error);
  const ef_tone_curve *curves[1] = {curve};
  ef_display_settings display = ef_display_settings_default();
  display.n_curves = 1;
  display.curve = curves;
  if (spectra != NULL)
    s.device = ef_display_from_spectra(file, spectra, &display, &error);
  if (s.device != NULL)
    s.stimulator = ef_stimulator_new(s.device, s.observer, NULL, NULL, &error);
  if (s.stimulator == NULL)
    fail_msg("%s", error.message);
  ef_population_settings people = ef_population_settings_default();
  people.count = 500;
  s.people = ef_population_new(&people, &error);
  assert_non_null(s.people);
  ef_tone_curve_free(curve);
  ef_spectra_free(spectra);
  return s;
}

static void scene_free(scene *s) {
  ef_population_free(s->people);
  ef_stimulator_free(s->stimulator);
  ef_observer_free(s->observer);
  ef_device_free(s->device);
}

/* Excitations of L, M, S by codes, from the spectrum they make. */
static void excite(const scene *s, const uint32_t *code, int bits,
                   double lms[3]) {
  const ef_grid *grid = ef_device_grid(s->device);
  double *light = malloc(grid->count * sizeof *light);
  double drive[3];
  for (int i = 0; i < 3; i++)
    drive[i] = code[i] / (double)((1 << bits) - 1);
  assert_int_equal(ef_device_spectrum(s->device, drive, light, NULL, NULL),
                   EF_OK);
  ef_viewing viewing = ef_viewing_default(NULL);
  ef_weights *weights =
      ef_observer_weights(s->observer, EF_CONES, grid, &viewing, NULL, NULL);
  assert_int_equal(ef_weights_apply(weights, 1, light, 1, lms, NULL), EF_OK);
  ef_weights_free(weights);
  free(light);
}

/* The largest contrast that the codes leave in silent cones. */
static double check_codes(const scene *s, const ef_isolation *way, int bits) {
  ef_codes_settings settings = ef_codes_settings_default();
  settings.bits = bits;
  ef_coded c;
  assert_int_equal(ef_isolation_codes(s->stimulator, way, &settings, &c, NULL),
                   EF_OK);
  double background[3], high[3], low[3], residual = 0;
  excite(s, c.background, bits, background);
  excite(s, c.high, bits, high);
  excite(s, c.low, bits, low);
  for (int k = 0; k < 3; k++) {
    assert_near(high[k] / background[k] - 1, c.contrast_high[k], 1e-11);
    assert_near(low[k] / background[k] - 1, c.contrast_low[k], 1e-11);
    if (way->role[k] == EF_RECEPTOR_SILENT)
      residual = fmax(residual, fmax(fabs(high[k] / background[k] - 1),
                                     fabs(low[k] / background[k] - 1)));
  }
  assert_near(residual, c.residual, 1e-11);
  assert_true(c.residual <= c.rounded_residual);
  return c.residual;
}

static double worst_rms(const scene *s, const ef_isolation *way,
                        const ef_population *people, double *squares) {
  ef_receptor_spread spread[EF_N_RECEPTORS];
  assert_int_equal(ef_isolation_spread(s->stimulator, way, people, 0, spread,
                                       NULL, NULL, NULL),
                   EF_OK);
  double worst = 0;
  *squares = 0;
  for (int k = 0; k < 3; k++)
    if (way->role[k] == EF_RECEPTOR_SILENT) {
      worst = fmax(worst, spread[k].rms);
      *squares += spread[k].rms * spread[k].rms;
    }
  return worst;
}

/* People without deviations, all 32 years old, are the observer: what is left
 * is how far the model of CIE 170-1 is from its table (0.1 %), times the
 * contrasts the primaries make one by one, which the condition number bounds.
 */
static void check_mean_people(const scene *s, const ef_isolation *way) {
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 3;
  settings.age_min_years = settings.age_max_years = 32;
  settings.deviation_scale = 0;
  ef_population *people = ef_population_new(&settings, NULL);
  double squares;
  assert_true(worst_rms(s, way, people, &squares) < 0.002);
  ef_population_free(people);
}

static void check_way(const scene *s, const char *words) {
  ef_direction direction;
  ef_isolation way, robust;
  ef_error error;
  ef_isolate_settings settings = ef_isolate_settings_default();
  if (ef_direction_parse(words, &direction, &error) != EF_OK ||
      ef_isolate(s->stimulator, &direction, &settings, &way, &error) != EF_OK)
    fail_msg("%s", error.message);
  for (int k = 0; k < 3; k++) {
    if (way.role[k] == EF_RECEPTOR_SILENT)
      assert_near(way.contrast[k], 0, 1e-12);
  }
  const double bits_8 = check_codes(s, &way, 8);
  const double bits_10 = check_codes(s, &way, 10);
  check_mean_people(s, &way);
  double plain_squares, robust_squares;
  const double people = worst_rms(s, &way, s->people, &plain_squares);
  /* Half as far, where there is room to choose. */
  settings.contrast = way.largest / 2;
  assert_int_equal(ef_isolate_robust(s->stimulator, &direction, &settings,
                                     s->people, 0, &robust, NULL, &error),
                   EF_OK);
  const double least = worst_rms(s, &robust, s->people, &robust_squares);
  assert_true(robust_squares <= plain_squares / 4 * (1 + 1e-9));
  printf("# %s: up to L %+.4f M %+.4f S %+.4f; silent cones: 8 bits %.5f, 10 "
         "bits %.5f, 500 people r.m.s. %.4f, at half of it %.4f and robust "
         "%.4f\n",
         words, way.contrast[0], way.contrast[1], way.contrast[2], bits_8,
         bits_10, people, people / 2, least);
}

static void check_display(const char *file) {
  scene s = scene_new(file);
  printf("# %s\n", file);
  for (int k = 0; k < N_WAYS; k++)
    check_way(&s, ways[k]);
  scene_free(&s);
}

static void crt(void **state) {
  (void)state;
  check_display("display_spd_crt.csv");
}

static void led_lcd(void **state) {
  (void)state;
  check_display("display_spd_led_lcd.csv");
}

int main(void) {
  if (figures_no_reference("measured displays"))
    return 0;
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(crt),
      cmocka_unit_test(led_lcd),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
