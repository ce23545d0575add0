/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every match. */
#include <stdlib.h>
#include <string.h>

#include <evenfield/match.h>

#include "gen.h"
#include "invented_display.h"
#include "near.h"

typedef struct scene {
  ef_device *device;
  ef_observer *observer;
  ef_setup *setup;
} scene;

static const char *const displays[] = {"srgb", "bt2020", "p3-dci", "invented"};
enum { N_DISPLAYS = 4 };

static scene scene_new(const char *name) {
  ef_error error;
  scene s;
  const ef_display_settings settings = ef_display_settings_default();
  s.device = strcmp(name, "invented") == 0
                 ? invented_display(true)
                 : ef_display_from_encoding(name, &settings, &error);
  s.observer = ef_observer_new("cie-1931", &error);
  s.setup = s.device != NULL
                ? ef_setup_new(s.device, s.observer, NULL, NULL, &error)
                : NULL;
  if (s.setup == NULL)
    fail_msg("%s: %s", name, error.message);
  return s;
}

static void scene_free(scene *s) {
  ef_setup_free(s->setup);
  ef_observer_free(s->observer);
  ef_device_free(s->device);
}

static ef_match_settings settings_with(int bits) {
  ef_match_settings settings = ef_match_settings_default();
  settings.bits = bits;
  return settings;
}

/* Amounts from -0.3 to 1.3: inside and outside the box. */
static void random_amounts(gen *g, double amount[3]) {
  gen_fill(g, 3, -0.3, 1.3, amount);
}

/* CIELAB colours of all chromas and hues, mostly beyond the gamut. */
static ef_xyz random_target(gen *g, const scene *s) {
  const ef_lch lch = {gen_between(g, 2, 98), gen_between(g, 0, 140),
                      gen_between(g, 0, 360)};
  return ef_lab_to_xyz(ef_lch_to_lab(lch), ef_setup_white(s->setup));
}

static ef_match match_of(const scene *s, ef_xyz target,
                         const ef_match_settings *settings) {
  ef_match match;
  ef_error error;
  const double xyz[3] = {target.X, target.Y, target.Z};
  if (ef_match_batch(s->setup, 1, xyz, settings, 1, &match, &error) != EF_OK)
    fail_msg("%s", error.message);
  return match;
}

static void match_then_mix_returns_the_target(void **state) {
  (void)state;
  const ef_match_settings settings = settings_with(0);
  for (int d = 0; d < N_DISPLAYS; d++) {
    scene s = scene_new(displays[d]);
    gen g = gen_new(100 + (uint64_t)d);
    for (int i = 0; i < 2000; i++) {
      double amount[3];
      random_amounts(&g, amount);
      const ef_xyz target = ef_setup_xyz(s.setup, amount, NULL);
      const ef_match m = match_of(&s, target, &settings);
      const ef_xyz back = ef_setup_xyz(s.setup, m.amount, NULL);
      /* Y of the white is 100. */
      assert_near(back.X, target.X, 1e-10);
      assert_near(back.Y, target.Y, 1e-10);
      assert_near(back.Z, target.Z, 1e-10);
      bool inside = true;
      for (int k = 0; k < 3; k++) {
        assert_near(m.amount[k], amount[k], 1e-11);
        inside = inside && m.amount[k] >= 0 && m.amount[k] <= 1;
        assert_int_equal((m.below >> k) & 1, m.amount[k] < 0);
        assert_int_equal((m.above >> k) & 1, m.amount[k] > 1);
      }
      assert_int_equal(m.in_gamut, inside);
      if (inside) {
        assert_true(m.nearest.difference == 0);
        assert_memory_equal(m.nearest.amount, m.amount, sizeof m.amount);
      } else {
        assert_true(m.nearest.difference > 0);
      }
    }
    scene_free(&s);
  }
}

/* Grassmann: the amounts of a sum of lights are the sums of their amounts, and
 * those of a multiple the multiples. Black counts once. */
static void amounts_add_and_scale(void **state) {
  (void)state;
  const ef_match_settings settings = settings_with(0);
  scene s = scene_new("invented");
  const ef_xyz k = ef_setup_black(s.setup);
  gen g = gen_new(7);
  for (int i = 0; i < 1000; i++) {
    const ef_xyz p = random_target(&g, &s), q = random_target(&g, &s);
    const double t = gen_between(&g, 0, 3);
    const ef_xyz sum = {p.X + t * (q.X - k.X), p.Y + t * (q.Y - k.Y),
                        p.Z + t * (q.Z - k.Z)};
    const ef_match a = match_of(&s, p, &settings);
    const ef_match b = match_of(&s, q, &settings);
    const ef_match c = match_of(&s, sum, &settings);
    for (int j = 0; j < 3; j++)
      assert_near(c.amount[j], a.amount[j] + t * b.amount[j], 1e-10);
  }
  scene_free(&s);
}

