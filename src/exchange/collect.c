/* SPDX-License-Identifier: GPL-3.0-or-later */
/* All spectra of a file at once. */
#include "exchange/exchange_private.h"

#include "base/base_private.h"

enum { ROWS_AT_ONCE = 1024 };

static ef_status refuse_content(const ef_reader_head *head, ef_error *error) {
  ef__error_set(error, EF_MALFORMED,
                "holds %s, expected spectra: a first column wavelength_nm, or "
                "columns named by wavelength",
                ef_content_text(head->content));
  ef__error_place(error, head->file, 0, 0, NULL);
  return EF_MALFORMED;
}

static ef_status refuse_size(const ef_reader *reader, ef_error *error) {
  ef__error_set(error, EF_MALFORMED,
                "the spectra fill more than %zu bytes, the limit for a file "
                "that is held whole; split it",
                reader->settings.max_bytes);
  ef__error_place(error, reader->head.file, 0, 0, NULL);
  return EF_MALFORMED;
}

/* Copies a block behind the rows collected so far. */
static ef_status append(ef__rows *rows, const ef_block *block,
                        ef_error *error) {
  size_t wanted = rows->room > 0 ? rows->room : ROWS_AT_ONCE;
  while (wanted < rows->n + block->n) wanted *= 2;
  ef_status status = ef__rows_reserve(rows, wanted, error);
  for (size_t i = 0; i < block->n && status == EF_OK; ++i) {
    double *const to = rows->value + rows->n * rows->width;
    for (size_t k = 0; k < rows->width; ++k) {
      to[k] = block->value[i * rows->width + k];
    }
    const ef__label label = {.name = ef__span_of(block->name[i])};
    status = ef__rows_add(rows, block->line[i], block->offset[i], label, error);
  }
  return status;
}

static ef_status collect(ef_reader *reader, ef__rows *rows, ef_error *error) {
  const size_t row_bytes = rows->width * sizeof(double);
  for (;;) {
    ef_block block;
    ef_status status = ef_reader_next(reader, ROWS_AT_ONCE, &block, error);
    if (status != EF_OK || block.n == 0) return status;
    if (rows->n + block.n > reader->settings.max_bytes / row_bytes) {
      return refuse_size(reader, error);
    }
    status = append(rows, &block, error);
    if (status != EF_OK) return status;
  }
}

static ef_spectra *make_spectra(const ef_reader_head *head, ef__rows *rows,
                                ef_error *error) {
  ef__rows_name_all(rows);
  ef_spectra *const spectra = ef_spectra_new(
      rows->n, rows->name, &head->grid, head->kind, rows->value, error);
  if (spectra == NULL) {
    ef__error_place(error, head->file, 0, 0, NULL);
    return NULL;
  }
  ef_spectra_set_absolute(spectra, head->absolute);
  return spectra;
}

ef_spectra *ef_spectra_read(const char *path,
                            const ef_reader_settings *settings,
                            ef_error *error) {
  ef_spectra *spectra = NULL;
  ef_reader *const reader = ef_reader_open(path, settings, error);
  if (reader == NULL) return NULL;
  ef__rows rows = {.width = reader->head.width};
  if (reader->head.content != EF_CONTENT_SPECTRA) {
    refuse_content(&reader->head, error);
  } else if (collect(reader, &rows, error) == EF_OK) {
    spectra = make_spectra(&reader->head, &rows, error);
  }
  ef__rows_clear(&rows);
  ef_reader_free(reader);
  return spectra;
}
