/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The panel's JND in a formula, and how well formulas order its pairs. */
#include <evenfield/difference.h>
#include <evenfield/panel.h>

#include "fail_alloc.h"
#include "near.h"

#include "panel/panel_private.h"

/* ---- STRESS -------------------------------------------------------------- */

/* By hand: E = 1, 2, 3 and V = 1, 1, 2: sum E^2 = 14, sum E V = 9, f = 14/9,
 * residuals -5/9, 4/9, -1/9: sum of squares 42/81; f^2 sum V^2 = 196/81 x 6. */
static void stress_by_hand(void **state) {
  (void)state;
  const double computed[] = {1, 2, 3}, seen[] = {1, 1, 2};
  double stress;
  ef_error error;
  assert_int_equal(ef_stress(3, computed, seen, &stress, &error), EF_OK);
  assert_near(stress, 100 * sqrt(42.0 / (196 * 6)), 1e-12);
  /* Neither scale matters; proportional ones have none. */
  const double scaled[] = {7, 14, 21};
  double same;
  assert_int_equal(ef_stress(3, scaled, seen, &same, &error), EF_OK);
  assert_near(same, stress, 1e-12);
  assert_int_equal(ef_stress(3, scaled, computed, &same, &error), EF_OK);
  assert_near(same, 0, 1e-12);
}

static void stress_refused(void **state) {
  (void)state;
  const double some[] = {1, 2}, none[] = {0, 0}, broken[] = {1, NOT_A_NUMBER};
  double stress;
  ef_error error;
  assert_int_equal(ef_stress(1, some, some, &stress, &error), EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "STRESS of 1 pair: expected at least two, with "
                      "differences above 0 on both sides");
  assert_int_equal(ef_stress(2, some, none, &stress, &error), EF_NO_ANSWER);
  assert_int_equal(ef_stress(2, broken, some, &stress, &error), EF_MALFORMED);
  assert_string_equal(error.message, "pair 2 has no difference");
}

/* F(0.975; 30, 30) = 2.0739 (tables). */
static void f_test(void **state) {
  (void)state;
  double f, p;
  ef_stress_compare(31, sqrt(2.0739) * 20, 20, &f, &p);
  assert_near(f, 2.0739, 1e-12);
  assert_near(p, 0.05, 1e-4);
  ef_stress_compare(31, 20, sqrt(2.0739) * 20, &f, &p);
  assert_near(p, 0.05, 1e-4);
  ef_stress_compare(31, 20, 20, &f, &p);
  assert_near(f, 1, 0);
  assert_near(p, 1, 1e-12);
  ef_stress_compare(31, 0, 0, &f, &p);
  assert_near(p, 1, 1e-12);
}

/* ---- Calibration --------------------------------------------------------- */

enum { PEOPLE = 12, PAIRS = 8, ROWS = PEOPLE * (PAIRS + 1) };

/* Answers of people whose JNDs are log-normal about `jnd` with `spread`; row
 * PAIRS of each is a pair without difference. */
typedef struct panel {
  double difference[ROWS];
  size_t observer[ROWS], shown[ROWS], positive[ROWS];
} panel;

static const double pair[PAIRS + 1] = {0.4, 0.7, 1, 1.4, 2, 2.8, 4, 5.5, 0};

static void ask_panel(ef_task task, double jnd, double spread, size_t each,
                      uint64_t seed, panel *out) {
  for (size_t i = 0; i < PEOPLE; ++i) {
    ef__random random = ef__random_stream(seed, i);
    const double own = jnd * exp(spread * ef__random_normal(&random));
    const double chance = ef_task_chance(task);
    ef_psychometric c = {.shape = EF_SHAPE_DETECTION,
                         .axis = EF_AXIS_LOG,
                         .task = task,
                         .width = 1 / log(10), /* exponent 1 */
                         .guess = isnan(chance) ? 0.12 : chance,
                         .lapse = 0.01};
    c.location = log10(own / EF_JND_D_PRIME);
    for (size_t k = 0; k <= PAIRS; ++k) {
      const size_t row = i * (PAIRS + 1) + k;
      out->difference[row] = pair[k];
      out->observer[row] = i;
      out->shown[row] = each;
      out->positive[row] = (size_t)ef__draw_binomial(
          &random, (double)each, ef_psychometric_value(&c, pair[k]));
    }
  }
}

