/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

const char *ef_status_text(ef_status status) {
  switch (status) {
  case EF_OK:
    return "done";
  case EF_INVALID:
    return "invalid argument";
  case EF_NO_MEMORY:
    return "out of memory";
  case EF_UNREADABLE:
    return "cannot be read";
  case EF_MALFORMED:
    return "malformed input";
  case EF_UNKNOWN_NAME:
    return "unknown name";
  case EF_NO_ANSWER:
    return "no answer exists";
  case EF_UNWRITABLE:
    return "cannot be written";
  case EF_EXISTS:
    return "output exists";
  }
  return "unknown status";
}

const char *ef_version(void) {
  return EF_VERSION;
}

/* Bytes of a UTF-8 character that begins with `lead`. */
static size_t character_bytes(unsigned char lead) {
  if (lead >= 0xF0u)
    return 4;
  if (lead >= 0xE0u)
    return 3;
  return lead >= 0xC0u ? 2 : 1;
}

/* Ends `text`, of `length` bytes that filled its buffer, before a UTF-8
 * character that was cut in the middle. */
static void drop_cut_character(char *text, size_t length) {
  size_t start = length;
  while (start > 0 && ((unsigned char)text[start - 1] & 0xC0u) == 0x80u) {
    --start;
  }
  if (start == 0)
    return;
  --start;
  if (length - start < character_bytes((unsigned char)text[start]))
    text[start] = '\0';
}

/* Quoted input may hold line ends and escapes; a message is one line. */
static void blank_controls(char *text) {
  for (; *text != '\0'; ++text) {
    const unsigned char c = (unsigned char)*text;
    if (c < 0x20u || c == 0x7Fu)
      *text = '?';
  }
}

static void format_line(char *text, size_t size, const char *format,
                        va_list arguments) {
  const int wanted = vsnprintf(text, size, format, arguments);
  if (wanted < 0)
    text[0] = '\0';
  if (wanted >= 0 && (size_t)wanted >= size)
    drop_cut_character(text, size - 1);
  blank_controls(text);
}

static void copy_line(char *to, size_t size, const char *from) {
  const size_t length = strlen(from);
  const size_t kept = length < size ? length : size - 1;
  memcpy(to, from, kept);
  to[kept] = '\0';
  if (kept < length)
    drop_cut_character(to, kept);
  blank_controls(to);
}

ef_status ef__error_set(ef_error *error, ef_status status, const char *format,
                        ...) {
  if (error == NULL)
    return status;
  memset(error, 0, sizeof *error);
  error->status = status;
  va_list arguments;
  va_start(arguments, format);
  format_line(error->message, sizeof error->message, format, arguments);
  va_end(arguments);
  return status;
}

ef_status ef__error_place(ef_error *error, const char *file, size_t line,
                          size_t column, const char *field) {
  if (error == NULL)
    return EF_OK;
  if (file != NULL)
    copy_line(error->file, sizeof error->file, file);
  if (line != 0)
    error->line = line;
  if (column != 0)
    error->column = column;
  if (field != NULL)
    copy_line(error->field, sizeof error->field, field);
  return error->status;
}

ef_status ef__error_memory(ef_error *error, const char *purpose) {
  return ef__error_set(error, EF_NO_MEMORY, "out of memory for %s", purpose);
}

void ef__note(const ef_notes *notes, const char *format, ...) {
  if (notes == NULL || notes->write == NULL)
    return;
  char line[1024];
  va_list arguments;
  va_start(arguments, format);
  format_line(line, sizeof line, format, arguments);
  va_end(arguments);
  notes->write(notes->cookie, line);
}

void ef_error_describe(const ef_error *error, char *text, size_t size) {
  if (size == 0)
    return;
  char line[32] = "";
  char column[40] = "";
  if (error->line != 0)
    snprintf(line, sizeof line, "%zu: ", error->line);
  const bool has_field = error->field[0] != '\0';
  if (error->column != 0 && !has_field) {
    snprintf(column, sizeof column, "column %zu: ", error->column);
  }
  const bool has_file = error->file[0] != '\0';
  const char *message = error->message[0] != '\0'
                            ? error->message
                            : ef_status_text(error->status);
  const int wanted =
      snprintf(text, size, "%s%s%s%s%s%s%s%s", has_file ? error->file : "",
               !has_file         ? ""
               : line[0] != '\0' ? ":"
                                 : ": ",
               !has_file && line[0] != '\0' ? "line " : "", line, column,
               has_field ? "field " : "", error->field, has_field ? ": " : "");
  if (wanted < 0) {
    text[0] = '\0';
    return;
  }
  if ((size_t)wanted >= size) {
    drop_cut_character(text, size - 1);
    return;
  }
  copy_line(text + wanted, size - (size_t)wanted, message);
}
