/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "text.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

/* ---- The buffer -------------------------------------------------------- */

static void add_bytes(text *t, const char *bytes, size_t length) {
  if (t->failed)
    return;
  if (t->room - t->length <= length) {
    const size_t room = 2 * t->room + length + 256;
    char *grown = realloc(t->bytes, room);
    if (grown == NULL) {
      t->failed = true;
      return;
    }
    t->bytes = grown;
    t->room = room;
  }
  memcpy(t->bytes + t->length, bytes, length);
  t->length += length;
  t->bytes[t->length] = '\0';
}

void text_add(text *t, const char *piece) {
  add_bytes(t, piece, strlen(piece));
}

void text_add_end(text *t) {
  add_bytes(t, "", 1);
}

void text_format(text *t, const char *format, ...) {
  char piece[1024];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(piece, sizeof piece, format, arguments);
  va_end(arguments);
  text_add(t, piece);
}

ef_status text_write(const text *t, ef_output *output, ef_error *error) {
  if (t->failed) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for the text");
  }
  return ef_output_write(output, t->bytes, t->length, error);
}

void text_free(text *t) {
  free(t->bytes);
  *t = (text){0};
}

size_t text_columns(const char *bytes) {
  size_t n = 0;
  for (; *bytes != '\0'; ++bytes) {
    if (((unsigned char)*bytes & 0xC0u) != 0x80u)
      ++n;
  }
  return n;
}

static void add_blanks(text *t, size_t n) {
  while (n-- > 0)
    add_bytes(t, " ", 1);
}

/* ---- Reports ----------------------------------------------------------- */

static void report_paragraph(text *t, const char *content) {
  content += strspn(content, " ");
  if (content[0] == '\0')
    return;
  if (!t->has_answer)
    ef_report_answer(t->report, content);
  else if (strcmp(t->heading, "Cautions") == 0)
    ef_report_caution(t->report, content);
  else
    ef_report_paragraph(t->report, content);
  t->has_answer = true;
}

void text_section(text *t, const char *title) {
  if (t->report == NULL)
    return;
  text_flush(t, NULL);
  snprintf(t->heading, sizeof t->heading, "%s", title);
  ef_report_section(t->report, title);
}

/* One line of what was added: a heading, or a piece of the paragraph that is
 * being put together, which a full stop ends. */
static void report_line(text *t, text *paragraph, const char *line,
                        size_t length) {
  while (length > 0 && line[length - 1] == ' ')
    --length;
  const bool is_heading = length > 1 && line[length - 1] == ':' &&
                          line[0] != ' ' && paragraph->length == 0 &&
                          length < sizeof t->heading;
  if (is_heading) {
    snprintf(t->heading, sizeof t->heading, "%.*s", (int)length - 1, line);
    ef_report_section(t->report, t->heading);
    return;
  }
  const size_t blanks = strspn(line, " ");
  if (length > blanks) {
    if (paragraph->length > 0)
      text_add(paragraph, " ");
    add_bytes(paragraph, line + blanks, length - blanks);
  }
  const bool ends = length <= blanks || line[length - 1] == '.';
  if (ends && paragraph->length > 0) {
    report_paragraph(t, paragraph->bytes);
    paragraph->length = 0;
    paragraph->bytes[0] = '\0';
  }
}

/* Hands on the whole lines that were added. What stands behind the last line
 * end stays, as the beginning of what comes next. */
static void report_lines(text *t) {
  text paragraph = {0};
  const char *line = t->bytes != NULL ? t->bytes : "";
  for (const char *end; (end = strchr(line, '\n')) != NULL; line = end + 1)
    report_line(t, &paragraph, line, (size_t)(end - line));
  if (paragraph.length > 0)
    report_paragraph(t, paragraph.bytes);
  t->failed = t->failed || paragraph.failed;
  text_free(&paragraph);
  if (t->bytes != NULL) {
    t->length = strlen(line);
    memmove(t->bytes, line, t->length + 1);
  }
}

ef_status text_flush(text *t, ef_error *error) {
  if (t->report != NULL) {
    text_add(t, "\n");
    report_lines(t);
  }
  if (t->failed)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the text");
  return EF_OK;
}

