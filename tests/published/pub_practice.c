/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rules of thumb of the trade, each by simulation. All of them: common
 * practice, no source. */
#include <evenfield/panel.h>

#include "near.h"

#include "panel/panel_private.h"

enum { LEVELS = 7 };

static double draw(ef__random *random, const ef_psychometric *observer,
                   double level, size_t n) {
  return ef__draw_binomial(random, (double)n,
                           ef_psychometric_value(observer, level));
}

/* Fit to n answers at each of seven levels from -2 to 2 widths. */
static ef_fit fit_of(const ef_psychometric *observer, size_t n, uint64_t seed) {
  double level[LEVELS];
  size_t shown[LEVELS], positive[LEVELS];
  ef__random random = ef__random_stream(seed, 0);
  for (size_t i = 0; i < LEVELS; ++i) {
    level[i] = observer->location +
               observer->width * (-2 + 4 * (double)i / (LEVELS - 1));
    shown[i] = n;
    positive[i] = (size_t)draw(&random, observer, level[i], n);
  }
  const ef_responses responses = {LEVELS, level, shown, positive};
  ef_fit_settings settings = ef_fit_settings_default(observer->task);
  settings.lapse = 0;
  ef_fit fit;
  ef_error error;
  if (ef_fit_responses(&responses, &settings, &fit, &error) != EF_OK)
    fail_msg("%s", error.message);
  return fit;
}

/* "75 % is halfway between chance and perfect in 2IFC": at the fitted 75 %
 * level a simulated observer sees the difference in half of the trials, and
 * guesses right in half of the others. */
static void three_quarters_is_halfway(void **state) {
  (void)state;
  const ef_psychometric observer = {.shape = EF_SHAPE_GAUSSIAN,
                                    .axis = EF_AXIS_LINEAR,
                                    .task = EF_TASK_2IFC,
                                    .location = 4,
                                    .width = 1,
                                    .guess = 0.5};
  const ef_fit fit = fit_of(&observer, 20000, 1);
  ef__random random = ef__random_stream(1, 1);
  const size_t n = 200000;
  const double right = draw(&random, &observer, fit.threshold.value, n);
  ef_psychometric sees = observer;
  sees.guess = 0;
  const double seen = draw(&random, &sees, fit.threshold.value, n);
  printf("# common practice, no source: at the 75 %% level %.4f right, %.4f "
         "seen\n",
         right / (double)n, seen / (double)n);
  /* Four standard errors of the simulation and the fit. */
  assert_near(right / (double)n, 0.75, 0.01);
  assert_near(seen / (double)n, 0.5, 0.02);
}

/* "84 % is one standard deviation of a cumulative Gaussian": the way from the
 * 50 % to the 84 % level is the observer's standard deviation. */
static void eighty_four_is_one_deviation(void **state) {
  (void)state;
  const ef_psychometric observer = {.shape = EF_SHAPE_GAUSSIAN,
                                    .axis = EF_AXIS_LINEAR,
                                    .task = EF_TASK_GREATER_LESS,
                                    .location = 10,
                                    .width = 1.7};
  const ef_fit fit = fit_of(&observer, 20000, 2);
  const double way = ef_psychometric_level(&fit.curve, 0.84) -
                     ef_psychometric_level(&fit.curve, 0.50);
  printf("# common practice, no source: 84 %% lies %.3f above 50 %%, the "
         "standard deviation is %.1f\n",
         way, observer.width);
  assert_near_relative(way, observer.width, 0.02);
}

/* "An up-down run of some 30 trials gives a reasonable threshold where constant
 * stimuli need some 300", with a steep observer (exponent 3) whose threshold is
 * known beforehand to a factor of 2.2. What the simulation says of it: 30
 * trials up and down are right to a factor of 1.25 (one standard deviation); 30
 * at constant levels often carry no threshold and give no 95 % limits at all;
 * the run is matched by some 100; 300 are safe, are better than the run by the
 * root of ten over three, and bring the slope too. */
static void thirty_trials_up_and_down(void **state) {
  (void)state;
  ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 1);
  s.exponent = 3;
  s.uncertainty = 0.8;
  s.lowest = 0.15;
  s.highest = 6;
  s.rule.step_first = 2;
  ef_plan_row run, constant[3];
  const size_t n[3] = {30, 100, 300};
  ef_error error;
  assert_int_equal(ef_plan_simulate(&s, EF_PROCEDURE_UP_DOWN, 30, &run, &error),
                   EF_OK);
  printf(
      "# common practice, no source: a factor of exp(sd):\n"
      "# up-down   30 trials: sd %.3f, middle 95 %% %.2f to %.2f, %zu of %zu "
      "failed\n",
      run.sd_ln, run.low, run.high, run.n_failed, run.n_experiments);
  for (size_t i = 0; i < 3; ++i) {
    assert_int_equal(
        ef_plan_simulate(&s, EF_PROCEDURE_CONSTANT, n[i], &constant[i], &error),
        EF_OK);
    printf("# constant %3zu trials: sd %.3f, middle 95 %% %.2f to %.2f, %zu of "
           "%zu failed\n",
           n[i], constant[i].sd_ln, constant[i].low, constant[i].high,
           constant[i].n_failed, constant[i].n_experiments);
  }
  assert_true(run.sd_ln < log(1.3) && isfinite(run.high));
  assert_near(run.median, 1, 0.1);
  assert_true(constant[0].sd_ln > 1.5 * run.sd_ln);
  assert_true(isinf(constant[0].high));
  assert_near(constant[1].sd_ln, run.sd_ln, 0.3 * run.sd_ln);
  assert_true(constant[2].sd_ln < run.sd_ln && isfinite(constant[2].high));
}

