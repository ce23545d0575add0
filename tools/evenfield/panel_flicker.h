/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `panel flicker`: settings of least flicker become personal luminance weights,
 * which `isolate --luminance-weights` takes. */
#ifndef COMMAND_PANEL_FLICKER_H
#define COMMAND_PANEL_FLICKER_H

#include <evenfield/exchange.h>
#include <evenfield/observer.h>
#include <evenfield/panel.h>

#include "answers.h"
#include "option.h"
#include "text.h"

typedef struct flicker_person {
  ef_status status;
  char reason[256]; /**< where no weights follow */
  ef_flicker weights;
} flicker_person;

typedef struct panel_flicker {
  const command_options *options;
  ef_observer *observer; /**< whose cone fundamentals */
  bool is_demo;
  const char *settings_path, *lights_path;
  bool has_stray; /**< a column black: stray light in every other one */
  name_list lights;
  double *excitation; /**< of each light at full drive: L and M */
  bool has_names;
  name_list people;
  size_t n; /**< settings */
  size_t *person;
  double *cone[4]; /**< L and M of the first light, L and M of the second */
  flicker_person *each;
} panel_flicker;

/** EF_NO_ANSWER when nobody's settings carry weights. Free with
 * panel_flicker_free in every case. */
ef_status panel_flicker_load(panel_flicker *p, const command_options *options,
                             const ef_notes *notes, ef_error *error);
void panel_flicker_free(panel_flicker *p);
/** All of the text. */
void panel_flicker_add(text *out, const panel_flicker *p);
/** To the file of --report. */
ef_status panel_flicker_report_write(const panel_flicker *p,
                                     const ef_notes *notes, ef_error *error);
/** Whose settings: a name, or "the observer". */
const char *panel_flicker_name(const panel_flicker *p, size_t who);
ef_status render_panel_flicker(const panel_flicker *p, ef_output *output,
                               ef_error *error);

#endif
