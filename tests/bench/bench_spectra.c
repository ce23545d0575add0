/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectra to channels beside OpenBLAS's matrix product, on a block of spectra
 * that exceeds every cache and stands for a million of them. */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

#include <cblas.h>

#include <evenfield/spectrum.h>

#include "bench.h"
#include "gen.h"
#include "kernel/kernels.h"

enum { BLOCK_BYTES = 256 * 1024 * 1024, MOST_SAMPLES = 401 };

typedef struct contest {
  size_t n_samples, n_channels, n;
  const double *weights;
  const double *sample;
  const float *sample_float, *weights_float;
  double *out;
  float *out_float;
  int jobs;
  double sum;
} contest;

static void run_dgemm(void *context) {
  contest *const c = context;
  openblas_set_num_threads(c->jobs);
  cblas_dgemm(CblasRowMajor, CblasNoTrans, CblasTrans, (int)c->n,
              (int)c->n_channels, (int)c->n_samples, 1, c->sample,
              (int)c->n_samples, c->weights, (int)c->n_samples, 0, c->out,
              (int)c->n_channels);
}

static void run_sgemm(void *context) {
  contest *const c = context;
  openblas_set_num_threads(c->jobs);
  cblas_sgemm(CblasRowMajor, CblasNoTrans, CblasTrans, (int)c->n,
              (int)c->n_channels, (int)c->n_samples, 1, c->sample_float,
              (int)c->n_samples, c->weights_float, (int)c->n_samples, 0,
              c->out_float, (int)c->n_channels);
}

/* Through the public call, as a user would. */
static ef_weights *weights;

static void run_ours(void *context) {
  contest *const c = context;
  ef_weights_apply(weights, c->n, c->sample, c->jobs, c->out, NULL);
}

static void run_ours_float(void *context) {
  contest *const c = context;
  ef_weights_apply_float(weights, c->n, c->sample_float, c->jobs, c->out, NULL);
}

static void run_baseline(void *context) {
  contest *const c = context;
  size_t last = 0;
  while (ef__kernels_at(last + 1) != NULL) ++last;
  ef__kernels_at(last)->apply(c->n_samples, c->n_channels, c->weights, c->n,
                              c->sample, c->out);
}

/* As fast as one thread reads the samples. */
static void run_reading(void *context) {
  contest *const c = context;
  c->sum = bench_sum(c->n * c->n_samples, c->sample);
}

/* Weights on a grid of n_samples for channels that are random functions. */
static ef_weights *make_weights(gen *g, size_t n_samples, size_t n_channels) {
  ef_fold_settings settings = ef_fold_settings_default();
  settings.working =
      (ef_grid){.count = n_samples, .start_nm = 380, .step_nm = 1};
  double *const channel =
      bench_allocate(n_channels * n_samples, sizeof *channel);
  double *const scale = bench_allocate(n_channels, sizeof *scale);
  gen_fill(g, n_channels * n_samples, 0, 2, channel);
  for (size_t i = 0; i < n_channels; ++i) scale[i] = 1;
  ef_weights *const made = ef_weights_fold(
      &settings.working, n_channels, channel, NULL, scale, &settings, NULL);
  free(channel);
  free(scale);
  return made;
}

static void set_sizes(contest *c, gen *g, size_t n_samples, size_t n_channels,
                      size_t n) {
  ef_weights_free(weights);
  weights = make_weights(g, n_samples, n_channels);
  if (weights == NULL) exit(1);
  c->n_samples = n_samples;
  c->n_channels = n_channels;
  c->n = n;
  c->weights = ef_weights_matrix(weights);
}

static void report_error(const contest *c, const char *name) {
  double *const exact = bench_allocate(c->n * c->n_channels, sizeof *exact);
  double largest = 0;
  contest peer = *c;
  peer.out = exact;
  run_dgemm(&peer);
  run_ours((void *)(uintptr_t)c);
  for (size_t i = 0; i < c->n * c->n_channels; ++i)
    largest = fmax(largest, fabs(c->out[i] / exact[i] - 1));
  bench_value(name, largest, "relative to dgemm's");
  free(exact);
}

