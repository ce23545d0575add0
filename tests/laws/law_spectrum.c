/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <stdlib.h>

#include "gen.h"
#include "near.h"
#include "spectrum/spectrum_private.h"

enum { MOST_SAMPLES = 80, MOST_VALUES = 120 };

static const ef_interpolation rules[] = {
    EF_INTERPOLATE_SPRAGUE, EF_INTERPOLATE_SPLINE, EF_INTERPOLATE_LINEAR};

/* Samples a rule can take, somewhere in the visible range: even for Sprague,
 * half of the time uneven for the others. */
static ef_grid random_samples(gen *g, ef_interpolation rule, double *list) {
  ef_grid grid = {.count = 6 + gen_below(g, MOST_SAMPLES - 6),
                  .start_nm = gen_between(g, 350, 450),
                  .step_nm = gen_between(g, 1, 12)};
  if (rule == EF_INTERPOLATE_SPRAGUE || gen_below(g, 2) == 0)
    return grid;
  double at = grid.start_nm;
  for (size_t i = 0; i < grid.count; ++i) {
    list[i] = at;
    at += gen_between(g, 0.5, 20);
  }
  grid.wavelength_nm = list;
  return grid;
}

static ef_grid random_values(gen *g) {
  return (ef_grid){.count = 1 + gen_below(g, MOST_VALUES),
                   .start_nm = gen_between(g, 340, 460),
                   .step_nm = gen_between(g, 0.2, 6)};
}

/* ---- Interpolation ----------------------------------------------------- */

static void resampling_is_linear(void **state) {
  (void)state;
  gen g = gen_new(31);
  for (int trial = 0; trial < 300; ++trial) {
    const ef_interpolation rule = rules[trial % 3];
    double list[MOST_SAMPLES], value[3 * MOST_SAMPLES];
    double out[3 * MOST_VALUES];
    const ef_grid from = random_samples(&g, rule, list);
    const ef_grid to = random_values(&g);
    const double p = gen_between(&g, -2, 2), q = gen_between(&g, -2, 2);
    const size_t n = from.count, m = to.count;
    gen_fill(&g, 2 * n, -1, 1, value);
    for (size_t i = 0; i < n; ++i) {
      value[2 * n + i] = p * value[i] + q * value[n + i];
    }
    assert_int_equal(
        ef_resample(&from, 3, value, &to, rule, EF_EXTEND_HOLD, out, NULL),
        EF_OK);
    for (size_t i = 0; i < m; ++i) {
      /* Splines over steps of 0.5 beside 20 nm swing far beyond 1. */
      const double size = 4 + fabs(out[i]) + fabs(out[m + i]);
      assert_near(out[2 * m + i], p * out[i] + q * out[m + i], 1e-13 * size);
    }
  }
}

static double polynomial(const double *c, size_t degree, double x) {
  double sum = c[degree];
  for (size_t k = degree; k-- > 0;)
    sum = sum * x + c[k];
  return sum;
}

/* Largest error of a rule on random polynomials in x = (nm - 550) / 100, over
 * the intervals that lie `margin` samples away from the ends. */
static double polynomial_error(ef_interpolation rule, size_t degree,
                               size_t margin) {
  gen g = gen_new(32);
  double largest = 0;
  for (int trial = 0; trial < 300; ++trial) {
    double list[MOST_SAMPLES], value[MOST_SAMPLES], c[8], out[MOST_VALUES];
    const ef_grid from = random_samples(&g, rule, list);
    gen_fill(&g, degree + 1, -1, 1, c);
    for (size_t i = 0; i < from.count; ++i) {
      const double x = (ef_grid_wavelength(&from, i) - 550) / 100;
      value[i] = polynomial(c, degree, x);
    }
    const double low = ef_grid_wavelength(&from, margin);
    const double high = ef_grid_wavelength(&from, from.count - 1 - margin);
    if (high <= low)
      continue;
    const ef_grid to = {MOST_VALUES, low, (high - low) / MOST_VALUES, NULL};
    assert_int_equal(
        ef_resample(&from, 1, value, &to, rule, EF_EXTEND_HOLD, out, NULL),
        EF_OK);
    for (size_t i = 0; i < to.count; ++i) {
      const double x = (ef_grid_wavelength(&to, i) - 550) / 100;
      double size = 0;
      for (size_t k = 0; k <= degree; ++k) {
        size += fabs(c[k] * pow(x, (double)k));
      }
      const double off = fabs(out[i] - polynomial(c, degree, x)) / (1 + size);
      largest = fmax(largest, off);
    }
  }
  return largest;
}

