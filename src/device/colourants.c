/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sets of colourants: absorption and scattering per unit of concentration. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

struct ef_colourants {
  size_t n;
  ef_grid grid;
  void *block;
  double *absorption;
  double *scattering; /* NULL: single-constant theory */
  double *wavelength_nm;
  char *text;
  const char *name[EF_MAX_COLOURANTS];
};

static ef_status check_values(size_t n, const char *const *names,
                              const ef_grid *grid, const double *value,
                              const char *what, ef_error *error) {
  for (size_t i = 0; i < n; i++) {
    for (size_t s = 0; s < grid->count; s++) {
      const double found = value[i * grid->count + s];
      if (isfinite(found) && found >= 0.0)
        continue;
      char number[24] = "";
      snprintf(number, sizeof number, "%zu", i + 1);
      return ef__error_set(error, EF_INVALID,
                           "%s of '%s' at %g nm is %g; expected a finite "
                           "number, zero or more",
                           what, names != NULL ? names[i] : number,
                           ef_grid_wavelength(grid, s), found);
    }
  }
  return EF_OK;
}

static ef_status check(size_t n, const char *const *names, const ef_grid *grid,
                       const double *absorption, const double *scattering,
                       ef_error *error) {
  if (n == 0 || n > EF_MAX_COLOURANTS)
    return ef__error_set(error, EF_INVALID, "%zu colourants; a set has 1 to %d",
                         n, EF_MAX_COLOURANTS);
  if (grid == NULL || absorption == NULL)
    return ef__error_set(error, EF_INVALID,
                         "colourants need a grid and their absorption");
  ef_status status = ef_grid_check(grid, error);
  if (status == EF_OK)
    status = check_values(n, names, grid, absorption,
                          scattering != NULL ? "the absorption" : "K/S", error);
  if (status == EF_OK && scattering != NULL)
    status = check_values(n, names, grid, scattering, "the scattering", error);
  return status;
}

static void copy_names(ef_colourants *set, const char *const *names) {
  char *at = set->text;
  for (size_t i = 0; i < set->n; i++) {
    set->name[i] = at;
    if (names != NULL) {
      const size_t length = strlen(names[i]) + 1;
      memcpy(at, names[i], length);
      at += length;
    } else {
      at += snprintf(at, 24, "%zu", i + 1) + 1;
    }
  }
}

/* One block of all arrays, filled. */
static ef_status copy_all(ef_colourants *set, const char *const *names,
                          const ef_grid *grid, const double *absorption,
                          const double *scattering, ef_error *error) {
  const size_t n = set->n, count = grid->count;
  const size_t n_listed = grid->wavelength_nm != NULL ? count : 0;
  const size_t n_scattering = scattering != NULL ? n * count : 0;
  size_t n_text = 0;
  for (size_t i = 0; i < n; i++)
    n_text += names != NULL ? strlen(names[i]) + 1 : 24;
  const ef__part parts[] = {
      {&set->absorption, n * count, sizeof(double)},
      {&set->scattering, n_scattering, sizeof(double)},
      {&set->wavelength_nm, n_listed, sizeof(double)},
      {&set->text, n_text, 1},
  };
  set->block = ef__allocate_block(4, parts);
  if (set->block == NULL)
    return ef__error_memory(error, "colourants");
  memcpy(set->absorption, absorption, n * count * sizeof(double));
  if (scattering != NULL)
    memcpy(set->scattering, scattering, n * count * sizeof(double));
  else
    set->scattering = NULL;
  set->grid = *grid;
  if (n_listed > 0) {
    memcpy(set->wavelength_nm, grid->wavelength_nm, count * sizeof(double));
    set->grid.wavelength_nm = set->wavelength_nm;
  }
  copy_names(set, names);
  return EF_OK;
}

ef_colourants *ef_colourants_new(size_t n, const char *const *names,
                                 const ef_grid *grid, const double *absorption,
                                 const double *scattering, ef_error *error) {
  if (check(n, names, grid, absorption, scattering, error) != EF_OK)
    return NULL;
  ef_colourants *set = ef__allocate_zeroed(1, sizeof *set);
  if (set == NULL) {
    ef__error_memory(error, "colourants");
    return NULL;
  }
  set->n = n;
  if (copy_all(set, names, grid, absorption, scattering, error) == EF_OK)
    return set;
  free(set);
  return NULL;
}

