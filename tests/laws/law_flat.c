/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matches for observers of two dimensions, over random dichromats, displays and
 * targets. */
#include <evenfield/match.h>

#include "gen.h"
#include "invented_display.h"
#include "must.h"
#include "near.h"

enum { N = 40, SAMPLES = INVENTED_SAMPLES };

typedef struct scene {
  ef_device *device;
  ef_observer *observer, *complete; /* the same eyes, with all cones */
  ef_setup *setup, *of_complete;
} scene;

static scene scene_new(gen *g, int round) {
  ef_cone_model model = ef_cone_model_default();
  model.age_years = gen_between(g, 20, 80);
  model.field_deg = gen_between(g, 1, 10);
  model.macular_percent = gen_between(g, -50, 50);
  scene s = {.device = invented_display(true)};
  s.complete = ef_observer_from_model(&model, NULL);
  model.deficiency = (ef_deficiency)(EF_PROTANOPE + round % 3);
  s.observer = ef_observer_from_model(&model, NULL);
  s.setup = must_setup(s.device, s.observer);
  s.of_complete = must_setup(s.device, s.complete);
  return s;
}

static void scene_free(scene *s) {
  ef_setup_free(s->setup);
  ef_setup_free(s->of_complete);
  ef_observer_free(s->observer);
  ef_observer_free(s->complete);
  ef_device_free(s->device);
}

static void run(const scene *s, const double *xyz, const double *near,
                const ef_match_settings *settings, ef_match *out) {
  ef_error error;
  if (ef_match_flat_batch(s->setup, N, xyz, near, settings, 0, out, &error) !=
      EF_OK) {
    fail_msg("%s", error.message);
  }
}

static void put(ef_xyz colour, double xyz[3]) {
  xyz[0] = colour.X;
  xyz[1] = colour.Y;
  xyz[2] = colour.Z;
}

static ef_match_settings exact_settings(void) {
  ef_match_settings settings = ef_match_settings_default();
  settings.bits = 0;
  return settings;
}

/* ---- In gamut ---------------------------------------------------------- */

/* What some amounts show is matched, by these amounts when they are asked for,
 * else by others that show the same. */
static void what_is_shown_is_matched(void **state) {
  (void)state;
  gen g = gen_new(1);
  const ef_match_settings settings = exact_settings();
  for (int round = 0; round < 12; ++round) {
    scene s = scene_new(&g, round);
    double amount[3 * N], xyz[3 * N], back[3];
    ef_match near[N], middle[N];
    gen_fill(&g, 3 * N, 0, 1, amount);
    for (size_t t = 0; t < N; ++t) {
      put(ef_setup_xyz(s.setup, amount + 3 * t, NULL), xyz + 3 * t);
    }
    run(&s, xyz, amount, &settings, near);
    run(&s, xyz, NULL, &settings, middle);
    for (size_t t = 0; t < N; ++t) {
      assert_true(near[t].in_gamut && middle[t].in_gamut);
      assert_true(near[t].nearest.difference == 0);
      for (size_t c = 0; c < 3; ++c) {
        assert_near(near[t].nearest.amount[c], amount[3 * t + c], 1e-9);
        assert_in_range((int)(1e6 * middle[t].nearest.amount[c]), 0, 1000000);
      }
      put(ef_setup_xyz(s.setup, middle[t].nearest.amount, NULL), back);
      for (size_t c = 0; c < 3; ++c) assert_near(back[c], xyz[3 * t + c], 1e-9);
    }
    scene_free(&s);
  }
}

/* A light that matches for the trichromat matches for the dichromat with the
 * same eyes, by the same amounts (reduction: Maxwell, Koenig). */
