/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Predicted answers: laws over seeded random inputs. */
#include <stdlib.h>

#include <evenfield/match.h>

#include "gen.h"
#include "near.h"

#include "difference/answers.h"

static ef_jnd_record random_record(gen *g) {
  ef_jnd_record r = {.value = exp(gen_between(g, -2, 2)),
                     .criterion = {EF_TASK_2IFC, gen_between(g, 0.55, 0.95), 0,
                                   NOT_A_NUMBER},
                     .exponent = gen_between(g, 0.5, 2.5),
                     .observer_log_sd = gen_between(g, 0, 0.8)};
  const double reach = gen_between(g, 0.02, 0.2);
  r.low = r.value * exp(-reach);
  r.high = r.value * exp(reach);
  return r;
}

static void tell(const ef_jnd_record *jnd, size_t n, const ef_judged *judged,
                 const ef_told_apart_settings *settings, int jobs,
                 ef_told_apart *out) {
  ef_error error;
  if (ef_told_apart_batch(jnd, n, judged, settings, jobs, out, &error) != EF_OK)
    fail_msg("%s", error.message);
}

static const ef_told_apart_settings first_order = {
    .propagation = EF_PROPAGATE_FIRST_ORDER};

/* ---- The curves -------------------------------------------------------- */

static double one_observer(ef__answer task, double d_prime) {
  static const ef_task tasks[] = {EF_TASK_2IFC, EF_TASK_SAME_DIFFERENT,
                                  EF_TASK_TRIANGLE};
  return ef_task_best_correct(tasks[task], d_prime);
}

/* The mean over observers by Simpson's rule in 4000 steps. */
static double mean_over(ef__answer task, double y, double spread) {
  enum { HALF = 2000 };
  double sum = 0, whole = 0;
  for (int i = -HALF; i <= HALF; ++i) {
    const double z = 9.0 * i / HALF;
    const double weight = exp(-0.5 * z * z) * (i % 2 == 0 ? 2 : 4);
    whole += weight;
    sum += weight * one_observer(task, exp(y + spread * z));
  }
  return sum / whole;
}

static void curves_are_means_over_observers(void **state) {
  (void)state;
  gen g = gen_new(91);
  double largest = 0, largest_slope = 0;
  for (int round = 0; round < 12; ++round) {
    const double spread = round == 0   ? 0
                          : round == 1 ? 25
                                       : pow(10, gen_between(&g, -3, 0.7));
    ef__answers *const answers = ef__answers_new(spread);
    assert_non_null(answers);
    for (int i = 0; i < 30; ++i) {
      const ef__answer task = (ef__answer)(i % EF__ANSWERS);
      const double y = gen_between(&g, -6 - 3 * spread, 3 + 3 * spread);
      double slope, unused;
      const double value = ef__answers_share(answers, task, y, &slope);
      const double off = value - mean_over(task, y, spread);
      largest = fmax(largest, fabs(off));
      const double h = 1e-4;
      const double numeric =
          (ef__answers_share(answers, task, y + h, &unused) -
           ef__answers_share(answers, task, y - h, &unused)) /
          (2 * h);
      largest_slope = fmax(largest_slope, fabs(slope - numeric));
      if (value < 0.999 && value > 0.51)
        assert_near(ef__answers_place(answers, task, value), y, 1e-6);
    }
    ef__answers_free(answers);
  }
  printf("# answers over observers: largest deviation %.2g, of slopes %.2g\n",
         largest, largest_slope);
  assert_true(largest < 2e-8); /* 3/128 of 64^-4 times a fourth slope of 13 */
  /* The cubics meet in kinks, a 64th of the fourth order. */
  assert_true(largest_slope < 1e-6);
}

/* ---- Predictions ------------------------------------------------------- */

static void assert_rises(const ef_estimate *low, const ef_estimate *high) {
  assert_true(high->value >= low->value && high->low >= low->low &&
              high->high >= low->high);
}

