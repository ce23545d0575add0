/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The nearest colour of the solver against a dense global search: a grid of the
 * amounts with a compass search from its best points. With the argument "dense"
 * on 2000 targets a setup and a 64^3 grid, else on 100 targets. */
#include <stdlib.h>

#include "base/base_private.h"
#include "gen.h"
#include "grid_search.h"
#include "invented_display.h"
#include "near.h"

/* Set once, from the command line. */
static size_t n_targets = 100;

typedef struct scene {
  const char *name;
  ef_observer *observer;
  ef_illuminant *illuminant;
  ef_device *device;
  ef_setup *setup;
  ef__mixing mixing;
  ef__scout *scout;
} scene;

static scene scene_of(const char *name, ef_device *device, bool reflects) {
  ef_error error = {0};
  scene s = {.name = name,
             .observer = ef_observer_new("cie-1931", &error),
             .illuminant = reflects ? ef_illuminant_new("D50", &error) : NULL,
             .device = device};
  s.setup = ef_setup_new(device, s.observer, s.illuminant, NULL, &error);
  if (s.setup == NULL ||
      ef__mixing_from_setup(s.setup, &s.mixing, &error) != EF_OK)
    fail_msg("%s: %s", name, error.message);
  return s;
}

static scene scene_at(size_t i) {
  const ef_display_settings settings = ef_display_settings_default();
  switch (i) {
  case 0:
    return scene_of("srgb", ef_display_from_encoding("srgb", &settings, NULL),
                    false);
  case 1:
    return scene_of("bt2020",
                    ef_display_from_encoding("bt2020", &settings, NULL), false);
  default:
    return scene_of("invented display with a bluish black",
                    invented_display(true), false);
  }
}
enum { N_SCENES = 3 };

/* What the solver needs of the scene for this formula. */
static void scene_look(scene *s, const ef_metric *metric) {
  ef__scout_free(s->scout);
  s->scout = ef__scout_new(&s->mixing, metric, NULL);
  assert_non_null(s->scout);
  s->mixing.scout = s->scout;
}

static void scene_free(scene *s) {
  ef__scout_free(s->scout);
  ef_setup_free(s->setup);
  ef_device_free(s->device);
  ef_illuminant_free(s->illuminant);
  ef_observer_free(s->observer);
}

/* ---- Targets out of gamut ---------------------------------------------- */

typedef struct target {
  double coordinate[3];
  double exact[3];
} target;

static bool in_box(const double a[3]) {
  return a[0] >= 0 && a[0] <= 1 && a[1] >= 0 && a[1] <= 1 && a[2] >= 0 &&
         a[2] <= 1;
}

/* Three kinds: anywhere in a box of CIELAB, impossible colours among them; a
 * little beyond the amounts the setup has; and nearly neutral ones of any
 * lightness, darker than black and lighter than white too. */
enum { ANYWHERE, BEYOND, NEUTRAL, N_KINDS };

static ef_xyz any_xyz(gen *g, int kind, const ef__mixing *mixing) {
  if (kind == BEYOND) {
    const double a[3] = {gen_between(g, -0.3, 1.3), gen_between(g, -0.3, 1.3),
                         gen_between(g, -0.3, 1.3)};
    return ef__mixing_xyz(mixing, a, NULL);
  }
  ef_lab lab = {gen_between(g, 0, 100), gen_between(g, -128, 128),
                gen_between(g, -128, 128)};
  if (kind == NEUTRAL) {
    const double chroma = 6 * gen_unit(g), h = 6.2832 * gen_unit(g);
    lab = (ef_lab){gen_between(g, -5, 115), chroma * cos(h), chroma * sin(h)};
  }
  return ef_lab_to_xyz(lab, mixing->conditions.white);
}