static void trichromats_matches_hold(void **state) {
  (void)state;
  gen g = gen_new(2);
  const ef_grid grid = invented_grid();
  const ef_match_settings settings = exact_settings();
  size_t n_seen = 0;
  for (int round = 0; round < 12; ++round) {
    scene s = scene_new(&g, round);
    double light[N * SAMPLES], xyz[3 * N], of_complete[3 * N], near[3 * N];
    ef_match flat[N], full[N];
    for (size_t t = 0; t < N; ++t) {
      gen_smooth(&g, SAMPLES, light + t * SAMPLES);
      for (size_t i = 0; i < SAMPLES; ++i) light[t * SAMPLES + i] *= 0.002;
    }
    ef_setup_light_xyz(s.setup, &grid, N, light, NULL, xyz, NULL);
    ef_setup_light_xyz(s.of_complete, &grid, N, light, NULL, of_complete, NULL);
    assert_int_equal(ef_match_batch(s.of_complete, N, of_complete, &settings, 0,
                                    full, NULL),
                     EF_OK);
    for (size_t t = 0; t < N; ++t) {
      memcpy(near + 3 * t, full[t].amount, 3 * sizeof *near);
    }
    run(&s, xyz, near, &settings, flat);
    for (size_t t = 0; t < N; ++t) {
      if (!full[t].in_gamut) continue;
      ++n_seen;
      assert_true(flat[t].in_gamut);
      for (size_t c = 0; c < 3; ++c) {
        assert_near(flat[t].amount[c], full[t].amount[c], 1e-7);
      }
    }
    scene_free(&s);
  }
  assert_true(n_seen > 100);
}

/* Without amounts to stay near, both ways along the line lead out of the box
 * after the same length. */
static void middle_is_the_middle(void **state) {
  (void)state;
  gen g = gen_new(3);
  const ef_match_settings settings = exact_settings();
  scene s = scene_new(&g, 1);
  double xyz[3 * N], amount[3 * N];
  ef_match low[N], high[N], middle[N];
  double far[3 * N], other[3 * N];
  gen_fill(&g, 3 * N, 0, 1, amount);
  for (size_t t = 0; t < N; ++t) {
    put(ef_setup_xyz(s.setup, amount + 3 * t, NULL), xyz + 3 * t);
    for (size_t c = 0; c < 3; ++c) {
      far[3 * t + c] = c == 0 ? 1e6 : 0;
      other[3 * t + c] = c == 0 ? -1e6 : 0;
    }
  }
  run(&s, xyz, far, &settings, high);
  run(&s, xyz, other, &settings, low);
  run(&s, xyz, NULL, &settings, middle);
  for (size_t t = 0; t < N; ++t) {
    for (size_t c = 0; c < 3; ++c) {
      assert_near(middle[t].amount[c],
                  (low[t].amount[c] + high[t].amount[c]) / 2, 1e-9);
    }
  }
  scene_free(&s);
}

/* ---- Out of gamut ------------------------------------------------------ */

static double difference_at(const scene *s, const ef_metric *metric,
                            const double amount[3], const double target[3]) {
  const ef_conditions conditions =
      ef_conditions_default(ef_setup_white(s->setup));
  double p[3], q[3];
  ef_metric_coordinates(metric, (ef_xyz){target[0], target[1], target[2]},
                        &conditions, p);
  ef_metric_coordinates(metric, ef_setup_xyz(s->setup, amount, NULL),
                        &conditions, q);
  return ef_metric_difference(metric, p, q);
}

/* No point of a grid over the box is nearer than the nearest colour. */
static void nearest_is_nearest(void **state) {
  (void)state;
  enum { STEPS = 15 };
  gen g = gen_new(4);
  static const char *const names[] = {"cielab", "ciede2000", "cam16-ucs"};
  size_t n_out = 0;
  for (int round = 0; round < 9; ++round) {
    scene s = scene_new(&g, round);
    ef_match_settings settings = exact_settings();
    settings.metric = ef_metric_find(names[round / 3], NULL);
    double xyz[3 * N], amount[3];
    ef_match m[N];
    for (size_t t = 0; t < N; ++t) {
      gen_fill(&g, 3, -0.15, 1.4, amount);
      for (size_t c = 0; c < 3; ++c) amount[c] = fmax(amount[c], 0);
      put(ef_setup_xyz(s.setup, amount, NULL), xyz + 3 * t);
    }
    run(&s, xyz, NULL, &settings, m);
    for (size_t t = 0; t < N; ++t) {
      if (m[t].in_gamut) continue;
      ++n_out;
      const double least = m[t].nearest.difference;
      assert_true(least > 0 && m[t].below + m[t].above != 0);
      assert_true(m[t].held_low + m[t].held_high != 0);
      assert_false(m[t].hue_kept.found);
      for (int i = 0; i < STEPS * STEPS * STEPS; ++i) {
        const double at[3] = {i % STEPS, i / STEPS % STEPS,
                              i / STEPS / STEPS};
        for (size_t c = 0; c < 3; ++c) amount[c] = at[c] / (STEPS - 1);
        assert_true(difference_at(&s, settings.metric, amount, xyz + 3 * t) >
                    least * (1 - 1e-9));
      }
    }
    scene_free(&s);
  }
  assert_true(n_out > 60);
}

