/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tables in the text form of CGATS.17 and ISO 28178: a preamble of keywords,
 * the names of the fields, and items that are cut into rows by their number,
 * wherever the lines end. The file is held whole, so that all of it is checked
 * before the first row comes. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Bytes of a file; the largest targets have some 1 MB. */
#define MOST_BYTES ((size_t)256 << 20)
/* Above this the largest value of spectra tells that they are percent. */
static const double largest_ratio = 2;

struct ef__cgats {
  const char *at, *end; /* of the data still to come */
  size_t line;          /* of `at` */
  size_t n_items;       /* of a row */
  size_t n_rows, row;
  size_t *column; /* of each item, SIZE_MAX: a wavelength */
  double *wavelength_nm; /* of such items */
  size_t n_columns;
};

/* ---- Words ------------------------------------------------------------- */

typedef struct scanner {
  ef__records *records; /* for messages */
  const char *at, *end;
  size_t line;
  /* The last word. */
  ef__span word;
  size_t word_line;
  bool is_quoted;
  bool starts_line; /* nothing stands before it in its line */
} scanner;

static ef_status refuse(const scanner *s, size_t line, ef_error *error,
                        const char *format, ...) EF_PRINTF(4, 5);

static ef_status refuse(const scanner *s, size_t line, ef_error *error,
                        const char *format, ...) {
  char message[400];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  ef__error_set(error, EF_MALFORMED, "%s", message);
  ef__error_place(error, s->records->input->name, line, 0, NULL);
  return EF_MALFORMED;
}

static bool is_blank(char c) {
  return c == ' ' || c == '\t' || c == '\r' || c == '\n' || c == '\f' ||
         c == '\v';
}

/* Blanks, line ends and comments; true when a line began on the way. */
static bool skip_blanks(scanner *s) {
  bool is_new_line = s->at == s->end ? false : s->line == 0;
  if (s->line == 0) s->line = 1;
  while (s->at < s->end) {
    if (*s->at == '#') {
      const char *const feed = memchr(s->at, '\n', (size_t)(s->end - s->at));
      s->at = feed != NULL ? feed : s->end;
    } else if (is_blank(*s->at)) {
      if (*s->at == '\n') {
        ++s->line;
        is_new_line = true;
      }
      ++s->at;
    } else {
      break;
    }
  }
  return is_new_line;
}

/* The next word; an empty span without text at the end. */
static ef_status next_word(scanner *s, ef_error *error) {
  s->starts_line = skip_blanks(s);
  s->word = (ef__span){NULL, 0};
  s->word_line = s->line;
  s->is_quoted = s->at < s->end && *s->at == '"';
  if (s->at == s->end) return EF_OK;
  if (s->is_quoted) {
    const char *const from = ++s->at;
    const char *const quote = memchr(from, '"', (size_t)(s->end - from));
    const char *const feed = memchr(from, '\n', (size_t)(s->end - from));
    if (quote == NULL || (feed != NULL && feed < quote)) {
      return refuse(s, s->line, error,
                    "a quote is opened and not closed in its line; close it");
    }
    s->word = (ef__span){from, (size_t)(quote - from)};
    s->at = quote + 1;
    return EF_OK;
  }
  const char *const from = s->at;
  while (s->at < s->end && !is_blank(*s->at) && *s->at != '#' &&
         *s->at != '"') {
    ++s->at;
  }
  s->word = (ef__span){from, (size_t)(s->at - from)};
  return EF_OK;
}

static bool is_word(const scanner *s, const char *text) {
  return !s->is_quoted && s->word.length == strlen(text) &&
         memcmp(s->word.text, text, s->word.length) == 0;
}

/* ---- Whether it is one ------------------------------------------------- */

static bool starts_with(const char *at, const char *end, const char *text) {
  const size_t length = strlen(text);
  return (size_t)(end - at) >= length && memcmp(at, text, length) == 0;
}

/* By the identifier that the standards give, or by a line that starts the field
 * names in what has been read so far. */
