/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Records and fields of CSV as RFC 4180 has it, with '#' comment lines. */
#include "exchange/exchange_private.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

ef_status ef__records_new(ef__input *input, ef__records *records,
                          ef_error *error) {
  *records = (ef__records){.input = input, .line = 0, .n_lines = 1};
  records->field_room = 64;
  records->field = ef__allocate(records->field_room, sizeof *records->field);
  if (records->field == NULL) return ef__error_memory(error, "fields");
  return EF_OK;
}

void ef__records_clear(ef__records *records) {
  ef__input_free(records->input);
  ef__cgats_free(records->cgats);
  free(records->field);
  *records = (ef__records){0};
}

ef_status ef__records_error(const ef__records *records, size_t field,
                            const char *name, ef_error *error,
                            const char *format, ...) {
  char message[400];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  ef__error_set(error, EF_MALFORMED, "%s", message);
  ef__error_place(error, records->input->name, records->line,
                  field == SIZE_MAX ? 0 : field + 1, name);
  return EF_MALFORMED;
}

/* ---- Where a record ends ----------------------------------------------- */

static ef_status refuse_long(const ef__records *records, ef_error *error) {
  return ef__records_error(records, SIZE_MAX, NULL, error,
                           "the line is longer than %zu bytes; expected a "
                           "table with one row a line",
                           EF__LONGEST_RECORD);
}

/* Makes window offset `at` readable, or reports the end. */
static ef_status reach(ef__records *records, size_t at, bool *is_end,
                       ef_error *error) {
  ef__input *const input = records->input;
  while (input->begin + at >= input->end && !input->at_end) {
    if (at > EF__LONGEST_RECORD) return refuse_long(records, error);
    const ef_status status = ef__input_more(input, error);
    if (status != EF_OK) return status;
  }
  *is_end = input->begin + at >= input->end;
  return EF_OK;
}

/* Length up to the next line feed from offset `from`, or to the end. */
static ef_status find_line_end(ef__records *records, size_t from,
                               size_t *length, ef_error *error) {
  const ef__input *const input = records->input;
  const char *feed = NULL;
  size_t at = from;
  for (;;) {
    bool is_end = false;
    const ef_status status = reach(records, at, &is_end, error);
    if (status != EF_OK) return status;
    const char *const base = input->buffer + input->begin;
    const size_t held = input->end - input->begin;
    if (!is_end) feed = memchr(base + at, '\n', held - at);
    *length = feed != NULL ? (size_t)(feed - base) : held;
    if (is_end || feed != NULL) break;
    at = held;
  }
  if (*length > EF__LONGEST_RECORD) return refuse_long(records, error);
  return EF_OK;
}

static bool is_separator(const ef__records *records, char c) {
  if (records->separator != '\0') return c == records->separator;
  return c == ',' || c == ';' || c == '\t';
}

/* Blanks that may stand beside a quoted field. */
static bool is_padding(const ef__records *records, char c) {
  return c == ' ' || (c == '\t' && records->separator != '\t');
}

/* True when a quote at `at` opens a field: at its start, padding aside. */
static bool opens_field(const ef__records *records, const char *text,
                        size_t at) {
  while (at > 0 && is_padding(records, text[at - 1])) --at;
  return at == 0 || is_separator(records, text[at - 1]);
}

/* Offset behind the quote that closes a field, looked for from `at` inside it;
 * SIZE_MAX if it is not within text[0 .. length). */
static size_t close_quote(const char *text, size_t length, size_t at) {
  while (at < length) {
    const char *const quote = memchr(text + at, '"', length - at);
    if (quote == NULL) return SIZE_MAX;
    at = (size_t)(quote - text) + 1;
    if (at == length || text[at] != '"') return at;
    ++at;
  }
  return SIZE_MAX;
}

/* Separators outside quotes before offset `end`. */
static size_t count_separators(const ef__records *records, const char *text,
                               size_t end) {
  size_t n = 0;
  for (size_t at = 0; at < end; ++at) {
    n += is_separator(records, text[at]);
    if (text[at] != '"' || !opens_field(records, text, at)) continue;
    const size_t behind = close_quote(text, end, at + 1);
    if (behind == SIZE_MAX) break;
    at = behind - 1;
  }
  return n;
}

