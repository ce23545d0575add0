/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A display as receptors get it: one row of excitations for each receptor. */
#include "stimulus/stimulus_private.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

static const char *const symbols[EF_N_RECEPTORS] = {"L", "M", "S", "rod",
                                                    "mel"};

const char *ef_receptor_symbol(ef_receptor receptor) {
  return symbols[receptor];
}

ef_status ef_receptor_find(const char *symbol, ef_receptor *out,
                           ef_error *error) {
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (!ef__name_equal(symbol, symbols[r]))
      continue;
    *out = (ef_receptor)r;
    return EF_OK;
  }
  return ef__error_unknown(error, "receptor", symbol, symbols, EF_N_RECEPTORS);
}

static ef_status check_device(const ef_device *device, ef_error *error) {
  if (ef_device_reflects(device)) {
    return ef__error_set(
        error, EF_NO_ANSWER,
        "'%s' (%s) reflects light; receptors are isolated with "
        "the primaries of a display",
        ef_device_name(device), ef_device_kind(device));
  }
  if (!ef_device_has_spectra(device)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "'%s' is known by chromaticities only; what receptors "
                         "get of it takes the spectra of its primaries",
                         ef_device_name(device));
  }
  return EF_OK;
}

/* Personal weights or the observer's, to a sum of 1. */
static ef_status set_weights(ef_stimulator *s, const double *personal,
                             ef_error *error) {
  const ef_mb_scale scale = ef_observer_mb_scale(s->observer);
  const double own[3] = {scale.k_l, scale.k_m, 0};
  const double *const weight = personal != NULL ? personal : own;
  double sum = 0;
  for (size_t c = 0; c < 3; ++c) {
    if (!(weight[c] >= 0) || !isfinite(weight[c])) {
      return ef__error_set(error, EF_INVALID,
                           "luminance weight of %s is %g; expected 0 or more",
                           symbols[c], weight[c]);
    }
    sum += weight[c];
  }
  if (!(weight[0] + weight[1] > 0) || !isfinite(sum)) {
    return ef__error_set(error, EF_INVALID,
                         "luminance weights %g:%g:%g; L and M cannot both be "
                         "without",
                         weight[0], weight[1], weight[2]);
  }
  for (size_t c = 0; c < 3; ++c)
    s->luminance_weight[c] = weight[c] / sum;
  return EF_OK;
}

/* Light of all drives at zero, and what each drive at full adds to it. */
static ef_status take_spectra(ef_stimulator *s, ef_error *error) {
  const size_t width = s->grid.count;
  double drive[EF_MAX_DRIVES] = {0};
  ef_status status =
      ef_device_spectrum(s->device, drive, s->spectrum, NULL, error);
  for (size_t i = 0; i < s->n && status == EF_OK; ++i) {
    double *const row = s->spectrum + (1 + i) * width;
    drive[i] = 1;
    status = ef_device_spectrum(s->device, drive, row, NULL, error);
    drive[i] = 0;
    for (size_t k = 0; k < width; ++k)
      row[k] -= s->spectrum[k];
  }
  return status;
}

/* `channel` of all weights for each spectrum: (1 + n) x n_channels. */
static ef_status see(const ef_stimulator *s, ef_channel_role role,
                     const ef_notes *notes, double *out, ef_error *error) {
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = ef_device_absolute(s->device);
  ef_error failure = {.status = EF_OK};
  ef_weights *const weights = ef_observer_weights(s->observer, role, &s->grid,
                                                  &viewing, notes, &failure);
  ef_status status = failure.status;
  if (weights != NULL) {
    status = ef_weights_apply(weights, 1 + s->n, s->spectrum, 1, out, &failure);
  }
  ef_weights_free(weights);
  if (status != EF_OK && error != NULL)
    *error = failure;
  return status;
}