bool ef__cgats_is_one(const ef__input *input) {
  static const char *const marks[] = {"CGATS", "ISO28178", "ISO28178-",
                                      "IT8.7/", "IT8/7."};
  const char *const begin = input->buffer + input->begin;
  const char *const end = input->buffer + input->end;
  for (size_t i = 0; i < sizeof marks / sizeof *marks; ++i) {
    if (starts_with(begin, end, marks[i])) return true;
  }
  for (const char *at = begin; at != NULL && at < end;) {
    while (at < end && (*at == ' ' || *at == '\t')) ++at;
    if (starts_with(at, end, "BEGIN_DATA_FORMAT")) return true;
    at = memchr(at, '\n', (size_t)(end - at));
    if (at != NULL) ++at;
  }
  return false;
}

/* ---- Names of fields --------------------------------------------------- */

typedef struct field_name {
  const char *theirs, *ours;
} field_name;

static const field_name field_names[] = {
    {"CMYK_C", "cyan"},    {"CMYK_M", "magenta"}, {"CMYK_Y", "yellow"},
    {"CMYK_K", "black"},   {"CMY_C", "cyan"},     {"CMY_M", "magenta"},
    {"CMY_Y", "yellow"},   {"RGB_R", "red"},      {"RGB_G", "green"},
    {"RGB_B", "blue"},     {"XYZ_X", "X"},        {"XYZ_Y", "Y"},
    {"XYZ_Z", "Z"},        {"XYY_X", "x"},        {"XYY_Y", "y"},
    {"XYY_CAPY", "Y"},     {"LAB_L", "L"},        {"LAB_A", "a"},
    {"LAB_B", "b"},        {"SAMPLE_NAME", "name"},
};

/* 380 of SPECTRAL_NM380, SPECTRAL_NM_380, NM380, nm_380, SPECTRAL_380, SPEC_380
 * and 380; an empty span for other names. */
static ef__span wavelength_text(ef__span name) {
  static const char *const before[] = {"SPECTRAL_NM_", "SPECTRAL_NM",
                                       "SPECTRAL_",    "SPEC_",
                                       "NM_",          "NM",
                                       "nm_",          "nm",
                                       ""};
  for (size_t i = 0; i < sizeof before / sizeof *before; ++i) {
    const size_t length = strlen(before[i]);
    if (name.length <= length || memcmp(name.text, before[i], length) != 0) {
      continue;
    }
    const ef__span rest = {name.text + length, name.length - length};
    double value;
    if (ef_number_parse(rest.text, rest.length, '.', &value)) return rest;
  }
  return (ef__span){NULL, 0};
}

static bool span_is(ef__span span, const char *text) {
  return span.length == strlen(text) &&
         memcmp(span.text, text, span.length) == 0;
}

static ef__span our_name(ef__span theirs) {
  for (size_t i = 0; i < sizeof field_names / sizeof *field_names; ++i) {
    if (span_is(theirs, field_names[i].theirs)) {
      return ef__span_of(field_names[i].ours);
    }
  }
  const ef__span wavelength = wavelength_text(theirs);
  return wavelength.text != NULL ? wavelength : theirs;
}

/* ---- The preamble ------------------------------------------------------ */

/* What the file says before its data. */
typedef struct preamble {
  size_t n_fields, fields_line; /* 0: not said */
  size_t n_sets, sets_line;     /* SIZE_MAX: not said */
  ef__span *name;
  size_t n_names, name_room, format_line;
  ef__span title, illuminant, observer, device_max;
  size_t device_max_line;
} preamble;

static ef_status read_count(scanner *s, const char *keyword, size_t *count,
                            ef_error *error) {
  char quoted[EF__QUOTED];
  double value;
  ef_status status = next_word(s, error);
  if (status != EF_OK) return status;
  if (s->word.text != NULL &&
      ef_number_parse(s->word.text, s->word.length, '.', &value) &&
      value >= 0 && value <= 1e9 && value == floor(value)) {
    *count = (size_t)value;
    return EF_OK;
  }
  return refuse(s, s->word_line, error,
                "%s is followed by %s, expected a whole number", keyword,
                s->word.text != NULL ? ef__quote(s->word, quoted)
                                     : "the end of the file");
}

