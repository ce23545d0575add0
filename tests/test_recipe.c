/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Recipes: what is told, what is refused, and the livery of the scenario. */
#include <stdlib.h>

#include <evenfield/exchange.h>
#include <evenfield/match.h>

#include "fail_alloc.h"
#include "invented_paint.h"
#include "near.h"

enum { N = PAINT_SAMPLES };

typedef struct shop {
  ef_device *device;
  ef_observer *observer;
  ef_illuminant *light[2];
  ef_recipe_settings settings;
} shop;

static int open_shop(void **state) {
  shop *s = calloc(1, sizeof *s);
  ef_colourants *set = paint_colourants(true);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.base = PAINT_WHITE;
  settings.total_loading = 0.5;
  s->device = ef_mixture_new("paint", set, &settings, NULL);
  ef_colourants_free(set);
  s->observer = ef_observer_new("cie-1931", NULL);
  s->light[0] = ef_illuminant_new("D65", NULL);
  s->light[1] = ef_illuminant_new("A", NULL);
  s->settings = ef_recipe_settings_default();
  s->settings.observer = s->observer;
  s->settings.n_lights = 2;
  s->settings.light = (const ef_illuminant *const *)s->light;
  *state = s;
  return 0;
}

static int close_shop(void **state) {
  shop *s = *state;
  ef_illuminant_free(s->light[0]);
  ef_illuminant_free(s->light[1]);
  ef_observer_free(s->observer);
  ef_device_free(s->device);
  free(s);
  return 0;
}

/* ---- What is told ------------------------------------------------------- */

/* A colour has no spectrum: it is matched in the first light, and told of the
 * others as far as it goes. */
static void standard_by_its_colour(void **state) {
  const shop *s = *state;
  const double c[4] = {0.8, 0.05, 0.15, 0};
  double r[N], w[3];
  ef_recipes found;
  ef_mixture_spectrum(s->device, c, r, NULL, NULL);
  ef_setup *setup =
      ef_setup_new(s->device, s->observer, s->light[0], NULL, NULL);
  double drive[3];
  ef_mixture_drives(s->device, c, drive, NULL);
  const ef_standard standard = {.xyz = ef_setup_xyz(setup, drive, NULL)};
  ef_setup_free(setup);
  assert_int_equal(
      ef_recipe_find(s->device, &standard, &s->settings, &found, NULL), EF_OK);
  assert_false(found.spectral.found);
  assert_true(found.colour.found);
  assert_true(isnan(found.colour.spectral_rms));
  assert_true(isnan(found.colour.unknown_light));
  assert_near(found.colour.view[0].difference, 0, 1e-7);
  for (size_t i = 0; i < 4; i++)
    assert_near(found.colour.concentration[i], c[i], 1e-7);
  assert_int_equal(found.colour.at_zero, 1u << 3); /* blue */
  assert_true(isnan(found.colour.view[1].standard.Y));
  assert_true(isnan(found.colour.view[1].difference));
  assert_true(isnan(found.colour.view[1].components.hue));
  assert_true(found.colour.view[1].mixture.Y > 0);
  ef_observer_white(s->observer, EF_TRISTIMULUS, s->light[1], NULL, w, NULL);
  assert_near(found.colour.view[1].white.X, w[0], 0);
}

/* More colour than the loading allows: the limit is told, and the difference
 * is that of what can be mixed. */
static void loading_is_a_limit(void **state) {
  const shop *s = *state;
  const ef_grid grid = paint_grid();
  double r[N];
  const double pure[4] = {0, 0, 0, 1};
  ef_recipes found;
  ef_mixture_spectrum(s->device, pure, r, NULL, NULL);
  const ef_standard standard = {.grid = &grid, .spectrum = r};
  assert_int_equal(
      ef_recipe_find(s->device, &standard, &s->settings, &found, NULL), EF_OK);
  assert_true(found.colour.at_total_loading);
  assert_true(found.spectral.at_total_loading);
  assert_true(found.colour.view[0].difference > 1);
  assert_near(found.colour.concentration[PAINT_WHITE], 0.5, 1e-9);
  assert_true(found.colour.view[0].components.lightness > 0);
}

