/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pairs that match under one look, seen under others. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

enum {
  PAIRS = 512, /* in a block */
  CHUNK = 64   /* pairs a thread takes: some 50 us */
};

enum { STANDARD, SAMPLE };

/* ---- Names of corrections ---------------------------------------------- */

static const char *const correction_names[] = {
    [EF_CORRECT_MULTIPLICATIVE] = "multiplicative",
    [EF_CORRECT_ADDITIVE] = "additive",
    [EF_CORRECT_SPECTRAL] = "spectral",
    [EF_CORRECT_NONE] = "none",
};
enum { CORRECTIONS = sizeof correction_names / sizeof correction_names[0] };

const char *ef_correction_name(ef_correction correction) {
  return (size_t)correction < CORRECTIONS ? correction_names[correction]
                                          : "unknown";
}

ef_status ef_correction_find(const char *name, ef_correction *out,
                             ef_error *error) {
  for (size_t i = 0; i < CORRECTIONS; ++i) {
    if (!ef__name_equal(name, correction_names[i]))
      continue;
    *out = (ef_correction)i;
    return EF_OK;
  }
  return ef__error_unknown(error, "correction", name, correction_names,
                           CORRECTIONS);
}

/* ---- One pair ---------------------------------------------------------- */

static double scaled(double test, double standard, double sample) {
  /* Equal values need no correction, even where both are zero. */
  return standard == sample ? test : test * (standard / sample);
}

/* Coordinates of the sample under the test look as it would look there, did it
 * match under the reference. */
static void correct(const ef_metric *metric, const ef_seen *reference,
                    const ef_seen *test, ef_correction correction,
                    double sample[3]) {
  const ef_xyz t = test->sample;
  const ef_xyz s = reference->sample, r = reference->standard;
  if (correction == EF_CORRECT_MULTIPLICATIVE) {
    const ef_xyz carried = {scaled(t.X, r.X, s.X), scaled(t.Y, r.Y, s.Y),
                            scaled(t.Z, r.Z, s.Z)};
    ef_metric_coordinates(metric, carried, &test->conditions, sample);
    return;
  }
  ef_metric_coordinates(metric, t, &test->conditions, sample);
  if (correction != EF_CORRECT_ADDITIVE)
    return;
  double standard_there[3], sample_there[3];
  ef_metric_coordinates(metric, r, &reference->conditions, standard_there);
  ef_metric_coordinates(metric, s, &reference->conditions, sample_there);
  for (size_t i = 0; i < 3; ++i)
    sample[i] += standard_there[i] - sample_there[i];
}

static double difference_of(const ef_metric *metric, const ef_seen *seen) {
  double standard[3], sample[3];
  ef_metric_coordinates(metric, seen->standard, &seen->conditions, standard);
  ef_metric_coordinates(metric, seen->sample, &seen->conditions, sample);
  return ef_metric_difference(metric, standard, sample);
}

static bool is_finite(const double value[3]) {
  return isfinite(value[0]) && isfinite(value[1]) && isfinite(value[2]);
}

ef_metamerism ef_metamerism_of_seen(const ef_metric *metric,
                                    const ef_seen *reference,
                                    const ef_seen *test,
                                    ef_correction correction) {
  const double nan = (double)NAN;
  ef_metamerism out = {.reference_difference = difference_of(metric, reference),
                       .test_difference = difference_of(metric, test),
                       .index = nan,
                       .components = {nan, nan, nan}};
  if (correction == EF_CORRECT_SPECTRAL)
    return out;
  double standard[3], sample[3];
  ef_metric_coordinates(metric, test->standard, &test->conditions, standard);
  correct(metric, reference, test, correction, sample);
  if (is_finite(standard) && is_finite(sample))
    out.index = ef_metric_components(metric, standard, sample, &out.components);
  return out;
}

ef_metamerism_settings ef_metamerism_settings_default(void) {
  return (ef_metamerism_settings){.metric = ef_metric_find("cielab", NULL),
                                  .correction = EF_CORRECT_MULTIPLICATIVE};
}

/* ---- Many pairs -------------------------------------------------------- */

