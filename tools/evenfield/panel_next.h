/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel next`: which of the pairs in hand to show next, from the answers so
 * far and nothing else. */
#ifndef COMMAND_PANEL_NEXT_H
#define COMMAND_PANEL_NEXT_H

#include "answers.h"
#include "option.h"

/** One observer in one condition. */
typedef struct next_step {
  size_t observer, condition;
  bool is_new; /**< nobody yet: how a new observer begins */
  ef_next next;
  double *gain; /**< at each level in hand; owned */
} next_step;

typedef struct panel_next {
  const command_options *options;
  answers answers;
  size_t n_levels;
  double *level; /**< in hand */
  size_t *line;  /**< of each in its file; NULL without one */
  name_list names;
  bool has_names;
  ef_next_settings settings;
  size_t n;
  next_step *step; /**< the last one is that of a new observer */
} panel_next;

/** Free with panel_next_free in every case. */
ef_status panel_next_load(panel_next *p, const command_options *options,
                          const ef_notes *notes, ef_error *error);
void panel_next_free(panel_next *p);
ef_status render_panel_next(const panel_next *p, ef_output *output,
                            ef_error *error);

#endif