static ef_status take_excitations(ef_stimulator *s, const ef_notes *notes,
                                  ef_error *error) {
  double receptor[(1 + EF_MAX_DRIVES) * EF_N_RECEPTORS];
  double xyz[(1 + EF_MAX_DRIVES) * 3];
  ef_status status = see(s, EF_RECEPTORS, notes, receptor, error);
  if (status == EF_OK)
    status = see(s, EF_TRISTIMULUS, NULL, xyz, error);
  if (status != EF_OK)
    return status;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    s->dark[r] = receptor[r];
    for (size_t i = 0; i < s->n; ++i)
      s->matrix[r * s->n + i] = receptor[(1 + i) * EF_N_RECEPTORS + r];
  }
  s->dark_y = xyz[1];
  for (size_t i = 0; i < s->n; ++i)
    s->y[i] = xyz[3 * (1 + i) + 1];
  return EF_OK;
}

static void tell_borrowed(const ef_observer *observer, const double *personal,
                          const ef_notes *notes) {
  if (!ef_observer_cones_borrowed(observer))
    return;
  ef__note(notes,
           "%s has no cones of its own: excitations are those of the CIE 2006 "
           "fundamentals for %g degrees%s",
           ef_observer_name(observer), ef_observer_field_deg(observer),
           personal == NULL ? ", and so is what counts as isoluminant" : "");
}

ef_stimulator *ef_stimulator_new(const ef_device *device,
                                 const ef_observer *observer,
                                 const double *luminance_weight,
                                 const ef_notes *notes, ef_error *error) {
  if (device == NULL || observer == NULL) {
    ef__error_set(error, EF_INVALID,
                  "a stimulator needs a device and an observer");
    return NULL;
  }
  if (check_device(device, error) != EF_OK)
    return NULL;
  ef_stimulator *s = NULL;
  double *spectrum = NULL;
  const size_t n = ef_device_n_drives(device);
  const ef_grid *const grid = ef_device_grid(device);
  const ef__part parts[] = {{&s, 1, sizeof *s},
                            {&spectrum, (1 + n) * grid->count, sizeof(double)}};
  if (ef__allocate_block(2, parts) == NULL) {
    ef__error_memory(error, "a stimulator");
    return NULL;
  }
  s->device = device;
  s->observer = observer;
  s->n = n;
  s->grid = *grid;
  s->spectrum = spectrum;
  ef_status status = set_weights(s, luminance_weight, error);
  if (status == EF_OK)
    status = take_spectra(s, error);
  if (status == EF_OK)
    status = take_excitations(s, notes, error);
  if (status == EF_OK) {
    tell_borrowed(observer, luminance_weight, notes);
    return s;
  }
  ef_stimulator_free(s);
  return NULL;
}

void ef_stimulator_free(ef_stimulator *stimulator) {
  free(stimulator); /* one block */
}

const ef_device *ef_stimulator_device(const ef_stimulator *stimulator) {
  return stimulator->device;
}

const ef_observer *ef_stimulator_observer(const ef_stimulator *stimulator) {
  return stimulator->observer;
}

size_t ef_stimulator_n_primaries(const ef_stimulator *stimulator) {
  return stimulator->n;
}

const double *ef_stimulator_luminance_weights(const ef_stimulator *stimulator) {
  return stimulator->luminance_weight;
}

const double *ef_stimulator_matrix(const ef_stimulator *stimulator) {
  return stimulator->matrix;
}

void ef_stimulator_excitations(const ef_stimulator *stimulator,
                               const double *amount,
                               double excitation[EF_N_RECEPTORS]) {
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    excitation[r] = stimulator->dark[r];
    for (size_t i = 0; i < stimulator->n; ++i)
      excitation[r] += stimulator->matrix[r * stimulator->n + i] * amount[i];
  }
}

double ef_stimulator_luminance_cd_m2(const ef_stimulator *stimulator,
                                     const double *amount) {
  if (!ef_device_absolute(stimulator->device))
    return nan("");
  double y = stimulator->dark_y;
  for (size_t i = 0; i < stimulator->n; ++i)
    y += stimulator->y[i] * amount[i];
  return y;
}
