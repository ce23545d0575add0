/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Code values for a modulation: those that keep silent receptors quiet, and the
 * smallest step that they can make. */
#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

enum { N = EF_MAX_DRIVES, MOST_PLACES = 20000 };

ef_codes_settings ef_codes_settings_default(void) {
  return (ef_codes_settings){.bits = 8, .quiet_weight = 10, .step_purity = 0.1};
}

/* ---- The error as a form ------------------------------------------------- */

static double amount_of(const ef__codes *codes, size_t i, uint32_t code) {
  return codes->amount[i * codes->n_codes + code];
}

/* Amount that one code more or less changes. */
static double step_at(const ef__codes *codes, size_t i, uint32_t code) {
  const uint32_t up = code + 1 < codes->n_codes ? code + 1 : code;
  const uint32_t down = code > 0 ? code - 1 : code;
  return (amount_of(codes, i, up) - amount_of(codes, i, down)) /
         (double)(up - down);
}

/* What a code counts: where nothing else decides, a twentieth of what one
 * changes; else next to nothing. */
static void add_cost_of_codes(ef__fit *fit, const ef__codes *codes,
                              const uint32_t *background, bool is_free) {
  const size_t n = fit->n;
  const double share = is_free ? 0.05 : 1e-6;
  double step[N], mean = 0;
  for (size_t i = 0; i < n; ++i) {
    step[i] = step_at(codes, i, background[i]);
    mean += fit->matrix[i * n + i] * step[i] * step[i] / (double)n;
  }
  for (size_t i = 0; i < n; ++i)
    fit->matrix[i * n + i] += share * share * mean / (step[i] * step[i]);
}

void ef__fit_set(ef__fit *fit, const ef_stimulator *stimulator,
                 const ef_isolation *isolation, const ef__codes *codes,
                 const uint32_t *background, double quiet_weight) {
  const size_t n = stimulator->n;
  *fit = (ef__fit){.n = n};
  for (size_t i = 0; i < n; ++i)
    fit->background[i] = amount_of(codes, i, background[i]);
  ef_stimulator_excitations(stimulator, fit->background, fit->excitation);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    const ef_receptor_role role = isolation->role[r];
    fit->weight[r] = role == EF_RECEPTOR_IGNORED  ? 0
                     : role == EF_RECEPTOR_SILENT ? quiet_weight * quiet_weight
                                                  : 1;
    for (size_t i = 0; i < n && fit->excitation[r] > 0; ++i)
      fit->gain[r * n + i] = stimulator->matrix[r * n + i] / fit->excitation[r];
    for (size_t i = 0; i < n; ++i) {
      for (size_t j = 0; j < n; ++j)
        fit->matrix[i * n + j] +=
            fit->weight[r] * fit->gain[r * n + i] * fit->gain[r * n + j];
    }
  }
  add_cost_of_codes(fit, codes, background, isolation->rank < n);
}

void ef__fit_contrasts_at(const ef__fit *fit, const double *amount,
                          double contrast[EF_N_RECEPTORS]) {
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    contrast[r] = fit->excitation[r] > 0 ? 0 : (double)NAN;
    for (size_t i = 0; i < fit->n; ++i)
      contrast[r] +=
          fit->gain[r * fit->n + i] * (amount[i] - fit->background[i]);
  }
}

void ef__fit_contrasts(const ef__fit *fit, const ef__codes *codes,
                       const uint32_t *code, double contrast[EF_N_RECEPTORS]) {
  double amount[N] = {0};
  for (size_t i = 0; i < fit->n; ++i)
    amount[i] = amount_of(codes, i, code[i]);
  ef__fit_contrasts_at(fit, amount, contrast);
}

/* ---- The best codes ------------------------------------------------------ */

typedef struct nearest {
  size_t n;
  double least;
  uint32_t code[N];
} nearest;

static double keep_nearest(void *context, const uint32_t *code,
                           const double *amount, double square) {
  nearest *const found = context;
  (void)amount;
  if (square < found->least) {
    found->least = square;
    memcpy(found->code, code, found->n * sizeof *code);
  }
  return found->least;
}

/* Amounts where the form is least: those wanted, moved to what the receptors
 * are to get against the background of the codes. */
static void find_centre(const ef__fit *fit, const ef_isolation *isolation,
                        double level, double *centre) {
  const size_t n = fit->n;
  double contrast[EF_N_RECEPTORS], matrix[N * N], move[N] = {0};
  for (size_t i = 0; i < n; ++i)
    centre[i] = fit->background[i] + level * isolation->modulation[i];
  ef__fit_contrasts_at(fit, centre, contrast);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (!(fit->weight[r] > 0))
      continue;
    /* A robust modulation gives silent receptors something. */
    const double wanted = level * isolation->contrast[r];
    for (size_t i = 0; i < n; ++i)
      move[i] += fit->weight[r] * fit->gain[r * n + i] * (wanted - contrast[r]);
  }
  memcpy(matrix, fit->matrix, n * n * sizeof *matrix);
  if (!ef__solve(n, matrix, 1, move))
    return;
  for (size_t i = 0; i < n; ++i)
    centre[i] += move[i];
}