/* Two lights that count are met half way. */
static void several_lights(void **state) {
  const shop *s = *state;
  const ef_grid grid = paint_grid();
  double r[N];
  for (size_t i = 0; i < N; i++) /* no mixture of these */
    r[i] = 0.35 + 0.25 * sin(1.3 * (double)i);
  const ef_standard standard = {.grid = &grid, .spectrum = r};
  const double weights[3][2] = {{1, 0}, {0, 1}, {1, 1}};
  double first[3], second[3];
  for (int k = 0; k < 3; k++) {
    ef_recipe_settings settings = s->settings;
    ef_recipes found;
    settings.weight = weights[k];
    assert_int_equal(
        ef_recipe_find(s->device, &standard, &settings, &found, NULL), EF_OK);
    first[k] = found.colour.view[0].difference;
    second[k] = found.colour.view[1].difference;
  }
  assert_true(first[0] < first[2] && first[2] < first[1]);
  assert_true(second[1] < second[2] && second[2] < second[0]);
  const double both = first[2] * first[2] + second[2] * second[2];
  assert_true(both < first[0] * first[0] + second[0] * second[0]);
  assert_true(both < first[1] * first[1] + second[1] * second[1]);
}

/* Samples of the standard need not be those of the colourants. */
static void standard_on_another_grid(void **state) {
  const shop *s = *state;
  double value[61], r[N];
  const ef_grid fine = {61, 400, 5, NULL}, own = paint_grid();
  const double c[4] = {0.9, 0.02, 0.03, 0.05};
  ef_mixture_spectrum(s->device, c, r, NULL, NULL);
  ef_resample(&own, 1, r, &fine, EF_INTERPOLATE_AUTO, EF_EXTEND_HOLD, value,
              NULL);
  const ef_standard standard = {.grid = &fine, .spectrum = value};
  ef_recipes found;
  assert_int_equal(
      ef_recipe_find(s->device, &standard, &s->settings, &found, NULL), EF_OK);
  for (size_t i = 0; i < 4; i++) {
    assert_near(found.spectral.concentration[i], c[i], 1e-9);
    /* By colour: the sums over 5 and 20 nm differ by a little. */
    assert_near(found.colour.concentration[i], c[i], 1e-3);
  }
}

static void only_the_base_fits(void **state) {
  const shop *s = *state;
  const ef_grid grid = paint_grid();
  double r[N];
  const double c[4] = {0.9, 0.02, 0.03, 0.05};
  ef_recipe_settings settings = s->settings;
  ef_recipes found;
  settings.quantum = 0.5;
  ef_mixture_spectrum(s->device, c, r, NULL, NULL);
  const ef_standard standard = {.grid = &grid, .spectrum = r};
  assert_int_equal(
      ef_recipe_find(s->device, &standard, &settings, &found, NULL), EF_OK);
  assert_true(found.stepped.found); /* the base alone, or one whole step */
  assert_int_equal(found.stepped.at_zero & 0xe, 0xe);
}

/* ---- What is refused ---------------------------------------------------- */

static void refuse(const shop *s, const ef_device *device,
                   const ef_standard *standard,
                   const ef_recipe_settings *settings, const char *message) {
  ef_error error = {0};
  ef_recipes found;
  (void)s;
  assert_int_equal(ef_recipe_find(device, standard, settings, &found, &error),
                   EF_INVALID);
  assert_string_equal(error.message, message);
}

static void recipes_at_fault(void **state) {
  const shop *s = *state;
  const ef_grid grid = paint_grid();
  double r[N] = {0};
  ef_standard standard = {.grid = &grid, .spectrum = r};
  ef_recipe_settings settings = s->settings;
  ef_device *display = ef_display_from_encoding("srgb", NULL, NULL);
  refuse(s, display, &standard, &settings, "'srgb' (display) is no mixture");
  ef_device_free(display);
  refuse(s, NULL, &standard, &settings,
         "a recipe needs a mixture, a standard, a metric and an observer");
  settings.observer = NULL;
  refuse(s, s->device, &standard, &settings,
         "a recipe needs a mixture, a standard, a metric and an observer");
  settings = s->settings;
  settings.n_lights = 0;
  refuse(s, s->device, &standard, &settings,
         "0 lights; a recipe is told for 1 to 8");
  settings = s->settings;
  const ef_illuminant *const one[2] = {s->light[0], NULL};
  settings.light = one;
  refuse(s, s->device, &standard, &settings, "light 2 is missing");
  settings = s->settings;
  const double negative[2] = {1, -1}, none[2] = {0, 0}, both[2] = {1, 1};
  settings.weight = negative;
  refuse(s, s->device, &standard, &settings,
         "light 2 counts -1; expected zero or more");
  settings.weight = none;
  refuse(s, s->device, &standard, &settings, "no light counts");
  settings.weight = both;
  const ef_standard colour = {.xyz = {10, 10, 10}};
  refuse(s, s->device, &colour, &settings,
         "a standard known by tristimulus values can be matched in the first "
         "light only; light 2 needs its spectrum");
  settings = s->settings;
  settings.quantum = 0.6;
  refuse(s, s->device, &standard, &settings,
         "steps of 0.6; expected zero or more, up to the total loading of 0.5");
  const ef_standard endless = {.xyz = {10, INFINITE, 10}};
  refuse(s, s->device, &endless, &s->settings, "the standard is not finite");
  r[3] = NOT_A_NUMBER;
  refuse(s, s->device, &standard, &s->settings,
         "the standard is not finite at 460 nm");
  standard.spectrum = NULL;
  refuse(s, s->device, &standard, &s->settings, "the standard has no spectrum");
}

