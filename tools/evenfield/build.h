/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What `observer build` computes, before anything is written. */
#ifndef COMMAND_BUILD_H
#define COMMAND_BUILD_H

#include "people.h"

enum { BUILD_FUNCTIONS = 6 }; /**< x_bar, y_bar, z_bar, l_bar, m_bar, s_bar */

/** One observer on the standard grid. */
typedef struct built_observer {
  ef_observer *observer; /**< owned */
  bool has_model;
  ef_cone_model model;
  double share;  /**< of the people it stands for; NaN when it was named */
  double *value; /**< BUILD_FUNCTIONS x grid.count; owned */
} built_observer;

typedef struct build {
  const command_options *options;
  size_t n;
  built_observer *one;
  people people; /**< of --categories; its population is NULL without */
  ef_grid grid;
  size_t first, last; /**< samples with figures: first to last */
} build;

/** Free with build_free in every case. */
ef_status build_load(build *b, const command_options *options,
                     const ef_notes *notes, ef_error *error);
void build_free(build *b);
/** "x_bar" ... Static. */
const char *build_function_name(size_t i);

#endif
