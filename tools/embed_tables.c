/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Turns files into C at build time, so that the library needs none of them
 * when it runs:
 *
 *   embed_tables OUT.c GROUP/NAME.csv...  -> src/spectrum/embedded_tables.h
 *   embed_tables --text OUT.c FILES...    -> src/exchange/embedded.h
 *
 * The name of a table is that of its file, its group that of the folder. What
 * is wrong with a table ends the build with "file:line: reason". The form of a
 * table: lines "# key: text", a header row that starts with wavelength_nm,
 * rows of numbers; an empty cell has no figure in the source and becomes 0. */
#include <errno.h>
#include <math.h>
#include <stdarg.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { TITLE, SOURCE, QUANTITY, RANGE, NOTE, RIGHTS, N_KEYS };

typedef struct header_key {
  const char *word;
  bool required; /* exactly once; the others as often as one likes */
} header_key;

static const header_key header_keys[N_KEYS] = {
    [TITLE] = {"title", true},       [SOURCE] = {"source", true},
    [QUANTITY] = {"quantity", true}, [RANGE] = {"range", true},
    [NOTE] = {"note", false},        [RIGHTS] = {"rights", false},
};

/* The longest string literal that every C17 compiler must take. */
#define LONGEST_LITERAL 4095

/* A list of pointers into the text of a file. */
typedef struct word_list {
  char **word;
  size_t count;
  size_t room;
} word_list;

typedef struct table {
  const char *path;
  char *text; /* the whole file, cut into strings */
  char *name;
  char *group;
  char *header[N_KEYS]; /* allocated; NULL until seen */
  size_t range_line;
  size_t header_row_line;
  word_list column;
  word_list cell; /* row by row */
} table;

/* ---- Refusing ---------------------------------------------------------- */

static _Noreturn void refuse(const char *path, size_t line, const char *format,
                             ...) {
  va_list arguments;
  va_start(arguments, format);
  if (line > 0)
    fprintf(stderr, "%s:%zu: ", path, line);
  else
    fprintf(stderr, "%s: ", path);
  vfprintf(stderr, format, arguments);
  fputc('\n', stderr);
  va_end(arguments);
  exit(EXIT_FAILURE);
}

static void *grow(void *memory, size_t size) {
  void *grown = realloc(memory, size);
  if (!grown) {
    fputs("embed_tables: out of memory\n", stderr);
    exit(EXIT_FAILURE);
  }
  return grown;
}

/* ---- Text and numbers -------------------------------------------------- */

static char *copy_text(const char *text, size_t length) {
  char *copy = grow(NULL, length + 1);
  memcpy(copy, text, length);
  copy[length] = '\0';
  return copy;
}

static void list_add(word_list *list, char *word) {
  if (list->count == list->room) {
    list->room = list->room ? 2 * list->room : 64;
    list->word = grow(list->word, list->room * sizeof *list->word);
  }
  list->word[list->count++] = word;
}

