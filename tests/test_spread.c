/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "match/match_private.h"

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

static ef_population *make_many(size_t count, uint64_t seed) {
  ef_population_settings settings = ef_population_settings_default();
  ef_error error;
  settings.count = count;
  settings.seed = seed;
  ef_population *const population = ef_population_new(&settings, &error);
  if (population == NULL) fail_msg("%s", error.message);
  return population;
}

static ef_illuminant *light(const char *name) {
  ef_error error;
  ef_illuminant *const illuminant = ef_illuminant_new(name, &error);
  if (illuminant == NULL) fail_msg("%s", error.message);
  return illuminant;
}

static const ef_metric *metric_of(const char *name) {
  const ef_metric *const metric = ef_metric_find(name, NULL);
  assert_non_null(metric);
  return metric;
}

/* Invented surfaces at 10 nm and invented lights at 5 nm, in pairs. */
enum { N_PAIRS = 7, SURFACE_SAMPLES = 36, LIGHT_SAMPLES = 81 };

typedef struct pairs {
  double surface[N_PAIRS * SURFACE_SAMPLES];
  double light[N_PAIRS * LIGHT_SAMPLES];
  double white[LIGHT_SAMPLES];
  ef_illuminant *illuminant;
  ef_side target, match;
} pairs;

static void make_pairs(pairs *p, gen *g) {
  for (size_t i = 0; i < N_PAIRS; ++i) {
    gen_smooth(g, SURFACE_SAMPLES, p->surface + i * SURFACE_SAMPLES);
  }
  for (size_t j = 0; j < LIGHT_SAMPLES; ++j) p->white[j] = 0;
  for (size_t k = 0; k < 3; ++k) {
    const double centre_nm[3] = {610, 540, 455};
    for (size_t j = 0; j < LIGHT_SAMPLES; ++j) {
      const double z = (380 + 5 * (double)j - centre_nm[k]) / 15;
      const double primary = exp(-z * z / 2);
      p->white[j] += 0.02 * primary;
      for (size_t i = 0; i < N_PAIRS; ++i) {
        p->light[i * LIGHT_SAMPLES + j] += 0.02 * gen_unit(g) * primary;
      }
    }
  }
  p->illuminant = light("D50");
  p->target = (ef_side){
      .grid = {.count = SURFACE_SAMPLES, .start_nm = 380, .step_nm = 10},
      .sample = p->surface,
      .viewing = ef_viewing_default(p->illuminant)};
  p->match = (ef_side){
      .grid = {.count = LIGHT_SAMPLES, .start_nm = 380, .step_nm = 5},
      .sample = p->light,
      .viewing = ef_viewing_default(NULL),
      .white = p->white};
}

static pairs *pairs_new(uint64_t seed) {
  gen g = gen_new(seed);
  pairs *const p = calloc(1, sizeof *p);
  assert_non_null(p);
  make_pairs(p, &g);
  return p;
}

static void pairs_free(pairs *p) {
  ef_illuminant_free(p->illuminant);
  free(p);
}

/* ---- Beside a plain loop over observers -------------------------------- */

