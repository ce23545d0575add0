/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Numbers of one row, and what they must keep to. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <string.h>

#include "base/base_private.h"

/* Noise of an instrument at black may go below zero by this. */
static const double lowest_surface = -0.02;
/* For lights, by this share of the largest value. */
static const double light_noise = 1e-3;
/* Fluorescence goes above 1; beyond this it is percent. */
static const double highest_surface = 2;

/* ---- Reading ----------------------------------------------------------- */

/* Straight through the bytes, for rows as they should be: no quotes, no
 * blanks, plain numbers. False sends the row to the careful reader, which
 * knows all forms and names what is wrong. */
static bool read_plainly(const ef__table *table, const ef__layout *layout,
                         double *value, double *device, ef__label *label) {
  const ef__records *const records = &table->records;
  const char separator = records->separator;
  const char mark = table->mark;
  const size_t n_columns = table->n_columns;
  const size_t n_values = layout->n_values;
  const char *at = records->text;
  const char *const end = at + records->length;
  for (size_t i = 0; i < n_columns; ++i) {
    const size_t slot = layout->slot[i];
    if (slot < EF__SLOT_NAME) {
      double *const to = slot == EF__SLOT_ANGLE ? &label->angle_deg
                         : slot < n_values      ? &value[slot]
                                           : &device[slot - n_values];
      at = ef__decimal_scan(at, end, mark, to);
      if (at == NULL) return false;
    } else {
      const char *const from = at;
      at = memchr(at, separator, (size_t)(end - at));
      if (at == NULL) at = end;
      if (slot == EF__SLOT_NAME) {
        label->name = ef__span_trim((ef__span){from, (size_t)(at - from)});
      }
    }
    if (i + 1 == n_columns) break;
    if (at == end || *at != separator) return false;
    ++at;
  }
  return at == end;
}

static ef_status read_carefully(ef__table *table, const ef__layout *layout,
                                double *value, double *device,
                                ef__label *label, ef_error *error) {
  ef_status status = ef__table_split(table, error);
  for (size_t i = 0; status == EF_OK && i < table->n_columns; ++i) {
    const size_t slot = layout->slot[i];
    if (slot >= EF__SLOT_NAME) continue;
    double *const to = slot == EF__SLOT_ANGLE     ? &label->angle_deg
                       : slot < layout->n_values ? &value[slot]
                                            : &device[slot - layout->n_values];
    status = ef__table_number(table, i, to, error);
  }
  if (status == EF_OK && layout->name_column != SIZE_MAX) {
    label->name = table->records.field[layout->name_column];
  }
  return status;
}

ef_status ef__row_read(ef__table *table, const ef__layout *layout,
                       double *value, double *device, ef__label *label,
                       ef_error *error) {
  *label = (ef__label){{"", 0}, (double)NAN};
  if (!table->records.has_quotes &&
      read_plainly(table, layout, value, device, label)) {
    return EF_OK;
  }
  return read_carefully(table, layout, value, device, label, error);
}

/* ---- Checking ---------------------------------------------------------- */

static ef_status place_fault(const ef__table *table, const ef__layout *layout,
                             size_t line, size_t slot, ef_error *error) {
  const size_t column = layout->column[slot];
  ef__error_place(error, table->records.input->name, line, column + 1,
                  table->column[column]);
  return EF_MALFORMED;
}

static ef_status refuse_surface(double value, const ef__limits *limits,
                                ef_error *error) {
  char number[EF_NUMBER_TEXT];
  /* As it stands in the file, but for the last digits. */
  ef_number_format(limits->is_percent ? round(value * 1e8) / 1e6 : value,
                   number);
  const char *const assumed =
      limits->kind_is_assumed
          ? " (assumed from the first rows; if these are lights, add "
            "'# quantity: light')"
          : "";
  if (limits->is_percent) {
    return ef__error_set(error, EF_MALFORMED,
                         "found %s %% for a surface%s, expected -2 to 200 %%, "
                         "100 being the perfect reflecting diffuser; for "
                         "ratios remove the word percent above the header",
                         number, assumed);
  }
  if (value < lowest_surface) {
    return ef__error_set(error, EF_MALFORMED,
                         "found %s for a surface%s, expected a ratio of -0.02 "
                         "or more; check the zero of the instrument",
                         number, assumed);
  }
  return ef__error_set(error, EF_MALFORMED,
                       "found %s for a surface%s, expected a ratio up to 2 "
                       "where 1 is the perfect reflecting diffuser; for "
                       "percent add the line '# unit: percent'",
                       number, assumed);
}

