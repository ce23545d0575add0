/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include <evenfield/match.h>

#include "gen.h"
#include "near.h"

enum { SAMPLES = 81, N_PAIRS = 20, N_OBSERVERS = 140 };

static const ef_grid grid = {.count = SAMPLES, .start_nm = 380, .step_nm = 5};

static ef_population *make(const ef_population_settings *settings) {
  ef_error error;
  ef_population *const population = ef_population_new(settings, &error);
  if (population == NULL) fail_msg("%s", error.message);
  return population;
}

static void spread_of(const ef_population *population, size_t n,
                      const ef_side *target, const ef_side *match,
                      const ef_spread_settings *settings, ef_spread *spread,
                      double *difference) {
  ef_error error;
  if (ef_population_spread(population, n, target, match, settings, 0, spread,
                           difference, NULL, &error) != EF_OK) {
    fail_msg("%s", error.message);
  }
}

static void random_lights(gen *g, size_t n, double *value) {
  for (size_t i = 0; i < n; ++i) gen_smooth(g, SAMPLES, value + i * SAMPLES);
}

/* Two sides of one spectrum: zero to the bit for everybody, whatever the
 * metric, the adaptation, the deficiency and the kind of stimulus. */
static void identical_spectra_are_told_apart_by_nobody(void **state) {
  (void)state;
  gen g = gen_new(1);
  static double sample[N_PAIRS * SAMPLES], white[SAMPLES];
  static double difference[N_PAIRS * N_OBSERVERS];
  ef_spread spread[N_PAIRS];
  ef_illuminant *const fl2 = ef_illuminant_new("FL2", NULL);
  random_lights(&g, N_PAIRS, sample);
  random_lights(&g, 1, white);
  for (int round = 0; round < 24; ++round) {
    ef_population_settings settings = ef_population_settings_default();
    settings.count = N_OBSERVERS;
    settings.seed = gen_bits(&g);
    settings.mean.field_deg = gen_between(&g, 1, 10);
    settings.mean.deficiency = (ef_deficiency)(round % 4);
    ef_population *const population = make(&settings);
    const bool is_surface = round % 3 == 0;
    const ef_side side = {grid, sample,
                          ef_viewing_default(is_surface ? fl2 : NULL),
                          is_surface && round % 2 == 0 ? NULL : white};
    const ef_spread_settings how = {ef_metric_at((size_t)round % 2),
                                    (ef_adaptation)(round % 3), 0, NULL};
    spread_of(population, N_PAIRS, &side, &side, &how, spread, difference);
    for (size_t i = 0; i < N_PAIRS * N_OBSERVERS; ++i) {
      assert_true(difference[i] == 0);
    }
    for (size_t p = 0; p < N_PAIRS; ++p) {
      assert_true(spread[p].mean == 0 && spread[p].p95 == 0 &&
                  spread[p].share_of_observers == 0);
    }
    ef_population_free(population);
  }
  ef_illuminant_free(fl2);
}

/* Without deviations and at one age everybody sees what the mean observer of
 * that age and field sees. */
