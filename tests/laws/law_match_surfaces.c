/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matching with devices whose colours do not add: prints and paints. */
#include <stdlib.h>

#include <evenfield/match.h>

#include "gen.h"
#include "invented_paint.h"
#include "invented_print.h"
#include "near.h"

typedef struct bench {
  ef_device *print, *paint;
  ef_setup *setup[2]; /* of the print, of the paint */
  ef_observer *observer;
  ef_illuminant *d50;
} bench;

static ef_device *make_print(void) {
  double primary[8 * PRINT_SAMPLES];
  const ef_grid grid = print_grid();
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = 1.8;
  print_primaries(3, primary);
  return ef_halftone_new("leaflet", NULL, &grid, primary, &settings, NULL);
}

static ef_device *make_paint(void) {
  ef_colourants *set = paint_colourants(true);
  ef_mixture_settings settings = ef_mixture_settings_default();
  settings.base = PAINT_WHITE;
  settings.total_loading = 0.6;
  ef_device *device = ef_mixture_new("livery", set, &settings, NULL);
  ef_colourants_free(set);
  return device;
}

static int set_up(void **state) {
  bench *b = calloc(1, sizeof *b);
  b->observer = ef_observer_new("cie-1931", NULL);
  b->d50 = ef_illuminant_new("D50", NULL);
  b->print = make_print();
  b->paint = make_paint();
  b->setup[0] = ef_setup_new(b->print, b->observer, b->d50, NULL, NULL);
  b->setup[1] = ef_setup_new(b->paint, b->observer, b->d50, NULL, NULL);
  *state = b;
  return b->setup[0] == NULL || b->setup[1] == NULL;
}

static int tear_down(void **state) {
  bench *b = *state;
  ef_setup_free(b->setup[0]);
  ef_setup_free(b->setup[1]);
  ef_device_free(b->print);
  ef_device_free(b->paint);
  ef_illuminant_free(b->d50);
  ef_observer_free(b->observer);
  free(b);
  return 0;
}

static void set_xyz(double *to, ef_xyz xyz) {
  to[0] = xyz.X;
  to[1] = xyz.Y;
  to[2] = xyz.Z;
}

/* Colours of the device are in its gamut, and are matched. */
static void own_colours_are_matched(void **state) {
  enum { N = 400 };
  static double target[3 * N];
  static ef_match match[N];
  const bench *b = *state;
  gen g = gen_new(3501);
  for (int k = 0; k < 2; k++) {
    ef_match_settings settings = ef_match_settings_default();
    deviation off = {0};
    for (size_t i = 0; i < N; i++) {
      double amount[3];
      gen_fill(&g, 3, 0.02, 0.98, amount);
      set_xyz(target + 3 * i, ef_setup_xyz(b->setup[k], amount, NULL));
    }
    assert_int_equal(
        ef_match_batch(b->setup[k], N, target, &settings, 1, match, NULL),
        EF_OK);
    for (size_t i = 0; i < N; i++) {
      assert_true(match[i].in_gamut);
      assert_int_equal(match[i].below | match[i].above, 0);
      deviation_add(&off, match[i].nearest.difference, 0, "a target");
      assert_true(match[i].coded.found);
      assert_true(match[i].coded.difference <=
                  match[i].rounded_difference + 1e-12);
    }
    deviation_print(&off, k == 0 ? "print" : "paint");
    assert_near(off.largest, 0, 1e-6);
  }
}

/* Least difference to a target over a grid of the box. */
static double least_on_grid(const ef_setup *setup, ef_xyz target, int steps) {
  const ef_xyz white = ef_setup_white(setup);
  const ef_lab wanted = ef_xyz_to_lab(target, white);
  double least = INFINITE;
  for (int i = 0; i <= steps; i++)
    for (int j = 0; j <= steps; j++)
      for (int k = 0; k <= steps; k++) {
        const double amount[3] = {(double)i / steps, (double)j / steps,
                                  (double)k / steps};
        const ef_lab lab =
            ef_xyz_to_lab(ef_setup_xyz(setup, amount, NULL), white);
        least = fmin(least, ef_delta_e_ciede2000(wanted, lab, 1, 1, 1));
      }
  return least;
}

/* Least difference among colours a little way from the amounts. */
static double least_around(gen *g, const ef_setup *setup, ef_xyz target,
                           const double *amount) {
  const ef_xyz white = ef_setup_white(setup);
  const ef_lab wanted = ef_xyz_to_lab(target, white);
  double least = INFINITE;
  for (int k = 0; k < 60; k++) {
    double near_by[3];
    for (int i = 0; i < 3; i++)
      near_by[i] = fmin(fmax(amount[i] + gen_between(g, -2e-3, 2e-3), 0), 1);
    const ef_lab lab = ef_xyz_to_lab(ef_setup_xyz(setup, near_by, NULL), white);
    least = fmin(least, ef_delta_e_ciede2000(wanted, lab, 1, 1, 1));
  }
  return least;
}

/* Outside, no colour of a grid is nearer, nor one close by. The nearest colour
 * need not be at a limit: more of a paint may no longer make a colour fuller (a
 * fold of the gamut), and CIEDE2000 has minima of its own. */
static void nearest_is_never_worse_than_a_grid(void **state) {
  enum { N = 40 };
  const bench *b = *state;
  const ef_match_settings settings = ef_match_settings_default();
  gen g = gen_new(3502);
  for (int k = 0; k < 2; k++) {
    const ef_setup *setup = b->setup[k];
    size_t n_outside = 0, n_free = 0;
    for (int i = 0; i < N; i++) {
      const ef_lab lab = {gen_between(&g, 15, 90), gen_between(&g, -80, 80),
                          gen_between(&g, -80, 80)};
      const ef_xyz target = ef_lab_to_xyz(lab, ef_setup_white(setup));
      double xyz[3];
      ef_match match;
      set_xyz(xyz, target);
      assert_int_equal(
          ef_match_batch(setup, 1, xyz, &settings, 1, &match, NULL), EF_OK);
      assert_true(match.nearest.difference <=
                  least_on_grid(setup, target, 20) + 1e-9);
      if (match.in_gamut)
        continue;
      n_outside++;
      n_free += (match.held_low | match.held_high) == 0;
      assert_true(match.nearest.difference <=
                  least_around(&g, setup, target, match.nearest.amount) + 1e-7);
      const ef_xyz shown = ef_setup_xyz(setup, match.nearest.amount, NULL);
      assert_near(shown.Y, match.nearest.xyz.Y, 1e-9);
    }
    printf("# %s: %zu of %d targets outside, %zu of them at no limit\n",
           k == 0 ? "print" : "paint", n_outside, N, n_free);
    assert_true(n_outside > 5);
  }
}

static void gamuts_have_volume(void **state) {
  const bench *b = *state;
  for (int k = 0; k < 2; k++) {
    ef_gamut gamut;
    assert_int_equal(
        ef_gamut_measure(b->setup[k], b->d50, EF_ADAPT_NONE, 1, &gamut, NULL),
        EF_OK);
    printf("# %s: volume %.0f, %.1f %% of the object-colour solid\n",
           k == 0 ? "print" : "paint", gamut.volume_lab,
           100 * gamut.solid_share);
    assert_true(gamut.volume_lab > 5e4 && gamut.volume_lab < 1.5e6);
    assert_true(gamut.solid_share > 0.02 && gamut.solid_share < 0.6);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(own_colours_are_matched),
      cmocka_unit_test(nearest_is_never_worse_than_a_grid),
      cmocka_unit_test(gamuts_have_volume),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, set_up, tear_down);
}