static void more_difference_is_told_more(void **state) {
  (void)state;
  enum { N = 60 };
  gen g = gen_new(92);
  for (int round = 0; round < 20; ++round) {
    const ef_jnd_record r = random_record(&g);
    double difference[N];
    ef_told_apart out[N];
    for (size_t i = 0; i < N; ++i)
      difference[i] = r.value * 0.08 * (double)i;
    const ef_judged judged = {difference, 1, NULL, NULL};
    tell(&r, N, &judged, &first_order, 0, out);
    for (size_t i = 0; i < N; ++i) {
      const ef_told_apart *const t = &out[i];
      assert_near(t->jnds.value, difference[i] / r.value, 1e-12);
      assert_near(t->d_prime.value,
                  pow(difference[i] / r.value, r.exponent) *
                      ef_criterion_d_prime(&r.criterion),
                  1e-11);
      if (r.observer_log_sd > 0)
        assert_near(t->share_of_observers.value,
                    0.5 * erfc(-log(difference[i] / r.value) /
                               r.observer_log_sd / sqrt(2)),
                    1e-12);
      const ef_estimate *const all[] = {&t->correct_2ifc,
                                        &t->correct_same_different,
                                        &t->correct_triangle,
                                        &t->share_of_observers};
      for (size_t k = 0; k < 4; ++k)
        assert_true(all[k]->low <= all[k]->value &&
                    all[k]->value <= all[k]->high && all[k]->high <= 1);
      if (i == 0)
        continue;
      assert_rises(&out[i - 1].d_prime, &t->d_prime);
      assert_rises(&out[i - 1].correct_2ifc, &t->correct_2ifc);
      assert_rises(&out[i - 1].correct_same_different,
                   &t->correct_same_different);
      assert_rises(&out[i - 1].correct_triangle, &t->correct_triangle);
      assert_rises(&out[i - 1].share_of_observers, &t->share_of_observers);
      assert_near(t->from_measurement + t->from_batch + t->from_jnd, 1, 1e-12);
    }
  }
}

/* The two ways agree where both hold: standard deviations of at most 6 % each.
 * 40 000 draws know a 2.5 % point to 1.4 % of the standard deviation and a
 * standard deviation to 0.4 %; the second order is about the square of the
 * relative uncertainty over its size, 5 %. In all a tenth of the half width. */
static void agree(const ef_estimate *drawn, const ef_estimate *by_slope,
                  double *largest) {
  const double half = 0.5 * (by_slope->high - by_slope->low);
  const double off = fmax(fabs(drawn->low - by_slope->low),
                          fabs(drawn->high - by_slope->high));
  *largest = fmax(*largest, off / half);
  assert_near(drawn->low, by_slope->low, 0.1 * half);
  assert_near(drawn->high, by_slope->high, 0.1 * half);
  assert_near_relative(drawn->se, by_slope->se, 0.05);
  assert_near(drawn->value, by_slope->value, 0);
}

static void drawing_agrees_with_slopes(void **state) {
  (void)state;
  enum { N = 8, OBSERVERS = 12 };
  gen g = gen_new(93);
  const ef_told_apart_settings draws = {.seed = 5, .n_draws = 40000};
  double largest = 0;
  for (int round = 0; round < 8; ++round) {
    ef_jnd_record r = random_record(&g);
    const size_t m = round % 2 == 0 ? 1 : OBSERVERS;
    r.observer_log_sd = gen_between(&g, 0.2, 0.6);
    const double reach = gen_between(&g, 0.02, 0.12); /* sd up to 6 % */
    r.low = r.value * exp(-reach);
    r.high = r.value * exp(reach);
    double difference[N * OBSERVERS], measurement[N], batch[N];
    for (size_t i = 0; i < N; ++i) {
      const double typical = r.value * gen_between(&g, 0.8, 1.6);
      for (size_t k = 0; k < m; ++k)
        difference[i * m + k] =
            m == 1 ? typical : typical * gen_between(&g, 0.6, 1.4);
      measurement[i] = typical * gen_between(&g, 0, 0.04);
      batch[i] = typical * gen_between(&g, 0, 0.04);
    }
    const ef_judged judged = {difference, m, measurement, batch};
    ef_told_apart drawn[N], by_slope[N];
    tell(&r, N, &judged, &draws, 0, drawn);
    tell(&r, N, &judged, &first_order, 0, by_slope);
    for (size_t i = 0; i < N; ++i) {
      agree(&drawn[i].jnds, &by_slope[i].jnds, &largest);
      agree(&drawn[i].d_prime, &by_slope[i].d_prime, &largest);
      agree(&drawn[i].correct_2ifc, &by_slope[i].correct_2ifc, &largest);
      agree(&drawn[i].correct_same_different,
            &by_slope[i].correct_same_different, &largest);
      agree(&drawn[i].correct_triangle, &by_slope[i].correct_triangle,
            &largest);
      agree(&drawn[i].share_of_observers, &by_slope[i].share_of_observers,
            &largest);
    }
  }
  printf("# ends of intervals by drawing and by slopes: at most %.1f %% of the "
         "half width apart\n",
         100 * largest);
}