static char lower(char c) {
  return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

/* The library finds names without regard to case, so they must differ so. */
static bool same_name(const char *a, const char *b) {
  while (*a && lower(*a) == lower(*b)) {
    a++;
    b++;
  }
  return lower(*a) == lower(*b);
}

static bool is_digit(char c) {
  return c >= '0' && c <= '9';
}

static size_t digits(const char *text) {
  size_t n = 0;
  while (is_digit(text[n]))
    n++;
  return n;
}

/* True for a finite decimal number: sign, digits, point, exponent. Every such
 * text is a C constant as it stands once it has a point or an exponent. */
static bool is_number(const char *text) {
  const char *at = text;
  at += *at == '-' || *at == '+';
  size_t n = digits(at);
  at += n;
  if (*at == '.') {
    size_t decimals = digits(at + 1);
    n += decimals;
    at += 1 + decimals;
  }
  if (n == 0)
    return false;
  if (*at == 'e' || *at == 'E') {
    at++;
    at += *at == '-' || *at == '+';
    if (digits(at) == 0)
      return false;
    at += digits(at);
  }
  return *at == '\0' && isfinite(strtod(text, NULL));
}

static const char *base_name(const char *path) {
  const char *slash = strrchr(path, '/');
  return slash ? slash + 1 : path;
}

/* ---- Reading ----------------------------------------------------------- */

/* The whole file with a zero behind it. */
static char *read_file(const char *path, size_t *length) {
  FILE *file = fopen(path, "rb");
  if (!file)
    refuse(path, 0, "cannot be opened: %s", strerror(errno));
  char *text = NULL;
  size_t used = 0, room = 0, got;
  do {
    room = room ? 2 * room : 65536;
    text = grow(text, room);
    got = fread(text + used, 1, room - 1 - used, file);
    used += got;
  } while (used == room - 1);
  if (ferror(file))
    refuse(path, 0, "cannot be read: %s", strerror(errno));
  fclose(file);
  text[used] = '\0';
  *length = used;
  return text;
}

/* Cuts the next line off `*rest`, without its end; NULL after the last. */
static char *next_line(char **rest) {
  char *line = *rest;
  if (*line == '\0')
    return NULL;
  char *end = strchr(line, '\n');
  *rest = end ? end + 1 : line + strlen(line);
  if (end)
    *end = '\0';
  size_t length = strlen(line);
  if (length > 0 && line[length - 1] == '\r')
    line[length - 1] = '\0';
  return line;
}

/* Cuts a line at its commas. */
static void split_cells(char *line, word_list *cells) {
  char *cell = line;
  for (char *comma; (comma = strchr(cell, ',')); cell = comma + 1) {
    *comma = '\0';
    list_add(cells, cell);
  }
  list_add(cells, cell);
}

static void read_name(table *t) {
  const char *file = base_name(t->path);
  const char *ending = strrchr(file, '.');
  if (!ending || strcmp(ending, ".csv") != 0 || ending == file)
    refuse(t->path, 0, "a table must be a file NAME.csv");
  t->name = copy_text(file, (size_t)(ending - file));
  for (const char *c = t->name; *c; c++)
    if (!is_digit(*c) && *c != '-' && *c != '.' && !(*c >= 'a' && *c <= 'z'))
      refuse(t->path, 0, "a table name has only a-z, 0-9, '-' and '.'");
  if (file == t->path)
    refuse(t->path, 0, "no folder in the path to take the group from");
  char *folder = copy_text(t->path, (size_t)(file - t->path - 1));
  const char *group = base_name(folder);
  t->group = copy_text(group, strlen(group));
  free(folder);
}

static size_t find_key(const char *word, size_t length) {
  size_t k = 0;
  while (k < N_KEYS && (strlen(header_keys[k].word) != length ||
                        memcmp(header_keys[k].word, word, length) != 0))
    k++;
  return k;
}

/* A line "# key: text" above the header row. */
static void read_comment(table *t, size_t line_number, const char *line) {
  if (t->header_row_line)
    refuse(t->path, line_number, "a '#' line below the header row");
  const char *colon = strchr(line, ':');
  if (strncmp(line, "# ", 2) != 0 || !colon)
    refuse(t->path, line_number, "a '#' line must read '# key: text'");
  size_t length = (size_t)(colon - line - 2);
  size_t k = find_key(line + 2, length);
  if (k == N_KEYS)
    refuse(t->path, line_number,
           "unknown key '%.*s'; known are title, source, quantity, range, "
           "note, rights",
           (int)length, line + 2);
  const char *text = colon + 1;
  while (*text == ' ')
    text++;
  if (*text == '\0')
    refuse(t->path, line_number, "'# %s:' has no text", header_keys[k].word);
  if (t->header[k] && header_keys[k].required)
    refuse(t->path, line_number, "a second '# %s:'", header_keys[k].word);
  size_t before = t->header[k] ? strlen(t->header[k]) + 1 : 0;
  if (before + strlen(text) > LONGEST_LITERAL)
    refuse(t->path, line_number, "'# %s:' is longer than %d characters",
           header_keys[k].word, LONGEST_LITERAL);
  t->header[k] = grow(t->header[k], before + strlen(text) + 1);
  if (before)
    t->header[k][before - 1] = '\n';
  strcpy(t->header[k] + before, text);
  if (k == RANGE)
    t->range_line = line_number;
}

static void read_header_row(table *t, size_t line_number, char *line) {
  t->header_row_line = line_number;
  for (size_t k = 0; k < N_KEYS; k++)
    if (header_keys[k].required && !t->header[k])
      refuse(t->path, line_number, "no '# %s:' line above the header row",
             header_keys[k].word);
  split_cells(line, &t->column);
  if (strcmp(t->column.word[0], "wavelength_nm") != 0)
    refuse(t->path, line_number, "the first column is '%s', not wavelength_nm",
           t->column.word[0]);
  if (t->column.count < 2)
    refuse(t->path, line_number, "no column beside wavelength_nm");
  for (size_t i = 0; i < t->column.count; i++) {
    if (t->column.word[i][0] == '\0')
      refuse(t->path, line_number, "column %zu has no name", i + 1);
    for (size_t j = 0; j < i; j++)
      if (same_name(t->column.word[i], t->column.word[j]))
        refuse(t->path, line_number, "columns %zu and %zu are both named '%s'",
               j + 1, i + 1, t->column.word[i]);
  }
}

static void read_row(table *t, size_t line_number, char *line) {
  size_t first = t->cell.count, n_columns = t->column.count;
  split_cells(line, &t->cell);
  size_t n_cells = t->cell.count - first;
  if (n_cells != n_columns)
    refuse(t->path, line_number, "%zu cells where the header row has %zu",
           n_cells, n_columns);
  char **cell = t->cell.word + first;
  for (size_t i = 0; i < n_columns; i++)
    if (!is_number(cell[i]) && (i == 0 || cell[i][0] != '\0'))
      refuse(t->path, line_number, "column %s: '%s' is not a number",
             t->column.word[i], cell[i]);
  if (strtod(cell[0], NULL) <= 0)
    refuse(t->path, line_number, "wavelength %s is not above zero", cell[0]);
  if (first > 0) {
    const char *previous = t->cell.word[first - n_columns];
    if (strtod(cell[0], NULL) <= strtod(previous, NULL))
      refuse(t->path, line_number,
             "wavelength %s after %s: wavelengths must increase", cell[0],
             previous);
  }
}

static double wavelength(const table *t, size_t row) {
  return strtod(t->cell.word[row * t->column.count], NULL);
}

/* "A to B nm, step S nm, N rows", or without the step for uneven tables: what
 * the header claims must be what the rows are, so that a lost row shows. */
static void check_range(const table *t) {
  double from = 0, to = 0, step = 0;
  size_t n_rows = 0, count = t->cell.count / t->column.count;
  int end = -1;
  sscanf(t->header[RANGE], "%lf to %lf nm, step %lf nm, %zu rows%n", &from, &to,
         &step, &n_rows, &end);
  if (end < 0) {
    step = 0;
    sscanf(t->header[RANGE], "%lf to %lf nm, %zu rows%n", &from, &to, &n_rows,
           &end);
  }
  if (end < 0 || t->header[RANGE][end] != '\0')
    refuse(t->path, t->range_line,
           "a range must read 'A to B nm, step S nm, N rows' or "
           "'A to B nm, N rows'");
  if (n_rows != count || from != wavelength(t, 0) ||
      to != wavelength(t, count - 1))
    refuse(t->path, t->range_line,
           "the rows are %s to %s nm, %zu rows: not what the range says",
           t->cell.word[0], t->cell.word[(count - 1) * t->column.count], count);
  for (size_t i = 1; i < count && step > 0; i++)
    if (fabs(wavelength(t, i) - wavelength(t, i - 1) - step) > 1e-9 * to)
      refuse(t->path, t->header_row_line + 1 + i,
             "the step from %s nm is not the %g nm of the range",
             t->cell.word[(i - 1) * t->column.count], step);
}

/* A zero byte would hide the rest of its line. */
static void check_bytes(const table *t, size_t length) {
  if (length == 0)
    refuse(t->path, 0, "the file is empty");
  size_t line_number = 1;
  for (size_t i = 0; i < length; i++) {
    if (t->text[i] == '\0')
      refuse(t->path, line_number, "a zero byte");
    line_number += t->text[i] == '\n';
  }
}

static void read_table(table *t, const char *path) {
  *t = (table){.path = path};
  read_name(t);
  size_t length, line_number = 0;
  t->text = read_file(path, &length);
  check_bytes(t, length);
  char *rest = t->text;
  for (char *line; (line = next_line(&rest));) {
    line_number++;
    if (line[0] == '#')
      read_comment(t, line_number, line);
    else if (line[0] == '\0')
      refuse(path, line_number, "an empty line");
    else if (!t->header_row_line)
      read_header_row(t, line_number, line);
    else
      read_row(t, line_number, line);
  }
  if (!t->header_row_line)
    refuse(path, line_number, "the file ends before a header row");
  if (t->cell.count == 0)
    refuse(path, line_number, "no row below the header row");
  check_range(t);
}

static void free_table(table *t) {
  for (size_t k = 0; k < N_KEYS; k++)
    free(t->header[k]);
  free(t->column.word);
  free(t->cell.word);
  free(t->name);
  free(t->group);
  free(t->text);
}

/* ---- Writing ----------------------------------------------------------- */

/* A C string literal, whatever bytes the text has. */
static void write_string(FILE *out, const char *text) {
  fputc('"', out);
  for (const char *at = text ? text : ""; *at; at++) {
    unsigned char c = (unsigned char)*at;
    if (c < ' ' || c > '~' || c == '"' || c == '\\' || c == '?')
      fprintf(out, "\\%03o", c);
    else
      fputc(c, out);
  }
  fputc('"', out);
}

static void write_columns(FILE *out, size_t index, const table *t) {
  fprintf(out, "static const char *const column_%zu[] = {\n", index);
  for (size_t i = 0; i < t->column.count; i++) {
    fputs("  ", out);
    write_string(out, t->column.word[i]);
    fputs(",\n", out);
  }
  fputs("};\n\n", out);
}

/* The figures stay as they are typed; the compiler converts them. */
static void write_values(FILE *out, size_t index, const table *t) {
  size_t n_columns = t->column.count, n_rows = t->cell.count / n_columns;
  fprintf(out, "static const double value_%zu[] = {", index);
  for (size_t c = 0; c < n_columns; c++)
    for (size_t r = 0; r < n_rows; r++) {
      const char *cell = t->cell.word[r * n_columns + c];
      const char *point = strpbrk(cell, ".eE") ? "" : ".0";
      fprintf(out, "%s%s%s,", r % 8 ? " " : "\n  ", cell[0] ? cell : "0",
              point);
    }
  fputs("\n};\n\n", out);
}

static void write_entry(FILE *out, size_t index, const table *t) {
  const struct {
    const char *member, *text;
  } texts[] = {
      {"name", t->name},
      {"group", t->group},
      {"title", t->header[TITLE]},
      {"source", t->header[SOURCE]},
      {"quantity", t->header[QUANTITY]},
      {"note", t->header[NOTE]},
      {"rights", t->header[RIGHTS]},
  };
  fputs("  {\n", out);
  for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
    fprintf(out, "    .%s = ", texts[i].member);
    write_string(out, texts[i].text);
    fputs(",\n", out);
  }
  fprintf(out,
          "    .n_rows = %zu,\n    .n_columns = %zu,\n"
          "    .column = column_%zu,\n    .value = value_%zu,\n  },\n",
          t->cell.count / t->column.count, t->column.count, index, index);
}

