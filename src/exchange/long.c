/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Long spectra: one row a wavelength, one column a spectrum. They are held
 * whole, since the first spectrum is complete with the last row only, and are
 * turned into one row a spectrum. */
#include "exchange/exchange_private.h"

#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Steps below this have no width: interpolation would divide by them. */
static const double shortest_step_nm = 1e-6;

/* Rows as they stand in the file: wavelength, then a value a spectrum. */
typedef struct long_rows {
  size_t width;
  size_t n, room;
  double *value;
  size_t *line;
} long_rows;

static ef_status reserve(long_rows *rows, ef_error *error) {
  if (rows->n < rows->room) return EF_OK;
  const size_t room = rows->room > 0 ? 2 * rows->room : 512;
  size_t n_values;
  double *value = NULL;
  if (ef__size_multiply(room, rows->width, &n_values)) {
    value = ef__reallocate(rows->value, n_values, sizeof *value);
  }
  if (value != NULL) rows->value = value;
  size_t *const line = ef__reallocate(rows->line, room, sizeof *line);
  if (line != NULL) rows->line = line;
  if (value == NULL || line == NULL) {
    return ef__error_memory(error, "long spectra");
  }
  rows->room = room;
  return EF_OK;
}

/* The wavelength of the row that was just read, against the one before. */
static ef_status check_wavelength(const ef_reader *reader,
                                  const long_rows *rows, ef_error *error) {
  const double *const row = rows->value + rows->n * rows->width;
  char number[EF_NUMBER_TEXT];
  char before[EF_NUMBER_TEXT];
  ef_number_format(row[0], number);
  if (row[0] < EF__SHORTEST_NM || row[0] > EF__LONGEST_NM) {
    return ef__table_error(&reader->table, 0, error,
                           "found wavelength %s, expected 100 to 10000 nm; "
                           "write wavelengths in nm",
                           number);
  }
  if (rows->n == 0 ||
      row[0] - row[-(ptrdiff_t)rows->width] >= shortest_step_nm) {
    return EF_OK;
  }
  const double previous = row[-(ptrdiff_t)rows->width];
  ef_number_format(previous, before);
  if (row[0] >= previous) {
    return ef__table_error(&reader->table, 0, error,
                           "wavelength %s is no step away from %s in line %zu; "
                           "keep one row for each wavelength",
                           number, before, rows->line[rows->n - 1]);
  }
  return ef__table_error(&reader->table, 0, error,
                         "wavelength %s comes after %s in line %zu; sort the "
                         "rows by increasing wavelength",
                         number, before, rows->line[rows->n - 1]);
}

static ef_status check_size(const ef_reader *reader, ef_error *error) {
  const ef__input *const input = reader->table.records.input;
  const size_t used = input->n_read - (input->end - input->begin);
  if (used <= reader->settings.max_bytes) return EF_OK;
  return ef__records_error(&reader->table.records, SIZE_MAX, NULL, error,
                           "the file goes on after %zu bytes, the limit for "
                           "spectra in columns, which are held whole; give "
                           "each spectrum a row of its own",
                           reader->settings.max_bytes);
}

static ef_status read_rows(ef_reader *reader, long_rows *rows,
                           ef_error *error) {
  for (;;) {
    ef_status status = reserve(rows, error);
    if (status != EF_OK) return status;
    ef__label label;
    bool has_row;
    status = ef__reader_row(reader, false, rows->value + rows->n * rows->width,
                            NULL, &label, &has_row, error);
    if (status != EF_OK || !has_row) return status;
    status = check_size(reader, error);
    if (status != EF_OK) return status;
    ef_error fault;
    status = check_wavelength(reader, rows, &fault);
    if (status == EF_OK) {
      rows->line[rows->n++] = reader->table.records.line;
      continue;
    }
    status = ef__reader_fault(reader, 0, &fault, error);
    if (status != EF_OK) return status;
  }
}

static ef_status check_rows(ef_reader *reader, long_rows *rows,
                            ef_error *error) {
  const size_t width = rows->width;
  size_t kept = 0;
  for (size_t i = 0; i < rows->n; ++i) {
    ef_error fault;
    double *const row = rows->value + i * width;
    ef_status status =
        ef__row_check(&reader->table, &reader->layout, &reader->limits,
                      rows->line[i], row, NULL, &fault);
    if (status == EF_OK) {
      if (kept < i) memcpy(rows->value + kept * width, row, width * sizeof *row);
      rows->line[kept++] = rows->line[i];
      continue;
    }
    status = ef__reader_fault(reader, 0, &fault, error);
    if (status != EF_OK) return status;
  }
  rows->n = kept;
  return EF_OK;
}

/* Columns of `from` to rows of the reader. */
static ef_status turn(ef_reader *reader, const long_rows *from,
                      ef_error *error) {
  ef__rows *const rows = &reader->rows;
  const size_t n_spectra = from->width - 1;
  const size_t n_bytes = reader->table.records.input->n_read;
  if (from->n == 0) return EF_OK; /* the caller names that */
  rows->width = from->n;
  ef_status status = ef__rows_reserve(rows, n_spectra, error);
  if (status != EF_OK) return status;
  reader->wavelength_nm = ef__allocate(from->n, sizeof *reader->wavelength_nm);
  if (reader->wavelength_nm == NULL) {
    return ef__error_memory(error, "long spectra");
  }
  for (size_t i = 0; i < from->n; ++i) {
    const double *const row = from->value + i * from->width;
    reader->wavelength_nm[i] = row[0];
    for (size_t s = 0; s < n_spectra; ++s) {
      rows->value[s * from->n + i] = row[1 + s];
    }
  }
  for (size_t s = 0; s < n_spectra && status == EF_OK; ++s) {
    const ef__label label = {.name = ef__span_of(reader->table.column[s + 1])};
    status = ef__rows_add(rows, s + 2, ef__byte_share(n_bytes, s, n_spectra),
                          label, error);
  }
  ef__rows_name_all(rows);
  return status;
}

ef_status ef__long_read(ef_reader *reader, ef_error *error) {
  long_rows rows = {.width = reader->layout.n_values};
  ef__range value = ef__range_none();
  ef_status status = read_rows(reader, &rows, error);
  if (status == EF_OK) {
    reader->source_ended = true;
    for (size_t i = 0; i < rows.n; ++i) {
      ef__range_add(&value, rows.width - 1, rows.value + i * rows.width + 1);
    }
    ef__decide_from_values(reader, rows.n, value, ef__range_none());
    reader->limits.largest_light = value.highest;
    status = check_rows(reader, &rows, error);
  }
  if (status == EF_OK) status = turn(reader, &rows, error);
  free(rows.value);
  free(rows.line);
  return status;
}