static ef_status add_name(scanner *s, preamble *p, ef_error *error) {
  if (p->n_names == EF__MOST_COLUMNS) {
    return refuse(s, s->word_line, error,
                  "there are more than %zu fields; split the file",
                  EF__MOST_COLUMNS);
  }
  if (p->n_names == p->name_room) {
    const size_t room = p->name_room > 0 ? 2 * p->name_room : 64;
    ef__span *const grown = ef__reallocate(p->name, room, sizeof *p->name);
    if (grown == NULL) return ef__error_memory(error, "the fields");
    p->name = grown;
    p->name_room = room;
  }
  p->name[p->n_names++] = s->word;
  return EF_OK;
}

static ef_status read_format(scanner *s, preamble *p, ef_error *error) {
  p->format_line = s->word_line;
  for (;;) {
    ef_status status = next_word(s, error);
    if (status != EF_OK) return status;
    if (s->word.text == NULL || is_word(s, "BEGIN_DATA")) {
      return refuse(s, p->format_line, error,
                    "BEGIN_DATA_FORMAT is not closed; add END_DATA_FORMAT "
                    "behind the names of the fields");
    }
    if (is_word(s, "END_DATA_FORMAT")) break;
    status = add_name(s, p, error);
    if (status != EF_OK) return status;
  }
  if (p->n_names == 0) {
    return refuse(s, p->format_line, error,
                  "there are no field names between BEGIN_DATA_FORMAT and "
                  "END_DATA_FORMAT");
  }
  return EF_OK;
}

/* The rest of the line of a keyword: its first word is the value. */
static ef_status read_value(scanner *s, ef__span *value, ef_error *error) {
  const size_t line = s->word_line;
  const scanner before = *s;
  const ef_status status = next_word(s, error);
  if (status != EF_OK) return status;
  if (s->word.text != NULL && s->word_line == line) {
    if (value->text == NULL) *value = s->word;
  } else {
    *s = before;
  }
  return EF_OK;
}

/* What stands behind the key of a WEIGHTING_FUNCTION, such as `ILLUMINANT,
 * D50`. */
static void weighting(const char *key, ef__span value, ef__span *kept) {
  const size_t length = strlen(key);
  if (value.text == NULL || value.length <= length ||
      memcmp(value.text, key, length) != 0) {
    return;
  }
  *kept = ef__span_trim(
      (ef__span){value.text + length, value.length - length});
}

static ef_status read_keyword(scanner *s, preamble *p, ef_error *error) {
  ef__span ignored = {NULL, 0};
  if (is_word(s, "NUMBER_OF_FIELDS")) {
    p->fields_line = s->word_line;
    return read_count(s, "NUMBER_OF_FIELDS", &p->n_fields, error);
  }
  if (is_word(s, "NUMBER_OF_SETS")) {
    p->sets_line = s->word_line;
    return read_count(s, "NUMBER_OF_SETS", &p->n_sets, error);
  }
  if (is_word(s, "BEGIN_DATA_FORMAT")) return read_format(s, p, error);
  if (!s->starts_line) return EF_OK;
  if (is_word(s, "FILE_DESCRIPTOR") || is_word(s, "DESCRIPTOR") ||
      is_word(s, "TABLE_DESCRIPTOR")) {
    return read_value(s, &p->title, error);
  }
  if (is_word(s, "ILLUMINANT")) return read_value(s, &p->illuminant, error);
  if (is_word(s, "OBSERVER")) return read_value(s, &p->observer, error);
  if (is_word(s, "DEVICE_MAX")) {
    p->device_max_line = s->word_line;
    return read_value(s, &p->device_max, error);
  }
  if (is_word(s, "WEIGHTING_FUNCTION")) {
    const ef_status status = read_value(s, &ignored, error);
    weighting("ILLUMINANT,", ignored, &p->illuminant);
    weighting("OBSERVER,", ignored, &p->observer);
    return status;
  }
  return EF_OK;
}

