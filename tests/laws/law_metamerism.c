/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Metamerism: laws over seeded random pairs of surfaces. */
#include <stdlib.h>

#include <evenfield/difference.h>

#include "gen.h"
#include "metrics.h"
#include "near.h"

enum { SAMPLES = 41, N = 600, TESTS = 3 };

static const ef_grid grid = {.count = SAMPLES, .start_nm = 380, .step_nm = 10};

typedef struct eyes {
  ef_illuminant *d65, *light[TESTS];
  ef_observer *cie_1931, *cie_1964;
  ef_look reference, test[TESTS];
  double standard[N * SAMPLES], sample[N * SAMPLES];
  ef_metamerism out[N * TESTS], other[N * TESTS];
} eyes;

/* Pairs that differ by some percent, under D65, A, FL11 and for CIE 1964. */
static int open_eyes(void **state) {
  eyes *const e = calloc(1, sizeof *e);
  static const char *const names[TESTS] = {"A", "FL11", "D65"};
  e->d65 = ef_illuminant_new("D65", NULL);
  e->cie_1931 = ef_observer_new("cie-1931", NULL);
  e->cie_1964 = ef_observer_new("cie-1964", NULL);
  e->reference = (ef_look){e->cie_1931, ef_viewing_default(e->d65)};
  for (size_t t = 0; t < TESTS; ++t) {
    e->light[t] = ef_illuminant_new(names[t], NULL);
    e->test[t] = (ef_look){t == 2 ? e->cie_1964 : e->cie_1931,
                           ef_viewing_default(e->light[t])};
  }
  gen g = gen_new(51);
  double change[SAMPLES];
  for (size_t i = 0; i < N; ++i) {
    gen_smooth(&g, SAMPLES, e->standard + i * SAMPLES);
    gen_smooth(&g, SAMPLES, change);
    for (size_t k = 0; k < SAMPLES; ++k)
      e->sample[i * SAMPLES + k] =
          0.95 * e->standard[i * SAMPLES + k] + 0.05 * change[k];
  }
  *state = e;
  return 0;
}

static int close_eyes(void **state) {
  eyes *const e = *state;
  for (size_t t = 0; t < TESTS; ++t)
    ef_illuminant_free(e->light[t]);
  ef_illuminant_free(e->d65);
  ef_observer_free(e->cie_1931);
  ef_observer_free(e->cie_1964);
  free(e);
  return 0;
}

static void run(eyes *e, size_t n, const double *sample, size_t n_tests,
                const ef_look *test, const ef_metric *metric,
                ef_correction correction, int jobs, ef_metamerism *out) {
  const ef_metamerism_settings settings = {.metric = metric,
                                           .correction = correction};
  ef_error error;
  if (ef_metamerism_batch(&grid, n, e->standard, sample, &e->reference,
                          n_tests, test, &settings, jobs, out, NULL,
                          &error) != EF_OK)
    fail_msg("%s", error.message);
}

static ef_weights *reference_weights(const eyes *e) {
  ef_weights *const weights = ef_observer_weights(
      e->cie_1931, EF_TRISTIMULUS, &grid, &e->reference.viewing, NULL, NULL);
  assert_non_null(weights);
  return weights;
}

static void identical_spectra_have_no_index(void **state) {
  eyes *const e = *state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_correction correction = (ef_correction)(m % 4);
    run(e, N, e->standard, TESTS, e->test, every_metric(m), correction, 0,
        e->out);
    for (size_t i = 0; i < N * TESTS; ++i)
      assert_true(e->out[i].index == 0 && e->out[i].test_difference == 0);
  }
  ef_weights *const weights = reference_weights(e);
  static ef_spectral_index index[N];
  assert_int_equal(ef_spectral_index_batch(weights, N, e->standard,
                                           e->standard, index, NULL),
                   EF_OK);
  for (size_t i = 0; i < N; ++i)
    assert_true(index[i].rms == 0 && index[i].black_rms == 0 &&
                index[i].weighted == 0);
  ef_weights_free(weights);
}

/* With the reference look as the test, nothing is left of a mismatch, whatever
 * it was: 1e-10 of a unit is the rounding of coordinates of size 100. */
static void corrections_take_out_the_reference(void **state) {
  eyes *const e = *state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    for (int c = 0; c < (int)EF_CORRECT_NONE; ++c) {
      run(e, N, e->sample, 1, &e->reference, every_metric(m), (ef_correction)c,
          0, e->out);
      for (size_t i = 0; i < N; ++i) {
        assert_near(e->out[i].index, 0, 1e-9);
        assert_near(e->out[i].test_difference, e->out[i].reference_difference,
                    0);
        assert_true(e->out[i].test_difference > 0);
      }
    }
  }
}