static void write_names(FILE *out, size_t n, const table *tables) {
  fputs("const char *const ef__table_names[] = {\n", out);
  for (size_t i = 0; i < n; i++) {
    fputs("  ", out);
    write_string(out, tables[i].name);
    fputs(",\n", out);
  }
  fputs("};\n", out);
}

static FILE *open_output(const char *path) {
  FILE *out = fopen(path, "wb");
  if (!out)
    refuse(path, 0, "cannot be written: %s", strerror(errno));
  fputs("/* Made by tools/embed_tables. */\n", out);
  return out;
}

static void close_output(FILE *out, const char *path) {
  bool bad = ferror(out) != 0;
  if (fclose(out) != 0 || bad) {
    remove(path);
    refuse(path, 0, "cannot be written whole");
  }
}

/* ---- The two modes ----------------------------------------------------- */

static int by_group_and_name(const void *a, const void *b) {
  const table *x = a, *y = b;
  int order = strcmp(x->group, y->group);
  return order ? order : strcmp(x->name, y->name);
}

static void check_names(const table *tables, size_t n) {
  for (size_t i = 0; i < n; i++)
    for (size_t j = 0; j < i; j++)
      if (same_name(tables[i].name, tables[j].name))
        refuse(tables[i].path, 1, "the name '%s' is taken by %s",
               tables[i].name, tables[j].path);
}

