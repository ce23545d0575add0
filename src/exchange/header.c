/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The header row decides what a table is: which set of columns it has, and
 * where the number of each column goes. Where several sets are there, the one
 * that says most is taken: spectra, X,Y,Z, x,y,Y, L,a,b; a note names the
 * columns that are not used. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Steps below this have no width: interpolation would divide by them. */
static const double shortest_step_nm = 1e-6;

typedef struct column_set {
  const char *name[3];
  ef_content content;
} column_set;

/* In order of preference. Case counts: x is not X. */
static const column_set colour_sets[] = {
    {{"X", "Y", "Z"}, EF_CONTENT_XYZ},
    {{"x", "y", "Y"}, EF_CONTENT_XYY},
    {{"L", "a", "b"}, EF_CONTENT_LAB},
    {{"L*", "a*", "b*"}, EF_CONTENT_LAB},
};
enum { N_COLOUR_SETS = sizeof colour_sets / sizeof *colour_sets };

/* Three drives, and for inks a fourth that need not be there. */
typedef struct device_set {
  const char *const *letter;
  const char *const *word;
} device_set;

static const char *const rgb_letters[] = {"R", "G", "B"};
static const char *const rgb_words[] = {"red", "green", "blue"};
static const char *const cmy_letters[] = {"C", "M", "Y", "K"};
static const char *const cmy_words[] = {"cyan", "magenta", "yellow", "black"};
static const device_set device_sets[] = {{rgb_letters, rgb_words},
                                         {cmy_letters, cmy_words}};
enum { RGB, CMY, N_DEVICE_SETS };

const char *ef_content_text(ef_content content) {
  switch (content) {
  case EF_CONTENT_SPECTRA: return "spectra";
  case EF_CONTENT_LAB: return "L,a,b";
  case EF_CONTENT_XYZ: return "X,Y,Z";
  case EF_CONTENT_XYY: return "x,y,Y";
  case EF_CONTENT_DEVICE: return "device values";
  }
  return "unknown";
}

/* ---- Finding columns --------------------------------------------------- */

static size_t find_column(const ef__table *table, const char *name) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (strcmp(table->column[i], name) == 0) return i;
  }
  return SIZE_MAX;
}

static size_t find_any_case(const ef__table *table, const char *name) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (ef__name_equal(table->column[i], name)) return i;
  }
  return SIZE_MAX;
}

static bool find_three(const ef__table *table, const char *const name[3],
                       size_t column[3]) {
  for (int i = 0; i < 3; ++i) {
    column[i] = find_column(table, name[i]);
    if (column[i] == SIZE_MAX) return false;
  }
  return true;
}

/* By letters, or written out: of words case does not count. */
static bool find_device(const ef__table *table, const device_set *set,
                        size_t column[3]) {
  if (find_three(table, set->letter, column)) return true;
  for (int i = 0; i < 3; ++i) {
    column[i] = find_any_case(table, set->word[i]);
    if (column[i] == SIZE_MAX) return false;
  }
  return true;
}

static bool is_unit(ef__span span) {
  return span.length == 2 && (span.text[0] == 'n' || span.text[0] == 'N') &&
         (span.text[1] == 'm' || span.text[1] == 'M');
}

/* 400, 400nm, 400 nm, nm400, nm_400; NaN for anything else. */
static double wavelength_of(const ef__table *table, size_t column) {
  ef__span span = ef__span_of(table->column[column]);
  if (span.length > 2 && is_unit((ef__span){span.text, 2})) {
    span.text += 2;
    span.length -= 2;
    if (span.text[0] == '_') {
      ++span.text;
      --span.length;
    }
  } else if (span.length > 2 &&
             is_unit((ef__span){span.text + span.length - 2, 2})) {
    span.length -= 2;
  }
  span = ef__span_trim(span);
  double wavelength_nm;
  const bool is_number =
      ef_number_parse(span.text, span.length, '.', &wavelength_nm) ||
      (table->records.separator != ',' &&
       ef_number_parse(span.text, span.length, ',', &wavelength_nm));
  const bool is_believed = is_number && wavelength_nm >= EF__SHORTEST_NM &&
                           wavelength_nm <= EF__LONGEST_NM;
  return is_believed ? wavelength_nm : (double)NAN;
}

