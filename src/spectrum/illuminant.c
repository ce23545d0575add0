/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "spectrum/spectrum_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

typedef enum law {
  LAW_EQUAL,   /* 100 at every wavelength */
  LAW_PLANCK,  /* by formula */
  LAW_SAMPLES, /* interpolated, zero outside */
} law;

struct ef_illuminant {
  law law;
  double exponent_nm;             /* LAW_PLANCK: c2 / T */
  ef_interpolation interpolation; /* LAW_SAMPLES, with the next two */
  ef_grid grid;
  double *power;
  char *name;
};

/* Second radiation constant of the ITS-90, and that of the definition of
 * illuminant A (ISO/CIE 11664-2:2022 equation 1), in nm K. */
static const double c2_nm_k = 1.4388e7;
static const double c2_of_a_nm_k = 1.435e7;
static const double temperature_of_a_k = 2848;
/* All formulas are 100 here. */
static const double reference_nm = 560;

/* ---- Names ------------------------------------------------------------- */

static const char *const known[] = {
    "A", "C", "D50", "D55", "D65", "D75", "E", "FL1", "FL2", "FL3", "FL4",
    "FL5", "FL6", "FL7", "FL8", "FL9", "FL10", "FL11", "FL12", "FL3.1", "FL3.2",
    "FL3.3", "FL3.4", "FL3.5", "FL3.6", "FL3.7", "FL3.8", "FL3.9", "FL3.10",
    "FL3.11", "FL3.12", "FL3.13", "FL3.14", "FL3.15", "HP1", "LED-B1", "LED-B2",
    "LED-B3", "LED-B4", "LED-B5", "LED-BH1", "LED-RGB1", "LED-V1", "LED-V2",
    /* The forms with a temperature, for the near names of an error. */
    "daylight:6504", "planck:2856"};

enum {
  N_FORMS = 2,
  N_KNOWN = sizeof known / sizeof *known,
  N_NAMES = N_KNOWN - N_FORMS
};

/* Tables that hold the illuminants whose names begin so; the longer first. */
static const struct {
  const char *beginning;
  const char *table;
} home[] = {{"FL3.", "cie-fl3"}, {"FL", "cie-fl"},   {"HP", "cie-hp"},
            {"LED", "cie-led"},  {"C", "cie-c"},     {"D50", "cie-d50"},
            {"D55", "cie-d55"},  {"D65", "cie-d65"}, {"D75", "cie-d75"}};

size_t ef_illuminant_names(const char *const **names) {
  *names = known;
  return N_NAMES;
}

static const char *table_of(const char *name) {
  for (size_t i = 0; i < sizeof home / sizeof *home; ++i) {
    const char *const beginning = home[i].beginning;
    if (strncmp(name, beginning, strlen(beginning)) == 0)
      return home[i].table;
  }
  return NULL;
}

/* ---- Making ------------------------------------------------------------ */

/* With room for `grid` and power when it is not NULL. */
static ef_illuminant *allocate(const char *name, const ef_grid *grid,
                               ef_error *error) {
  ef_illuminant *illuminant = NULL;
  ef_illuminant part = {.law = LAW_EQUAL};
  double *wavelength = NULL;
  const size_t length = strlen(name);
  const ef__part parts[] = {
      {&illuminant, 1, sizeof *illuminant},
      {&part.power, grid != NULL ? grid->count : 0, sizeof *part.power},
      {&wavelength, grid != NULL ? ef__grid_storage(grid) : 0,
       sizeof *wavelength},
      {&part.name, length + 1, 1}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    ef__error_memory(error, "an illuminant");
    return NULL;
  }
  if (grid != NULL) {
    part.law = LAW_SAMPLES;
    part.grid = ef__grid_copy(grid, wavelength);
  }
  memcpy(part.name, name, length + 1);
  *illuminant = part;
  return illuminant;
}