static target random_target(gen *g, int kind, const ef__mixing *mixing,
                            const ef_metric *metric) {
  target t;
  for (;;) {
    const ef_xyz xyz = any_xyz(g, kind, mixing);
    ef__exact(mixing, xyz, t.exact);
    if (in_box(t.exact)) continue;
    if (kind == BEYOND && !(xyz.X >= 0 && xyz.Y >= 0 && xyz.Z >= 0)) continue;
    ef_metric_coordinates(metric, xyz, &mixing->conditions, t.coordinate);
    /* Darker than black has a meaning in CIELAB alone: the other formulas
     * leave their domain there. */
    if (kind == BEYOND && !(t.coordinate[0] >= 0)) continue;
    return t;
  }
}

/* ---- Against the grid -------------------------------------------------- */

typedef struct comparison {
  const grid_search *grid;
  const target *target;
  double *ours, *theirs; /* differences */
} comparison;

static void compare_range(void *context, size_t begin, size_t end) {
  const comparison *const c = context;
  ef__search search = {.mixing = c->grid->mixing, .metric = c->grid->metric};
  for (size_t i = begin; i < end; ++i) {
    ef__minima minima;
    double amount[3];
    memcpy(search.target, c->target[i].coordinate, sizeof search.target);
    ef__nearest(&search, c->target[i].exact, &minima);
    c->ours[i] = sqrt(minima.at[0].square);
    c->theirs[i] =
        grid_search_nearest(c->grid, c->target[i].coordinate, amount);
  }
}

/* Ours is never above the grid's by more than 1e-6. */
static void compare(const char *name, const grid_search *grid,
                    const target *targets, size_t n) {
  double *const both = malloc(2 * n * sizeof *both);
  assert_non_null(both);
  comparison c = {grid, targets, both, both + n};
  ef__parallel_for(n, 1, 0, compare_range, &c);
  double worst = -1, grid_worst = 0;
  size_t at = 0, exact = 0;
  for (size_t i = 0; i < n; ++i) {
    const double gap = c.ours[i] - c.theirs[i];
    exact += gap <= 1e-6;
    grid_worst = fmax(grid_worst, -gap);
    if (gap <= worst) continue; /* NaN goes on */
    worst = gap;
    at = i;
  }
  const double *const t = targets[at].coordinate;
  printf("# %s, %s: %zu of %zu as good as %d^3 grid and polish, largest gap "
         "%.2g at %.4f %.4f %.4f, grid worse by up to %.3g\n",
         name, ef_metric_name(grid->metric), exact, n, grid->side, worst, t[0],
         t[1], t[2], grid_worst);
  free(both);
  assert_true(worst <= 1e-6);
}

static target *random_targets(uint64_t seed, int first_kind, int n_kinds,
                              const ef__mixing *mixing,
                              const ef_metric *metric, size_t n) {
  target *const targets = malloc(n * sizeof *targets);
  assert_non_null(targets);
  gen g = gen_new(seed);
  for (size_t i = 0; i < n; ++i) {
    targets[i] = random_target(&g, first_kind + (int)(i % (size_t)n_kinds),
                               mixing, metric);
  }
  return targets;
}

static void compare_scene(size_t i, const char *metric_name) {
  scene s = scene_at(i);
  const ef_metric *const metric = ef_metric_find(metric_name, NULL);
  scene_look(&s, metric);
  grid_search grid = grid_search_new(&s.mixing, metric, 64);
  target *const targets =
      random_targets(10 + i, ANYWHERE, N_KINDS, &s.mixing, metric, n_targets);
  compare(s.name, &grid, targets, n_targets);
  free(targets);
  grid_search_free(&grid);
  scene_free(&s);
}

static void ciede2000_is_never_worse_than_the_grid(void **state) {
  (void)state;
  for (size_t i = 0; i < N_SCENES; ++i) compare_scene(i, "ciede2000");
}

static void cielab_is_never_worse_than_the_grid(void **state) {
  (void)state;
  for (size_t i = 0; i < N_SCENES; ++i) compare_scene(i, "cielab");
}