static void no_deviation_is_the_mean_observer(void **state) {
  (void)state;
  gen g = gen_new(2);
  static double target[N_PAIRS * SAMPLES], match[N_PAIRS * SAMPLES];
  static double white[SAMPLES], difference[N_PAIRS * N_OBSERVERS];
  ef_spread spread[N_PAIRS];
  random_lights(&g, N_PAIRS, target);
  random_lights(&g, N_PAIRS, match);
  random_lights(&g, 1, white);
  const ef_side a = {grid, target, ef_viewing_default(NULL), white};
  const ef_side b = {grid, match, ef_viewing_default(NULL), white};
  const ef_spread_settings how = ef_spread_settings_default();
  for (int round = 0; round < 8; ++round) {
    ef_population_settings settings = ef_population_settings_default();
    settings.count = N_OBSERVERS;
    settings.deviation_scale = 0;
    settings.mean.field_deg = gen_between(&g, 1, 10);
    settings.age_min_years = settings.age_max_years = gen_between(&g, 20, 80);
    ef_population *const population = make(&settings);
    ef_cone_model model = settings.mean;
    model.age_years = settings.age_min_years;
    ef_observer *const observer = ef_observer_from_model(&model, NULL);
    ef_weights *const weights = ef_observer_weights(
        observer, EF_TRISTIMULUS, &grid, &a.viewing, NULL, NULL);
    double xyz[2][3 * N_PAIRS], w[3];
    ef_weights_apply(weights, N_PAIRS, target, 1, xyz[0], NULL);
    ef_weights_apply(weights, N_PAIRS, match, 1, xyz[1], NULL);
    ef_weights_apply(weights, 1, white, 1, w, NULL);
    spread_of(population, N_PAIRS, &a, &b, &how, spread, difference);
    for (size_t p = 0; p < N_PAIRS; ++p) {
      ef_lab lab[2];
      for (size_t s = 0; s < 2; ++s) {
        const double *const v = xyz[s] + 3 * p;
        lab[s] = ef_xyz_to_lab((ef_xyz){v[0], v[1], v[2]},
                               (ef_xyz){w[0], w[1], w[2]});
      }
      const double expected = ef_delta_e_ciede2000(lab[0], lab[1], 1, 1, 1);
      for (size_t i = 0; i < N_OBSERVERS; ++i) {
        assert_near_relative(difference[p * N_OBSERVERS + i], expected, 1e-10);
      }
      assert_near_relative(spread[p].mean, expected, 1e-10);
      assert_near_relative(spread[p].p95, expected, 1e-10);
    }
    ef_weights_free(weights);
    ef_observer_free(observer);
    ef_population_free(population);
  }
}

/* The unit of the lights does not matter: each side is judged against its own
 * white. */
static void units_cancel(void **state) {
  (void)state;
  gen g = gen_new(3);
  static double target[N_PAIRS * SAMPLES], match[N_PAIRS * SAMPLES];
  static double white[2 * SAMPLES], scaled[(N_PAIRS + 1) * SAMPLES];
  static double before[N_PAIRS * N_OBSERVERS], after[N_PAIRS * N_OBSERVERS];
  ef_spread spread[N_PAIRS];
  random_lights(&g, N_PAIRS, target);
  random_lights(&g, N_PAIRS, match);
  random_lights(&g, 2, white);
  ef_population_settings settings = ef_population_settings_default();
  settings.count = N_OBSERVERS;
  ef_population *const population = make(&settings);
  const ef_spread_settings how = ef_spread_settings_default();
  ef_side a = {grid, target, ef_viewing_default(NULL), white};
  ef_side b = {grid, match, ef_viewing_default(NULL), white + SAMPLES};
  spread_of(population, N_PAIRS, &a, &b, &how, spread, before);
  for (size_t i = 0; i < N_PAIRS * SAMPLES; ++i) scaled[i] = 3e-5 * match[i];
  for (size_t i = 0; i < SAMPLES; ++i) {
    scaled[N_PAIRS * SAMPLES + i] = 3e-5 * white[SAMPLES + i];
  }
  b.sample = scaled;
  b.white = scaled + N_PAIRS * SAMPLES;
  a.viewing.absolute = true;
  spread_of(population, N_PAIRS, &a, &b, &how, spread, after);
  for (size_t i = 0; i < N_PAIRS * N_OBSERVERS; ++i) {
    assert_near(after[i], before[i], 1e-9);
  }
  ef_population_free(population);
}

static double dot(const double *weight, const double *sample) {
  double sum = 0;
  for (size_t i = 0; i < SAMPLES; ++i) sum += weight[i] * sample[i];
  return sum;
}

/* A metamer for one member: what that person sees of the difference is taken
 * out by means of three primaries. */
