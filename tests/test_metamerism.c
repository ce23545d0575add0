/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Indices of metamerism and colour inconstancy: worked by hand, and refused. */
#include <evenfield/difference.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

enum { SAMPLES = 36 };

static const ef_grid grid = {.count = SAMPLES, .start_nm = 380, .step_nm = 10};

/* A pair close to each other under D65, further apart under A. ASTM E308-01
 * whites. */
static const ef_seen under_d65 = {.standard = {20.17, 21.50, 24.10},
                                  .sample = {20.31, 21.44, 23.90},
                                  .conditions = {.white = {95.047, 100,
                                                           108.883}}};
static const ef_seen under_a = {.standard = {23.95, 21.60, 7.80},
                                .sample = {24.62, 21.81, 7.65},
                                .conditions = {.white = {109.850, 100,
                                                         35.585}}};

static const ef_metric *cielab(void) {
  return ef_metric_find("cielab", NULL);
}

/* By the formulas of CIE 015 in another language's arithmetic. */
static void worked_by_hand(void **state) {
  (void)state;
  const ef_metamerism plain =
      ef_metamerism_of_seen(cielab(), &under_d65, &under_a, EF_CORRECT_NONE);
  assert_near(plain.reference_difference, 0.9950354528780492, 1e-12);
  assert_near(plain.test_difference, 2.1657040122435665, 1e-12);
  assert_near(plain.index, plain.test_difference, 0);
  const ef_metamerism multiplied = ef_metamerism_of_seen(
      cielab(), &under_d65, &under_a, EF_CORRECT_MULTIPLICATIVE);
  assert_near(multiplied.index, 1.2913105025055995, 1e-12);
  assert_near(multiplied.components.lightness, 0.2899029463507503, 1e-12);
  assert_near(multiplied.test_difference, plain.test_difference, 0);
  const ef_metamerism added = ef_metamerism_of_seen(
      cielab(), &under_d65, &under_a, EF_CORRECT_ADDITIVE);
  assert_near(added.index, 1.297245306344976, 1e-12);
  assert_near(added.components.lightness, 0.2895328562544819, 1e-12);
}

static void no_ratio_to_zero(void **state) {
  (void)state;
  ef_seen reference = under_d65;
  reference.sample.Z = 0;
  ef_metamerism told = ef_metamerism_of_seen(
      cielab(), &reference, &under_a, EF_CORRECT_MULTIPLICATIVE);
  assert_true(isnan(told.index) && isnan(told.components.hue));
  assert_true(isfinite(told.test_difference));
  /* Both without blue: nothing to correct there. */
  reference.standard.Z = 0;
  told = ef_metamerism_of_seen(cielab(), &reference, &under_a,
                               EF_CORRECT_MULTIPLICATIVE);
  assert_true(isfinite(told.index));
  told = ef_metamerism_of_seen(cielab(), &under_d65, &under_a,
                               EF_CORRECT_SPECTRAL);
  assert_true(isnan(told.index) && isnan(told.components.chroma));
  assert_true(isfinite(told.reference_difference));
}

static void corrections_by_name(void **state) {
  (void)state;
  for (size_t i = 0; i <= EF_CORRECT_NONE; ++i) {
    ef_correction correction;
    assert_int_equal(
        ef_correction_find(ef_correction_name((ef_correction)i), &correction,
                           NULL),
        EF_OK);
    assert_int_equal(correction, i);
  }
  assert_string_equal(ef_correction_name((ef_correction)9), "unknown");
  ef_correction correction = EF_CORRECT_NONE;
  ef_error error;
  assert_int_equal(ef_correction_find("Additiv", &correction, &error),
                   EF_UNKNOWN_NAME);
  assert_string_equal(error.message, "no correction is called 'Additiv'; near "
                                     "names: additive");
  assert_int_equal(correction, EF_CORRECT_NONE);
}

/* What the lights and eyes are that batches look with. */
typedef struct eyes {
  ef_illuminant *d65, *a;
  ef_observer *cie_1931;
  ef_look reference, test;
} eyes;

static eyes eyes_open(void) {
  eyes e = {.d65 = ef_illuminant_new("D65", NULL),
            .a = ef_illuminant_new("A", NULL),
            .cie_1931 = ef_observer_new("cie-1931", NULL)};
  e.reference = (ef_look){e.cie_1931, ef_viewing_default(e.d65)};
  e.test = (ef_look){e.cie_1931, ef_viewing_default(e.a)};
  return e;
}

static void eyes_close(eyes *e) {
  ef_observer_free(e->cie_1931);
  ef_illuminant_free(e->a);
  ef_illuminant_free(e->d65);
}

