/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel next`: which of the pairs in hand to show next, from the answers so
 * far and nothing else. */
#ifndef COMMAND_PANEL_NEXT_H
#define COMMAND_PANEL_NEXT_H

#include "answers.h"
#include "option.h"
#include "text.h"

/** One observer in one condition. */
typedef struct next_step {
  size_t observer, condition;
  bool is_new; /**< nobody yet: how a new observer begins */
  ef_next next;
  double *gain; /**< at each level in hand; owned */
  /** The posterior, n_thresholds of the settings; NULL unless it is to be
   * drawn; owned. */
  double *threshold, *density;
} next_step;

typedef struct panel_next {
  const command_options *options;
  answers answers;
  bool is_demo;
  size_t n_levels;
  double *level; /**< in hand */
  size_t *line;  /**< of each in its file; NULL without one */
  name_list names;
  bool has_names;
  ef_next_settings settings;
  size_t n;
  next_step *step; /**< the last one is that of a new observer */
} panel_next;

/** "deck 3 (level 1.3)" or "level 1.3". */
void panel_next_level(const panel_next *p, size_t level, char *name,
                      size_t room);
/** "p01", "p01, deck" or "a new observer". */
void panel_next_name(const panel_next *p, const next_step *s, char *name,
                     size_t room);
/** The JND where there is one, else the threshold. */
ef_estimate panel_next_aim(const next_step *s);
/** "JND" or "threshold". */
const char *panel_next_aim_words(const next_step *s);
/** Whose gains are told level by level: the only observer's, else a new one's.
 */
const next_step *panel_next_told(const panel_next *p);

/** Free with panel_next_free in every case. */
ef_status panel_next_load(panel_next *p, const command_options *options,
                          const ef_notes *notes, ef_error *error);
void panel_next_free(panel_next *p);
/** All of the text. */
void panel_next_add(text *out, const panel_next *p);
ef_status render_panel_next(const panel_next *p, ef_output *output,
                            ef_error *error);

#endif
