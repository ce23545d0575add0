/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Psychometric fits: what is refused, with which words; what is noted; the
 * edges. That the numbers are right is in published/pub_glm.c and
 * laws/law_panel.c. */
#include <evenfield/panel.h>

#include "fail_alloc.h"
#include "near.h"

enum { MAX = 12 };

typedef struct answers {
  size_t n;
  double level[MAX];
  size_t shown[MAX], positive[MAX];
} answers;

/* What the notes sink heard, lines joined. */
typedef struct heard {
  char text[2048];
} heard;

static void hear(void *cookie, const char *line) {
  heard *const h = cookie;
  strncat(h->text, line, sizeof h->text - strlen(h->text) - 1);
  strncat(h->text, "\n", sizeof h->text - strlen(h->text) - 1);
}

static ef_status fit_answers(const answers *a, const ef_fit_settings *settings,
                             ef_fit *fit, ef_error *error) {
  const ef_responses responses = {a->n, a->level, a->shown, a->positive};
  memset(error, 0, sizeof *error);
  return ef_fit_responses(&responses, settings, fit, error);
}

static void assert_refused(const answers *a, const ef_fit_settings *settings,
                           ef_status status, const char *message) {
  ef_fit fit;
  ef_error error;
  assert_int_equal(fit_answers(a, settings, &fit, &error), status);
  assert_string_equal(error.message, message);
  assert_int_equal(error.status, status);
}

static const answers sound = {
    5, {1, 2, 3, 4, 5}, {40, 40, 40, 40, 40}, {21, 24, 31, 37, 40}};

/* ---- Malformed answers --------------------------------------------------- */

static void answers_that_cannot_be(void **state) {
  (void)state;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  ef_fit_settings s_log = s;
  s_log.axis = EF_AXIS_LOG;
  ef_fit fit;
  ef_error error;
  answers a = sound;
  a.positive[2] = 41;
  assert_refused(&a, &s, EF_MALFORMED,
                 "k is 41 and n is 40: more answers are positive than were "
                 "given");
  fit_answers(&a, &s, &fit, &error);
  assert_int_equal(error.line, 3);
  assert_string_equal(error.field, "k");
  a = sound;
  a.shown[3] = a.positive[3] = 0;
  assert_refused(&a, &s, EF_MALFORMED,
                 "n is 0: a level without answers says nothing; leave it out");
  fit_answers(&a, &s, &fit, &error);
  assert_int_equal(error.line, 4);
  assert_string_equal(error.field, "n");
  a = sound;
  a.level[0] = -1;
  assert_refused(&a, &s_log, EF_MALFORMED,
                 "level is -1, and a logarithmic axis has no place below 0: "
                 "use a linear axis, or the size of the difference");
  fit_answers(&a, &s_log, &fit, &error);
  assert_int_equal(error.line, 1);
  assert_string_equal(error.field, "level");
  assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
  a.level[4] = NOT_A_NUMBER;
  a.level[0] = INFINITE;
  assert_refused(&a, &s, EF_MALFORMED, "level is inf, expected a number");
}

/* ---- No threshold -------------------------------------------------------- */

static void no_threshold(void **state) {
  (void)state;
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  answers a = sound;
  a.n = 0;
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "0 levels: a curve needs at least two different levels");
  a.n = 1;
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "1 level: a curve needs at least two different levels");
  a.n = 3;
  a.level[0] = a.level[1] = a.level[2];
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "1 level: a curve needs at least two different levels");
  a = sound;
  a.n = 2;
  a.positive[1] = 39;
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "2 levels cannot carry 3 parameters: show more levels, or fix "
                 "the lapse rate");
  a = sound;
  for (size_t i = 0; i < a.n; ++i)
    a.positive[i] = a.shown[i];
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "all 200 answers are \"right\": the threshold lies below the "
                 "lowest level, 1; show lower levels");
  for (size_t i = 0; i < a.n; ++i)
    a.positive[i] = 0;
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "none of 200 answers is \"right\": the threshold lies above "
                 "the highest level, 5; show higher levels");
  const size_t chance[] = {21, 19, 22, 18, 21};
  memcpy(a.positive, chance, sizeof chance);
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "the answers do not depend on the level: 101 of 200 are "
                 "\"right\", and one share for all levels fits as well; show "
                 "levels on both sides of the threshold, and more trials");
  const size_t falling[] = {38, 35, 31, 24, 21};
  memcpy(a.positive, falling, sizeof falling);
  assert_refused(&a, &s, EF_NO_ANSWER,
                 "fewer answers are \"right\" at higher levels, where more are "
                 "expected: check the sign of the levels and which answer is "
                 "counted");
}

