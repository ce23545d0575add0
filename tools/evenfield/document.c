/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "document.h"

#include "message.h"

/* Rows that a thread writes at a time: some hundred kB. */
enum { PIECE = 64, DEPTH = 2 };

ef_status document_open(document *d, ef_output *output, bool is_csv,
                        ef_error *error) {
  *d = (document){0};
  if (is_csv) {
    d->csv = ef_csv_new(output, error);
    return d->csv != NULL ? EF_OK : error->status;
  }
  d->json = ef_json_new(output, error);
  if (d->json == NULL)
    return error->status;
  ef_json_begin_object(d->json, NULL);
  return EF_OK;
}

void document_begin_rows(document *d, const char *key) {
  if (d->json != NULL)
    ef_json_begin_array(d->json, key);
}

record document_header(const document *d) {
  return record_of_csv(d->csv, true);
}

record document_row(const document *d) {
  return d->csv != NULL ? record_of_csv(d->csv, false)
                        : record_of_json(d->json);
}

void document_end_rows(document *d) {
  if (d->json != NULL)
    ef_json_end_array(d->json);
}

/* ---- Rows by several threads ------------------------------------------- */

typedef struct wave {
  const document *whole;
  document_writer *write;
  const void *self;
  size_t first;
  ef_status status[DOCUMENT_PARTS];
  ef_error error[DOCUMENT_PARTS];
} wave;

static ef_status finish_writer(document *d, ef_error *error) {
  const ef_status status = d->csv != NULL ? ef_csv_finish(d->csv, error)
                                          : ef_json_finish(d->json, error);
  d->csv = NULL;
  d->json = NULL;
  return status;
}

/* Rows [begin, end) of the wave, into an output of their own. */
static void write_piece(void *context, size_t begin, size_t end) {
  wave *w = context;
  const size_t k = begin / PIECE;
  ef_output *output = w->whole->part[k];
  document piece = {0};
  ef_output_clear(output);
  if (w->whole->csv != NULL)
    piece.csv = ef_csv_new(output, &w->error[k]);
  else
    piece.json = ef_json_new_elements(output, DEPTH, &w->error[k]);
  if (piece.csv == NULL && piece.json == NULL) {
    w->status[k] = w->error[k].status;
    return;
  }
  for (size_t i = begin; i < end; ++i)
    w->write(&piece, w->self, w->first + i);
  w->status[k] = finish_writer(&piece, &w->error[k]);
}

static ef_status append(document *d, const wave *w, size_t n_pieces,
                        ef_error *error) {
  for (size_t k = 0; k < n_pieces; ++k) {
    size_t length;
    const char *bytes = ef_output_bytes(d->part[k], &length);
    if (w->status[k] != EF_OK) {
      *error = w->error[k];
      return w->status[k];
    }
    if (d->csv != NULL)
      ef_csv_rows(d->csv, bytes, length);
    else
      ef_json_elements(d->json, bytes, length);
  }
  return EF_OK;
}

static ef_status make_parts(document *d, ef_error *error) {
  for (size_t k = 0; k < DOCUMENT_PARTS; ++k) {
    if (d->part[k] == NULL)
      d->part[k] = ef_output_memory(error);
    if (d->part[k] == NULL)
      return error->status;
  }
  return EF_OK;
}

ef_status document_write(document *d, size_t n, int jobs,
                         document_writer *write, const void *self,
                         ef_error *error) {
  if (jobs == 1 || n <= PIECE) {
    for (size_t i = 0; i < n; ++i)
      write(d, self, i);
    return EF_OK;
  }
  const size_t most = DOCUMENT_PARTS * PIECE;
  ef_status status = make_parts(d, error);
  for (size_t first = 0; first < n && status == EF_OK; first += most) {
    const size_t here = n - first < most ? n - first : most;
    wave w = {.whole = d, .write = write, .self = self, .first = first};
    ef_parallel_for(here, PIECE, jobs, write_piece, &w);
    status = append(d, &w, (here + PIECE - 1) / PIECE, error);
  }
  return status;
}

/* ---- The end ----------------------------------------------------------- */

ef_status document_close(document *d, ef_error *error) {
  if (d->json != NULL)
    ef_json_end_object(d->json);
  return finish_writer(d, error);
}

/* A run that failed half-way leaves a writer open: it is finished for its
 * memory, and what it says is of no interest any more. */
void document_free(document *d) {
  ef_error ignored;
  finish_writer(d, &ignored);
  for (size_t k = 0; k < DOCUMENT_PARTS; ++k)
    ef_output_discard(d->part[k]);
  *d = (document){0};
}
