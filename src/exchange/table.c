/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A table: remarks, named columns, rows that know their line. */
#include "exchange/exchange_private.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* ---- Remarks ----------------------------------------------------------- */

/* The text behind "key:", or an empty span without text for another key. */
static ef__span remark_text(ef__span comment, const char *key) {
  const ef__span none = {NULL, 0};
  const size_t length = strlen(key);
  const ef__span line = ef__span_trim(comment);
  if (line.length <= length || line.text[length] != ':') return none;
  for (size_t i = 0; i < length; ++i) {
    const char c = line.text[i];
    if ((c >= 'A' && c <= 'Z' ? c - 'A' + 'a' : c) != key[i]) return none;
  }
  return ef__span_trim(
      (ef__span){line.text + length + 1, line.length - length - 1});
}

/* Spreadsheets fill every line to the width of the table. */
static ef__span without_fillers(ef__span span) {
  while (span.length > 0 && strchr(",; \t", span.text[span.length - 1])) {
    --span.length;
  }
  return span;
}

/* The first remark of a key counts. */
static ef_status keep_remark(ef__table *table, const char *key, char **kept,
                             bool *is_kept, ef_error *error) {
  const ef__records *const records = &table->records;
  const ef__span comment = {records->text, records->length};
  const ef__span text = without_fillers(remark_text(comment, key));
  if (text.text == NULL) return EF_OK;
  if (*kept != NULL) {
    ef__note(table->notes, "%s:%zu: a second '# %s:' line is not used",
             records->input->name, records->line, key);
    return EF_OK;
  }
  *kept = ef__copy_text(text.text, text.length);
  if (*kept == NULL) return ef__error_memory(error, "comment lines");
  if (is_kept != NULL) *is_kept = true;
  return EF_OK;
}

static ef_status read_remark(ef__table *table, ef_error *error) {
  ef__remarks *const remarks = &table->remarks;
  bool is_device_max = false;
  ef_status status = keep_remark(table, "title", &remarks->title, NULL, error);
  if (status == EF_OK) {
    status = keep_remark(table, "quantity", &remarks->quantity, NULL, error);
  }
  if (status == EF_OK) {
    status = keep_remark(table, "unit", &remarks->unit, NULL, error);
  }
  if (status == EF_OK) {
    status = keep_remark(table, "device_max", &remarks->device_max,
                         &is_device_max, error);
  }
  if (status == EF_OK) {
    status = keep_remark(table, "illuminant", &remarks->illuminant, NULL, error);
  }
  if (status == EF_OK) {
    status = keep_remark(table, "observer", &remarks->observer, NULL, error);
  }
  if (is_device_max) remarks->device_max_line = table->records.line;
  return status;
}

static ef_status complete_remarks(ef__remarks *remarks, ef_error *error) {
  char **const texts[] = {&remarks->title, &remarks->quantity, &remarks->unit,
                          &remarks->device_max, &remarks->illuminant,
                          &remarks->observer};
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i) {
    if (*texts[i] == NULL) *texts[i] = ef__copy_text("", 0);
    if (*texts[i] == NULL) return ef__error_memory(error, "comment lines");
  }
  return EF_OK;
}

/* ---- Header row -------------------------------------------------------- */

ef_status ef__header_error(const ef__table *table, size_t column,
                           ef_error *error, const char *format, ...) {
  char message[480];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  const bool has_column = column < table->n_columns;
  ef__error_set(error, EF_MALFORMED, "%s", message);
  ef__error_place(error, table->records.input->name, table->header_line,
                  has_column ? column + 1 : 0,
                  has_column ? table->column[column] : NULL);
  return EF_MALFORMED;
}

/* Files of old systems end their lines by a lone carriage return. */
static ef_status check_line_ends(const ef__table *table, ef_error *error) {
  const ef__records *const records = &table->records;
  if (records->has_quotes || records->length == 0) return EF_OK;
  if (memchr(records->text, '\r', records->length) == NULL) return EF_OK;
  return ef__records_error(records, SIZE_MAX, NULL, error,
                           "lines end with a lone carriage return; save the "
                           "file with LF or CRLF line ends");
}