void ef_colourants_free(ef_colourants *colourants) {
  if (colourants == NULL)
    return;
  free(colourants->block);
  free(colourants);
}

/* ---- Parts of others ---------------------------------------------------- */

/* Copies rows index[i] of a set into a block of two arrays. */
ef_colourants *ef_colourants_pick(const ef_colourants *colourants, size_t n,
                                  const size_t *index, ef_error *error) {
  const char *names[EF_MAX_COLOURANTS];
  const size_t count = colourants->grid.count;
  if (n == 0 || n > EF_MAX_COLOURANTS) {
    ef__error_set(error, EF_INVALID, "%zu colourants; a set has 1 to %d", n,
                  EF_MAX_COLOURANTS);
    return NULL;
  }
  for (size_t i = 0; i < n; i++) {
    if (index[i] >= colourants->n) {
      ef__error_set(error, EF_INVALID, "colourant %zu of %zu", index[i] + 1,
                    colourants->n);
      return NULL;
    }
    names[i] = colourants->name[index[i]];
  }
  double *absorption = ef__allocate(2 * n, count * sizeof(double));
  if (absorption == NULL) {
    ef__error_memory(error, "colourants");
    return NULL;
  }
  double *scattering = absorption + n * count;
  const size_t row_size = count * sizeof(double);
  for (size_t i = 0; i < n; i++) {
    memcpy(absorption + i * count, colourants->absorption + index[i] * count,
           row_size);
    if (colourants->scattering != NULL)
      memcpy(scattering + i * count, colourants->scattering + index[i] * count,
             row_size);
  }
  ef_colourants *set = ef_colourants_new(
      n, names, &colourants->grid, absorption,
      colourants->scattering != NULL ? scattering : NULL, error);
  free(absorption);
  return set;
}

/* ---- From spectra in pairs ---------------------------------------------- */

enum { NAME_ROOM = 128 };

/* Which spectra belong to one colourant; SIZE_MAX: none. */
typedef struct pair {
  char name[NAME_ROOM];
  size_t k, s, ks;
} pair;

/* Cuts "red_k" into "red" and "k"; false when there is no such ending. */
static bool cut_name(const char *name, char head[NAME_ROOM],
                     const char **ending) {
  const char *bar = strrchr(name, '_');
  if (bar == NULL || bar == name || (size_t)(bar - name) >= NAME_ROOM)
    return false;
  memcpy(head, name, (size_t)(bar - name));
  head[bar - name] = '\0';
  *ending = bar + 1;
  return true;
}

static ef_status place(pair *pairs, size_t *n, const ef_spectra *spectra,
                       size_t index, ef_error *error) {
  const char *name = ef_spectra_name(spectra, index), *ending = "";
  char head[NAME_ROOM] = "";
  const bool is_cut = cut_name(name, head, &ending);
  const bool is_k = is_cut && ef__name_equal(ending, "k");
  const bool is_s = is_cut && ef__name_equal(ending, "s");
  if (!is_k && !is_s && !(is_cut && ef__name_equal(ending, "ks")))
    return ef__error_set(error, EF_MALFORMED,
                         "spectrum '%s' is neither NAME_k, NAME_s nor NAME_ks: "
                         "colourants are given by pairs of absorption and "
                         "scattering, or by their ratio",
                         name);
  size_t i = 0;
  while (i < *n && !ef__name_equal(pairs[i].name, head))
    i++;
  if (i == EF_MAX_COLOURANTS)
    return ef__error_set(error, EF_MALFORMED,
                         "more than %d colourants; leave some out",
                         EF_MAX_COLOURANTS);
  if (i == *n) {
    pairs[(*n)++] = (pair){.k = SIZE_MAX, .s = SIZE_MAX, .ks = SIZE_MAX};
    memcpy(pairs[i].name, head, sizeof head);
  }
  size_t *at = is_k ? &pairs[i].k : is_s ? &pairs[i].s : &pairs[i].ks;
  if (*at != SIZE_MAX)
    return ef__error_set(error, EF_MALFORMED,
                         "spectrum '%s' is there twice (case is ignored)",
                         name);
  *at = index;
  return EF_OK;
}

