/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "spectrum/spectrum_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

struct ef_spectra {
  size_t n;
  ef_kind kind;
  bool is_absolute;
  ef_grid grid;
  const char **name; /* n, into `text` */
  double *value;     /* n x grid.count */
};

enum { NUMBER_LENGTH = 24 }; /* a size_t in decimal, with its terminator */

static ef_status check_values(size_t n, const char *const *names,
                              const ef_grid *grid, const double *value,
                              ef_error *error) {
  for (size_t i = 0; i < n * grid->count; ++i) {
    if (isfinite(value[i]))
      continue;
    const size_t spectrum = i / grid->count;
    const double at = ef_grid_wavelength(grid, i % grid->count);
    const char *const text = isnan(value[i]) ? "not a number" : "infinite";
    if (names == NULL) {
      return ef__error_set(error, EF_INVALID, "spectrum %zu is %s at %g nm",
                           spectrum + 1, text, at);
    }
    return ef__error_set(error, EF_INVALID, "spectrum '%.64s' is %s at %g nm",
                         names[spectrum], text, at);
  }
  return EF_OK;
}

/* Bytes of all names with their terminators. */
static bool name_bytes(size_t n, const char *const *names, size_t *bytes) {
  if (names == NULL)
    return ef__size_multiply(n, NUMBER_LENGTH, bytes);
  *bytes = 0;
  for (size_t i = 0; i < n; ++i) {
    if (!ef__size_add(*bytes, strlen(names[i]) + 1, bytes))
      return false;
  }
  return true;
}

static void copy_names(size_t n, const char *const *names, char *text,
                       const char **name) {
  for (size_t i = 0; i < n; ++i) {
    name[i] = text;
    if (names != NULL) {
      const size_t length = strlen(names[i]) + 1;
      memcpy(text, names[i], length);
      text += length;
    } else {
      text += snprintf(text, NUMBER_LENGTH, "%zu", i + 1) + 1;
    }
  }
}

static ef_spectra *allocate(size_t n, const char *const *names,
                            const ef_grid *grid) {
  ef_spectra *spectra = NULL;
  ef_spectra part = {.n = n};
  double *wavelength = NULL;
  char *text = NULL;
  size_t n_values, n_bytes;
  if (!ef__size_multiply(n, grid->count, &n_values))
    return NULL;
  if (!name_bytes(n, names, &n_bytes))
    return NULL;
  const ef__part parts[] = {
      {&spectra, 1, sizeof *spectra},
      {&part.value, n_values, sizeof *part.value},
      {&wavelength, ef__grid_storage(grid), sizeof *wavelength},
      {&part.name, n, sizeof *part.name},
      {&text, n_bytes, 1}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    return NULL;
  }
  part.grid = ef__grid_copy(grid, wavelength);
  copy_names(n, names, text, part.name);
  *spectra = part;
  return spectra;
}

ef_spectra *ef_spectra_new(size_t n, const char *const *names,
                           const ef_grid *grid, ef_kind kind,
                           const double *value, ef_error *error) {
  if (ef_grid_check(grid, error) != EF_OK)
    return NULL;
  ef_spectra *const spectra = allocate(n, names, grid);
  if (spectra == NULL) {
    ef__error_memory(error, "a set of spectra");
    return NULL;
  }
  if (check_values(n, names, grid, value, error) != EF_OK) {
    ef_spectra_free(spectra);
    return NULL;
  }
  spectra->kind = kind;
  if (n > 0)
    memcpy(spectra->value, value, n * grid->count * sizeof *value);
  return spectra;
}

void ef_spectra_free(ef_spectra *spectra) {
  free(spectra); /* one block */
}

size_t ef_spectra_count(const ef_spectra *spectra) {
  return spectra->n;
}

ef_kind ef_spectra_kind(const ef_spectra *spectra) {
  return spectra->kind;
}

bool ef_spectra_absolute(const ef_spectra *spectra) {
  return spectra->is_absolute;
}

void ef_spectra_set_absolute(ef_spectra *spectra, bool absolute) {
  spectra->is_absolute = absolute;
}

const ef_grid *ef_spectra_grid(const ef_spectra *spectra) {
  return &spectra->grid;
}

const char *ef_spectra_name(const ef_spectra *spectra, size_t i) {
  return spectra->name[i];
}

const double *ef_spectra_values(const ef_spectra *spectra) {
  return spectra->value;
}

ef_status ef_spectra_find(const ef_spectra *spectra, const char *name,
                          size_t *index, ef_error *error) {
  for (size_t i = 0; i < spectra->n; ++i) {
    if (strcmp(spectra->name[i], name) != 0)
      continue;
    *index = i;
    return EF_OK;
  }
  return ef__error_unknown(error, "spectrum", name, spectra->name, spectra->n);
}
