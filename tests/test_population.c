/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include <evenfield/observer.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

enum { N_PARAMETERS = 8 };

static ef_population *make(const ef_population_settings *settings) {
  ef_error error;
  ef_population *const population = ef_population_new(settings, &error);
  if (population == NULL) fail_msg("%s", error.message);
  return population;
}

static ef_population *make_many(size_t count, uint64_t seed) {
  ef_population_settings settings = ef_population_settings_default();
  settings.count = count;
  settings.seed = seed;
  return make(&settings);
}

static void list_parameters(const ef_cone_model *model,
                            double value[N_PARAMETERS]) {
  value[0] = model->lens_percent;
  value[1] = model->macular_percent;
  for (size_t c = 0; c < 3; ++c) {
    value[2 + c] = model->density_percent[c];
    value[5 + c] = model->shift_nm[c];
  }
}

/* ---- Draws ------------------------------------------------------------- */

/* The published inputs come back from 20 000 draws: standard deviations within
 * four standard errors (sd / sqrt(2 n), 2 % in all), means within four of
 * theirs. That the macular pigment stops at nothing takes 0.3 % from its sd and
 * moves its mean by 0.1 % of it (a normal distribution held at -2.74). */
static void sample_deviations_are_the_published(void **state) {
  (void)state;
  enum { N = 20000 };
  ef_population *const population = make_many(N, 7);
  const ef_cone_model published = ef_population_deviations();
  double sd[N_PARAMETERS], sum[N_PARAMETERS] = {0}, square[N_PARAMETERS] = {0};
  double product = 0;
  list_parameters(&published, sd);
  for (size_t i = 0; i < N; ++i) {
    const ef_cone_model member = ef_population_member(population, i);
    double value[N_PARAMETERS];
    list_parameters(&member, value);
    product += value[0] * value[2];
    for (size_t k = 0; k < N_PARAMETERS; ++k) {
      sum[k] += value[k];
      square[k] += value[k] * value[k];
    }
  }
  static const char *const names[N_PARAMETERS] = {
      "lens %", "macular %", "L %", "M %", "S %", "L nm", "M nm", "S nm"};
  for (size_t k = 0; k < N_PARAMETERS; ++k) {
    const double mean = sum[k] / N;
    const double found = sqrt(square[k] / N - mean * mean);
    printf("# %s: sd %.4f, published %.1f, mean %+.4f\n", names[k], found,
           sd[k], mean);
    assert_near(mean, 0, 4 * sd[k] / sqrt(N) + (k == 1 ? 0.001 * sd[k] : 0));
    assert_near_relative(found, sd[k], 4 / sqrt(2 * N) + (k == 1 ? 0.003 : 0));
  }
  /* Independent: a correlation of two of them is chance. */
  assert_near(product / N / (sd[0] * sd[2]), 0, 4 / sqrt(N));
  ef_population_free(population);
}

static void published_deviations(void **state) {
  (void)state;
  const double published[N_PARAMETERS] = {18.7, 36.5, 9.0, 9.0, 7.4,
                                          2.0,  1.5,  1.3};
  double own[N_PARAMETERS];
  const ef_cone_model sd = ef_population_deviations();
  list_parameters(&sd, own);
  assert_same_bits(own, published, N_PARAMETERS);
}

static void ages_are_spread_evenly(void **state) {
  (void)state;
  enum { N = 20000 };
  ef_population_settings settings = ef_population_settings_default();
  settings.count = N;
  settings.age_min_years = 25;
  settings.age_max_years = 65;
  ef_population *const population = make(&settings);
  size_t decade[4] = {0};
  for (size_t i = 0; i < N; ++i) {
    const double age_years = ef_population_member(population, i).age_years;
    assert_true(age_years >= 25 && age_years <= 65);
    ++decade[(size_t)((age_years - 25) / 10.0000001)];
  }
  for (size_t k = 0; k < 4; ++k) {
    assert_near((double)decade[k] / N, 0.25, 4 * sqrt(0.25 * 0.75 / N));
  }
  ef_population_free(population);
}

