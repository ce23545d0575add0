/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Absorption and scattering of colourants from drawdowns, one wavelength after
 * the other: the unknowns that may not be negative and that make the squared
 * relative errors of the reflectances least. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum {
  FIRST_STEPS = 8, /* of each start; the best goes on */
  MOST_STEPS = 200,
  GRID_STARTS = 9
};

/* The sum of squares at hand, for one wavelength. Unknowns are the absorptions,
 * then in two-constant theory the scatterings; one of these may be fixed. */
typedef struct fit {
  const ef_drawdowns *table;
  ef_colourant_fit_settings settings;
  size_t n, n_rows;
  size_t n_unknowns;
  size_t fixed;   /* the unknown that is 1: sets the unit; SIZE_MAX: none */
  bool is_opaque; /* all drawdowns */
  size_t s;       /* the wavelength */
  void *block;
  double *inside;  /* n_rows: measured, corrected for the surface */
  double *backing; /* n_rows: likewise */
  double *weight;  /* n_rows: 1 / measured */
  double *error;   /* n_rows: weighted */
  double *slope;   /* n_rows x n_unknowns */
  double *system;  /* (n_rows + n_unknowns) x n_unknowns */
  double *right;   /* n_rows + n_unknowns */
  double *scratch;
  double *absorption; /* n x count */
  double *scattering;
  double *square; /* n_rows: squared relative errors of all wavelengths */
} fit;

static const double *shares(const fit *f, size_t row) {
  return f->table->concentration + row * f->n;
}

static double thickness(const fit *f, size_t row) {
  return f->table->thickness != NULL ? f->table->thickness[row] : HUGE_VAL;
}

/* Share of colourant i in the mixture: in single-constant theory the base is
 * always whole. */
static double share(const fit *f, size_t row, size_t i) {
  return f->settings.single_constant && i == f->settings.base
             ? 1.0
             : shares(f, row)[i];
}

/* ---- Checks ------------------------------------------------------------- */

ef_colourant_fit_settings ef_colourant_fit_settings_default(void) {
  const ef_colourant_fit_settings settings = {
      .single_constant = false,
      .base = SIZE_MAX,
      .surface = ef_surface_none(),
      .least_reflectance = 0.01,
  };
  return settings;
}

static ef_status check_table(const ef_drawdowns *table,
                             const ef_colourant_fit_settings *settings,
                             ef_error *error) {
  if (table->n_drawdowns == 0 || table->concentration == NULL ||
      table->reflectance == NULL)
    return ef__error_set(error, EF_INVALID, "a table without drawdowns");
  if (table->n_colourants == 0 || table->n_colourants > EF_MAX_COLOURANTS)
    return ef__error_set(error, EF_INVALID, "%zu colourants; a set has 1 to %d",
                         table->n_colourants, EF_MAX_COLOURANTS);
  if (settings->base != SIZE_MAX && settings->base >= table->n_colourants)
    return ef__error_set(error, EF_INVALID, "the base is colourant %zu of %zu",
                         settings->base + 1, table->n_colourants);
  if (settings->single_constant && settings->base == SIZE_MAX)
    return ef__error_set(error, EF_INVALID,
                         "single-constant theory needs a base, which the "
                         "others are added to");
  if (!(settings->least_reflectance > 0.0 &&
        settings->least_reflectance <= 1.0))
    return ef__error_set(error, EF_INVALID,
                         "least reflectance %g; expected above 0 and at most 1",
                         settings->least_reflectance);
  ef_status status = ef__surface_check(&settings->surface, error);
  return status == EF_OK ? ef_grid_check(&table->grid, error) : status;
}

static ef_status at_row(const fit *f, size_t row, ef_error *error) {
  if (f->table->line != NULL)
    ef__error_place(error, NULL, f->table->line[row], 0, NULL);
  return EF_INVALID;
}

static ef_status check_spectrum(const fit *f, size_t row, const double *value,
                                const char *what, ef_error *error) {
  const size_t count = f->table->grid.count;
  for (size_t s = 0; s < count; s++) {
    if (value[row * count + s] >= 0.0 && value[row * count + s] <= 1.0)
      continue;
    ef__error_set(error, EF_INVALID,
                  "drawdown %zu: %s %g at %g nm, expected 0 to 1", row + 1,
                  what, value[row * count + s],
                  ef_grid_wavelength(&f->table->grid, s));
    return at_row(f, row, error);
  }
  return EF_OK;
}

