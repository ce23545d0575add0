/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A display from a table of measurements: what was sent, and what was measured
 * for it. Black, primaries and curves are read off, and every mixture that was
 * measured shows how well the additive model holds. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *const default_names[3] = {"red", "green", "blue"};

/* The table and what is derived from it. A row is `width` numbers. */
typedef struct fit {
  const ef_measurements *table;
  const char *name;
  const ef_notes *notes;
  size_t n;            /* drives */
  size_t width;        /* samples, or 3 */
  const ef_grid *grid; /* NULL: X, Y, Z */
  const double *row;   /* n_rows x width */
  const char *drive_name[EF_MAX_DRIVES];
  void *block;     /* of the arrays below */
  double *black;   /* width */
  double *primary; /* n x width, with the black */
  double *net;     /* n x width, without it */
  double *white;   /* width */
  bool white_known;
  double *xyz;                                /* n_rows x 3, CIE 1931 */
  ef__ramp_point *point;                      /* n_rows + 2 */
  double *ramp;                               /* 2 x (n_rows + 2) */
  double gram[EF_MAX_DRIVES * EF_MAX_DRIVES]; /* net x net */
  ef_device *device; /* built with straight lines, then bent */
} fit;

/* ---- Checks ------------------------------------------------------------ */

static ef_status at_row(const ef_measurements *table, size_t row,
                        ef_error *error) {
  return ef__error_place(error, NULL,
                         table->line != NULL ? table->line[row] : 0, 0, NULL);
}

static ef_status check_rows(const fit *f, ef_error *error) {
  const ef_measurements *table = f->table;
  for (size_t r = 0; r < table->n_rows; r++) {
    for (size_t i = 0; i < f->n; i++) {
      const double drive = table->drive[r * f->n + i];
      if (drive >= 0.0 && drive <= 1.0)
        continue;
      const ef_status status = ef__error_set(
          error, EF_INVALID, "row %zu: device value %g of %s, expected 0 to 1",
          r + 1, drive, f->drive_name[i]);
      at_row(table, r, error);
      return status;
    }
    for (size_t s = 0; s < f->width; s++) {
      if (isfinite(f->row[r * f->width + s]))
        continue;
      const ef_status status = ef__error_set(
          error, EF_INVALID, "row %zu: measured value %zu is not finite", r + 1,
          s + 1);
      at_row(table, r, error);
      return status;
    }
  }
  return EF_OK;
}

