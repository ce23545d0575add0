/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * One result as a JSON object or a row of CSV, described once: the columns of
 * CSV are the keys of JSON joined by underscores. */
#ifndef COMMAND_RECORD_H
#define COMMAND_RECORD_H

#include <evenfield/colour.h>
#include <evenfield/exchange.h>

typedef struct record {
  ef_json *json;  /**< either this */
  ef_csv *csv;    /**< or this */
  bool is_header; /**< CSV: column names are written, values are not */
  char prefix[200]; /**< of column names */
  size_t length[8]; /**< of the prefix outside each open object */
  size_t depth;
} record;

record record_of_json(ef_json *json);
record record_of_csv(ef_csv *csv, bool is_header);

/** Nested objects; `key` NULL for the record itself, an array's element. */
void record_begin(record *r, const char *key);
void record_end(record *r);
void record_number(record *r, const char *key, double value);
void record_text(record *r, const char *key, const char *text);
void record_boolean(record *r, const char *key, bool value);
/** JSON: an array; CSV: a column KEY_NAME for each. */
void record_numbers(record *r, const char *key, size_t n,
                    const char *const *names, const double *values);
/** JSON: an array; CSV: one column, parted by "; ". */
void record_texts(record *r, const char *key, size_t n,
                  const char *const *texts);
/** X, Y, Z. */
void record_xyz(record *r, ef_xyz xyz);
/** L_star, a_star, b_star, C_star, h_deg. */
void record_lab(record *r, ef_lab lab);

#endif
