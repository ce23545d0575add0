/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A long answer for programs: rows of CSV, or a JSON object that holds them as
 * the elements of an array. */
#ifndef COMMAND_DOCUMENT_H
#define COMMAND_DOCUMENT_H

#include "record.h"

/** Pieces of a block that threads write at a time. */
enum { DOCUMENT_PARTS = 32 };

typedef struct document {
  ef_csv *csv;   /**< either this */
  ef_json *json; /**< or this, in an object that is begun */
  ef_output *part[DOCUMENT_PARTS];
} document;

/** CSV: waits for document_header. JSON: begins the object; what it says goes
 * to `json` until document_begin_rows. Free with document_free in every case.
 */
ef_status document_open(document *d, ef_output *output, bool is_csv,
                        ef_error *error);
/** The array of rows begins; for CSV nothing. */
void document_begin_rows(document *d, const char *key);
/** The next row. CSV: the names of its columns first, once. */
record document_header(const document *d);
record document_row(const document *d);

/** Row or rows `i` of `self`, written to `part`; called from any thread. */
typedef void document_writer(const document *part, const void *self, size_t i);
/** Rows 0 .. n in their order, by up to `jobs` threads (0: all cores). */
ef_status document_write(document *d, size_t n, int jobs,
                         document_writer *write, const void *self,
                         ef_error *error);
/** The array of rows ends; what else there is to say goes to `json`. */
void document_end_rows(document *d);
/** Ends the object, and tells what went wrong while it was written. */
ef_status document_close(document *d, ef_error *error);
/** Also of a run that failed half-way. */
void document_free(document *d);

#endif
