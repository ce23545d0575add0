/* SPDX-License-Identifier: GPL-3.0-or-later */
/* 1000 observers x 1000 pairs at 1 nm: ef_population_spread beside a plain loop
 * that takes one observer after the other and one pair after the other. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

#include <evenfield/match.h>

#include "gen.h"

enum { N_OBSERVERS = 1000, N_PAIRS = 1000, N_LOOP = 50, SAMPLES = 401 };

/* Time on the wall and on the processors, which other work does not disturb. */
typedef struct span {
  double wall_s, busy_s;
} span;

static double read_clock(clockid_t which) {
  struct timespec t;
  clock_gettime(which, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static span now(void) {
  return (span){read_clock(CLOCK_MONOTONIC),
                read_clock(CLOCK_PROCESS_CPUTIME_ID)};
}

static span since(span start) {
  const span end = now();
  return (span){end.wall_s - start.wall_s, end.busy_s - start.busy_s};
}

static void print_span(const char *what, span taken) {
  printf("  %-28s %7.3f s   %7.3f s\n", what, taken.wall_s, taken.busy_s);
}

static void give_up(const char *what, const ef_error *error) {
  fprintf(stderr, "%s: %s\n", what, error->message);
  exit(1);
}

static ef_xyz dot_3(const double *weights, const double *sample,
                    double factor) {
  double xyz[3];
  for (size_t c = 0; c < 3; ++c) {
    double sum = 0;
    for (size_t j = 0; j < SAMPLES; ++j) {
      sum += weights[c * SAMPLES + j] * sample[j];
    }
    xyz[c] = factor * sum;
  }
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

/* The work of one observer as one would write it down, one pair at a time. */
static double one_observer(const ef_population *population, size_t i,
                           const ef_side *target, const ef_side *match,
                           const ef_metric *metric) {
  ef_error error;
  const ef_cone_model model = ef_population_member(population, i);
  ef_observer *const observer = ef_observer_from_model(&model, &error);
  if (observer == NULL) give_up("observer", &error);
  ef_weights *const weights = ef_observer_weights(
      observer, EF_TRISTIMULUS, &target->grid, &target->viewing, NULL, &error);
  if (weights == NULL) give_up("weights", &error);
  const double *const matrix = ef_weights_matrix(weights);
  const ef_xyz white = dot_3(matrix, match->white, 1);
  const double factor = 100 / white.Y;
  const ef_conditions conditions = ef_conditions_default(
      (ef_xyz){factor * white.X, 100, factor * white.Z});
  double sum = 0;
  for (size_t p = 0; p < N_PAIRS; ++p) {
    double reference[3], sample[3];
    ef_metric_coordinates(
        metric, dot_3(matrix, target->sample + p * SAMPLES, factor),
        &conditions, reference);
    ef_metric_coordinates(
        metric, dot_3(matrix, match->sample + p * SAMPLES, factor),
        &conditions, sample);
    sum += ef_metric_difference(metric, reference, sample);
  }
  ef_weights_free(weights);
  ef_observer_free(observer);
  return sum;
}

/* Sums the differences of the first N_LOOP observers; returns their time scaled
 * up to all of them. */
static span time_loop(const ef_population *population, const ef_side *target,
                      const ef_side *match, const ef_metric *metric,
                      double *sum) {
  const double factor = (double)N_OBSERVERS / N_LOOP;
  const span start = now();
  *sum = 0;
  for (size_t i = 0; i < N_LOOP; ++i) {
    *sum += one_observer(population, i, target, match, metric);
  }
  const span taken = since(start);
  return (span){factor * taken.wall_s, factor * taken.busy_s};
}

int main(void) {
  gen g = gen_new(1);
  ef_error error;
  double *const sample = malloc(2 * N_PAIRS * SAMPLES * sizeof *sample);
  double *const difference =
      malloc((size_t)N_PAIRS * N_OBSERVERS * sizeof *difference);
  ef_spread *const spread = malloc(N_PAIRS * sizeof *spread);
  static double white[SAMPLES];
  for (size_t i = 0; i < 2 * N_PAIRS; ++i) {
    gen_smooth(&g, SAMPLES, sample + i * SAMPLES);
  }
  for (size_t j = 0; j < SAMPLES; ++j) white[j] = 1;
  const ef_side target = {
      .grid = {.count = SAMPLES, .start_nm = 380, .step_nm = 1},
      .sample = sample,
      .viewing = ef_viewing_default(NULL),
      .white = white};
  ef_side match = target;
  match.sample = sample + N_PAIRS * SAMPLES;
  ef_population_settings settings = ef_population_settings_default();
  settings.count = N_OBSERVERS;
  ef_population *const population = ef_population_new(&settings, &error);
  if (population == NULL) give_up("population", &error);
  const ef_spread_settings how = ef_spread_settings_default();
  const int jobs[3] = {1, 2, 0};
  span taken[3];
  for (size_t k = 0; k < 3; ++k) {
    const span start = now();
    if (ef_population_spread(population, N_PAIRS, &target, &match, &how,
                             jobs[k], spread, difference, NULL,
                             &error) != EF_OK) {
      give_up("spread", &error);
    }
    taken[k] = since(start);
  }
  double loop_sum, sum = 0;
  const span loop =
      time_loop(population, &target, &match, how.metric, &loop_sum);
  for (size_t i = 0; i < N_LOOP; ++i) {
    for (size_t p = 0; p < N_PAIRS; ++p) {
      sum += difference[p * N_OBSERVERS + i];
    }
  }
  printf("%d observers x %d pairs, %d samples at 1 nm, CIEDE2000\n",
         N_OBSERVERS, N_PAIRS, SAMPLES);
  printf("  %-28s %9s   %9s\n", "", "wall", "processor");
  print_span("one job", taken[0]);
  print_span("two jobs", taken[1]);
  print_span("all cores", taken[2]);
  print_span("plain loop, from 50 observers", loop);
  printf("  plain loop / one job, processor time: %.1f\n"
         "  plain loop / two jobs, wall:          %.1f\n",
         loop.busy_s / taken[0].busy_s, loop.wall_s / taken[1].wall_s);
  printf("  sum of the differences, relative to the loop's: %.2g\n",
         fabs(sum / loop_sum - 1));
  ef_population_free(population);
  free(spread);
  free(difference);
  free(sample);
  return fabs(sum / loop_sum - 1) < 1e-9 ? 0 : 1;
}