static ef_status check_preamble(const scanner *s, const preamble *p,
                                ef_error *error) {
  if (p->n_names == 0) {
    return refuse(s, s->word_line, error,
                  "BEGIN_DATA stands before any names of fields; add "
                  "BEGIN_DATA_FORMAT, the names and END_DATA_FORMAT");
  }
  if (p->fields_line > 0 && p->n_fields != p->n_names) {
    return refuse(s, p->fields_line, error,
                  "NUMBER_OF_FIELDS says %zu, and %zu names follow "
                  "BEGIN_DATA_FORMAT; correct one of the two",
                  p->n_fields, p->n_names);
  }
  return EF_OK;
}

/* To the word behind BEGIN_DATA. */
static ef_status read_preamble(scanner *s, preamble *p, ef_error *error) {
  p->n_sets = SIZE_MAX;
  for (;;) {
    ef_status status = next_word(s, error);
    if (status != EF_OK) return status;
    if (s->word.text == NULL) {
      return refuse(s, s->word_line, error,
                    "the file ends before BEGIN_DATA; expected the names of "
                    "the fields and a table of data");
    }
    if (is_word(s, "BEGIN_DATA")) return check_preamble(s, p, error);
    status = read_keyword(s, p, error);
    if (status != EF_OK) return status;
  }
}

/* ---- The data, checked ------------------------------------------------- */

/* What a first pass over the data tells. */
typedef struct survey {
  size_t n_rows;
  double most_spectral, most_rgb;
  size_t other_line; /* of a further table, 0: none */
} survey;

static bool is_spectral(ef__span name) {
  return wavelength_text(name).text != NULL || span_is(name, "SPECTRAL_DEC") ||
         span_is(name, "SPECTRAL_PCT");
}

static void note_value(const preamble *p, survey *found, size_t item,
                       ef__span word) {
  const ef__span name = p->name[item];
  double value;
  const bool is_rgb = name.length == 5 && memcmp(name.text, "RGB_", 4) == 0;
  if (!is_rgb && !is_spectral(name)) return;
  if (!ef_number_parse(word.text, word.length, '.', &value)) return;
  if (is_rgb) {
    found->most_rgb = fmax(found->most_rgb, value);
  } else {
    found->most_spectral = fmax(found->most_spectral, value);
  }
}

static ef_status survey_data(scanner s, const preamble *p, survey *found,
                             ef_error *error) {
  size_t item = 0;
  size_t row_line = s.line;
  *found = (survey){0};
  for (;;) {
    ef_status status = next_word(&s, error);
    if (status != EF_OK) return status;
    if (s.word.text == NULL) {
      return refuse(&s, s.word_line, error,
                    "the file ends inside its data, %zu rows behind "
                    "BEGIN_DATA; expected END_DATA: is it cut off?",
                    found->n_rows);
    }
    if (is_word(&s, "END_DATA")) break;
    if (item == 0) row_line = s.word_line;
    note_value(p, found, item, s.word);
    if (++item < p->n_names) continue;
    item = 0;
    ++found->n_rows;
  }
  if (item > 0) {
    return refuse(&s, row_line, error,
                  "the last row has %zu items, expected %zu as there are "
                  "fields; an item is missing or too many in some row",
                  item, p->n_names);
  }
  if (p->n_sets != SIZE_MAX && p->n_sets != found->n_rows) {
    return refuse(&s, p->sets_line, error,
                  "NUMBER_OF_SETS says %zu, and the data have %zu rows of %zu "
                  "items; correct one of the two",
                  p->n_sets, found->n_rows, p->n_names);
  }
  const ef_status status = next_word(&s, error);
  if (status == EF_OK && s.word.text != NULL) found->other_line = s.word_line;
  return status;
}

