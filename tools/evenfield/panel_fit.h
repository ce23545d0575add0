/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel fit`: a curve for each observer and condition, one for all observers
 * of a condition, and what they say of a group. */
#ifndef COMMAND_PANEL_FIT_H
#define COMMAND_PANEL_FIT_H

#include "answers.h"
#include "option.h"

/** One curve, with what a chart of it needs: the points, the curve's parameters
 * and their covariance (in `fit`), the intervals. */
typedef struct panel_fit {
  size_t observer, condition;
  bool is_pooled; /**< all observers of the condition */
  ef_status status;
  char reason[512]; /**< where there is no threshold: what is missing */
  ef_fit fit;
  ef_goodness goodness;
  size_t n_trials, n_points;
  double *level; /**< n_points, rising; owned */
  size_t *shown, *positive;
  ef_sensitivity *sensitivity; /**< of each point above 0; NULL without blanks
                                */
  bool has_bias;
  ef_place_bias bias;
} panel_fit;

/** The observers of one condition together. */
typedef struct panel_summary {
  size_t condition, n_observers;
  bool has_threshold, has_jnd, has_equality;
  ef_group threshold, jnd;
  ef_adjustment equality; /**< the observers' PSE, each counting alike */
} panel_summary;

typedef struct panel_fits {
  const command_options *options;
  answers answers;
  bool is_demo;
  ef_fit_settings settings;
  ef_interval_settings intervals;
  size_t n, n_found;
  panel_fit *fit;
  size_t n_summaries; /**< one a condition */
  panel_summary *summary;
} panel_fits;

/** Reads and fits. EF_NO_ANSWER when no curve has a threshold. Free with
 * panel_fits_free in every case. */
ef_status panel_fits_load(panel_fits *p, const command_options *options,
                          const ef_notes *notes, ef_error *error);
void panel_fits_free(panel_fits *p);

/** What a group needs before its summary is given as the panel's. */
enum { PANEL_LEAST_OBSERVERS = 3 };

typedef enum panel_figure {
  PANEL_THRESHOLD,
  PANEL_JND,
  PANEL_EQUALITY
} panel_figure;

/** The panel's value of a figure in a condition: of the group where that has
 * observers enough, else of the pooled (or only) curve. NaN where there is
 * none. */
ef_estimate panel_fits_value(const panel_fits *p, size_t condition,
                             panel_figure figure, bool *is_group);
/** The pooled (or only) curve of a condition. */
const panel_fit *panel_fits_whole(const panel_fits *p, size_t condition);

#endif