/* All in pairs, or all as ratios. */
static ef_status check_pairs(const pair *pairs, size_t n, ef_error *error) {
  for (size_t i = 0; i < n; i++) {
    const pair *p = &pairs[i];
    const bool is_ratio = p->ks != SIZE_MAX;
    if (is_ratio != (pairs[0].ks != SIZE_MAX))
      return ef__error_set(error, EF_MALFORMED,
                           "'%s' is given by %s, '%s' otherwise; give all "
                           "colourants in one way",
                           p->name, is_ratio ? "K/S" : "K and S",
                           pairs[0].name);
    if (is_ratio && p->k == SIZE_MAX && p->s == SIZE_MAX)
      continue;
    if (!is_ratio && p->k != SIZE_MAX && p->s != SIZE_MAX)
      continue;
    if (is_ratio)
      return ef__error_set(error, EF_MALFORMED,
                           "'%s' is given by K/S and by %s; keep one", p->name,
                           p->k != SIZE_MAX ? "K" : "S");
    return ef__error_set(error, EF_MALFORMED,
                         "'%s' has no spectrum %s_%s beside %s_%s", p->name,
                         p->name, p->k == SIZE_MAX ? "k" : "s", p->name,
                         p->k == SIZE_MAX ? "s" : "k");
  }
  return EF_OK;
}

static ef_colourants *from_pairs(const ef_spectra *spectra, const pair *pairs,
                                 size_t n, ef_error *error) {
  const char *names[EF_MAX_COLOURANTS];
  const ef_grid *grid = ef_spectra_grid(spectra);
  const double *value = ef_spectra_values(spectra);
  const bool is_ratio = pairs[0].ks != SIZE_MAX;
  const size_t count = grid->count, row_size = count * sizeof(double);
  double *absorption = ef__allocate(2 * n, row_size);
  if (absorption == NULL) {
    ef__error_memory(error, "colourants");
    return NULL;
  }
  double *scattering = absorption + n * count;
  for (size_t i = 0; i < n; i++) {
    names[i] = pairs[i].name;
    memcpy(absorption + i * count,
           value + (is_ratio ? pairs[i].ks : pairs[i].k) * count, row_size);
    if (!is_ratio)
      memcpy(scattering + i * count, value + pairs[i].s * count, row_size);
  }
  ef_colourants *set = ef_colourants_new(n, names, grid, absorption,
                                         is_ratio ? NULL : scattering, error);
  free(absorption);
  return set;
}

ef_colourants *ef_colourants_from_spectra(const ef_spectra *spectra,
                                          ef_error *error) {
  pair pairs[EF_MAX_COLOURANTS];
  size_t n = 0;
  for (size_t i = 0; i < ef_spectra_count(spectra); i++)
    if (place(pairs, &n, spectra, i, error) != EF_OK)
      return NULL;
  return check_pairs(pairs, n, error) == EF_OK
             ? from_pairs(spectra, pairs, n, error)
             : NULL;
}

/* ---- Questions ---------------------------------------------------------- */

size_t ef_colourants_count(const ef_colourants *colourants) {
  return colourants->n;
}

const char *ef_colourants_name(const ef_colourants *colourants, size_t i) {
  return i < colourants->n ? colourants->name[i] : NULL;
}

ef_status ef_colourants_find(const ef_colourants *colourants, const char *name,
                             size_t *index, ef_error *error) {
  for (size_t i = 0; i < colourants->n; i++) {
    if (!ef__name_equal(colourants->name[i], name))
      continue;
    *index = i;
    return EF_OK;
  }
  return ef__error_unknown(error, "colourant", name, colourants->name,
                           colourants->n);
}

const ef_grid *ef_colourants_grid(const ef_colourants *colourants) {
  return &colourants->grid;
}

const double *ef_colourants_absorption(const ef_colourants *colourants,
                                       size_t i) {
  return i < colourants->n ? colourants->absorption + i * colourants->grid.count
                           : NULL;
}

const double *ef_colourants_scattering(const ef_colourants *colourants,
                                       size_t i) {
  return colourants->scattering != NULL && i < colourants->n
             ? colourants->scattering + i * colourants->grid.count
             : NULL;
}
