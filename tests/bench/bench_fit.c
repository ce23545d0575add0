/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Fits of a seven-level 2IFC experiment a second, beside GSL's simplex
 * minimiser (nmsimplex2) on the same likelihood from the same start, and the
 * bootstrap of 10 000 such fits. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include <gsl/gsl_multimin.h>

#include "panel/panel_private.h"

enum { M = EF__PARAMETERS, LEVELS = 7, SETS = 2000, SAMPLES = 10000 };

static double read_clock(clockid_t which) {
  struct timespec t;
  clock_gettime(which, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Processor time, which other work on the machine does not disturb. */
static double now_s(void) {
  return read_clock(CLOCK_PROCESS_CPUTIME_ID);
}

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
  const ef__likelihood *const likelihood = context;
  const double theta[M] = {gsl_vector_get(x, 0), exp(gsl_vector_get(x, 1)), 0.5,
                           likelihood->high[EF__LAPSE] /
                               (1 + exp(-gsl_vector_get(x, 2)))};
  return ef__likelihood_evaluate(likelihood, theta, NULL, NULL, NULL);
}

/* Half the deviance reached with simplex sizes below 1e-6. */
static double fit_by_simplex(ef__likelihood *likelihood,
                             gsl_multimin_fminimizer *minimiser, gsl_vector *x,
                             gsl_vector *step, int *n_steps) {
  gsl_multimin_function f = {simplex_value, 3, likelihood};
  gsl_vector_set(x, 0, 0);
  gsl_vector_set(x, 1, 0.3);
  gsl_vector_set(x, 2, -1);
  gsl_vector_set_all(step, 0.5);
  gsl_multimin_fminimizer_set(minimiser, &f, x, step);
  for (int i = 0; i < 1000; ++i) {
    (*n_steps)++;
    if (gsl_multimin_fminimizer_iterate(minimiser) != 0 ||
        gsl_multimin_fminimizer_size(minimiser) < 1e-6)
      break;
  }
  return minimiser->fval;
}

typedef struct result {
  double seconds, value[SETS];
} result;

static void prepare(uint64_t i, ef__data *data, void **block,
                    ef__likelihood *likelihood) {
  size_t positive[LEVELS];
  draw_set(i, positive);
  const ef_responses responses = {LEVELS, level, shown, positive};
  const ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
  if (ef__data_new(&responses, settings.axis, data, block, NULL) != EF_OK ||
      ef__likelihood_setup(&settings, data, likelihood, NULL) != EF_OK)
    exit(1);
}

typedef enum effort { ONE_START, THREE_STARTS, SEVEN_STARTS } effort;

/* Where the simplex begins, too. */
static const double origin[M] = {0, 1.35, 0.5, 0.016};

static void run_ours(effort how, result *out) {
  out->seconds = 0;
  for (size_t i = 0; i < SETS; ++i) {
    ef__data data;
    void *block;
    ef__likelihood likelihood;
    prepare(i, &data, &block, &likelihood);
    const ef__objective objective = ef__likelihood_objective(&likelihood);
    ef__minimum best;
    const double begin = now_s();
    if (how == ONE_START)
      ef__minimise(&objective, origin, EF__TOLERANCE, &best);
    else if (how == THREE_STARTS)
      ef__maximise(&likelihood, origin, true, EF__TOLERANCE_QUICK, &best);
    else
      ef__maximise(&likelihood, NULL, false, EF__TOLERANCE, &best);
    out->seconds += now_s() - begin;
    out->value[i] = best.value;
    free(block);
  }
}

static void run_simplex(result *out, int *n_steps) {
  gsl_multimin_fminimizer *minimiser =
      gsl_multimin_fminimizer_alloc(gsl_multimin_fminimizer_nmsimplex2, 3);
  gsl_vector *x = gsl_vector_alloc(3), *step = gsl_vector_alloc(3);
  out->seconds = 0;
  for (size_t i = 0; i < SETS; ++i) {
    ef__data data;
    void *block;
    ef__likelihood likelihood;
    prepare(i, &data, &block, &likelihood);
    const double begin = now_s();
    out->value[i] = fit_by_simplex(&likelihood, minimiser, x, step, n_steps);
    out->seconds += now_s() - begin;
    free(block);
  }
  gsl_multimin_fminimizer_free(minimiser);
  gsl_vector_free(x);
  gsl_vector_free(step);
}

static void run_bootstrap(int jobs) {
  size_t positive[LEVELS];
  draw_set(3, positive);
  const ef_responses responses = {LEVELS, level, shown, positive};
  const ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
  ef_interval_settings intervals = ef_interval_settings_default();
  intervals.method = EF_INTERVAL_BOOTSTRAP;
  intervals.n_samples = SAMPLES;
  intervals.jobs = jobs;
  ef_fit fit;
  ef_goodness goodness;
  if (ef_fit_responses(&responses, &settings, &fit, NULL) != EF_OK)
    exit(1);
  const double begin = now_s(), wall = read_clock(CLOCK_MONOTONIC);
  if (ef_fit_intervals(&responses, &settings, &intervals, &fit, &goodness,
                       NULL) != EF_OK)
    exit(1);
  printf("bootstrap of %d fits, %d thread%s: %.3f s of processor, %.3f s on "
         "the wall\n",
         SAMPLES, jobs, jobs == 1 ? "" : "s", now_s() - begin,
         read_clock(CLOCK_MONOTONIC) - wall);
}

/* Sets where `a` stops above `b` by more than rounding and tolerance. */
static size_t worse(const result *a, const result *b) {
  size_t n = 0;
  for (size_t i = 0; i < SETS; ++i)
    n += a->value[i] - b->value[i] > 1e-4;
  return n;
}

static void print_row(const char *name, const result *r, const result *simplex,
                      const result *best) {
  printf("  %-34s %9.0f  %6.1f  %6zu\n", name, SETS / r->seconds,
         simplex->seconds / r->seconds, worse(r, best));
}

int main(void) {
  static result one, three, seven, simplex, best;
  int n_steps = 0;
  ef__gsl_ready();
  run_ours(ONE_START, &one);
  run_ours(THREE_STARTS, &three);
  run_ours(SEVEN_STARTS, &seven);
  run_simplex(&simplex, &n_steps);
  for (size_t i = 0; i < SETS; ++i) {
    best.value[i] = fmin(fmin(one.value[i], three.value[i]),
                         fmin(seven.value[i], simplex.value[i]));
  }
  printf("7 levels, 3 parameters, %d data sets, one thread, processor time\n"
         "  %-34s %9s  %6s  %s\n",
         SETS, "", "fits/s", "ratio", "sets short of the best");
  print_row("nmsimplex2 of GSL, one start", &simplex, &simplex, &best);
  print_row("ours, one start", &one, &simplex, &best);
  print_row("ours, three starts (bootstrap)", &three, &simplex, &best);
  print_row("ours, seven starts (a user's fit)", &seven, &simplex, &best);
  run_bootstrap(1);
  run_bootstrap(2);
  return 0;
}
