/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `match` and `swatch` compute, before anything is written. */
#ifndef COMMAND_MATCH_H
#define COMMAND_MATCH_H

#include <evenfield/match.h>

#include "companion.h"
#include "device.h"
#include "lights.h"
#include "recipes.h"
#include "seen.h"
#include "targets.h"

/** Everything the answers rest on. */
struct match_scene {
  const command_options *options;
  ef_metric *metric; /**< owned */
  ef_jnd jnd;        /**< value NaN: none */
  bool own_jnd;      /**< from --jnd */
  double tolerance;  /**< for --check */
  ef_observer *observer;
  ef_illuminant *illuminant;
  chosen_device device;
  ef_setup *setup;
  lights lights;     /**< none for displays */
  lights_view print; /**< of prints with spectra: has lights */
  recipes recipes;   /**< of colourants */
  bool has_views;    /**< targets and matches are told in all lights */
  colour_basis basis;
  ef_match_settings settings;
  double luminance_cd_m2; /**< of a display's white; NaN when not known */
  bool has_gamut;
  ef_gamut gamut; /**< measured by match_measure_gamut */
  const char *target_source;
  bool demo_targets;
  ef_reader *reader; /**< of the targets */
  targets targets;
  companion companion; /**< of a dichromat */
  seen seen;           /**< its population is NULL without --population */
};

/** Reads and checks everything but the rows of the targets. Free with
 * match_scene_free in every case. */
ef_status match_scene_load(match_scene *s, const command_options *options,
                           const ef_notes *notes, ef_error *error);
void match_scene_free(match_scene *s);
ef_status match_measure_gamut(match_scene *s, ef_error *error);

/** What is shown for a target in the end: by the code values, or exactly when
 * none were asked for. */
const ef_shown *match_achieved(const match_scene *s, const ef_match *m);

/** Counts over all targets so far. */
typedef struct match_summary {
  size_t n, n_skipped;
  size_t n_in_gamut;
  size_t n_near;      /**< out of gamut, missed by no more than one JND */
  size_t n_visible;   /**< what is shown differs by more than one JND */
  size_t n_beyond;    /**< what is shown differs by more than the tolerance */
  double mean, worst; /**< difference of what is shown */
  char worst_name[128];
  double worst_in_gamut; /**< the same among targets in gamut */
  double worst_miss;     /**< largest gap of targets out of gamut */
  char worst_miss_name[128];
  ef_components worst_miss_parts;
  ef_xyz worst_miss_target;
  double sum;
  /* Of a population: means over the targets in gamut (NaN without any) and over
   * all targets, and the target with the largest 95th percentile of all. */
  ef_spread in_gamut, all;
  ef_spread worst_seen;
  char worst_seen_name[128];
} match_summary;

/** One block of answers. */
typedef struct match_rows {
  size_t n;
  const char *const *name;
  const ef_match *match;
  const ef_spread *spread; /**< NULL without --population */
  /** Target and match in each of the scene's lights, n x lights.n; NULL where
   * there are none. */
  const ef_recipe_view *view;
  const ef_recipes *recipe; /**< NULL for devices that do not mix */
} match_rows;

void match_summary_add(match_summary *sum, const match_scene *s,
                       const match_rows *rows, size_t i);

/** Who receives the answers, block by block. A function that fails ends the
 * run. */
typedef struct match_sink {
  void *self;
  ef_status (*begin)(void *self, const match_scene *s, ef_error *error);
  ef_status (*rows)(void *self, const match_scene *s, const match_rows *rows,
                    ef_error *error);
  ef_status (*end)(void *self, const match_scene *s, const match_summary *sum,
                   ef_error *error);
} match_sink;

/** Reads, matches and hands on all targets in blocks, so that memory does not
 * grow with their number; all of `sinks` receive them. */
ef_status match_stream(match_scene *s, size_t n_sinks,
                       const match_sink *const *sinks, match_summary *sum,
                       ef_error *error);

#endif