static ef_status check_row(const fit *f, size_t row, ef_error *error) {
  double sum = 0.0;
  for (size_t i = 0; i < f->n; i++) {
    const double c = shares(f, row)[i];
    sum += c;
    if (c >= 0.0 && isfinite(c))
      continue;
    ef__error_set(error, EF_INVALID,
                  "drawdown %zu: concentration %g, expected zero or more",
                  row + 1, c);
    return at_row(f, row, error);
  }
  const double x = thickness(f, row);
  if (!(sum > 0.0) && !f->settings.single_constant) {
    ef__error_set(error, EF_INVALID, "drawdown %zu holds no colourant",
                  row + 1);
    return at_row(f, row, error);
  }
  if (!(x > 0.0) || (!isinf(x) && (f->settings.single_constant ||
                                   f->table->backing == NULL))) {
    ef__error_set(error, EF_INVALID,
                  !(x > 0.0) ? "drawdown %zu: thickness %g, expected above zero"
                  : f->settings.single_constant
                      ? "drawdown %zu: thickness %g, but single-constant "
                        "theory is fitted to opaque ones"
                      : "drawdown %zu: thickness %g, but the reflectance of "
                        "what it lies on is not given",
                  row + 1, x);
    return at_row(f, row, error);
  }
  ef_status status =
      check_spectrum(f, row, f->table->reflectance, "reflectance", error);
  if (status == EF_OK && !isinf(x))
    status = check_spectrum(f, row, f->table->backing, "backing", error);
  return status;
}

/* Absorption and scattering of what stands in one drawdown alone cannot be
 * told apart, unless that one sets the unit. */
static ef_status check_numbers(const fit *f, ef_error *error) {
  for (size_t i = 0; i < f->n; i++) {
    size_t n_found = 0;
    for (size_t r = 0; r < f->n_rows; r++)
      n_found += share(f, r, i) > 0.0;
    const bool one_is_enough =
        f->settings.single_constant || f->fixed == f->n + i;
    const size_t n_needed = one_is_enough ? 1 : 2;
    if (n_found >= n_needed)
      continue;
    char number[EF_NUMBER_TEXT];
    ef_number_format((double)(i + 1), number);
    return ef__error_set(
        error, EF_NO_ANSWER, "colourant '%s' stands in %zu drawdown%s; %s",
        f->table->name != NULL ? f->table->name[i] : number, n_found,
        n_found == 1 ? "" : "s",
        one_is_enough ? "1 is needed"
                      : "2 of different compositions are needed to tell its "
                        "absorption from its scattering");
  }
  return EF_OK;
}

/* ---- Errors of the reflectances ----------------------------------------- */

static void take_wavelength(fit *f, size_t s) {
  const size_t count = f->table->grid.count;
  const ef_surface *surface = &f->settings.surface;
  f->s = s;
  for (size_t r = 0; r < f->n_rows; r++) {
    const double measured = f->table->reflectance[r * count + s];
    f->weight[r] = 1.0 / fmax(measured, f->settings.least_reflectance);
    f->inside[r] = fmax(ef_surface_inside(surface, measured), 0.0);
    f->backing[r] =
        isinf(thickness(f, r))
            ? 0.0
            : fmax(ef_surface_inside(surface, f->table->backing[r * count + s]),
                   0.0);
  }
}

/* Weighted errors at x, their slopes if asked for; their sum of squares. */
static double take_errors(fit *f, const double *x, bool with_slopes) {
  const size_t count = f->table->grid.count;
  const bool two = !f->settings.single_constant;
  double sum = 0.0;
  for (size_t r = 0; r < f->n_rows; r++) {
    double k = 0.0, sc = two ? 0.0 : 1.0, along[2], outer;
    for (size_t i = 0; i < f->n; i++) {
      k += share(f, r, i) * x[i];
      if (two)
        sc += share(f, r, i) * x[f->n + i];
    }
    const double inside =
        ef_km_reflectance(k, sc, thickness(f, r), f->backing[r], along);
    const double outside =
        ef_surface_outside(&f->settings.surface, inside, &outer);
    const double w = f->weight[r];
    f->error[r] = w * (outside - f->table->reflectance[r * count + f->s]);
    sum += f->error[r] * f->error[r];
    for (size_t i = 0; with_slopes && i < f->n; i++) {
      double *row = f->slope + r * f->n_unknowns;
      row[i] = w * outer * along[0] * share(f, r, i);
      if (two)
        row[f->n + i] = w * outer * along[1] * share(f, r, i);
    }
  }
  return sum;
}

/* ---- Steps -------------------------------------------------------------- */

/* The unknowns of the linearised problem in `to`, from those at x with slopes
 * and errors taken there; `damping` holds them back in units of their own
 * slopes (Marquardt 1963). */
