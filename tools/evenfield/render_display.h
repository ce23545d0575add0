/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What is known of a display, as lines of "what this rests on". */
#ifndef COMMAND_RENDER_DISPLAY_H
#define COMMAND_RENDER_DISPLAY_H

#include "display.h"
#include "text.h"

typedef struct render_display {
  const command_options *options;
  const display *display;
  const ef_metric *metric; /**< of its residuals */
  double luminance_cd_m2;  /**< of its white; NaN: not known */
} render_display;

/** Display, tone curve, additivity. */
void render_display_basis(text *out, const render_display *r);

#endif
