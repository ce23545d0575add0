/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Plans: up-down runs step by step, simulated experiments, the search for the
 * number of trials. */
#include <evenfield/panel.h>

#include "fail_alloc.h"
#include "near.h"

#include "panel/panel_private.h"

/* ---- An up-down run by hand ---------------------------------------------- */

/* Two down, one up, by a factor of 2, no first steps, from level 16:
 * R R: 8; R R: 4; W: turn at 4, up to 8; R R: turn at 8, down to 4; R W: turn
 * at 4, up to 8; W: 16; R R: turn at 16, down to 8. Turns 4 8 4 16. */
static void run_by_hand(void **state) {
  (void)state;
  const ef_up_down rule = {2, 1, 2, 2, 2, 0};
  ef__run run = ef__run_begin(&rule, 16);
  const char *const answers = "RRRRWRRRWWRR";
  const double level[] = {16, 8, 8, 4, 8, 8, 4, 4, 8, 16, 16, 8};
  for (size_t i = 0; answers[i] != '\0'; ++i) {
    ef__run_answer(&run, answers[i] == 'R');
    assert_near_relative(exp(run.t), level[i], 1e-12);
  }
  assert_int_equal(run.n_turns, 4);
  assert_near_relative(ef__run_estimate(&run), pow(4.0 * 8 * 4 * 16, 1.0 / 4),
                       1e-12);
  /* One more turn makes five: the last is left out. */
  ef__run_answer(&run, false);
  assert_int_equal(run.n_turns, 5);
  assert_near_relative(ef__run_estimate(&run), pow(4.0 * 8 * 4 * 16, 1.0 / 4),
                       1e-12);
}

/* Steps are larger until the turns left out are over. */
static void first_steps(void **state) {
  (void)state;
  const ef_up_down rule = {1, 1, 1.1, 1.2, 3, 1};
  ef__run run = ef__run_begin(&rule, 27);
  ef__run_answer(&run, true);
  assert_near_relative(exp(run.t), 9.0, 1e-12);
  ef__run_answer(&run, false); /* the turn left out, at 9 */
  assert_near_relative(exp(run.t), 9 * 1.2, 1e-12);
  assert_true(isnan(ef__run_estimate(&run)));
  ef__run_answer(&run, true);
  ef__run_answer(&run, false);
  assert_near_relative(ef__run_estimate(&run), 9 * 1.2 / sqrt(1.1), 1e-12);
}

/* ---- Rows ---------------------------------------------------------------- */

static ef_plan_row simulate(const ef_plan_settings *s, ef_procedure procedure,
                            size_t n_trials) {
  ef_plan_row row;
  ef_error error;
  if (ef_plan_simulate(s, procedure, n_trials, &row, &error) != EF_OK)
    fail_msg("%s", error.message);
  return row;
}

static void threads_change_nothing(void **state) {
  (void)state;
  for (int procedure = 0; procedure < 3; ++procedure) {
    ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 0.9);
    s.n_experiments = 200;
    s.other_jnd = 1.5;
    s.jobs = 1;
    const ef_plan_row one = simulate(&s, (ef_procedure)procedure, 60);
    s.jobs = 3;
    const ef_plan_row three = simulate(&s, (ef_procedure)procedure, 60);
    /* Not the bytes between the members. */
    assert_int_equal(one.n_failed, three.n_failed);
    assert_same_bits(&one.median, &three.median, 6);
    s.seed = 2;
    const ef_plan_row other = simulate(&s, (ef_procedure)procedure, 60);
    assert_true(other.median != one.median);
    /* The unit of the JND does not matter. */
    s.jnd *= 1024;
    s.other_jnd *= 1024;
    const ef_plan_row scaled = simulate(&s, (ef_procedure)procedure, 60);
    assert_near_relative(scaled.median, other.median, 1e-6);
    assert_near(scaled.power, other.power, 0.0051);
  }
}

/* Sound estimates come nearer with the root of the trials, in every task. */
static void precision_grows(void **state) {
  (void)state;
  for (size_t t = 0; t < ef_task_count(); ++t) {
    ef_plan_settings s = ef_plan_settings_default((ef_task)t, 0.9);
    s.n_experiments = 400;
    const ef_plan_row few = simulate(&s, EF_PROCEDURE_CONSTANT, 700);
    const ef_plan_row many = simulate(&s, EF_PROCEDURE_CONSTANT, 2800);
    assert_int_equal(few.n_trials, 700);
    assert_near(many.median, 1, 0.06);
    assert_near(many.sd_ln, 0.5 * few.sd_ln, 0.15 * few.sd_ln);
    assert_true(few.low < few.median && few.median < few.high);
    assert_near(few.half_width, 0.5 * (few.high - few.low), 1e-12);
  }
}

