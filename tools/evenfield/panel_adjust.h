/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel adjust`: settings that observers made by hand until two things looked
 * alike (method of adjustment). */
#ifndef COMMAND_PANEL_ADJUST_H
#define COMMAND_PANEL_ADJUST_H

#include <evenfield/exchange.h>
#include <evenfield/panel.h>

#include "answers.h"
#include "option.h"
#include "text.h"

/** The settings of one observer against one standard. */
typedef struct adjust_group {
  size_t person;
  double standard; /**< NaN: not known */
  ef_status status;
  char reason[256]; /**< where nothing follows */
  ef_adjustment summary;
} adjust_group;

typedef struct panel_adjust {
  const command_options *options;
  const char *path;
  char unit[ANSWERS_UNIT_ROOM];
  bool has_names, has_standard;
  name_list people;
  size_t n, room;
  size_t *group_of;
  double *setting;
  size_t n_groups, n_found;
  adjust_group *group;
} panel_adjust;

/** EF_NO_ANSWER when nobody's settings have a spread. Free with
 * panel_adjust_free in every case. */
ef_status panel_adjust_load(panel_adjust *p, const command_options *options,
                            const ef_notes *notes, ef_error *error);
void panel_adjust_free(panel_adjust *p);
ef_status render_panel_adjust(const panel_adjust *p, ef_output *output,
                              ef_error *error);

#endif