static void rules_are_exact_on_their_polynomials(void **state) {
  (void)state;
  /* Rounding of values up to 5^4 relative to 1 + size. */
  const double rounding = 1e-12;
  assert_near(polynomial_error(EF_INTERPOLATE_LINEAR, 1, 0), 0, rounding);
  assert_near(polynomial_error(EF_INTERPOLATE_SPLINE, 1, 0), 0, rounding);
  assert_near(polynomial_error(EF_INTERPOLATE_SPRAGUE, 4, 2), 0, rounding);
  /* The published end rule keeps straight lines, no more. */
  assert_near(polynomial_error(EF_INTERPOLATE_SPRAGUE, 1, 0), 0, rounding);
  /* And the test above can fail: one degree more is not exact. */
  assert_true(polynomial_error(EF_INTERPOLATE_LINEAR, 2, 0) > 1e-5);
  assert_true(polynomial_error(EF_INTERPOLATE_SPLINE, 2, 0) > 1e-5);
  assert_true(polynomial_error(EF_INTERPOLATE_SPRAGUE, 5, 2) > 1e-9);
  assert_true(polynomial_error(EF_INTERPOLATE_SPRAGUE, 2, 0) > 1e-5);
}

/* Sprague and spline curves have no kink: slopes from both sides of a sample
 * agree, up to the second derivative times the distance. */
static void smooth_rules_have_no_kinks(void **state) {
  (void)state;
  gen g = gen_new(33);
  for (size_t r = 0; r < 2; ++r) {
    double value[20];
    gen_fill(&g, 20, 0, 1, value);
    const ef_grid from = {20, 400, 10, NULL};
    const double d = 1e-4;
    for (size_t i = 1; i < 19; ++i) {
      const double at = ef_grid_wavelength(&from, i);
      const ef_grid to = {3, at - d, d, NULL};
      double out[3];
      assert_int_equal(ef_resample(&from, 1, value, &to, rules[r],
                                   EF_EXTEND_HOLD, out, NULL),
                       EF_OK);
      const double jump = (out[2] - out[1]) / d - (out[1] - out[0]) / d;
      assert_near(jump, 0, 2 * d); /* second derivatives stay below 1 / nm^2 */
    }
  }
}

/* ---- Folding ----------------------------------------------------------- */