static bool is_number(const ef__table *table, size_t column) {
  const ef__span span = ef__span_of(table->column[column]);
  double value;
  return ef_number_parse(span.text, span.length, '.', &value) ||
         ef_number_parse(span.text, span.length, ',', &value);
}

/* ---- Refusing ---------------------------------------------------------- */

static ef_status refuse_unknown(const ef__table *table, ef_error *error) {
  char found[160] = "";
  size_t used = 0;
  size_t n_listed = 0;
  for (; n_listed < table->n_columns && n_listed < 8; ++n_listed) {
    char quoted[EF__QUOTED];
    ef__quote(ef__span_of(table->column[n_listed]), quoted);
    if (used + strlen(quoted) + 2 >= sizeof found) break;
    used += (size_t)snprintf(found + used, sizeof found - used, "%s%s",
                             n_listed > 0 ? ", " : "", quoted);
  }
  return ef__header_error(
      table, SIZE_MAX, error,
      "no known set of columns: found %s%s, expected wavelength_nm first, or "
      "columns named by wavelength (400, 400nm, nm400), or L,a,b, X,Y,Z, "
      "x,y,Y, R,G,B or C,M,Y (case counts); rename the columns",
      found, n_listed < table->n_columns ? " ..." : "");
}

static ef_status refuse_header(const ef__table *table, ef_error *error) {
  const size_t at = find_any_case(table, "wavelength_nm");
  if (at != SIZE_MAX) {
    return ef__header_error(table, at, error,
                            "wavelength_nm is column %zu, expected the first; "
                            "move it there",
                            at + 1);
  }
  static const char *const near[] = {"wavelength", "nm", "lambda", "wl"};
  const char *const first = table->column[0];
  for (size_t i = 0; i < sizeof near / sizeof *near; ++i) {
    const size_t length = strlen(near[i]);
    const ef__span start = {first, strlen(first) < length ? 0 : length};
    char word[16] = "";
    memcpy(word, start.text, start.length);
    const char next = first[start.length];
    const bool is_word = next == '\0' || next == ' ' || next == '(' ||
                         next == '[' || next == '/' || next == '_';
    if (!is_word || !ef__name_equal(word, near[i])) continue;
    return ef__header_error(table, 0, error,
                            "the first column looks like wavelengths; name it "
                            "wavelength_nm if they are in nm");
  }
  return refuse_unknown(table, error);
}

/* A file without a header row starts with a row of data. */
static ef_status check_is_header(const ef__table *table, ef_error *error) {
  bool has_only_wavelengths = true;
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (!is_number(table, i)) return EF_OK;
    if (isnan(wavelength_of(table, i))) has_only_wavelengths = false;
  }
  if (has_only_wavelengths) return EF_OK;
  return ef__header_error(table, SIZE_MAX, error,
                          "the first row holds numbers only; expected a header "
                          "row such as wavelength_nm,sample or name,L,a,b "
                          "above it");
}

/* ---- Laying out -------------------------------------------------------- */

static void place(ef__layout *layout, size_t column, size_t slot) {
  layout->slot[column] = slot;
  layout->column[slot] = column;
}

static ef_status allocate_layout(const ef__table *table, ef__layout *layout,
                                 ef_error *error) {
  const size_t n = table->n_columns;
  const ef__part parts[] = {
      {&layout->slot, n, sizeof *layout->slot},
      {&layout->column, n + 6, sizeof *layout->column},
      {&layout->wavelength_nm, n, sizeof *layout->wavelength_nm}};
  *layout = (ef__layout){.name_column = SIZE_MAX, .angle_column = SIZE_MAX};
  if (ef__allocate_block(3, parts) == NULL) {
    return ef__error_memory(error, "the header row");
  }
  for (size_t i = 0; i < n; ++i) layout->slot[i] = EF__SLOT_NONE;
  return EF_OK;
}