/* A look at a block of pairs. */
typedef struct eye {
  ef_weights *weights;
  ef_conditions conditions;
  double xyz[2][3 * PAIRS];
} eye;

typedef struct work {
  const ef_metamerism_settings *settings;
  size_t n_tests;
  eye *eyes;         /* the reference, then the tests */
  double *corrected; /* PAIRS spectra, where the spectrum is corrected */
  double *corrected_xyz; /* PAIRS x 3, for one test after the other */
  ef_metamerism *out; /* of the first pair of the block */
} work;

static ef_status open_eye(const ef_look *look, const ef_grid *grid,
                          const ef_conditions *conditions, const char *which,
                          eye *out, const ef_notes *notes, ef_error *error) {
  if (look->viewing.kind != EF_SURFACE || look->viewing.illuminant == NULL) {
    return ef__error_set(error, EF_INVALID,
                         "the %s look is at lights; metamerism is told of "
                         "surfaces: give its illuminant",
                         which);
  }
  ef_error why;
  out->weights = ef_observer_weights(look->observer, EF_TRISTIMULUS, grid,
                                     &look->viewing, notes, &why);
  if (out->weights == NULL) {
    if (error != NULL)
      *error = why;
    return why.status;
  }
  double white[3];
  const ef_status status =
      ef_observer_white(look->observer, EF_TRISTIMULUS,
                        look->viewing.illuminant, &look->viewing.working, white,
                        error);
  out->conditions = *conditions;
  out->conditions.white = (ef_xyz){white[0], white[1], white[2]};
  return status;
}

static ef_status check_spectra(const ef_grid *grid, size_t n,
                               const double *const side[2], ef_error *error) {
  static const char *const name[] = {"standard", "sample"};
  for (size_t i = 0; i < 2 * n * grid->count; ++i) {
    const size_t s = i / (n * grid->count), rest = i % (n * grid->count);
    if (isfinite(side[s][rest]))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "value %zu of %s %zu is not a finite number",
                         rest % grid->count + 1, name[s],
                         rest / grid->count + 1);
  }
  return EF_OK;
}

static ef_seen seen_by(const eye *e, size_t pair) {
  const double *const a = e->xyz[STANDARD] + 3 * pair;
  const double *const b = e->xyz[SAMPLE] + 3 * pair;
  return (ef_seen){.standard = {a[0], a[1], a[2]},
                   .sample = {b[0], b[1], b[2]},
                   .conditions = e->conditions};
}

static void tell(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const ef_correction correction =
      w->settings->correction == EF_CORRECT_SPECTRAL ? EF_CORRECT_NONE
                                                     : w->settings->correction;
  for (size_t i = begin; i < end; ++i) {
    const ef_seen reference = seen_by(&w->eyes[0], i);
    for (size_t t = 0; t < w->n_tests; ++t) {
      const ef_seen test = seen_by(&w->eyes[t + 1], i);
      w->out[i * w->n_tests + t] = ef_metamerism_of_seen(
          w->settings->metric, &reference, &test, correction);
    }
  }
}

/* The index of test look t again, of the corrected samples. */
typedef struct again {
  const work *w;
  size_t t;
} again;

static void tell_again(void *context, size_t begin, size_t end) {
  const again *const a = context;
  const work *const w = a->w;
  for (size_t i = begin; i < end; ++i) {
    ef_seen test = seen_by(&w->eyes[a->t + 1], i);
    const double *const c = w->corrected_xyz + 3 * i;
    test.sample = (ef_xyz){c[0], c[1], c[2]};
    const ef_metamerism told = ef_metamerism_of_seen(
        w->settings->metric, &test, &test, EF_CORRECT_NONE);
    ef_metamerism *const out = &w->out[i * w->n_tests + a->t];
    out->index = told.index;
    out->components = told.components;
  }
}

static ef_status tell_corrected(work *w, size_t n, const double *standard,
                                const double *sample, int jobs,
                                ef_error *error) {
  ef_status status = ef_spectral_correct(w->eyes[0].weights, n, standard,
                                         sample, w->corrected, error);
  for (size_t t = 0; t < w->n_tests && status == EF_OK; ++t) {
    status = ef_weights_apply(w->eyes[t + 1].weights, n, w->corrected, jobs,
                              w->corrected_xyz, error);
    again a = {w, t};
    if (status == EF_OK)
      ef__parallel_for(n, CHUNK, jobs, tell_again, &a);
  }
  return status;
}

