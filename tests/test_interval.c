/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Intervals and goodness of fit: against a search by hand, at the edges, and
 * what is refused. How often they hold the truth: laws/law_coverage.c. */
#include <stdlib.h>

#include "fail_alloc.h"
#include "near.h"

#include "panel/panel_private.h"

enum { MAX = 12, M = EF__PARAMETERS };

typedef struct answers {
  size_t n;
  double level[MAX];
  size_t shown[MAX], positive[MAX];
} answers;

static const answers forced = {7,
                               {1, 1.7, 2.4, 3, 3.6, 4.3, 5},
                               {40, 40, 40, 40, 40, 40, 40},
                               {21, 19, 25, 29, 36, 38, 39}};
static const answers greater = {
    5, {8, 9, 10, 11, 12}, {100, 100, 100, 100, 100}, {1, 5, 29, 66, 93}};

static ef_fit fit_of(const answers *a, const ef_fit_settings *settings) {
  const ef_responses responses = {a->n, a->level, a->shown, a->positive};
  ef_fit fit;
  ef_error error;
  if (ef_fit_responses(&responses, settings, &fit, &error) != EF_OK)
    fail_msg("%s", error.message);
  return fit;
}

static ef_goodness intervals_of(const answers *a,
                                const ef_fit_settings *settings,
                                const ef_interval_settings *intervals,
                                ef_fit *fit) {
  const ef_responses responses = {a->n, a->level, a->shown, a->positive};
  ef_goodness goodness;
  ef_error error;
  if (ef_fit_intervals(&responses, settings, intervals, fit, &goodness,
                       &error) != EF_OK)
    fail_msg("%s", error.message);
  return goodness;
}

/* ---- Profile against a search by hand ------------------------------------ */

/* The least half deviance with the 75 % level at `t` (in 2IFC, gaussian), over
 * a fine grid of slopes and lapses, refined three times. */
static double by_grid(const answers *a, double t) {
  double width_low = 0.05, width_high = 6, lapse_low = 0, lapse_high = 0.06;
  double least = INFINITE;
  for (int round = 0; round < 4; ++round) {
    double best_width = 0, best_lapse = 0;
    const double d_width = (width_high - width_low) / 60;
    const double d_lapse = (lapse_high - lapse_low) / 30;
    for (int i = 0; i <= 60; ++i) {
      for (int j = 0; j <= 30; ++j) {
        ef_psychometric c = {.shape = EF_SHAPE_GAUSSIAN,
                             .axis = EF_AXIS_LINEAR,
                             .task = EF_TASK_2IFC,
                             .location = t,
                             .width = width_low + d_width * i,
                             .guess = 0.5,
                             .lapse = lapse_low + d_lapse * j};
        double value = 0;
        for (size_t r = 0; r < a->n; ++r) {
          const double p = ef_psychometric_value(&c, a->level[r]);
          const double n = (double)a->shown[r], k = (double)a->positive[r];
          value += ef__likelihood_part(k, n, p) +
                   ef__likelihood_part(n - k, n, 1 - p);
        }
        if (value >= least)
          continue;
        least = value;
        best_width = c.width;
        best_lapse = c.lapse;
      }
    }
    if (best_width == 0)
      break;
    width_low = fmax(best_width - 2 * d_width, 0.01);
    width_high = best_width + 2 * d_width;
    lapse_low = fmax(best_lapse - 2 * d_lapse, 0);
    lapse_high = fmin(best_lapse + 2 * d_lapse, 0.06);
  }
  return least;
}

/* At each limit twice the loss is chi-square's 3.8415. The grid ends within
 * 1e-4 of the least value. */
static void profile_limits_by_hand(void **state) {
  (void)state;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  ef_interval_settings i = ef_interval_settings_default();
  i.n_samples = 0;
  ef_fit fit = fit_of(&forced, &s);
  intervals_of(&forced, &s, &i, &fit);
  const double least = 0.5 * fit.deviance;
  assert_near(2 * (by_grid(&forced, fit.threshold.low) - least), 3.84146, 2e-4);
  assert_near(2 * (by_grid(&forced, fit.threshold.high) - least), 3.84146,
              2e-4);
  /* 75 % is the JND in 2IFC, and F = 1/2. */
  assert_near(fit.jnd.low, fit.threshold.low, 1e-6);
  assert_near(fit.jnd.high, fit.threshold.high, 1e-6);
  assert_true(fit.threshold.low < fit.threshold.value &&
              fit.threshold.value < fit.threshold.high);
  /* Lapses cannot leave their limits. */
  assert_near(fit.lapse.low, 0, 0);
  assert_near(fit.lapse.high, 0.06, 1e-12);
}