/* What adaptive choice saves: less than the trials at constant levels for the
 * same precision, where little is known beforehand. */
static void adaptive_saves(void **state) {
  (void)state;
  ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 0.9);
  s.n_experiments = 300;
  s.uncertainty = 0.6;
  const ef_plan_row constant = simulate(&s, EF_PROCEDURE_CONSTANT, 100);
  const ef_plan_row adaptive = simulate(&s, EF_PROCEDURE_ADAPTIVE, 100);
  printf("# 100 trials of 2ifc: sd of ln JND %.3f constant, %.3f adaptive\n",
         constant.sd_ln, adaptive.sd_ln);
  assert_true(adaptive.sd_ln < 0.8 * constant.sd_ln);
  assert_true(constant.n_failed > 0);
  assert_int_equal(adaptive.n_failed, 0);
}

/* A JND is told from itself in 5 % of experiments, from another the better the
 * further it is and the more the trials. */
static void power(void **state) {
  (void)state;
  ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 1);
  s.n_experiments = 1000;
  assert_true(isnan(simulate(&s, EF_PROCEDURE_CONSTANT, 420).power));
  s.other_jnd = 1;
  assert_near(simulate(&s, EF_PROCEDURE_CONSTANT, 420).power, 0.05, 0.005);
  s.other_jnd = 1.3;
  const double little = simulate(&s, EF_PROCEDURE_CONSTANT, 420).power;
  s.other_jnd = 1.6;
  const double more = simulate(&s, EF_PROCEDURE_CONSTANT, 420).power;
  const double most = simulate(&s, EF_PROCEDURE_CONSTANT, 1400).power;
  assert_true(0.1 < little && little < more && more < most && most > 0.95);
}

/* ---- Search -------------------------------------------------------------- */

static void fewest_trials(void **state) {
  (void)state;
  ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 0.9);
  s.n_experiments = 400;
  ef_plan_row row;
  ef_error error;
  assert_int_equal(
      ef_plan_search(&s, EF_PROCEDURE_CONSTANT, 0.3, 5000, &row, &error),
      EF_OK);
  printf("# precision 0.3 in 2ifc: %zu trials at constant levels\n",
         row.n_trials);
  assert_true(row.half_width <= 0.3);
  assert_true(
      simulate(&s, EF_PROCEDURE_CONSTANT, row.n_trials * 3 / 4).half_width >
      0.3);
  assert_int_equal(
      ef_plan_search(&s, EF_PROCEDURE_CONSTANT, 0.1, 200, &row, &error),
      EF_NO_ANSWER);
  assert_int_equal(row.n_trials, 200);
  char expected[300];
  snprintf(expected, sizeof expected,
           "200 trials of one observer give a precision of %.2g (constant), "
           "not 0.1: allow more trials, or plan for more observers",
           row.half_width);
  assert_string_equal(error.message, expected);
  assert_int_equal(
      ef_plan_search(&s, EF_PROCEDURE_CONSTANT, 0, 200, &row, &error),
      EF_INVALID);
  assert_string_equal(error.message, "precision is 0, expected above 0");
}

/* t(0.975, 9) = 2.26216: 0.3 x 2.26216 / sqrt 10 = 0.2146 <= ln 1.25 = 0.2231,
 * and t(0.975, 8) = 2.30600: 0.3 x 2.306 / 3 = 0.2306 is not. */
static void observers_needed(void **state) {
  (void)state;
  assert_int_equal(ef_plan_observers(0.3, 0, 0.25), 10);
  assert_int_equal(ef_plan_observers(0.18, 0.24, 0.25), 10);
  assert_int_equal(ef_plan_observers(0, 0, 0.25), 2);
  assert_int_equal(ef_plan_observers(0.3, INFINITE, 0.25), 0);
  assert_true(ef_plan_observers(0.3, 0.2, 0.1) > 50);
}

/* ---- Refused ------------------------------------------------------------- */

static void assert_refused(const ef_plan_settings *s, ef_procedure procedure,
                           size_t n_trials, const char *message) {
  ef_plan_row row;
  ef_error error;
  assert_int_equal(ef_plan_simulate(s, procedure, n_trials, &row, &error),
                   EF_INVALID);
  assert_string_equal(error.message, message);
}

/* A one-sample t-test of an effect of half a standard deviation needs 34
 * observers for a power of 80 % (Cohen, Statistical Power Analysis, 2nd ed.
 * 1988, after his tables; from memory); without an effect it errs in 5 %. */