void ef__layout_clear(ef__layout *layout) {
  free(layout->slot);
  *layout = (ef__layout){0};
}

static ef_status lay_out_long(const ef__table *table, ef__layout *layout,
                              ef_error *error) {
  if (table->n_columns < 2) {
    return ef__header_error(table, 0, error,
                            "there is no spectrum beside wavelength_nm; "
                            "expected one column for each, separated by "
                            "commas, semicolons or tabs");
  }
  layout->content = EF_CONTENT_SPECTRA;
  layout->is_long = true;
  layout->n_values = table->n_columns;
  for (size_t i = 0; i < table->n_columns; ++i) place(layout, i, i);
  return EF_OK;
}

static size_t count_wavelengths(const ef__table *table) {
  size_t n = 0;
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (!isnan(wavelength_of(table, i))) ++n;
  }
  return n;
}

static ef_status lay_out_wide(const ef__table *table, ef__layout *layout,
                              ef_error *error) {
  size_t n = 0;
  layout->content = EF_CONTENT_SPECTRA;
  for (size_t i = 0; i < table->n_columns; ++i) {
    const double wavelength_nm = wavelength_of(table, i);
    if (isnan(wavelength_nm)) continue;
    if (n > 0 &&
        wavelength_nm - layout->wavelength_nm[n - 1] < shortest_step_nm) {
      return ef__header_error(
          table, i, error,
          "the wavelength does not lie above that of column '%.40s'; "
          "wavelengths "
          "must increase from column to column, each there once",
          table->column[layout->column[n - 1]]);
    }
    layout->wavelength_nm[n] = wavelength_nm;
    place(layout, i, n++);
  }
  layout->n_values = n;
  return EF_OK;
}

static void lay_out_colours(const ef__table *table, ef__layout *layout,
                            bool *is_found) {
  size_t column[3];
  for (int s = 0; s < N_COLOUR_SETS; ++s) {
    if (!find_three(table, colour_sets[s].name, column)) continue;
    layout->content = colour_sets[s].content;
    layout->n_values = 3;
    for (size_t i = 0; i < 3; ++i) place(layout, column[i], i);
    *is_found = true;
    return;
  }
}

/* Device values behind the values, if there are any. */
static ef_status lay_out_device(const ef__table *table, ef__layout *layout,
                                ef_error *error) {
  size_t rgb[3];
  size_t cmy[3];
  const bool has_rgb = find_device(table, &device_sets[RGB], rgb);
  const bool has_cmy = find_device(table, &device_sets[CMY], cmy);
  if (has_rgb && has_cmy) {
    return ef__header_error(table, cmy[0], error,
                            "there are two sets of device values, R,G,B and "
                            "C,M,Y; keep one");
  }
  if (!has_rgb && !has_cmy) return EF_OK;
  const size_t *const column = has_rgb ? rgb : cmy;
  for (size_t i = 0; i < 3; ++i) {
    if (layout->slot[column[i]] != EF__SLOT_NONE) {
      return ef__header_error(table, column[i], error,
                              "the column would be yellow of C,M,Y and Y of %s "
                              "at once; name the inks cyan, magenta, yellow",
                              ef_content_text(layout->content));
    }
    place(layout, column[i], layout->n_values + i);
  }
  const device_set *const set = &device_sets[has_rgb ? RGB : CMY];
  layout->n_device = 3;
  const bool has_letters = strcmp(table->column[column[0]], set->letter[0]) == 0;
  const size_t black =
      has_rgb       ? SIZE_MAX
      : has_letters ? find_column(table, set->letter[3])
                    : find_any_case(table, set->word[3]);
  if (black != SIZE_MAX && layout->slot[black] == EF__SLOT_NONE) {
    place(layout, black, layout->n_values + layout->n_device++);
  }
  layout->device_name = set->word;
  layout->device_letter = set->letter;
  return EF_OK;
}

