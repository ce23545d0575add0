/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A channel's value is c' P s: weights c on the working grid, the operator P,
 * samples s. The weights on the samples are P' c, so the transposed operator is
 * applied to each channel, which costs a few operations a working wavelength;
 * P itself is never multiplied out. */
#include "spectrum/spectrum_private.h"

#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"

ef_fold_settings ef_fold_settings_default(void) {
  return (ef_fold_settings){.working = ef_grid_standard(),
                            .interpolation = EF_INTERPOLATE_AUTO,
                            .extension = EF_EXTEND_AUTO,
                            .kind = EF_SURFACE,
                            .correct_bandpass = false};
}

static ef_extension resolve_extension(const ef_fold_settings *settings) {
  if (settings->extension != EF_EXTEND_AUTO)
    return settings->extension;
  return settings->kind == EF_SURFACE ? EF_EXTEND_HOLD : EF_EXTEND_ZERO;
}

static ef_status check_finite(size_t n, const double *value, const char *what,
                              ef_error *error) {
  for (size_t i = 0; i < n; ++i) {
    if (isfinite(value[i]))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "value %zu of the %s is not a finite number", i + 1,
                         what);
  }
  return EF_OK;
}

static ef_weights *allocate(size_t n_channels, const ef_grid *samples) {
  ef_weights *weights = NULL;
  ef_weights part = {.n_channels = n_channels, .n_samples = samples->count};
  double *wavelength = NULL;
  size_t n_weights;
  if (!ef__size_multiply(n_channels, samples->count, &n_weights))
    return NULL;
  const ef__part parts[] = {
      {&weights, 1, sizeof *weights},
      {&part.matrix, n_weights, sizeof *part.matrix},
      {&part.outside, n_channels, sizeof *part.outside},
      {&wavelength, ef__grid_storage(samples), sizeof *wavelength}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    return NULL;
  }
  part.grid = ef__grid_copy(samples, wavelength);
  *weights = part;
  return weights;
}

/* Share of |weight| on the working wavelengths that rest on the end rule. */
static double outside_share(const ef__operator *op, const double *weight) {
  double whole = 0;
  double outside = 0;
  for (size_t i = 0; i < op->n_out; ++i) {
    whole += fabs(weight[i]);
    if (op->outside[i])
      outside += fabs(weight[i]);
  }
  return whole > 0 ? outside / whole : 0;
}

static void fold_channels(const ef__operator *op, const double *channel,
                          const double *illuminant, const double *scale,
                          double *working, double *scratch,
                          ef_weights *weights) {
  for (size_t c = 0; c < weights->n_channels; ++c) {
    const double *const curve = channel + c * op->n_out;
    double *const row = weights->matrix + c * op->n_in;
    for (size_t i = 0; i < op->n_out; ++i) {
      working[i] = illuminant != NULL ? curve[i] * illuminant[i] : curve[i];
    }
    weights->outside[c] = outside_share(op, working);
    ef__operator_apply_transposed(op, working, scratch, row);
    for (size_t i = 0; i < op->n_in; ++i)
      row[i] *= scale[c];
  }
}

ef_weights *ef_weights_fold(const ef_grid *samples, size_t n_channels,
                            const double *channel, const double *illuminant,
                            const double *scale,
                            const ef_fold_settings *settings, ef_error *error) {
  ef_weights *weights = NULL;
  double *work = NULL;
  ef__operator *const op = ef__operator_new(
      samples, &settings->working, settings->interpolation,
      resolve_extension(settings), settings->correct_bandpass, error);
  if (op == NULL)
    return NULL;
  size_t n_values;
  if (!ef__size_multiply(n_channels, op->n_out, &n_values)) {
    ef__error_set(error, EF_INVALID, "%zu channels are too many", n_channels);
    goto done;
  }
  if (check_finite(n_values, channel, "channels", error) != EF_OK)
    goto done;
  if (check_finite(n_channels, scale, "scales", error) != EF_OK)
    goto done;
  if (illuminant != NULL &&
      check_finite(op->n_out, illuminant, "illuminant", error) != EF_OK) {
    goto done;
  }
  work = ef__allocate(op->n_out + ef__operator_scratch(op), sizeof *work);
  weights = allocate(n_channels, samples);
  if (work == NULL || weights == NULL) {
    ef__error_memory(error, "folded weights");
    ef_weights_free(weights);
    weights = NULL;
    goto done;
  }
  fold_channels(op, channel, illuminant, scale, work, work + op->n_out,
                weights);
done:
  free(work);
  free(op);
  return weights;
}

void ef_weights_free(ef_weights *weights) {
  free(weights); /* one block */
}

size_t ef_weights_channels(const ef_weights *weights) {
  return weights->n_channels;
}

size_t ef_weights_samples(const ef_weights *weights) {
  return weights->n_samples;
}

const double *ef_weights_matrix(const ef_weights *weights) {
  return weights->matrix;
}

double ef_weights_outside(const ef_weights *weights, size_t channel) {
  return weights->outside[channel];
}

const ef_grid *ef_weights_grid(const ef_weights *weights) {
  return &weights->grid;
}
