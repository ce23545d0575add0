/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A modulation as the members of a population get it. */
#include <math.h>
#include <stdlib.h>

#include "stimulus/stimulus_private.h"

typedef struct work {
  const ef__eyes *eyes;
  const ef_isolation *isolation;
  const ef_population *population;
  double *contrast; /* count x EF_N_RECEPTORS */
} work;

static void see_members(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const size_t n = w->eyes->n;
  for (size_t k = begin; k < end; ++k) {
    const ef_cone_model model = ef_population_member(w->population, k);
    double gain[EF_N_RECEPTORS * EF_MAX_DRIVES];
    ef__eyes_gains(w->eyes, &model, w->isolation->background, gain);
    for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
      double sum = 0;
      for (size_t i = 0; i < n; ++i)
        sum += gain[r * n + i] * w->isolation->modulation[i];
      w->contrast[k * EF_N_RECEPTORS + r] = sum;
    }
  }
}

static double intended_for(const ef_isolation *isolation, size_t r) {
  switch (isolation->role[r]) {
  case EF_RECEPTOR_SILENT:
    return 0;
  case EF_RECEPTOR_CHANGED:
    return isolation->along * isolation->direction[r];
  case EF_RECEPTOR_IGNORED:
    break;
  }
  return isolation->contrast[r];
}

static ef_receptor_spread spread_of(const ef_isolation *isolation, size_t r,
                                    size_t count, const double *contrast,
                                    double *off) {
  ef_receptor_spread out = {.intended = intended_for(isolation, r)};
  double squares = 0;
  for (size_t k = 0; k < count; ++k) {
    const double c = contrast[k * EF_N_RECEPTORS + r];
    off[k] = fabs(c - out.intended);
    out.mean += c / (double)count;
    squares += off[k] * off[k];
    if (off[k] > out.worst) {
      out.worst = off[k];
      out.member = k;
    }
  }
  out.rms = sqrt(squares / (double)count);
  out.p95 = ef_quantile(count, off, 0.95);
  return out;
}

void ef__tell_field(const ef_stimulator *stimulator,
                    const ef_population *population, const ef_notes *notes) {
  const double own = ef_observer_field_deg(stimulator->observer);
  const double theirs = ef_population_field_deg(population);
  if (own == theirs)
    return;
  ef__note(notes,
           "the population looks at a field of %g degrees, observer %s at one "
           "of %g",
           theirs, ef_observer_name(stimulator->observer), own);
}

ef_status ef_isolation_spread(const ef_stimulator *stimulator,
                              const ef_isolation *isolation,
                              const ef_population *population, int jobs,
                              ef_receptor_spread out[EF_N_RECEPTORS],
                              double *contrast, const ef_notes *notes,
                              ef_error *error) {
  enum { CHUNK = 4 };
  const size_t count = ef_population_count(population);
  ef_status status = ef__isolation_check(stimulator, isolation, error);
  if (status != EF_OK)
    return status;
  double *all = NULL, *off = NULL;
  ef__eyes *eyes = NULL;
  const ef__part parts[] = {{&all, count * EF_N_RECEPTORS, sizeof *all},
                            {&off, count, sizeof *off}};
  void *const block = ef__allocate_block(2, parts);
  if (block == NULL)
    return ef__error_memory(error, "contrasts of a population");
  status = ef__eyes_new(stimulator, &eyes, error);
  if (status == EF_OK) {
    work w = {eyes, isolation, population, contrast != NULL ? contrast : all};
    ef__parallel_for(count, CHUNK, jobs, see_members, &w);
    for (size_t r = 0; r < EF_N_RECEPTORS; ++r)
      out[r] = spread_of(isolation, r, count, w.contrast, off);
    ef__tell_field(stimulator, population, notes);
  }
  ef__eyes_free(eyes);
  free(block);
  return status;
}
