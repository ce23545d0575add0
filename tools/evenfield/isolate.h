/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `isolate` computes: a modulation, its codes, other people, the eye, and
 * cautions. */
#ifndef COMMAND_ISOLATE_H
#define COMMAND_ISOLATE_H

#include <evenfield/stimulus.h>

#include "display.h"
#include "isolate_frames.h"
#include "option.h"
#include "people.h"

/** What the modulation rests on. */
struct isolate_scene {
  const command_options *options;
  bool demo_display;
  ef_metric *metric; /**< of the display's residuals */
  ef_observer *observer;
  display display;
  ef_stimulator *stimulator;
  bool own_weights; /**< of luminance */
  const char *direction_text;
  ef_direction direction;
  ef_isolate_settings settings;
  ef_pupil pupil;
  double size_deg, exposure_s;
  people people; /**< its population is NULL: none was asked for */
};

/** What came of it. */
struct isolate_result {
  ef_isolation way;
  ef_coded coded;
  ef_receptor_spread spread[EF_N_RECEPTORS]; /**< with a population */
  double field_deg; /**< diameter of a disc as large as what changes */
  bool has_eye;     /**< false: the spectra are not absolute, and no luminance,
                         troland, irradiance or hazard is known */
  ef_retinal eye;
  ef_blue_light blue; /**< of the worse of the two extremes */
  size_t n_cautions;
  char caution[EF_MOST_CAUTIONS][EF_CAUTION_TEXT];
  isolate_show show;
};

/** Reads what the options name. Free with isolate_scene_free in every case. */
ef_status isolate_scene_load(isolate_scene *s, const command_options *options,
                             const ef_notes *notes, ef_error *error);
void isolate_scene_free(isolate_scene *s);
/** Free with isolate_result_free in every case. */
ef_status isolate_compute(const isolate_scene *s, const ef_notes *notes,
                          isolate_result *out, ef_error *error);
void isolate_result_free(isolate_result *r);

/** The drives of some amounts. */
void isolate_drives(const isolate_scene *s, const double *amount,
                    double *drive);
/** Amounts of the background plus `sign` times the modulation. */
void isolate_extreme(const ef_isolation *way, double sign, double *amount);

/* ---- isolate_options.c ------------------------------------------------- */

/** --background, for that display. */
ef_status isolate_background(const command_options *options,
                             const ef_device *device,
                             ef_isolate_settings *settings, ef_error *error);
/** --luminance-weights. */
ef_status isolate_weights(const char *words, double weight[3], ef_error *error);
/** --pupil; the age is the observer's, where it has one. */
ef_status isolate_pupil(const char *words, const ef_observer *observer,
                        ef_pupil *pupil, ef_error *error);

#endif
