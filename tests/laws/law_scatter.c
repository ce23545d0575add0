/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Noise of spectra carried to differences: against noise itself. */
#include <stdlib.h>

#include <evenfield/difference.h>

#include "gen.h"
#include "metrics.h"
#include "near.h"

enum { SAMPLES = 31, READINGS = 20000 };

static const ef_grid grid = {.count = SAMPLES, .start_nm = 400, .step_nm = 10};

typedef struct bench {
  ef_illuminant *d65;
  ef_observer *observer;
  ef_weights *weights;
  ef_conditions conditions;
  double sd[SAMPLES];
  double spectrum[READINGS * SAMPLES], xyz[READINGS * 3];
} bench;

static int bench_set(void **state) {
  bench *const b = calloc(1, sizeof *b);
  b->d65 = ef_illuminant_new("D65", NULL);
  b->observer = ef_observer_new("cie-1964", NULL);
  const ef_viewing viewing = ef_viewing_default(b->d65);
  b->weights = ef_observer_weights(b->observer, EF_TRISTIMULUS, &grid, &viewing,
                                   NULL, NULL);
  double white[3];
  ef_observer_white(b->observer, EF_TRISTIMULUS, b->d65, NULL, white, NULL);
  b->conditions =
      ef_conditions_default((ef_xyz){white[0], white[1], white[2]});
  /* 0.1 % of the scale, more towards the ends. */
  for (size_t k = 0; k < SAMPLES; ++k)
    b->sd[k] = 0.001 + 0.0001 * fabs((double)k - 15);
  *state = b;
  return 0;
}

static int bench_clear(void **state) {
  bench *const b = *state;
  ef_weights_free(b->weights);
  ef_observer_free(b->observer);
  ef_illuminant_free(b->d65);
  free(b);
  return 0;
}

/* Readings of one spectrum, and their colours. */
static void measure(bench *b, gen *g, const double *spectrum) {
  for (size_t i = 0; i < READINGS * SAMPLES; ++i)
    b->spectrum[i] = spectrum[i % SAMPLES] + b->sd[i % SAMPLES] * gen_normal(g);
  assert_int_equal(ef_weights_apply(b->weights, READINGS, b->spectrum, 0,
                                    b->xyz, NULL),
                   EF_OK);
}

static ef_xyz colour_of(const bench *b, const double *spectrum) {
  double xyz[3];
  assert_int_equal(ef_weights_apply(b->weights, 1, spectrum, 1, xyz, NULL),
                   EF_OK);
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

/* Covariances of N readings are right to sqrt(2 / N) of their variances: 1 %,
 * five times that allowed. */
static void readings_scatter_as_the_noise_says(void **state) {
  bench *const b = *state;
  gen g = gen_new(61);
  double spectrum[SAMPLES];
  gen_smooth(&g, SAMPLES, spectrum);
  measure(b, &g, spectrum);
  ef_scatter said, seen;
  assert_int_equal(ef_scatter_of_noise(b->weights, b->sd, &said, NULL), EF_OK);
  assert_int_equal(ef_scatter_of_readings(READINGS, b->xyz, &seen, NULL),
                   EF_OK);
  for (size_t k = 0; k < 9; ++k) {
    const double size = sqrt(said.covariance[k / 3 * 4] *
                             said.covariance[k % 3 * 4]);
    assert_near(seen.covariance[k], said.covariance[k], 0.05 * size);
  }
}

/* To first order the spread of the differences is the one foretold: in every
 * formula, for pairs some ten times further apart than the noise. The spread
 * of N differences is right to sqrt(1 / 2N), 0.5 %; second order adds some
 * percent of the square of noise over difference. */
static void differences_scatter_as_foretold(void **state) {
  bench *const b = *state;
  gen g = gen_new(62);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    double standard[SAMPLES], sample[SAMPLES];
    gen_smooth(&g, SAMPLES, standard);
    for (size_t k = 0; k < SAMPLES; ++k)
      sample[k] = standard[k] * (1.1 - 0.002 * (double)k);
    const ef_xyz reference = colour_of(b, standard);
    measure(b, &g, sample);
    ef_scatter scatter;
    ef_scatter_of_noise(b->weights, b->sd, &scatter, NULL);
    const ef_uncertain told =
        ef_metric_uncertainty(metric, reference, colour_of(b, sample),
                              &b->conditions, NULL, &scatter);
    assert_true(told.difference > 8 * told.sd && told.sd > 0);
    double at[3], sum = 0, squares = 0;
    ef_metric_coordinates(metric, reference, &b->conditions, at);
    for (size_t i = 0; i < READINGS; ++i) {
      double other[3];
      const double *const c = b->xyz + 3 * i;
      ef_metric_coordinates(metric, (ef_xyz){c[0], c[1], c[2]},
                            &b->conditions, other);
      const double off =
          ef_metric_difference(metric, at, other) - told.difference;
      sum += off;
      squares += off * off;
    }
    const double mean = sum / READINGS;
    const double sd = sqrt(squares / READINGS - mean * mean);
    printf("# %-12s difference %.3f, sd foretold %.4f, seen %.4f\n",
           ef_metric_name(metric), told.difference, told.sd, sd);
    assert_near_relative(sd, told.sd, 0.03);
  }
}

/* Two readings of one sample: the root mean square of their difference. The
 * square of a difference spreads by about its own size: 1 % of N, three times
 * that and the curvature of the formulas. CAM-UCS chroma has no slope on the
 * neutral axis, so the sample is a coloured one. */
static void noise_alone_is_a_difference(void **state) {
  bench *const b = *state;
  gen g = gen_new(63);
  double spectrum[SAMPLES];
  for (size_t k = 0; k < SAMPLES; ++k)
    spectrum[k] = 0.2 + 0.015 * (double)k;
  ef_scatter scatter;
  ef_scatter_of_noise(b->weights, b->sd, &scatter, NULL);
  const ef_xyz colour = colour_of(b, spectrum);
  measure(b, &g, spectrum);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    const ef_uncertain told = ef_metric_uncertainty(
        metric, colour, colour, &b->conditions, &scatter, &scatter);
    assert_true(told.difference == 0 && told.noise_alone > 0);
    double squares = 0;
    for (size_t i = 0; i < READINGS; i += 2) {
      double pair[2][3];
      for (size_t k = 0; k < 2; ++k) {
        const double *const c = b->xyz + 3 * (i + k);
        ef_metric_coordinates(metric, (ef_xyz){c[0], c[1], c[2]},
                              &b->conditions, pair[k]);
      }
      const double d = ef_metric_difference(metric, pair[0], pair[1]);
      squares += d * d;
    }
    assert_near_relative(sqrt(squares / (READINGS / 2)), told.noise_alone,
                         0.04);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(readings_scatter_as_the_noise_says),
      cmocka_unit_test(differences_scatter_as_foretold),
      cmocka_unit_test(noise_alone_is_a_difference),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, bench_set, bench_clear);
}