/* All formulas, on real colours a little out of gamut. */
static void other_formulas_are_never_worse_than_the_grid(void **state) {
  (void)state;
  const size_t n = n_targets / 5;
  for (size_t i = 0; i < N_SCENES; ++i) {
    scene s = scene_at(i);
    for (size_t m = 0; m < ef_metric_count(); ++m) {
      scene_look(&s, ef_metric_at(m));
      grid_search grid = grid_search_new(&s.mixing, ef_metric_at(m), 24);
      target *const targets =
          random_targets(20 + m, BEYOND, 1, &s.mixing, grid.metric, n);
      compare(s.name, &grid, targets, n);
      free(targets);
      grid_search_free(&grid);
    }
    scene_free(&s);
  }
}

/* ---- Properties of the answer ------------------------------------------ */

/* No step into the box goes down: the multipliers of the bounds have the right
 * sign and the other slopes vanish. Places at a kink or jump are left out by
 * their difference to a neutral or opposite hue. */
static void the_answer_is_stationary(void **state) {
  (void)state;
  const ef_metric *const metric = ef_metric_find("cielab", NULL);
  for (size_t i = 0; i < N_SCENES; ++i) {
    scene s = scene_at(i);
    scene_look(&s, metric);
    ef__search search = {.mixing = &s.mixing, .metric = metric};
    gen g = gen_new(40);
    for (int n = 0; n < 3000; ++n) {
      const target t = random_target(&g, n % N_KINDS, &s.mixing, metric);
      ef__minima minima;
      memcpy(search.target, t.coordinate, sizeof search.target);
      ef__nearest(&search, t.exact, &minima);
      ef__place at;
      memcpy(at.amount, minima.at[0].amount, sizeof at.amount);
      ef__search_expand(&search, &at);
      const ef__place *const place = &at;
      assert_true(in_box(place->amount));
      for (int k = 0; k < 3; ++k) {
        /* What a free amount could still gain is g^2 / (2 H). */
        const double slope = place->gradient[k];
        const double gain = slope * slope / (2 * place->hessian[4 * k]);
        const bool pushed = (place->amount[k] == 0 && slope > 0) ||
                            (place->amount[k] == 1 && slope < 0);
        assert_true(pushed || gain < 1e-8 * (1 + place->square));
      }
      assert_near(place->square, ef__search_value(&search, place->amount),
                  1e-12 * (1 + place->square));
    }
    scene_free(&s);
  }
}

static void minima_are_sorted_and_repeatable(void **state) {
  (void)state;
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  scene s = scene_at(0);
  scene_look(&s, metric);
  gen g = gen_new(50);
  for (int n = 0; n < 500; ++n) {
    const target t = random_target(&g, n % N_KINDS, &s.mixing, metric);
    ef__minima first, again;
    ef__search search = {.mixing = &s.mixing, .metric = metric};
    memcpy(search.target, t.coordinate, sizeof search.target);
    ef__nearest(&search, t.exact, &first);
    ef__nearest(&search, t.exact, &again);
    assert_true(first.n >= 1 && first.n == again.n);
    for (size_t i = 0; i < first.n; ++i) {
      assert_true(in_box(first.at[i].amount));
      assert_true(i == 0 || first.at[i - 1].square <= first.at[i].square);
      assert_same_bits(again.at[i].amount, first.at[i].amount, 3);
    }
  }
  scene_free(&s);
}

int main(int argc, char **argv) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(ciede2000_is_never_worse_than_the_grid),
      cmocka_unit_test(cielab_is_never_worse_than_the_grid),
      cmocka_unit_test(other_formulas_are_never_worse_than_the_grid),
      cmocka_unit_test(the_answer_is_stationary),
      cmocka_unit_test(minima_are_sorted_and_repeatable),
  };
  if (argc > 1 && strcmp(argv[1], "dense") == 0) n_targets = 2000;
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
