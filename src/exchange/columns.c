/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A small table of numbers by the names of its columns, held whole. */
#include "exchange/exchange_private.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

struct ef_columns {
  size_t n_columns, n_rows, room;
  double *value; /* room x n_columns, row after row */
  size_t *line;
};

/* ---- Header row -------------------------------------------------------- */

static size_t find(const ef__table *table, const char *name) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (ef__name_equal(table->column[i], name)) return i;
  }
  return SIZE_MAX;
}

/* Where each of the names stands. Columns of other names are left alone. */
static ef_status find_all(const ef__table *table, size_t n,
                          const char *const *names, size_t *place,
                          ef_error *error) {
  for (size_t i = 0; i < n; ++i) {
    place[i] = find(table, names[i]);
    if (place[i] != SIZE_MAX) continue;
    char asked[200] = "";
    for (size_t k = 0; k < n; ++k) {
      const size_t used = strlen(asked);
      snprintf(asked + used, sizeof asked - used, "%s%s", k == 0 ? "" : ",",
               names[k]);
    }
    return ef__header_error(table, SIZE_MAX, error,
                            "there is no column called %s; expected %s",
                            names[i], asked);
  }
  return EF_OK;
}

static void note_others(const ef__table *table, size_t n,
                        const size_t *place) {
  size_t n_others = 0;
  const char *first = NULL;
  for (size_t i = 0; i < table->n_columns; ++i) {
    bool is_used = false;
    for (size_t k = 0; k < n; ++k) is_used = is_used || place[k] == i;
    if (is_used) continue;
    if (n_others++ == 0) first = table->column[i];
  }
  if (n_others == 0) return;
  char quoted[EF__QUOTED];
  ef__quote(ef__span_of(first), quoted);
  ef__note(table->notes, "%s:%zu: column %s%s not used",
           table->records.input->name, table->header_line, quoted,
           n_others > 1 ? " and others are" : " is");
}

/* ---- Rows -------------------------------------------------------------- */

static ef_status reserve(ef_columns *columns, ef_error *error) {
  if (columns->n_rows < columns->room) return EF_OK;
  const size_t room = columns->room > 0 ? 2 * columns->room : 64;
  double *const value = ef__reallocate(
      columns->value, room, columns->n_columns * sizeof *columns->value);
  if (value != NULL) columns->value = value;
  size_t *const line =
      ef__reallocate(columns->line, room, sizeof *columns->line);
  if (line != NULL) columns->line = line;
  if (value == NULL || line == NULL) {
    return ef__error_memory(error, "a table of numbers");
  }
  columns->room = room;
  return EF_OK;
}

static ef_status read_rows(ef_columns *columns, ef__table *table,
                           const size_t *place, ef_error *error) {
  for (;;) {
    bool has_row;
    ef_status status = ef__table_next(table, &has_row, error);
    if (status != EF_OK || !has_row) return status;
    if (columns->n_rows == EF_COLUMNS_MOST_ROWS) {
      return ef__records_error(&table->records, SIZE_MAX, NULL, error,
                               "the table goes on after %d rows, the limit for "
                               "one that is held whole",
                               EF_COLUMNS_MOST_ROWS);
    }
    status = ef__table_split(table, error);
    if (status == EF_OK) status = reserve(columns, error);
    if (status != EF_OK) return status;
    double *const row = columns->value + columns->n_rows * columns->n_columns;
    for (size_t k = 0; k < columns->n_columns && status == EF_OK; ++k) {
      status = ef__table_number(table, place[k], &row[k], error);
    }
    if (status != EF_OK) return status;
    columns->line[columns->n_rows++] = table->records.line;
  }
}

/* ---- The object -------------------------------------------------------- */

static ef_status read_table(ef_columns *columns, ef__table *table,
                            const char *const *names, ef_error *error) {
  size_t place[EF_COLUMNS_MOST];
  const size_t n = columns->n_columns;
  ef_status status = find_all(table, n, names, place, error);
  if (status != EF_OK) return status;
  note_others(table, n, place);
  status = read_rows(columns, table, place, error);
  if (status != EF_OK || columns->n_rows > 0) return status;
  return ef__header_error(table, SIZE_MAX, error,
                          "there is a header and no row to read");
}

/* Takes the input over; NULL: the error is set already. */
static ef_columns *read_input(ef__input *input, size_t n_columns,
                              const char *const *names, const ef_notes *notes,
                              ef_error *error) {
  if (input == NULL) return NULL;
  ef__table table;
  ef_columns *const columns = ef__allocate_zeroed(1, sizeof *columns);
  if (columns == NULL) {
    ef__input_free(input);
    ef__error_memory(error, "a table of numbers");
    return NULL;
  }
  columns->n_columns = n_columns;
  bool is_read = false;
  if (ef__table_open(input, notes, &table, error) == EF_OK) {
    is_read = read_table(columns, &table, names, error) == EF_OK;
    ef__table_clear(&table);
  }
  if (is_read) return columns;
  ef_columns_free(columns);
  return NULL;
}

static bool count_is_good(size_t n_columns, ef_error *error) {
  if (n_columns >= 1 && n_columns <= EF_COLUMNS_MOST) return true;
  ef__error_set(error, EF_INVALID, "%zu columns are asked for; 1 to %d can be",
                n_columns, EF_COLUMNS_MOST);
  return false;
}

ef_columns *ef_columns_from_text(const char *name, const char *text,
                                 size_t length, size_t n_columns,
                                 const char *const *names,
                                 const ef_notes *notes, ef_error *error) {
  if (!count_is_good(n_columns, error)) return NULL;
  return read_input(ef__input_from_text(name, text, length, error), n_columns,
                    names, notes, error);
}

ef_columns *ef_columns_read(const char *path, size_t n_columns,
                            const char *const *names, const ef_notes *notes,
                            ef_error *error) {
  ef__span demo;
  if (!count_is_good(n_columns, error)) return NULL;
  switch (ef__demo_find(path, &demo, error)) {
  case EF__DEMO_NONE: break;
  case EF__DEMO_UNKNOWN: return NULL;
  case EF__DEMO_FOUND:
    return ef_columns_from_text(path, demo.text, demo.length, n_columns, names,
                                notes, error);
  }
  return read_input(ef__input_open(path, error), n_columns, names, notes,
                    error);
}

void ef_columns_free(ef_columns *columns) {
  if (columns == NULL) return;
  free(columns->value);
  free(columns->line);
  free(columns);
}

size_t ef_columns_rows(const ef_columns *columns) {
  return columns->n_rows;
}

double ef_columns_at(const ef_columns *columns, size_t row, size_t column) {
  return columns->value[row * columns->n_columns + column];
}

size_t ef_columns_line(const ef_columns *columns, size_t row) {
  return columns->line[row];
}
