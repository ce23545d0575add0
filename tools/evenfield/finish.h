/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Samples from the rows of a file: rows of one name are repeated readings, and
 * with different angles one finish seen from several sides. */
#ifndef COMMAND_FINISH_H
#define COMMAND_FINISH_H

#include <evenfield/exchange.h>

#include "looks.h"
#include "part.h"

/** A sample at one angle: the mean of its readings. */
typedef struct specimen {
  double angle_deg; /**< NaN: none */
  size_t n_readings;
  const double *value; /**< as in the file */
  const double *xyz;   /**< under each look, 3 each */
  /** Of one reading, under each look, 9 each; NULL for a single reading. */
  const double *covariance;
} specimen;

/** A sample. Borrowed from its list. */
typedef struct finish {
  const char *name;
  size_t line, offset; /**< of its first reading in the file */
  size_t n;            /**< angles */
  const specimen *at;
  /** Where an earlier part of the file has readings of the same name, which are
   * not in the mean: line, else 0. */
  size_t also_in_part;
  bool used; /**< the user's own mark */
} finish;

/** Some samples, found by name. */
typedef struct finish_list {
  size_t n;
  finish *item;
  /* Owned: what the items point to, and the places by name. */
  specimen *specimens;
  double *value, *xyz, *covariance;
  char *names;
  size_t n_slots, *slot;
} finish_list;

void finish_list_free(finish_list *list);
/** NULL when there is none of that name. */
finish *finish_list_find(const finish_list *list, const char *name);

/** A file of samples, read part by part. */
typedef struct finish_file finish_file;

/** All rows are read, whatever the range. `most_rows`: of the first part, within
 * which readings of a name may stand anywhere; in later parts they must follow
 * each other. NULL and the error else. Free with finish_file_free. */
finish_file *finish_file_open(const command_options *options, const char *path,
                              const part_range *range, size_t most_rows,
                              const ef_notes *notes, ef_error *error);
void finish_file_free(finish_file *file);
const ef_reader_head *finish_file_head(const finish_file *file);
size_t finish_file_skipped(const finish_file *file);
/** Says what tristimulus values are wanted: before the first part. */
ef_status finish_file_look(finish_file *file, const looks *l,
                           const ef_notes *notes, ef_error *error);
/** The next part; `list->n` 0 at the end. `list` is freed and filled anew. */
ef_status finish_file_next(finish_file *file, finish_list *list,
                           ef_error *error);
/** True when the last part was the first and the whole. */
bool finish_file_is_whole(const finish_file *file);

#endif
