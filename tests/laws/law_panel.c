/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Curves, likelihood and fit: laws over seeded random inputs. */
#include <stdlib.h>

#include "gen.h"
#include "near.h"

#include "panel/panel_private.h"

enum { M = EF__PARAMETERS };

static const ef__model models[] = {
    {EF_SHAPE_GAUSSIAN, EF_TASK_YES_NO, false},
    {EF_SHAPE_LOGISTIC, EF_TASK_GREATER_LESS, true},
    {EF_SHAPE_WEIBULL, EF_TASK_2IFC, false},
    {EF_SHAPE_DETECTION, EF_TASK_2IFC, false},
    {EF_SHAPE_DETECTION, EF_TASK_TRIANGLE, false},
    {EF_SHAPE_DETECTION, EF_TASK_YES_NO, false},
    {EF_SHAPE_DETECTION, EF_TASK_SAME_DIFFERENT, false},
};
enum { MODELS = sizeof models / sizeof models[0] };

/* Parameters well inside their limits. */
static void random_parameters(gen *g, const ef__model *model, double *theta) {
  theta[EF__INTERCEPT] = gen_between(g, -1, 1);
  theta[EF__SLOPE] = gen_between(g, 0.5, 2);
  theta[EF__GUESS] = ef__model_guess(model, gen_between(g, 0.02, 0.4));
  theta[EF__LAPSE] = gen_between(g, 0.005, 0.05);
}

/* Central differences of step h on values of size 1 are right to about h^2 and
 * epsilon / h: 1e-9 for h = 1e-5. */
static void derivatives_are_those_of_the_value(void **state) {
  (void)state;
  gen g = gen_new(11);
  for (size_t i = 0; i < 200 * MODELS; ++i) {
    const ef__model *const model = &models[i % MODELS];
    double theta[M];
    random_parameters(&g, model, theta);
    const double eta = gen_between(&g, -2.5, 1.6);
    const double h = 1e-5;
    ef__point at, up, down;
    ef__model_point(model, eta, false, theta[EF__GUESS], theta[EF__LAPSE], &at);
    assert_near(at.p + at.q, 1, 1e-15);
    ef__model_point(model, eta + h, false, theta[EF__GUESS], theta[EF__LAPSE],
                    &up);
    ef__model_point(model, eta - h, false, theta[EF__GUESS], theta[EF__LAPSE],
                    &down);
    assert_near(at.p_eta, (up.p - down.p) / (2 * h), 1e-9);
    assert_near(at.p_eta_eta, (up.p_eta - down.p_eta) / (2 * h), 1e-9);
    assert_near(at.p_eta_guess, (up.p_guess - down.p_guess) / (2 * h), 1e-9);
    assert_near(at.p_eta_lapse, (up.p_lapse - down.p_lapse) / (2 * h), 1e-9);
    ef__model_point(model, eta, false, theta[EF__GUESS] + h, theta[EF__LAPSE],
                    &up);
    ef__model_point(model, eta, false, theta[EF__GUESS] - h, theta[EF__LAPSE],
                    &down);
    assert_near(at.p_guess, (up.p - down.p) / (2 * h), 1e-9);
    assert_near(at.p_guess_guess, (up.p_guess - down.p_guess) / (2 * h), 1e-9);
    assert_near(at.p_guess_lapse, (up.p_lapse - down.p_lapse) / (2 * h), 1e-9);
    ef__model_point(model, eta, false, theta[EF__GUESS], theta[EF__LAPSE] + h,
                    &up);
    ef__model_point(model, eta, false, theta[EF__GUESS], theta[EF__LAPSE] - h,
                    &down);
    assert_near(at.p_lapse, (up.p - down.p) / (2 * h), 1e-9);
  }
}

/* Gradient and curvature of the whole likelihood, blank included. Sums of 120
 * answers: relative to their size of up to 1e3. */