void ef__fit_codes(const ef__fit *fit, const ef__codes *codes,
                   const ef_isolation *isolation, double level,
                   size_t most_places, uint32_t *code) {
  nearest found = {.n = fit->n, .least = HUGE_VAL};
  ef__walk walk = {.codes = codes,
                   .most_places = most_places,
                   .bound = HUGE_VAL,
                   .visit = keep_nearest,
                   .context = &found};
  find_centre(fit, isolation, level, walk.centre);
  ef__walk_set_root(&walk, fit->matrix);
  for (size_t i = 0; i < fit->n; ++i)
    walk.last[i] = (uint32_t)(codes->n_codes - 1);
  ef__walk_run(&walk);
  memcpy(code, found.code, fit->n * sizeof *code);
}

/* ---- Report -------------------------------------------------------------- */

double ef__along(const ef_isolation *isolation, const double *contrast,
                 double *square) {
  double along = 0;
  *square = 0;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (isolation->role[r] != EF_RECEPTOR_CHANGED)
      continue;
    along += isolation->direction[r] * contrast[r];
    *square += isolation->direction[r] * isolation->direction[r];
  }
  return along / *square;
}

static ef_status check(const ef_codes_settings *settings, ef_error *error) {
  if (settings->bits < 1 || settings->bits > 16) {
    return ef__error_set(error, EF_INVALID,
                         "code values of %d bits; expected 1 to 16",
                         settings->bits);
  }
  if (!(settings->quiet_weight >= 1 && isfinite(settings->quiet_weight))) {
    return ef__error_set(error, EF_INVALID,
                         "a weight of %g for silent receptors; expected 1 or "
                         "more",
                         settings->quiet_weight);
  }
  if (settings->step_purity > 0 && settings->step_purity <= 1)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "a purity of %g for the smallest step; expected more "
                       "than 0 and at most 1",
                       settings->step_purity);
}

static double residual_of(const ef_isolation *isolation,
                          const double *contrast) {
  double residual = 0;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (isolation->role[r] == EF_RECEPTOR_SILENT)
      residual = fmax(residual, fabs(contrast[r]));
  }
  return residual;
}

/* With each amount rounded for itself. */
static double rounded_residual(const ef__fit *fit, const ef__codes *codes,
                               const ef_isolation *isolation, double level) {
  uint32_t code[N];
  double contrast[EF_N_RECEPTORS];
  for (size_t i = 0; i < fit->n; ++i) {
    const double amount =
        isolation->background[i] + level * isolation->modulation[i];
    code[i] = ef__codes_round(codes, i, amount);
  }
  ef__fit_contrasts(fit, codes, code, contrast);
  return residual_of(isolation, contrast);
}

static void choose(const ef_stimulator *stimulator,
                   const ef_isolation *isolation, const ef__codes *codes,
                   const ef_codes_settings *settings, ef_coded *out) {
  ef__fit fit;
  double unused;
  const bool both = isolation->modulation_kind == EF_SYMMETRIC;
  for (size_t i = 0; i < stimulator->n; ++i)
    out->background[i] = ef__codes_round(codes, i, isolation->background[i]);
  ef__fit_set(&fit, stimulator, isolation, codes, out->background,
              settings->quiet_weight);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r)
    out->background_error[r] = fit.excitation[r] / isolation->excitation[r] - 1;
  memcpy(out->low, out->background, sizeof out->low);
  ef__fit_codes(&fit, codes, isolation, 1, MOST_PLACES, out->high);
  if (both)
    ef__fit_codes(&fit, codes, isolation, -1, MOST_PLACES, out->low);
  ef__fit_contrasts(&fit, codes, out->high, out->contrast_high);
  ef__fit_contrasts(&fit, codes, out->low, out->contrast_low);
  out->along_high = ef__along(isolation, out->contrast_high, &unused);
  out->along_low = ef__along(isolation, out->contrast_low, &unused);
  out->residual = fmax(residual_of(isolation, out->contrast_high),
                       residual_of(isolation, out->contrast_low));
  out->rounded_residual = rounded_residual(&fit, codes, isolation, 1);
  if (both) {
    out->rounded_residual = fmax(out->rounded_residual,
                                 rounded_residual(&fit, codes, isolation, -1));
  }
  ef__smallest_step(&fit, codes, isolation, settings->step_purity, out);
  out->below_resolution = !(isolation->along >= out->smallest_contrast);
}

ef_status ef_isolation_codes(const ef_stimulator *stimulator,
                             const ef_isolation *isolation,
                             const ef_codes_settings *settings, ef_coded *out,
                             ef_error *error) {
  ef__codes *codes = NULL;
  ef_status status = ef__isolation_check(stimulator, isolation, error);
  if (status == EF_OK)
    status = check(settings, error);
  if (status == EF_OK)
    status = ef__codes_new(stimulator->device, settings->bits, &codes, error);
  if (status != EF_OK)
    return status;
  *out = (ef_coded){.bits = settings->bits};
  choose(stimulator, isolation, codes, settings, out);
  free(codes);
  return EF_OK;
}
