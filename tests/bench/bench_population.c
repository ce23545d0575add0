/* SPDX-License-Identifier: GPL-3.0-or-later */
/* 1000 observers x 1000 pairs at 1 nm: ef_population_spread beside a plain loop
 * that takes one observer after the other and one pair after the other. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include <evenfield/match.h>

#include "bench.h"
#include "gen.h"

enum { N_OBSERVERS = 1000, N_PAIRS = 1000, N_LOOP = 50, SAMPLES = 401 };

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

typedef struct contest {
  const ef_population *population;
  const ef_side *target, *match;
  const ef_spread_settings *how;
  int jobs;
  ef_spread *spread;
  double *difference;
  double loop_sum;
} contest;

/* The first N_LOOP observers only. */
static void run_loop(void *context) {
  contest *const c = context;
  c->loop_sum = 0;
  for (size_t i = 0; i < N_LOOP; ++i) {
    c->loop_sum +=
        one_observer(c->population, i, c->target, c->match, c->how->metric);
  }
}

static void run_spread(void *context) {
  contest *const c = context;
  ef_error error;
  if (ef_population_spread(c->population, N_PAIRS, c->target, c->match, c->how,
                           c->jobs, c->spread, c->difference, NULL,
                           &error) != EF_OK) {
    give_up("spread", &error);
  }
}

int main(void) {
  gen g = gen_new(1);
  ef_error error;
  double *const sample = bench_allocate(2 * N_PAIRS * SAMPLES, sizeof *sample);
  double *const difference =
      bench_allocate((size_t)N_PAIRS * N_OBSERVERS, sizeof *difference);
  ef_spread *const spread = bench_allocate(N_PAIRS, sizeof *spread);
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
  contest one = {population, &target, &match, &how, 1, spread, difference, 0};
  contest two = one;
  two.jobs = 2;
  bench_entry entry[] = {{"population_loop", run_loop, &one, false, 0},
                         {"population_one_thread", run_spread, &one, false, 0},
                         {"population_two_threads", run_spread, &two, true, 0}};
  bench_run(3, entry);
  entry[0].seconds *= (double)N_OBSERVERS / N_LOOP;
  bench_per_item(3, entry, (double)N_OBSERVERS * N_PAIRS);
  bench_row("1000 observers x 1000 pairs, 401 samples, CIEDE2000",
            "plain loop, one observer after the other", &entry[1], &entry[0],
            0);
  bench_row("the same, two threads, wall", "plain loop, one thread", &entry[2],
            &entry[0], 0);
  double sum = 0;
  for (size_t i = 0; i < N_LOOP; ++i) {
    for (size_t p = 0; p < N_PAIRS; ++p) {
      sum += difference[p * N_OBSERVERS + i];
    }
  }
  bench_value("population_error", fabs(sum / one.loop_sum - 1),
              "relative, of the sum of the differences");
  ef_population_free(population);
  free(spread);
  free(difference);
  free(sample);
  return fabs(sum / one.loop_sum - 1) < 1e-9 ? 0 : 1;
}