static ef_xyz see(const ef_observer *observer, const ef_side *side,
                  const double *sample) {
  double xyz[3];
  ef_weights *const weights = ef_observer_weights(
      observer, EF_TRISTIMULUS, &side->grid, &side->viewing, NULL, NULL);
  assert_non_null(weights);
  ef_weights_apply(weights, 1, sample, 1, xyz, NULL);
  ef_weights_free(weights);
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

static ef_xyz scaled(ef_xyz xyz, double factor) {
  return (ef_xyz){factor * xyz.X, factor * xyz.Y, factor * xyz.Z};
}

/* What the header says, for one observer and one pair, step by step. */
static double difference_of_one(const ef_observer *observer,
                                const ef_side *target, const double *sample,
                                const ef_side *match, const double *shown,
                                const ef_spread_settings *settings) {
  double perfect[SURFACE_SAMPLES], matrix[9], reference[3], seen[3];
  for (size_t i = 0; i < SURFACE_SAMPLES; ++i) perfect[i] = 1;
  ef_xyz target_white = see(observer, target, perfect);
  ef_xyz match_white = see(observer, match, match->white);
  const double target_factor = 100 / target_white.Y;
  const double match_factor = 100 / match_white.Y;
  target_white = scaled(target_white, target_factor);
  match_white = scaled(match_white, match_factor);
  ef_adaptation_matrix(settings->adaptation, target_white, match_white, matrix,
                       NULL);
  const ef_xyz carried = ef_xyz_transform(
      matrix, scaled(see(observer, target, sample), target_factor));
  const ef_xyz xyz = scaled(see(observer, match, shown), match_factor);
  const ef_conditions conditions = ef_conditions_default(match_white);
  ef_metric_coordinates(settings->metric, carried, &conditions, reference);
  ef_metric_coordinates(settings->metric, xyz, &conditions, seen);
  return ef_metric_difference(settings->metric, reference, seen);
}

static void check_against_loop(const ef_spread_settings *settings) {
  enum { N = 150 };
  pairs *const p = pairs_new(31);
  ef_population *const population = make_many(N, 8);
  static double difference[N_PAIRS * N];
  ef_spread spread[N_PAIRS];
  ef_error error;
  if (ef_population_spread(population, N_PAIRS, &p->target, &p->match, settings,
                           0, spread, difference, NULL, &error) != EF_OK) {
    fail_msg("%s", error.message);
  }
  for (size_t i = 0; i < N; i += 7) {
    const ef_cone_model model = ef_population_member(population, i);
    ef_observer *const observer = ef_observer_from_model(&model, NULL);
    for (size_t k = 0; k < N_PAIRS; ++k) {
      const double expected = difference_of_one(
          observer, &p->target, p->surface + k * SURFACE_SAMPLES, &p->match,
          p->light + k * LIGHT_SAMPLES, settings);
      assert_true(expected > 1); /* colours by chance are far apart */
      assert_near_relative(difference[k * N + i], expected, 1e-11);
    }
    ef_observer_free(observer);
  }
  ef_population_free(population);
  pairs_free(p);
}

static void equals_a_loop_over_observers(void **state) {
  (void)state;
  ef_spread_settings settings = ef_spread_settings_default();
  check_against_loop(&settings);
  settings.metric = metric_of("cielab");
  settings.adaptation = EF_ADAPT_BRADFORD;
  check_against_loop(&settings);
  settings.adaptation = EF_ADAPT_NONE;
  check_against_loop(&settings);
}

/* ---- Statistics -------------------------------------------------------- */

static int ascending(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return x < y ? -1 : x > y;
}

/* Percentile by sorting, for populations of any size. */
static void statistics_are_those_of_the_differences(void **state) {
  (void)state;
  const size_t sizes[] = {1, 2, 3, 20, 21, 40, 41, 127, 128, 129, 300};
  pairs *const p = pairs_new(4);
  ef_spread_settings settings = ef_spread_settings_default();
  settings.threshold = 20;
  for (size_t s = 0; s < sizeof sizes / sizeof *sizes; ++s) {
    const size_t n = sizes[s];
    ef_population *const population = make_many(n, 5);
    double *const difference = malloc(N_PAIRS * n * sizeof *difference);
    ef_spread spread[N_PAIRS];
    assert_int_equal(ef_population_spread(population, N_PAIRS, &p->target,
                                          &p->match, &settings, 1, spread,
                                          difference, NULL, NULL),
                     EF_OK);
    for (size_t k = 0; k < N_PAIRS; ++k) {
      double *const value = difference + k * n;
      double sum = 0;
      size_t above = 0;
      for (size_t i = 0; i < n; ++i) {
        sum += value[i];
        above += value[i] > 20;
      }
      qsort(value, n, sizeof *value, ascending);
      const double place = 0.95 * (double)(n - 1);
      const size_t low = (size_t)place;
      const size_t high = low + 1 < n ? low + 1 : low;
      assert_near_relative(spread[k].mean, sum / (double)n, 1e-14);
      assert_near_relative(
          spread[k].p95,
          value[low] + (place - (double)low) * (value[high] - value[low]),
          1e-14);
      assert_near(spread[k].share_of_observers, (double)above / (double)n, 0);
    }
    free(difference);
    ef_population_free(population);
  }
  pairs_free(p);
}

/* Two observers of whom one counts twice are as three. The percentile with
 * weights is the least value that 95 % of them reach. */
static void weights_count_observers(void **state) {
  (void)state;
  enum { N = 3 };
  pairs *const p = pairs_new(6);
  const size_t once[2] = {3, 11}, twice[N] = {3, 3, 11};
  const double weight[2] = {2.0 / 3, 1.0 / 3}, heavy[2] = {0.96, 0.04};
  ef_population *const all = make_many(20, 5);
  ef_population *const two = ef_population_choose(all, 2, once, NULL);
  ef_population *const three = ef_population_choose(all, N, twice, NULL);
  ef_spread_settings settings = ef_spread_settings_default();
  ef_spread weighted[N_PAIRS], alike[N_PAIRS];
  double difference[N_PAIRS * 2];
  settings.threshold = 20;
  assert_int_equal(ef_population_spread(three, N_PAIRS, &p->target, &p->match,
                                        &settings, 1, alike, NULL, NULL, NULL),
                   EF_OK);
  settings.weight = weight;
  assert_int_equal(ef_population_spread(two, N_PAIRS, &p->target, &p->match,
                                        &settings, 1, weighted, difference,
                                        NULL, NULL),
                   EF_OK);
  for (size_t k = 0; k < N_PAIRS; ++k) {
    const double *const value = difference + 2 * k;
    assert_near_relative(weighted[k].mean, alike[k].mean, 1e-14);
    assert_near(weighted[k].share_of_observers, alike[k].share_of_observers,
                1e-15);
    assert_true(weighted[k].p95 == fmax(value[0], value[1]));
  }
  settings.weight = heavy;
  ef_population_spread(two, N_PAIRS, &p->target, &p->match, &settings, 1,
                       weighted, NULL, NULL, NULL);
  for (size_t k = 0; k < N_PAIRS; ++k) {
    assert_true(weighted[k].p95 == difference[2 * k] ||
                difference[2 * k + 1] < difference[2 * k]);
  }
  ef_population_free(three);
  ef_population_free(two);
  ef_population_free(all);
  pairs_free(p);
}

static void check_weights_refused(const pairs *p, size_t n,
                                  const double *weight, const char *message) {
  ef_population *const population = make_many(n, 5);
  ef_spread_settings settings = ef_spread_settings_default();
  ef_spread spread[N_PAIRS];
  ef_error error;
  settings.weight = weight;
  assert_int_equal(ef_population_spread(population, N_PAIRS, &p->target,
                                        &p->match, &settings, 1, spread, NULL,
                                        NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message, message);
  ef_population_free(population);
}

static void weights_are_checked(void **state) {
  (void)state;
  pairs *const p = pairs_new(6);
  const double none[2] = {1, 0}, half[2] = {0.3, 0.2};
  double *const many = calloc(1001, sizeof *many);
  check_weights_refused(p, 2, none,
                        "the weight of observer 2 is 0; it must be above 0");
  check_weights_refused(p, 2, half,
                        "the weights of the observers sum to 0.5; they must "
                        "sum to 1");
  check_weights_refused(p, 1001, many,
                        "weights for 1001 observers; at most 1000 have some");
  free(many);
  pairs_free(p);
}

/* Threads, blocks of pairs, blocks of observers and what else is asked in the
 * same call change no bit. 5000 observers x 900 pairs are more differences than
 * are kept at a time. */
static void blocks_and_threads_change_nothing(void **state) {
  (void)state;
  enum { N = 5000, PAIRS = 900, SAMPLES = 6 };
  gen g = gen_new(77);
  const ef_grid grid = {.count = SAMPLES, .start_nm = 420, .step_nm = 50};
  double *const sample = malloc(2 * PAIRS * SAMPLES * sizeof *sample);
  ef_spread *const spread = malloc(2 * PAIRS * sizeof *spread);
  ef_illuminant *const illuminant = light("A");
  ef_population *const population = make_many(N, 12);
  ef_side target = {.grid = grid, .viewing = ef_viewing_default(illuminant)};
  ef_side match = target;
  const ef_spread_settings settings = ef_spread_settings_default();
  gen_fill(&g, 2 * PAIRS * SAMPLES, 0.01, 0.99, sample);
  target.sample = sample;
  match.sample = sample + PAIRS * SAMPLES;
  ef_population_spread(population, PAIRS, &target, &match, &settings, 2, spread,
                       NULL, NULL, NULL);
  /* The last hundred pairs alone, on one thread. */
  target.sample += (PAIRS - 100) * SAMPLES;
  match.sample += (PAIRS - 100) * SAMPLES;
  ef_population_spread(population, 100, &target, &match, &settings, 1,
                       spread + PAIRS, NULL, NULL, NULL);
  assert_memory_equal(spread + PAIRS, spread + PAIRS - 100,
                      100 * sizeof *spread);
  ef_population_free(population);
  ef_illuminant_free(illuminant);
  free(spread);
  free(sample);
}

static void index_is_the_mean_of_pairs(void **state) {
  (void)state;
  const ef_spread spread[4] = {
      {1, 2.5, 0.25}, {3, 7, 0.75}, {2, 7, 0.5}, {0, 0.5, 0}};
  const ef_spread_index index = ef_spread_index_of(4, spread);
  assert_near(index.mean, 1.5, 0);
  assert_near(index.p95, 4.25, 0);
  assert_near(index.share_of_observers, 0.375, 0);
  assert_int_equal(index.worst, 1);
  const ef_spread_index none = ef_spread_index_of(0, NULL);
  assert_true(isnan(none.mean) && isnan(none.p95) && none.worst == 0);
}

/* The default threshold is the metric's JND. */
static void threshold_is_the_jnd(void **state) {
  (void)state;
  pairs *const p = pairs_new(4);
  ef_population *const population = make_many(50, 5);
  ef_spread_settings settings = ef_spread_settings_default();
  ef_spread by_default[N_PAIRS], by_number[N_PAIRS];
  assert_string_equal(ef_metric_name(settings.metric), "ciede2000");
  assert_true(settings.adaptation == EF_ADAPT_CAT16);
  ef_population_spread(population, N_PAIRS, &p->target, &p->match, &settings, 1,
                       by_default, NULL, NULL, NULL);
  settings.threshold = ef_metric_jnd(settings.metric).value;
  assert_true(settings.threshold > 0);
  ef_population_spread(population, N_PAIRS, &p->target, &p->match, &settings, 1,
                       by_number, NULL, NULL, NULL);
  assert_memory_equal(by_default, by_number, sizeof by_default);
  ef_population_free(population);
  pairs_free(p);
}

/* ---- Errors ------------------------------------------------------------ */

static void check_refused(const pairs *p, const char *message) {
  ef_population *const population = make_many(3, 5);
  const ef_spread_settings settings = ef_spread_settings_default();
  ef_spread spread[N_PAIRS];
  ef_error error = {.status = EF_OK};
  assert_int_equal(ef_population_spread(population, N_PAIRS, &p->target,
                                        &p->match, &settings, 1, spread, NULL,
                                        NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message, message);
  ef_population_free(population);
}

static void inputs_are_checked(void **state) {
  (void)state;
  pairs *const p = pairs_new(4);
  p->match.white = NULL;
  check_refused(p, "the match's side shows lights: the white they are judged "
                   "against is needed");
  p->match.white = p->white;
  p->surface[2 * SURFACE_SAMPLES + 4] = NOT_A_NUMBER;
  check_refused(p, "sample 5 of target 3 is not a finite number");
  p->surface[2 * SURFACE_SAMPLES + 4] = 0.4;
  p->light[7] = INFINITE;
  check_refused(p, "sample 8 of match 1 is not a finite number");
  p->light[7] = 0;
  p->white[LIGHT_SAMPLES - 1] = INFINITE;
  check_refused(p, "sample 81 of white 1 is not a finite number");
  for (size_t j = 0; j < LIGHT_SAMPLES; ++j) p->white[j] = 0;
  check_refused(p, "the white of the match's side is dark for observer 1");
  p->target.viewing.illuminant = NULL;
  check_refused(p, "surfaces are seen in some light: an illuminant is needed");
  p->target.grid.count = 0;
  check_refused(p, "a grid needs at least one sample");
  pairs_free(p);
}

static void count_line(void *cookie, const char *line) {
  (void)line;
  ++*(int *)cookie;
}

/* Said once a side, not for each block of observers. */
static void notes_come_once(void **state) {
  (void)state;
  pairs *const p = pairs_new(4);
  ef_population *const population = make_many(400, 5);
  const ef_spread_settings settings = ef_spread_settings_default();
  ef_spread spread[N_PAIRS];
  int n_lines = 0;
  const ef_notes notes = {count_line, &n_lines};
  p->target.grid.start_nm = 430;
  ef_population_spread(population, N_PAIRS, &p->target, &p->match, &settings, 1,
                       spread, NULL, &notes, NULL);
  assert_int_equal(n_lines, 1);
  ef_population_free(population);
  pairs_free(p);
}

/* Blocks of pairs by one crowd, whose weights are held or, as of very many
 * people, not all of them: the same digits as one call for all pairs. */
static void a_crowd_sees_the_same(void **state) {
  (void)state;
  for (size_t n_held = 0; n_held < 5; ++n_held) {
    pairs *const p = pairs_new(4);
    ef_population *const population = make_many(400, 5); /* four blocks */
    ef_spread_settings settings = ef_spread_settings_default();
    settings.threshold = 20;
    ef_spread whole[N_PAIRS], part[N_PAIRS];
    int n_lines = 0;
    const ef_notes notes = {count_line, &n_lines};
    p->target.grid.start_nm = 430; /* something to note */
    assert_int_equal(ef_population_spread(population, N_PAIRS, &p->target,
                                          &p->match, &settings, 0, whole, NULL,
                                          NULL, NULL),
                     EF_OK);
    ef_crowd *const crowd = ef_crowd_new(population, &p->target, &p->match,
                                         &settings, &notes, NULL);
    ef__crowd_hold(crowd, n_held);
    for (size_t i = 0; i < N_PAIRS; ++i) {
      assert_int_equal(
          ef_crowd_spread(crowd, 1,
                          p->target.sample + i * p->target.grid.count,
                          p->match.sample + i * p->match.grid.count, 1,
                          &part[i], NULL, NULL),
          EF_OK);
    }
    assert_memory_equal(whole, part, sizeof whole);
    assert_int_equal(n_lines, 1);
    ef_crowd_free(crowd);
    ef_population_free(population);
    pairs_free(p);
  }
  ef_crowd_free(NULL);
}

/* A fold that failed is made anew at the next call. */
static void a_crowd_goes_on_after_a_failure(void **state) {
  (void)state;
  pairs *const p = pairs_new(4);
  ef_population *const population = make_many(3, 5);
  const ef_spread_settings settings = ef_spread_settings_default();
  ef_spread spread[N_PAIRS], again[N_PAIRS];
  ef_error error;
  ef_crowd *const crowd = ef_crowd_new(population, &p->target, &p->match,
                                       &settings, NULL, NULL);
  for (size_t n = 1;; ++n) {
    fail_alloc_at(n);
    const ef_status status =
        ef_crowd_spread(crowd, N_PAIRS, p->target.sample, p->match.sample, 1,
                        spread, NULL, &error);
    fail_alloc_stop();
    if (status == EF_OK) break;
    assert_int_equal(status, EF_NO_MEMORY);
    assert_true(n < 1000);
  }
  ef_population_spread(population, N_PAIRS, &p->target, &p->match, &settings, 1,
                       again, NULL, NULL, NULL);
  assert_memory_equal(spread, again, sizeof spread);
  ((double *)p->surface)[1] = INFINITE;
  assert_int_equal(ef_crowd_spread(crowd, N_PAIRS, p->target.sample,
                                   p->match.sample, 1, spread, NULL, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "sample 2 of target 1");
  ef_crowd_free(crowd);
  ef_population_free(population);
  pairs_free(p);
}

static void spread_survives_a_lack_of_memory(void **state) {
  (void)state;
  pairs *const p = pairs_new(4);
  ef_population *const population = make_many(3, 5);
  const ef_spread_settings settings = ef_spread_settings_default();
  ef_spread spread[N_PAIRS];
  for (size_t n = 1;; ++n) {
    ef_error error;
    fail_alloc_at(n);
    const ef_status status =
        ef_population_spread(population, N_PAIRS, &p->target, &p->match,
                             &settings, 1, spread, NULL, NULL, &error);
    if (!fail_alloc_stop()) {
      assert_int_equal(status, EF_OK);
      assert_true(n > 5);
      break;
    }
    assert_int_equal(status, EF_NO_MEMORY);
    assert_int_equal(error.status, EF_NO_MEMORY);
  }
  ef_population_free(population);
  pairs_free(p);
}

/* ---- Where they see the pairs ------------------------------------------ */

/* The colours of everybody differ by what everybody sees; a crowd that was asked
 * for colours tells differences as before. */
static void colours_are_those_that_differ(void **state) {
  (void)state;
  enum { N = 150 };
  pairs *const p = pairs_new(77);
  ef_population *const population = make_many(N, 5);
  const ef_spread_settings settings = ef_spread_settings_default();
  static double difference[2][N_PAIRS * N];
  static ef_xyz seen[2][N_PAIRS * N], white[N];
  ef_spread spread[N_PAIRS];
  ef_crowd *const crowd = ef_crowd_new(population, &p->target, &p->match,
                                       &settings, NULL, NULL);
  assert_non_null(crowd);
  assert_int_equal(ef_crowd_colours(crowd, N_PAIRS, p->surface, p->light, 2,
                                    seen[0], seen[1], white, NULL),
                   EF_OK);
  for (size_t k = 0; k < 2; ++k) {
    assert_int_equal(k == 0 ? ef_crowd_spread(crowd, N_PAIRS, p->surface,
                                              p->light, 1, spread,
                                              difference[0], NULL)
                            : ef_population_spread(population, N_PAIRS,
                                                   &p->target, &p->match,
                                                   &settings, 1, spread,
                                                   difference[1], NULL, NULL),
                     EF_OK);
  }
  assert_same_bits(difference[0], difference[1], N_PAIRS * N);
  for (size_t k = 0; k < N_PAIRS; ++k) {
    for (size_t i = 0; i < N; ++i) {
      double at[2][3];
      const ef_conditions conditions = ef_conditions_default(white[i]);
      assert_near(white[i].Y, 100, 1e-10);
      for (size_t side = 0; side < 2; ++side) {
        ef_metric_coordinates(settings.metric, seen[side][k * N + i],
                              &conditions, at[side]);
      }
      assert_near_relative(ef_metric_difference(settings.metric, at[0], at[1]),
                           difference[0][k * N + i], 1e-9);
    }
  }
  p->light[3] = NOT_A_NUMBER;
  ef_error error;
  ef_crowd_colours(crowd, N_PAIRS, p->surface, p->light, 1, seen[0], seen[1],
                   white, &error);
  assert_error(&error, EF_INVALID, "is not a finite number");
  ef_crowd_free(crowd);
  ef_population_free(population);
  pairs_free(p);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(equals_a_loop_over_observers),
      cmocka_unit_test(statistics_are_those_of_the_differences),
      cmocka_unit_test(a_crowd_sees_the_same),
      cmocka_unit_test(a_crowd_goes_on_after_a_failure),
      cmocka_unit_test(weights_count_observers),
      cmocka_unit_test(weights_are_checked),
      cmocka_unit_test(blocks_and_threads_change_nothing),
      cmocka_unit_test(index_is_the_mean_of_pairs),
      cmocka_unit_test(threshold_is_the_jnd),
      cmocka_unit_test(inputs_are_checked),
      cmocka_unit_test(notes_come_once),
      cmocka_unit_test(spread_survives_a_lack_of_memory),
      cmocka_unit_test(colours_are_those_that_differ),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