/* One run of 30 trials; the first `n_lapses` answers are wrong whatever is
 * shown. ln of estimate over truth. */
static double off_by(bool is_plain, size_t n_lapses, uint64_t index) {
  const ef_psychometric observer = {.shape = EF_SHAPE_DETECTION,
                                    .axis = EF_AXIS_LOG,
                                    .task = EF_TASK_2IFC,
                                    .location = 0,
                                    .width = 1 / (3 * log(10)),
                                    .guess = 0.5};
  ef_up_down rule = ef_up_down_default();
  if (is_plain) {
    rule.step_first = rule.step_up;
    rule.n_turns_left_out = 0;
  }
  ef__run run = ef__run_begin(&rule, 2);
  ef__random random = ef__random_stream(4, index);
  for (size_t i = 0; i < 30; ++i) {
    const double p = ef_psychometric_value(&observer, exp(run.t));
    const bool is_right = ef__random_unit(&random) < p;
    ef__run_answer(&run, is_right && i >= n_lapses);
  }
  return log(ef__run_estimate(&run) /
             ef_psychometric_level(&observer, ef_up_down_target(&rule)));
}

typedef struct scatter {
  double bias, sd, share_ended;
} scatter;

/* Of the mean of `n_runs` runs, the first of them with lapses; runs with too
 * few turns are left out. */
static scatter scatter_of(bool is_plain, size_t n_lapses, size_t n_runs) {
  enum { TIMES = 1000 };
  double sum = 0, square = 0, n = 0;
  for (size_t i = 0; i < TIMES; ++i) {
    double mean = 0, n_ended = 0;
    for (size_t k = 0; k < n_runs; ++k) {
      const double off =
          off_by(is_plain, k == 0 ? n_lapses : 0, i * n_runs + k);
      if (isnan(off))
        continue;
      mean += off;
      n_ended++;
    }
    if (n_ended == 0)
      continue;
    mean /= n_ended;
    sum += mean;
    square += mean * mean;
    n++;
  }
  const double bias = sum / n;
  return (scatter){bias, sqrt(square / n - bias * bias), n / TIMES};
}

static scatter print_scatter(const char *what, bool is_plain, size_t n_lapses,
                             size_t n_runs) {
  const scatter s = scatter_of(is_plain, n_lapses, n_runs);
  printf("# %-46s bias %6.3f  sd %.3f  %.1f %% ended\n", what, s.bias, s.sd,
         100 * s.share_ended);
  return s;
}

/* "Early lapses throw an up-down run off, and averaging several runs helps": of
 * a run that counts all turns, three wrong answers at the start shift the
 * estimate by a third. With three sound runs beside it the mean is shifted by a
 * quarter of that and has half the spread. Larger steps at first, and those
 * turns left out, leave less of the shift for a wider spread. */
static void early_lapses(void **state) {
  (void)state;
  puts("# common practice, no source: ln of estimate over truth, 30 trials");
  const scatter none = print_scatter("all turns, no lapse", true, 0, 1);
  const scatter off = print_scatter("all turns, three lapses", true, 3, 1);
  const scatter four =
      print_scatter("mean of it and three without", true, 3, 4);
  print_scatter("first turns left out, no lapse", false, 0, 1);
  const scatter fast =
      print_scatter("first turns left out, three lapses", false, 3, 1);
  assert_true(off.bias > none.bias + 0.15);
  assert_near(four.bias, 0.25 * off.bias, 0.03);
  assert_near(four.sd, 0.5 * none.sd, 0.1 * none.sd);
  assert_true(fabs(fast.bias) < 0.5 * fabs(off.bias));
}

/* Weber's law (E. H. Weber 1834): an observer whose standard deviation is a
 * constant share of the base level has a JND proportional to the base; found at
 * each base by its own experiment, on a linear axis. */
static void webers_law(void **state) {
  (void)state;
  const double fraction = 0.08;
  for (double base = 0.5; base < 600; base *= 4) {
    const ef_psychometric observer = {.shape = EF_SHAPE_GAUSSIAN,
                                      .axis = EF_AXIS_LINEAR,
                                      .task = EF_TASK_GREATER_LESS,
                                      .location = base,
                                      .width = fraction * base};
    const ef_fit fit = fit_of(&observer, 2000, (uint64_t)(base * 2));
    const double expected = 0.67448975019608174 * fraction;
    printf("# base %6.1f: JND / base %.5f +- %.5f, expected %.5f\n", base,
           fit.jnd.value / base, fit.jnd.se / base, expected);
    assert_near(fit.jnd.value / base, expected, 4 * fit.jnd.se / base);
    assert_true(fit.jnd.se < 0.03 * fit.jnd.value);
    assert_near(fit.equality.value, base, 4 * fit.equality.se);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(three_quarters_is_halfway),
      cmocka_unit_test(eighty_four_is_one_deviation),
      cmocka_unit_test(thirty_trials_up_and_down),
      cmocka_unit_test(early_lapses),
      cmocka_unit_test(webers_law),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