static void power_of_a_group(void **state) {
  (void)state;
  const double half = exp(0.5 * 0.3);
  assert_true(ef_plan_power(0.3, 0, 34, half) >= 0.8);
  assert_true(ef_plan_power(0.3, 0, 33, half) < 0.8);
  /* t tables: 0.807 at 34 */
  assert_near(ef_plan_power(0.3, 0, 34, half), 0.807, 2e-3);
  assert_near(ef_plan_power(0.3, 0.1, 12, 1), 0.05, 1e-4);
  assert_near(ef_plan_power(0.3, 0.1, 12, 1.2),
              ef_plan_power(0.3, 0.1, 12, 1 / 1.2), 1e-12);
  assert_true(isnan(ef_plan_power(0.3, 0.1, 1, 1.2)));
  assert_true(isnan(ef_plan_power(0.3, 0.1, 5, 0)));
}

static void levels_of_a_plan(void **state) {
  (void)state;
  double level[3];
  ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 2);
  s.lowest = 0.5;
  s.highest = 2;
  ef_plan_levels(&s, 3, level);
  assert_near(level[0], 1, 1e-15);
  assert_near(level[1], 2, 1e-15);
  assert_near(level[2], 4, 1e-15);
  s = ef_plan_settings_default(EF_TASK_GREATER_LESS, 2);
  s.equality = 10;
  ef_plan_levels(&s, 3, level);
  assert_near(level[0], 5, 1e-14);
  assert_near(level[1], 10, 1e-14);
  assert_near(level[2], 15, 1e-14);
}

static void refused(void **state) {
  (void)state;
  const ef_plan_settings good = ef_plan_settings_default(EF_TASK_2IFC, 1);
  ef_plan_settings s = good;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 13,
                 "13 trials for 7 levels, expected at least two at each");
  s.jnd = 0;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "expected JND is 0, expected a number above 0");
  s = good;
  s.axis = EF_AXIS_LINEAR;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "plans of 2ifc are made on a logarithmic axis");
  s = good;
  s.lowest = 0;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "7 levels (15 in hand) from 0 to 3 JND: expected at least "
                 "two, the lowest first and above 0");
  s = good;
  s.lapse = 0.2;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "observers with lapses 0.2 (0 to 0.06), exponent 1 (above 0), "
                 "uncertainty 0.3 (at least 0), false alarms 0.1 (between 0 "
                 "and 0.9)");
  s = good;
  s.n_experiments = 39;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "39 experiments, expected at least 40 for a middle 95 %");
  s = good;
  s.rule.n_down = 1;
  s.rule.n_up = 2;
  assert_refused(&s, EF_PROCEDURE_UP_DOWN, 100,
                 "the up-down rule rests at 0.293 right answers, expected "
                 "above chance; counts are at least 1, steps above 1");
  s = ef_plan_settings_default(EF_TASK_YES_NO, 1);
  assert_refused(&s, EF_PROCEDURE_UP_DOWN, 100,
                 "an up-down run needs answers that are right or wrong: 2ifc "
                 "or triangle, not yes-no");
  s.shape = EF_SHAPE_GAUSSIAN;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "plans of yes-no use the detection curve: other thresholds "
                 "move with the criterion");
  s = ef_plan_settings_default(EF_TASK_GREATER_LESS, 1);
  s.highest = s.lowest;
  assert_refused(&s, EF_PROCEDURE_CONSTANT, 100,
                 "7 levels (15 in hand) from -2.5 to -2.5 JND: expected at "
                 "least two, the lowest first");
}

static void names(void **state) {
  (void)state;
  assert_string_equal(ef_procedure_name(EF_PROCEDURE_CONSTANT), "constant");
  assert_string_equal(ef_procedure_name(EF_PROCEDURE_UP_DOWN), "up-down");
  assert_string_equal(ef_procedure_name(EF_PROCEDURE_ADAPTIVE), "adaptive");
  assert_string_equal(ef_procedure_name((ef_procedure)7), "unknown");
}

static bool attempt(void *context) {
  (void)context;
  ef_plan_settings s = ef_plan_settings_default(EF_TASK_2IFC, 1);
  s.n_experiments = 40;
  ef_plan_row row;
  ef_error error;
  if (ef_plan_simulate(&s, EF_PROCEDURE_ADAPTIVE, 20, &row, &error) == EF_OK)
    return true;
  assert_int_equal(error.status, EF_NO_MEMORY);
  return false;
}

static void without_memory(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(attempt, NULL), 3);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(run_by_hand),
      cmocka_unit_test(first_steps),
      cmocka_unit_test(threads_change_nothing),
      cmocka_unit_test(precision_grows),
      cmocka_unit_test(adaptive_saves),
      cmocka_unit_test(power),
      cmocka_unit_test(fewest_trials),
      cmocka_unit_test(observers_needed),
      cmocka_unit_test(power_of_a_group),
      cmocka_unit_test(levels_of_a_plan),
      cmocka_unit_test(refused),
      cmocka_unit_test(names),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
