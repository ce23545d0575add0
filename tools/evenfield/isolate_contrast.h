/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A modulation in planes of contrast, in all that the display could do. */
#ifndef COMMAND_ISOLATE_CONTRAST_H
#define COMMAND_ISOLATE_CONTRAST_H

#include <evenfield/picture.h>

#include "isolate.h"

/** In the order of the choices of --plane. */
typedef enum contrast_plane {
  CONTRAST_LM,      /**< of L and M */
  CONTRAST_OPPONENT /**< red-green and tritan: L - M, S - luminance */
} contrast_plane;

/** Titles of axes are set here. *out is freed with ef_chart_free in every
 * case. */
ef_status isolate_contrast_draw(const isolate_scene *s, const isolate_result *r,
                                contrast_plane plane,
                                ef_chart_settings settings, ef_chart **out,
                                ef_error *error);

#endif