static double difference_at(const scene *s, const ef_match_settings *settings,
                            ef_xyz target, const double amount[3]) {
  const ef_conditions conditions = {.white = ef_setup_white(s->setup)};
  double reference[3], sample[3];
  ef_metric_coordinates(settings->metric, target, &conditions, reference);
  ef_metric_coordinates(settings->metric, ef_setup_xyz(s->setup, amount, NULL),
                        &conditions, sample);
  return ef_metric_difference(settings->metric, reference, sample);
}

/* Nothing that is easily found is nearer: clipped amounts, hue kept, corners,
 * colours of the box at random. */
static void nearest_is_never_beaten_by_chance(void **state) {
  (void)state;
  static const char *const metrics[] = {"ciede2000", "cielab"};
  for (int k = 0; k < 2 * N_DISPLAYS; k++) {
    scene s = scene_new(displays[k / 2]);
    ef_match_settings settings = settings_with(0);
    settings.metric = ef_metric_find(metrics[k % 2], NULL);
    gen g = gen_new(31 + (uint64_t)k);
    for (int i = 0; i < 250; i++) {
      const ef_xyz target = random_target(&g, &s);
      const ef_match m = match_of(&s, target, &settings);
      const double least = m.nearest.difference;
      assert_near(difference_at(&s, &settings, target, m.nearest.amount), least,
                  m.in_gamut ? 1e-4 : 1e-12);
      for (int j = 0; j < 3; j++)
        assert_true(m.nearest.amount[j] >= 0 && m.nearest.amount[j] <= 1);
      double trial[3];
      for (int j = 0; j < 3; j++)
        trial[j] = fmin(fmax(m.amount[j], 0), 1);
      assert_true(least <= difference_at(&s, &settings, target, trial) + 1e-9);
      if (m.hue_kept.found)
        assert_true(least <= m.hue_kept.difference + 1e-9);
      for (int r = 0; r < 150; r++) {
        gen_fill(&g, 3, 0, 1, trial);
        if (r < 8) /* corners */
          for (int j = 0; j < 3; j++)
            trial[j] = (r >> j) & 1;
        if (r % 2 == 1) /* faces */
          trial[gen_below(&g, 3)] = gen_unit(&g) < 0.5 ? 0 : 1;
        assert_true(least <=
                    difference_at(&s, &settings, target, trial) + 1e-9);
      }
      if (m.in_gamut)
        continue;
      /* CIEDE2000 may be least inside the box, at its jump. */
      if (k % 2 == 1)
        assert_true((m.held_low | m.held_high) != 0);
    }
    scene_free(&s);
  }
}

static void hue_kept_keeps_hue_and_lightness(void **state) {
  (void)state;
  const ef_match_settings settings = settings_with(0);
  for (int d = 0; d < N_DISPLAYS; d++) {
    scene s = scene_new(displays[d]);
    const ef_xyz white = ef_setup_white(s.setup);
    gen g = gen_new(55 + (uint64_t)d);
    int n_same_lightness = 0;
    for (int i = 0; i < 1000; i++) {
      const ef_xyz target = random_target(&g, &s);
      const ef_match m = match_of(&s, target, &settings);
      assert_true(m.hue_kept.found);
      const ef_lch want = ef_lab_to_lch(ef_xyz_to_lab(target, white));
      const ef_lch got = ef_lab_to_lch(ef_xyz_to_lab(m.hue_kept.xyz, white));
      if (fabs(got.L_star - want.L_star) < 1e-9)
        n_same_lightness++;
      assert_true(got.C_star <= want.C_star + 1e-9);
      if (got.C_star > 1e-3) {
        /* cbrt and its inverse leave some eps of 100 in a* and b* */
        assert_near(remainder(got.h_deg - want.h_deg, 360), 0,
                    1e-9 * 57.3 * 100 / got.C_star);
      }
      if (m.in_gamut || fabs(got.L_star - want.L_star) > 1e-9)
        continue;
      /* A little more chroma is out of the box. */
      const ef_lch more = {want.L_star, got.C_star + 1e-4 * want.C_star,
                           want.h_deg};
      const ef_match beyond =
          match_of(&s, ef_lab_to_xyz(ef_lch_to_lab(more), white), &settings);
      assert_false(beyond.in_gamut);
    }
    printf("# %s: lightness kept for %d of 1000\n", displays[d],
           n_same_lightness);
    assert_true(n_same_lightness > 900);
    scene_free(&s);
  }
}

/* Every lattice point, one by one. */
static double least_of_all(const scene *s, const ef_match_settings *settings,
                           ef_xyz target) {
  const int n =
      settings->n_steps > 0 ? settings->n_steps + 1 : 1 << settings->bits;
  double least = INFINITE;
  for (int code = 0; code < n * n * n; code++) {
    const int digit[3] = {code % n, code / n % n, code / n / n};
    double amount[3];
    for (size_t i = 0; i < 3; i++)
      amount[i] = ef_device_amount(s->device, i, digit[i] / (n - 1.0), NULL);
    const double d = difference_at(s, settings, target, amount);
    if (d < least)
      least = d;
  }
  return least;
}