static ef_status refuse_open_quote(ef__records *records, size_t open,
                                   bool at_end, ef_error *error) {
  const char *const text = records->input->buffer + records->input->begin;
  const size_t field = count_separators(records, text, open);
  if (at_end) {
    return ef__records_error(records, field, NULL, error,
                             "a quote is opened and not closed before the end "
                             "of the file; close it, or double it inside a "
                             "quoted field");
  }
  return ef__records_error(records, field, NULL, error,
                           "a quote is opened and not closed within %zu bytes; "
                           "close it, or double it inside a quoted field",
                           EF__LONGEST_QUOTED);
}

/* Adds lines to a record of `*length` bytes until the quote at `open` closes;
 * `*behind` is the offset behind that. */
static ef_status extend_to_close(ef__records *records, size_t open,
                                 size_t *length, size_t *behind,
                                 ef_error *error) {
  size_t from = open + 1;
  for (;;) {
    const char *const text = records->input->buffer + records->input->begin;
    *behind = close_quote(text, *length, from);
    const size_t reached = *behind != SIZE_MAX ? *behind : *length;
    if (reached - open > EF__LONGEST_QUOTED) {
      return refuse_open_quote(records, open, false, error);
    }
    if (*behind != SIZE_MAX) return EF_OK;
    /* A quote at the end of a line closes: none is half read here. */
    from = *length + 1;
    bool is_end = false;
    ef_status status = reach(records, from, &is_end, error);
    if (status != EF_OK) return status;
    if (is_end) return refuse_open_quote(records, open, true, error);
    status = find_line_end(records, from, length, error);
    if (status != EF_OK) return status;
    ++records->n_lines;
  }
}

/* `*length` is that of the first line and becomes that of the record, whose
 * quoted fields may hold line ends. */
static ef_status extend_over_quotes(ef__records *records, size_t *length,
                                    ef_error *error) {
  size_t at = 0;
  while (at < *length) {
    const char *const text = records->input->buffer + records->input->begin;
    const char *const quote = memchr(text + at, '"', *length - at);
    if (quote == NULL) return EF_OK;
    const size_t open = (size_t)(quote - text);
    at = open + 1;
    if (!opens_field(records, text, open)) continue;
    const ef_status status =
        extend_to_close(records, open, length, &at, error);
    if (status != EF_OK) return status;
  }
  return EF_OK;
}

/* ---- Records ----------------------------------------------------------- */

static bool is_blank_line(const char *text, size_t length) {
  for (size_t i = 0; i < length; ++i) {
    if (text[i] != ' ' && text[i] != '\t' && text[i] != '\r') return false;
  }
  return true;
}

static bool is_comment(const char *text, size_t length) {
  size_t at = 0;
  while (at < length && (text[at] == ' ' || text[at] == '\t')) ++at;
  return at < length && text[at] == '#';
}

/* Sets the record to the `length` bytes at the window's start and takes them,
 * with the line feed, out of the window. */
static void take_record(ef__records *records, size_t length) {
  ef__input *const input = records->input;
  records->text = input->buffer + input->begin;
  records->offset = input->n_read - (input->end - input->begin);
  const bool has_feed = input->begin + length < input->end;
  input->begin += length + (has_feed ? 1 : 0);
  if (length > 0 && records->text[length - 1] == '\r') --length;
  records->length = length;
  records->is_split = false;
}

static ef_status next_row(ef__records *records, size_t length,
                          ef_error *error) {
  const char *const text = records->input->buffer + records->input->begin;
  records->has_quotes = memchr(text, '"', length) != NULL;
  if (records->has_quotes) {
    const ef_status status = extend_over_quotes(records, &length, error);
    if (status != EF_OK) return status;
  }
  take_record(records, length);
  return EF_OK;
}

static void take_comment(ef__records *records, size_t length) {
  take_record(records, length);
  const char *const hash = memchr(records->text, '#', records->length);
  const size_t skipped = (size_t)(hash - records->text) + 1;
  records->text += skipped;
  records->length -= skipped;
}

