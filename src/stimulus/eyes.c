/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Excitations of many observers by a few lights: the lights are interpolated
 * once, so that an observer costs the sums over wavelength and nothing else. */
#include "observer/model_private.h"

#include "stimulus/stimulus_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { W = EF__WORKING_SAMPLES };

/* Rods and melanopsin, as the mean observer of 32 years has them. */
static ef_status take_rest(double *rest, ef_error *error) {
  ef_observer *const observer = ef_observer_new("cie-2015-2", error);
  if (observer == NULL)
    return EF_NO_MEMORY;
  const ef_channels channels = ef_observer_channels(observer, EF_RECEPTORS);
  memcpy(rest, channels.value + (size_t)EF_ROD * W, 2 * W * sizeof *rest);
  ef_observer_free(observer);
  return EF_OK;
}

ef_status ef__eyes_new(const ef_stimulator *stimulator, ef__eyes **out,
                       ef_error *error) {
  ef__eyes *eyes = NULL;
  double *light = NULL, *rest = NULL;
  const size_t n = stimulator->n;
  const ef_grid grid = ef_grid_standard();
  const ef__part parts[] = {{&eyes, 1, sizeof *eyes},
                            {&light, (1 + n) * W, sizeof *light},
                            {&rest, 2 * W, sizeof *rest}};
  if (ef__allocate_block(3, parts) == NULL)
    return ef__error_memory(error, "the eyes of a population");
  *eyes = (ef__eyes){.n = n, .light = light, .rest = rest};
  ef_status status =
      ef_resample(&stimulator->grid, 1 + n, stimulator->spectrum, &grid,
                  EF_INTERPOLATE_AUTO, EF_EXTEND_ZERO, light, error);
  if (status == EF_OK)
    status = take_rest(rest, error);
  if (status == EF_OK)
    status = ef__cones_new(&grid, &eyes->cones, error);
  if (status != EF_OK) {
    ef__eyes_free(eyes);
    return status;
  }
  *out = eyes;
  return EF_OK;
}

void ef__eyes_free(ef__eyes *eyes) {
  if (eyes == NULL)
    return;
  free(eyes->cones);
  free(eyes);
}

static double sum_of(const double *channel, const double *light) {
  double sum = 0;
  for (size_t k = 0; k < W; ++k)
    sum += channel[k] * light[k];
  return sum;
}

void ef__eyes_excitations(const ef__eyes *eyes, const ef_cone_model *model,
                          double dark[EF_N_RECEPTORS], double *matrix) {
  double channel[EF_N_RECEPTORS * W];
  double *const rest = channel + (size_t)EF_ROD * W;
  ef__cones_fundamentals(eyes->cones, model, EF_ENERGY, channel);
  for (size_t k = 0; k < W; ++k) {
    const double factor = exp(ef__cones_lens_change(
        &eyes->cones->templates, model, eyes->cones->wavelength_nm[k]));
    rest[k] = factor * eyes->rest[k];
    rest[W + k] = factor * eyes->rest[W + k];
  }
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    dark[r] = sum_of(channel + r * W, eyes->light);
    for (size_t i = 0; i < eyes->n; ++i)
      matrix[r * eyes->n + i] =
          sum_of(channel + r * W, eyes->light + (1 + i) * W);
  }
}

void ef__eyes_gains(const ef__eyes *eyes, const ef_cone_model *model,
                    const double *background, double *gain) {
  double dark[EF_N_RECEPTORS];
  ef__eyes_excitations(eyes, model, dark, gain);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    double *const row = gain + r * eyes->n;
    double excitation = dark[r];
    for (size_t i = 0; i < eyes->n; ++i)
      excitation += row[i] * background[i];
    for (size_t i = 0; i < eyes->n; ++i)
      row[i] = excitation > 0 ? row[i] / excitation : 0;
  }
}