static ef_status tell_block(work *w, size_t n, const double *standard,
                            const double *sample, int jobs, ef_error *error) {
  for (size_t e = 0; e <= w->n_tests; ++e) {
    eye *const at = &w->eyes[e];
    ef_status status = ef_weights_apply(at->weights, n, standard, jobs,
                                        at->xyz[STANDARD], error);
    if (status == EF_OK)
      status = ef_weights_apply(at->weights, n, sample, jobs, at->xyz[SAMPLE],
                                error);
    if (status != EF_OK)
      return status;
  }
  ef__parallel_for(n, CHUNK, jobs, tell, w);
  if (w->settings->correction != EF_CORRECT_SPECTRAL)
    return EF_OK;
  return tell_corrected(w, n, standard, sample, jobs, error);
}

static ef_status open_eyes(work *w, const ef_grid *grid,
                           const ef_look *reference, const ef_look *test,
                           const ef_notes *notes, ef_error *error) {
  const ef_conditions *const base = &w->settings->conditions;
  ef_status status =
      open_eye(reference, grid, base, "reference", &w->eyes[0], notes, error);
  for (size_t t = 0; t < w->n_tests && status == EF_OK; ++t)
    status = open_eye(&test[t], grid, base, "test", &w->eyes[t + 1], notes,
                      error);
  return status;
}

ef_status ef_metamerism_batch(const ef_grid *grid, size_t n,
                              const double *standard, const double *sample,
                              const ef_look *reference, size_t n_tests,
                              const ef_look *test,
                              const ef_metamerism_settings *settings, int jobs,
                              ef_metamerism *out, const ef_notes *notes,
                              ef_error *error) {
  ef_status status = ef_grid_check(grid, error);
  if (status == EF_OK)
    status = check_spectra(grid, n, (const double *[2]){standard, sample},
                           error);
  if (status != EF_OK)
    return status;
  const bool spectral = settings->correction == EF_CORRECT_SPECTRAL;
  work w = {.settings = settings, .n_tests = n_tests};
  const ef__part parts[] = {
      {&w.eyes, n_tests + 1, sizeof *w.eyes},
      {&w.corrected, spectral ? PAIRS * grid->count : 0, sizeof(double)},
      {&w.corrected_xyz, spectral ? 3 * PAIRS : 0, sizeof(double)}};
  void *const block =
      ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  if (block == NULL)
    return ef__error_memory(error, "indices of metamerism");
  status = open_eyes(&w, grid, reference, test, notes, error);
  for (size_t at = 0; at < n && status == EF_OK; at += PAIRS) {
    const size_t n_here = n - at < PAIRS ? n - at : PAIRS;
    w.out = out + at * n_tests;
    status = tell_block(&w, n_here, standard + at * grid->count,
                        sample + at * grid->count, jobs, error);
  }
  for (size_t e = 0; e <= n_tests; ++e)
    ef_weights_free(w.eyes[e].weights);
  free(block);
  return status;
}

/* ---- Colour inconstancy ------------------------------------------------ */

ef_status ef_inconstancy(const ef_metric *metric, ef_adaptation adaptation,
                         ef_xyz reference,
                         const ef_conditions *reference_conditions, ef_xyz test,
                         ef_xyz test_white, double *index,
                         ef_components *components, ef_error *error) {
  double matrix[9];
  const ef_status status = ef_adaptation_matrix(
      adaptation, test_white, reference_conditions->white, matrix, error);
  if (status != EF_OK)
    return status;
  double there[3], carried[3];
  ef_components unused;
  ef_metric_coordinates(metric, reference, reference_conditions, there);
  ef_metric_coordinates(metric, ef_xyz_transform(matrix, test),
                        reference_conditions, carried);
  *index = ef_metric_components(metric, there, carried,
                                components != NULL ? components : &unused);
  return EF_OK;
}