static void no_d_prime_without_blanks(void **state) {
  (void)state;
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_YES_NO);
  s.shape = EF_SHAPE_DETECTION;
  s.axis = EF_AXIS_LOG;
  assert_refused(&sound, &s, EF_NO_ANSWER,
                 "no blanks: yes-no gives d' only when the answers to level 0 "
                 "(no difference) are known; show blanks, or give the "
                 "false-alarm rate");
  s.guess = 0.3;
  ef_fit fit;
  ef_error error;
  assert_int_equal(fit_answers(&sound, &s, &fit, &error), EF_OK);
  assert_near(fit.guess.value, 0.3, 1e-15);
  assert_false(fit.guess_estimated);
}

/* ---- Settings ------------------------------------------------------------ */

static void settings_refused(void **state) {
  (void)state;
  const ef_fit_settings good = ef_fit_settings_default(EF_TASK_2IFC);
  ef_fit_settings s = good;
  s.lapse = 0.5;
  assert_refused(&sound, &s, EF_INVALID,
                 "lapse rate is 0.5, expected at least 0 and below 0.5");
  s = good;
  s.lapse_max = -0.01;
  assert_refused(&sound, &s, EF_INVALID,
                 "largest lapse rate is -0.01, expected at least 0 and below "
                 "0.5");
  s = good;
  s.lapse_max = NOT_A_NUMBER;
  assert_refused(&sound, &s, EF_INVALID,
                 "the lapse rate is estimated, and has no limit");
  s = good;
  s.guess = 1;
  assert_refused(&sound, &s, EF_INVALID,
                 "guess rate is 1, expected at least 0 and below 1");
  s = good;
  s.width = 0;
  assert_refused(&sound, &s, EF_INVALID,
                 "width is 0, expected a number above 0");
  s = good;
  s.criterion = 0.5;
  assert_refused(&sound, &s, EF_INVALID,
                 "criterion is 0.5, expected a proportion above 0.5 and below "
                 "1");
  s = good;
  s.shape = EF_SHAPE_DETECTION;
  assert_refused(&sound, &s, EF_INVALID,
                 "the detection curve needs a logarithmic axis");
  s.axis = EF_AXIS_LOG;
  s.guess = 0.4;
  assert_refused(&sound, &s, EF_INVALID,
                 "the detection curve of 2ifc begins at chance: leave the "
                 "guess rate open");
  s = ef_fit_settings_default(EF_TASK_GREATER_LESS);
  s.shape = EF_SHAPE_DETECTION;
  assert_refused(&sound, &s, EF_INVALID,
                 "the detection curve is about differences without a sign; "
                 "greater-less has one: use gaussian");
  s.shape = (ef_shape)9;
  assert_refused(&sound, &s, EF_INVALID, "unknown task, shape or axis");
}

static void shapes_by_name(void **state) {
  (void)state;
  ef_shape shape;
  ef_error error;
  assert_int_equal(ef_shape_find("Weibull", &shape, &error), EF_OK);
  assert_int_equal(shape, EF_SHAPE_WEIBULL);
  assert_int_equal(ef_shape_axis(shape), EF_AXIS_LOG);
  assert_int_equal(ef_shape_axis(EF_SHAPE_LOGISTIC), EF_AXIS_LINEAR);
  assert_int_equal(ef_shape_find("gausian", &shape, &error), EF_UNKNOWN_NAME);
  assert_string_equal(error.message,
                      "no model is called 'gausian'; near names: gaussian");
}

/* ---- Separation ---------------------------------------------------------- */

static void separated_answers(void **state) {
  (void)state;
  heard h = {""};
  const ef_notes notes = {hear, &h};
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_GREATER_LESS);
  s.notes = &notes;
  const answers a = {4, {1, 2, 4, 5}, {10, 10, 10, 10}, {0, 0, 10, 10}};
  ef_fit fit;
  ef_error error;
  assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
  assert_int_equal(fit.support, EF_SUPPORT_STEP);
  assert_near(fit.bracket_low, 2, 0); /* levels as they were given */
  assert_near(fit.bracket_high, 4, 0);
  assert_near(fit.threshold.value, 3, 1e-12);
  assert_near(fit.equality.value, 3, 1e-12);
  assert_near(fit.sigma.value, 0, 0);
  assert_near(fit.jnd.value, 0, 0);
  assert_true(isnan(fit.threshold.se) && isnan(fit.se_slope));
  assert_near(ef_psychometric_value(&fit.curve, 2), 0, 1e-3);
  assert_string_equal(
      h.text, "the answers are separated: they change all at once between "
              "levels 2 and 4, so the slope has no finite estimate and the "
              "threshold may lie anywhere between; show levels there\n");
  /* One level in between has answers of both kinds. */
  const answers one = {4, {1, 2, 4, 5}, {10, 10, 10, 10}, {0, 7, 10, 10}};
  h.text[0] = '\0';
  assert_int_equal(fit_answers(&one, &s, &fit, &error), EF_OK);
  assert_int_equal(fit.support, EF_SUPPORT_STEP);
  assert_near(fit.bracket_low, 2, 1e-12);
  assert_near(fit.bracket_high, 2, 1e-12);
  assert_near(fit.threshold.value, 2, 1e-12);
  assert_near(ef_psychometric_value(&fit.curve, 2), 0.7, 1e-3);
  assert_string_equal(
      h.text, "the answers are separated: they change all at once at level 2, "
              "so the slope has no finite estimate; show levels close to it on "
              "both sides\n");
}