static ef_status calibrate(const panel *p, size_t n_rows,
                           const ef_calibration_settings *s,
                           ef_calibration *out, ef_observer_jnd *each,
                           ef_error *error) {
  return ef_calibrate(n_rows, p->difference, p->observer, p->shown, p->positive,
                      PEOPLE, s, out, each, error);
}

/* The interval of the JND and of the spread hold the truth, task by task, in as
 * many of 40 panels as 95 % intervals should: 33 and more (34 would be missed
 * once in 50). */
static void jnd_of_a_panel(void **state) {
  (void)state;
  const ef_task task[] = {EF_TASK_2IFC, EF_TASK_SAME_DIFFERENT,
                          EF_TASK_TRIANGLE, EF_TASK_YES_NO};
  for (size_t t = 0; t < 4; ++t) {
    size_t n_held = 0, n_spread = 0;
    for (uint64_t i = 0; i < 40; ++i) {
      panel p;
      ask_panel(task[t], 1.3, 0.35, 40, 100 + i, &p);
      ef_calibration_settings s = ef_calibration_settings_default(task[t]);
      s.intervals.n_samples = 0;
      ef_calibration out;
      ef_observer_jnd each[PEOPLE];
      ef_error error;
      if (calibrate(&p, ROWS, &s, &out, each, &error) != EF_OK)
        fail_msg("%s", error.message);
      assert_false(out.is_pooled);
      assert_near(out.exponent, 1, 1e-12);
      n_held += out.jnd.low <= 1.3 && 1.3 <= out.jnd.high;
      n_spread += out.group.spread.low <= 0.35 && 0.35 <= out.group.spread.high;
    }
    printf("# %s: JND held in %zu of 40 panels, spread in %zu\n",
           ef_task_name(task[t]), n_held, n_spread);
    assert_true(n_held >= 33 && n_spread >= 33);
  }
}

/* The exponent is found when it is asked for. */
static void exponent_estimated(void **state) {
  (void)state;
  panel p;
  ask_panel(EF_TASK_2IFC, 1.3, 0, 400, 7, &p);
  ef_calibration_settings s = ef_calibration_settings_default(EF_TASK_2IFC);
  s.exponent = NOT_A_NUMBER;
  s.intervals.n_samples = 0;
  ef_calibration out;
  ef_observer_jnd each[PEOPLE];
  ef_error error;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_OK);
  assert_near(out.exponent, 1, 0.06);
  assert_near(out.pooled.jnd.value, 1.3, 0.06);
  assert_true(out.pooled.exponent.low < 1 && 1 < out.pooled.exponent.high);
}

/* Kept as a record that predictions read. */
static void record_of_a_panel(void **state) {
  (void)state;
  panel p;
  ask_panel(EF_TASK_2IFC, 1.3, 0.3, 60, 8, &p);
  ef_calibration_settings s = ef_calibration_settings_default(EF_TASK_2IFC);
  ef_calibration out;
  ef_observer_jnd each[PEOPLE];
  ef_error error;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_OK);
  ef_jnd_record record;
  ef_calibration_record(&out, "ciede2000", "an invented panel", &record);
  assert_int_equal(ef_jnd_record_check(&record, &error), EF_OK);
  assert_string_equal(record.metric, "ciede2000");
  assert_string_equal(record.source, "an invented panel");
  assert_near(record.value, out.group.mean.value, 0);
  assert_near(record.observer_log_sd, out.group.spread.value, 0);
  assert_int_equal(record.n_observers, PEOPLE);
  assert_near(ef_criterion_d_prime(&record.criterion), EF_JND_D_PRIME, 1e-15);
  /* Longer texts are cut. */
  char text[400];
  memset(text, 'x', sizeof text - 1);
  text[sizeof text - 1] = '\0';
  ef_calibration_record(&out, text, text, &record);
  assert_int_equal(strlen(record.metric), sizeof record.metric - 1);
  assert_int_equal(strlen(record.source), sizeof record.source - 1);
}