static bool has_field(const preamble *p, const char *name) {
  for (size_t i = 0; i < p->n_names; ++i) {
    if (span_is(p->name[i], name)) return true;
  }
  return false;
}

/* ---- Columns ----------------------------------------------------------- */

/* Pairs of a wavelength and a value: the first row gives the names. */
static ef_status read_wavelengths(scanner s, const preamble *p,
                                  ef__cgats *cgats, ef_error *error) {
  for (size_t i = 0; i < p->n_names; ++i) {
    const ef_status status = next_word(&s, error);
    if (status != EF_OK) return status;
    cgats->wavelength_nm[i] = (double)NAN;
    if (!span_is(p->name[i], "SPECTRAL_NM")) continue;
    const bool has_value =
        i + 1 < p->n_names && (span_is(p->name[i + 1], "SPECTRAL_PCT") ||
                               span_is(p->name[i + 1], "SPECTRAL_DEC"));
    if (!has_value) {
      return refuse(&s, p->format_line, error,
                    "field %zu is SPECTRAL_NM, expected SPECTRAL_PCT or "
                    "SPECTRAL_DEC behind it",
                    i + 1);
    }
    if (!ef_number_parse(s.word.text, s.word.length, '.',
                         &cgats->wavelength_nm[i])) {
      char quoted[EF__QUOTED];
      return refuse(&s, s.word_line, error,
                    "found %s, expected a wavelength in nm",
                    ef__quote(s.word, quoted));
    }
  }
  return EF_OK;
}

/* Name of item i among the columns; `number` has room for a wavelength. */
static ef__span column_name(const preamble *p, const ef__cgats *cgats, size_t i,
                            bool has_names, char number[EF_NUMBER_TEXT]) {
  const bool has_xyz = has_field(p, "XYZ_Y");
  if (i > 0 && !isnan(cgats->wavelength_nm[i - 1])) {
    ef_number_format(cgats->wavelength_nm[i - 1], number);
    return ef__span_of(number);
  }
  if (!has_names && span_is(p->name[i], "SAMPLE_ID")) {
    return ef__span_of("name");
  }
  /* Beside X, Y, Z the others go under their own names. */
  if (has_xyz && p->name[i].length > 4 &&
      memcmp(p->name[i].text, "XYY_", 4) == 0) {
    return p->name[i];
  }
  return our_name(p->name[i]);
}

static ef_status name_columns(const preamble *p, ef__cgats *cgats,
                              ef__table *table, ef_error *error) {
  char number[EF_NUMBER_TEXT];
  const bool has_names = has_field(p, "SAMPLE_NAME");
  size_t n = 0, n_bytes = 0;
  for (size_t i = 0; i < p->n_names; ++i) {
    if (!isnan(cgats->wavelength_nm[i])) {
      cgats->column[i] = SIZE_MAX;
      continue;
    }
    cgats->column[i] = n++;
    n_bytes += column_name(p, cgats, i, has_names, number).length + 1;
  }
  char *text;
  const ef__part parts[] = {{&table->column, n, sizeof *table->column},
                            {&text, n_bytes, 1}};
  if (ef__allocate_block(2, parts) == NULL) {
    return ef__error_memory(error, "the fields");
  }
  for (size_t i = 0; i < p->n_names; ++i) {
    if (cgats->column[i] == SIZE_MAX) continue;
    const ef__span name = column_name(p, cgats, i, has_names, number);
    table->column[cgats->column[i]] = text;
    memcpy(text, name.text, name.length);
    text[name.length] = '\0';
    text += name.length + 1;
  }
  table->n_columns = cgats->n_columns = n;
  return EF_OK;
}

/* ---- What the columns are ---------------------------------------------- */

