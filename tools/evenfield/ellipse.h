/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `ellipse` computes, before anything is written. */
#ifndef COMMAND_ELLIPSE_H
#define COMMAND_ELLIPSE_H

#include <evenfield/difference.h>

#include "colours.h"
#include "jnd.h"
#include "point.h"

/** Values of --figure, in the order of its choices. */
typedef enum ellipse_figure {
  FIGURE_SECTION,
  FIGURE_PROJECTION,
  FIGURE_ELLIPSOID
} ellipse_figure;

/** Values of --basis, in the order of its choices. */
typedef enum ellipse_basis {
  BASIS_FORMULA,
  BASIS_MACADAM,
  BASIS_STEPS,
  BASIS_LAMPS,
  BASIS_LUO_RIGG, /**< from here on experiments of the library */
  BASIS_RIT_DUPONT,
  BASIS_HUANG
} ellipse_basis;

/** Everything the answers rest on. */
typedef struct ellipse_scene {
  const command_options *options;
  ellipse_basis from;
  ellipse_figure figure;
  ef_metric *metric; /**< owned; NULL unless from a formula */
  jnd jnd;
  ef_experiment *experiment; /**< owned; NULL unless from one */
  /** JND, standard deviations, steps or published sizes; NaN: a size. */
  double steps;
  double size; /**< in units of the metric */
  ef_observer *observer;
  ef_illuminant *illuminant;
  colour_basis basis;
  ef_conditions conditions;
  ef_frame frame;
  bool has_luminance; /**< of colours in cd/m2: that of the white is given */
} ellipse_scene;

/** Free with ellipse_scene_free in every case. */
ef_status ellipse_scene_load(ellipse_scene *s, const command_options *options,
                             const ef_notes *notes, ef_error *error);
void ellipse_scene_free(ellipse_scene *s);

#define ELLIPSE_REASON_ROOM 512

/** One colour's. */
typedef struct ellipse_row {
  const char *name;
  point at;
  bool found;
  ef_ellipse ellipse;
  double third; /**< the coordinate beside the plane's; NaN when not known */
  ef_ellipsoid solid;        /**< with FIGURE_ELLIPSOID */
  bool between;              /**< within MacAdam's centres; true for others */
  ef_nearest_center nearest; /**< of an experiment */
  char reason[ELLIPSE_REASON_ROOM]; /**< why none was found, "" else */
} ellipse_row;

/** Receives rows in blocks; one that fails ends the run. */
typedef struct ellipse_sink {
  void *self;
  ef_status (*rows)(void *self, const ellipse_scene *s, size_t n,
                    const ellipse_row *rows, ef_error *error);
} ellipse_sink;

typedef struct ellipse_count {
  size_t n, n_found, n_skipped;
} ellipse_count;

/** The colours of the options, then all files in order. EF_NO_ANSWER when none
 * of them has an ellipse. */
ef_status ellipse_stream(ellipse_scene *s, const ef_notes *notes,
                         const ellipse_sink *sink, ellipse_count *count,
                         ef_error *error);

#endif