static void refused(void **state) {
  (void)state;
  eyes e = eyes_open();
  double standard[2 * SAMPLES], sample[2 * SAMPLES];
  gen g = gen_new(3);
  gen_fill(&g, 2 * SAMPLES, 0, 1, standard);
  gen_fill(&g, 2 * SAMPLES, 0, 1, sample);
  const ef_metamerism_settings settings = ef_metamerism_settings_default();
  ef_metamerism out[2];
  ef_error error;
  sample[SAMPLES + 4] = NOT_A_NUMBER;
  assert_int_equal(ef_metamerism_batch(&grid, 2, standard, sample,
                                       &e.reference, 1, &e.test, &settings, 1,
                                       out, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "value 5 of sample 2 is not a finite number");
  sample[SAMPLES + 4] = 0.5;
  standard[0] = INFINITE;
  assert_int_equal(ef_metamerism_batch(&grid, 2, standard, sample,
                                       &e.reference, 1, &e.test, &settings, 1,
                                       out, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "value 1 of standard 1 is not a finite number");
  standard[0] = 0.5;
  const ef_look light = {e.cie_1931, ef_viewing_default(NULL)};
  assert_int_equal(ef_metamerism_batch(&grid, 2, standard, sample, &light, 1,
                                       &e.test, &settings, 1, out, NULL,
                                       &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "the reference look is at lights; metamerism is told of "
                      "surfaces: give its illuminant");
  assert_int_equal(ef_metamerism_batch(&grid, 2, standard, sample,
                                       &e.reference, 1, &light, &settings, 1,
                                       out, NULL, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "the test look is at lights; metamerism is told of "
                      "surfaces: give its illuminant");
  const ef_grid none = {.count = 0};
  assert_int_equal(ef_metamerism_batch(&none, 0, standard, sample,
                                       &e.reference, 1, &e.test, &settings, 1,
                                       out, NULL, &error),
                   EF_INVALID);
  eyes_close(&e);
}

/* Two samples cannot hold three channels apart. */
static void channels_that_depend(void **state) {
  (void)state;
  eyes e = eyes_open();
  const ef_grid two = {.count = 2, .start_nm = 450, .step_nm = 100};
  ef_weights *const weights =
      ef_observer_weights(e.cie_1931, EF_TRISTIMULUS, &two,
                          &e.reference.viewing, NULL, NULL);
  assert_non_null(weights);
  const double standard[2] = {0.2, 0.3}, sample[2] = {0.3, 0.2};
  double corrected[2];
  ef_spectral_index index;
  ef_error error;
  static const char *const message =
      "the 3 channels of the reference depend on each other on these 2 "
      "samples: what it does not see is not defined";
  assert_int_equal(ef_spectral_correct(weights, 1, standard, sample, corrected,
                                       &error),
                   EF_NO_ANSWER);
  assert_string_equal(error.message, message);
  assert_int_equal(ef_spectral_index_batch(weights, 1, standard, sample,
                                           &index, &error),
                   EF_NO_ANSWER);
  assert_string_equal(error.message, message);
  ef_weights_free(weights);
  eyes_close(&e);
}

/* What adaptation makes good is no inconstancy: a grey keeps its colour, and so
 * does whatever the adaptation itself predicts. */
static void what_adapts_is_constant(void **state) {
  (void)state;
  const ef_xyz d65 = under_d65.conditions.white, a = under_a.conditions.white;
  const ef_xyz grey = {0.2 * d65.X, 0.2 * d65.Y, 0.2 * d65.Z};
  const ef_xyz grey_there = {0.2 * a.X, 0.2 * a.Y, 0.2 * a.Z};
  double index;
  ef_components part;
  assert_int_equal(ef_inconstancy(cielab(), EF_ADAPT_CAT16, grey,
                                  &under_d65.conditions, grey_there, a, &index,
                                  NULL, NULL),
                   EF_OK);
  assert_near(index, 0, 1e-12);
  double matrix[9];
  assert_int_equal(ef_adaptation_matrix(EF_ADAPT_CAT16, d65, a, matrix, NULL),
                   EF_OK);
  const ef_xyz there = ef_xyz_transform(matrix, under_d65.standard);
  assert_int_equal(ef_inconstancy(cielab(), EF_ADAPT_CAT16,
                                  under_d65.standard, &under_d65.conditions,
                                  there, a, &index, &part, NULL),
                   EF_OK);
  assert_near(index, 0, 1e-12);
  /* Ten percent more of everything: lighter, the same hue. */
  const ef_xyz more = {1.1 * there.X, 1.1 * there.Y, 1.1 * there.Z};
  assert_int_equal(ef_inconstancy(cielab(), EF_ADAPT_CAT16,
                                  under_d65.standard, &under_d65.conditions,
                                  more, a, &index, &part, NULL),
                   EF_OK);
  const double Y = under_d65.standard.Y / 100;
  assert_near(part.lightness, 116 * (cbrt(1.1 * Y) - cbrt(Y)), 1e-10);
  assert_near(part.hue, 0, 1e-10);
  ef_error error;
  assert_int_equal(ef_inconstancy(cielab(), EF_ADAPT_CAT16, grey,
                                  &under_d65.conditions, grey_there,
                                  (ef_xyz){0, 0, 0}, &index, NULL, &error),
                   EF_INVALID);
}

static bool attempt(void *context) {
  const eyes *const e = context;
  double standard[SAMPLES], sample[SAMPLES];
  gen g = gen_new(4);
  gen_smooth(&g, SAMPLES, standard);
  gen_smooth(&g, SAMPLES, sample);
  ef_metamerism_settings settings = ef_metamerism_settings_default();
  settings.correction = EF_CORRECT_SPECTRAL;
  ef_metamerism out;
  ef_error error = {0};
  const ef_status status =
      ef_metamerism_batch(&grid, 1, standard, sample, &e->reference, 1,
                          &e->test, &settings, 1, &out, NULL, &error);
  assert_true(status == EF_OK || error.status == EF_NO_MEMORY);
  return status == EF_OK;
}

static void without_memory(void **state) {
  (void)state;
  eyes e = eyes_open();
  assert_true(fail_alloc_each(attempt, &e) > 3);
  eyes_close(&e);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(worked_by_hand),
      cmocka_unit_test(no_ratio_to_zero),
      cmocka_unit_test(corrections_by_name),
      cmocka_unit_test(refused),
      cmocka_unit_test(channels_that_depend),
      cmocka_unit_test(what_adapts_is_constant),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