/* The column at which the buffer's last line ends. */
static size_t current_column(const text *t) {
  if (t->length == 0)
    return 0;
  const char *line = strrchr(t->bytes, '\n');
  return text_columns(line != NULL ? line + 1 : t->bytes);
}

/* True when `text` starts with a unit, which stays with its number. */
static bool starts_with_unit(const char *words) {
  static const char *const units[] = {"%",   "Delta ", "E*",
                                      "JND", "cd/m2",  "lux"};
  for (size_t i = 0; i < sizeof units / sizeof units[0]; ++i) {
    if (strncmp(words, units[i], strlen(units[i])) == 0)
      return true;
  }
  return false;
}

/* Bytes of the next piece that is not broken: a word and the units after it. */
static size_t piece_length(const char *sentence) {
  size_t length = strcspn(sentence, " ");
  while (sentence[length] == ' ' && starts_with_unit(sentence + length + 1)) {
    length += 1 + strcspn(sentence + length + 1, " ");
  }
  return length;
}

static void report_sentence(text *t, const char *sentence) {
  report_lines(t);
  text_add(t, sentence);
  if (t->failed || t->bytes == NULL)
    return;
  report_paragraph(t, t->bytes);
  t->length = 0;
  t->bytes[0] = '\0';
}

void text_wrap(text *t, const char *sentence, size_t indent) {
  if (t->report != NULL) {
    report_sentence(t, sentence);
    return;
  }
  const size_t last = 79;
  size_t column = current_column(t);
  bool is_first = true;
  while (*sentence != '\0') {
    const size_t length = piece_length(sentence);
    size_t width = 0;
    for (size_t i = 0; i < length; ++i) {
      if (((unsigned char)sentence[i] & 0xC0u) != 0x80u)
        ++width;
    }
    if (!is_first && column + 1 + width > last) {
      text_add(t, "\n");
      add_blanks(t, indent);
      column = indent;
    } else if (!is_first) {
      text_add(t, " ");
      ++column;
    }
    add_bytes(t, sentence, length);
    column += width;
    is_first = false;
    sentence += length;
    sentence += strspn(sentence, " ");
  }
  text_add(t, "\n");
}

void text_paragraph(text *t, text *content, size_t indent) {
  text_wrap(t, content->bytes != NULL ? content->bytes : "", indent);
  t->failed = t->failed || content->failed;
  text_free(content);
}

void text_label(text *t, const char *label, text *content) {
  enum { LABEL_WIDTH = 15 };
  const char *bytes = content->bytes != NULL ? content->bytes : "";
  if (t->report != NULL) {
    report_lines(t);
    ef_report_term(t->report, label, bytes);
  } else {
    text_format(t, "  %-*s", LABEL_WIDTH - 2, label);
    text_wrap(t, bytes, LABEL_WIDTH);
  }
  t->failed = t->failed || content->failed;
  text_free(content);
}

/* ---- Tables ------------------------------------------------------------ */

text_table table_new(void) {
  return (text_table){0};
}

static void widen(text_table *t, size_t c, const char *content) {
  const size_t width = text_columns(content);
  if (width > t->column[c].width)
    t->column[c].width = width;
}

void table_column(text_table *t, const char *line1, const char *line2,
                  bool is_left) {
  if (t->n_columns == TABLE_MOST_COLUMNS)
    return;
  const size_t c = t->n_columns++;
  t->column[c].head[0] = line1;
  t->column[c].head[1] = line2;
  t->column[c].is_left = is_left;
  widen(t, c, line2);
}

void table_cell(text_table *t, const char *content) {
  widen(t, t->n_cells % t->n_columns, content);
  ++t->n_cells;
  add_bytes(&t->cells, content, strlen(content) + 1);
}

void table_format(text_table *t, const char *format, ...) {
  char content[512];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(content, sizeof content, format, arguments);
  va_end(arguments);
  table_cell(t, content);
}

void table_number(text_table *t, double value, int decimals) {
  char number[EF_NUMBER_TEXT];
  if (isnan(value)) {
    table_cell(t, "-");
    return;
  }
  ef_number_format_fixed(value, decimals, number);
  table_cell(t, number);
}