/* Many answers: the profile is a parabola, and its limits are 1.96 standard
 * errors away. */
static void profile_of_many_answers(void **state) {
  (void)state;
  answers a = greater;
  for (size_t r = 0; r < a.n; ++r) {
    a.shown[r] *= 1000;
    a.positive[r] *= 1000;
  }
  ef_interval_settings i = ef_interval_settings_default();
  i.n_samples = 0;
  i.widen = false; /* a thousand times the same misfit is significant */
  for (int is_log = 0; is_log < 2; ++is_log) {
    ef_fit_settings s = ef_fit_settings_default(EF_TASK_GREATER_LESS);
    s.lapse = 0;
    s.axis = is_log ? EF_AXIS_LOG : EF_AXIS_LINEAR;
    ef_fit fit = fit_of(&a, &s);
    intervals_of(&a, &s, &i, &fit);
    const ef_estimate *const e[] = {&fit.threshold, &fit.equality, &fit.jnd,
                                    &fit.sigma};
    for (size_t k = 0; k < 4; ++k) {
      assert_near_relative(e[k]->value - e[k]->low, 1.959964 * e[k]->se, 0.02);
      assert_near_relative(e[k]->high - e[k]->value, 1.959964 * e[k]->se, 0.02);
    }
  }
}

/* The range of levels, held on a logarithmic axis, is that of the curve at the
 * limit: a curve through it loses just what is allowed. */
static void range_on_a_logarithmic_axis(void **state) {
  (void)state;
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_GREATER_LESS);
  s.lapse = 0;
  s.axis = EF_AXIS_LOG;
  s.shape = EF_SHAPE_WEIBULL; /* not symmetric */
  ef_interval_settings i = ef_interval_settings_default();
  i.n_samples = 0;
  i.widen = false;
  ef_fit fit = fit_of(&greater, &s);
  intervals_of(&greater, &s, &i, &fit);
  for (int side = 0; side < 2; ++side) {
    const double target = side ? fit.jnd.high : fit.jnd.low;
    double least = INFINITE;
    for (double width = 0.005; width < 0.2; width *= 1.0001) {
      ef_psychometric c = fit.curve;
      c.width = width;
      c.location = 0;
      const double range = 0.5 * (ef_psychometric_level(&c, 0.75) -
                                  ef_psychometric_level(&c, 0.25));
      c.location = log10(target / range);
      double value = 0;
      for (size_t r = 0; r < greater.n; ++r) {
        const double p = ef_psychometric_value(&c, greater.level[r]);
        const double n = (double)greater.shown[r];
        const double k = (double)greater.positive[r];
        value +=
            ef__likelihood_part(k, n, p) + ef__likelihood_part(n - k, n, 1 - p);
      }
      least = fmin(least, value);
    }
    assert_near(2 * least - fit.deviance, 3.84146, 1e-3);
  }
}

static void level_of_the_interval(void **state) {
  (void)state;
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  s.lapse = 0.01;
  ef_interval_settings i = ef_interval_settings_default();
  i.n_samples = 0;
  ef_fit narrow = fit_of(&forced, &s), wide = narrow;
  i.level = 0.68;
  intervals_of(&forced, &s, &i, &narrow);
  i.level = 0.99;
  intervals_of(&forced, &s, &i, &wide);
  const double ratio = (wide.threshold.high - wide.threshold.low) /
                       (narrow.threshold.high - narrow.threshold.low);
  assert_near(ratio, 2.5758 / 0.99446, 0.15); /* of normal quantiles */
}

/* ---- Open intervals ------------------------------------------------------ */

/* Levels that all lie above the threshold bound it from above alone. */
static void open_intervals(void **state) {
  (void)state;
  const answers high = {4, {4, 5, 6, 7}, {50, 50, 50, 50}, {40, 43, 46, 49}};
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  s.lapse = 0;
  ef_interval_settings i = ef_interval_settings_default();
  i.n_samples = 0;
  /* At 95 % they would be refused: one share for all levels would do. */
  i.level = 0.999;
  ef_fit fit = fit_of(&high, &s);
  intervals_of(&high, &s, &i, &fit);
  assert_true(fit.extrapolated);
  assert_true(isinf(fit.threshold.low) && fit.threshold.low < 0);
  assert_true(isfinite(fit.threshold.high) && fit.threshold.high < 5);
  assert_true(isinf(fit.sigma.high));
  /* On a logarithmic axis a level has no lower end but 0. */
  s.axis = EF_AXIS_LOG;
  fit = fit_of(&high, &s);
  intervals_of(&high, &s, &i, &fit);
  assert_near(fit.threshold.low, 0, 0);
}