static void ages_follow_a_table(void **state) {
  (void)state;
  enum { N = 20000 };
  const double age_years[4] = {22, 45, 50, 80};
  const double share[4] = {0.2, 0.45, 0, 0.35};
  ef_population_settings settings = ef_population_settings_default();
  settings.count = N;
  settings.n_ages = 4;
  settings.age_years = age_years;
  settings.share = share;
  ef_population *const population = make(&settings);
  size_t n[4] = {0};
  for (size_t i = 0; i < N; ++i) {
    size_t row = 0;
    const double age = ef_population_member(population, i).age_years;
    while (age != age_years[row]) assert_true(++row < 4);
    ++n[row];
  }
  for (size_t k = 0; k < 4; ++k) {
    assert_near((double)n[k] / N, share[k],
                4 * sqrt(share[k] * (1 - share[k]) / N));
  }
  assert_int_equal(n[2], 0);
  ef_population_free(population);
}

/* A member depends on seed and index alone. */
static void members_do_not_depend_on_the_rest(void **state) {
  (void)state;
  ef_population *const few = make_many(10, 3), *const many = make_many(5000, 3);
  ef_population *const other = make_many(10, 4);
  for (size_t i = 10; i-- > 0;) {
    const ef_cone_model a = ef_population_member(few, i);
    const ef_cone_model b = ef_population_member(many, i);
    const ef_cone_model c = ef_population_member(other, i);
    assert_memory_equal(&a, &b, sizeof a);
    assert_true(a.lens_percent != c.lens_percent);
  }
  ef_population_free(few);
  ef_population_free(many);
  ef_population_free(other);
}

/* What individuals depart from is added to each. */
static void mean_is_added(void **state) {
  (void)state;
  ef_population_settings settings = ef_population_settings_default();
  ef_population *const plain = make(&settings);
  settings.mean.field_deg = 10;
  settings.mean.deficiency = EF_DEUTERANOPE;
  settings.mean.lens_percent = 5;
  settings.mean.shift_nm[0] = -12;
  settings.deviation_scale = 0.5;
  ef_population *const shifted = make(&settings);
  assert_true(ef_population_field_deg(shifted) == 10);
  assert_true(ef_population_field_deg(plain) == 2);
  for (size_t i = 0; i < 50; ++i) {
    const ef_cone_model a = ef_population_member(plain, i);
    const ef_cone_model b = ef_population_member(shifted, i);
    assert_true(b.age_years == a.age_years);
    assert_true(b.field_deg == 10 && b.deficiency == EF_DEUTERANOPE);
    assert_near(b.lens_percent, 5 + a.lens_percent / 2, 1e-12);
    assert_near(b.shift_nm[0], -12 + a.shift_nm[0] / 2, 1e-12);
  }
  ef_population_free(plain);
  ef_population_free(shifted);
}

/* No density below nothing, however far deviations are stretched. */
static void members_stay_within_the_model(void **state) {
  (void)state;
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 20000;
  settings.deviation_scale = 3;
  settings.mean.shift_nm[1] = 38;
  ef_population *const population = make(&settings);
  size_t n_without = 0;
  for (size_t i = 0; i < settings.count; ++i) {
    const ef_cone_model member = ef_population_member(population, i);
    assert_int_equal(ef_cone_model_check(&member, NULL), EF_OK);
    n_without += member.macular_percent == -100;
  }
  assert_true(n_without > 0);
  ef_population_free(population);
}

/* ---- Weights ----------------------------------------------------------- */

static ef_illuminant *light(const char *name) {
  ef_error error;
  ef_illuminant *const illuminant = ef_illuminant_new(name, &error);
  if (illuminant == NULL) fail_msg("%s", error.message);
  return illuminant;
}