static ef_status refuse_light(double value, bool is_assumed, ef_error *error) {
  char number[EF_NUMBER_TEXT];
  ef_number_format(value, number);
  return ef__error_set(
      error, EF_MALFORMED,
      "found %s for a light%s, expected zero or more, noise of 0.1 %% of the "
      "largest value apart; check the dark reading",
      number,
      is_assumed ? " (assumed from the first rows; if these are surfaces, add "
                   "'# quantity: reflectance')"
                 : "");
}

static ef_status check_spectrum(const ef__limits *limits, size_t n,
                                const double *value, size_t *fault,
                                ef_error *error) {
  const bool is_surface = limits->kind == EF_SURFACE;
  if (limits->any_sign) return EF_OK;
  double low = lowest_surface;
  if (!is_surface) {
    double largest = limits->largest_light;
    for (size_t i = 0; i < n && limits->largest_light == 0; ++i) {
      if (value[i] > largest) largest = value[i];
    }
    low = -light_noise * largest;
  }
  /* One pass without a branch a value; the place is looked for afterwards. */
  bool is_good = true;
  for (size_t i = 0; i < n; ++i) {
    is_good &= value[i] >= low && !(is_surface && value[i] > highest_surface);
  }
  if (is_good) return EF_OK;
  for (size_t i = 0; i < n; ++i) {
    *fault = i;
    if (value[i] < low || (is_surface && value[i] > highest_surface)) break;
  }
  return is_surface
             ? refuse_surface(value[*fault], limits, error)
             : refuse_light(value[*fault], limits->kind_is_assumed, error);
}

/* What no colour can be: tristimulus Y and lightness below zero, chromaticity
 * without y. X, Z, x and y of imaginary colours are free. */
static ef_status check_colour(ef_content content, const double *value,
                              size_t *fault, ef_error *error) {
  char number[EF_NUMBER_TEXT];
  const size_t luminance = content == EF_CONTENT_LAB   ? 0
                           : content == EF_CONTENT_XYZ ? 1
                                                       : 2;
  if (value[luminance] < 0) {
    *fault = luminance;
    ef_number_format(value[luminance], number);
    return ef__error_set(error, EF_MALFORMED,
                         "found %s, expected zero or more; there is no light "
                         "below zero",
                         number);
  }
  if (content == EF_CONTENT_XYY && value[1] <= 0) {
    *fault = 1;
    ef_number_format(value[1], number);
    return ef__error_set(error, EF_MALFORMED,
                         "found %s, expected a chromaticity y above zero; "
                         "write the colour as X,Y,Z",
                         number);
  }
  return EF_OK;
}

static ef_status check_device(const ef__limits *limits, size_t n,
                              const double *device, size_t *fault,
                              ef_error *error) {
  char number[EF_NUMBER_TEXT];
  char most[EF_NUMBER_TEXT];
  for (size_t i = 0; i < n; ++i) {
    if (device[i] >= 0 && device[i] <= limits->device_max) continue;
    *fault = i;
    ef_number_format(device[i], number);
    ef_number_format(limits->device_max, most);
    return ef__error_set(
        error, EF_MALFORMED,
        "found device value %s, expected 0 to %s%s", number, most,
        limits->device_max_is_assumed
            ? " (full drive, assumed from the first rows; add a line "
              "'# device_max: N' if it is another)"
            : ", the value of full drive; check '# device_max:' and the value");
  }
  return EF_OK;
}

ef_status ef__row_check(const ef__table *table, const ef__layout *layout,
                        const ef__limits *limits, size_t line,
                        const double *value, const double *device,
                        ef_error *error) {
  size_t fault = 0;
  ef_status status = EF_OK;
  if (layout->content == EF_CONTENT_SPECTRA) {
    /* Of a long table the first value is the wavelength. */
    const size_t first = layout->is_long ? 1 : 0;
    status = check_spectrum(limits, layout->n_values - first, value + first,
                            &fault, error);
    fault += first;
  } else if (layout->content != EF_CONTENT_DEVICE) {
    status = check_colour(layout->content, value, &fault, error);
  }
  if (status == EF_OK && layout->n_device > 0) {
    status = check_device(limits, layout->n_device, device, &fault, error);
    fault += layout->n_values;
  }
  return status == EF_OK ? EF_OK
                         : place_fault(table, layout, line, fault, error);
}