/* Columns from `c` on that the first head line of `c` stands over: those that
 * follow without a first line of their own. */
static size_t span_end(const text_table *t, size_t c) {
  size_t end = c + 1;
  while (end < t->n_columns && t->column[end].head[0] == NULL)
    ++end;
  return end;
}

static size_t span_width(const text_table *t, size_t begin, size_t end) {
  size_t width = 2 * (end - begin - 1);
  for (size_t c = begin; c < end; ++c)
    width += t->column[c].width;
  return width;
}

/* Makes room for first head lines that are wider than what they span. */
static void widen_for_heads(text_table *t) {
  for (size_t c = 0; c < t->n_columns; c = span_end(t, c)) {
    if (t->column[c].head[0] == NULL)
      continue;
    const size_t end = span_end(t, c);
    const size_t wanted = text_columns(t->column[c].head[0]);
    const size_t width = span_width(t, c, end);
    if (wanted > width) {
      const size_t last = t->column[c].is_left ? end - 1 : c;
      t->column[last].width += wanted - width;
    }
  }
}

/* Drops the blanks at the end of the line and ends it. */
static void end_line(text *out) {
  while (out->length > 0 && out->bytes[out->length - 1] == ' ') {
    out->bytes[--out->length] = '\0';
  }
  text_add(out, "\n");
}

static void add_aligned(text *out, const char *content, size_t width,
                        bool is_left) {
  const size_t taken = text_columns(content);
  const size_t blanks = width > taken ? width - taken : 0;
  add_blanks(out, 2);
  if (!is_left)
    add_blanks(out, blanks);
  text_add(out, content);
  if (is_left)
    add_blanks(out, blanks);
}

static void add_heads(const text_table *t, text *out) {
  for (size_t c = 0; c < t->n_columns; c = span_end(t, c)) {
    const char *head = t->column[c].head[0];
    const size_t end = span_end(t, c);
    add_aligned(out, head != NULL ? head : "", span_width(t, c, end),
                t->column[c].is_left);
  }
  end_line(out);
  bool is_empty = true;
  for (size_t c = 0; c < t->n_columns; ++c) {
    is_empty = is_empty && t->column[c].head[1][0] == '\0';
  }
  if (is_empty)
    return;
  for (size_t c = 0; c < t->n_columns; ++c) {
    add_aligned(out, t->column[c].head[1], t->column[c].width,
                t->column[c].is_left);
  }
  end_line(out);
}

/* A blank line between tables stays out of a report. */
static void report_table(const text_table *t, text *out) {
  ef_report_column column[TABLE_MOST_COLUMNS];
  const char **cell = malloc((t->n_cells + 1) * sizeof *cell);
  if (cell == NULL) {
    out->failed = true;
    return;
  }
  for (size_t c = 0; c < t->n_columns; ++c) {
    column[c] = (ef_report_column){t->column[c].head[0], t->column[c].head[1],
                                   t->column[c].is_left};
  }
  const char *at = t->cells.bytes;
  for (size_t i = 0; i < t->n_cells; ++i) {
    cell[i] = at;
    at += strlen(at) + 1;
  }
  report_lines(out);
  if (out->heading[0] == '\0')
    text_section(out, "In figures");
  ef_report_table(out->report, out->heading, t->n_columns, column,
                  t->n_cells / t->n_columns, cell);
  free(cell);
}

void table_finish(text_table *t, text *out) {
  if (t->cells.failed)
    out->failed = true;
  if (out->report != NULL) {
    if (!out->failed)
      report_table(t, out);
    text_free(&t->cells);
    return;
  }
  widen_for_heads(t);
  add_heads(t, out);
  const char *cell = t->cells.bytes;
  for (size_t i = 0; i < t->n_cells && cell != NULL; ++i) {
    const size_t c = i % t->n_columns;
    add_aligned(out, cell, t->column[c].width, t->column[c].is_left);
    if (c + 1 == t->n_columns)
      end_line(out);
    cell += strlen(cell) + 1;
  }
  text_free(&t->cells);
}
