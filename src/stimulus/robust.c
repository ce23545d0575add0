/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The modulation that leaves least in the silent receptors of a population. The
 * contrasts of a member are linear in the modulation, so that the mean of their
 * squares is a quadratic form, and what the receptors that change are to get
 * leaves a subspace: modulation = start + sum of z_k directions_k. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

enum { N = EF_MAX_DRIVES, BLOCK = 1024 /* members at a time */ };

/* Share of the mean square weight that the length of the modulation counts:
 * enough for a definite form, too little to see. */
static const double length_weight = 1e-9;

/* ---- The form ------------------------------------------------------------ */

typedef struct work {
  const ef__eyes *eyes;
  const ef_isolation *isolation;
  const ef_population *population;
  size_t first; /* member of the block */
  double *form; /* n x n of each member of the block */
} work;

/* Sum over the silent receptors of gain gain'. */
static void add_members(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const size_t n = w->eyes->n;
  for (size_t k = begin; k < end; ++k) {
    const ef_cone_model model =
        ef_population_member(w->population, w->first + k);
    double gain[EF_N_RECEPTORS * N];
    double *const form = w->form + k * n * n;
    ef__eyes_gains(w->eyes, &model, w->isolation->background, gain);
    memset(form, 0, n * n * sizeof *form);
    for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
      if (w->isolation->role[r] != EF_RECEPTOR_SILENT)
        continue;
      for (size_t i = 0; i < n; ++i) {
        for (size_t j = 0; j < n; ++j)
          form[i * n + j] += gain[r * n + i] * gain[r * n + j];
      }
    }
  }
}

/* The mean over the population, n x n, with the weight of the length. */
static ef_status mean_form(const ef_stimulator *stimulator,
                           const ef_isolation *isolation,
                           const ef_population *population, int jobs,
                           double *form, ef_error *error) {
  enum { CHUNK = 4 };
  const size_t n = stimulator->n, count = ef_population_count(population);
  ef__eyes *eyes = NULL;
  work w = {.isolation = isolation, .population = population};
  ef_status status = ef__eyes_new(stimulator, &eyes, error);
  if (status != EF_OK)
    return status;
  w.eyes = eyes;
  w.form = ef__allocate(BLOCK, n * n * sizeof *w.form);
  if (w.form == NULL) {
    ef__eyes_free(eyes);
    return ef__error_memory(error, "a robust modulation");
  }
  memset(form, 0, n * n * sizeof *form);
  for (; w.first < count; w.first += BLOCK) {
    const size_t left = count - w.first, here = left < BLOCK ? left : BLOCK;
    ef__parallel_for(here, CHUNK, jobs, add_members, &w);
    for (size_t k = 0; k < here; ++k) {
      for (size_t i = 0; i < n * n; ++i)
        form[i] += w.form[k * n * n + i] / (double)count;
    }
  }
  double trace = 0;
  for (size_t i = 0; i < n; ++i)
    trace += form[i * n + i];
  for (size_t i = 0; i < n; ++i)
    form[i * n + i] += length_weight * trace / (double)n;
  free(w.form);
  ef__eyes_free(eyes);
  return EF_OK;
}

/* ---- The subspace -------------------------------------------------------- */

/* Takes away what `v` has of the rows so far, twice; its length. */
static double reduce(size_t n, size_t n_rows, const double *row, double *v) {
  for (int pass = 0; pass < 2; ++pass) {
    for (size_t k = 0; k < n_rows; ++k) {
      double along = 0;
      for (size_t i = 0; i < n; ++i)
        along += row[k * n + i] * v[i];
      for (size_t i = 0; i < n; ++i)
        v[i] -= along * row[k * n + i];
    }
  }
  double square = 0;
  for (size_t i = 0; i < n; ++i)
    square += v[i] * v[i];
  return sqrt(square);
}

static void append(size_t n, size_t *n_rows, double *row, const double *v,
                   double length) {
  for (size_t i = 0; i < n; ++i)
    row[*n_rows * n + i] = v[i] / length;
  ++*n_rows;
}

/* Orthonormal rows: first those of the receptors that change, then what
 * completes them. Returns how many are the receptors'. */
static size_t complete_basis(const ef_stimulator *stimulator,
                             const ef_isolation *isolation, double *row) {
  const size_t n = stimulator->n;
  size_t n_rows = 0;
  double v[N];
  for (size_t r = 0; r < EF_N_RECEPTORS && n_rows < n; ++r) {
    if (isolation->role[r] != EF_RECEPTOR_CHANGED)
      continue;
    double size = 0;
    for (size_t i = 0; i < n; ++i) {
      v[i] = stimulator->matrix[r * n + i] / isolation->excitation[r];
      size = fmax(size, fabs(v[i]));
    }
    const double length = reduce(n, n_rows, row, v);
    if (length > 1e-12 * size) /* else it follows those before */
      append(n, &n_rows, row, v, length);
  }
  const size_t n_fixed = n_rows;
  while (n_rows < n) {
    /* Of the axes the one that is least in the rows so far. */
    double best[N], longest = 0;
    for (size_t j = 0; j < n; ++j) {
      memset(v, 0, sizeof v);
      v[j] = 1;
      const double length = reduce(n, n_rows, row, v);
      if (length > longest) {
        longest = length;
        memcpy(best, v, sizeof best);
      }
    }
    append(n, &n_rows, row, best, longest);
  }
  return n_fixed;
}

