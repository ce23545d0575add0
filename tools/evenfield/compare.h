/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `compare` computes, before anything is written. */
#ifndef COMMAND_COMPARE_H
#define COMMAND_COMPARE_H

#include <evenfield/match.h>

#include "cloud.h"
#include "finish.h"
#include "jnd.h"
#include "people.h"
#include "worst_case.h"

/** Which sample is held against which standard. */
typedef enum compare_pairing {
  PAIR_ONE,   /**< every sample against the one standard */
  PAIR_NAMES, /**< each with the standard of its own name */
  PAIR_LIST   /**< as --pairs says */
} compare_pairing;

/** Everything the answers rest on. */
typedef struct compare_scene {
  const command_options *options;
  ef_metric *metric; /**< owned */
  jnd jnd;
  double tolerance;   /**< in the metric; NaN: none */
  bool own_tolerance; /**< from --tolerance */
  looks looks;
  ef_correction correction;
  ef_adaptation adaptation; /**< for colour inconstancy */
  ef_task task;
  ef_told_apart_settings told;
  ef_teller *teller[2];       /**< by propagation; made when they are needed */
  bool always_draws;          /**< Monte Carlo also for small uncertainties */
  size_t n_weights;           /**< of angles; 0: all alike */
  double *angle_deg, *weight; /**< owned */
  const char *standard_source, *batch_source;
  bool is_demo;
  compare_pairing pairing;
  part_range part; /**< of the batch, or of the list of pairs */
  finish_file *standard, *batch; /**< one file: `batch` NULL */
  bool has_spectra;              /**< both sides */
  bool same_grid;
  people people; /**< population NULL: none asked for */
  /** They before each look of the first observer; NULL for the others. */
  ef_crowd *crowd[LOOKS_MOST];
  clouds *clouds; /**< what a chart shows of them; NULL: nothing. Owned */
  worst_case *worst_case; /**< of --worst-case, with one standard; owned */
  size_t n_worst_cases;
  char *worst_case_of; /**< name of the standard; owned */
  const ef_notes *notes;
} compare_scene;

/** Opens the files and checks everything but their rows. Free with
 * compare_scene_free in every case. */
ef_status compare_scene_load(compare_scene *s, const command_options *options,
                             const ef_notes *notes, ef_error *error);
void compare_scene_free(compare_scene *s);

/** One pair at one angle under one look. NaN where not known. */
typedef struct outcome {
  ef_xyz standard, sample;
  double difference;
  ef_components components; /**< sample minus standard */
  double cielab;            /**< difference in CIE 1976 L*a*b* */
  double sd;                /**< standard uncertainty of measurement */
  double noise_alone;       /**< difference that this scatter alone makes */
  double metamerism;        /**< special index against the first look */
  double inconstancy_standard, inconstancy_sample;
  ef_told_apart told;
  double population_mean, population_p95; /**< difference over the people */
} outcome;

#define COMPARE_REASON_ROOM 320

/** One pair. Borrowed during the call. */
typedef struct compared {
  const char *standard, *sample; /**< names; "" where there is none */
  size_t line;                   /**< of the sample, or in the list of pairs */
  size_t n_readings[2];          /**< of standard and sample, all angles */
  size_t n_angles;         /**< 0: nothing could be computed, see reason */
  const double *angle_deg; /**< NaN each where there are none */
  const outcome *outcome;  /**< n_angles x looks */
  const ef_angles *finish; /**< of each look over the angles; NULL for one */
  const double *other_observer; /**< change-of-observer index, each angle */
  const ef_spectral_index *spectral; /**< each angle */
  size_t worst;                      /**< outcome of the largest difference */
  size_t worst_told;                 /**< outcome that most people tell apart */
  /** Of the tolerance: everything is within, or something beyond; neither where
   * something is missing. */
  bool within, beyond;
  bool is_certain;                  /**< no 95 % interval says otherwise */
  char reason[COMPARE_REASON_ROOM]; /**< what is missing, "" if nothing */
} compared;

/** Angle and look of outcome `i`. */
size_t compare_angle_of(const compare_scene *s, size_t i);
const look *compare_look_of(const compare_scene *s, size_t i);

typedef struct compare_count {
  size_t n, n_computed, n_within, n_beyond, n_skipped;
  bool has_repeats; /**< repeated readings */
  bool has_angles;
  /** Sums of the differences under each look, and how many. */
  double difference[LOOKS_MOST];
  size_t n_differences[LOOKS_MOST];
} compare_count;

/** Receives pairs in blocks; a function that fails ends the run. */
typedef struct compare_sink {
  void *self;
  ef_status (*rows)(void *self, const compare_scene *s, size_t n,
                    const compared *pairs, ef_error *error);
} compare_sink;

/** Reads, pairs, compares and hands on everything in blocks, so that memory
 * does not grow with the number of pairs. EF_NO_ANSWER when no pair could be
 * computed. */
ef_status compare_stream(compare_scene *s, const compare_sink *sink,
                         compare_count *count, ef_error *error);

#endif
