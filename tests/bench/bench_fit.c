/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Fits of a seven-level 2IFC experiment beside GSL's simplex
 * minimiser (nmsimplex2) on the same likelihood from the same start, and the
 * bootstrap of 10 000 such fits. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include <gsl/gsl_multimin.h>

#include "bench.h"
#include "panel/panel_private.h"

enum { M = EF__PARAMETERS, LEVELS = 7, SETS = 2000, SAMPLES = 10000 };

static const double level[LEVELS] = {1, 1.7, 2.4, 3, 3.6, 4.3, 5};
static const size_t shown[LEVELS] = {40, 40, 40, 40, 40, 40, 40};

static void draw_set(uint64_t index, size_t positive[LEVELS]) {
  const ef_psychometric truth = {
      EF_SHAPE_GAUSSIAN, EF_AXIS_LINEAR, EF_TASK_2IFC, 3, 1, 0.5, 0.02};
  ef__random random = ef__random_stream(5, index);
  for (size_t i = 0; i < LEVELS; ++i) {
    positive[i] = (size_t)ef__draw_binomial(
        &random, (double)shown[i], ef_psychometric_value(&truth, level[i]));
  }
}

/* Slope as its logarithm and lapses through a logistic function, so that the
 * simplex needs no limits. */
static double simplex_value(const gsl_vector *x, void *context) {
  const ef__likelihood *const set = context;
  const double theta[M] = {gsl_vector_get(x, 0), exp(gsl_vector_get(x, 1)), 0.5,
                           set->high[EF__LAPSE] /
                               (1 + exp(-gsl_vector_get(x, 2)))};
  return ef__likelihood_evaluate(set, theta, NULL, NULL, NULL);
}

/* Half the deviance reached with simplex sizes below 1e-6. */
static double fit_by_simplex(ef__likelihood *set,
                             gsl_multimin_fminimizer *minimiser, gsl_vector *x,
                             gsl_vector *step) {
  gsl_multimin_function f = {simplex_value, 3, set};
  gsl_vector_set(x, 0, 0);
  gsl_vector_set(x, 1, 0.3);
  gsl_vector_set(x, 2, -1);
  gsl_vector_set_all(step, 0.5);
  gsl_multimin_fminimizer_set(minimiser, &f, x, step);
  for (int i = 0; i < 1000; ++i) {
    if (gsl_multimin_fminimizer_iterate(minimiser) != 0 ||
        gsl_multimin_fminimizer_size(minimiser) < 1e-6)
      break;
  }
  return minimiser->fval;
}

/* Every way fits all sets; `value` is half the deviance it reached. */
typedef enum effort { SIMPLEX, ONE_START, THREE_STARTS, SEVEN_STARTS } effort;

typedef struct contest {
  effort how;
  double value[SETS];
} contest;

static ef__data data[SETS];
static ef__likelihood likelihood[SETS];

static void prepare(size_t i) {
  size_t positive[LEVELS];
  draw_set(i, positive);
  void *block; /* kept to the end */
  const ef_responses responses = {LEVELS, level, shown, positive};
  const ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
  if (ef__data_new(&responses, settings.axis, &data[i], &block, NULL) !=
          EF_OK ||
      ef__likelihood_setup(&settings, &data[i], &likelihood[i], NULL) != EF_OK)
    exit(1);
}

/* Where the simplex begins, too. */
static const double origin[M] = {0, 1.35, 0.5, 0.016};

static void run_simplex(contest *c) {
  gsl_multimin_fminimizer *minimiser =
      gsl_multimin_fminimizer_alloc(gsl_multimin_fminimizer_nmsimplex2, 3);
  gsl_vector *x = gsl_vector_alloc(3), *step = gsl_vector_alloc(3);
  for (size_t i = 0; i < SETS; ++i)
    c->value[i] = fit_by_simplex(&likelihood[i], minimiser, x, step);
  gsl_multimin_fminimizer_free(minimiser);
  gsl_vector_free(x);
  gsl_vector_free(step);
}

static void run(void *context) {
  contest *const c = context;
  if (c->how == SIMPLEX) {
    run_simplex(c);
    return;
  }
  for (size_t i = 0; i < SETS; ++i) {
    const ef__objective objective = ef__likelihood_objective(&likelihood[i]);
    ef__minimum best;
    if (c->how == ONE_START)
      ef__minimise(&objective, origin, EF__TOLERANCE, &best);
    else if (c->how == THREE_STARTS)
      ef__maximise(&likelihood[i], origin, true, EF__TOLERANCE_QUICK, &best);
    else
      ef__maximise(&likelihood[i], NULL, false, EF__TOLERANCE, &best);
    c->value[i] = best.value;
  }
}

static void run_bootstrap(void *jobs) {
  size_t positive[LEVELS];
  draw_set(3, positive);
  const ef_responses responses = {LEVELS, level, shown, positive};
  const ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
  ef_interval_settings intervals = ef_interval_settings_default();
  intervals.method = EF_INTERVAL_BOOTSTRAP;
  intervals.n_samples = SAMPLES;
  intervals.jobs = *(const int *)jobs;
  ef_fit fit;
  ef_goodness goodness;
  if (ef_fit_responses(&responses, &settings, &fit, NULL) != EF_OK ||
      ef_fit_intervals(&responses, &settings, &intervals, &fit, &goodness,
                       NULL) != EF_OK)
    exit(1);
}

int main(void) {
  static contest contests[] = {
      {.how = SIMPLEX}, {.how = ONE_START}, {.how = THREE_STARTS},
      {.how = SEVEN_STARTS}};
  bench_entry entry[] = {{"fit_simplex", run, &contests[0], false, 0},
                         {"fit_one_start", run, &contests[1], false, 0},
                         {"fit_three_starts", run, &contests[2], false, 0},
                         {"fit_seven_starts", run, &contests[3], false, 0}};
  ef__gsl_ready();
  for (size_t i = 0; i < SETS; ++i) prepare(i);
  bench_run(4, entry);
  bench_per_item(4, entry, SETS);
  bench_value("fits_per_second", SETS / entry[2].seconds, "fits");
  bench_value("fits_per_second_simplex", SETS / entry[0].seconds, "fits");
  for (size_t k = 0; k < 4; ++k) {
    size_t reached = 0;
    for (size_t i = 0; i < SETS; ++i) {
      double best = contests[0].value[i];
      for (size_t j = 1; j < 4; ++j) best = fmin(best, contests[j].value[i]);
      reached += contests[k].value[i] - best <= 1e-4;
    }
    char name[64];
    snprintf(name, sizeof name, "%s_reach", entry[k].name);
    bench_value(name, (double)reached / SETS, "of the best likelihood known");
  }
  bench_row("psychometric fit, 7 levels, as in a bootstrap", "GSL simplex",
            &entry[2], &entry[0], 3);
  bench_row("psychometric fit, 7 levels, as for a user", "GSL simplex",
            &entry[3], &entry[0], 0);
  int one = 1, two = 2;
  bench_entry threads[] = {{"bootstrap_one_thread", run_bootstrap, &one, true, 0},
                           {"bootstrap_two_threads", run_bootstrap, &two, true,
                            0}};
  bench_run(2, threads);
  bench_per_item(2, threads, SAMPLES);
  bench_row("bootstrap of 10^4 fits, two threads, wall", "itself, one thread",
            &threads[1], &threads[0], 0);
  return 0;
}