static ef_illuminant *from_table(const char *name, const char *table_name,
                                 ef_error *error) {
  const ef_table *const table = ef_table_find(table_name, error);
  if (table == NULL)
    return NULL;
  const size_t column = ef_table_column(table, name);
  if (column == SIZE_MAX) {
    ef__error_set(error, EF_UNKNOWN_NAME, "table '%s' has no column '%s'",
                  table_name, name);
    return NULL;
  }
  const ef_grid grid = ef_table_grid(table);
  ef_illuminant *const illuminant = allocate(name, &grid, error);
  if (illuminant == NULL)
    return NULL;
  illuminant->interpolation = EF_INTERPOLATE_LINEAR;
  memcpy(illuminant->power, table->value + column * table->n_rows,
         table->n_rows * sizeof *illuminant->power);
  return illuminant;
}

static ef_illuminant *planckian(const char *name, double exponent_nm,
                                ef_error *error) {
  ef_illuminant *const illuminant = allocate(name, NULL, error);
  if (illuminant == NULL)
    return NULL;
  illuminant->law = LAW_PLANCK;
  illuminant->exponent_nm = exponent_nm;
  return illuminant;
}

static ef_illuminant *from_name(const char *name, ef_error *error) {
  if (strcmp(name, "E") == 0)
    return allocate(name, NULL, error);
  if (strcmp(name, "A") == 0) {
    return planckian(name, c2_of_a_nm_k / temperature_of_a_k, error);
  }
  return from_table(name, table_of(name), error);
}

/* Shares of S1 and S2 in daylight: CIE 015:2018 equations 4.5 to 4.11 (those of
 * Judd, MacAdam & Wyszecki 1964), without the rounding to three decimals that
 * belongs to the tables of the named ones. */
static void daylight_shares(double temperature_k, double *m1, double *m2) {
  const double t = 1 / temperature_k;
  const double x =
      temperature_k <= 7000
          ? ((-4.6070e9 * t + 2.9678e6) * t + 0.09911e3) * t + 0.244063
          : ((-2.0064e9 * t + 1.9018e6) * t + 0.24748e3) * t + 0.237040;
  const double y = (-3.000 * x + 2.870) * x - 0.275;
  const double m = 0.0241 + 0.2562 * x - 0.7341 * y;
  *m1 = (-1.3515 - 1.7703 * x + 5.9114 * y) / m;
  *m2 = (0.0300 - 31.4424 * x + 30.0717 * y) / m;
}

static ef_illuminant *daylight(const char *name, double temperature_k,
                               ef_error *error) {
  const ef_table *const table = ef_table_find("daylight-components", error);
  if (table == NULL)
    return NULL;
  const ef_grid grid = ef_table_grid(table);
  ef_illuminant *const illuminant = allocate(name, &grid, error);
  if (illuminant == NULL)
    return NULL;
  illuminant->interpolation = EF_INTERPOLATE_LINEAR;
  double m1, m2;
  daylight_shares(temperature_k, &m1, &m2);
  const double *const s0 = table->value + table->n_rows;
  const double *const s1 = s0 + table->n_rows;
  const double *const s2 = s1 + table->n_rows;
  for (size_t i = 0; i < table->n_rows; ++i) {
    illuminant->power[i] = s0[i] + m1 * s1[i] + m2 * s2[i];
  }
  return illuminant;
}

/* The text after "FORM:", or NULL. */
static const char *after_form(const char *name, const char *form) {
  char beginning[16];
  const size_t length = strlen(form);
  if (strlen(name) <= length || name[length] != ':')
    return NULL;
  memcpy(beginning, name, length);
  beginning[length] = '\0';
  return ef__name_equal(beginning, form) ? name + length + 1 : NULL;
}