/* ---- Notes --------------------------------------------------------------- */

static void notes_beside_an_answer(void **state) {
  (void)state;
  heard h = {""};
  const ef_notes notes = {hear, &h};
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_YES_NO);
  s.notes = &notes;
  answers a = {5, {1, 2, 3, 4, 5}, {30, 30, 30, 30, 30}, {2, 6, 16, 24, 29}};
  ef_fit fit;
  ef_error error;
  assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
  assert_true(isnan(fit.jnd.value));
  assert_string_equal(
      h.text,
      "a yes-no threshold moves with the observer's criterion: compare d', not "
      "thresholds, between observers or conditions\n"
      "no blanks were shown (level 0): no false-alarm rate, so no d' and no "
      "JND\n");
  /* A blank on a logarithmic axis brings the guess rate. */
  h.text[0] = '\0';
  a.level[0] = 0;
  s.axis = EF_AXIS_LOG;
  assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
  assert_true(fit.guess_estimated);
  assert_true(isfinite(fit.jnd.value));
  assert_non_null(strstr(h.text, "guess rate estimated from the blanks: "));
  /* Threshold beyond the levels; lapses beyond the limit. */
  h.text[0] = '\0';
  s = ef_fit_settings_default(EF_TASK_2IFC);
  s.notes = &notes;
  s.lapse = 0;
  const answers low = {4, {1, 2, 3, 4}, {90, 90, 90, 90}, {45, 47, 55, 62}};
  assert_int_equal(fit_answers(&low, &s, &fit, &error), EF_OK);
  assert_true(fit.extrapolated && fit.threshold.value > 4);
  assert_non_null(strstr(h.text, "lies outside the levels shown"));
  h.text[0] = '\0';
  s.lapse = NOT_A_NUMBER;
  const answers lapses = {
      5, {1, 2, 3, 4, 5}, {90, 90, 90, 90, 90}, {44, 52, 77, 77, 78}};
  assert_int_equal(fit_answers(&lapses, &s, &fit, &error), EF_OK);
  assert_true(fit.lapse_at_limit);
  assert_near(fit.lapse.value, 0.06, 1e-15);
  assert_string_equal(h.text,
                      "the lapse rate is at its limit 0.06: the observer may "
                      "not have attended, or the curve has another shape\n");
}

/* ---- JND ----------------------------------------------------------------- */

/* The JND is at d' = 0.9539 in every task: answers that a detection curve
 * gives exactly (a million a level) bring its JND back. */
static void jnd_is_the_same_in_every_task(void **state) {
  (void)state;
  const ef_task task[] = {EF_TASK_2IFC, EF_TASK_TRIANGLE, EF_TASK_YES_NO,
                          EF_TASK_SAME_DIFFERENT};
  for (size_t i = 0; i < 4; ++i) {
    const double chance = ef_task_chance(task[i]);
    ef_psychometric truth = {.shape = EF_SHAPE_DETECTION,
                             .axis = EF_AXIS_LOG,
                             .task = task[i],
                             .location = log10(0.8), /* d' = 1 at 0.8 */
                             .width = 1 / (1.3 * log(10)),
                             .guess = isnan(chance) ? 0.15 : chance};
    answers a = {7, {0, 0.3, 0.6, 0.9, 1.3, 1.8, 2.5}, {0}, {0}};
    for (size_t r = 0; r < a.n; ++r) {
      a.shown[r] = 1000000;
      a.positive[r] =
          (size_t)lround(1e6 * ef_psychometric_value(&truth, a.level[r]));
    }
    ef_fit_settings s = ef_fit_settings_default(task[i]);
    s.shape = EF_SHAPE_DETECTION;
    s.axis = EF_AXIS_LOG;
    ef_fit fit;
    ef_error error;
    if (fit_answers(&a, &s, &fit, &error) != EF_OK)
      fail_msg("%s", error.message);
    const double jnd = 0.8 * pow(EF_JND_D_PRIME, 1 / 1.3);
    /* Counts are rounded to one in a million. */
    assert_near_relative(fit.jnd.value, jnd, 1e-4);
    assert_near_relative(fit.exponent.value, 1.3, 1e-4);
    assert_near(fit.guess.value, truth.guess, 1e-5);
    assert_true(isnan(fit.sigma.value));
    /* Another shape through the same answers: a million answers show the
     * misfit, and the JND moves by up to a fifth. */
    s.shape = EF_SHAPE_GAUSSIAN;
    assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
    assert_true(fit.deviance > 1000);
    assert_near_relative(fit.jnd.value, jnd, 0.25);
  }
}

