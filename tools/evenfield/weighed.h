/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --weighed: of what the samples of a file were mixed. One line for each
 * colourant in a sample: sample, colourant, parts, and for films thickness and
 * the sample they lie over. */
#ifndef COMMAND_WEIGHED_H
#define COMMAND_WEIGHED_H

#include <evenfield/device.h>

#include "rows.h"

typedef struct weighed {
  size_t n_colourants;
  char *colourant[EF_MAX_COLOURANTS]; /**< in the order of the file */
  /* Drawdowns: the samples that something was weighed for. */
  size_t n;
  size_t *row;           /**< of the file of samples */
  size_t *line;          /**< first of each in the weighed file */
  double *concentration; /**< n x n_colourants, each sample's sum is 1 */
  double *thickness;     /**< infinite: opaque */
  size_t *over;          /**< row of the substrate, SIZE_MAX: none */
  bool has_films;
} weighed;

/** Reads `path` for the samples of `samples`, a file called `samples_name`.
 * Free with weighed_free in every case. */
ef_status weighed_read(const char *path, const rows *samples,
                       const char *samples_name, const ef_notes *notes,
                       weighed *out, ef_error *error);
void weighed_free(weighed *w);

#endif