static bool is_named(const ef__records *records, size_t i, char letter) {
  if (i >= records->n_fields) return false;
  const ef__span field = ef__span_trim(records->field[i]);
  return field.length == 1 && field.text[0] == letter;
}

/* First of the columns C, M, Y side by side, where another Y is there as well:
 * that of X,Y,Z or x,y,Y. SIZE_MAX when no two columns are called Y so. */
static size_t find_inks(const ef__records *records) {
  size_t n_named_y = 0;
  size_t first = SIZE_MAX;
  for (size_t i = 0; i < records->n_fields; ++i) {
    if (!is_named(records, i, 'Y')) continue;
    ++n_named_y;
    if (i >= 2 && is_named(records, i - 2, 'C') &&
        is_named(records, i - 1, 'M')) {
      if (first != SIZE_MAX) return SIZE_MAX;
      first = i - 2;
    }
  }
  return n_named_y == 2 ? first : SIZE_MAX;
}

/* Name of column i; inks are written out where their first is `inks`, so that
 * yellow and luminance are two things. */
static ef__span name_of(const ef__records *records, size_t inks, size_t i) {
  static const char *const words[] = {"cyan", "magenta", "yellow", "black"};
  const bool is_ink = inks != SIZE_MAX && i >= inks && i < inks + 4;
  if (is_ink && (i < inks + 3 || is_named(records, i, 'K'))) {
    return ef__span_of(words[i - inks]);
  }
  return ef__span_trim(records->field[i]);
}

/* Names of the split header row into one block: pointers, then texts. */
static ef_status copy_names(ef__table *table, ef_error *error) {
  const ef__records *const records = &table->records;
  const size_t n = records->n_fields;
  const size_t inks = find_inks(records);
  size_t n_bytes = n;
  for (size_t i = 0; i < n; ++i) n_bytes += name_of(records, inks, i).length;
  char *text;
  const ef__part parts[] = {{&table->column, n, sizeof *table->column},
                            {&text, n_bytes, 1}};
  if (ef__allocate_block(2, parts) == NULL) {
    return ef__error_memory(error, "the header row");
  }
  for (size_t i = 0; i < n; ++i) {
    const ef__span field = name_of(records, inks, i);
    table->column[i] = text;
    memcpy(text, field.text, field.length);
    text[field.length] = '\0';
    text += field.length + 1;
  }
  table->n_columns = n;
  return EF_OK;
}

typedef struct named_column {
  const char *name;
  size_t column;
} named_column;

static int by_name(const void *a, const void *b) {
  const named_column *const x = a;
  const named_column *const y = b;
  const int order = strcmp(x->name, y->name);
  return order != 0 ? order : (x->column > y->column) - (x->column < y->column);
}

static ef_status check_repeats(const ef__table *table, ef_error *error) {
  const size_t n = table->n_columns;
  named_column *const sorted = ef__allocate(n, sizeof *sorted);
  if (sorted == NULL) return ef__error_memory(error, "the header row");
  for (size_t i = 0; i < n; ++i)
    sorted[i] = (named_column){table->column[i], i};
  qsort(sorted, n, sizeof *sorted, by_name);
  size_t first = SIZE_MAX, second = SIZE_MAX;
  for (size_t i = 1; i < n; ++i) {
    const bool is_repeat = strcmp(sorted[i - 1].name, sorted[i].name) == 0;
    if (!is_repeat || sorted[i].column > second) continue;
    first = sorted[i - 1].column;
    second = sorted[i].column;
  }
  free(sorted);
  if (second == SIZE_MAX) return EF_OK;
  return ef__header_error(table, second, error,
                          "columns %zu and %zu have one name; rename or remove "
                          "one of them",
                          first + 1, second + 1);
}