/* Amounts out of gamut match, and no other amounts of the line stay nearer to
 * the box. */
static void signed_amounts_match(void **state) {
  (void)state;
  gen g = gen_new(5);
  const ef_match_settings settings = exact_settings();
  scene s = scene_new(&g, 0);
  double xyz[3 * N], amount[3], back[3];
  ef_match m[N];
  for (size_t t = 0; t < N; ++t) {
    gen_fill(&g, 3, 0, 1.6, amount);
    put(ef_setup_xyz(s.setup, amount, NULL), xyz + 3 * t);
  }
  run(&s, xyz, NULL, &settings, m);
  for (size_t t = 0; t < N; ++t) {
    put(ef_setup_xyz(s.setup, m[t].amount, NULL), back);
    double most = 0;
    for (size_t c = 0; c < 3; ++c) {
      assert_near(back[c], xyz[3 * t + c], 1e-9);
      most = fmax(most, fmax(-m[t].amount[c], m[t].amount[c] - 1));
    }
    if (m[t].in_gamut) continue;
    assert_true(most > 0 && most <= 0.6 + 1e-9); /* the amounts it came from */
  }
  scene_free(&s);
}

/* ---- Codes ------------------------------------------------------------- */

/* Better than rounding, and as good as any of the codes about the amounts. */
static void codes_are_the_best_about(void **state) {
  (void)state;
  gen g = gen_new(6);
  for (int k = 0; k < 6; ++k) {
    ef_match_settings settings = ef_match_settings_default();
    settings.bits = 1 + k;
    const double max_code = (double)((1 << settings.bits) - 1);
    scene s = scene_new(&g, k);
    double xyz[3 * N], amount[3 * N], at[3];
    ef_match m[N];
    gen_fill(&g, 3 * N, 0, 1, amount);
    for (size_t t = 0; t < N; ++t) {
      put(ef_setup_xyz(s.setup, amount + 3 * t, NULL), xyz + 3 * t);
    }
    run(&s, xyz, amount, &settings, m);
    for (size_t t = 0; t < N; ++t) {
      const double found = m[t].coded.difference;
      assert_true(found <= m[t].rounded_difference + 1e-12);
      for (int i = 0; i < 27; ++i) {
        const int step[3] = {i % 3 - 1, i / 3 % 3 - 1, i / 9 - 1};
        bool is_code = true;
        for (size_t c = 0; c < 3; ++c) {
          const double code =
              round(m[t].nearest.drive[c] * max_code) + step[c];
          is_code = is_code && code >= 0 && code <= max_code &&
                    fabs(m[t].nearest.drive[c] * max_code - code) < 1;
          at[c] = ef_device_amount(s.device, c, code / max_code, NULL);
        }
        if (!is_code) continue;
        assert_true(difference_at(&s, settings.metric, at, xyz + 3 * t) >=
                    found - 1e-9);
      }
    }
    scene_free(&s);
  }
}

/* ---- Adaptation -------------------------------------------------------- */

/* From white to white, and never off the plane; a trichromat's is the usual
 * one. */