static ef_weights *weigh(const ef_population *population, size_t first,
                         size_t count, const ef_grid *samples,
                         const ef_viewing *viewing, int jobs) {
  ef_error error;
  ef_weights *const weights = ef_population_weights(
      population, first, count, samples, viewing, jobs, NULL, &error);
  if (weights == NULL) fail_msg("%s", error.message);
  return weights;
}

/* Everybody without deviations at one age is the observer of the model, to the
 * bit, for surfaces, lights and lights in cd/m2, trichromats and others. */
static void no_deviation_is_the_mean_observer(void **state) {
  (void)state;
  const char *const names[] = {"model:age=32,field=2", "model:age=61,field=7",
                               "tritanope:age=40,field=10"};
  const ef_cone_model means[] = {
      {.age_years = 32, .field_deg = 2},
      {.age_years = 61, .field_deg = 7},
      {.age_years = 40, .field_deg = 10, .deficiency = EF_TRITANOPE}};
  const ef_grid samples = {.count = 36, .start_nm = 380, .step_nm = 10};
  ef_illuminant *const illuminant = light("FL11");
  ef_viewing viewing[3] = {ef_viewing_default(illuminant),
                           ef_viewing_default(NULL), ef_viewing_default(NULL)};
  viewing[2].absolute = true;
  for (size_t k = 0; k < 3; ++k) {
    ef_population_settings settings = ef_population_settings_default();
    settings.count = 3;
    settings.mean = means[k];
    settings.deviation_scale = 0;
    settings.age_min_years = settings.age_max_years = means[k].age_years;
    ef_population *const population = make(&settings);
    ef_observer *const observer = ef_observer_new(names[k], NULL);
    assert_non_null(observer);
    for (size_t v = 0; v < 3; ++v) {
      ef_weights *const many =
          weigh(population, 0, 3, &samples, &viewing[v], 1);
      ef_weights *const one = ef_observer_weights(
          observer, EF_TRISTIMULUS, &samples, &viewing[v], NULL, NULL);
      assert_int_equal(ef_weights_channels(many), 9);
      for (size_t i = 0; i < 3; ++i) {
        assert_same_bits(ef_weights_matrix(many) + i * 3 * samples.count,
                         ef_weights_matrix(one), 3 * samples.count);
      }
      ef_weights_free(many);
      ef_weights_free(one);
    }
    ef_population_free(population);
    ef_observer_free(observer);
  }
  ef_illuminant_free(illuminant);
}

/* Parts, threads and counts change nothing. */
static void parts_and_threads_agree(void **state) {
  (void)state;
  const ef_grid samples = ef_grid_standard();
  const ef_viewing viewing = ef_viewing_default(NULL);
  ef_population *const population = make_many(50, 11);
  ef_population *const larger = make_many(70, 11);
  ef_weights *const whole = weigh(population, 0, 50, &samples, &viewing, 1);
  ef_weights *const threaded = weigh(population, 0, 50, &samples, &viewing, 5);
  ef_weights *const part = weigh(larger, 13, 21, &samples, &viewing, 0);
  const size_t row = 3 * samples.count;
  assert_same_bits(ef_weights_matrix(threaded), ef_weights_matrix(whole),
                   50 * row);
  assert_same_bits(ef_weights_matrix(part), ef_weights_matrix(whole) + 13 * row,
                   21 * row);
  ef_weights_free(whole);
  ef_weights_free(threaded);
  ef_weights_free(part);
  ef_population_free(population);
  ef_population_free(larger);
}