static bool solve_linear(fit *f, const double *x, double damping, double *to) {
  const size_t m = f->n_unknowns;
  size_t column[2 * EF_MAX_COLOURANTS], n_columns = 0;
  double length[2 * EF_MAX_COLOURANTS] = {0.0};
  double solution[2 * EF_MAX_COLOURANTS];
  for (size_t j = 0; j < m; j++)
    if (j != f->fixed)
      column[n_columns++] = j;
  for (size_t r = 0; r < f->n_rows; r++) {
    f->right[r] = -f->error[r];
    for (size_t c = 0; c < n_columns; c++) {
      const double slope = f->slope[r * m + column[c]];
      f->system[r * n_columns + c] = slope;
      f->right[r] += slope * x[column[c]];
      length[c] += slope * slope;
    }
  }
  for (size_t c = 0; c < n_columns; c++) {
    double *row = f->system + (f->n_rows + c) * n_columns;
    memset(row, 0, n_columns * sizeof *row);
    row[c] = sqrt(damping * length[c]);
    f->right[f->n_rows + c] = row[c] * x[column[c]];
  }
  if (!ef__nnls(f->n_rows + n_columns, n_columns, f->system, f->right,
                f->scratch, solution, NULL))
    return false;
  memcpy(to, x, m * sizeof *to);
  for (size_t c = 0; c < n_columns; c++)
    to[column[c]] = solution[c];
  return true;
}

static bool is_same(size_t n, const double *a, const double *b) {
  for (size_t j = 0; j < n; j++)
    if (fabs(a[j] - b[j]) > 1e-12 * fmax(fabs(a[j]), fabs(b[j])))
      return false;
  return true;
}

/* Walks down from x by at most `most` steps; the sum of squares reached. */
static double descend(fit *f, double *x, int most) {
  double damping = 1e-3;
  double sum = take_errors(f, x, true);
  for (int step = 0; step < most && sum > 0.0; step++) {
    double to[2 * EF_MAX_COLOURANTS];
    if (!solve_linear(f, x, damping, to))
      break;
    const double reached = take_errors(f, to, true);
    const bool is_end =
        is_same(f->n_unknowns, x, to) || fabs(sum - reached) <= 1e-15 * sum;
    if (reached < sum) {
      memcpy(x, to, f->n_unknowns * sizeof *x);
      sum = reached;
      damping = fmax(0.1 * damping, 1e-15);
    } else {
      take_errors(f, x, true); /* what belongs to x */
      damping *= 10.0;
    }
    if (is_end || damping > 1e15)
      break;
  }
  return sum;
}

/* ---- Starts ------------------------------------------------------------- */

/* For opaque samples sum c (k - q s) = 0 with the measured ratio q = K/S, one
 * equation a sample, weighted so that its error is that of the reflectance
 * relative to itself: dR / R = -dq / sqrt(q^2 + 2 q), dq = error / S. The sum
 * of the shares stands for S. */
static bool start_linear(fit *f, double *x) {
  const size_t m = f->n_unknowns;
  size_t n_columns = 0;
  for (size_t r = 0; r < f->n_rows; r++) {
    const double inside = fmax(f->inside[r], DBL_EPSILON);
    const double q = ef_km_ratio(fmin(inside, 1.0));
    double whole = 0.0;
    for (size_t i = 0; i < f->n; i++)
      whole += share(f, r, i);
    const double w =
        1.0 / (sqrt(q * (q + 2.0)) * whole + f->settings.least_reflectance);
    const bool single = f->settings.single_constant;
    f->right[r] = single ? w * q : 0.0;
    n_columns = 0;
    double *row = f->system + r * (m - (f->fixed < m ? 1 : 0));
    for (size_t j = 0; j < m; j++) {
      const double c = share(f, r, j % f->n);
      const double value = w * (j < f->n ? c : -q * c);
      if (j == f->fixed)
        f->right[r] = -value;
      else
        row[n_columns++] = value;
    }
  }
  double solution[2 * EF_MAX_COLOURANTS];
  if (!ef__nnls(f->n_rows, n_columns, f->system, f->right, f->scratch, solution,
                NULL))
    return false;
  for (size_t j = 0, c = 0; j < m; j++)
    x[j] = j == f->fixed ? 1.0 : solution[c++];
  return true;
}

/* All absorptions alike and all scatterings alike, each so that a typical film
 * has a tenth, one or ten of it. */
static void start_grid(const fit *f, int which, double *x) {
  static const double size[3] = {0.1, 1.0, 10.0};
  double sum = 0.0;
  size_t n_films = 0;
  for (size_t r = 0; r < f->n_rows; r++) {
    if (isinf(thickness(f, r)))
      continue;
    for (size_t i = 0; i < f->n; i++)
      sum += shares(f, r)[i] * thickness(f, r);
    n_films++;
  }
  const double unit = (double)n_films / sum;
  for (size_t i = 0; i < f->n; i++) {
    x[i] = unit * size[which % 3];
    x[f->n + i] = unit * size[which / 3];
  }
}

