/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every recipe. */
#include <stdlib.h>

#include <evenfield/match.h>

#include "gen.h"
#include "invented_paint.h"
#include "near.h"

enum { N = PAINT_SAMPLES, LIGHTS = 3 };

typedef struct shop {
  ef_observer *observer;
  ef_illuminant *light[LIGHTS];
  ef_recipe_settings settings;
} shop;

static int open_shop(void **state) {
  static const char *const names[LIGHTS] = {"D65", "A", "FL11"};
  shop *s = calloc(1, sizeof *s);
  s->observer = ef_observer_new("cie-1964", NULL);
  for (int k = 0; k < LIGHTS; k++)
    s->light[k] = ef_illuminant_new(names[k], NULL);
  s->settings = ef_recipe_settings_default();
  s->settings.observer = s->observer;
  s->settings.n_lights = LIGHTS;
  s->settings.light = (const ef_illuminant *const *)s->light;
  *state = s;
  return 0;
}

static int close_shop(void **state) {
  shop *s = *state;
  for (int k = 0; k < LIGHTS; k++)
    ef_illuminant_free(s->light[k]);
  ef_observer_free(s->observer);
  free(s);
  return 0;
}

/* Opaque paint, tints of a single-constant base, films with and without. */
static ef_device *mixture(int kind, const double *substrate) {
  ef_colourants *set = paint_colourants(kind != 1);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.base = kind == 3 ? SIZE_MAX : PAINT_WHITE;
  settings.total_loading = kind == 0 ? 0.4 : kind == 1 ? 2 : 1;
  if (kind >= 2) {
    settings.thickness = 1.3;
    settings.substrate = substrate;
    settings.surface = (ef_surface){0.04, 0.6, true};
  }
  ef_error error;
  ef_device *device = ef_mixture_new("paint", set, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_colourants_free(set);
  return device;
}

static void random_concentrations(gen *g, const ef_device *device, double *c) {
  double drive[8];
  /* In film without a base all four are unknown, and four unknowns match a
   * colour in many ways; there the white is left out. */
  gen_fill(g, 8, 0.02, 0.6, drive);
  if (ef_mixture_base(device) == SIZE_MAX)
    drive[0] = 0;
  assert_int_equal(ef_mixture_concentrations(device, drive, c, NULL), EF_OK);
}

static void find(const ef_device *device, const double *spectrum,
                 const ef_recipe_settings *settings, ef_recipes *out) {
  const ef_grid grid = paint_grid();
  const ef_standard standard = {.grid = &grid, .spectrum = spectrum};
  ef_error error;
  if (ef_recipe_find(device, &standard, settings, out, &error) != EF_OK)
    fail_msg("%s", error.message);
}

/* The recipe of a known mixture is that mixture, by its spectrum and, where
 * colour has but one answer, by its colour. */
static void known_mixture_comes_back(void **state) {
  const shop *s = *state;
  gen g = gen_new(3401);
  deviation spectral = {0}, colour = {0}, difference = {0};
  double substrate[N];
  paint_substrate(true, substrate);
  for (int trial = 0; trial < 120; trial++) {
    const int kind = trial % 4;
    ef_device *device = mixture(kind, substrate);
    double c[EF_MAX_RECIPE], r[N];
    ef_recipes found;
    random_concentrations(&g, device, c);
    ef_mixture_spectrum(device, c, r, NULL, NULL);
    find(device, r, &s->settings, &found);
    assert_true(found.colour.found && found.spectral.found);
    assert_false(found.stepped.found);
    for (size_t i = 0; i < PAINTS; i++) {
      deviation_add(&spectral, found.spectral.concentration[i], c[i],
                    paint_names[i]);
      if (kind != 3)
        deviation_add(&colour, found.colour.concentration[i], c[i],
                      paint_names[i]);
    }
    deviation_add(&difference, found.colour.difference, 0, "a mixture");
    deviation_add(&difference, found.colour.view[0].difference, 0, "a mixture");
    ef_device_free(device);
  }
  deviation_print(&spectral, "concentrations by spectrum");
  deviation_print(&colour, "concentrations by colour");
  deviation_print(&difference, "difference left");
  /* The squared goal has its digits down to some 1e-16 of the colour's size:
   * a difference of 1e-8, times how little a colour says of its recipe. */
  assert_near(spectral.largest, 0, 1e-9);
  assert_near(colour.largest, 0, 1e-8);
  assert_near(difference.largest, 0, 1e-7);
}

/* Limits hold, and what is told belongs together. */
static void check_recipe(const ef_device *device, const ef_recipe *r,
                         const double *standard) {
  double sum = 0, whole = 0, spectrum[N], square = 0;
  const size_t base = ef_mixture_base(device);
  const double most = ef_mixture_total_loading(device);
  for (size_t i = 0; i < ef_mixture_count(device); i++) {
    assert_true(r->concentration[i] >= 0);
    whole += r->concentration[i];
    sum += i == base ? 0 : r->concentration[i];
    if (i != base)
      assert_int_equal(r->at_zero >> i & 1, r->concentration[i] == 0);
    assert_true(r->sensitivity[i] >= 0);
  }
  assert_true(sum <= most * (1 + 1e-12));
  assert_int_equal(r->at_total_loading, sum >= most * (1 - 1e-9));
  if (base != SIZE_MAX && most <= 1 && ef_device_n_drives(device) == 3)
    assert_near(whole, 1, 1e-12);
  ef_mixture_spectrum(device, r->concentration, spectrum, NULL, NULL);
  for (size_t s = 0; s < N; s++)
    square += (spectrum[s] - standard[s]) * (spectrum[s] - standard[s]) / N;
  assert_near(r->spectral_rms, sqrt(square), 1e-12);
}

/* ---- A light that is not known ------------------------------------------ */

/* A light, and a standard in it. */
typedef struct seen {
  ef_weights *weights;
  ef_xyz white, standard;
} seen;

static ef_xyz xyz_in(const seen *look, const double *r) {
  const double *w = ef_weights_matrix(look->weights);
  double xyz[3] = {0};
  for (size_t c = 0; c < 3; c++)
    for (size_t q = 0; q < N; q++)
      xyz[c] += w[c * N + q] * r[q];
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

/* Difference between the standard and a colour `t` times the move from it. */
static double moved(const seen *look, ef_xyz move, double t) {
  const ef_xyz a = look->standard;
  const ef_xyz b = {a.X + t * move.X, a.Y + t * move.Y, a.Z + t * move.Z};
  return ef_delta_e_ciede2000(ef_xyz_to_lab(a, look->white),
                              ef_xyz_to_lab(b, look->white), 1, 1, 1);
}

static void look_away(seen *look) {
  for (int k = 0; k < LIGHTS; k++) {
    ef_weights_free(look[k].weights);
    look[k].weights = NULL;
  }
}

static void look_at(const shop *s, const double *standard, seen *look) {
  const ef_grid grid = paint_grid();
  look_away(look);
  for (int k = 0; k < LIGHTS; k++) {
    const ef_viewing viewing = ef_viewing_default(s->light[k]);
    double w[3];
    look[k].weights = ef_observer_weights(s->observer, EF_TRISTIMULUS, &grid,
                                          &viewing, NULL, NULL);
    ef_observer_white(s->observer, EF_TRISTIMULUS, s->light[k], NULL, w, NULL);
    look[k].white = (ef_xyz){w[0], w[1], w[2]};
    look[k].standard = xyz_in(&look[k], standard);
  }
}

/* The error of a mixture in a light `power` times this one at each sample,
 * whose white is brought to that of this light. */
static ef_xyz error_in(const seen *look, const double *off,
                       const double *power) {
  double lit[N];
  for (size_t q = 0; q < N; q++)
    lit[q] = power[q] * off[q];
  const ef_xyz e = xyz_in(look, lit), white = xyz_in(look, power);
  double all[N];
  for (size_t q = 0; q < N; q++)
    all[q] = 1;
  const ef_xyz unit = xyz_in(look, all);
  return (ef_xyz){e.X * unit.X / white.X, e.Y * unit.Y / white.Y,
                  e.Z * unit.Z / white.Z};
}

/* What more power at single samples does, one after the other: the definition
 * of what is expected. Samples stand 20 nm apart, peaks are 10 wide. */
static double expected(const seen *look, const double *mixed,
                       const double *standard) {
  double off[N], power[N], sum = 0;
  for (size_t q = 0; q < N; q++) {
    off[q] = mixed[q] - standard[q];
    power[q] = 1;
  }
  for (int k = 0; k < LIGHTS; k++) {
    const double d = moved(&look[k], error_in(&look[k], off, power), 1);
    const ef_xyz plain = error_in(&look[k], off, power);
    sum += d * d / LIGHTS;
    for (size_t q = 0; q < N; q++) {
      const double more = 1e-5;
      power[q] += more;
      const ef_xyz lit = error_in(&look[k], off, power);
      power[q] = 1;
      const ef_xyz move = {(lit.X - plain.X) / more, (lit.Y - plain.Y) / more,
                           (lit.Z - plain.Z) / more};
      const double one = moved(&look[k], move, 1e-5) / 1e-5;
      sum += 0.5 * one * one / LIGHTS;
    }
  }
  return sqrt(sum);
}

/* Lights drawn at random about the known ones, with the whole spectrum at once:
 * what their peaks add to the square is what is expected of small peaks, to
 * scale. Errors are small, so that the formula is its local metric. */
static void unknown_lights_drawn(void **state) {
  enum { DRAWS = 2000 };
  const double size = 0.02;
  const shop *s = *state;
  gen g = gen_new(3406);
  static seen look[LIGHTS];
  ef_device *device = mixture(0, NULL);
  for (int trial = 0; trial < 3; trial++) {
    double c[EF_MAX_RECIPE], standard[N], off[N], power[2][N], square = 0;
    double ripple = 0;
    ef_recipes found;
    random_concentrations(&g, device, c);
    ef_mixture_spectrum(device, c, standard, NULL, NULL);
    for (size_t q = 0; q < N; q++)
      standard[q] *= 1 + 0.005 * (q % 3 == 0 ? 1 : -1) * gen_unit(&g);
    find(device, standard, &s->settings, &found);
    look_at(s, standard, look);
    const ef_recipe *r = &found.spectral;
    ef_mixture_spectrum(device, r->concentration, off, NULL, NULL);
    for (size_t q = 0; q < N; q++)
      off[q] -= standard[q];
    for (int k = 0; k < LIGHTS; k++)
      square += r->view[k].difference * r->view[k].difference / LIGHTS;
    for (int draw = 0; draw < DRAWS; draw++) {
      const int k = draw % LIGHTS;
      for (size_t q = 0; q < N; q++) { /* of variance 1/2: half a peak */
        const double more = size * gen_between(&g, -sqrt(1.5), sqrt(1.5));
        power[0][q] = 1 + more;
        power[1][q] = 1 - more;
      }
      const double a = moved(&look[k], error_in(&look[k], off, power[0]), 1);
      const double b = moved(&look[k], error_in(&look[k], off, power[1]), 1);
      const double own = r->view[k].difference;
      ripple += (0.5 * (a * a + b * b) - own * own) / (size * size * DRAWS);
    }
    printf("# expected %.4f, drawn %.4f; in the known lights %.4f, by colour "
           "%.4f\n",
           r->unknown_light, sqrt(square + ripple), sqrt(square),
           found.colour.unknown_light);
    /* 2000 draws of a square: 3 % of the ripple's, three times. */
    assert_near(sqrt(square + ripple) / r->unknown_light, 1, 0.05);
    assert_true(ripple > 0.2 * square);
  }
  look_away(look);
  ef_device_free(device);
}

/* ---- Nothing is better -------------------------------------------------- */

/* For a standard that cannot be mixed: no recipe on a fine grid of the simplex
 * is better than the one found, by colour or in a light that is not known. */
static void nothing_better_on_a_grid(void **state) {
  const shop *s = *state;
  static seen look[LIGHTS];
  gen g = gen_new(3402);
  ef_device *device = mixture(0, NULL);
  size_t n_limited = 0;
  const double most = ef_mixture_total_loading(device);
  for (int trial = 0; trial < 12; trial++) {
    enum { STEPS = 18 };
    double r[N], weight[LIGHTS] = {1, trial % 2, trial % 3};
    ef_recipe_settings settings = s->settings;
    ef_recipes found, one;
    settings.weight = weight;
    gen_smooth(&g, N, r);
    find(device, r, &settings, &found);
    check_recipe(device, &found.colour, r);
    check_recipe(device, &found.spectral, r);
    n_limited += found.colour.at_total_loading || found.colour.at_zero != 0;
    look_at(s, r, look);
    for (int k = 0; k < 2; k++) {
      const ef_recipe *told = k == 0 ? &found.colour : &found.spectral;
      double mixed[N];
      ef_mixture_spectrum(device, told->concentration, mixed, NULL, NULL);
      assert_near(told->unknown_light, expected(look, mixed, r), 1e-4);
    }
    assert_true(found.spectral.unknown_light <=
                found.colour.unknown_light + 1e-9);
    assert_true(found.colour.difference <= found.spectral.difference + 1e-12);
    settings.quantum = most / STEPS; /* walks the grid by a search of its own */
    find(device, r, &settings, &one);
    assert_true(one.stepped.found);
    check_recipe(device, &one.stepped, r);
    assert_true(one.stepped.difference >= found.colour.difference - 1e-9);
    for (int i = 0; i <= STEPS; i++)
      for (int j = 0; i + j <= STEPS; j++)
        for (int k = 0; i + j + k <= STEPS; k++) {
          const double c[4] = {1 - most * (i + j + k) / STEPS, most * i / STEPS,
                               most * j / STEPS, most * k / STEPS};
          double mixed[N];
          ef_mixture_spectrum(device, c, mixed, NULL, NULL);
          assert_true(expected(look, mixed, r) >=
                      found.spectral.unknown_light - 1e-4);
        }
  }
  printf("# %zu of 12 standards end at a limit\n", n_limited);
  assert_true(n_limited > 2);
  ef_device_free(device);
  look_away(look);
}

/* Differences of a recipe written out: the definition of the goal. */
static double difference_of(const shop *s, const ef_device *device,
                            const double *c, const double *standard,
                            const double *weight) {
  double r[N], sum = 0, whole = 0;
  const ef_grid grid = paint_grid();
  ef_mixture_spectrum(device, c, r, NULL, NULL);
  for (int k = 0; k < LIGHTS; k++) {
    const ef_viewing viewing = ef_viewing_default(s->light[k]);
    ef_weights *weights = ef_observer_weights(s->observer, EF_TRISTIMULUS,
                                              &grid, &viewing, NULL, NULL);
    double a[3], b[3], w[3];
    ef_weights_apply(weights, 1, standard, 1, a, NULL);
    ef_weights_apply(weights, 1, r, 1, b, NULL);
    ef_observer_white(s->observer, EF_TRISTIMULUS, s->light[k], NULL, w, NULL);
    const ef_xyz white = {w[0], w[1], w[2]};
    const double d = ef_delta_e_ciede2000(
        ef_xyz_to_lab((ef_xyz){a[0], a[1], a[2]}, white),
        ef_xyz_to_lab((ef_xyz){b[0], b[1], b[2]}, white), 1, 1, 1);
    sum += weight[k] * d * d;
    whole += weight[k];
    ef_weights_free(weights);
  }
  return sqrt(sum / whole);
}

/* No small change within the limits, and no random recipe, is better. */
static void colour_recipes_are_least(void **state) {
  const shop *s = *state;
  gen g = gen_new(3403);
  ef_device *device = mixture(0, NULL);
  for (int trial = 0; trial < 12; trial++) {
    double r[N], weight[LIGHTS] = {1, 0.7 * (trial % 2), 0.3 * (trial % 3)};
    ef_recipe_settings settings = s->settings;
    ef_recipes found;
    settings.weight = weight;
    gen_smooth(&g, N, r);
    find(device, r, &settings, &found);
    const double least =
        difference_of(s, device, found.colour.concentration, r, weight);
    assert_near(found.colour.difference, least, 1e-9);
    for (int k = 0; k < 150; k++) {
      double drive[3], c[4];
      ef_mixture_drives(device, found.colour.concentration, drive, NULL);
      for (int i = 0; i < 3; i++)
        drive[i] =
            k < 75 ? gen_unit(&g)
                   : fmin(fmax(drive[i] + gen_between(&g, -0.02, 0.02), 0), 1);
      ef_mixture_concentrations(device, drive, c, NULL);
      assert_true(difference_of(s, device, c, r, weight) >= least - 1e-7);
    }
  }
  ef_device_free(device);
}

/* Whole steps: multiples, within the loading, and on a coarse grid the best of
 * all of them. */
static void whole_steps_are_the_best(void **state) {
  const shop *s = *state;
  gen g = gen_new(3404);
  ef_device *device = mixture(0, NULL);
  const double most = ef_mixture_total_loading(device);
  const double weight[LIGHTS] = {1, 0, 0};
  size_t n_missed = 0;
  for (int trial = 0; trial < 10; trial++) {
    enum { STEPS = 10 };
    double c[EF_MAX_RECIPE], r[N];
    ef_recipe_settings settings = s->settings;
    ef_recipes found;
    settings.quantum = most / STEPS;
    random_concentrations(&g, device, c);
    ef_mixture_spectrum(device, c, r, NULL, NULL);
    find(device, r, &settings, &found);
    assert_true(found.stepped.found);
    check_recipe(device, &found.stepped, r);
    double least = INFINITE;
    for (size_t i = 1; i < PAINTS; i++) {
      const double steps = found.stepped.concentration[i] / settings.quantum;
      assert_near(steps, round(steps), 1e-9);
    }
    for (int i = 0; i <= STEPS; i++)
      for (int j = 0; i + j <= STEPS; j++)
        for (int k = 0; i + j + k <= STEPS; k++) {
          const double grid[4] = {1 - most * (i + j + k) / STEPS,
                                  most * i / STEPS, most * j / STEPS,
                                  most * k / STEPS};
          least = fmin(least, difference_of(s, device, grid, r, weight));
        }
    assert_true(found.stepped.difference >= least - 1e-9);
    n_missed += found.stepped.difference > least + 1e-9;
  }
  printf("# whole steps: best of all missed in %zu of 10\n", n_missed);
  assert_true(n_missed <= 1);
  ef_device_free(device);
}

/* Sensitivity is the difference to the mixture with 1 % more weighed in. */
static void sensitivity_is_of_the_batch(void **state) {
  const shop *s = *state;
  gen g = gen_new(3405);
  const double weight[LIGHTS] = {1, 0, 0};
  double substrate[N];
  paint_substrate(false, substrate);
  for (int kind = 0; kind < 4; kind++) {
    ef_device *device = mixture(kind, substrate);
    double c[EF_MAX_RECIPE], r[N], own[N];
    ef_recipes found;
    random_concentrations(&g, device, c);
    ef_mixture_spectrum(device, c, r, NULL, NULL);
    find(device, r, &s->settings, &found);
    const double *e = found.colour.concentration;
    ef_mixture_spectrum(device, e, own, NULL, NULL);
    for (size_t i = 0; i < PAINTS; i++) {
      double more[EF_MAX_RECIPE], whole = 1;
      memcpy(more, e, sizeof more);
      more[i] *= 1.01;
      if (kind == 0 || kind == 2)
        whole += 0.01 * e[i];
      else if (kind == 1 && i == PAINT_WHITE)
        whole = 1.01;
      for (size_t k = 0; k < PAINTS; k++)
        more[k] /= whole;
      assert_near(found.colour.sensitivity[i],
                  difference_of(s, device, more, own, weight), 1e-9);
    }
    ef_device_free(device);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(known_mixture_comes_back),
      cmocka_unit_test(unknown_lights_drawn),
      cmocka_unit_test(nothing_better_on_a_grid),
      cmocka_unit_test(colour_recipes_are_least),
      cmocka_unit_test(whole_steps_are_the_best),
      cmocka_unit_test(sensitivity_is_of_the_batch),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, open_shop, close_shop);
}