static void folding_equals_resampling_and_summing(void **state) {
  (void)state;
  gen g = gen_new(34);
  for (int trial = 0; trial < 300; ++trial) {
    const ef_interpolation rule = rules[trial % 3];
    double list[MOST_SAMPLES], value[MOST_SAMPLES], corrected[MOST_SAMPLES];
    double channel[2 * MOST_VALUES], light[MOST_VALUES], fine[MOST_VALUES];
    const ef_grid from = random_samples(&g, rule, list);
    ef_fold_settings settings = {.working = random_values(&g),
                                 .interpolation = rule,
                                 .kind = trial % 2 ? EF_SURFACE : EF_LIGHT};
    settings.correct_bandpass = from.wavelength_nm == NULL && trial % 5 == 0;
    const size_t m = settings.working.count;
    gen_fill(&g, from.count, 0, 1, value);
    gen_fill(&g, 2 * m, -0.5, 2, channel);
    gen_fill(&g, m, 0, 100, light);
    const double scale[] = {0.37, 1.9};
    ef_weights *const w =
        ef_weights_fold(&from, 2, channel, light, scale, &settings, NULL);
    assert_non_null(w);
    double folded[2];
    assert_int_equal(ef_weights_apply(w, 1, value, 1, folded, NULL), EF_OK);
    memcpy(corrected, value, sizeof value);
    if (settings.correct_bandpass) {
      ef__bandpass_apply(from.count, value, corrected);
    }
    assert_int_equal(ef_resample(&from, 1, corrected, &settings.working, rule,
                                 trial % 2 ? EF_EXTEND_HOLD : EF_EXTEND_ZERO,
                                 fine, NULL),
                     EF_OK);
    for (size_t c = 0; c < 2; ++c) {
      double sum = 0, size = 0;
      for (size_t i = 0; i < m; ++i) {
        const double term = scale[c] * channel[c * m + i] * light[i] * fine[i];
        sum += term;
        size += fabs(term);
      }
      assert_near(folded[c], sum, 1e-13 * size); /* some 100 terms */
    }
    ef_weights_free(w);
  }
}

/* <P x, y> = <x, P' y>: the two directions of the operator are one. */
static void transposed_operator_is_the_transposed(void **state) {
  (void)state;
  gen g = gen_new(37);
  for (int trial = 0; trial < 300; ++trial) {
    const ef_interpolation rule = rules[trial % 3];
    double list[MOST_SAMPLES], x[MOST_SAMPLES], ty[MOST_SAMPLES];
    double y[MOST_VALUES], px[MOST_VALUES], scratch[2 * MOST_SAMPLES];
    const ef_grid from = random_samples(&g, rule, list);
    const ef_grid to = random_values(&g);
    ef__operator *const op = ef__operator_new(
        &from, &to, rule, trial % 2 ? EF_EXTEND_HOLD : EF_EXTEND_ZERO,
        from.wavelength_nm == NULL && trial % 5 < 3, NULL);
    assert_non_null(op);
    assert_true(ef__operator_scratch(op) <= 2 * MOST_SAMPLES);
    gen_fill(&g, from.count, -1, 1, x);
    gen_fill(&g, to.count, -1, 1, y);
    ef__operator_apply(op, x, scratch, px);
    ef__operator_apply_transposed(op, y, scratch, ty);
    double left = 0, right = 0, size = 0;
    for (size_t i = 0; i < to.count; ++i)
      left += px[i] * y[i];
    for (size_t i = 0; i < from.count; ++i)
      right += x[i] * ty[i];
    for (size_t i = 0; i < to.count; ++i)
      size += fabs(px[i]);
    for (size_t i = 0; i < from.count; ++i)
      size += fabs(ty[i]);
    assert_near(left, right, 1e-14 * size);
    free(op);
  }
}

/* A perfect reflector gets the plain sum: the weights of a row add up. */
static void held_weights_sum_to_the_channel(void **state) {
  (void)state;
  gen g = gen_new(35);
  for (int trial = 0; trial < 150; ++trial) {
    double list[MOST_SAMPLES], channel[MOST_VALUES];
    const ef_interpolation rule = rules[trial % 3];
    const ef_grid from = random_samples(&g, rule, list);
    ef_fold_settings settings = ef_fold_settings_default();
    settings.working = random_values(&g);
    settings.interpolation = rule;
    settings.correct_bandpass = from.wavelength_nm == NULL;
    const double scale = 1;
    double sum = 0, folded = 0;
    gen_fill(&g, settings.working.count, 0, 2, channel);
    for (size_t i = 0; i < settings.working.count; ++i)
      sum += channel[i];
    ef_weights *const w =
        ef_weights_fold(&from, 1, channel, NULL, &scale, &settings, NULL);
    assert_non_null(w);
    for (size_t i = 0; i < from.count; ++i)
      folded += ef_weights_matrix(w)[i];
    assert_near(folded, sum, 1e-12 * sum);
    ef_weights_free(w);
  }
}