static void jnd_of_greater_less(void **state) {
  (void)state;
  const answers a = {
      5, {8, 9, 10, 11, 12}, {100, 100, 100, 100, 100}, {1, 5, 29, 66, 93}};
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_GREATER_LESS);
  ef_fit fit;
  ef_error error;
  s.lapse = 0;
  assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
  assert_near(fit.jnd.value, 0.67448975019608174 * fit.sigma.value, 1e-12);
  assert_near(fit.jnd.se, 0.67448975019608174 * fit.sigma.se, 1e-12);
  assert_near(fit.equality.value, fit.threshold.value, 1e-12);
  s.axis = EF_AXIS_LOG;
  assert_int_equal(fit_answers(&a, &s, &fit, &error), EF_OK);
  const double upper = ef_psychometric_level(&fit.curve, 0.75);
  const double lower = ef_psychometric_level(&fit.curve, 0.25);
  assert_near(fit.jnd.value, 0.5 * (upper - lower), 1e-12);
  assert_true(fit.jnd.se > 0.05 && fit.jnd.se < 0.1);
}

/* ---- Curves at their edges ----------------------------------------------- */

static void edges_of_curves(void **state) {
  (void)state;
  ef_psychometric c = {.shape = EF_SHAPE_WEIBULL,
                       .axis = EF_AXIS_LOG,
                       .task = EF_TASK_2IFC,
                       .location = 0,
                       .width = 1 / (2 * log(10)),
                       .guess = 0.5,
                       .lapse = 0.01};
  /* 1 - exp(-x^2) over 0.5 .. 0.99 */
  assert_near(ef_psychometric_value(&c, 0.7), 0.5 + 0.49 * -expm1(-0.49),
              1e-15);
  assert_near(ef_psychometric_value(&c, 0), 0.5, 0);
  assert_near(ef_psychometric_value(&c, 1e9), 0.99, 1e-15);
  assert_true(isnan(ef_psychometric_value(&c, -1)));
  assert_true(isnan(ef_psychometric_value(&c, NOT_A_NUMBER)));
  assert_near(ef_psychometric_slope(&c, 0), 0, 0);
  assert_true(isnan(ef_psychometric_slope(&c, -1)));
  assert_true(isnan(ef_psychometric_level(&c, 0.5)));
  assert_true(isnan(ef_psychometric_level(&c, 1)));
  /* Lapses do not move a threshold. */
  const double without = ef_psychometric_level(&c, 0.75);
  c.lapse = 0;
  assert_near(ef_psychometric_level(&c, 0.75), without, 0);
  assert_near(without, sqrt(log(2)), 1e-15);
}

static void trials_counted(void **state) {
  (void)state;
  const double level[] = {3, 1, 3, 2, 1, 3};
  const bool positive[] = {true, false, false, true, true, true};
  double out[6];
  size_t shown[6], k[6];
  assert_int_equal(ef_responses_collect(6, level, positive, out, shown, k), 3);
  const double expected[] = {1, 2, 3};
  assert_same_bits(out, expected, 3);
  assert_true(shown[0] == 2 && shown[1] == 1 && shown[2] == 3);
  assert_true(k[0] == 1 && k[1] == 1 && k[2] == 2);
  assert_int_equal(ef_responses_collect(0, level, positive, out, shown, k), 0);
}

static bool attempt_fit(void *context) {
  (void)context;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  ef_fit fit;
  ef_error error;
  const ef_status status = fit_answers(&sound, &s, &fit, &error);
  if (status != EF_OK)
    assert_error(&error, EF_NO_MEMORY, "answers");
  return status == EF_OK;
}

static void without_memory(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(attempt_fit, NULL), 1);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(answers_that_cannot_be),
      cmocka_unit_test(no_threshold),
      cmocka_unit_test(no_d_prime_without_blanks),
      cmocka_unit_test(settings_refused),
      cmocka_unit_test(shapes_by_name),
      cmocka_unit_test(separated_answers),
      cmocka_unit_test(notes_beside_an_answer),
      cmocka_unit_test(jnd_is_the_same_in_every_task),
      cmocka_unit_test(jnd_of_greater_less),
      cmocka_unit_test(edges_of_curves),
      cmocka_unit_test(trials_counted),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
