/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `describe` computes, before anything is written. */
#ifndef COMMAND_DESCRIBE_H
#define COMMAND_DESCRIBE_H

#include <evenfield/difference.h>

#include "colours.h"
#include "option.h"

/** One spectrum or colour. Numbers that are not known or not defined are
 * NaN. */
typedef struct description {
  const char *name, *file;
  const char *kind; /**< "surface", "light" or "colour" */
  ef_xyz xyz;
  ef_xyy xyy;
  ef_uv uv;
  ef_lab lab;
  ef_lms lms;
  double rod, melanopsin; /**< excitations on the scale of the cones' */
  ef_mb mb;
  bool has_alpha;      /**< of spectra of lights */
  ef_alpha_opic alpha; /**< absolute when luminance_cd_m2 is known */
  double luminance_cd_m2;
  ef_cct cct;
  ef_dominant dominant;
  double Ra;
  bool Ra_tolerable; /**< near enough to its reference for Ra to mean much */
  ef_whiteness whiteness; /**< of surfaces and colours */
  /** Of spectra of lights: the nearest of the daylights that ISO/CIE 23603
   * grades simulators of, and how far in CIE 1964 u', v'; NULL: no spectrum. */
  const char *daylight;
  double daylight_distance;
} description;

/** No simulator farther than this from its daylight has a grade. */
#define DESCRIBE_SIMULATOR_REACH 0.015

/** Everything the answers rest on. */
typedef struct describe_scene {
  const command_options *options;
  ef_observer *observer;
  ef_observer *observer_1931; /**< for colour temperature; NULL: the same */
  ef_illuminant *illuminant;
  colour_basis basis;
  ef_xy equal_energy;                /**< white of lights */
  const ef_white_scale *white_scale; /**< NULL: none for this observer and
                                          light */
  bool has_light_white;              /**< a file held a light named white */
} describe_scene;

/** Free with describe_scene_free in every case. */
ef_status describe_scene_load(describe_scene *s, const command_options *options,
                              const ef_notes *notes, ef_error *error);
void describe_scene_free(describe_scene *s);

/** Receives descriptions in blocks; one that fails ends the run. */
typedef struct describe_sink {
  void *self;
  ef_status (*rows)(void *self, const describe_scene *s, size_t n,
                    const description *descriptions, ef_error *error);
} describe_sink;

/** Reads all files in order. */
ef_status describe_stream(describe_scene *s, const ef_notes *notes,
                          const describe_sink *sink, size_t *n,
                          size_t *n_skipped, ef_error *error);

#endif