static void embed_tables(const char *out_path, size_t n, char *const *paths) {
  table *tables = grow(NULL, n * sizeof *tables);
  for (size_t i = 0; i < n; i++)
    read_table(&tables[i], paths[i]);
  check_names(tables, n);
  qsort(tables, n, sizeof *tables, by_group_and_name);
  FILE *out = open_output(out_path);
  fputs("#include \"spectrum/embedded_tables.h\"\n\n", out);
  for (size_t i = 0; i < n; i++) {
    write_columns(out, i, &tables[i]);
    write_values(out, i, &tables[i]);
  }
  fputs("const ef_table ef__tables[] = {\n", out);
  for (size_t i = 0; i < n; i++)
    write_entry(out, i, &tables[i]);
  fprintf(out, "};\n\nconst size_t ef__table_count = %zu;\n\n", n);
  write_names(out, n, tables);
  close_output(out, out_path);
  for (size_t i = 0; i < n; i++)
    free_table(&tables[i]);
  free(tables);
}

static int by_base_name(const void *a, const void *b) {
  return strcmp(base_name(*(char *const *)a), base_name(*(char *const *)b));
}

/* An array of bytes, since a literal may not be longer than 4095 characters.
 * Returns the length of the file. */
static size_t write_bytes(FILE *out, size_t index, const char *path) {
  size_t length;
  char *text = read_file(path, &length);
  fprintf(out, "static const unsigned char text_%zu[] = {", index);
  for (size_t i = 0; i <= length; i++)
    fprintf(out, "%s%d,", i % 20 ? "" : "\n  ", (unsigned char)text[i]);
  fputs("\n};\n\n", out);
  free(text);
  return length;
}