ef_status ef__records_next(ef__records *records, ef__record_kind *kind,
                           ef_error *error) {
  if (records->cgats != NULL) return ef__cgats_next(records, kind, error);
  for (;;) {
    records->line += records->n_lines;
    records->n_lines = 1;
    bool is_end = false;
    ef_status status = reach(records, 0, &is_end, error);
    if (status != EF_OK) return status;
    if (is_end) {
      *kind = EF__RECORD_END;
      return EF_OK;
    }
    size_t length;
    status = find_line_end(records, 0, &length, error);
    if (status != EF_OK) return status;
    const char *const text = records->input->buffer + records->input->begin;
    if (is_comment(text, length)) {
      *kind = EF__RECORD_COMMENT;
      take_comment(records, length);
      return EF_OK;
    }
    if (is_blank_line(text, length)) {
      take_record(records, length);
      continue;
    }
    *kind = EF__RECORD_ROW;
    return next_row(records, length, error);
  }
}

/* ---- Fields ------------------------------------------------------------ */

/* True when `c` stands in the record outside quotes. */
static bool has_outside_quotes(const ef__records *records, char c) {
  const char *const text = records->text;
  for (size_t at = 0; at < records->length; ++at) {
    if (text[at] == c) return true;
    if (text[at] != '"' || !opens_field(records, text, at)) continue;
    const size_t behind = close_quote(text, records->length, at + 1);
    if (behind == SIZE_MAX) return false;
    at = behind - 1;
  }
  return false;
}

void ef__records_detect(ef__records *records) {
  records->separator = has_outside_quotes(records, '\t')  ? '\t'
                       : has_outside_quotes(records, ';') ? ';'
                                                          : ',';
}

/* Doubled quotes of text[0 .. length) to single ones; the new length. */
static size_t resolve_quotes(char *text, size_t length) {
  size_t kept = 0;
  for (size_t i = 0; i < length; ++i) {
    if (text[i] == '"') ++i; /* a pair: close_quote stopped at single ones */
    text[kept++] = text[i];
  }
  return kept;
}

static ef_status add_field(ef__records *records, ef__span span,
                           ef_error *error) {
  if (records->n_fields == records->field_room) {
    ef__span *const grown = ef__reallocate(
        records->field, 2 * records->field_room, sizeof *records->field);
    if (grown == NULL) return ef__error_memory(error, "fields");
    records->field = grown;
    records->field_room *= 2;
  }
  records->field[records->n_fields++] = span;
  return EF_OK;
}

/* The quoted field that opens at `*at`; `*at` moves to the separator behind
 * it. */
static ef_status quoted_field(ef__records *records, size_t *at, ef__span *span,
                              ef_error *error) {
  char *const text = records->text;
  const size_t open = *at;
  const size_t behind = close_quote(text, records->length, open + 1);
  if (behind == SIZE_MAX) {
    return ef__records_error(records, records->n_fields, NULL, error,
                             "a quote is opened and not closed; close it");
  }
  span->text = text + open + 1;
  span->length = resolve_quotes(text + open + 1, behind - open - 2);
  *at = behind;
  while (*at < records->length && text[*at] != records->separator) {
    if (!is_padding(records, text[*at])) {
      return ef__records_error(
          records, records->n_fields, NULL, error,
          "text stands behind the closing quote of the field; double the "
          "quotes inside a quoted field");
    }
    ++*at;
  }
  return EF_OK;
}

static ef__span plain_field(const ef__records *records, size_t *at) {
  const char *const text = records->text;
  const size_t left = records->length - *at;
  const char *const found =
      left > 0 ? memchr(text + *at, records->separator, left) : NULL;
  const ef__span span = {text + *at,
                         found != NULL ? (size_t)(found - text) - *at : left};
  *at += span.length;
  return ef__span_trim(span);
}

ef_status ef__records_split(ef__records *records, ef_error *error) {
  size_t at = 0;
  if (records->is_split) return EF_OK;
  records->is_split = true;
  records->n_fields = 0;
  for (;;) {
    size_t open = at;
    while (open < records->length && is_padding(records, records->text[open])) {
      ++open;
    }
    ef__span span;
    if (open < records->length && records->text[open] == '"') {
      at = open;
      const ef_status status = quoted_field(records, &at, &span, error);
      if (status != EF_OK) return status;
    } else {
      span = plain_field(records, &at);
    }
    const ef_status status = add_field(records, span, error);
    if (status != EF_OK) return status;
    if (at == records->length) return EF_OK;
    ++at; /* the separator */
  }
}
