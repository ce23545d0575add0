/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Rows of a target file as tristimulus values on the display's scale. */
#ifndef COMMAND_TARGETS_H
#define COMMAND_TARGETS_H

#include <evenfield/device.h>

#include "colours.h"
#include "option.h"

/** How the rows of one file become targets. */
typedef struct targets {
  const ef_setup *setup; /**< borrowed */
  colours colours;
  bool in_cd_m2; /**< X,Y,Z are in cd/m2 */
  double scale;  /**< to the setup's scale, before adaptation */
  ef_adaptation adaptation;
  double adapt[9]; /**< the matrix of it */
  char about[240]; /**< "surfaces under D65" ... */
} targets;

/** Decides for a file with this head. Free with targets_free in every case. */
ef_status targets_init(targets *t, const command_options *options,
                       const ef_setup *setup, const colour_basis *basis,
                       const ef_reader_head *head, const ef_notes *notes,
                       ef_error *error);
void targets_free(targets *t);
/** n rows of values to n x 3 tristimulus values. */
ef_status targets_xyz(const targets *t, size_t n, const double *value, int jobs,
                      double *xyz, ef_error *error);

#endif