static void embed_texts(const char *out_path, size_t n, char **paths) {
  qsort(paths, n, sizeof *paths, by_base_name);
  for (size_t i = 1; i < n; i++)
    if (by_base_name(&paths[i - 1], &paths[i]) == 0)
      refuse(paths[i], 1, "the name '%s' is taken by %s", base_name(paths[i]),
             paths[i - 1]);
  size_t *length = grow(NULL, n * sizeof *length);
  FILE *out = open_output(out_path);
  fputs("#include \"exchange/embedded.h\"\n\n", out);
  for (size_t i = 0; i < n; i++)
    length[i] = write_bytes(out, i, paths[i]);
  fputs("const ef__embedded_text ef__demo_files[] = {\n", out);
  for (size_t i = 0; i < n; i++) {
    fputs("  {", out);
    write_string(out, base_name(paths[i]));
    fprintf(out, ", (const char *)text_%zu, %zu},\n", i, length[i]);
  }
  fprintf(out, "};\n\nconst size_t ef__demo_file_count = %zu;\n\n", n);
  fputs("const char *const ef__demo_names[] = {\n", out);
  for (size_t i = 0; i < n; i++) {
    char *name = copy_text(base_name(paths[i]), strlen(base_name(paths[i])));
    char *ending = strrchr(name, '.');
    if (ending && ending > name)
      *ending = '\0';
    fputs("  ", out);
    write_string(out, name);
    fputs(",\n", out);
    free(name);
  }
  fputs("};\n", out);
  close_output(out, out_path);
  free(length);
}

int main(int argc, char **argv) {
  bool as_text = argc > 1 && strcmp(argv[1], "--text") == 0;
  int first = as_text ? 2 : 1;
  if (argc < first + 2) {
    fputs("usage: embed_tables [--text] OUT.c FILES...\n", stderr);
    return 2;
  }
  size_t n = (size_t)(argc - first - 1);
  if (as_text)
    embed_texts(argv[first], n, argv + first + 1);
  else
    embed_tables(argv[first], n, argv + first + 1);
  return 0;
}
