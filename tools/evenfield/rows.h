/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * All rows of a file at once, for the files that are needed whole: displays,
 * ramps, pairs. */
#ifndef COMMAND_ROWS_H
#define COMMAND_ROWS_H

#include <evenfield/exchange.h>

typedef struct rows {
  size_t n, width, n_device;
  char **name;
  size_t *line;
  double *value;  /**< n x width */
  double *device; /**< n x n_device, NULL if none */
} rows;

/** Reads to the end. EF_MALFORMED for a file without rows. Free with rows_free
 * in every case. */
ef_status rows_read(ef_reader *reader, rows *out, ef_error *error);
void rows_free(rows *r);
/** The spectra of the rows, as a set. NULL and the error else. */
ef_spectra *rows_spectra(const rows *r, const ef_reader_head *head,
                         ef_error *error);

#endif
