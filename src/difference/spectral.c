/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a look sees of a spectral difference and what it does not: the
 * fundamental and the metameric black of Cohen & Kappauf (1982). */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

#include <evenfield/difference.h>

/* Splits spectra. The rows of the weights span what is seen. */
typedef struct splitter {
  size_t n_channels, n_samples;
  const double *row; /* n_channels x n_samples, borrowed */
  double *inverse;   /* of row row', n_channels x n_channels */
  double *seen;      /* scratch, 2 x n_channels */
  void *block;
} splitter;

/* row row' of the whole matrix. */
static void fill_gram(const splitter *s, double *gram) {
  for (size_t i = 0; i < s->n_channels; ++i) {
    for (size_t j = 0; j < s->n_channels; ++j) {
      double sum = 0;
      for (size_t k = 0; k < s->n_samples; ++k)
        sum += s->row[i * s->n_samples + k] * s->row[j * s->n_samples + k];
      gram[i * s->n_channels + j] = sum;
    }
  }
}

static ef_status splitter_set(const ef_weights *weights, splitter *s,
                              ef_error *error) {
  const size_t n = ef_weights_channels(weights);
  double *gram;
  *s = (splitter){.n_channels = n,
                  .n_samples = ef_weights_samples(weights),
                  .row = ef_weights_matrix(weights)};
  const ef__part parts[] = {{&s->inverse, n * n, sizeof(double)},
                            {&gram, n * n, sizeof(double)},
                            {&s->seen, 2 * n, sizeof(double)}};
  s->block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  if (s->block == NULL)
    return ef__error_memory(error, "what a look sees of spectra");
  for (size_t i = 0; i < n; ++i)
    s->inverse[i * n + i] = 1;
  fill_gram(s, gram);
  if (s->n_samples >= n && ef__solve(n, gram, n, s->inverse))
    return EF_OK;
  free(s->block);
  s->block = NULL;
  return ef__error_set(error, EF_NO_ANSWER,
                       "the %zu channels of the reference depend on each other "
                       "on these %zu samples: what it does not see is not "
                       "defined",
                       n, s->n_samples);
}

/* out = the part of b - a that the look sees. */
static void see(const splitter *s, const double *a, const double *b,
                double *out) {
  double *const channel = s->seen, *const amount = s->seen + s->n_channels;
  for (size_t i = 0; i < s->n_channels; ++i) {
    double sum = 0;
    for (size_t k = 0; k < s->n_samples; ++k)
      sum += s->row[i * s->n_samples + k] * (b[k] - a[k]);
    channel[i] = sum;
  }
  for (size_t i = 0; i < s->n_channels; ++i) {
    amount[i] = 0;
    for (size_t j = 0; j < s->n_channels; ++j)
      amount[i] += s->inverse[i * s->n_channels + j] * channel[j];
  }
  for (size_t k = 0; k < s->n_samples; ++k) {
    double sum = 0;
    for (size_t i = 0; i < s->n_channels; ++i)
      sum += s->row[i * s->n_samples + k] * amount[i];
    out[k] = sum;
  }
}

ef_status ef_spectral_correct(const ef_weights *reference, size_t n,
                              const double *standard, const double *sample,
                              double *corrected, ef_error *error) {
  splitter s;
  ef_status status = splitter_set(reference, &s, error);
  if (status != EF_OK)
    return status;
  double *const seen = ef__allocate(s.n_samples, sizeof *seen);
  if (seen == NULL)
    status = ef__error_memory(error, "corrected spectra");
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    const size_t at = i * s.n_samples;
    see(&s, sample + at, standard + at, seen);
    for (size_t k = 0; k < s.n_samples; ++k)
      corrected[at + k] = sample[at + k] + seen[k];
  }
  free(seen);
  free(s.block);
  return status;
}

static ef_spectral_index index_of(const splitter *s, const double *standard,
                                  const double *sample, double *seen) {
  double sum = 0, black = 0, weighted = 0;
  see(s, standard, sample, seen);
  for (size_t k = 0; k < s->n_samples; ++k) {
    const double d = sample[k] - standard[k];
    sum += d * d;
    black += (d - seen[k]) * (d - seen[k]);
    for (size_t i = 0; i < s->n_channels; ++i) {
      const double part = s->row[i * s->n_samples + k] * d;
      weighted += part * part;
    }
  }
  const double n = (double)s->n_samples;
  return (ef_spectral_index){.rms = sqrt(sum / n),
                             .black_rms = sqrt(black / n),
                             .weighted = sqrt(weighted)};
}

ef_status ef_spectral_index_batch(const ef_weights *reference, size_t n,
                                  const double *standard, const double *sample,
                                  ef_spectral_index *out, ef_error *error) {
  splitter s;
  ef_status status = splitter_set(reference, &s, error);
  if (status != EF_OK)
    return status;
  double *const seen = ef__allocate(s.n_samples, sizeof *seen);
  if (seen == NULL)
    status = ef__error_memory(error, "spectral indices");
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    const size_t at = i * s.n_samples;
    out[i] = index_of(&s, standard + at, sample + at, seen);
  }
  free(seen);
  free(s.block);
  return status;
}
