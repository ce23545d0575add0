/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Parametric bootstrap: fits to answers simulated from the fit. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>

enum { M = EF__PARAMETERS, CHUNK = 64 };

typedef struct work {
  const ef__likelihood *likelihood;
  const ef__reading *reading;
  const ef__minimum *fit;
  const ef__samples *out;
  const double *share;
  double *scratch; /* n levels for each chunk */
  uint64_t seed;
} work;

static void sample_failed(const ef__samples *out, size_t i) {
  out->threshold[i] = out->equality[i] = out->jnd[i] = (double)NAN;
  out->slope[i] = out->guess[i] = out->lapse[i] = (double)NAN;
}

/* Where answers are separated the search stops anywhere in the gap: its middle
 * stands for it. */
static double step_place(const ef__likelihood *likelihood,
                         const ef__minimum *found) {
  const ef__verdict verdict = ef__support_after(likelihood, found);
  if (verdict.support != EF_SUPPORT_STEP)
    return (double)NAN;
  return 0.5 * (likelihood->data->t[verdict.row_low] +
                likelihood->data->t[verdict.row_high]);
}

static void read_sample(const work *w, const ef__likelihood *likelihood,
                        const ef__minimum *found, size_t i) {
  const ef__samples *const out = w->out;
  const double slope = found->x[EF__SLOPE];
  const double intercept = found->x[EF__INTERCEPT];
  out->threshold[i] = (w->reading->eta_threshold - intercept) / slope;
  out->equality[i] = (w->reading->eta_equality - intercept) / slope;
  out->slope[i] = slope;
  out->guess[i] = ef__model_guess_rate(&likelihood->model, found->x[EF__GUESS]);
  out->lapse[i] = found->x[EF__LAPSE];
  out->jnd[i] = ef__reading_jnd(w->reading, likelihood, found->x);
  /* A slope that could be a step takes neighbouring levels apart in eta. */
  if (slope * likelihood->data->least_gap < 5 ||
      !ef__is_estimated(likelihood, EF__SLOPE))
    return;
  const double t = step_place(likelihood, found);
  if (isnan(t))
    return;
  out->threshold[i] = t;
  if (!isnan(out->equality[i]))
    out->equality[i] = t;
  out->slope[i] = (double)INFINITY;
  const ef__data *const data = likelihood->data;
  out->jnd[i] =
      w->reading->jnd == EF__JND_RANGE
          ? 0
          : ef__axis_level(w->reading->axis, data->centre + data->scale * t);
}

static void run_samples(void *ctx, size_t begin, size_t end) {
  const work *const w = ctx;
  ef__data data = *w->likelihood->data;
  data.positive = w->scratch + begin / CHUNK * data.n;
  ef__likelihood likelihood = *w->likelihood;
  likelihood.data = &data;
  for (size_t i = begin; i < end; ++i) {
    ef__random random = ef__random_stream(w->seed, i);
    ef__draw_answers(&random, &data, w->share, data.positive);
    ef__minimum found;
    ef__maximise(&likelihood, w->fit->x, true, EF__TOLERANCE_QUICK, &found);
    w->out->deviance[i] = 2 * found.value;
    const bool has_threshold =
        found.converged && found.x[EF__SLOPE] > 1e-6 &&
        ef__support_before(&likelihood).support == EF_SUPPORT_FULL;
    if (has_threshold)
      read_sample(w, &likelihood, &found, i);
    else
      sample_failed(w->out, i);
  }
}

static void expected_shares(const ef__likelihood *likelihood,
                            const double *theta, double *share) {
  const ef__data *const data = likelihood->data;
  for (size_t i = 0; i < data->n; ++i) {
    double rest;
    ef__model_share(&likelihood->model,
                    theta[EF__INTERCEPT] + theta[EF__SLOPE] * data->t[i],
                    i == 0 && data->has_blank, theta[EF__GUESS],
                    theta[EF__LAPSE], &share[i], &rest);
  }
}

ef_status ef__samples_new(const ef__likelihood *likelihood,
                          const ef__reading *reading, const ef__minimum *fit,
                          size_t n_samples, uint64_t seed, int jobs,
                          ef__samples *out, void **block, ef_error *error) {
  const size_t n = likelihood->data->n;
  double *share, *scratch;
  size_t n_scratch;
  *block = NULL;
  if (!ef__size_multiply(n_samples / CHUNK + 1, n, &n_scratch))
    return ef__error_memory(error, "the simulated answers");
  const size_t size = sizeof(double);
  const ef__part part[] = {
      {&out->threshold, n_samples, size}, {&out->equality, n_samples, size},
      {&out->jnd, n_samples, size},       {&out->slope, n_samples, size},
      {&out->guess, n_samples, size},     {&out->lapse, n_samples, size},
      {&out->deviance, n_samples, size},  {&share, n, size},
      {&scratch, n_scratch, size},
  };
  *block = ef__allocate_block(sizeof part / sizeof part[0], part);
  if (*block == NULL)
    return ef__error_memory(error, "the simulated answers");
  out->n = n_samples;
  expected_shares(likelihood, fit->x, share);
  work w = {likelihood, reading, fit, out, share, scratch, seed};
  ef__parallel_for(n_samples, CHUNK, jobs, run_samples, &w);
  out->n_failed = 0;
  for (size_t i = 0; i < n_samples; ++i)
    out->n_failed += isnan(out->threshold[i]) ? 1 : 0;
  return EF_OK;
}
