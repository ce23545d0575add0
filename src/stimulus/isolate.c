/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Modulations that change the receptors they are meant to change. The
 * contrasts of a modulation are linear in its amounts, so that with as many
 * primaries as receptors there is one solution (Estevez & Spekreijse, Vision
 * Res. 22 (1982) 681-691) and with more primaries the largest contrast in the
 * gamut is a linear programme. */
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/base_private.h"
#include "stimulus/stimulus_private.h"

ef_isolate_settings ef_isolate_settings_default(void) {
  ef_isolate_settings settings = {.background_rule = EF_BACKGROUND_GIVEN,
                                  .least_share = 0.5,
                                  .modulation = EF_SYMMETRIC,
                                  .contrast = (double)NAN};
  for (size_t i = 0; i < EF_MAX_DRIVES; ++i)
    settings.background[i] = 0.5;
  return settings;
}

/* ---- Checks ------------------------------------------------------------- */

static ef_status check_background(const ef_stimulator *stimulator,
                                  const double *background, ef_error *error) {
  for (size_t i = 0; i < stimulator->n; ++i) {
    if (background[i] >= 0 && background[i] <= 1)
      continue;
    return ef__error_set(error, EF_INVALID,
                         "the background has %g of primary '%s'; the gamut "
                         "holds 0 to 1",
                         background[i],
                         ef_device_drive_name(stimulator->device, i));
  }
  return EF_OK;
}

static ef_status check(const ef_stimulator *stimulator,
                       const ef_isolate_settings *settings, ef_error *error) {
  if (!isnan(settings->contrast) &&
      !(settings->contrast > 0 && isfinite(settings->contrast))) {
    return ef__error_set(error, EF_INVALID,
                         "a contrast of %g is wanted; expected more than 0 (a "
                         "direction has the signs)",
                         settings->contrast);
  }
  if (settings->background_rule != EF_BACKGROUND_FREE)
    return check_background(stimulator, settings->background, error);
  const double share = settings->least_share;
  if (share > 0 && share < 1)
    return EF_OK;
  return ef__error_set(
      error, EF_INVALID,
      "the background is to have at least %g of what full drive "
      "gives; expected more than 0 and less than 1",
      share);
}

ef_status ef__isolation_check(const ef_stimulator *stimulator,
                              const ef_isolation *isolation, ef_error *error) {
  if (isolation->n_primaries == stimulator->n)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "a modulation of %zu primaries is shown on %zu",
                       isolation->n_primaries, stimulator->n);
}

/* ---- The largest modulation --------------------------------------------- */

void ef__isolate_room(ef_modulation modulation, size_t n,
                      const double *background, double *down, double *up) {
  for (size_t i = 0; i < n; ++i) {
    down[i] = background[i];
    up[i] = 1 - background[i];
    if (modulation == EF_SYMMETRIC)
      down[i] = up[i] = fmin(down[i], up[i]);
  }
}

/* As many rows as primaries: the modulation of one unit, stretched to the
 * first limit. */
static bool solve_square(const ef__rows *rows, const double *down,
                         const double *up, double *modulation, double *along) {
  const size_t n = rows->n_primaries;
  double a[EF_N_RECEPTORS * EF_MAX_DRIVES];
  memcpy(a, rows->gain, n * n * sizeof *a);
  memcpy(modulation, rows->target, n * sizeof *modulation);
  if (!ef__solve(n, a, 1, modulation))
    return false;
  double farthest = 0;
  for (size_t i = 0; i < n; ++i)
    farthest = fmax(farthest, fabs(modulation[i]));
  *along = HUGE_VAL;
  for (size_t i = 0; i < n; ++i) {
    /* Less is what rounding leaves of nothing, and no limit stops it. */
    const bool moves = fabs(modulation[i]) > 1e-12 * farthest;
    const double room = modulation[i] < 0 ? down[i] : up[i];
    if (moves)
      *along = fmin(*along, room / fabs(modulation[i]));
  }
  for (size_t i = 0; i < n; ++i)
    modulation[i] *= *along;
  return true;
}

