/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel plan`: how many observers, levels and trials, by simulation. */
#ifndef COMMAND_PANEL_PLAN_H
#define COMMAND_PANEL_PLAN_H

#include <evenfield/exchange.h>
#include <evenfield/panel.h>

#include "option.h"
#include "text.h"

enum { PLAN_PROCEDURES = 3, PLAN_SIZES = 5, PLAN_MOST_LEVELS = 50 };

/** A panel of one size by one procedure. */
typedef struct plan_choice {
  ef_plan_row row;    /**< of one observer */
  size_t n_observers; /**< for the precision wanted; 0: no number will do */
  double group_power; /**< of so many, against the other JND; NaN without */
  bool is_sound;      /**< hardly any experiment fails */
} plan_choice;

typedef struct panel_plan {
  const command_options *options;
  ef_plan_settings settings;
  double precision;
  size_t n_procedures;
  ef_procedure procedure[PLAN_PROCEDURES];
  plan_choice choice[PLAN_PROCEDURES][PLAN_SIZES];
  int best[PLAN_PROCEDURES]; /**< choice of fewest answers; -1: none will do */
  size_t alone[PLAN_PROCEDURES]; /**< trials by which one observer's own JND is
                                    as precise; 0: not known */
  size_t n_levels;
  double level[PLAN_MOST_LEVELS];
} panel_plan;

ef_status panel_plan_make(panel_plan *p, const command_options *options,
                          ef_error *error);
/** All of the text. */
void panel_plan_add(text *out, const panel_plan *p);
/** "constant levels" ... Static. */
const char *plan_procedure_words(ef_procedure procedure);
/** True when a number of observers is known by which the precision is met. */
bool plan_will_do(const plan_choice *c);
/** Of all observers together. */
size_t plan_answers(const plan_choice *c);
ef_status render_panel_plan(const panel_plan *p, ef_output *output,
                            ef_error *error);

#endif