static void hear(void *cookie, const char *line) {
  char *const text = cookie;
  strncat(text, line, 4095 - strlen(text));
  strncat(text, "\n", 4095 - strlen(text));
}

/* One person: pooled, and said so. One who always sees it: left out. */
static void few_observers(void **state) {
  (void)state;
  char heard[4096] = "";
  const ef_notes notes = {hear, heard};
  panel p;
  ask_panel(EF_TASK_2IFC, 1.3, 0, 60, 9, &p);
  ef_calibration_settings s = ef_calibration_settings_default(EF_TASK_2IFC);
  s.notes = &notes;
  ef_calibration out;
  ef_observer_jnd each[PEOPLE];
  ef_error error;
  for (size_t row = PAIRS + 1; row < 2 * (PAIRS + 1); ++row)
    p.positive[row] = p.shown[row];
  assert_int_equal(calibrate(&p, 2 * (PAIRS + 1), &s, &out, each, &error),
                   EF_OK);
  assert_true(out.is_pooled);
  assert_near(out.jnd.value, out.pooled.jnd.value, 0);
  assert_int_equal(each[1].support, EF_SUPPORT_ALL_POSITIVE);
  assert_true(isnan(each[1].jnd.value));
  assert_int_equal(each[1].n_trials, 60 * (PAIRS + 1));
  assert_non_null(strstr(
      heard,
      "observer 2 has no JND: all 480 answers are \"right\": the "
      "threshold lies below the lowest level, 0.4; show lower levels\n"));
  assert_non_null(strstr(
      heard, "1 of 12 observers have a JND of their own, expected at least 3 "
             "for the panel's to be that of a group: all answers pooled, and "
             "the interval does not hold for other people\n"));
  ef_jnd_record record;
  ef_calibration_record(&out, "cielab", "test", &record);
  assert_near(record.observer_log_sd, 0, 0);
  assert_int_equal(record.n_observers, 1);
}

static void calibration_refused(void **state) {
  (void)state;
  panel p;
  ask_panel(EF_TASK_2IFC, 1.3, 0, 20, 10, &p);
  ef_calibration_settings s =
      ef_calibration_settings_default(EF_TASK_GREATER_LESS);
  ef_calibration out;
  ef_observer_jnd each[PEOPLE];
  ef_error error;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_INVALID);
  assert_string_equal(error.message,
                      "a formula's difference has no sign: greater-less "
                      "answers give no JND in it");
  s = ef_calibration_settings_default(EF_TASK_2IFC);
  s.exponent = 0;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_INVALID);
  assert_string_equal(error.message,
                      "exponent is 0, expected a number above 0");
  s = ef_calibration_settings_default(EF_TASK_2IFC);
  p.observer[4] = PEOPLE;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_INVALID);
  assert_string_equal(error.message,
                      "observer 12 of 12, expected to be counted from 0");
  assert_int_equal(error.line, 5);
  assert_string_equal(error.field, "observer");
  p.observer[4] = 0;
  p.difference[3] = -1;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_MALFORMED);
  assert_int_equal(error.line, 4);
  /* Nothing is seen. */
  p.difference[3] = 1.4;
  for (size_t i = 0; i < ROWS; ++i)
    p.positive[i] = 10;
  assert_int_equal(calibrate(&p, ROWS, &s, &out, each, &error), EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "the answers do not depend on the level");
  /* Same-different without same pairs. */
  s = ef_calibration_settings_default(EF_TASK_SAME_DIFFERENT);
  assert_int_equal(calibrate(&p, PAIRS, &s, &out, each, &error), EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "no blanks: same-different gives d' only");
}

static bool attempt(void *context) {
  ef_calibration_settings s = ef_calibration_settings_default(EF_TASK_2IFC);
  s.intervals.n_samples = 50;
  ef_calibration out;
  ef_observer_jnd each[PEOPLE];
  ef_error error;
  if (calibrate(context, ROWS, &s, &out, each, &error) == EF_OK)
    return true;
  assert_int_equal(error.status, EF_NO_MEMORY);
  return false;
}

static void without_memory(void **state) {
  (void)state;
  panel p;
  ask_panel(EF_TASK_2IFC, 1.3, 0.2, 60, 11, &p);
  assert_int_equal(fail_alloc_each(attempt, &p), 3 + 1 + 2 * PEOPLE + 2);
}