/* The perfect diffuser has Y = 100 in everybody's eyes, not one XYZ. */
static void white_is_everybodys_own(void **state) {
  (void)state;
  const ef_grid samples = {.count = 31, .start_nm = 400, .step_nm = 10};
  ef_illuminant *const illuminant = light("LED-B1");
  const ef_viewing viewing = ef_viewing_default(illuminant);
  ef_population *const population = make_many(40, 2);
  ef_weights *const weights = weigh(population, 0, 40, &samples, &viewing, 0);
  double perfect[31], xyz[120];
  for (size_t i = 0; i < 31; ++i) perfect[i] = 1;
  assert_int_equal(ef_weights_apply(weights, 1, perfect, 1, xyz, NULL), EF_OK);
  for (size_t i = 0; i < 40; ++i) {
    assert_near(xyz[3 * i + 1], 100, 1e-10);
    assert_true(xyz[3 * i] > 0 && xyz[3 * i + 2] > 0);
    if (i > 0) assert_true(xyz[3 * i] != xyz[0]);
  }
  ef_weights_free(weights);
  ef_population_free(population);
  ef_illuminant_free(illuminant);
}

static void keep_line(void *cookie, const char *line) {
  snprintf(cookie, 200, "%s", line);
}

static void missing_range_is_noted(void **state) {
  (void)state;
  const ef_grid samples = {.count = 21, .start_nm = 450, .step_nm = 10};
  const ef_viewing viewing = ef_viewing_default(NULL);
  ef_population *const population = make_many(2, 2);
  char line[200] = "";
  const ef_notes notes = {keep_line, line};
  ef_weights *const weights = ef_population_weights(
      population, 0, 2, &samples, &viewing, 1, &notes, NULL);
  assert_non_null(strstr(line, "of the weight of an individual's z_bar lies "
                               "outside the measured 450 to 650 nm"));
  ef_weights_free(weights);
  ef_population_free(population);
}

/* ---- Medoids ----------------------------------------------------------- */

static void medoids_of_two_clear_groups(void **state) {
  (void)state;
  const double age_years[2] = {20, 80}, share[2] = {0.3, 0.7};
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 400;
  settings.n_ages = 2;
  settings.age_years = age_years;
  settings.share = share;
  settings.deviation_scale = 0.1;
  ef_population *const population = make(&settings);
  size_t index[2], n_old = 0;
  double found[2];
  assert_int_equal(
      ef_population_medoids(population, 2, 9, 1, index, found, NULL), EF_OK);
  for (size_t i = 0; i < 400; ++i) {
    n_old += ef_population_member(population, i).age_years == 80;
  }
  assert_true(ef_population_member(population, index[0]).age_years == 80);
  assert_true(ef_population_member(population, index[1]).age_years == 20);
  assert_near(found[0], (double)n_old / 400, 1e-15);
  assert_near(found[1], 1 - (double)n_old / 400, 1e-15);
  ef_population_free(population);
}

/* One medoid: no member has a smaller sum of squared distances, tried for all
 * of them. */
static void one_medoid_is_the_most_central(void **state) {
  (void)state;
  enum { N = 60, SIZE = 120 };
  const ef_grid grid = {.count = 40, .start_nm = 390, .step_nm = 10};
  ef_population *const population = make_many(N, 5);
  double vector[N][SIZE];
  size_t index, best = 0;
  double least = INFINITE;
  for (size_t i = 0; i < N; ++i) {
    const ef_cone_model member = ef_population_member(population, i);
    ef_cone_model_fundamentals(&member, EF_ENERGY, &grid, vector[i], NULL);
  }
  for (size_t i = 0; i < N; ++i) {
    double sum = 0;
    for (size_t o = 0; o < N; ++o) {
      for (size_t j = 0; j < SIZE; ++j) {
        sum += (vector[i][j] - vector[o][j]) * (vector[i][j] - vector[o][j]);
      }
    }
    if (sum >= least) continue;
    least = sum;
    best = i;
  }
  assert_int_equal(
      ef_population_medoids(population, 1, 1, 0, &index, NULL, NULL), EF_OK);
  assert_int_equal(index, best);
  ef_population_free(population);
}