static void make_metamer(const double *weight, const double *sample, gen *g,
                         double *other) {
  double m[9], right[3], primary[3 * SAMPLES];
  gen_smooth(g, SAMPLES, other);
  for (size_t k = 0; k < 3; ++k) {
    const double centre_nm[3] = {615, 535, 450};
    for (size_t i = 0; i < SAMPLES; ++i) {
      const double z = (380 + 5 * (double)i - centre_nm[k]) / 20;
      primary[k * SAMPLES + i] = exp(-z * z / 2);
    }
  }
  for (size_t c = 0; c < 3; ++c) {
    right[c] = dot(weight + c * SAMPLES, sample) -
               dot(weight + c * SAMPLES, other);
    for (size_t k = 0; k < 3; ++k) {
      m[3 * c + k] = dot(weight + c * SAMPLES, primary + k * SAMPLES);
    }
  }
  const double whole = m[0] * (m[4] * m[8] - m[5] * m[7]) -
                       m[1] * (m[3] * m[8] - m[5] * m[6]) +
                       m[2] * (m[3] * m[7] - m[4] * m[6]);
  for (size_t k = 0; k < 3; ++k) {
    double r[9];
    memcpy(r, m, sizeof r);
    for (size_t c = 0; c < 3; ++c) r[3 * c + k] = right[c];
    const double amount = (r[0] * (r[4] * r[8] - r[5] * r[7]) -
                           r[1] * (r[3] * r[8] - r[5] * r[6]) +
                           r[2] * (r[3] * r[7] - r[4] * r[6])) / whole;
    for (size_t i = 0; i < SAMPLES; ++i) {
      other[i] += amount * primary[k * SAMPLES + i];
    }
  }
}

/* A match set for one person holds for that person and, as they are all
 * different, for hardly anybody else. */
static void a_match_holds_for_whom_it_was_set(void **state) {
  (void)state;
  gen g = gen_new(4);
  static double target[N_PAIRS * SAMPLES], match[N_PAIRS * SAMPLES];
  static double difference[N_PAIRS * N_OBSERVERS];
  ef_spread spread[N_PAIRS];
  ef_population_settings settings = ef_population_settings_default();
  settings.count = N_OBSERVERS;
  settings.seed = 5;
  ef_population *const population = make(&settings);
  ef_illuminant *const d65 = ef_illuminant_new("D65", NULL);
  const ef_side a = {grid, target, ef_viewing_default(d65), NULL};
  const ef_side b = {grid, match, ef_viewing_default(d65), NULL};
  random_lights(&g, N_PAIRS, target);
  for (size_t p = 0; p < N_PAIRS; ++p) {
    ef_weights *const own = ef_population_weights(population, 3 * p, 1, &grid,
                                                  &a.viewing, 1, NULL, NULL);
    make_metamer(ef_weights_matrix(own), target + p * SAMPLES, &g,
                 match + p * SAMPLES);
    ef_weights_free(own);
  }
  const ef_spread_settings how = ef_spread_settings_default();
  spread_of(population, N_PAIRS, &a, &b, &how, spread, difference);
  for (size_t p = 0; p < N_PAIRS; ++p) {
    size_t n_matching = 0;
    for (size_t i = 0; i < N_OBSERVERS; ++i) {
      n_matching += difference[p * N_OBSERVERS + i] < 1e-3;
    }
    assert_near(difference[p * N_OBSERVERS + 3 * p], 0, 1e-9);
    assert_int_equal(n_matching, 1);
    assert_true(spread[p].p95 >= spread[p].mean);
  }
  ef_illuminant_free(d65);
  ef_population_free(population);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(identical_spectra_are_told_apart_by_nobody),
      cmocka_unit_test(no_deviation_is_the_mean_observer),
      cmocka_unit_test(units_cancel),
      cmocka_unit_test(a_match_holds_for_whom_it_was_set),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
