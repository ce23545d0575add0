/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Targets in, answers out: exact amounts, the nearest colour, hue kept, codes.
 * Every target is computed by itself, so that neither threads nor the size of
 * the batch change a digit. */
#include <evenfield/match.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "match/match_private.h"

/* Amounts this close to 0 or 1 are at the bound: the rounding of an inverse of
 * condition 1e3, far above any real display's, and below any code. */
#define SNAP 4e-12

ef_match_settings ef_match_settings_default(void) {
  return (ef_match_settings){.metric = ef_metric_find("ciede2000", NULL),
                             .bits = 8,
                             .hue_kept = true,
                             .jnd = (double)NAN};
}

void ef__fill_shown(const ef__batch *job, const ef__search *search,
                    const double amount[3], ef_shown *out) {
  double coordinate[3];
  for (size_t i = 0; i < 3; ++i) {
    out->amount[i] = amount[i];
    out->drive[i] = ef_device_drive(job->device, i, amount[i]);
  }
  out->xyz = ef__mixing_xyz(search->mixing, amount, NULL);
  ef_metric_coordinates(search->metric, out->xyz,
                        &search->mixing->conditions, coordinate);
  out->difference = ef_metric_components(search->metric, search->target,
                                         coordinate, &out->components);
  out->jnds = out->difference / job->jnd;
  out->found = true;
}

void ef__fill_exact(const ef__batch *job, const double amount[3],
                    ef_xyz target, ef_shown *out) {
  for (size_t i = 0; i < 3; ++i) {
    out->amount[i] = amount[i];
    out->drive[i] = ef_device_drive(job->device, i, amount[i]);
  }
  out->xyz = target;
  out->difference = 0;
  out->jnds = 0 / job->jnd;
  out->components = (ef_components){0, 0, 0};
  out->found = true;
}

void ef__fill_amounts(double amount[3], ef_match *m) {
  for (int i = 0; i < 3; ++i) {
    if (fabs(amount[i]) < SNAP) amount[i] = 0;
    if (fabs(amount[i] - 1) < SNAP) amount[i] = 1;
    if (amount[i] < 0) m->below |= (uint32_t)1 << i;
    if (amount[i] > 1) m->above |= (uint32_t)1 << i;
    m->amount[i] = amount[i];
  }
  m->in_gamut = m->below == 0 && m->above == 0;
}

static void fill_exact_amounts(const ef__mixing *mixing, ef_match *m,
                               double amount[3]) {
  if (ef__exact(mixing, m->target, amount)) {
    ef__fill_amounts(amount, m);
    return;
  }
  for (int i = 0; i < 3; ++i) m->amount[i] = (double)NAN;
}

void ef__fill_held(ef_match *m) {
  for (int i = 0; i < 3; ++i) {
    if (m->in_gamut) break;
    if (m->nearest.amount[i] <= 0) m->held_low |= (uint32_t)1 << i;
    if (m->nearest.amount[i] >= 1) m->held_high |= (uint32_t)1 << i;
  }
}

void ef__fill_coded(const ef__batch *job, const ef__search *search,
                    ef_match *m) {
  double amount[3], rounded[3], coordinate[3];
  for (int i = 0; i < 3; ++i) {
    const double code = round(m->nearest.drive[i] * job->max_code);
    amount[i] = job->lattice.amount[i][m->code[i]];
    rounded[i] = job->lattice.amount[i][(size_t)code];
  }
  ef__fill_shown(job, search, amount, &m->coded);
  for (int i = 0; i < 3; ++i) {
    m->coded.drive[i] = (double)m->code[i] / job->max_code;
  }
  ef_metric_coordinates(search->metric,
                        ef__mixing_xyz(search->mixing, rounded, NULL),
                        &search->mixing->conditions, coordinate);
  m->rounded_difference =
      ef_metric_difference(search->metric, search->target, coordinate);
}

/* True when the nearest colour that was found is the target after all, which
 * the search for exact amounts, with its few starts, has missed. */
static bool is_reached(const ef__batch *job, ef_match *m, ef__minima *minima) {
  const double near = 1e-3; /* from where Newton's method finds the rest */
  if (!(minima->at[0].square < near * near)) return false;
  double amount[3];
  memcpy(amount, minima->at[0].amount, sizeof amount);
  if (!ef__exact_from(&job->mixing, m->target, amount)) return false;
  memcpy(m->amount, amount, sizeof amount);
  memcpy(minima->at[0].amount, amount, sizeof amount);
  minima->at[0].square = 0;
  minima->n = 1;
  m->in_gamut = true;
  return true;
}

/* The codes, and where these show less than the nearest colour known, which the
 * search for it has missed, the colour to which they lead. */
static void quantise(const ef__batch *job, ef__search *search,
                     ef__minima *minima, uint32_t code[3]) {
  double square, amount[3];
  ef__quantise(search, &job->lattice, minima, code, &square);
  if (!(square < minima->at[0].square * (1 - 1e-9))) return;
  for (int c = 0; c < 3; ++c) amount[c] = job->lattice.amount[c][code[c]];
  ef__nearest_from(search, amount, minima);
  ef__quantise(search, &job->lattice, minima, code, &square);
}