static void adaptation_keeps_the_plane(void **state) {
  (void)state;
  gen g = gen_new(7);
  ef_illuminant *const a = ef_illuminant_new("A", NULL);
  ef_illuminant *const d65 = ef_illuminant_new("D65", NULL);
  const ef_grid grid = ef_grid_standard();
  for (int round = 0; round < 12; ++round) {
    scene s = scene_new(&g, round);
    double from[3], to[3], matrix[9], usual[9], light[471], xyz[3];
    ef_observer_white(s.observer, EF_TRISTIMULUS, a, NULL, from, NULL);
    ef_observer_white(s.observer, EF_TRISTIMULUS, d65, NULL, to, NULL);
    const ef_xyz w1 = {from[0], from[1], from[2]}, w2 = {to[0], to[1], to[2]};
    assert_int_equal(ef_match_adaptation(s.observer, EF_ADAPT_CAT16, w1, w2,
                                         matrix, NULL),
                     EF_OK);
    const ef_xyz carried = ef_xyz_transform(matrix, w1);
    assert_near(carried.X, w2.X, 1e-10);
    assert_near(carried.Y, w2.Y, 1e-10);
    assert_near(carried.Z, w2.Z, 1e-10);
    const ef_viewing viewing = ef_viewing_default(NULL);
    ef_weights *const weights = ef_observer_weights(
        s.observer, EF_TRISTIMULUS, &grid, &viewing, NULL, NULL);
    gen_smooth(&g, 471, light);
    ef_weights_apply(weights, 1, light, 1, xyz, NULL);
    const ef_xyz c = ef_xyz_transform(matrix, (ef_xyz){xyz[0], xyz[1], xyz[2]});
    const double volume =
        from[0] * (to[1] * c.Z - to[2] * c.Y) -
        from[1] * (to[0] * c.Z - to[2] * c.X) +
        from[2] * (to[0] * c.Y - to[1] * c.X);
    assert_near(volume / (from[1] * to[1] * c.Y), 0, 1e-12);
    ef_match_adaptation(s.complete, EF_ADAPT_CAT16, w1, w2, matrix, NULL);
    ef_adaptation_matrix(EF_ADAPT_CAT16, w1, w2, usual, NULL);
    assert_same_bits(matrix, usual, 9);
    ef_match_adaptation(s.observer, EF_ADAPT_NONE, w1, w2, matrix, NULL);
    ef_adaptation_matrix(EF_ADAPT_NONE, w1, w2, usual, NULL);
    assert_same_bits(matrix, usual, 9);
    ef_weights_free(weights);
    scene_free(&s);
  }
  ef_illuminant_free(a);
  ef_illuminant_free(d65);
}

/* A population of dichromats without deviations sees what the one of them sees
 * who is an observer. */
static void population_adapts_as_its_observer(void **state) {
  (void)state;
  gen g = gen_new(8);
  const ef_grid grid = invented_grid();
  ef_illuminant *const a = ef_illuminant_new("A", NULL);
  for (int round = 0; round < 6; ++round) {
    scene s = scene_new(&g, round);
    double surface[SAMPLES], light[SAMPLES], white[SAMPLES];
    double from[3], xyz[2][3], matrix[9], p[3], q[3], seen;
    gen_smooth(&g, SAMPLES, surface);
    gen_smooth(&g, SAMPLES, light);
    const double full[3] = {1, 1, 1};
    ef_device_spectrum(s.device, full, white, NULL, NULL);
    for (size_t i = 0; i < SAMPLES; ++i) light[i] *= white[i];
    ef_population_settings settings = ef_population_settings_default();
    assert_true(ef_observer_model(s.observer, &settings.mean));
    settings.count = 1;
    settings.deviation_scale = 0;
    settings.age_min_years = settings.age_max_years = settings.mean.age_years;
    ef_population *const one = ef_population_new(&settings, NULL);
    const ef_side target = {grid, surface, ef_viewing_default(a), NULL};
    const ef_side match = {grid, light, ef_viewing_default(NULL), white};
    /* A tritanope's colours have one of two opposite hues, where CIEDE2000
     * jumps: rounding would decide. */
    ef_spread_settings how = ef_spread_settings_default();
    how.metric = ef_metric_find("cielab", NULL);
    ef_spread spread;
    assert_int_equal(ef_population_spread(one, 1, &target, &match, &how, 1,
                                          &spread, &seen, NULL, NULL),
                     EF_OK);
    ef_weights *const weights = ef_observer_weights(
        s.observer, EF_TRISTIMULUS, &grid, &target.viewing, NULL, NULL);
    ef_weights_apply(weights, 1, surface, 1, xyz[0], NULL);
    ef_setup_light_xyz(s.setup, &grid, 1, light, NULL, xyz[1], NULL);
    double perfect[SAMPLES];
    for (size_t i = 0; i < SAMPLES; ++i) perfect[i] = 1;
    ef_weights_apply(weights, 1, perfect, 1, from, NULL);
    const ef_xyz to = ef_setup_white(s.setup);
    ef_match_adaptation(s.observer, EF_ADAPT_CAT16,
                        (ef_xyz){from[0], from[1], from[2]}, to, matrix, NULL);
    const ef_conditions conditions = ef_conditions_default(to);
    ef_metric_coordinates(
        how.metric,
        ef_xyz_transform(matrix, (ef_xyz){xyz[0][0], xyz[0][1], xyz[0][2]}),
        &conditions, p);
    ef_metric_coordinates(how.metric,
                          (ef_xyz){xyz[1][0], xyz[1][1], xyz[1][2]},
                          &conditions, q);
    assert_near_relative(seen, ef_metric_difference(how.metric, p, q), 1e-9);
    ef_weights_free(weights);
    ef_population_free(one);
    scene_free(&s);
  }
  ef_illuminant_free(a);
}