static ef_status check_names(const ef__table *table, ef_error *error) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (table->column[i][0] != '\0') continue;
    return ef__header_error(table, i, error,
                            "the column has no name; name it or remove it");
  }
  return check_repeats(table, error);
}

static ef_status read_header(ef__table *table, ef_error *error) {
  ef__records *const records = &table->records;
  table->header_line = records->line;
  ef_status status = check_line_ends(table, error);
  if (status != EF_OK) return status;
  ef__records_detect(records);
  status = ef__records_split(records, error);
  if (status != EF_OK) return status;
  if (records->n_fields > EF__MOST_COLUMNS) {
    return ef__header_error(table, SIZE_MAX, error,
                            "the header row has %zu columns; at most %zu are "
                            "read: split the file",
                            records->n_fields, EF__MOST_COLUMNS);
  }
  status = copy_names(table, error);
  return status == EF_OK ? check_names(table, error) : status;
}

/* ---- The table --------------------------------------------------------- */

static ef_status refuse_empty(const ef__table *table, ef_error *error) {
  const ef__input *const input = table->records.input;
  ef__error_set(error, EF_MALFORMED,
                input->n_read == 0
                    ? "the file is empty; expected a header row and rows below "
                      "it"
                    : "there is no header row; expected one such as name,L,a,b "
                      "and rows below it");
  return ef__error_place(error, input->name, 0, 0, NULL), EF_MALFORMED;
}

static ef_status read_top(ef__table *table, ef_error *error) {
  for (;;) {
    ef__record_kind kind;
    ef_status status = ef__records_next(&table->records, &kind, error);
    if (status != EF_OK) return status;
    if (kind == EF__RECORD_END) return refuse_empty(table, error);
    if (kind == EF__RECORD_ROW) break;
    status = check_line_ends(table, error);
    if (status == EF_OK) status = read_remark(table, error);
    if (status != EF_OK) return status;
  }
  const ef_status status = complete_remarks(&table->remarks, error);
  return status == EF_OK ? read_header(table, error) : status;
}

/* The first bytes tell the format. */
static ef_status look_at_start(ef__input *input, bool *is_cgats,
                               ef_error *error) {
  const ef_status status = ef__input_more(input, error);
  *is_cgats = status == EF_OK && ef__cgats_is_one(input);
  return status;
}

static ef_status open_cgats(ef__table *table, ef_error *error) {
  const ef_status status = ef__cgats_open(table, error);
  return status == EF_OK ? check_names(table, error) : status;
}

ef_status ef__table_open(ef__input *input, const ef_notes *notes,
                         ef__table *table, ef_error *error) {
  *table = (ef__table){.notes = notes};
  bool is_cgats = false;
  ef_status status = ef__records_new(input, &table->records, error);
  if (status == EF_OK) status = look_at_start(input, &is_cgats, error);
  if (status == EF_OK) {
    status = is_cgats ? open_cgats(table, error) : read_top(table, error);
  }
  if (status != EF_OK) {
    ef__table_clear(table);
    return status;
  }
  /* Between commas no decimal comma can stand. */
  if (table->records.separator == ',') table->mark = '.';
  return EF_OK;
}

void ef__table_clear(ef__table *table) {
  ef__records_clear(&table->records);
  free(table->remarks.title);
  free(table->remarks.quantity);
  free(table->remarks.unit);
  free(table->remarks.device_max);
  free(table->remarks.illuminant);
  free(table->remarks.observer);
  free(table->column);
  *table = (ef__table){0};
}

/* A line of separators alone is as good as a blank one. */
static bool is_filler(const ef__records *records) {
  if (records->length == 0 || records->text[0] != records->separator) {
    return false;
  }
  for (size_t i = 1; i < records->length; ++i) {
    const char c = records->text[i];
    if (c != records->separator && c != ' ') return false;
  }
  return true;
}