static void bench_double(contest *c, gen *g, size_t n_samples, double wanted,
                         double wanted_two) {
  char text[8][64], what[128];
  set_sizes(c, g, n_samples, 3, BLOCK_BYTES / 8 / n_samples);
  contest two = *c;
  two.jobs = 2;
  static const char *const end[] = {"dgemm",     "reading",  "apply",
                                    "baseline",  "dgemm_two", "apply_two"};
  for (size_t i = 0; i < 6; ++i)
    snprintf(text[i], sizeof text[i], "spectra%zu_%s", n_samples, end[i]);
  bench_entry entry[] = {{text[0], run_dgemm, c, false, 0},
                         {text[1], run_reading, c, false, 0},
                         {text[2], run_ours, c, false, 0},
                         {text[3], run_baseline, c, false, 0},
                         {text[4], run_dgemm, &two, true, 0},
                         {text[5], run_ours, &two, true, 0}};
  bench_run(6, entry);
  bench_per_item(6, entry, (double)c->n);
  snprintf(what, sizeof what, "spectra of %zu samples to 3 channels",
           n_samples);
  bench_row(what, "OpenBLAS dgemm", &entry[2], &entry[0], wanted);
  bench_detail(&entry[3], &entry[0]);
  if (n_samples == MOST_SAMPLES) {
    bench_row("the same, two threads, wall", "OpenBLAS dgemm, two threads",
              &entry[5], &entry[4], wanted_two);
    bench_row("the same, of the speed of reading", "sum of all samples",
              &entry[2], &entry[1], 0.6);
  } else {
    bench_detail(&entry[5], &entry[4]);
    bench_detail(&entry[2], &entry[1]);
  }
  snprintf(text[6], sizeof text[6], "spectra%zu_error", n_samples);
  report_error(c, text[6]);
}

static void bench_float(contest *c, gen *g) {
  set_sizes(c, g, MOST_SAMPLES, 3, BLOCK_BYTES / 8 / MOST_SAMPLES);
  float *const narrow =
      bench_allocate(3 * MOST_SAMPLES, sizeof *narrow);
  for (size_t i = 0; i < 3 * MOST_SAMPLES; ++i) narrow[i] = (float)c->weights[i];
  c->weights_float = narrow;
  bench_entry entry[] = {{"spectra401_sgemm", run_sgemm, c, false, 0},
                         {"spectra401_float", run_ours_float, c, false, 0}};
  bench_run(2, entry);
  bench_per_item(2, entry, (double)c->n);
  bench_row("spectra of 401 float samples, sums in double", "OpenBLAS sgemm",
            &entry[1], &entry[0], 3);
  free(narrow);
}

static void bench_population(contest *c, gen *g) {
  const size_t n_channels = 3000, n = 10000;
  set_sizes(c, g, MOST_SAMPLES, n_channels, n);
  double *const out = bench_allocate(n_channels * n, sizeof *out);
  double *const before = c->out;
  c->out = out;
  bench_entry entry[] = {{"people_dgemm", run_dgemm, c, false, 0},
                         {"people_apply", run_ours, c, false, 0},
                         {"people_baseline", run_baseline, c, false, 0}};
  bench_run(3, entry);
  const double products = (double)n_channels * (double)n * MOST_SAMPLES;
  for (size_t i = 0; i < 3; ++i) {
    char text[64];
    snprintf(text, sizeof text, "%s_speed", entry[i].name);
    bench_value(text, 2e-9 * products / entry[i].seconds, "GFLOP/s");
  }
  bench_row("3 x 1000 channels, 10^4 spectra of 401 samples", "OpenBLAS dgemm",
            &entry[1], &entry[0], 0.7);
  bench_detail(&entry[2], &entry[0]);
  report_error(c, "people_error");
  c->out = before;
  free(out);
}

int main(void) {
  gen g = gen_new(1);
  double *const sample = bench_allocate(BLOCK_BYTES, 1);
  float *const narrow = bench_allocate(BLOCK_BYTES / 2, 1);
  double *const out = bench_allocate(BLOCK_BYTES / 31 * 3 + 64, 1);
  float *const out_float = bench_allocate(BLOCK_BYTES / 31 * 3 + 64, 1);
  gen_fill(&g, BLOCK_BYTES / 8, 0, 1, sample);
  for (size_t i = 0; i < BLOCK_BYTES / 8; ++i) narrow[i] = (float)sample[i];
  contest c = {.sample = sample,
               .sample_float = narrow,
               .out = out,
               .out_float = out_float,
               .jobs = 1};
  bench_double(&c, &g, 401, 2, 2.5);
  bench_double(&c, &g, 81, 2.5, 0);
  bench_double(&c, &g, 31, 2, 0);
  bench_float(&c, &g);
  bench_population(&c, &g);
  ef_weights_free(weights);
  return 0;
}
