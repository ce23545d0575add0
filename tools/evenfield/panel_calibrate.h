/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel calibrate`: the panel's JND in a difference formula, and how well each
 * formula orders the panel's pairs. */
#ifndef COMMAND_PANEL_CALIBRATE_H
#define COMMAND_PANEL_CALIBRATE_H

#include "answers.h"
#include "option.h"
#include "pair_list.h"

/** A formula beside the one that was asked for. */
typedef struct panel_formula {
  const ef_metric *metric;
  bool is_asked;
  ef_formula_score score;
} panel_formula;

typedef struct panel_calibration {
  const command_options *options;
  answers answers;
  pair_list pairs; /**< n 0 where the levels are differences already */
  const char *pairs_path, *samples_path; /**< NULL: none */
  bool is_demo;
  ef_metric *metric;
  ef_calibration_settings settings;
  ef_calibration result;
  ef_observer_jnd *each; /**< of every observer */
  size_t n_observers;
  ef_jnd_record record;
  size_t n_formulas, n_scored; /**< pairs that differ and were answered */
  panel_formula *formula;      /**< by rising STRESS */
} panel_calibration;

/** EF_NO_ANSWER when the answers carry no JND. Free with
 * panel_calibration_free in every case. */
ef_status panel_calibration_load(panel_calibration *c,
                                 const command_options *options,
                                 const ef_notes *notes, ef_error *error);
void panel_calibration_free(panel_calibration *c);

#endif
