/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matching works with every formula: real colours on a smaller display. */
#include <evenfield/match.h>

#include "gen.h"
#include "metrics.h"
#include "near.h"

typedef struct scene {
  ef_device *device;
  ef_observer *observer;
  ef_setup *setup;
} scene;

static scene scene_new(void) {
  const ef_display_settings settings = ef_display_settings_default();
  scene s = {.device = ef_display_from_encoding("srgb", &settings, NULL),
             .observer = ef_observer_new("cie-1931", NULL)};
  assert_non_null(s.device);
  assert_non_null(s.observer);
  s.setup = ef_setup_new(s.device, s.observer, NULL, NULL, NULL);
  assert_non_null(s.setup);
  return s;
}

static void scene_free(scene *s) {
  ef_setup_free(s->setup);
  ef_observer_free(s->observer);
  ef_device_free(s->device);
}

/* In the gamut of BT.2020, the dark ones as frequent as the light ones. */
static ef_xyz random_target(gen *g) {
  double rgb[3];
  for (int k = 0; k < 3; ++k)
    rgb[k] = 100 * pow(gen_between(g, 0.1, 1), 2.2);
  return (ef_xyz){0.636958 * rgb[0] + 0.144617 * rgb[1] + 0.168881 * rgb[2],
                  0.262700 * rgb[0] + 0.677998 * rgb[1] + 0.059302 * rgb[2],
                  0.028073 * rgb[1] + 1.060985 * rgb[2]};
}

static double difference_at(const scene *s, const ef_metric *metric,
                            ef_xyz target, const double amount[3]) {
  const ef_conditions conditions =
      ef_conditions_default(ef_setup_white(s->setup));
  double reference[3], sample[3];
  ef_metric_coordinates(metric, target, &conditions, reference);
  ef_metric_coordinates(metric, ef_setup_xyz(s->setup, amount, NULL),
                        &conditions, sample);
  return ef_metric_difference(metric, reference, sample);
}

/* Trials all over the box, then ever closer around the answer. */
static double best_by_chance(const scene *s, const ef_metric *metric,
                             ef_xyz target, const double amount[3], gen *g) {
  double least = INFINITE;
  for (int r = 0; r < 200; ++r) {
    double trial[3];
    const double reach = r < 60 ? 1 : pow(10, -gen_between(g, 0, 6));
    for (int k = 0; k < 3; ++k) {
      trial[k] = amount[k] + reach * gen_between(g, -1, 1);
      if (gen_below(g, 3) == 0)
        trial[k] = amount[k];
      trial[k] = fmin(fmax(trial[k], 0), 1);
    }
    least = fmin(least, difference_at(s, metric, target, trial));
  }
  return least;
}

static void nearest_with_every_formula(void **state) {
  (void)state;
  scene s = scene_new();
  for (size_t m = 0; m < every_metric_count(); ++m) {
    ef_match_settings settings = ef_match_settings_default();
    settings.metric = every_metric(m);
    settings.bits = 0;
    gen g = gen_new(1);
    int n_outside = 0;
    deviation worst = {0, ""};
    for (int i = 0; i < 200; ++i) {
      const ef_xyz t = random_target(&g);
      const double xyz[3] = {t.X, t.Y, t.Z};
      ef_match match;
      assert_int_equal(
          ef_match_batch(s.setup, 1, xyz, &settings, 1, &match, NULL), EF_OK);
      if (match.in_gamut) {
        assert_true(match.nearest.difference < 1e-4);
        continue;
      }
      ++n_outside;
      const double found = match.nearest.difference;
      assert_true(found > 0);
      const double chance =
          best_by_chance(&s, settings.metric, t, match.nearest.amount, &g);
      char where[96];
      snprintf(where, sizeof where, "XYZ %.3f %.3f %.3f, %.4f", t.X, t.Y, t.Z,
               found);
      deviation_add(&worst, fmax(found - chance, 0), 0, where);
    }
    deviation_print(&worst, ef_metric_name(settings.metric));
    assert_true(n_outside > 50);
    /* Rounding of the difference: some 1e-12 of it. */
    assert_true(worst.largest < 1e-9);
  }
  scene_free(&s);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(nearest_with_every_formula),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