/* ---- The call ---------------------------------------------------------- */

static void batch_hands_over(void **state) {
  (void)state;
  gen g = gen_new(9);
  const ef_match_settings settings = ef_match_settings_default();
  scene s = scene_new(&g, 2);
  double xyz[3 * N], amount[3];
  ef_match flat[N], batch[N], single;
  for (size_t t = 0; t < N; ++t) {
    gen_fill(&g, 3, 0, 1.3, amount);
    put(ef_setup_xyz(s.setup, amount, NULL), xyz + 3 * t);
  }
  run(&s, xyz, NULL, &settings, flat);
  assert_int_equal(ef_match_batch(s.setup, N, xyz, &settings, 2, batch, NULL),
                   EF_OK);
  assert_memory_equal(flat, batch, sizeof flat);
  for (size_t t = 0; t < N; ++t) {
    ef_match_batch(s.setup, 1, xyz + 3 * t, &settings, 1, &single, NULL);
    assert_memory_equal(&flat[t], &single, sizeof single);
  }
  scene_free(&s);
}

static void expect_refused(const ef_setup *setup, const double xyz[3],
                           ef_status status, const char *message) {
  const ef_match_settings settings = ef_match_settings_default();
  ef_error error;
  ef_match m;
  assert_int_equal(ef_match_flat_batch(setup, 1, xyz, NULL, &settings, 1, &m,
                                       &error),
                   status);
  assert_string_equal(error.message, message);
}

static void what_has_no_answer_is_refused(void **state) {
  (void)state;
  gen g = gen_new(10);
  scene s = scene_new(&g, 1);
  double xyz[3];
  put(ef_setup_white(s.setup), xyz);
  char message[200];
  snprintf(message, sizeof message,
           "observer %s sees three dimensions: ef_match_batch finds matches",
           ef_observer_name(s.complete));
  expect_refused(s.of_complete, xyz, EF_INVALID, message);
  xyz[0] += 1;
  const ef_match_settings settings = ef_match_settings_default();
  ef_error error;
  ef_match m;
  assert_int_equal(
      ef_match_flat_batch(s.setup, 1, xyz, NULL, &settings, 1, &m, &error),
      EF_INVALID);
  assert_non_null(strstr(error.message, "target 1 lies "));
  xyz[0] = (double)NAN;
  expect_refused(s.setup, xyz, EF_INVALID,
                 "target 1 has a value that is not a finite number");
  scene_free(&s);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(what_is_shown_is_matched),
      cmocka_unit_test(trichromats_matches_hold),
      cmocka_unit_test(middle_is_the_middle),
      cmocka_unit_test(nearest_is_nearest),
      cmocka_unit_test(signed_amounts_match),
      cmocka_unit_test(codes_are_the_best_about),
      cmocka_unit_test(adaptation_keeps_the_plane),
      cmocka_unit_test(population_adapts_as_its_observer),
      cmocka_unit_test(batch_hands_over),
      cmocka_unit_test(what_has_no_answer_is_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