static void codes_are_the_best_of_all(void **state) {
  (void)state;
  static const struct {
    int bits, n_steps, n_targets;
  } plan[] = {{1, 0, 60}, {2, 0, 60}, {3, 0, 60}, {4, 0, 12}, {5, 0, 24},
              {6, 0, 1},  {0, 1, 20}, {0, 5, 20}, {0, 20, 12}};
  size_t n_rounded_worse = 0, n = 0, n_missed = 0;
  for (int d = 0; d < N_DISPLAYS; d++) {
    scene s = scene_new(displays[d]);
    gen g = gen_new(77 + (uint64_t)d);
    for (size_t p = 0; p < sizeof plan / sizeof plan[0]; p++) {
      ef_match_settings settings = settings_with(plan[p].bits);
      settings.n_steps = plan[p].n_steps;
      for (int i = 0; i < plan[p].n_targets; i++) {
        const ef_xyz target = random_target(&g, &s);
        const ef_match m = match_of(&s, target, &settings);
        const double least = least_of_all(&s, &settings, target);
        if (!(m.coded.difference <= least + 1e-9)) {
          print_error("%s, %d bits or %d steps, target %d: %.9g, best of all "
                      "%.9g\n",
                      displays[d], plan[p].bits, plan[p].n_steps, i,
                      m.coded.difference, least);
        }
        n_missed += m.coded.difference > least + 1e-9;
        assert_true(m.coded.difference <= m.rounded_difference + 1e-12);
        for (size_t c = 0; c < 3 && plan[p].n_steps > 0; c++) {
          assert_true(m.coded.drive[c] == (double)m.code[c] / plan[p].n_steps);
        }
        n_rounded_worse += m.rounded_difference > m.coded.difference + 1e-9;
        n++;
      }
    }
    scene_free(&s);
  }
  printf("# plainly rounded codes are worse for %zu of %zu targets\n",
         n_rounded_worse, n);
  assert_true(n_rounded_worse > 0);
  assert_int_equal(n_missed, 0);
}

/* More bits are never worse where the coarser codes are among the finer: 1 bit
 * in any, 8 bits in 16 (65535 = 257 x 255), 4 in 8. */
static void finer_codes_are_never_worse(void **state) {
  (void)state;
  static const int nested[][2] = {{1, 5}, {4, 8}, {8, 16}, {5, 10}};
  for (int d = 0; d < N_DISPLAYS; d++) {
    scene s = scene_new(displays[d]);
    gen g = gen_new(5 + (uint64_t)d);
    for (int i = 0; i < 400; i++) {
      const ef_xyz target = random_target(&g, &s);
      for (size_t k = 0; k < sizeof nested / sizeof nested[0]; k++) {
        const ef_match_settings coarse = settings_with(nested[k][0]);
        const ef_match_settings fine = settings_with(nested[k][1]);
        assert_true(match_of(&s, target, &fine).coded.difference <=
                    match_of(&s, target, &coarse).coded.difference + 1e-9);
      }
    }
    scene_free(&s);
  }
}

static void threads_and_batches_change_nothing(void **state) {
  (void)state;
  enum { N = 700 };
  scene s = scene_new("invented");
  gen g = gen_new(9);
  const ef_match_settings settings = settings_with(8);
  double *xyz = malloc(3 * N * sizeof *xyz);
  ef_match *one = calloc(N, sizeof *one), *other = calloc(N, sizeof *other);
  for (int i = 0; i < N; i++) {
    const ef_xyz t = random_target(&g, &s);
    memcpy(xyz + 3 * i, &t, sizeof t);
  }
  assert_int_equal(ef_match_batch(s.setup, N, xyz, &settings, 1, one, NULL),
                   EF_OK);
  assert_int_equal(ef_match_batch(s.setup, N, xyz, &settings, 5, other, NULL),
                   EF_OK);
  assert_memory_equal(one, other, N * sizeof *one);
  for (int i = 0; i < N; i += 13) {
    assert_int_equal(
        ef_match_batch(s.setup, 1, xyz + 3 * i, &settings, 0, other, NULL),
        EF_OK);
    assert_memory_equal(one + i, other, sizeof *one);
  }
  free(other);
  free(one);
  free(xyz);
  scene_free(&s);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(match_then_mix_returns_the_target),
      cmocka_unit_test(amounts_add_and_scale),
      cmocka_unit_test(nearest_is_never_beaten_by_chance),
      cmocka_unit_test(hue_kept_keeps_hue_and_lightness),
      cmocka_unit_test(codes_are_the_best_of_all),
      cmocka_unit_test(finer_codes_are_never_worse),
      cmocka_unit_test(threads_and_batches_change_nothing),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
