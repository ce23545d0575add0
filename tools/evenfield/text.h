/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Text for people: a buffer that grows, and tables of aligned columns. */
#ifndef COMMAND_TEXT_H
#define COMMAND_TEXT_H

#include <evenfield/exchange.h>
#include <evenfield/picture.h>

/** Text that grows. With a report its parts go there instead: headings (lines
 * that end in a colon), paragraphs, labels and tables; the first paragraph is
 * the answer. */
typedef struct text {
  char *bytes; /**< NULL while empty; always ends in a terminator */
  size_t length, room;
  bool failed;       /**< out of memory: what follows is dropped */
  ef_report *report; /**< borrowed; NULL: plain text */
  bool has_answer;
  char heading[120]; /**< of the report's section, which its tables show */
} text;

void text_add(text *t, const char *piece);
/** A terminator as part of the contents: texts one after another. */
void text_add_end(text *t);
void text_format(text *t, const char *format, ...) EF_PRINTF(2, 3);
/** Writes all of it; EF_NO_MEMORY when something was dropped. */
ef_status text_write(const text *t, ef_output *output, ef_error *error);
void text_free(text *t);
/** Begins a section where there is a report; nothing else. */
void text_section(text *t, const char *title);
/** Hands on to the report what text_add left; EF_NO_MEMORY when something was
 * dropped. */
ef_status text_flush(text *t, ef_error *error);
/** Adds `sentence` broken at blanks before column 79, `indent` blanks before
 * each line but the first, and a line end. */
void text_wrap(text *t, const char *sentence, size_t indent);

/** The same for a text that was put together; frees it. */
void text_paragraph(text *t, text *content, size_t indent);

/** One line of "what it is: this", with `content` wrapped beside the label.
 * Frees the content. */
void text_label(text *t, const char *label, text *content);

/** Columns on a terminal that a UTF-8 text takes (combining marks and wide
 * characters are not told apart). */
size_t text_columns(const char *bytes);

#define TABLE_MOST_COLUMNS 80

/** A table that fits its columns to their contents. */
typedef struct text_table {
  size_t n_columns;
  struct {
    const char *head[2]; /**< two lines: what, and its unit; borrowed */
    bool is_left;        /**< left-aligned: words */
    size_t width;
  } column[TABLE_MOST_COLUMNS];
  text cells; /**< one after another, each with its terminator */
  size_t n_cells;
} text_table;

/** A table with two blanks before each line. */
text_table table_new(void);
/** The next column; `line1` NULL: the head of the column before stands over
 * this one too. */
void table_column(text_table *t, const char *line1, const char *line2,
                  bool is_left);
/** The next cell, from left to right, row after row. */
void table_cell(text_table *t, const char *content);
void table_format(text_table *t, const char *format, ...) EF_PRINTF(2, 3);
/** A number with fixed decimals; "-" for NaN. */
void table_number(text_table *t, double value, int decimals);
/** Adds heads and rows to `out` and frees the table. */
void table_finish(text_table *t, text *out);

#endif
