/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rows of CSV, written as they come. Lines end with LF. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Fields are gathered here: they are short, and an output is a long way. */
enum { ROOM = 4096 };

struct ef_csv {
  ef_output *output;
  bool in_row;
  bool row_is_blank; /* one empty field so far */
  ef_status status;  /* of the first failure */
  ef_error error;
  size_t used;
  char text[ROOM];
};

ef_csv *ef_csv_new(ef_output *output, ef_error *error) {
  ef_csv *const csv = ef__allocate_zeroed(1, sizeof *csv);
  if (csv == NULL) {
    ef__error_memory(error, "CSV");
    return NULL;
  }
  csv->output = output;
  return csv;
}

static void hand_on(ef_csv *csv, const char *bytes, size_t length) {
  if (csv->status != EF_OK || length == 0) return;
  csv->status = ef_output_write(csv->output, bytes, length, &csv->error);
}

static void empty(ef_csv *csv) {
  hand_on(csv, csv->text, csv->used);
  csv->used = 0;
}

static void put_one(ef_csv *csv, char byte) {
  if (csv->used == ROOM) empty(csv);
  csv->text[csv->used++] = byte;
}

static void put(ef_csv *csv, const char *bytes, size_t length) {
  if (length > ROOM - csv->used) empty(csv);
  if (length > ROOM) {
    hand_on(csv, bytes, length);
    return;
  }
  if (length > 0) memcpy(csv->text + csv->used, bytes, length);
  csv->used += length;
}

void ef_csv_comment(ef_csv *csv, const char *text) {
  if (csv->in_row) ef_csv_end_row(csv);
  for (;;) {
    const size_t length = strcspn(text, "\r\n");
    put(csv, "# ", 2);
    put(csv, text, length);
    put(csv, "\n", 1);
    text += length;
    if (text[0] == '\r' && text[1] == '\n') ++text;
    if (*text == '\0') return;
    ++text;
    if (*text == '\0') return; /* one line end at the end is no line */
  }
}

static void begin_field(ef_csv *csv) {
  if (csv->in_row) put_one(csv, ',');
  csv->row_is_blank = false;
  csv->in_row = true;
}

static bool is_blank(char c) {
  return c == ' ' || c == '\t';
}

/* What a reader would take for something else without quotes: separators of
 * any dialect too, as the header row decides the dialect. */
static bool needs_quotes(const char *text, bool is_first) {
  const size_t length = strlen(text);
  if (length == 0) return false;
  if (is_blank(text[0]) || is_blank(text[length - 1])) return true;
  if (is_first && (text[0] == '#' || text[0] == '\xEF')) return true;
  return strpbrk(text, ",;\t\"\r\n") != NULL;
}

static void put_quoted(ef_csv *csv, const char *text) {
  put(csv, "\"", 1);
  for (;;) {
    const size_t length = strcspn(text, "\"");
    put(csv, text, length);
    text += length;
    if (*text == '\0') break;
    put(csv, "\"\"", 2);
    ++text;
  }
  put(csv, "\"", 1);
}

void ef_csv_text(ef_csv *csv, const char *text) {
  const bool is_first = !csv->in_row;
  if (text == NULL) text = "";
  begin_field(csv);
  if (needs_quotes(text, is_first)) {
    put_quoted(csv, text);
  } else {
    put(csv, text, strlen(text));
  }
  if (is_first && text[0] == '\0') csv->row_is_blank = true;
}

void ef_csv_number(ef_csv *csv, double value) {
  const bool is_first = !csv->in_row;
  begin_field(csv);
  if (isnan(value)) {
    csv->row_is_blank = is_first;
    return;
  }
  if (EF_NUMBER_TEXT > ROOM - csv->used) empty(csv);
  csv->used += ef_number_format(value, csv->text + csv->used);
}

void ef_csv_end_row(ef_csv *csv) {
  /* A blank line is no row. */
  if (csv->row_is_blank) put(csv, "\"\"", 2);
  put_one(csv, '\n');
  csv->in_row = false;
  csv->row_is_blank = false;
}

void ef_csv_rows(ef_csv *csv, const char *bytes, size_t length) {
  if (csv->in_row) ef_csv_end_row(csv);
  if (length > 0) put(csv, bytes, length);
}

ef_status ef_csv_finish(ef_csv *csv, ef_error *error) {
  if (csv == NULL) return EF_OK;
  if (csv->in_row) ef_csv_end_row(csv);
  empty(csv);
  const ef_status status = csv->status;
  if (status != EF_OK && error != NULL) *error = csv->error;
  free(csv);
  return status;
}