/* ---- The least ----------------------------------------------------------- */

/* Moves `modulation` along the rows `way` (m of them) to the least of the
 * form, down and up within room. */
static bool descend(size_t n, const double *form, size_t m, const double *way,
                    const double *down, const double *up, double *modulation) {
  double matrix[N * N], linear[N], limit[2 * N * N], bound[2 * N], z[N];
  double image[N]; /* form x a direction */
  for (size_t a = 0; a < m; ++a) {
    for (size_t i = 0; i < n; ++i) {
      image[i] = 0;
      for (size_t j = 0; j < n; ++j)
        image[i] += form[i * n + j] * way[a * n + j];
    }
    linear[a] = 0;
    for (size_t i = 0; i < n; ++i)
      linear[a] += image[i] * modulation[i];
    for (size_t b = 0; b < m; ++b) {
      matrix[b * m + a] = 0;
      for (size_t i = 0; i < n; ++i)
        matrix[b * m + a] += image[i] * way[b * n + i];
    }
  }
  for (size_t i = 0; i < n; ++i) {
    for (size_t a = 0; a < m; ++a) {
      limit[2 * i * m + a] = way[a * n + i];
      limit[(2 * i + 1) * m + a] = -way[a * n + i];
    }
    bound[2 * i] = -down[i] - modulation[i];
    bound[2 * i + 1] = modulation[i] - up[i];
  }
  if (!ef__least_quadratic(m, matrix, linear, 2 * n, limit, bound, z))
    return false;
  for (size_t a = 0; a < m; ++a) {
    for (size_t i = 0; i < n; ++i)
      modulation[i] += z[a] * way[a * n + i];
  }
  return true;
}

/* The form is so flat in some directions that the programme keeps its limits to
 * 1e-10 only: puts the modulation within them, and back onto what the receptors
 * that change got of `start`. */
static void settle(size_t n, size_t n_fixed, const double *row,
                   const double *start, const double *down, const double *up,
                   double *modulation) {
  ef__table t = {.n_rows = n_fixed, .n_columns = n};
  for (size_t i = 0; i < n; ++i) {
    t.low[i] = -down[i];
    t.high[i] = up[i];
    modulation[i] = fmin(fmax(modulation[i], -down[i]), up[i]);
  }
  for (size_t k = 0; k < n_fixed; ++k) {
    for (size_t i = 0; i < n; ++i) {
      t.row[k * n + i] = row[k * n + i];
      t.right[k] += row[k * n + i] * start[i];
    }
  }
  ef__table_bring_onto_rows(&t, modulation);
}

static double value_of(size_t n, const double *form, const double *x) {
  double sum = 0;
  for (size_t i = 0; i < n; ++i) {
    for (size_t j = 0; j < n; ++j)
      sum += x[i] * form[i * n + j] * x[j];
  }
  return sum;
}

/* The least, begun again from where it ended as long as that goes down: what
 * the programme leaves is in proportion to the way. */
static bool find_least(size_t n, const double *form, size_t n_fixed,
                       const double *row, const double *down, const double *up,
                       double *modulation) {
  enum { MOST_PASSES = 8 };
  double start[N], trial[N];
  memcpy(start, modulation, n * sizeof *start);
  for (int pass = 0; pass < MOST_PASSES; ++pass) {
    memcpy(trial, modulation, n * sizeof *trial);
    if (!descend(n, form, n - n_fixed, row + n_fixed * n, down, up, trial))
      return pass > 0;
    settle(n, n_fixed, row, start, down, up, trial);
    if (!(value_of(n, form, trial) < value_of(n, form, modulation)))
      return true;
    memcpy(modulation, trial, n * sizeof *trial);
  }
  return true;
}

static ef_status check(const ef_isolation *isolation, ef_error *error) {
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (isolation->role[r] == EF_RECEPTOR_SILENT)
      return EF_OK;
  }
  return ef__error_set(error, EF_INVALID,
                       "no receptor is to be silent, so that there is nothing "
                       "to keep from a population");
}

ef_status ef_isolate_robust(const ef_stimulator *stimulator,
                            const ef_direction *direction,
                            const ef_isolate_settings *settings,
                            const ef_population *population, int jobs,
                            ef_isolation *out, const ef_notes *notes,
                            ef_error *error) {
  const size_t n = stimulator->n;
  double form[N * N], row[N * N], down[N], up[N];
  ef_isolation found;
  ef_status status = ef_isolate(stimulator, direction, settings, &found, error);
  if (status == EF_OK)
    status = check(&found, error);
  if (status == EF_OK)
    status = mean_form(stimulator, &found, population, jobs, form, error);
  if (status != EF_OK)
    return status;
  ef__isolate_room(settings->modulation, n, found.background, down, up);
  const size_t n_fixed = complete_basis(stimulator, &found, row);
  if (n_fixed < n &&
      !find_least(n, form, n_fixed, row, down, up, found.modulation)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the modulation with the least residual was not found "
                         "(condition number %.3g)",
                         found.condition_number);
  }
  ef__isolation_take_contrasts(stimulator, &found);
  ef__tell_field(stimulator, population, notes);
  *out = found;
  return EF_OK;
}
