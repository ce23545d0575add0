/* SPDX-License-Identifier: GPL-3.0-or-later */
/* JND records, criteria by text, and predictions worked by hand. */
#include <stdlib.h>

#include <evenfield/difference.h>

#include "fail_alloc.h"
#include "heard.h"
#include "near.h"

static ef_jnd_record record_of(double value, double exponent, double spread) {
  return (ef_jnd_record){.metric = "ciede2000",
                         .value = value,
                         .criterion = {EF_TASK_2IFC, 0.75, 0, NOT_A_NUMBER},
                         .exponent = exponent,
                         .observer_log_sd = spread,
                         .low = NOT_A_NUMBER,
                         .high = NOT_A_NUMBER,
                         .source = "a panel"};
}

static ef_told_apart tell(const ef_jnd_record *jnd, double difference,
                          double measurement_sd, double batch_sd,
                          ef_propagation propagation) {
  ef_told_apart_settings settings = ef_told_apart_settings_default();
  settings.propagation = propagation;
  const ef_judged judged = {.difference = &difference,
                            .n_observers = 1,
                            .measurement_sd = &measurement_sd,
                            .batch_sd = &batch_sd};
  ef_told_apart out;
  ef_error error;
  if (ef_told_apart_batch(jnd, 1, &judged, &settings, 1, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

/* ---- Criteria ---------------------------------------------------------- */

static void criteria_by_text(void **state) {
  (void)state;
  const struct {
    const char *text;
    ef_task task;
    double d_prime, tolerance;
  } rows[] = {
      {"75%", EF_TASK_2IFC, EF_JND_D_PRIME, 1e-15},
      {"50%", EF_TASK_YES_NO, EF_JND_D_PRIME, 0},
      {"84%", EF_TASK_2IFC, 1.41421356237309505, 1e-14},
      {"d-prime:1.2", EF_TASK_2IFC, 1.2, 0},
      {"2ifc:76.02499%", EF_TASK_2IFC, 1, 1e-5}, /* dprime-correct.csv */
      {"triangle:41.8047%", EF_TASK_TRIANGLE, 1, 1e-5},
      {"2IFC:75%", EF_TASK_2IFC, EF_JND_D_PRIME, 1e-15},
      {"yes-no:50%:15.865525393145705%", EF_TASK_YES_NO, 1, 1e-14},
      /* dprime-same-different.csv, F 0.10, H 0.50 */
      {"same-different:50%:10%", EF_TASK_SAME_DIFFERENT, 2.324389, 1e-6},
  };
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    ef_criterion c;
    ef_error error;
    if (ef_criterion_find(rows[i].text, &c, &error) != EF_OK)
      fail_msg("%s", error.message);
    assert_int_equal(c.task, rows[i].task);
    assert_near(ef_criterion_d_prime(&c), rows[i].d_prime, rows[i].tolerance);
  }
}

static void no_criteria(void **state) {
  (void)state;
#define EXPECTED                                                               \
  "expected 50%, 75%, 84%, d-prime:NUMBER, or a task with its share of "       \
  "positive answers as in 2ifc:80% or yes-no:60%:20%"
#define NO_D_PRIME                                                             \
  "has no d' above 0: give a share above chance and below 100 %; yes-no and "  \
  "same-different also need the false alarms, as in yes-no:60%:20%"
  const struct {
    const char *text;
    ef_status status;
    const char *message;
  } rows[] = {
      {"80%", EF_INVALID, "'80%' is no criterion; " EXPECTED},
      {"", EF_INVALID, "'' is no criterion; " EXPECTED},
      {"2ifc", EF_INVALID, "'2ifc' is no criterion; " EXPECTED},
      {"2ifc:", EF_INVALID, "'2ifc:' is no criterion; " EXPECTED},
      {"2ifc:0.8", EF_INVALID, "'2ifc:0.8' is no criterion; " EXPECTED},
      {"2ifc:%", EF_INVALID, "'2ifc:%' is no criterion; " EXPECTED},
      {"d-prime:x", EF_INVALID, "'d-prime:x' is no criterion; " EXPECTED},
      {"yes-no:60%:20%:1%", EF_INVALID,
       "'yes-no:60%:20%:1%' is no criterion; " EXPECTED},
      {"a-task-of-a-name-that-never-ends-at-all:60%", EF_INVALID,
       "'a-task-of-a-name-that-never-ends-at-all:60%' is no "
       "criterion; " EXPECTED},
      {"triangel:60%", EF_UNKNOWN_NAME,
       "no task is called 'triangel'; near names: triangle"},
      {"d-prime:0", EF_INVALID, "the criterion 'd-prime:0' " NO_D_PRIME},
      {"2ifc:50%", EF_INVALID, "the criterion '2ifc:50%' " NO_D_PRIME},
      {"2ifc:100%", EF_INVALID, "the criterion '2ifc:100%' " NO_D_PRIME},
      {"triangle:33%", EF_INVALID, "the criterion 'triangle:33%' " NO_D_PRIME},
      {"yes-no:60%", EF_INVALID, "the criterion 'yes-no:60%' " NO_D_PRIME},
      {"yes-no:60%:60%", EF_INVALID,
       "the criterion 'yes-no:60%:60%' " NO_D_PRIME},
  };
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    ef_criterion c = {.proportion = 7};
    ef_error error;
    assert_int_equal(ef_criterion_find(rows[i].text, &c, &error),
                     rows[i].status);
    assert_string_equal(error.message, rows[i].message);
    assert_near(c.proportion, 7, 0);
  }
}

/* ---- Records ----------------------------------------------------------- */

static void default_record(void **state) {
  (void)state;
  heard h = {0};
  const ef_notes notes = heard_notes(&h);
  ef_jnd_record r;
  ef_error error;
  assert_int_equal(ef_jnd_record_default(ef_metric_find("ciede2000", NULL), &r,
                                         &notes, &error),
                   EF_OK);
  assert_int_equal(ef_jnd_record_check(&r, &error), EF_OK);
  assert_near(r.value, 0.8, 0);
  assert_near(r.exponent, 1, 0);
  assert_near(r.observer_log_sd, 0.28, 0);
  assert_near(ef_criterion_d_prime(&r.criterion), EF_JND_D_PRIME, 0);
  assert_true(isnan(r.low) && isnan(r.high));
  assert_string_equal(r.metric, "ciede2000");
  assert_string_equal(r.source,
                      "ISO/TR 28642:2016; Paravina et al., J. Esthet. Restor. "
                      "Dent. 27 Suppl. 1 (2015) S1-S9");
  assert_string_equal(
      h.text,
      "JND taken as 0.8 Delta E*00 (50 % of observers see it (50:50 "
      "perceptibility); ISO/TR 28642:2016; Paravina et al., J. Esthet. "
      "Restor. Dent. 27 Suppl. 1 (2015) S1-S9); size, gap, surround and light "
      "of the samples change it, a panel of your own gives yours\n"
      "JNDs taken to spread over observers by 28 % (median of the judgements "
      "in Berns et al., Color Res. Appl. 16 (1991) 297-316); the uncertainty "
      "of the JND itself is not published and not in the interval\n");
  assert_int_equal(
      ef_jnd_record_default(ef_metric_find("cie94", NULL), &r, NULL, &error),
      EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "no JND is published for cie94: give one, or use a "
                      "formula that has one (cielab, ciede2000, itp)");
}

/* Whichever formula has a published JND has a default record. */
static void records_of_all_formulas(void **state) {
  (void)state;
  for (size_t i = 0; i < ef_metric_count(); ++i) {
    const ef_metric *const metric = ef_metric_at(i);
    ef_jnd_record r;
    const ef_status status = ef_jnd_record_default(metric, &r, NULL, NULL);
    assert_int_equal(status, isnan(ef_metric_jnd(metric).value) ? EF_NO_ANSWER
                                                                : EF_OK);
    if (status == EF_OK)
      assert_int_equal(ef_jnd_record_check(&r, NULL), EF_OK);
  }
}

static void bad_records(void **state) {
  (void)state;
  ef_jnd_record rows[9];
  for (size_t i = 0; i < 9; ++i)
    rows[i] = record_of(0.9, 1, 0.3);
  rows[0].value = 0;
  rows[1].value = INFINITE;
  rows[2].exponent = 0.05;
  rows[3].exponent = NOT_A_NUMBER;
  rows[4].observer_log_sd = -0.1;
  rows[5].criterion.proportion = 0.5;
  rows[6].low = 1;
  rows[6].high = 1.2;
  rows[7].low = 0.8;
  rows[8].low = 0;
  rows[8].high = 1;
  static const char *const messages[] = {
      "the JND is 0, expected a number above 0",
      "the JND is inf, expected a number above 0",
      "the exponent of the JND is 0.05, expected 0.1 to 10",
      "the exponent of the JND is nan, expected 0.1 to 10",
      "the spread over observers of the JND is -0.1, expected 0 to 3",
      "the criterion of the JND has no d' above 0 (found 0): give a share "
      "above chance and below 1",
      "the interval of the JND is 1 to 1.2, expected one above 0 that holds "
      "the JND, 0.9",
      "the interval of the JND is 0.8 to nan, expected one above 0 that holds "
      "the JND, 0.9",
      "the interval of the JND is 0 to 1, expected one above 0 that holds the "
      "JND, 0.9",
  };
  for (size_t i = 0; i < 9; ++i) {
    ef_error error;
    assert_int_equal(ef_jnd_record_check(&rows[i], &error), EF_INVALID);
    assert_string_equal(error.message, messages[i]);
  }
}

static void record_at_another_criterion(void **state) {
  (void)state;
  ef_jnd_record r = record_of(0.9, 2, 0.3), to;
  r.low = 0.8;
  r.high = 1.1;
  ef_criterion at_84;
  ef_error error;
  ef_criterion_find("84%", &at_84, NULL);
  assert_int_equal(ef_jnd_record_convert(&r, &at_84, &to, &error), EF_OK);
  const double factor = sqrt(sqrt(2) / EF_JND_D_PRIME); /* exponent 2 */
  assert_near(to.value, 0.9 * factor, 1e-14);
  assert_near(to.low, 0.8 * factor, 1e-14);
  assert_near(to.high, 1.1 * factor, 1e-14);
  assert_string_equal(to.source, "a panel");
  /* What is told does not change with the criterion it is stated at. */
  const ef_told_apart a =
      tell(&r, 1.3, 0, 0, EF_PROPAGATE_FIRST_ORDER);
  const ef_told_apart b =
      tell(&to, 1.3, 0, 0, EF_PROPAGATE_FIRST_ORDER);
  assert_near(a.d_prime.value, b.d_prime.value, 1e-14);
  assert_near(a.d_prime.low, b.d_prime.low, 1e-14);
  assert_near(a.correct_triangle.high, b.correct_triangle.high, 1e-9);
  const ef_criterion chance = {EF_TASK_2IFC, 0.5, 0, NOT_A_NUMBER};
  assert_int_equal(ef_jnd_record_convert(&r, &chance, &to, &error),
                   EF_NO_ANSWER);
}

/* ---- Predictions ------------------------------------------------------- */

static void worked_by_hand(void **state) {
  (void)state;
  /* One JND is 75 % right in 2IFC for everybody when all are alike. */
  ef_jnd_record r = record_of(0.9, 1, 0);
  ef_told_apart t = tell(&r, 0.9, 0, 0, EF_PROPAGATE_MONTE_CARLO);
  assert_near(t.jnds.value, 1, 1e-15);
  assert_near(t.d_prime.value, EF_JND_D_PRIME, 1e-14);
  assert_near(t.correct_2ifc.value, 0.75, 1e-9);
  assert_near(t.share_of_observers.value, 0, 0); /* not above */
  /* Nothing is uncertain. */
  assert_true(t.d_prime.se == 0 && t.d_prime.low == t.d_prime.value &&
              t.correct_2ifc.high == t.correct_2ifc.value);
  assert_true(t.from_measurement == 0 && t.from_batch == 0 && t.from_jnd == 0);
  /* d' 1 and 2 of the published columns, d' growing with the square. */
  r = record_of(0.9, 2, 0);
  r.criterion.d_prime = 1;
  t = tell(&r, 0.9 * sqrt(2), 0, 0, EF_PROPAGATE_MONTE_CARLO);
  assert_near(t.d_prime.value, 2, 1e-14);
  assert_near(t.correct_2ifc.value, 0.921350, 5.01e-7);
  assert_near(t.correct_triangle.value, 0.604807, 5.01e-7);
  /* The largest share over the criterion k, by a search in another language. */
  assert_near(t.correct_same_different.value, 0.6796737, 5e-8);
  assert_near(t.share_of_observers.value, 1, 0);
  /* Half of the observers have a lower JND than the median; 0.56 above it in
   * logarithms is two standard deviations. */
  r = record_of(0.9, 1, 0.28);
  t = tell(&r, 0.9, 0, 0, EF_PROPAGATE_MONTE_CARLO);
  assert_near(t.share_of_observers.value, 0.5, 1e-15);
  t = tell(&r, 0.9 * exp(0.56), 0, 0, EF_PROPAGATE_MONTE_CARLO);
  assert_near(t.share_of_observers.value, 0.97724986805182079, 1e-13);
}

static void nothing_to_see(void **state) {
  (void)state;
  const ef_jnd_record r = record_of(0.9, 1.4, 0.3);
  for (int p = 0; p < 2; ++p) {
    const ef_told_apart t = tell(&r, 0, 0, 0, (ef_propagation)p);
    assert_true(t.jnds.value == 0 && t.d_prime.value == 0 &&
                t.d_prime.high == 0);
    assert_true(t.correct_2ifc.value == 0.5 && t.correct_2ifc.high == 0.5);
    assert_true(t.correct_same_different.value == 0.5);
    assert_near(t.correct_triangle.value, 1.0 / 3, 0);
    assert_true(t.share_of_observers.value == 0);
    const ef_told_apart none =
        tell(&r, NOT_A_NUMBER, 0.1, 0.1, (ef_propagation)p);
    assert_true(isnan(none.jnds.value) && isnan(none.d_prime.low) &&
                isnan(none.correct_2ifc.high) &&
                isnan(none.share_of_observers.value));
  }
  /* Uncertain whether there is a difference: first order has no answer. */
  ef_told_apart t = tell(&r, 0, 0.3, 0, EF_PROPAGATE_MONTE_CARLO);
  assert_true(t.jnds.low == 0 && t.jnds.high > 0.5 && t.jnds.high < 0.8);
  assert_near(t.from_measurement, 1, 0);
  t = tell(&r, 0, 0.3, 0.4, EF_PROPAGATE_FIRST_ORDER);
  assert_true(t.correct_2ifc.value == 0.5 && isnan(t.correct_2ifc.high) &&
              isnan(t.jnds.se) && isnan(t.share_of_observers.low));
  assert_near(t.from_batch, 0.64, 1e-15);
  assert_near(t.from_measurement, 0.36, 1e-15);
}

/* Certain to be seen: the interval closes at 1, without a slope. */
static void everything_is_seen(void **state) {
  (void)state;
  ef_jnd_record r = record_of(0.01, 2, 0.1);
  r.low = 0.009;
  r.high = 0.011;
  for (int p = 0; p < 2; ++p) {
    const ef_told_apart t = tell(&r, 5, 0.5, 0, (ef_propagation)p);
    assert_near(t.correct_2ifc.value, 1, 0);
    assert_near(t.correct_2ifc.low, 1, 0);
    assert_near(t.correct_triangle.high, 1, 0);
    assert_near(t.share_of_observers.low, 1, 1e-15);
    assert_true(t.d_prime.low < t.d_prime.value);
  }
}

static void bad_pairs(void **state) {
  (void)state;
  const ef_jnd_record r = record_of(0.9, 1, 0.3);
  const double good[] = {1, 2, 3, 4}, negative[] = {1, 2, -3, 4};
  const double infinite[] = {0.1, INFINITE, 0, 0};
  ef_told_apart_settings settings = ef_told_apart_settings_default();
  ef_told_apart out[4];
  ef_error error;
  const struct {
    ef_judged judged;
    size_t n;
    const char *message;
  } rows[] = {
      {{negative, 1, NULL, NULL}, 4,
       "the difference of pair 3 is -3, expected a number from 0"},
      {{negative, 2, NULL, NULL}, 2,
       "the difference of pair 2 is -3, expected a number from 0"},
      {{infinite, 1, NULL, NULL}, 4,
       "the difference of pair 2 is inf, expected a number from 0"},
      {{good, 1, infinite, NULL}, 4,
       "the measurement uncertainty of pair 2 is inf, expected a number from "
       "0"},
      {{good, 1, NULL, negative}, 4,
       "the batch spread of pair 3 is -3, expected a number from 0"},
      {{good, 0, NULL, NULL}, 4, "no observer to tell the pairs apart"},
  };
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    assert_int_equal(ef_told_apart_batch(&r, rows[i].n, &rows[i].judged,
                                         &settings, 1, out, &error),
                     EF_INVALID);
    assert_string_equal(error.message, rows[i].message);
  }
  const ef_judged judged = {good, 1, NULL, NULL};
  settings.n_draws = 99;
  assert_int_equal(
      ef_told_apart_batch(&r, 4, &judged, &settings, 1, out, &error),
      EF_INVALID);
  assert_string_equal(error.message, "99 draws, expected 100 to 10000000");
  settings.propagation = EF_PROPAGATE_FIRST_ORDER; /* draws none */
  assert_int_equal(
      ef_told_apart_batch(&r, 4, &judged, &settings, 1, out, &error), EF_OK);
  ef_jnd_record bad = r;
  bad.value = -1;
  assert_int_equal(
      ef_told_apart_batch(&bad, 4, &judged, &settings, 1, out, &error),
      EF_INVALID);
  assert_string_equal(error.message,
                      "the JND is -1, expected a number above 0");
}

static bool attempt(void *context) {
  (void)context;
  const ef_jnd_record r = record_of(0.9, 1, 0.3);
  const double difference[2] = {1, 2}, sd[2] = {0.1, 0.1};
  const ef_judged judged = {difference, 1, sd, NULL};
  ef_told_apart_settings settings = ef_told_apart_settings_default();
  settings.n_draws = 100;
  ef_told_apart out[2];
  ef_error error = {0};
  const ef_status status =
      ef_told_apart_batch(&r, 2, &judged, &settings, 1, out, &error);
  assert_true(status == EF_OK || error.status == EF_NO_MEMORY);
  return status == EF_OK;
}

static void without_memory(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(attempt, NULL), 7);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(criteria_by_text),
      cmocka_unit_test(no_criteria),
      cmocka_unit_test(default_record),
      cmocka_unit_test(records_of_all_formulas),
      cmocka_unit_test(bad_records),
      cmocka_unit_test(record_at_another_criterion),
      cmocka_unit_test(worked_by_hand),
      cmocka_unit_test(nothing_to_see),
      cmocka_unit_test(everything_is_seen),
      cmocka_unit_test(bad_pairs),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