/* ---- The demo ----------------------------------------------------------- */

/* The livery was painted with other pigments than the paint shop has now: each
 * colour can be mixed again or not, and what can is metameric to the old. */
static void livery_is_mixed_again(void **state) {
  const shop *s = *state;
  ef_reader_settings reading = ef_reader_settings_default();
  ef_error error;
  reading.kind = EF_KIND_LIGHT; /* absorption has no upper limit */
  ef_spectra *pastes =
      ef_spectra_read("demo:livery-colourants", &reading, &error);
  ef_spectra *livery = ef_spectra_read("demo:livery", NULL, &error);
  assert_true(pastes != NULL && livery != NULL);
  ef_colourants *set = ef_colourants_from_spectra(pastes, &error);
  ef_mixture_settings mixing = ef_mixture_settings_default();
  mixing.base = 0;
  ef_device *device = ef_mixture_new("livery", set, &mixing, &error);
  ef_recipe_settings settings = s->settings;
  settings.quantum = 0.001;
  size_t n_matched = 0;
  for (size_t i = 0; i < ef_spectra_count(livery); i++) {
    const ef_grid *grid = ef_spectra_grid(livery);
    const ef_standard standard = {
        .grid = grid, .spectrum = ef_spectra_values(livery) + i * grid->count};
    ef_recipes found;
    assert_int_equal(
        ef_recipe_find(device, &standard, &settings, &found, &error), EF_OK);
    const ef_recipe *r = &found.colour;
    printf("# %s: white %.3f red %.4f yellow %.4f blue %.4f; CIEDE2000 D65 "
           "%.2f A %.2f; 1 %% of red moves it by %.3f\n",
           ef_spectra_name(livery, i), r->concentration[0], r->concentration[1],
           r->concentration[2], r->concentration[3], r->view[0].difference,
           r->view[1].difference, r->sensitivity[1]);
    assert_true(found.spectral.unknown_light <= r->unknown_light + 1e-9);
    assert_true(found.stepped.difference >= r->difference - 1e-9);
    if (r->view[0].difference < 0.01) {
      n_matched++;
      assert_true(r->view[1].difference > 0.05);
    }
  }
  assert_true(n_matched >= 5);
  ef_device_free(device);
  ef_colourants_free(set);
  ef_spectra_free(livery);
  ef_spectra_free(pastes);
}

/* ---- Memory ------------------------------------------------------------- */

static bool attempt(void *context) {
  const shop *s = context;
  const ef_grid grid = paint_grid();
  double r[N];
  ef_recipes found;
  for (size_t i = 0; i < N; i++)
    r[i] = 0.5;
  const ef_standard standard = {.grid = &grid, .spectrum = r};
  const ef_status status =
      ef_recipe_find(s->device, &standard, &s->settings, &found, NULL);
  assert_true(status == EF_OK || status == EF_NO_MEMORY);
  return status == EF_OK;
}

static void no_memory(void **state) {
  assert_true(fail_alloc_each(attempt, *state) > 5);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(standard_by_its_colour),
      cmocka_unit_test(loading_is_a_limit),
      cmocka_unit_test(several_lights),
      cmocka_unit_test(standard_on_another_grid),
      cmocka_unit_test(only_the_base_fits),
      cmocka_unit_test(recipes_at_fault),
      cmocka_unit_test(livery_is_mixed_again),
      cmocka_unit_test(no_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, open_shop, close_shop);
}