/* A pair that matches has nothing to be corrected. */
static void corrections_leave_a_match_alone(void **state) {
  eyes *const e = *state;
  static double matching[N * SAMPLES];
  static ef_metamerism plain[N * TESTS];
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  ef_weights *const weights = reference_weights(e);
  assert_int_equal(ef_spectral_correct(weights, N, e->standard, e->sample,
                                       matching, NULL),
                   EF_OK);
  ef_weights_free(weights);
  run(e, N, matching, TESTS, e->test, metric, EF_CORRECT_NONE, 0, plain);
  for (int c = 0; c < (int)EF_CORRECT_NONE; ++c) {
    run(e, N, matching, TESTS, e->test, metric, (ef_correction)c, 0, e->out);
    for (size_t i = 0; i < N * TESTS; ++i) {
      assert_near(e->out[i].reference_difference, 0, 1e-9);
      /* neutral standards amplify rounding: hue of a tiny chroma */
      assert_near(e->out[i].index, plain[i].index, 1e-8);
    }
  }
  /* And the spectral correction of the pair as it was is this very pair. */
  run(e, N, e->sample, TESTS, e->test, metric, EF_CORRECT_SPECTRAL, 0, e->out);
  for (size_t i = 0; i < N * TESTS; ++i)
    assert_near(e->out[i].index, plain[i].index, 1e-12);
}

/* A change of the light or the eye shows, and corrections, which differ in what
 * they take out, agree about the size of what is left: within a factor of 2. */
static void a_change_shows(void **state) {
  eyes *const e = *state;
  const ef_metric *const metric = ef_metric_find("cielab", NULL);
  double sum[3][TESTS] = {{0}};
  for (int c = 0; c < 3; ++c) {
    run(e, N, e->sample, TESTS, e->test, metric, (ef_correction)c, 0, e->out);
    for (size_t i = 0; i < N * TESTS; ++i)
      sum[c][i % TESTS] += e->out[i].index / N;
  }
  for (size_t t = 0; t < TESTS; ++t) {
    printf("# mean index %zu: multiplicative %.3f, additive %.3f, spectral "
           "%.3f\n",
           t, sum[0][t], sum[1][t], sum[2][t]);
    assert_true(sum[0][t] > 0.05);
    for (int c = 1; c < 3; ++c)
      assert_true(sum[c][t] > 0.5 * sum[0][t] && sum[c][t] < 2 * sum[0][t]);
  }
}

static void batches_and_threads_do_not_matter(void **state) {
  eyes *const e = *state;
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  for (int c = 0; c <= (int)EF_CORRECT_NONE; ++c) {
    run(e, N, e->sample, TESTS, e->test, metric, (ef_correction)c, 3, e->out);
    run(e, 7, e->sample, TESTS, e->test, metric, (ef_correction)c, 1,
        e->other);
    assert_same_bits((double *)e->other, (double *)e->out,
                     7 * TESTS * sizeof(ef_metamerism) / sizeof(double));
    run(e, N, e->sample, 1, e->test, metric, (ef_correction)c, 1, e->other);
    for (size_t i = 0; i < N; ++i)
      assert_same_bits(&e->other[i].index, &e->out[i * TESTS].index, 1);
  }
}

/* The metameric black is what is left when the seen part is gone: not seen,
 * at right angles to the rest, and itself unchanged by another correction. */
static void blacks_are_not_seen(void **state) {
  eyes *const e = *state;
  static double matching[N * SAMPLES], again[N * SAMPLES];
  static double xyz[3 * N], target[3 * N];
  static ef_spectral_index index[N];
  ef_weights *const weights = reference_weights(e);
  memcpy(matching, e->sample, sizeof matching); /* in place */
  assert_int_equal(ef_spectral_correct(weights, N, e->standard, matching,
                                       matching, NULL),
                   EF_OK);
  assert_int_equal(ef_spectral_correct(weights, N, e->standard, matching,
                                       again, NULL),
                   EF_OK);
  assert_int_equal(ef_weights_apply(weights, N, matching, 1, xyz, NULL),
                   EF_OK);
  assert_int_equal(ef_weights_apply(weights, N, e->standard, 1, target, NULL),
                   EF_OK);
  assert_int_equal(ef_spectral_index_batch(weights, N, e->standard, e->sample,
                                           index, NULL),
                   EF_OK);
  for (size_t i = 0; i < 3 * N; ++i)
    assert_near(xyz[i], target[i], 1e-11);
  for (size_t i = 0; i < N; ++i) {
    double seen = 0, black = 0, whole = 0;
    for (size_t k = i * SAMPLES; k < (i + 1) * SAMPLES; ++k) {
      assert_near(again[k], matching[k], 1e-13);
      const double part = e->sample[k] - matching[k];
      const double rest = matching[k] - e->standard[k];
      seen += part * part;
      black += rest * rest;
      whole += (part + rest) * (part + rest);
    }
    assert_near(seen + black, whole, 1e-13); /* Pythagoras */
    assert_near(index[i].black_rms, sqrt(black / SAMPLES), 1e-13);
    assert_near(index[i].rms, sqrt(whole / SAMPLES), 1e-13);
    assert_true(index[i].black_rms < index[i].rms && index[i].weighted > 0);
  }
  ef_weights_free(weights);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(identical_spectra_have_no_index),
      cmocka_unit_test(corrections_take_out_the_reference),
      cmocka_unit_test(corrections_leave_a_match_alone),
      cmocka_unit_test(a_change_shows),
      cmocka_unit_test(batches_and_threads_do_not_matter),
      cmocka_unit_test(blacks_are_not_seen),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, open_eyes, close_eyes);
}