static void medoids_are_reproducible(void **state) {
  (void)state;
  ef_population *const population = make_many(3000, 21);
  size_t one[10], many[10];
  double share[10], sum = 0;
  ef_population_medoids(population, 10, 4, 1, one, share, NULL);
  ef_population_medoids(population, 10, 4, 7, many, NULL, NULL);
  assert_memory_equal(one, many, sizeof one);
  for (size_t i = 0; i < 10; ++i) {
    sum += share[i];
    assert_true(i == 0 || share[i] <= share[i - 1]);
    for (size_t o = 0; o < i; ++o) assert_true(one[i] != one[o]);
  }
  assert_near(sum, 1, 1e-12);
  ef_population *const chosen = ef_population_choose(population, 10, one, NULL);
  assert_int_equal(ef_population_count(chosen), 10);
  for (size_t i = 0; i < 10; ++i) {
    const ef_cone_model a = ef_population_member(population, one[i]);
    const ef_cone_model b = ef_population_member(chosen, i);
    assert_memory_equal(&a, &b, sizeof a);
  }
  ef_population_free(chosen);
  ef_population_free(population);
}

/* As many medoids as members, and members that coincide. */
static void medoids_at_the_edges(void **state) {
  (void)state;
  ef_population *const population = make_many(6, 21);
  size_t index[6];
  double share[6];
  assert_int_equal(
      ef_population_medoids(population, 6, 1, 1, index, share, NULL), EF_OK);
  for (size_t i = 0; i < 6; ++i) {
    assert_near(share[i], 1.0 / 6, 1e-15);
    assert_int_equal(index[i], i); /* equal groups: by member */
  }
  ef_population_free(population);
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 5;
  settings.deviation_scale = 0;
  settings.age_max_years = 20;
  ef_population *const same = make(&settings);
  assert_int_equal(ef_population_medoids(same, 3, 1, 1, index, share, NULL),
                   EF_OK);
  assert_near(share[0], 1, 0);
  ef_population_free(same);
}

/* ---- Errors ------------------------------------------------------------ */

