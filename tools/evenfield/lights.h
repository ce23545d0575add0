/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The lights that surfaces are matched in: the first is the one of the match,
 * in the others it is told how far standard and match part. */
#ifndef COMMAND_LIGHTS_H
#define COMMAND_LIGHTS_H

#include <evenfield/match.h>

#include "colours.h"
#include "option.h"

typedef struct lights {
  size_t n; /**< 1 to EF_MAX_LIGHTS; 0: nothing is told of others */
  ef_illuminant *light[EF_MAX_LIGHTS]; /**< owned, but for the first */
} lights;

/** `first` and those of --illuminant behind it; where none was asked for, A,
 * FL11 and LED-B3. Free with lights_free in every case. */
ef_status lights_init(lights *l, const command_options *options,
                      const ef_illuminant *first, const ef_notes *notes,
                      ef_error *error);
void lights_free(lights *l);
/** True when --illuminant asks for more than one. */
bool lights_are_asked(const command_options *options);

/** What a print's spectrum looks like in all lights, beside its target's. */
typedef struct lights_view {
  const lights *lights;
  const ef_device *device;
  const ef_metric *metric;
  ef_xyz white[EF_MAX_LIGHTS];
  ef_weights *target[EF_MAX_LIGHTS], *print[EF_MAX_LIGHTS]; /**< owned */
  double *spectrum;                                         /**< owned */
  size_t width; /**< samples of a target */
} lights_view;

/** For targets that are surfaces with spectra, and a device with spectra that
 * reflects. Free with lights_view_free in every case. */
ef_status lights_view_init(lights_view *v, const lights *l,
                           const ef_device *device, const ef_observer *observer,
                           const ef_metric *metric, const ef_reader_head *head,
                           const ef_notes *notes, ef_error *error);
void lights_view_free(lights_view *v);
/** One target of `width` samples and the print at `drive`: a view for each
 * light. */
ef_status lights_view_of(const lights_view *v, const double *target,
                         const double *drive, ef_recipe_view *out,
                         ef_error *error);

#endif