static void intervals_of_a_step(void **state) {
  (void)state;
  const answers step = {4, {1, 2, 4, 5}, {10, 10, 10, 10}, {0, 0, 10, 10}};
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_GREATER_LESS);
  ef_interval_settings i = ef_interval_settings_default();
  for (int boot = 0; boot < 2; ++boot) {
    i.method = boot ? EF_INTERVAL_BOOTSTRAP : EF_INTERVAL_PROFILE;
    ef_fit fit = fit_of(&step, &s);
    const ef_goodness g = intervals_of(&step, &s, &i, &fit);
    assert_near(g.p_value, 1, 1e-3);
    if (boot)
      continue; /* all samples are the same step */
    assert_true(fit.threshold.low > 1.9 && fit.threshold.low < 2.2);
    assert_true(fit.threshold.high > 3.8 && fit.threshold.high < 4.1);
    assert_near(fit.sigma.low, 0, 0);
    assert_true(fit.sigma.high > 0.3 && fit.sigma.high < 3);
    assert_near(fit.jnd.low, 0, 0);
    assert_near(fit.jnd.high, 0.674490 * fit.sigma.high, 1e-6);
  }
}

/* ---- Bootstrap ----------------------------------------------------------- */

static void threads_change_nothing(void **state) {
  (void)state;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  ef_interval_settings i = ef_interval_settings_default();
  i.method = EF_INTERVAL_BOOTSTRAP;
  i.n_samples = 1000;
  i.jobs = 1;
  ef_fit one = fit_of(&forced, &s), three = one, other = one;
  const ef_goodness g_one = intervals_of(&forced, &s, &i, &one);
  i.jobs = 3;
  const ef_goodness g_three = intervals_of(&forced, &s, &i, &three);
  /* Value, standard error and limits of each; between the members of the whole
   * there are bytes that mean nothing. */
  assert_same_bits(&one.threshold.value, &three.threshold.value, 4);
  assert_same_bits(&one.equality.value, &three.equality.value, 4);
  assert_same_bits(&one.jnd.value, &three.jnd.value, 4);
  assert_same_bits(&one.sigma.value, &three.sigma.value, 4);
  assert_same_bits(&one.lapse.value, &three.lapse.value, 4);
  assert_near(g_one.p_value, g_three.p_value, 0);
  i.seed = 2;
  intervals_of(&forced, &s, &i, &other);
  assert_true(other.threshold.low != one.threshold.low);
  /* Both methods look at the same answers. */
  i = ef_interval_settings_default();
  ef_fit profile = fit_of(&forced, &s);
  intervals_of(&forced, &s, &i, &profile);
  const double width = profile.threshold.high - profile.threshold.low;
  assert_near(one.threshold.low, profile.threshold.low, 0.2 * width);
  assert_near(one.threshold.high, profile.threshold.high, 0.2 * width);
}

/* The JND of a yes-no curve rests on the false alarms too: the bootstrap has
 * its limits, a profile has not. */
static void jnd_of_yes_no(void **state) {
  (void)state;
  const answers a = {
      6, {0, 1, 2, 3, 4, 5}, {80, 50, 50, 50, 50, 50}, {9, 11, 20, 31, 43, 48}};
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_YES_NO);
  ef_interval_settings i = ef_interval_settings_default();
  ef_fit fit = fit_of(&a, &s);
  intervals_of(&a, &s, &i, &fit);
  assert_true(isnan(fit.jnd.low) && isnan(fit.jnd.high));
  i.method = EF_INTERVAL_BOOTSTRAP;
  intervals_of(&a, &s, &i, &fit);
  assert_true(fit.jnd.low < fit.jnd.value && fit.jnd.value < fit.jnd.high);
}

/* ---- Goodness ------------------------------------------------------------ */

