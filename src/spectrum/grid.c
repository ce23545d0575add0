/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "spectrum/spectrum_private.h"

#include <math.h>
#include <string.h>

#include "base/base_private.h"

/* Two wavelengths are the same when they differ by less than this, relative:
 * far below any instrument, far above the rounding of start + i * step. */
static const double same_relative = 1e-9;
/* Steps within this share of themselves count as even: what is left when an
 * instrument writes wavelengths with seven digits. */
static const double even_share = 1e-6;

ef_grid ef_grid_standard(void) {
  return (ef_grid){.count = 471, .start_nm = 360, .step_nm = 1};
}

double ef_grid_wavelength(const ef_grid *grid, size_t i) {
  if (grid->wavelength_nm != NULL)
    return grid->wavelength_nm[i];
  return grid->start_nm + (double)i * grid->step_nm;
}

static ef_status check_even(const ef_grid *grid, ef_error *error) {
  if (!isfinite(grid->start_nm) || !(grid->start_nm > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "sample 1 is at %g nm; wavelengths must be above zero",
                         grid->start_nm);
  }
  if (grid->count == 1)
    return EF_OK;
  if (!isfinite(grid->step_nm) || !(grid->step_nm > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "the step is %g nm; it must be above zero",
                         grid->step_nm);
  }
  const double last = ef_grid_wavelength(grid, grid->count - 1);
  const double before = ef_grid_wavelength(grid, grid->count - 2);
  if (!isfinite(last) || !(last > before)) {
    return ef__error_set(error, EF_INVALID,
                         "a step of %g nm from %g nm does not reach sample %zu",
                         grid->step_nm, grid->start_nm, grid->count);
  }
  return EF_OK;
}

ef_status ef_grid_check(const ef_grid *grid, ef_error *error) {
  if (grid->count == 0) {
    return ef__error_set(error, EF_INVALID, "a grid needs at least one sample");
  }
  if (grid->wavelength_nm == NULL)
    return check_even(grid, error);
  double before = 0;
  for (size_t i = 0; i < grid->count; ++i) {
    const double at = grid->wavelength_nm[i];
    if (!isfinite(at) || !(at > 0)) {
      return ef__error_set(
          error, EF_INVALID,
          "sample %zu is at %g nm; wavelengths must be above zero", i + 1, at);
    }
    if (!(at > before)) {
      return ef__error_set(
          error, EF_INVALID,
          "sample %zu is at %g nm after %g nm; wavelengths must increase",
          i + 1, at, before);
    }
    before = at;
  }
  return EF_OK;
}

static bool is_same(double a, double b) {
  return fabs(a - b) <= same_relative * fmax(fabs(a), fabs(b));
}

bool ef_grid_equal(const ef_grid *a, const ef_grid *b) {
  if (a->count != b->count)
    return false;
  for (size_t i = 0; i < a->count; ++i) {
    if (!is_same(ef_grid_wavelength(a, i), ef_grid_wavelength(b, i))) {
      return false;
    }
  }
  return true;
}

ef_grid ef_grid_simplify(const ef_grid *grid) {
  if (grid->wavelength_nm == NULL || grid->count < 2)
    return *grid;
  const double start = grid->wavelength_nm[0];
  const double length = grid->wavelength_nm[grid->count - 1] - start;
  const ef_grid even = {.count = grid->count,
                        .start_nm = start,
                        .step_nm = length / (double)(grid->count - 1)};
  for (size_t i = 1; i < grid->count; ++i) {
    const double off = grid->wavelength_nm[i] - ef_grid_wavelength(&even, i);
    if (fabs(off) > even_share * even.step_nm)
      return *grid;
  }
  return even;
}

size_t ef__grid_storage(const ef_grid *grid) {
  return grid->wavelength_nm != NULL ? grid->count : 0;
}

ef_grid ef__grid_copy(const ef_grid *grid, double *storage) {
  ef_grid copy = *grid;
  if (grid->wavelength_nm == NULL)
    return copy;
  memcpy(storage, grid->wavelength_nm, grid->count * sizeof *storage);
  copy.wavelength_nm = storage;
  return copy;
}

/* Last sample at or before the wavelength; the caller knows there is one. */
static size_t last_not_above(const ef_grid *grid, double wavelength_nm) {
  size_t low = 0;
  size_t high = grid->count;
  while (high - low > 1) {
    const size_t middle = low + (high - low) / 2;
    if (ef_grid_wavelength(grid, middle) <= wavelength_nm) {
      low = middle;
    } else {
      high = middle;
    }
  }
  return low;
}

ef__place ef__grid_locate(const ef_grid *grid, double wavelength_nm,
                          size_t *i) {
  const size_t last = grid->count - 1;
  *i = 0;
  if (is_same(wavelength_nm, ef_grid_wavelength(grid, 0)))
    return EF__AT;
  if (wavelength_nm < ef_grid_wavelength(grid, 0))
    return EF__BELOW;
  *i = last_not_above(grid, wavelength_nm);
  if (is_same(wavelength_nm, ef_grid_wavelength(grid, *i)))
    return EF__AT;
  if (*i == last)
    return EF__ABOVE;
  if (is_same(wavelength_nm, ef_grid_wavelength(grid, *i + 1))) {
    ++*i;
    return EF__AT;
  }
  return EF__WITHIN;
}
