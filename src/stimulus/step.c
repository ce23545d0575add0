/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The smallest step along a direction that code values can make. */
#include <math.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

enum { N = EF_MAX_DRIVES };

typedef struct smallest {
  const ef__fit *fit;
  const ef_isolation *isolation;
  double purity;
  double size;   /* largest contrast of one unit along the direction */
  double square; /* squared length of the direction */
  double n_terms;
  double least; /* along the direction, so far */
  uint32_t code[N];
} smallest;

static bool is_pure(const smallest *s, const double *contrast, double along) {
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (s->isolation->role[r] == EF_RECEPTOR_IGNORED)
      continue;
    const double off = contrast[r] - along * s->isolation->direction[r];
    if (!(fabs(off) <= s->purity * along * s->size))
      return false;
  }
  return true;
}

/* Departures are at most purity x along x size in each of n_terms - 1
 * receptors, so that the form below is at most n_terms x along^2. */
static double bound_of(const smallest *s, double along) {
  return s->n_terms * along * along;
}

static double keep_smallest(void *context, const uint32_t *code,
                            const double *amount, double square) {
  smallest *const s = context;
  double contrast[EF_N_RECEPTORS], unused;
  (void)square;
  ef__fit_contrasts_at(s->fit, amount, contrast);
  const double along = ef__along(s->isolation, contrast, &unused);
  if (along > 0 && along < s->least && is_pure(s, contrast, along)) {
    s->least = along;
    memcpy(s->code, code, s->fit->n * sizeof *code);
  }
  return bound_of(s, s->least);
}

/* along^2 + sum of (departure / (purity x size))^2, as a form in amounts; and a
 * trifle that makes it definite. */
static void step_form(const smallest *s, double *matrix) {
  const size_t n = s->fit->n;
  double along[N] = {0}, trace = 0;
  memset(matrix, 0, N * N * sizeof *matrix);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (s->isolation->role[r] != EF_RECEPTOR_CHANGED)
      continue;
    for (size_t i = 0; i < n; ++i)
      along[i] +=
          s->isolation->direction[r] * s->fit->gain[r * n + i] / s->square;
  }
  for (size_t r = 0; r <= EF_N_RECEPTORS; ++r) {
    double row[N];
    const bool is_departure = r < EF_N_RECEPTORS;
    if (is_departure && s->isolation->role[r] == EF_RECEPTOR_IGNORED)
      continue;
    for (size_t i = 0; i < n; ++i) {
      row[i] = is_departure ? (s->fit->gain[r * n + i] -
                               along[i] * s->isolation->direction[r]) /
                                  (s->purity * s->size)
                            : along[i];
    }
    for (size_t i = 0; i < n; ++i) {
      for (size_t j = 0; j < n; ++j)
        matrix[i * n + j] += row[i] * row[j];
    }
  }
  for (size_t i = 0; i < n; ++i)
    trace += matrix[i * n + i];
  for (size_t i = 0; i < n; ++i)
    matrix[i * n + i] += 1e-12 * trace;
}

void ef__smallest_step(const ef__fit *fit, const ef__codes *codes,
                       const ef_isolation *isolation, double purity,
                       ef_coded *out) {
  enum { REACH = 12, PLACES = 200000 };
  double matrix[N * N];
  smallest s = {.fit = fit, .isolation = isolation, .purity = purity};
  ef__along(isolation, isolation->contrast, &s.square);
  s.n_terms = 1;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    s.size = fmax(s.size, fabs(isolation->direction[r]));
    s.n_terms += isolation->role[r] != EF_RECEPTOR_IGNORED;
  }
  step_form(&s, matrix);
  ef__walk walk = {.codes = codes,
                   .most_places = PLACES,
                   .visit = keep_smallest,
                   .context = &s};
  ef__walk_set_root(&walk, matrix);
  for (size_t i = 0; i < fit->n; ++i) {
    const uint32_t at = out->background[i];
    const uint32_t last = (uint32_t)(codes->n_codes - 1);
    walk.centre[i] = fit->background[i];
    walk.first[i] = at > REACH ? at - REACH : 0;
    walk.last[i] = last - at > REACH ? at + REACH : last;
  }
  out->smallest_contrast = (double)NAN;
  memcpy(out->smallest, out->background, sizeof out->smallest);
  /* Wider and wider, so that a small step is found among few places. */
  for (double along = 1e-6 / s.size; along * s.size < 4; along *= 2) {
    s.least = along;
    walk.bound = bound_of(&s, along);
    ef__walk_run(&walk);
    if (s.least < along) {
      out->smallest_contrast = s.least;
      memcpy(out->smallest, s.code, fit->n * sizeof *s.code);
      return;
    }
  }
}