/* Where the uncertainty is as large as the difference, only drawing knows that
 * differences end at 0. */
static void drawing_knows_the_floor(void **state) {
  (void)state;
  gen g = gen_new(94);
  ef_jnd_record r = random_record(&g);
  r.low = r.high = NOT_A_NUMBER;
  const double difference = r.value, sd = r.value;
  const ef_judged judged = {&difference, 1, &sd, NULL};
  const ef_told_apart_settings draws = {.seed = 5, .n_draws = 40000};
  ef_told_apart t;
  tell(&r, 1, &judged, &draws, 1, &t);
  assert_true(t.jnds.low == 0 && t.correct_2ifc.low == 0.5);
  assert_near(t.jnds.high, 1 + 1.959964, 0.05);
}

/* ---- Populations ------------------------------------------------------- */

static void populations_average(void **state) {
  (void)state;
  enum { OBSERVERS = 200 };
  gen g = gen_new(95);
  const ef_told_apart_settings draws = {.seed = 2, .n_draws = 500};
  for (int round = 0; round < 6; ++round) {
    const ef_jnd_record r = random_record(&g);
    double difference[OBSERVERS], measurement = 0.1 * r.value;
    for (size_t k = 0; k < OBSERVERS; ++k)
      difference[k] = r.value * gen_between(&g, 0, 3);
    ef_told_apart each[OBSERVERS], all, alike, single;
    const ef_judged one_by_one = {difference, 1, NULL, NULL};
    const ef_judged together = {difference, OBSERVERS, &measurement, NULL};
    tell(&r, OBSERVERS, &one_by_one, &first_order, 0, each);
    tell(&r, 1, &together, &draws, 0, &all);
    double share = 0, correct = 0;
    for (size_t k = 0; k < OBSERVERS; ++k) {
      share += each[k].share_of_observers.value / OBSERVERS;
      correct += each[k].correct_triangle.value / OBSERVERS;
    }
    assert_near(all.share_of_observers.value, share, 1e-12);
    assert_near(all.correct_triangle.value, correct, 1e-12);
    assert_true(all.share_of_observers.low < share &&
                all.share_of_observers.high > share);
    /* Many who see the same are as one. */
    for (size_t k = 0; k < OBSERVERS; ++k)
      difference[k] = difference[0];
    const ef_judged first = {difference, 1, &measurement, NULL};
    for (int p = 0; p < 2; ++p) {
      const ef_told_apart_settings *const how = p == 0 ? &draws : &first_order;
      tell(&r, 1, &together, how, 0, &alike);
      tell(&r, 1, &first, how, 0, &single);
      assert_near(alike.correct_2ifc.value, single.correct_2ifc.value, 1e-12);
      /* quantiles of outcomes, and outcomes of quantiles */
      assert_near(alike.correct_2ifc.low, single.correct_2ifc.low, 1e-3);
      assert_near(alike.share_of_observers.high,
                  single.share_of_observers.high, 2e-3);
      assert_near_relative(alike.correct_2ifc.se, single.correct_2ifc.se,
                           1e-6);
    }
  }
}

/* Without a spread of JNDs the share is that of the observers who see more than
 * the threshold: what the population's own statistics say. */