/* ---- Formulas ------------------------------------------------------------ */

enum { SHOWN_PAIRS = 30 };

/* Seen differences follow the first formula; the second has scatter of its own,
 * the third is the first in another unit. */
static void formulas(size_t each, double difference[3 * SHOWN_PAIRS],
                     size_t *shown, size_t *positive) {
  ef__random random = ef__random_stream(60, 0);
  const ef_psychometric c = {.shape = EF_SHAPE_DETECTION,
                             .axis = EF_AXIS_LOG,
                             .task = EF_TASK_2IFC,
                             .width = 1 / log(10),
                             .guess = 0.5};
  for (size_t i = 0; i < SHOWN_PAIRS; ++i) {
    const double e = 0.5 + 1.5 * ef__random_unit(&random);
    difference[i] = e;
    difference[SHOWN_PAIRS + i] = e * exp(0.5 * ef__random_normal(&random));
    difference[2 * SHOWN_PAIRS + i] = 3 * e;
    shown[i] = each;
    positive[i] = (size_t)ef__draw_binomial(&random, (double)each,
                                            ef_psychometric_value(&c, e));
  }
}

static void formulas_in_order(void **state) {
  (void)state;
  double difference[3 * SHOWN_PAIRS];
  size_t shown[SHOWN_PAIRS], positive[SHOWN_PAIRS], best;
  formulas(300, difference, shown, positive);
  ef_calibration_settings s = ef_calibration_settings_default(EF_TASK_2IFC);
  ef_formula_score score[3];
  ef_error error;
  assert_int_equal(ef_formulas_score(SHOWN_PAIRS, 3, difference, shown,
                                     positive, &s, score, &best, &error),
                   EF_OK);
  printf("# STRESS %.1f, with scatter of its own %.1f: F %.1f, p %.2g\n",
         score[0].stress, score[1].stress, score[1].f, score[1].p_value);
  assert_int_equal(best, 0);
  assert_true(score[0].stress < 15 && score[1].stress > 30);
  assert_true(score[1].p_value < 0.001);
  assert_near(score[0].p_value, 1, 1e-12);
  assert_near(score[2].stress, score[0].stress, 1e-10);
  assert_near_relative(score[2].jnd, 3 * score[0].jnd, 1e-9);
  assert_near(score[2].log_likelihood, score[0].log_likelihood, 1e-6);
  assert_true(score[1].log_likelihood < score[0].log_likelihood - 10);
  assert_near(score[0].jnd, EF_JND_D_PRIME, 0.1);
}

static void formulas_refused(void **state) {
  (void)state;
  double difference[3 * SHOWN_PAIRS];
  size_t shown[SHOWN_PAIRS], positive[SHOWN_PAIRS], best;
  formulas(20, difference, shown, positive);
  ef_calibration_settings s =
      ef_calibration_settings_default(EF_TASK_SAME_DIFFERENT);
  ef_formula_score score[3];
  ef_error error;
  assert_int_equal(ef_formulas_score(SHOWN_PAIRS, 1, difference, shown,
                                     positive, &s, score, &best, &error),
                   EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "no pair without a difference: the d' of same-different "
                      "needs its false alarms");
  s = ef_calibration_settings_default(EF_TASK_2IFC);
  positive[6] = 21;
  assert_int_equal(ef_formulas_score(SHOWN_PAIRS, 1, difference, shown,
                                     positive, &s, score, &best, &error),
                   EF_MALFORMED);
  assert_string_equal(error.message,
                      "pair 7: 21 positive answers of 20, expected at least "
                      "one answer and no more positive ones");
  assert_int_equal(error.line, 7);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(stress_by_hand),
      cmocka_unit_test(stress_refused),
      cmocka_unit_test(f_test),
      cmocka_unit_test(jnd_of_a_panel),
      cmocka_unit_test(exponent_estimated),
      cmocka_unit_test(record_of_a_panel),
      cmocka_unit_test(few_observers),
      cmocka_unit_test(calibration_refused),
      cmocka_unit_test(without_memory),
      cmocka_unit_test(formulas_in_order),
      cmocka_unit_test(formulas_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