/* More primaries. Columns are shares of each primary's larger room, so that one
 * with hardly any is not lost beside the others; the last column is how far
 * along. */
static void fill_table(const ef__rows *rows, const double *down,
                       const double *up, ef__table *t) {
  const size_t n = rows->n_primaries;
  *t = (ef__table){.n_rows = rows->n, .n_columns = n + 1};
  double room[EF_MAX_DRIVES];
  for (size_t i = 0; i < n; ++i) {
    room[i] = fmax(down[i], up[i]);
    t->low[i] = room[i] > 0 ? -down[i] / room[i] : 0;
    t->high[i] = room[i] > 0 ? up[i] / room[i] : 0;
  }
  double most = HUGE_VAL; /* no amount reaches more */
  for (size_t k = 0; k < rows->n; ++k) {
    double reach = 0;
    for (size_t i = 0; i < n; ++i) {
      const double g = rows->gain[k * n + i] * room[i];
      t->row[k * (n + 1) + i] = g;
      reach += fabs(g);
    }
    t->row[k * (n + 1) + n] = -rows->target[k];
    if (rows->target[k] != 0)
      most = fmin(most, reach / fabs(rows->target[k]));
  }
  t->high[n] = 1.5 * most;
  t->gain[n] = 1;
}

static bool solve_programme(const ef__rows *rows, ef__simplex *simplex,
                            const double *down, const double *up,
                            double *modulation, double *along) {
  ef__table table;
  double x[EF__TABLE_COLUMNS];
  fill_table(rows, down, up, &table);
  if (ef__table_solve(&table, simplex, x, along) != EF__SIMPLEX_BEST)
    return false;
  for (size_t i = 0; i < rows->n_primaries; ++i)
    modulation[i] = x[i] * fmax(down[i], up[i]);
  return true;
}

ef_status ef__isolate_largest(const ef__rows *rows, const double *down,
                              const double *up, double *modulation,
                              double *along, ef_error *error) {
  bool solved;
  if (rows->n == rows->n_primaries) {
    solved = solve_square(rows, down, up, modulation, along);
  } else {
    ef__simplex *const simplex =
        ef__simplex_new(rows->n, rows->n_primaries + 1);
    if (simplex == NULL)
      return ef__error_memory(error, "a modulation");
    solved = solve_programme(rows, simplex, down, up, modulation, along);
    ef__simplex_free(simplex);
  }
  if (solved)
    return EF_OK;
  return ef__error_set(error, EF_NO_ANSWER,
                       "the largest modulation was not found: the receptors "
                       "are hardly separable (condition number %.3g)",
                       rows->condition_number);
}

/* ---- Report ------------------------------------------------------------- */

/* Which limits a modulation of the largest contrast reaches. */
static void find_limits(ef_isolation *out, const double *largest) {
  const double reached = 1e-9; /* of full drive */
  for (size_t i = 0; i < out->n_primaries; ++i) {
    const double at = out->background[i], step = largest[i];
    const bool both = out->modulation_kind == EF_SYMMETRIC;
    const double top = at + (both ? fabs(step) : step);
    const double bottom = at - (both ? fabs(step) : -step);
    const uint32_t bit = UINT32_C(1) << i;
    if (top >= 1 - reached && (both || step > 0))
      out->held_high |= bit;
    if (bottom <= reached && (both || step < 0))
      out->held_low |= bit;
  }
}

void ef__isolation_take_contrasts(const ef_stimulator *stimulator,
                                  ef_isolation *out) {
  const size_t n = stimulator->n;
  const double *const weight = stimulator->luminance_weight;
  double pooled = 0, before = 0, change = 0;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    double sum = 0;
    for (size_t i = 0; i < n; ++i)
      sum += stimulator->matrix[r * n + i] * out->modulation[i];
    out->contrast[r] =
        out->excitation[r] > 0 ? sum / out->excitation[r] : (double)NAN;
    if (r > EF_S_CONE)
      continue;
    pooled += out->excitation[r] > 0 ? out->contrast[r] * out->contrast[r] : 0;
    before += weight[r] * out->excitation[r];
    change += weight[r] * sum;
  }
  out->pooled_contrast = sqrt(pooled);
  out->luminance_change = before > 0 ? change / before : (double)NAN;
  out->luminance_cd_m2 =
      ef_stimulator_luminance_cd_m2(stimulator, out->background);
}

