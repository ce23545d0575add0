/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rows whose fields are texts, by the names of their columns. */
#include "exchange/exchange_private.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

struct ef_fields {
  ef__table table;
  size_t n;
  size_t place[EF_FIELDS_MOST]; /* column in the file; SIZE_MAX: not there */
  char *bytes; /* texts of the current row, one after another */
  size_t room;
  const char *text[EF_FIELDS_MOST];
};

/* ---- Header row -------------------------------------------------------- */

static size_t find(const ef__table *table, const char *name) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (ef__name_equal(table->column[i], name))
      return i;
  }
  return SIZE_MAX;
}

static ef_status find_all(ef_fields *fields, size_t n_needed,
                          const char *const *names, ef_error *error) {
  for (size_t i = 0; i < fields->n; ++i) {
    fields->place[i] = find(&fields->table, names[i]);
    if (fields->place[i] == SIZE_MAX && i < n_needed) {
      return ef__header_error(&fields->table, SIZE_MAX, error,
                              "there is no column called %s; add one",
                              names[i]);
    }
  }
  return EF_OK;
}

static void note_others(const ef_fields *fields) {
  const ef__table *const table = &fields->table;
  for (size_t i = 0; i < table->n_columns; ++i) {
    bool is_used = false;
    for (size_t k = 0; k < fields->n; ++k)
      is_used = is_used || fields->place[k] == i;
    if (is_used)
      continue;
    char quoted[EF__QUOTED];
    ef__quote(ef__span_of(table->column[i]), quoted);
    ef__note(table->notes, "%s:%zu: column %s is not used",
             table->records.input->name, table->header_line, quoted);
  }
}

/* ---- Opening ----------------------------------------------------------- */

static ef__input *open_input(const char *path, ef_error *error) {
  ef__span demo;
  switch (ef__demo_find(path, &demo, error)) {
  case EF__DEMO_NONE:
    break;
  case EF__DEMO_UNKNOWN:
    return NULL;
  case EF__DEMO_FOUND:
    return ef__input_from_text(path, demo.text, demo.length, error);
  }
  return ef__input_open(path, error);
}

/* Takes the input over. */
static ef_fields *fields_new(ef__input *input, size_t n, size_t n_needed,
                             const char *const *names, const ef_notes *notes,
                             ef_error *error) {
  ef_fields *const fields = ef__allocate_zeroed(1, sizeof *fields);
  if (fields == NULL) {
    ef__input_free(input);
    ef__error_memory(error, "a table");
    return NULL;
  }
  fields->n = n;
  if (ef__table_open(input, notes, &fields->table, error) != EF_OK ||
      find_all(fields, n_needed, names, error) != EF_OK) {
    ef_fields_free(fields);
    return NULL;
  }
  note_others(fields);
  return fields;
}

ef_fields *ef_fields_open(const char *path, size_t n, size_t n_needed,
                          const char *const *names, const ef_notes *notes,
                          ef_error *error) {
  if (n == 0 || n > EF_FIELDS_MOST || n_needed > n) {
    ef__error_set(error, EF_INVALID,
                  "%zu columns are asked for, %zu of them needed; 1 to %d can "
                  "be",
                  n, n_needed, EF_FIELDS_MOST);
    return NULL;
  }
  ef__input *const input = open_input(path, error);
  return input == NULL ? NULL
                       : fields_new(input, n, n_needed, names, notes, error);
}

void ef_fields_free(ef_fields *fields) {
  if (fields == NULL)
    return;
  ef__table_clear(&fields->table);
  free(fields->bytes);
  free(fields);
}

/* ---- Rows -------------------------------------------------------------- */

static ef__span field_at(const ef_fields *fields, size_t i) {
  const ef__span none = {"", 0};
  return fields->place[i] == SIZE_MAX
             ? none
             : ef__span_trim(fields->table.records.field[fields->place[i]]);
}

/* The fields end in the window of the input: texts need room of their own. */
static ef_status copy_row(ef_fields *fields, ef_error *error) {
  size_t needed = 0;
  for (size_t i = 0; i < fields->n; ++i)
    needed += field_at(fields, i).length + 1;
  if (needed > fields->room) {
    char *const grown = ef__reallocate(fields->bytes, 2 * needed, 1);
    if (grown == NULL)
      return ef__error_memory(error, "the fields of a row");
    fields->bytes = grown;
    fields->room = 2 * needed;
  }
  char *to = fields->bytes;
  for (size_t i = 0; i < fields->n; ++i) {
    const ef__span span = field_at(fields, i);
    memcpy(to, span.text, span.length);
    to[span.length] = '\0';
    fields->text[i] = to;
    to += span.length + 1;
  }
  return EF_OK;
}

ef_status ef_fields_next(ef_fields *fields, const char *const **text,
                         size_t *line, ef_error *error) {
  bool has_row;
  *text = NULL;
  ef_status status = ef__table_next(&fields->table, &has_row, error);
  if (status != EF_OK || !has_row)
    return status;
  status = ef__table_split(&fields->table, error);
  if (status == EF_OK)
    status = copy_row(fields, error);
  if (status != EF_OK)
    return status;
  *text = fields->text;
  if (line != NULL)
    *line = fields->table.records.line;
  return EF_OK;
}

ef_status ef_fields_number(ef_fields *fields, size_t i, double *value,
                           ef_error *error) {
  if (i >= fields->n || fields->place[i] == SIZE_MAX) {
    return ef__error_set(error, EF_INVALID,
                         "column %zu was not asked for or is not there", i);
  }
  return ef__table_number(&fields->table, fields->place[i], value, error);
}

size_t ef_fields_offset(const ef_fields *fields) {
  return fields->table.records.offset;
}

/* ---- For the caller's own checks --------------------------------------- */

bool ef_fields_has(const ef_fields *fields, size_t i) {
  return i < fields->n && fields->place[i] != SIZE_MAX;
}

const char *ef_fields_unit(const ef_fields *fields) {
  return fields->table.remarks.unit;
}

ef_status ef_fields_fault(const ef_fields *fields, size_t i, ef_error *error,
                          const char *format, ...) {
  char message[480];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  const ef__table *const table = &fields->table;
  const bool has_column = ef_fields_has(fields, i);
  ef__error_set(error, EF_MALFORMED, "%s", message);
  ef__error_place(error, table->records.input->name, table->records.line,
                  has_column ? fields->place[i] + 1 : 0,
                  has_column ? table->column[fields->place[i]] : NULL);
  return EF_MALFORMED;
}