/* ---- Applying ---------------------------------------------------------- */

static ef_weights *random_weights(gen *g, size_t n_channels, size_t n_samples) {
  ef_fold_settings settings = ef_fold_settings_default();
  settings.working = (ef_grid){n_samples, 400, 1, NULL};
  settings.interpolation = EF_INTERPOLATE_LINEAR;
  double *const channel = malloc(n_channels * n_samples * sizeof *channel);
  double *const scale = malloc(n_channels * sizeof *scale);
  assert_non_null(channel);
  assert_non_null(scale);
  gen_fill(g, n_channels * n_samples, -1, 1, channel);
  gen_fill(g, n_channels, 0.5, 2, scale);
  ef_weights *const w = ef_weights_fold(&settings.working, n_channels, channel,
                                        NULL, scale, &settings, NULL);
  assert_non_null(w);
  free(channel);
  free(scale);
  return w;
}

static void check_apply(gen *g, size_t n_channels, size_t n_samples, size_t n) {
  ef_weights *const w = random_weights(g, n_channels, n_samples);
  double *const sample = malloc(n * n_samples * sizeof *sample);
  double *const out = malloc(n * n_channels * sizeof *out);
  double *const other = malloc(n * n_channels * sizeof *other);
  assert_true(sample != NULL && out != NULL && other != NULL);
  gen_fill(g, n * n_samples, 0, 1, sample);
  assert_int_equal(ef_weights_apply(w, n, sample, 1, out, NULL), EF_OK);
  const int jobs[] = {0, 2, 3, 16};
  for (size_t k = 0; k < 4; ++k) {
    memset(other, 0, n * n_channels * sizeof *other);
    assert_int_equal(ef_weights_apply(w, n, sample, jobs[k], other, NULL),
                     EF_OK);
    assert_same_bits(other, out, n * n_channels);
  }
  for (size_t i = 0; i < n; ++i) { /* in batches of one */
    assert_int_equal(ef_weights_apply(w, 1, sample + i * n_samples, 0,
                                      other + i * n_channels, NULL),
                     EF_OK);
  }
  assert_same_bits(other, out, n * n_channels);
  /* Against the plain sum, for one spectrum. */
  const double *const matrix = ef_weights_matrix(w);
  const size_t i = n / 2;
  for (size_t c = 0; c < n_channels; ++c) {
    double sum = 0;
    for (size_t s = 0; s < n_samples; ++s) {
      sum += matrix[c * n_samples + s] * sample[i * n_samples + s];
    }
    assert_near(out[i * n_channels + c], sum,
                (double)n_samples * DBL_EPSILON * (double)n_samples);
  }
  free(sample);
  free(out);
  free(other);
  ef_weights_free(w);
}

static void applying_does_not_depend_on_batch_or_jobs(void **state) {
  (void)state;
  gen g = gen_new(36);
  check_apply(&g, 3, 31, 40000); /* several chunks */
  check_apply(&g, 3, 36, 33);
  check_apply(&g, 3, 1, 5);
  check_apply(&g, 1, 7, 100);
  check_apply(&g, 2, 81, 65);
  check_apply(&g, 5, 401, 700);
  check_apply(&g, 7, 2, 129);
  check_apply(&g, 3001, 36, 40); /* a thousand observers: many tiles */
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(resampling_is_linear),
      cmocka_unit_test(rules_are_exact_on_their_polynomials),
      cmocka_unit_test(smooth_rules_have_no_kinks),
      cmocka_unit_test(folding_equals_resampling_and_summing),
      cmocka_unit_test(transposed_operator_is_the_transposed),
      cmocka_unit_test(held_weights_sum_to_the_channel),
      cmocka_unit_test(applying_does_not_depend_on_batch_or_jobs),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