/* "red at full drive, blue at zero" */
static void list_limits(const ef_device *device, const ef_isolation *out,
                        size_t size, char *text) {
  size_t used = 0;
  text[0] = '\0';
  for (size_t k = 0; k < 2 * out->n_primaries; ++k) {
    const size_t i = k / 2;
    const bool high = k % 2 == 1;
    if (((high ? out->held_high : out->held_low) >> i & 1) == 0 || used >= size)
      continue;
    const int length =
        snprintf(text + used, size - used, "%s%s", used > 0 ? ", " : "",
                 ef_device_limit_name(device, i, high));
    used += length > 0 ? (size_t)length : 0;
  }
}

static ef_status refuse_contrast(const ef_stimulator *stimulator,
                                 const ef_isolation *out, double wanted,
                                 ef_error *error) {
  char limits[200];
  list_limits(stimulator->device, out, sizeof limits, limits);
  if (!(wanted > 0)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the background leaves no room along this direction "
                         "(limit: %s)",
                         limits);
  }
  return ef__error_set(error, EF_NO_ANSWER,
                       "a contrast of %.6g along this direction is wanted; the "
                       "largest in gamut is %.6g (limit: %s)",
                       wanted, out->largest, limits);
}

/* At a background that is settled. */
static ef_status isolate_at(const ef_stimulator *stimulator,
                            const ef_direction *direction,
                            const ef_isolate_settings *settings,
                            ef_isolation *out, ef_error *error) {
  const size_t n = stimulator->n;
  double down[EF_MAX_DRIVES], up[EF_MAX_DRIVES], largest[EF_MAX_DRIVES];
  ef__rows rows;
  ef_stimulator_excitations(stimulator, out->background, out->excitation);
  ef_status status = ef_direction_resolve(
      stimulator, direction, out->excitation, out->role, out->direction, error);
  if (status == EF_OK)
    status = ef__rows_make(stimulator, out->role, out->direction,
                           out->excitation, &rows, error);
  if (status != EF_OK)
    return status;
  ef__isolate_room(settings->modulation, n, out->background, down, up);
  status = ef__isolate_largest(&rows, down, up, largest, &out->largest, error);
  if (status != EF_OK)
    return status;
  find_limits(out, largest);
  out->condition_number = rows.condition_number;
  out->n_controlled = rows.n_controlled;
  out->rank = rows.n;
  /* What rounding leaves of a background without room is no contrast. */
  const double nothing = 64 * DBL_EPSILON;
  const bool all = isnan(settings->contrast);
  if (out->largest <= nothing ||
      (!all && settings->contrast > out->largest * (1 + nothing))) {
    return refuse_contrast(stimulator, out, all ? 0 : settings->contrast,
                           error);
  }
  out->along = all ? out->largest : fmin(settings->contrast, out->largest);
  for (size_t i = 0; i < n; ++i)
    out->modulation[i] = largest[i] * (out->along / out->largest);
  ef__isolation_take_contrasts(stimulator, out);
  return EF_OK;
}

ef_status ef_isolate(const ef_stimulator *stimulator,
                     const ef_direction *direction,
                     const ef_isolate_settings *settings, ef_isolation *out,
                     ef_error *error) {
  ef_status status = check(stimulator, settings, error);
  if (status != EF_OK)
    return status;
  ef_isolation found = {.n_primaries = stimulator->n,
                        .modulation_kind = settings->modulation};
  memcpy(found.background, settings->background,
         stimulator->n * sizeof *found.background);
  if (settings->background_rule != EF_BACKGROUND_GIVEN) {
    status = ef__background_choose(stimulator, direction, settings,
                                   found.background, error);
  }
  if (status == EF_OK)
    status = isolate_at(stimulator, direction, settings, &found, error);
  if (status == EF_OK)
    *out = found;
  return status;
}