/* Percent where the field says so, else where no ratio is so large. */
static bool is_percent(const preamble *p, const survey *found,
                       const ef__table *table) {
  if (has_field(p, "SPECTRAL_PCT")) return true;
  if (has_field(p, "SPECTRAL_DEC") || has_field(p, "RGB_R") ||
      !(found->most_spectral > largest_ratio)) {
    return false;
  }
  ef__note(table->notes,
           "%s: its spectra are read as percent: the largest value is above 2, "
           "and no field says what they are",
           table->records.input->name);
  return true;
}

static ef_status keep_text(char **kept, ef__span text, ef_error *error) {
  *kept = ef__copy_text(text.text != NULL ? text.text : "", text.length);
  return *kept != NULL ? EF_OK : ef__error_memory(error, "the preamble");
}

/* Full drive: as the file says, else percent of inks by the standard, and of
 * RGB what the largest value tells. "" where there are none. */
static ef_status keep_device_max(const preamble *p, const survey *found,
                                 ef__table *table, ef_error *error) {
  ef__remarks *const remarks = &table->remarks;
  const bool is_ink = has_field(p, "CMYK_C") || has_field(p, "CMY_C");
  const char *most = is_ink ? "100" : "";
  remarks->device_max_line = p->format_line;
  if (p->device_max.text != NULL) {
    remarks->device_max_line = p->device_max_line;
    return keep_text(&remarks->device_max, p->device_max, error);
  }
  if (has_field(p, "RGB_R")) {
    most = found->most_rgb <= 1     ? "1"
           : found->most_rgb <= 100 ? "100"
                                    : "255";
    ef__note(table->notes,
             "%s: R,G,B read as 0 to %s: the largest value tells",
             table->records.input->name, most);
  }
  return keep_text(&remarks->device_max, ef__span_of(most), error);
}

/* Spectra beside inks are reflectances by the standard. */
static ef_status keep_remarks(const preamble *p, const survey *found,
                              ef__table *table, ef_error *error) {
  ef__remarks *const remarks = &table->remarks;
  const bool is_rgb = has_field(p, "RGB_R");
  ef_status status = keep_text(&remarks->title, p->title, error);
  if (status == EF_OK) {
    status = keep_text(&remarks->illuminant, p->illuminant, error);
  }
  if (status == EF_OK) {
    status = keep_text(&remarks->observer, p->observer, error);
  }
  if (status == EF_OK) {
    status = keep_text(&remarks->quantity,
                       ef__span_of(is_rgb ? "" : "reflectance"), error);
  }
  if (status == EF_OK) {
    const char *const unit = is_percent(p, found, table) ? "percent" : "";
    status = keep_text(&remarks->unit, ef__span_of(unit), error);
  }
  return status == EF_OK ? keep_device_max(p, found, table, error) : status;
}

static void note_rest(const survey *found, const ef__table *table) {
  if (found->other_line > 0) {
    ef__note(table->notes,
             "%s:%zu: a further table starts here; only the first is read",
             table->records.input->name, found->other_line);
  }
}

/* ---- Opening ----------------------------------------------------------- */

static ef_status read_all(ef__records *records, ef_error *error) {
  ef__input *const input = records->input;
  while (!input->at_end) {
    const ef_status status = ef__input_more(input, error);
    if (status != EF_OK) return status;
    if (input->end - input->begin > MOST_BYTES) {
      ef__error_set(error, EF_MALFORMED,
                    "has more than %zu bytes, which no list of this form has",
                    MOST_BYTES);
      return ef__error_place(error, input->name, 0, 0, NULL);
    }
  }
  return EF_OK;
}

