/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `swatch` says about the pictures it has drawn. */
#ifndef COMMAND_RENDER_SWATCH_H
#define COMMAND_RENDER_SWATCH_H

#include <evenfield/exchange.h>

#include "pictures.h"

/** What the pictures show. */
typedef struct swatch_scene {
  const pictures *pictures;
  ef_metric *metric;       /**< owned by whoever made this */
  const char *halves;      /**< "left: target, right: ...", a phrase */
  const char *key;         /**< of what a pair without a striped corner is */
  const char *head[2];     /**< the same above its column */
  const char *none, *some; /**< what it means that no pair or so many pairs have
                                a striped corner, a phrase */
  bool is_demo;
  const char *display; /**< of the demo */
  char observer[400];  /**< whose colours they are */
  bool cones_borrowed;
} swatch_scene;

ef_status render_swatch(const swatch_scene *s, const command_options *options,
                        ef_output *output, ef_error *error);

#endif