static void check_refused(const ef_population_settings *settings,
                          const char *message) {
  ef_error error = {.status = EF_OK};
  assert_null(ef_population_new(settings, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_string_equal(error.message, message);
}

static void settings_are_checked(void **state) {
  (void)state;
  ef_population_settings s = ef_population_settings_default();
  s.count = 0;
  check_refused(&s, "a population of 0 observers; 1 to 1000000 are possible");
  s.count = 10000000;
  check_refused(&s, "a population of 10000000 observers; 1 to 1000000 are "
                    "possible");
  s = ef_population_settings_default();
  s.age_min_years = 10;
  check_refused(&s, "the ages go from 10 to 70 years; the observer model takes "
                    "20 to 80");
  s.age_min_years = 75;
  check_refused(&s, "the ages go from 75 down to 70 years; the lower one comes "
                    "first");
  s = ef_population_settings_default();
  s.age_max_years = NOT_A_NUMBER;
  check_refused(&s, "the ages go from 20 to nan years; the observer model "
                    "takes 20 to 80");
  s = ef_population_settings_default();
  s.deviation_scale = -1;
  check_refused(&s, "individuals deviate by -1 times the published standard "
                    "deviations; 0 to 3 are possible");
  s = ef_population_settings_default();
  s.mean.field_deg = 11;
  check_refused(&s,
                "the field is 11 degrees; the observer model takes 1 to 10");
  double age_years[3] = {25, 50, 75}, share[3] = {0.3, 0.3, 0.3};
  s = ef_population_settings_default();
  s.n_ages = 3;
  s.age_years = age_years;
  s.share = share;
  check_refused(&s, "the shares of the age table sum to 0.9; they must sum to "
                    "1");
  share[1] = -0.3;
  check_refused(&s, "row 2 of the age table has a share of -0.3; shares must "
                    "not be negative");
  age_years[2] = 90;
  share[1] = 0.4;
  check_refused(&s, "row 3 of the age table is for 90 years; the observer "
                    "model takes 20 to 80");
}

static void parts_are_checked(void **state) {
  (void)state;
  ef_population *const population = make_many(10, 1);
  const ef_grid samples = ef_grid_standard();
  ef_viewing viewing = ef_viewing_default(NULL);
  ef_error error;
  assert_null(ef_population_weights(population, 8, 3, &samples, &viewing, 1,
                                    NULL, &error));
  assert_string_equal(error.message,
                      "observers 8 to 11 are asked of a population of 10");
  assert_null(ef_population_weights(population, 0, 0, &samples, &viewing, 1,
                                    NULL, &error));
  viewing.kind = EF_SURFACE;
  assert_null(ef_population_weights(population, 0, 1, &samples, &viewing, 1,
                                    NULL, &error));
  assert_error(&error, EF_INVALID, "an illuminant is needed");
  size_t index[2] = {4, 10};
  assert_int_equal(
      ef_population_medoids(population, 11, 1, 1, index, NULL, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "11 medoids of 10 observers; 1 to 10 are possible");
  assert_null(ef_population_choose(population, 2, index, &error));
  assert_string_equal(error.message, "member 10 is chosen of a population of "
                                     "10, whose first is 0");
  assert_null(ef_population_choose(population, 0, index, &error));
  ef_population_free(population);
  ef_population *const large = make_many(100001, 1);
  assert_int_equal(ef_population_medoids(large, 2, 1, 1, index, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message, "medoids of 100001 observers; a "
                                     "population of at most 100000 will do");
  ef_population_free(large);
}

static bool make_all(void *context) {
  (void)context;
  const double age_years[1] = {30}, share[1] = {1};
  ef_population_settings settings = ef_population_settings_default();
  settings.count = 4;
  settings.mean.field_deg = 3;
  settings.mean.deficiency = EF_PROTANOPE;
  settings.n_ages = 1;
  settings.age_years = age_years;
  settings.share = share;
  const ef_grid samples = {.count = 9, .start_nm = 400, .step_nm = 40};
  const ef_viewing viewing = ef_viewing_default(NULL);
  size_t index[2];
  ef_population *const population = ef_population_new(&settings, NULL);
  if (population == NULL) return false;
  ef_weights *const weights = ef_population_weights(population, 0, 4, &samples,
                                                    &viewing, 1, NULL, NULL);
  const bool done =
      weights != NULL && ef_population_medoids(population, 2, 1, 1, index,
                                               NULL, NULL) == EF_OK;
  ef_population *const chosen =
      done ? ef_population_choose(population, 2, index, NULL) : NULL;
  const bool is_complete = chosen != NULL;
  ef_population_free(chosen);
  ef_weights_free(weights);
  ef_population_free(population);
  return is_complete;
}

static void populations_survive_a_lack_of_memory(void **state) {
  (void)state;
  assert_true(fail_alloc_each(make_all, NULL) >= 9);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(sample_deviations_are_the_published),
      cmocka_unit_test(published_deviations),
      cmocka_unit_test(ages_are_spread_evenly),
      cmocka_unit_test(ages_follow_a_table),
      cmocka_unit_test(members_do_not_depend_on_the_rest),
      cmocka_unit_test(mean_is_added),
      cmocka_unit_test(members_stay_within_the_model),
      cmocka_unit_test(no_deviation_is_the_mean_observer),
      cmocka_unit_test(parts_and_threads_agree),
      cmocka_unit_test(white_is_everybodys_own),
      cmocka_unit_test(missing_range_is_noted),
      cmocka_unit_test(medoids_of_two_clear_groups),
      cmocka_unit_test(one_medoid_is_the_most_central),
      cmocka_unit_test(medoids_are_reproducible),
      cmocka_unit_test(medoids_at_the_edges),
      cmocka_unit_test(settings_are_checked),
      cmocka_unit_test(parts_are_checked),
      cmocka_unit_test(populations_survive_a_lack_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