static ef_status check_table(const ef_measurements *table, ef_error *error) {
  if (table->n_rows == 0 || table->drive == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a table of measurements without rows");
  if ((table->xyz == NULL) == (table->spectrum == NULL))
    return ef__error_set(error, EF_INVALID,
                         "measurements are either tristimulus values or "
                         "spectra; found %s",
                         table->xyz == NULL ? "neither" : "both");
  if (table->n_drives < 3 || table->n_drives > EF_MAX_DRIVES)
    return ef__error_set(error, EF_INVALID,
                         "found %zu device values a row; a display has 3 to %d",
                         table->n_drives, EF_MAX_DRIVES);
  if (table->drive_name == NULL && table->n_drives != 3)
    return ef__error_set(error, EF_INVALID,
                         "%zu device values a row need names", table->n_drives);
  return table->spectrum != NULL ? ef_grid_check(&table->grid, error) : EF_OK;
}

/* ---- Black, primaries, white ------------------------------------------- */

static bool row_is(const fit *f, size_t row, const double *drive) {
  for (size_t i = 0; i < f->n; i++)
    if (f->table->drive[row * f->n + i] != drive[i])
      return false;
  return true;
}

/* Mean of the rows with exactly these drives; how many there were. */
static size_t average_rows(const fit *f, const double *drive, double *mean) {
  size_t n_found = 0;
  for (size_t s = 0; s < f->width; s++)
    mean[s] = 0.0;
  for (size_t r = 0; r < f->table->n_rows; r++) {
    if (!row_is(f, r, drive))
      continue;
    n_found++;
    for (size_t s = 0; s < f->width; s++)
      mean[s] += f->row[r * f->width + s];
  }
  for (size_t s = 0; n_found > 0 && s < f->width; s++)
    mean[s] /= (double)n_found;
  return n_found;
}

static void fill_gram(fit *f) {
  for (size_t i = 0; i < f->n; i++) {
    for (size_t j = 0; j < f->n; j++) {
      double sum = 0.0;
      for (size_t s = 0; s < f->width; s++)
        sum += f->net[i * f->width + s] * f->net[j * f->width + s];
      f->gram[i * f->n + j] = sum;
    }
  }
}

static ef_status read_corners(fit *f, ef_error *error) {
  double drive[EF_MAX_DRIVES] = {0.0};
  if (average_rows(f, drive, f->black) == 0)
    ef__note(f->notes,
             "%s: no row has all device values 0, so the black is taken as "
             "zero",
             f->name);
  for (size_t i = 0; i < f->n; i++) {
    drive[i] = 1.0;
    if (average_rows(f, drive, f->primary + i * f->width) == 0)
      return ef__error_set(error, EF_NO_ANSWER,
                           "no row shows %s alone at full drive; measure one "
                           "with %s 1 and all others 0",
                           f->drive_name[i], f->drive_name[i]);
    drive[i] = 0.0;
    for (size_t s = 0; s < f->width; s++)
      f->net[i * f->width + s] = f->primary[i * f->width + s] - f->black[s];
  }
  for (size_t i = 0; i < f->n; i++)
    drive[i] = 1.0;
  f->white_known = average_rows(f, drive, f->white) > 0;
  fill_gram(f);
  return EF_OK;
}

/* ---- Curves ------------------------------------------------------------ */

/* The only drive of the row above 0, or n. */
static size_t single_channel(const fit *f, size_t row) {
  size_t found = f->n;
  for (size_t i = 0; i < f->n; i++) {
    if (f->table->drive[row * f->n + i] == 0.0)
      continue;
    if (found < f->n)
      return f->n;
    found = i;
  }
  return found;
}

static bool is_grey(const fit *f, size_t row) {
  const double *drive = f->table->drive + row * f->n;
  for (size_t i = 1; i < f->n; i++)
    if (drive[i] != drive[0])
      return false;
  return drive[0] > 0.0;
}

static double dot_net(const fit *f, size_t row, size_t i) {
  double sum = 0.0;
  for (size_t s = 0; s < f->width; s++)
    sum +=
        f->net[i * f->width + s] * (f->row[row * f->width + s] - f->black[s]);
  return sum;
}

/* Least-squares amount of channel i in a row of that channel alone. */
static double single_amount(const fit *f, size_t row, size_t i) {
  return dot_net(f, row, i) / f->gram[i * f->n + i];
}

/* Least-squares amount of channel i in a row of all channels. More primaries
 * than numbers cannot be told apart: then one luminance share for all. */
static bool grey_amount(const fit *f, size_t row, size_t i, double *amount) {
  double gram[EF_MAX_DRIVES * EF_MAX_DRIVES], right[EF_MAX_DRIVES];
  if (f->width < f->n) {
    double sum = 0.0;
    for (size_t j = 0; j < f->n; j++)
      sum += f->net[j * f->width + 1];
    *amount = (f->row[row * f->width + 1] - f->black[1]) / sum;
    return isfinite(*amount);
  }
  memcpy(gram, f->gram, f->n * f->n * sizeof *gram);
  for (size_t j = 0; j < f->n; j++)
    right[j] = dot_net(f, row, j);
  if (!ef__solve(f->n, gram, 1, right))
    return false;
  *amount = right[i];
  return true;
}

/* Points of channel i between 0 and full, from its own ramp or the grey one.
 * A ramp ends where the primary, or the white, was measured. */
static size_t collect(fit *f, size_t i, bool grey, bool *has_inner) {
  size_t n = 0;
  bool has_end = false;
  *has_inner = false;
  f->point[n++] = (ef__ramp_point){0.0, 0.0, 1.0};
  for (size_t r = 0; r < f->table->n_rows; r++) {
    if (grey ? !is_grey(f, r) : single_channel(f, r) != i)
      continue;
    const double drive = f->table->drive[r * f->n + i];
    double amount = 0.0;
    if (!grey)
      amount = single_amount(f, r, i);
    else if (!grey_amount(f, r, i, &amount))
      continue;
    has_end |= drive == 1.0;
    *has_inner |= drive < 1.0;
    f->point[n++] = (ef__ramp_point){drive, amount, 1.0};
  }
  if (!has_end)
    f->point[n++] = (ef__ramp_point){1.0, 1.0, 1.0};
  return n;
}

static ef_status put_curve(fit *f, size_t i, ef_tone_curve *curve) {
  if (curve == NULL)
    return EF_NO_MEMORY;
  ef_tone_curve_free(f->device->curve[i]);
  f->device->curve[i] = curve;
  return EF_OK;
}

static ef_status build_ramp(fit *f, size_t i, size_t n, bool grey,
                            ef_error *error) {
  size_t n_pooled;
  n = ef__ramp_make_monotone(n, f->point, &n_pooled);
  double *drive = f->ramp, *level = f->ramp + n;
  for (size_t k = 0; k < n; k++) {
    drive[k] = f->point[k].drive;
    level[k] = f->point[k].level;
  }
  if (n_pooled > 0)
    ef__note(
        f->notes,
        "%s: the %s ramp of %s does not rise everywhere; points pooled with "
        "a neighbour: %zu",
        f->name, grey ? "grey" : "single-channel", f->drive_name[i], n_pooled);
  return put_curve(f, i, ef_tone_curve_from_ramp(n, drive, level, error));
}

static ef_status fit_curve(fit *f, size_t i, ef_error *error) {
  bool has_inner;
  bool grey = false;
  size_t n = collect(f, i, grey, &has_inner);
  if (!has_inner) {
    grey = true;
    n = collect(f, i, grey, &has_inner);
    if (has_inner)
      ef__note(f->notes,
               "%s: %s has no ramp of its own, its curve is read off the grey "
               "ramp",
               f->name, f->drive_name[i]);
  }
  if (has_inner)
    return build_ramp(f, i, n, grey, error);
  ef__note(f->notes,
           "%s: no row shows %s between zero and full drive, so its curve is "
           "taken as linear",
           f->name, f->drive_name[i]);
  return EF_OK;
}

/* Curves of the settings come before those of the table. */
static ef_status read_curves(fit *f, const ef_display_settings *settings,
                             ef_error *error) {
  ef_status status = EF_OK;
  for (size_t i = 0; status == EF_OK && i < f->n; i++)
    if (settings->n_curves == 0)
      status = fit_curve(f, i, error);
  return status;
}

/* ---- Residuals --------------------------------------------------------- */

static bool is_mixture(const fit *f, size_t row) {
  size_t n_on = 0;
  for (size_t i = 0; i < f->n; i++)
    n_on += f->table->drive[row * f->n + i] > 0.0;
  return n_on >= 2;
}

static ef_xyz scaled(const double xyz[3], double factor) {
  return (ef_xyz){factor * xyz[0], factor * xyz[1], factor * xyz[2]};
}

/* `corner`: XYZ of black, primaries with the black, and white. */
static void predict(const fit *f, const double *corner, const double *drive,
                    double xyz[3]) {
  for (size_t c = 0; c < 3; c++) {
    xyz[c] = corner[c];
    for (size_t i = 0; i < f->n; i++)
      xyz[c] += ef_device_amount(f->device, i, drive[i], NULL) *
                (corner[3 * (1 + i) + c] - corner[c]);
  }
}

static ef_status read_residuals(fit *f, ef_residual *residual,
                                size_t *n_residuals, ef_error *error) {
  const ef_measurements *table = f->table;
  double corner[3 * (EF_MAX_DRIVES + 2)];
  double *white = corner + 3 * (1 + f->n);
  const double full[EF_MAX_DRIVES] = {1, 1, 1, 1, 1, 1, 1, 1};
  ef_status status =
      ef__light_xyz_1931(f->grid, table->absolute, 1, f->black, corner, error);
  if (status == EF_OK)
    status = ef__light_xyz_1931(f->grid, table->absolute, f->n, f->primary,
                                corner + 3, error);
  if (status == EF_OK && f->white_known)
    status =
        ef__light_xyz_1931(f->grid, table->absolute, 1, f->white, white, error);
  if (status == EF_OK)
    status = ef__light_xyz_1931(f->grid, table->absolute, table->n_rows, f->row,
                                f->xyz, error);
  if (status != EF_OK)
    return status;
  if (!f->white_known)
    predict(f, corner, full, white);
  const double factor = 100.0 / white[1];
  size_t n = 0;
  for (size_t r = 0; r < table->n_rows; r++) {
    if (!is_mixture(f, r))
      continue;
    double predicted[3];
    predict(f, corner, table->drive + r * f->n, predicted);
    residual[n++] =
        (ef_residual){r, scaled(f->xyz + 3 * r, factor),
                      scaled(predicted, factor), scaled(white, factor)};
  }
  *n_residuals = n;
  return EF_OK;
}

/* ---- Construction ------------------------------------------------------ */

static ef_status allocate(fit *f, ef_error *error) {
  const size_t n_rows = f->table->n_rows, width = f->width;
  const ef__part parts[] = {
      {&f->black, width, sizeof(double)},
      {&f->primary, f->n * width, sizeof(double)},
      {&f->net, f->n * width, sizeof(double)},
      {&f->white, width, sizeof(double)},
      {&f->xyz, n_rows, 3 * sizeof(double)},
      {&f->point, n_rows + 2, sizeof(ef__ramp_point)},
      {&f->ramp, n_rows + 2, 2 * sizeof(double)},
  };
  f->block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  return f->block != NULL ? EF_OK
                          : ef__error_memory(error, "a table of measurements");
}

/* With straight lines for curves: its checks come before the fit. */
static ef_status build(fit *f, const ef_display_settings *settings,
                       ef_error *error) {
  ef_tone_curve *linear = ef_tone_curve_new("linear", error);
  if (linear == NULL)
    return EF_NO_MEMORY;
  const ef_tone_curve *curve[EF_MAX_DRIVES];
  for (size_t i = 0; i < f->n; i++)
    curve[i] = linear;
  const ef__display_parts parts = {
      .name = f->name,
      .n_primaries = f->n,
      .primary_name = f->drive_name,
      .grid = f->grid,
      .absolute = f->table->absolute,
      .black = f->black,
      .primary = f->primary,
      .white = f->white_known ? f->white : NULL,
      .curve = curve,
  };
  f->device = ef__display_new(&parts, settings, error);
  ef_tone_curve_free(linear);
  return f->device != NULL ? EF_OK : EF_INVALID;
}

/* The steps in order; the device of the fit is whole when all went well. */
static ef_status run(fit *f, const ef_display_settings *settings,
                     ef_residual *residual, size_t *n_residuals,
                     ef_error *error) {
  ef_status status = check_rows(f, error);
  if (status == EF_OK)
    status = allocate(f, error);
  if (status == EF_OK)
    status = read_corners(f, error);
  if (status == EF_OK)
    status = build(f, settings, error);
  if (status == EF_OK)
    status = read_curves(f, settings, error);
  if (status == EF_OK && residual != NULL)
    status = read_residuals(f, residual, n_residuals, error);
  return status;
}

ef_device *ef_display_from_measurements(const char *name,
                                        const ef_measurements *measurements,
                                        const ef_display_settings *settings,
                                        ef_residual *residual,
                                        size_t *n_residuals, ef_error *error) {
  const ef_display_settings plain = ef_display_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (name == NULL || measurements == NULL ||
      (residual != NULL && n_residuals == NULL)) {
    ef__error_set(error, EF_INVALID,
                  "a display needs a name and measurements, and residuals a "
                  "place for their number");
    return NULL;
  }
  if (check_table(measurements, error) != EF_OK)
    return NULL;
  const bool spectral = measurements->spectrum != NULL;
  fit f = {
      .table = measurements,
      .name = name,
      .notes = settings->notes,
      .n = measurements->n_drives,
      .width = spectral ? measurements->grid.count : 3,
      .grid = spectral ? &measurements->grid : NULL,
      .row = spectral ? measurements->spectrum : measurements->xyz,
  };
  for (size_t i = 0; i < f.n; i++)
    f.drive_name[i] = measurements->drive_name != NULL
                          ? measurements->drive_name[i]
                          : default_names[i];
  if (run(&f, settings, residual, n_residuals, error) != EF_OK) {
    ef_device_free(f.device);
    f.device = NULL;
  }
  free(f.block);
  return f.device;
}