static void likelihood_has_its_own_gradient(void **state) {
  (void)state;
  gen g = gen_new(12);
  for (size_t i = 0; i < 40 * MODELS; ++i) {
    double t[6] = {0, -1.2, -0.5, 0, 0.6, 1.1};
    double shown[6], positive[6];
    for (size_t r = 0; r < 6; ++r) {
      shown[r] = 20;
      positive[r] = (double)(1 + gen_below(&g, 18));
    }
    const ef__data data = {.n = 6,
                           .has_blank = true,
                           .scale = 1,
                           .t = t,
                           .shown = shown,
                           .positive = positive};
    const ef__likelihood likelihood = {.model = models[i % MODELS],
                                       .data = &data};
    double theta[M], gradient[M], curvature[M * M], expected[M * M];
    random_parameters(&g, &likelihood.model, theta);
    ef__likelihood_evaluate(&likelihood, theta, gradient, curvature, expected);
    for (size_t j = 0; j < M; ++j) {
      double up[M], down[M], g_up[M], g_down[M], unused[M * M], too[M * M];
      const double h = 1e-6;
      memcpy(up, theta, sizeof up);
      memcpy(down, theta, sizeof down);
      up[j] += h;
      down[j] -= h;
      const double above =
          ef__likelihood_evaluate(&likelihood, up, g_up, unused, too);
      const double below =
          ef__likelihood_evaluate(&likelihood, down, g_down, unused, too);
      assert_near(gradient[j], (above - below) / (2 * h),
                  1e-6 * (1 + fabs(gradient[j])));
      for (size_t k = 0; k < M; ++k) {
        const double numeric = (g_up[k] - g_down[k]) / (2 * h);
        assert_near(curvature[M * j + k], numeric,
                    1e-6 * (100 + fabs(numeric)));
      }
    }
  }
}

/* Share -> level -> share, and the slope is the derivative. */
static void level_inverts_value(void **state) {
  (void)state;
  gen g = gen_new(13);
  for (size_t i = 0; i < 300 * MODELS; ++i) {
    const ef__model *const model = &models[i % MODELS];
    const double chance = ef_task_chance(model->task);
    ef_psychometric curve = {
        .shape = model->shape,
        .task = model->task,
        .axis = model->shape == EF_SHAPE_DETECTION || gen_below(&g, 2) == 0
                    ? EF_AXIS_LOG
                    : EF_AXIS_LINEAR,
        .location = gen_between(&g, -1, 1),
        .width = gen_between(&g, 0.05, 0.8),
        .guess = isnan(chance) ? gen_between(&g, 0.02, 0.3) : chance,
        .lapse = 0};
    const double share =
        curve.guess + (1 - curve.guess) * gen_between(&g, 0.05, 0.95);
    const double level = ef_psychometric_level(&curve, share);
    assert_near(ef_psychometric_value(&curve, level), share, 1e-13);
    const double h = 1e-6 * fmax(fabs(level), 1e-3);
    const double numeric = (ef_psychometric_value(&curve, level + h) -
                            ef_psychometric_value(&curve, level - h)) /
                           (2 * h);
    assert_near(ef_psychometric_slope(&curve, level), numeric,
                1e-6 * (1 + numeric));
  }
}

static void d_prime_inverts_proportion(void **state) {
  (void)state;
  gen g = gen_new(14);
  for (size_t i = 0; i < 1000; ++i) {
    const ef_task task = (ef_task)(i % 5);
    const double alarms = gen_between(&g, 0.01, 0.5);
    const double d = gen_between(&g, 0.05, 4);
    /* conditioned by the slope of the share, above 1e-3 here */
    assert_near(
        ef_task_d_prime(task, alarms, ef_task_proportion(task, alarms, d)), d,
        1e-11);
    assert_near(ef_task_best_d_prime(task, ef_task_best_correct(task, d)), d,
                1e-11);
  }
}