/* Reads a temperature between two bounds and writes the name as it is kept. */
static bool read_temperature(const char *form, const char *text, double low_k,
                             double high_k, double *temperature_k, char *name,
                             size_t size, ef_error *error) {
  const bool is_number =
      ef_number_parse(text, strlen(text), '.', temperature_k);
  if (!is_number || *temperature_k < low_k || *temperature_k > high_k) {
    ef__error_set(error, EF_INVALID,
                  "'%s:%.32s': the temperature must be a number from %.0f to "
                  "%.0f K",
                  form, text, low_k, high_k);
    return false;
  }
  char number[EF_NUMBER_TEXT];
  ef_number_format(*temperature_k, number);
  snprintf(name, size, "%s:%s", form, number);
  return true;
}

ef_illuminant *ef_illuminant_new(const char *name, ef_error *error) {
  for (size_t i = 0; i < N_NAMES; ++i) {
    if (ef__name_equal(name, known[i]))
      return from_name(known[i], error);
  }
  char kept[64];
  double temperature_k;
  const char *text = after_form(name, "daylight");
  if (text != NULL) {
    if (!read_temperature("daylight", text, 4000, 25000, &temperature_k, kept,
                          sizeof kept, error)) {
      return NULL;
    }
    return daylight(kept, temperature_k, error);
  }
  text = after_form(name, "planck");
  if (text != NULL) {
    if (!read_temperature("planck", text, 500, 100000, &temperature_k, kept,
                          sizeof kept, error)) {
      return NULL;
    }
    return planckian(kept, c2_nm_k / temperature_k, error);
  }
  ef__error_unknown(error, "illuminant", name, known, N_KNOWN);
  return NULL;
}

ef_illuminant *ef_illuminant_from_spectra(const ef_spectra *spectra, size_t i,
                                          ef_error *error) {
  if (i >= ef_spectra_count(spectra)) {
    ef__error_set(error, EF_INVALID, "no spectrum %zu in a set of %zu", i + 1,
                  ef_spectra_count(spectra));
    return NULL;
  }
  const char *const name = ef_spectra_name(spectra, i);
  if (ef_spectra_kind(spectra) != EF_LIGHT) {
    ef__error_set(error, EF_INVALID,
                  "'%.64s' is a surface; an illuminant must be a light", name);
    return NULL;
  }
  const ef_grid *const grid = ef_spectra_grid(spectra);
  ef_illuminant *const illuminant = allocate(name, grid, error);
  if (illuminant == NULL)
    return NULL;
  illuminant->interpolation = EF_INTERPOLATE_AUTO;
  memcpy(illuminant->power, ef_spectra_values(spectra) + i * grid->count,
         grid->count * sizeof *illuminant->power);
  return illuminant;
}

void ef_illuminant_free(ef_illuminant *illuminant) {
  free(illuminant); /* one block */
}

const char *ef_illuminant_name(const ef_illuminant *illuminant) {
  return illuminant->name;
}

/* ---- Sampling ---------------------------------------------------------- */

/* ISO/CIE 11664-2:2022 equation 1, with any c2 / T. */
static double planck(double exponent_nm, double wavelength_nm) {
  const double share =
      expm1(exponent_nm / reference_nm) / expm1(exponent_nm / wavelength_nm);
  return 100 * pow(reference_nm / wavelength_nm, 5) * share;
}

ef_status ef_illuminant_sample(const ef_illuminant *illuminant,
                               const ef_grid *grid, double *power,
                               ef_error *error) {
  if (illuminant->law == LAW_SAMPLES) {
    return ef_resample(&illuminant->grid, 1, illuminant->power, grid,
                       illuminant->interpolation, EF_EXTEND_ZERO, power, error);
  }
  const ef_status status = ef_grid_check(grid, error);
  if (status != EF_OK)
    return status;
  for (size_t i = 0; i < grid->count; ++i) {
    power[i] =
        illuminant->law == LAW_EQUAL
            ? 100
            : planck(illuminant->exponent_nm, ef_grid_wavelength(grid, i));
  }
  return EF_OK;
}