static void note_unused(const ef__table *table, const ef__layout *layout) {
  char list[200] = "";
  size_t used = 0;
  size_t n_unused = 0;
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (layout->slot[i] != EF__SLOT_NONE) continue;
    char quoted[EF__QUOTED];
    ef__quote(ef__span_of(table->column[i]), quoted);
    if (used + strlen(quoted) + 8 < sizeof list) {
      used += (size_t)snprintf(list + used, sizeof list - used, "%s%s",
                               n_unused > 0 ? ", " : "", quoted);
    } else if (list[used - 1] != '.') {
      used += (size_t)snprintf(list + used, sizeof list - used, ", ...");
    }
    ++n_unused;
  }
  if (n_unused == 0) return;
  ef__note(table->notes, "%s:%zu: %s taken; %zu column%s not used: %s",
           table->records.input->name, table->header_line,
           ef_content_text(layout->content), n_unused,
           n_unused == 1 ? " is" : "s are", list);
}

static ef_status find_called(const ef__table *table, const char *word,
                             ef__layout *layout, ef_error *error) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (!ef__name_equal(table->column[i], word)) continue;
    if (layout->name_column != SIZE_MAX) {
      return ef__header_error(table, i, error,
                              "columns %zu and %zu are both called %s; "
                              "rename one of them",
                              layout->name_column + 1, i + 1, word);
    }
    layout->name_column = i;
    layout->slot[i] = EF__SLOT_NAME;
  }
  return EF_OK;
}

/* name, or in its place what instruments write. */
static ef_status find_name_column(const ef__table *table, ef__layout *layout,
                                  ef_error *error) {
  static const char *const words[] = {"name", "sample", "sample name", "id"};
  ef_status status = EF_OK;
  for (size_t i = 0; i < sizeof words / sizeof *words; ++i) {
    if (status != EF_OK || layout->name_column != SIZE_MAX) break;
    status = find_called(table, words[i], layout, error);
  }
  return status;
}

/* The measuring angle of rows that are one sample. */
static ef_status find_angle_column(const ef__table *table, ef__layout *layout,
                                   ef_error *error) {
  for (size_t i = 0; i < table->n_columns; ++i) {
    if (!ef__name_equal(table->column[i], "angle_deg") &&
        !ef__name_equal(table->column[i], "angle")) {
      continue;
    }
    if (layout->angle_column != SIZE_MAX) {
      return ef__header_error(table, i, error,
                              "columns %zu and %zu are both angles; "
                              "rename one of them",
                              layout->angle_column + 1, i + 1);
    }
    layout->angle_column = i;
    layout->slot[i] = EF__SLOT_ANGLE;
  }
  return EF_OK;
}

static ef_status lay_out_rows(const ef__table *table, ef__layout *layout,
                              ef_error *error) {
  bool is_colour = false;
  ef_status status = check_is_header(table, error);
  if (status != EF_OK) return status;
  status = find_name_column(table, layout, error);
  if (status == EF_OK) status = find_angle_column(table, layout, error);
  if (status != EF_OK) return status;
  const size_t n_wavelengths = count_wavelengths(table);
  /* One column with a number for a name beside colours is no spectrum. */
  if (n_wavelengths <= 1) lay_out_colours(table, layout, &is_colour);
  if (!is_colour && n_wavelengths > 0) {
    status = lay_out_wide(table, layout, error);
    if (status != EF_OK) return status;
  }
  status = lay_out_device(table, layout, error);
  if (status != EF_OK) return status;
  if (layout->n_values == 0) {
    if (layout->n_device == 0) return refuse_header(table, error);
    layout->content = EF_CONTENT_DEVICE;
  }
  note_unused(table, layout);
  return EF_OK;
}

ef_status ef__layout_new(const ef__table *table, ef__layout *layout,
                         ef_error *error) {
  ef_status status = allocate_layout(table, layout, error);
  if (status != EF_OK) return status;
  status = ef__name_equal(table->column[0], "wavelength_nm")
               ? lay_out_long(table, layout, error)
               : lay_out_rows(table, layout, error);
  if (status != EF_OK) ef__layout_clear(layout);
  return status;
}