static void which_observer_alone(void **state) {
  (void)state;
  enum { PAIRS = 5, OBSERVERS = 150, SAMPLES = 41 };
  gen g = gen_new(96);
  const ef_grid grid = {.count = SAMPLES, .start_nm = 380, .step_nm = 10};
  double target[PAIRS * SAMPLES], match[PAIRS * SAMPLES];
  static double difference[PAIRS * OBSERVERS];
  for (size_t i = 0; i < PAIRS; ++i) {
    double change[SAMPLES];
    gen_smooth(&g, SAMPLES, target + i * SAMPLES);
    gen_smooth(&g, SAMPLES, change);
    for (size_t k = 0; k < SAMPLES; ++k)
      match[i * SAMPLES + k] =
          0.98 * target[i * SAMPLES + k] + 0.02 * change[k];
  }
  ef_illuminant *const d65 = ef_illuminant_new("D65", NULL);
  ef_population_settings settings = ef_population_settings_default();
  settings.count = OBSERVERS;
  ef_population *const people = ef_population_new(&settings, NULL);
  const ef_side a = {grid, target, ef_viewing_default(d65), NULL};
  const ef_side b = {grid, match, ef_viewing_default(d65), NULL};
  ef_spread_settings how = ef_spread_settings_default();
  ef_spread spread[PAIRS];
  how.threshold = 0.9;
  assert_int_equal(ef_population_spread(people, PAIRS, &a, &b, &how, 0, spread,
                                        difference, NULL, NULL),
                   EF_OK);
  ef_jnd_record r = {.value = 0.9,
                     .criterion = {EF_TASK_2IFC, 0.75, 0, NOT_A_NUMBER},
                     .exponent = 1,
                     .low = NOT_A_NUMBER,
                     .high = NOT_A_NUMBER};
  const ef_judged judged = {difference, OBSERVERS, NULL, NULL};
  ef_told_apart sharp[PAIRS], blurred[PAIRS];
  tell(&r, PAIRS, &judged, &first_order, 0, sharp);
  r.observer_log_sd = 0.28;
  tell(&r, PAIRS, &judged, &first_order, 0, blurred);
  for (size_t i = 0; i < PAIRS; ++i) {
    assert_near(sharp[i].share_of_observers.value,
                spread[i].share_of_observers, 1e-12);
    assert_near(sharp[i].jnds.value, spread[i].mean / 0.9, 1e-12);
    printf("# pair %zu: mean difference %.3f, share above by observers %.3f, "
           "with their JNDs %.3f\n",
           i, spread[i].mean, sharp[i].share_of_observers.value,
           blurred[i].share_of_observers.value);
  }
  ef_population_free(people);
  ef_illuminant_free(d65);
}

static void seeds_batches_and_threads(void **state) {
  (void)state;
  enum { N = 21, NUMBERS = sizeof(ef_told_apart) / sizeof(double) };
  gen g = gen_new(97);
  const ef_jnd_record r = random_record(&g);
  double difference[N], sd[N];
  for (size_t i = 0; i < N; ++i) {
    difference[i] = r.value * gen_between(&g, 0, 2);
    sd[i] = 0.1 * r.value;
  }
  const ef_judged judged = {difference, 1, sd, sd};
  ef_told_apart_settings settings = {.seed = 11, .n_draws = 2000};
  ef_told_apart all[N], other[N];
  tell(&r, N, &judged, &settings, 1, all);
  tell(&r, N, &judged, &settings, 3, other);
  assert_same_bits((double *)other, (double *)all, N * NUMBERS);
  for (size_t i = 0; i < N; ++i) {
    const ef_judged one = {difference + i, 1, sd + i, sd + i};
    tell(&r, 1, &one, &settings, 1, other);
    assert_same_bits((double *)other, (double *)&all[i], NUMBERS);
  }
  settings.seed = 12;
  tell(&r, N, &judged, &settings, 1, other);
  assert_true(other[0].jnds.high != all[0].jnds.high);
  assert_near_relative(other[0].jnds.high, all[0].jnds.high, 0.1);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(curves_are_means_over_observers),
      cmocka_unit_test(more_difference_is_told_more),
      cmocka_unit_test(drawing_agrees_with_slopes),
      cmocka_unit_test(drawing_knows_the_floor),
      cmocka_unit_test(populations_average),
      cmocka_unit_test(which_observer_alone),
      cmocka_unit_test(seeds_batches_and_threads),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