static void match_one(const ef__batch *job, ef_xyz target, ef_match *m) {
  ef__search search = {.mixing = &job->mixing, .metric = job->settings->metric};
  ef__minima minima;
  double amount[3];
  memset(m, 0, sizeof *m);
  m->target = target;
  ef_metric_coordinates(search.metric, target, &job->mixing.conditions,
                        search.target);
  fill_exact_amounts(&job->mixing, m, amount);
  if (m->in_gamut) {
    ef__fill_exact(job, amount, target, &m->nearest);
    minima.n = 1;
    minima.at[0].square = 0;
    memcpy(minima.at[0].amount, amount, sizeof amount);
    if (job->settings->hue_kept) m->hue_kept = m->nearest;
  } else {
    ef__nearest(&search, amount, &minima);
  }
  const bool reached =
      !m->in_gamut && !job->mixing.affine && is_reached(job, m, &minima);
  if (job->max_code > 0) quantise(job, &search, &minima, m->code);
  if (reached) {
    memcpy(amount, m->amount, sizeof amount);
    ef__fill_exact(job, amount, target, &m->nearest);
    if (job->settings->hue_kept) m->hue_kept = m->nearest;
  } else if (!m->in_gamut) {
    ef__fill_shown(job, &search, minima.at[0].amount, &m->nearest);
    double kept[3];
    if (job->settings->hue_kept && ef__hue_kept(&search, kept)) {
      ef__fill_shown(job, &search, kept, &m->hue_kept);
    }
  }
  ef__fill_held(m);
  if (job->max_code > 0) ef__fill_coded(job, &search, m);
}

static void match_range(void *context, size_t begin, size_t end) {
  const ef__batch *const j = context;
  for (size_t i = begin; i < end; ++i) {
    const double *const t = j->xyz + 3 * i;
    match_one(j, (ef_xyz){t[0], t[1], t[2]}, &j->out[i]);
  }
}

/* Amounts of all codes, 0 to max_code of each channel, in one block. */
static ef_status make_lattice(ef__batch *job, double **block, ef_error *error) {
  const size_t n = (size_t)job->max_code + 1;
  *block = ef__allocate(3 * n, sizeof **block);
  if (*block == NULL) return ef__error_memory(error, "the code values");
  job->lattice.n_codes = n;
  for (size_t c = 0; c < 3; ++c) {
    double *const amount = *block + c * n;
    for (size_t i = 0; i < n; ++i) {
      amount[i] = ef_device_amount(job->device, c, (double)i / job->max_code,
                                   NULL);
    }
    job->lattice.amount[c] = amount;
  }
  return EF_OK;
}

static ef_status check_settings(const ef_match_settings *settings, int jobs,
                                ef_error *error) {
  if (settings->metric == NULL) {
    return ef__error_set(error, EF_INVALID, "no metric is given");
  }
  if (settings->bits < 0 || settings->bits > 16) {
    return ef__error_set(error, EF_INVALID,
                         "%d bits; code values have 1 to 16, 0 for none",
                         settings->bits);
  }
  if (settings->n_steps < 0 || settings->n_steps > EF_MATCH_MOST_STEPS) {
    return ef__error_set(error, EF_INVALID,
                         "%d steps of a drive; expected 1 to %d, 0 for none",
                         settings->n_steps, EF_MATCH_MOST_STEPS);
  }
  if (settings->bits > 0 && settings->n_steps > 0) {
    return ef__error_set(error, EF_INVALID,
                         "codes of %d bits and %d steps; one of them is 0",
                         settings->bits, settings->n_steps);
  }
  if (settings->jnd <= 0) {
    return ef__error_set(error, EF_INVALID, "a JND of %g; it is above 0",
                         settings->jnd);
  }
  if (jobs < 0) {
    return ef__error_set(error, EF_INVALID, "%d jobs; 0 or more are possible",
                         jobs);
  }
  return EF_OK;
}

static ef_status check_targets(size_t n, const double *xyz, ef_error *error) {
  for (size_t i = 0; i < 3 * n; ++i) {
    if (isfinite(xyz[i])) continue;
    return ef__error_set(error, EF_INVALID,
                         "target %zu has a value that is not a finite number",
                         i / 3 + 1);
  }
  return EF_OK;
}

ef_status ef__batch_start(ef__batch *batch, const ef_setup *setup, size_t n,
                          const double *xyz, const ef_match_settings *settings,
                          int jobs, ef_match *out, double **block,
                          ef_error *error) {
  *batch = (ef__batch){.device = ef_setup_device(setup),
                       .settings = settings,
                       .xyz = xyz,
                       .out = out};
  *block = NULL;
  ef_status status = check_settings(settings, jobs, error);
  if (status == EF_OK) status = check_targets(n, xyz, error);
  if (status != EF_OK) return status;
  batch->jnd = isnan(settings->jnd) ? ef_metric_jnd(settings->metric).value
                                    : settings->jnd;
  batch->max_code = settings->n_steps > 0
                        ? (double)settings->n_steps
                        : (double)(((size_t)1 << settings->bits) - 1);
  return batch->max_code > 0 ? make_lattice(batch, block, error) : EF_OK;
}

ef_status ef_match_batch(const ef_setup *setup, size_t n, const double *xyz,
                         const ef_match_settings *settings, int jobs,
                         ef_match *out, ef_error *error) {
  enum { CHUNK = 64 }; /* some 0.3 ms of targets out of gamut */
  if (ef_observer_dimensions(ef_setup_observer(setup)) < 3) {
    return ef_match_flat_batch(setup, n, xyz, NULL, settings, jobs, out,
                               error);
  }
  ef__batch j;
  double *block;
  ef__scout *scout = NULL;
  ef_status status = ef__batch_start(&j, setup, n, xyz, settings, jobs, out,
                                     &block, error);
  if (status == EF_OK) status = ef__mixing_from_setup(setup, &j.mixing, error);
  if (status == EF_OK) {
    scout = ef__scout_new(&j.mixing, settings->metric, error);
    if (scout == NULL) status = EF_NO_MEMORY;
    j.mixing.scout = scout;
  }
  if (status == EF_OK) ef__parallel_for(n, CHUNK, jobs, match_range, &j);
  free(block);
  ef__scout_free(scout);
  return status;
}