static void overdispersion_widens(void **state) {
  (void)state;
  /* Every second level off by 12 of 100. */
  const answers off = {6,
                       {1, 2, 3, 4, 5, 6},
                       {100, 100, 100, 100, 100, 100},
                       {14, 8, 46, 40, 90, 86}};
  ef_fit_settings s = ef_fit_settings_default(EF_TASK_YES_NO);
  s.lapse = 0;
  ef_interval_settings i = ef_interval_settings_default();
  ef_fit fit = fit_of(&off, &s), plain = fit;
  const ef_goodness g = intervals_of(&off, &s, &i, &fit);
  assert_true(g.is_overdispersed && g.p_value < 0.01);
  assert_near(g.dispersion, fit.pearson / 4, 1e-12);
  /* t(0.975, 4) = 2.776445 (tables) */
  assert_near(g.widened_by, sqrt(g.dispersion) * 2.776445 / 1.959964, 1e-5);
  i.widen = false;
  const ef_goodness bare = intervals_of(&off, &s, &i, &plain);
  assert_near(bare.widened_by, 1, 0);
  /* The profile is steeper than a parabola on one side, flatter on the other.
   */
  assert_near((fit.threshold.high - fit.threshold.low) /
                  (plain.threshold.high - plain.threshold.low),
              g.widened_by, 0.4 * g.widened_by);
  /* By chi-square without simulation: nearly the same with 100 answers. */
  i.n_samples = 0;
  const ef_goodness chi = intervals_of(&off, &s, &i, &plain);
  assert_true(chi.p_value < 0.01 && chi.n_samples == 0);
}

static void p_value_of_a_good_fit(void **state) {
  (void)state;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  ef_interval_settings i = ef_interval_settings_default();
  ef_fit fit = fit_of(&forced, &s);
  const ef_goodness simulated = intervals_of(&forced, &s, &i, &fit);
  assert_false(simulated.is_overdispersed);
  assert_near(simulated.widened_by, 1, 0);
  i.n_samples = 0;
  const ef_goodness chi = intervals_of(&forced, &s, &i, &fit);
  /* Lapses held at their limits leave the law of chi-square only nearly. */
  assert_near(simulated.p_value, chi.p_value, 0.15);
  /* As many parameters as levels: no degrees of freedom. */
  answers three = forced;
  three.n = 3;
  three.level[1] = 3;
  three.positive[1] = 28;
  three.level[2] = 5;
  three.positive[2] = 38;
  fit = fit_of(&three, &s);
  const ef_goodness none = intervals_of(&three, &s, &i, &fit);
  assert_true(isnan(none.p_value) && isnan(none.dispersion));
  assert_near(none.widened_by, 1, 0);
}

/* ---- Refused ------------------------------------------------------------- */

static void refused(void **state) {
  (void)state;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  const ef_responses responses = {forced.n, forced.level, forced.shown,
                                  forced.positive};
  ef_fit fit = fit_of(&forced, &s);
  ef_goodness g;
  ef_error error;
  ef_interval_settings i = ef_interval_settings_default();
  i.level = 95;
  assert_int_equal(ef_fit_intervals(&responses, &s, &i, &fit, &g, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "interval level is 95, expected between 0.5 and 1");
  i = ef_interval_settings_default();
  i.method = EF_INTERVAL_BOOTSTRAP;
  i.n_samples = 39;
  assert_int_equal(ef_fit_intervals(&responses, &s, &i, &fit, &g, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "39 samples for a bootstrap at level 0.95, expected at "
                      "least 40");
  fit.support = EF_SUPPORT_FLAT;
  i.n_samples = 100;
  assert_int_equal(ef_fit_intervals(&responses, &s, &i, &fit, &g, &error),
                   EF_INVALID);
  assert_string_equal(error.message,
                      "the fit carries no threshold, so it has no interval");
}

static bool attempt_intervals(void *context) {
  (void)context;
  const ef_fit_settings s = ef_fit_settings_default(EF_TASK_2IFC);
  const ef_responses responses = {forced.n, forced.level, forced.shown,
                                  forced.positive};
  ef_interval_settings i = ef_interval_settings_default();
  i.n_samples = 100;
  ef_fit fit;
  ef_goodness g;
  ef_error error;
  if (ef_fit_responses(&responses, &s, &fit, &error) == EF_OK &&
      ef_fit_intervals(&responses, &s, &i, &fit, &g, &error) == EF_OK)
    return true;
  assert_error(&error, EF_NO_MEMORY, "answers");
  return false;
}

static void without_memory(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(attempt_intervals, NULL), 3);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(profile_limits_by_hand),
      cmocka_unit_test(profile_of_many_answers),
      cmocka_unit_test(range_on_a_logarithmic_axis),
      cmocka_unit_test(level_of_the_interval),
      cmocka_unit_test(open_intervals),
      cmocka_unit_test(intervals_of_a_step),
      cmocka_unit_test(threads_change_nothing),
      cmocka_unit_test(jnd_of_yes_no),
      cmocka_unit_test(overdispersion_widens),
      cmocka_unit_test(p_value_of_a_good_fit),
      cmocka_unit_test(refused),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