ef_status ef__table_next(ef__table *table, bool *has_row, ef_error *error) {
  ef__record_kind kind;
  do {
    const ef_status status = ef__records_next(&table->records, &kind, error);
    if (status != EF_OK) return status;
  } while (kind == EF__RECORD_COMMENT ||
           (kind == EF__RECORD_ROW && is_filler(&table->records)));
  *has_row = kind == EF__RECORD_ROW;
  return EF_OK;
}

static const char *separator_name(char separator) {
  return separator == ',' ? "commas" : separator == ';' ? "semicolons" : "tabs";
}

ef_status ef__table_split(ef__table *table, ef_error *error) {
  ef__records *const records = &table->records;
  const ef_status status = ef__records_split(records, error);
  if (status != EF_OK) return status;
  if (records->n_fields == table->n_columns) return EF_OK;
  const char *const hint =
      records->n_fields < table->n_columns ? "complete the row or leave it out"
      : records->separator == ','
          ? "quote a field that holds a comma; decimal commas need semicolons "
            "or tabs between the fields"
          : "quote a field that holds a separator";
  return ef__records_error(
      records, SIZE_MAX, NULL, error,
      "the row has %zu field%s between %s, expected %zu as "
      "in the header row; %s",
      records->n_fields, records->n_fields == 1 ? "" : "s",
      separator_name(records->separator), table->n_columns, hint);
}

/* ---- Numbers ----------------------------------------------------------- */

/* The first mark of the file decides: 1,234 must not be read as a number of
 * thousands in one row and as a decimal in the next. */
static void learn_mark(ef__table *table, ef__span field) {
  const bool has_comma = memchr(field.text, ',', field.length) != NULL;
  table->mark = has_comma ? ',' : '.';
  table->mark_line = table->records.line;
  if (!has_comma) return;
  ef__note(table->notes, "%s: numbers are read with a decimal comma",
           table->records.input->name);
}

static ef_status refuse_mark(const ef__table *table, size_t column,
                             const char *found, ef_error *error) {
  if (table->records.separator == ',') {
    return ef__table_error(table, column, error,
                           "found %s, expected a number with a decimal point; "
                           "decimal commas need semicolons or tabs between the "
                           "fields",
                           found);
  }
  if (table->records.cgats != NULL) {
    return ef__table_error(table, column, error,
                           "found %s, expected a number with a decimal point",
                           found);
  }
  return ef__table_error(table, column, error,
                         "found %s, expected a decimal %s as in line %zu; use "
                         "one decimal mark in all rows",
                         found, table->mark == ',' ? "comma" : "point",
                         table->mark_line);
}

ef_status ef__table_number(ef__table *table, size_t column, double *value,
                           ef_error *error) {
  char quoted[EF__QUOTED];
  const ef__span field = ef__span_trim(table->records.field[column]);
  ef__decimal_fault fault = ef__decimal_read(field, table->mark, value);
  if (fault == EF__DECIMAL_MARK && table->mark == '\0') {
    learn_mark(table, field);
    fault = ef__decimal_read(field, table->mark, value);
  }
  switch (fault) {
  case EF__DECIMAL_GOOD: return EF_OK;
  case EF__DECIMAL_EMPTY:
    return ef__table_error(table, column, error,
                           "the field is empty, expected a number; fill it or "
                           "leave the row out");
  case EF__DECIMAL_ENDLESS:
    return ef__table_error(table, column, error,
                           "found %s, expected a finite number; leave the row "
                           "out or measure it again",
                           ef__quote(field, quoted));
  case EF__DECIMAL_TOO_LARGE:
    return ef__table_error(table, column, error,
                           "%s is beyond the range of numbers (1.8e308); check "
                           "the exponent",
                           ef__quote(field, quoted));
  case EF__DECIMAL_MARK:
    return refuse_mark(table, column, ef__quote(field, quoted), error);
  case EF__DECIMAL_TEXT: break;
  }
  return ef__table_error(table, column, error,
                         "found %s, expected a number; correct it or leave the "
                         "row out",
                         ef__quote(field, quoted));
}