/* No other criterion k gives more right answers in same-different. */
static void best_correct_is_the_best(void **state) {
  (void)state;
  for (double d = 0.2; d < 5; d += 0.3) {
    const double best = ef_task_best_correct(EF_TASK_SAME_DIFFERENT, d);
    double largest = 0;
    for (double k = 0.001; k < 8; k += 0.001) {
      const double alarms = erfc(k / 2); /* 2 Phi(-k / sqrt 2) */
      const double hits = ef_task_proportion(EF_TASK_SAME_DIFFERENT, alarms, d);
      largest = fmax(largest, 0.5 * (hits + 1 - alarms));
    }
    assert_true(largest <= best + 1e-15);
    /* The top, of curvature below 1, is missed by at most 0.0005. */
    assert_near(largest, best, 0.5 * 0.0005 * 0.0005);
  }
}

/* ---- Fit ----------------------------------------------------------------- */

enum { ROWS = 8 };

typedef struct sample {
  double level[2 * ROWS];
  size_t shown[2 * ROWS], positive[2 * ROWS];
} sample;

/* An ordinary experiment of the task, 50 answers a level. */
static void draw_sample(gen *g, const ef_psychometric *truth, size_t n,
                        sample *out) {
  for (size_t i = 0; i < n; ++i) {
    const double t =
        truth->location + truth->width * (-2 + 4 * (double)i / (double)(n - 1));
    out->level[i] = ef__axis_level(truth->axis, t);
    out->shown[i] = 50;
    out->positive[i] = 0;
    for (size_t k = 0; k < 50; ++k) {
      out->positive[i] +=
          gen_unit(g) < ef_psychometric_value(truth, out->level[i]);
    }
  }
}

static ef_fit fit_or_fail(const sample *s, size_t n,
                          const ef_fit_settings *settings) {
  const ef_responses responses = {n, s->level, s->shown, s->positive};
  ef_fit fit;
  ef_error error;
  if (ef_fit_responses(&responses, settings, &fit, &error) != EF_OK)
    fail_msg("%s", error.message);
  return fit;
}

static const ef_psychometric ordinary = {.shape = EF_SHAPE_GAUSSIAN,
                                         .axis = EF_AXIS_LINEAR,
                                         .task = EF_TASK_2IFC,
                                         .location = 3,
                                         .width = 1.2,
                                         .guess = 0.5,
                                         .lapse = 0.02};

/* Rows in any order, levels split over rows, trial by trial: the same fit. */
static void arrangement_does_not_matter(void **state) {
  (void)state;
  gen g = gen_new(15);
  const ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
  for (int i = 0; i < 50; ++i) {
    sample s, mixed;
    draw_sample(&g, &ordinary, ROWS, &s);
    const ef_fit fit = fit_or_fail(&s, ROWS, &settings);
    for (size_t r = 0; r < ROWS; ++r) {
      const size_t part = s.positive[r] / 2; /* of 10, from the far end */
      const size_t some = part < 10 ? part : 10;
      mixed.level[r] = mixed.level[2 * ROWS - 1 - r] = s.level[r];
      mixed.shown[r] = 10;
      mixed.positive[r] = some;
      mixed.shown[2 * ROWS - 1 - r] = 40;
      mixed.positive[2 * ROWS - 1 - r] = s.positive[r] - some;
      if (s.positive[r] - some > 40)
        fail_msg("the split is wrong");
    }
    const ef_fit again = fit_or_fail(&mixed, 2 * ROWS, &settings);
    /* The whole by its values: between its members are bytes without meaning. */
    assert_same_bits(&fit.curve.location, &again.curve.location, 4);
    assert_same_bits(fit.covariance, again.covariance, 16);
    assert_same_bits(&fit.threshold.value, &again.threshold.value, 4);
    assert_same_bits(&fit.jnd.value, &again.jnd.value, 4);
    assert_same_bits(&fit.sigma.value, &again.sigma.value, 4);
    assert_same_bits(&fit.lapse.value, &again.lapse.value, 4);
    assert_same_bits(&fit.deviance, &again.deviance, 1);
  }
}

