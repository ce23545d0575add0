/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static char *read_text(const char *path) {
  FILE *file = fopen(path, "rb");
  if (file == NULL)
    fail_msg("cannot open %s", path);
  fseek(file, 0, SEEK_END);
  const long length = ftell(file);
  rewind(file);
  char *text = malloc((size_t)length + 1);
  if (text == NULL)
    fail_msg("no memory for %s", path);
  if (fread(text, 1, (size_t)length, file) != (size_t)length) {
    fail_msg("cannot read %s", path);
  }
  fclose(file);
  text[length] = '\0';
  return text;
}

static size_t count_char(const char *text, char wanted) {
  size_t n = 0;
  for (; *text != '\0'; ++text)
    n += *text == wanted;
  return n;
}

/* Cuts `line` at its commas into at most `room` cells; returns their number. */
static size_t split(char *line, char **cell, size_t room) {
  size_t n = 0;
  for (char *at = line; at != NULL;) {
    char *comma = strchr(at, ',');
    if (comma != NULL)
      *comma = '\0';
    if (n < room)
      cell[n] = at;
    ++n;
    at = comma != NULL ? comma + 1 : NULL;
  }
  return n;
}

static figures read_figures(const char *path) {
  figures f = {.text = read_text(path)};
  const size_t room = count_char(f.text, ',') + count_char(f.text, '\n') + 1;
  f.cell = malloc(room * sizeof *f.cell);
  if (f.cell == NULL)
    fail_msg("no memory for %s", path);
  size_t used = 0;
  for (char *line = strtok(f.text, "\n"); line; line = strtok(NULL, "\n")) {
    if (line[0] == '#')
      continue;
    const size_t n = split(line, f.cell + used, room - used);
    if (f.n_columns == 0)
      f.n_columns = n;
    if (n != f.n_columns)
      fail_msg("%s: ragged row '%s'", path, line);
    used += n;
  }
  if (used <= f.n_columns)
    fail_msg("%s: no rows", path);
  f.column = f.cell;
  f.cell += f.n_columns;
  f.n_rows = used / f.n_columns - 1;
  return f;
}

figures figures_read(const char *folder, const char *file) {
  const char *tests = getenv("EVENFIELD_TESTS");
  if (tests == NULL)
    fail_msg("EVENFIELD_TESTS names no folder");
  char path[1024];
  snprintf(path, sizeof path, "%s/%s/%s", tests, folder, file);
  return read_figures(path);
}

figures figures_reference(const char *file) {
  char path[1024];
  snprintf(path, sizeof path, "%s/surfaces/%s", getenv("EVENFIELD_REFERENCE"),
           file);
  return read_figures(path);
}

bool figures_no_reference(const char *what) {
  const char *folder = getenv("EVENFIELD_REFERENCE");
  if (folder != NULL && folder[0] != '\0')
    return false;
  printf("1..0 # SKIP EVENFIELD_REFERENCE is not set, %s are left out\n", what);
  return true;
}

void figures_free(figures *f) {
  free(f->column);
  free(f->text);
}

size_t figures_column(const figures *f, const char *column) {
  for (size_t c = 0; c < f->n_columns; ++c) {
    if (strcmp(f->column[c], column) == 0)
      return c;
  }
  fail_msg("no column %s", column);
  return 0;
}

const char *figures_text(const figures *f, size_t row, size_t column) {
  assert_true(row < f->n_rows && column < f->n_columns);
  return f->cell[row * f->n_columns + column];
}

double figures_number(const figures *f, size_t row, size_t column) {
  const char *text = figures_text(f, row, column);
  if (text[0] == '\0')
    return (double)NAN;
  char *end;
  const double value = strtod(text, &end);
  if (*end != '\0')
    fail_msg("'%s' is not a number", text);
  return value;
}

size_t figures_row(const figures *f, const char *name) {
  for (size_t r = 0; r < f->n_rows; ++r) {
    if (strcmp(figures_text(f, r, 0), name) == 0)
      return r;
  }
  fail_msg("no row %s", name);
  return 0;
}