/* The best of all starts goes on to the end. */
static void fit_wavelength(fit *f, size_t s, double *x) {
  double least = HUGE_VAL;
  take_wavelength(f, s);
  if (f->is_opaque) {
    if (!start_linear(f, x))
      for (size_t j = 0; j < f->n_unknowns; j++)
        x[j] = 1.0;
  } else {
    for (int k = 0; k < GRID_STARTS; k++) {
      double trial[2 * EF_MAX_COLOURANTS];
      start_grid(f, k, trial);
      const double sum = descend(f, trial, FIRST_STEPS);
      if (sum >= least)
        continue;
      least = sum;
      memcpy(x, trial, f->n_unknowns * sizeof *x);
    }
  }
  descend(f, x, MOST_STEPS);
}

/* ---- All wavelengths ---------------------------------------------------- */

static void fit_all(fit *f, double *relative_rms) {
  const size_t count = f->table->grid.count;
  double x[2 * EF_MAX_COLOURANTS];
  for (size_t s = 0; s < count; s++) {
    fit_wavelength(f, s, x);
    for (size_t i = 0; i < f->n; i++) {
      f->absorption[i * count + s] = x[i];
      if (!f->settings.single_constant)
        f->scattering[i * count + s] = x[f->n + i];
    }
    take_errors(f, x, false);
    for (size_t r = 0; r < f->n_rows; r++)
      f->square[r] += f->error[r] * f->error[r];
  }
  for (size_t r = 0; relative_rms != NULL && r < f->n_rows; r++)
    relative_rms[r] = sqrt(f->square[r] / (double)count);
}

static ef_status allocate(fit *f, ef_error *error) {
  const size_t count = f->table->grid.count;
  const size_t n_equations = f->n_rows + f->n_unknowns;
  const size_t n_scratch = ef__nnls_scratch(n_equations, f->n_unknowns);
  const ef__part parts[] = {
      {&f->inside, f->n_rows, sizeof(double)},
      {&f->backing, f->n_rows, sizeof(double)},
      {&f->weight, f->n_rows, sizeof(double)},
      {&f->error, f->n_rows, sizeof(double)},
      {&f->square, f->n_rows, sizeof(double)},
      {&f->slope, f->n_rows, f->n_unknowns * sizeof(double)},
      {&f->system, n_equations, f->n_unknowns * sizeof(double)},
      {&f->right, n_equations, sizeof(double)},
      {&f->scratch, n_scratch, sizeof(double)},
      {&f->absorption, count, f->n * sizeof(double)},
      {&f->scattering, count, f->n * sizeof(double)},
  };
  f->block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  return f->block != NULL ? EF_OK : ef__error_memory(error, "drawdowns");
}

static ef_status check_rows(const fit *f, ef_error *error) {
  ef_status status = EF_OK;
  for (size_t r = 0; status == EF_OK && r < f->n_rows; r++)
    status = check_row(f, r, error);
  return status == EF_OK ? check_numbers(f, error) : status;
}

/* What sets the unit, when nothing else does. */
static void choose_unit(fit *f) {
  f->is_opaque = true;
  for (size_t r = 0; r < f->n_rows; r++)
    f->is_opaque &= isinf(thickness(f, r));
  f->fixed = SIZE_MAX;
  if (f->is_opaque && !f->settings.single_constant)
    f->fixed = f->n + (f->settings.base != SIZE_MAX ? f->settings.base : 0);
}

ef_colourants *ef_colourants_fit(const ef_drawdowns *drawdowns,
                                 const ef_colourant_fit_settings *settings,
                                 double *relative_rms, ef_error *error) {
  const ef_colourant_fit_settings plain = ef_colourant_fit_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (drawdowns == NULL) {
    ef__error_set(error, EF_INVALID, "a fit needs drawdowns");
    return NULL;
  }
  if (check_table(drawdowns, settings, error) != EF_OK)
    return NULL;
  fit f = {.table = drawdowns,
           .settings = *settings,
           .n = drawdowns->n_colourants,
           .n_rows = drawdowns->n_drawdowns};
  f.n_unknowns = settings->single_constant ? f.n : 2 * f.n;
  choose_unit(&f);
  if (check_rows(&f, error) != EF_OK || allocate(&f, error) != EF_OK)
    return NULL;
  fit_all(&f, relative_rms);
  ef_colourants *fitted =
      ef_colourants_new(f.n, drawdowns->name, &drawdowns->grid, f.absorption,
                        settings->single_constant ? NULL : f.scattering, error);
  free(f.block);
  return fitted;
}