/* Levels in another unit scale thresholds and JND, and nothing else; on a
 * logarithmic axis they shift the location. */
static void unit_of_the_levels_does_not_matter(void **state) {
  (void)state;
  gen g = gen_new(16);
  for (int i = 0; i < 60; ++i) {
    sample s;
    draw_sample(&g, &ordinary, ROWS, &s);
    ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
    if (i % 2 == 1) {
      settings.axis = EF_AXIS_LOG;
      for (size_t r = 0; r < ROWS; ++r)
        s.level[r] = exp(s.level[r]);
    }
    const ef_fit fit = fit_or_fail(&s, ROWS, &settings);
    const double unit = 1000;
    for (size_t r = 0; r < ROWS; ++r)
      s.level[r] *= unit;
    const ef_fit scaled = fit_or_fail(&s, ROWS, &settings);
    assert_near_relative(scaled.threshold.value, unit * fit.threshold.value,
                         1e-9);
    assert_int_equal(scaled.support, fit.support);
    if (fit.support == EF_SUPPORT_FULL)
      assert_near_relative(scaled.threshold.se, unit * fit.threshold.se, 1e-7);
    assert_near_relative(scaled.jnd.value, unit * fit.jnd.value, 1e-9);
    assert_near(scaled.deviance, fit.deviance, 1e-10);
    assert_near(scaled.lapse.value, fit.lapse.value, 1e-9);
  }
}

/* Nothing near the fit is more likely: 200 tries around each. */
static void fit_is_a_maximum(void **state) {
  (void)state;
  gen g = gen_new(17);
  for (size_t i = 0; i < 10 * MODELS; ++i) {
    const ef__model *const model = &models[i % MODELS];
    const double chance = ef_task_chance(model->task);
    ef_psychometric truth = ordinary;
    truth.shape = model->shape;
    truth.task = model->task;
    truth.guess = isnan(chance) ? 0.1 : chance;
    truth.axis = EF_AXIS_LOG;
    truth.location = 0.3;
    truth.width = 0.25;
    sample s;
    draw_sample(&g, &truth, ROWS, &s);
    s.level[ROWS] = 0;
    s.shown[ROWS] = 50;
    s.positive[ROWS] = (size_t)(50 * truth.guess);
    const ef_responses responses = {ROWS + 1, s.level, s.shown, s.positive};
    ef_fit_settings settings = ef_fit_settings_default(model->task);
    settings.shape = model->shape;
    settings.axis = EF_AXIS_LOG;
    ef__data data;
    void *block;
    ef_error error;
    assert_int_equal(
        ef__data_new(&responses, EF_AXIS_LOG, &data, &block, &error), EF_OK);
    ef__likelihood likelihood;
    assert_int_equal(
        ef__likelihood_setup(&settings, &data, &likelihood, &error), EF_OK);
    ef__minimum best;
    ef__maximise(&likelihood, NULL, false, EF__TOLERANCE, &best);
    assert_true(best.converged);
    for (int k = 0; k < 200; ++k) {
      double near[M];
      const double far = pow(10, gen_between(&g, -4, 0));
      for (size_t j = 0; j < M; ++j) {
        near[j] = best.x[j] + far * gen_normal(&g);
        near[j] = fmin(fmax(near[j], likelihood.low[j]), likelihood.high[j]);
      }
      const double value =
          ef__likelihood_evaluate(&likelihood, near, NULL, NULL, NULL);
      assert_true(!(value < best.value - 1e-12));
    }
    free(block);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(derivatives_are_those_of_the_value),
      cmocka_unit_test(likelihood_has_its_own_gradient),
      cmocka_unit_test(level_inverts_value),
      cmocka_unit_test(d_prime_inverts_proportion),
      cmocka_unit_test(best_correct_is_the_best),
      cmocka_unit_test(arrangement_does_not_matter),
      cmocka_unit_test(unit_of_the_levels_does_not_matter),
      cmocka_unit_test(fit_is_a_maximum),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