static ef_status prepare(scanner *s, const preamble *p, ef__table *table,
                         ef_error *error) {
  survey found;
  const scanner data = *s;
  ef_status status = survey_data(data, p, &found, error);
  if (status != EF_OK) return status;
  ef__cgats *const cgats = ef__allocate_zeroed(1, sizeof *cgats);
  if (cgats == NULL) return ef__error_memory(error, "a table");
  table->records.cgats = cgats;
  *cgats = (ef__cgats){.at = data.at,
                       .end = data.end,
                       .line = data.line,
                       .n_items = p->n_names,
                       .n_rows = found.n_rows};
  cgats->column = ef__allocate(p->n_names, sizeof *cgats->column);
  cgats->wavelength_nm = ef__allocate(p->n_names, sizeof *cgats->wavelength_nm);
  if (cgats->column == NULL || cgats->wavelength_nm == NULL) {
    return ef__error_memory(error, "a table");
  }
  table->header_line = p->format_line;
  if (found.n_rows == 0) {
    return refuse(s, s->word_line, error,
                  "no row stands between BEGIN_DATA and END_DATA; add at least "
                  "one");
  }
  status = read_wavelengths(data, p, cgats, error);
  if (status == EF_OK) status = name_columns(p, cgats, table, error);
  if (status == EF_OK) status = keep_remarks(p, &found, table, error);
  if (status != EF_OK) return status;
  note_rest(&found, table);
  return EF_OK;
}

ef_status ef__cgats_open(ef__table *table, ef_error *error) {
  ef__records *const records = &table->records;
  ef_status status = read_all(records, error);
  if (status != EF_OK) return status;
  const ef__input *const input = records->input;
  scanner s = {.records = records,
               .at = input->buffer + input->begin,
               .end = input->buffer + input->end};
  preamble p = {0};
  status = read_preamble(&s, &p, error);
  if (status == EF_OK) status = prepare(&s, &p, table, error);
  free(p.name);
  table->mark = '.';
  records->separator = ' ';
  return status;
}

void ef__cgats_free(ef__cgats *cgats) {
  if (cgats == NULL) return;
  free(cgats->column);
  free(cgats->wavelength_nm);
  free(cgats);
}

/* ---- Rows -------------------------------------------------------------- */

static ef_status make_fields(ef__records *records, size_t n, ef_error *error) {
  if (n <= records->field_room) return EF_OK;
  ef__span *const grown =
      ef__reallocate(records->field, n, sizeof *records->field);
  if (grown == NULL) return ef__error_memory(error, "fields");
  records->field = grown;
  records->field_room = n;
  return EF_OK;
}

/* A wavelength of a further row must be that of the first. */
static ef_status check_wavelength(const scanner *s, double wanted_nm,
                                  ef_error *error) {
  char quoted[EF__QUOTED], wanted[EF_NUMBER_TEXT];
  double value;
  if (ef_number_parse(s->word.text, s->word.length, '.', &value) &&
      value == wanted_nm) {
    return EF_OK;
  }
  ef_number_format(wanted_nm, wanted);
  return refuse(s, s->word_line, error,
                "found wavelength %s, expected %s as in the first row; all "
                "rows need the same wavelengths",
                ef__quote(s->word, quoted), wanted);
}

ef_status ef__cgats_next(ef__records *records, ef__record_kind *kind,
                         ef_error *error) {
  ef__cgats *const c = records->cgats;
  *kind = EF__RECORD_END;
  if (c->row == c->n_rows) return EF_OK;
  ef_status status = make_fields(records, c->n_columns, error);
  if (status != EF_OK) return status;
  scanner s = {
      .records = records, .at = c->at, .end = c->end, .line = c->line};
  for (size_t i = 0; i < c->n_items; ++i) {
    status = next_word(&s, error);
    if (status != EF_OK) return status;
    if (i == 0) records->line = s.word_line;
    if (c->column[i] != SIZE_MAX) {
      records->field[c->column[i]] = s.word;
    } else {
      status = check_wavelength(&s, c->wavelength_nm[i], error);
      if (status != EF_OK) return status;
    }
  }
  records->offset = ef__byte_share(records->input->n_read, c->row, c->n_rows);
  c->at = s.at;
  c->line = s.line;
  ++c->row;
  records->n_fields = c->n_columns;
  records->is_split = true;
  records->has_quotes = true; /* the fields are cut already */
  records->length = 0;
  *kind = EF__RECORD_ROW;
  return EF_OK;
}
