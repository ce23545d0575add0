/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Displays: the light at a drive is the black, the reflected room light, and
 * for each primary its amount times what it adds to the black. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef struct display {
  ef_device device;
  size_t width;       /* samples of a spectrum, or 3: X, Y, Z */
  void *block;        /* of the two arrays */
  double *background; /* black and room light */
  double *primary;    /* n_drives x width, without the black */
  bool white_known;   /* measured; for ef_display_additivity */
  double white[3];    /* CIE 1931, in the dark */
  double sum[3];      /* black and all primaries, in the dark */
} display;

static const display *as_display(const ef_device *device) {
  return (const display *)device;
}

/* ---- What every kind of device answers --------------------------------- */

static void release(ef_device *device) {
  free(((display *)device)->block);
}

static void spectrum(const ef_device *device, const double *amount, double *out,
                     double *jacobian) {
  const display *d = as_display(device);
  const size_t n = device->n_drives;
  for (size_t s = 0; s < d->width; s++) {
    double sum = d->background[s];
    for (size_t i = 0; i < n; i++) {
      const double slope = d->primary[i * d->width + s];
      sum += amount[i] * slope;
      if (jacobian != NULL)
        jacobian[s * n + i] = slope;
    }
    out[s] = sum;
  }
}

/* Background and primaries as `observer` sees them: (1 + n) x 3. */
static ef_status fold(const display *d, const ef_observer *observer,
                      const ef_notes *notes, double *xyz, ef_error *error) {
  const ef_device *device = &d->device;
  if (device->grid.count == 0) {
    if (strcmp(ef_observer_name(observer), "cie-1931") != 0)
      return ef__error_set(error, EF_NO_ANSWER,
                           "'%s' is known by tristimulus values of the "
                           "observer cie-1931 only; observer %s needs the "
                           "spectra of its primaries",
                           device->name, ef_observer_name(observer));
    memcpy(xyz, d->background, 3 * sizeof *xyz);
    memcpy(xyz + 3, d->primary, device->n_drives * 3 * sizeof *xyz);
    return EF_OK;
  }
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = device->absolute;
  ef_weights *weights = ef_observer_weights(
      observer, EF_TRISTIMULUS, &device->grid, &viewing, notes, error);
  if (weights == NULL)
    return EF_NO_MEMORY;
  ef_status status = ef_weights_apply(weights, 1, d->background, 1, xyz, error);
  if (status == EF_OK)
    status = ef_weights_apply(weights, device->n_drives, d->primary, 1, xyz + 3,
                              error);
  ef_weights_free(weights);
  return status;
}

static ef_status see(const ef_device *device, const ef_observer *observer,
                     const ef_illuminant *illuminant, const ef_notes *notes,
                     ef__colour_map *map, ef_error *error) {
  (void)illuminant;
  double xyz[3 * (1 + EF_MAX_DRIVES)];
  const ef_status status =
      fold(as_display(device), observer, notes, xyz, error);
  if (status != EF_OK)
    return status;
  const size_t n = device->n_drives;
  map->affine = true;
  for (size_t c = 0; c < 3; c++) {
    map->origin[c] = xyz[c];
    map->white[c] = xyz[c];
    for (size_t i = 0; i < n; i++) {
      map->vector[c * n + i] = xyz[3 * (1 + i) + c];
      map->white[c] += xyz[3 * (1 + i) + c];
    }
  }
  return EF_OK;
}

static const ef__device_class display_class = {
    .kind = "display",
    .reflects = false,
    .release = release,
    .spectrum = spectrum,
    .see = see,
};

/* ---- Checks ------------------------------------------------------------ */

ef_display_settings ef_display_settings_default(void) {
  const ef_display_settings settings = {
      .n_curves = 0,
      .curve = NULL,
      .ambient_lux = 0.0,
      .screen_reflectance = 0.0,
      .ambient_illuminant = NULL,
      .notes = NULL,
  };
  return settings;
}

static ef_status check_settings(const ef_display_settings *settings,
                                size_t n_drives, ef_error *error) {
  const size_t n = settings->n_curves;
  if (n > 1 && n != n_drives)
    return ef__error_set(error, EF_INVALID,
                         "%zu tone curves for %zu primaries; give one for "
                         "each, one for all, or none",
                         n, n_drives);
  for (size_t i = 0; i < n; i++)
    if (settings->curve == NULL || settings->curve[i] == NULL)
      return ef__error_set(error, EF_INVALID, "tone curve %zu is missing",
                           i + 1);
  if (!isfinite(settings->ambient_lux) || settings->ambient_lux < 0.0)
    return ef__error_set(error, EF_INVALID,
                         "room light of %g lux; expected 0 or more",
                         settings->ambient_lux);
  if (!(settings->screen_reflectance >= 0.0 &&
        settings->screen_reflectance <= 1.0))
    return ef__error_set(error, EF_INVALID,
                         "screen reflectance %g; expected a ratio from 0 to 1",
                         settings->screen_reflectance);
  if (settings->ambient_lux > 0.0 && settings->ambient_illuminant == NULL)
    return ef__error_set(error, EF_INVALID,
                         "room light of %g lux needs its illuminant",
                         settings->ambient_lux);
  return EF_OK;
}

static ef_status check_parts(const ef__display_parts *parts,
                             const ef_display_settings *settings,
                             ef_error *error) {
  const size_t n = parts->n_primaries;
  if (n < 3 || n > EF_MAX_DRIVES)
    return ef__error_set(error, EF_INVALID,
                         "found %zu primaries; a display has 3 to %d", n,
                         EF_MAX_DRIVES);
  if (parts->ambient != NULL && settings->ambient_lux > 0.0)
    return ef__error_set(error, EF_INVALID,
                         "room light is given twice, as a measured spectrum "
                         "and in lux; leave one out");
  return check_settings(settings, n, error);
}

/* Columns of unit length: the ratio of two primaries' lights is no sign of
 * dependence. */
static ef_status condition_of(size_t n, const double *xyz, double *condition,
                              ef_error *error) {
  double column[3 * EF_MAX_DRIVES];
  for (size_t i = 0; i < n; i++) {
    const double *v = xyz + 3 * i;
    const double length = sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2]);
    for (size_t c = 0; c < 3; c++)
      column[c * n + i] = v[c] / length;
  }
  double *scratch = ef__allocate(ef__condition_scratch(3, n), sizeof *scratch);
  if (scratch == NULL)
    return ef__error_memory(error, "the condition number");
  const ef_status status =
      ef__condition(3, n, column, scratch, NULL, condition, error);
  free(scratch);
  return status;
}

static ef_status check_dependence(const ef__display_parts *parts,
                                  const double *net, ef_error *error) {
  /* Where half of the digits of an amount are lost. */
  const double greatest = 1.0 / sqrt(DBL_EPSILON);
  double condition;
  const ef_status status =
      condition_of(parts->n_primaries, net, &condition, error);
  if (status != EF_OK || condition <= greatest)
    return status;
  char number[EF_NUMBER_TEXT];
  snprintf(number, sizeof number, "%.3g", condition);
  return ef__error_set(error, EF_NO_ANSWER,
                       "the primaries are linearly dependent: one is a mixture "
                       "of the others (condition number %s)",
                       isinf(condition) ? "infinite" : number);
}

/* `net`: XYZ of the primaries without the black, n x 3. */
static ef_status check_light(const ef__display_parts *parts, const display *d,
                             const double *black, const double *net,
                             ef_error *error) {
  const double white = d->white_known ? d->white[1] : d->sum[1];
  if (!(white > black[1]))
    return ef__error_set(error, EF_INVALID,
                         "the %s (Y = %g) is not lighter than the black (Y = "
                         "%g)",
                         d->white_known ? "white" : "sum of the primaries",
                         white, black[1]);
  for (size_t i = 0; i < parts->n_primaries; i++)
    if (!parts->imaginary && !(net[3 * i + 1] > 0.0))
      return ef__error_set(error, EF_INVALID,
                           "primary '%s' adds no light to the black (Y = %g, "
                           "black Y = %g)",
                           parts->primary_name[i], net[3 * i + 1] + black[1],
                           black[1]);
  return EF_OK;
}

/* ---- Construction ------------------------------------------------------ */

/* Black into the background, and each primary without it. */
static ef_status copy_lights(display *d, const ef__display_parts *parts,
                             ef_error *error) {
  const size_t n = parts->n_primaries, width = d->width;
  const ef__part arrays[] = {{&d->background, width, sizeof(double)},
                             {&d->primary, n * width, sizeof(double)}};
  d->block = ef__allocate_block(2, arrays);
  if (d->block == NULL)
    return ef__error_memory(error, "a display");
  for (size_t s = 0; s < width; s++) {
    const double black = parts->black != NULL ? parts->black[s] : 0.0;
    d->background[s] = black;
    for (size_t i = 0; i < n; i++)
      d->primary[i * width + s] = parts->primary[i * width + s] - black;
  }
  return EF_OK;
}

/* Black, white and primaries for the CIE 1931 observer, and what must hold for
 * them. Room light is not in them yet. */
static ef_status check_lights(display *d, const ef__display_parts *parts,
                              ef_error *error) {
  const size_t n = parts->n_primaries;
  double black[3], net[3 * EF_MAX_DRIVES];
  ef_status status = ef__light_xyz_1931(parts->grid, parts->absolute, 1,
                                        d->background, black, error);
  if (status == EF_OK)
    status = ef__light_xyz_1931(parts->grid, parts->absolute, n, d->primary,
                                net, error);
  if (status == EF_OK && parts->white != NULL) {
    d->white_known = true;
    status = ef__light_xyz_1931(parts->grid, parts->absolute, 1, parts->white,
                                d->white, error);
  }
  if (status != EF_OK)
    return status;
  for (size_t c = 0; c < 3; c++) {
    d->sum[c] = black[c];
    for (size_t i = 0; i < n; i++)
      d->sum[c] += net[3 * i + c];
  }
  status = check_light(parts, d, black, net, error);
  return status == EF_OK ? check_dependence(parts, net, error) : status;
}

/* The settings' curves, else the display's own, else straight lines. */
static ef_status set_up(display *d, const ef__display_parts *parts,
                        const ef_display_settings *settings, ef_error *error) {
  const size_t n = parts->n_primaries;
  const ef_tone_curve *curve[EF_MAX_DRIVES];
  ef_tone_curve *linear = NULL;
  if (settings->n_curves == 0 && parts->curve == NULL) {
    linear = ef_tone_curve_new("linear", error);
    if (linear == NULL)
      return EF_NO_MEMORY;
    ef__note(settings->notes,
             "%s: no tone curve given, drives are taken as shares of the light "
             "(linear)",
             parts->name);
  }
  for (size_t i = 0; i < n; i++)
    curve[i] = settings->n_curves == n   ? settings->curve[i]
               : settings->n_curves == 1 ? settings->curve[0]
               : linear != NULL          ? linear
                                         : parts->curve[i];
  const ef_status status =
      ef__device_set_up(&d->device, &display_class, parts->name, n,
                        parts->primary_name, parts->grid, curve, error);
  ef_tone_curve_free(linear);
  return status;
}

ef_device *ef__display_new(const ef__display_parts *parts,
                           const ef_display_settings *settings,
                           ef_error *error) {
  const ef_display_settings plain = ef_display_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (check_parts(parts, settings, error) != EF_OK)
    return NULL;
  display *d = ef__allocate_zeroed(1, sizeof *d);
  if (d == NULL) {
    ef__error_memory(error, "a display");
    return NULL;
  }
  d->device.kind = &display_class; /* frees what the rest leaves */
  d->device.absolute = parts->absolute;
  d->width = parts->grid != NULL ? parts->grid->count : 3;
  ef_status status = set_up(d, parts, settings, error);
  if (status == EF_OK)
    status = copy_lights(d, parts, error);
  if (status == EF_OK)
    status = check_lights(d, parts, error);
  for (size_t s = 0; status == EF_OK && parts->ambient != NULL && s < d->width;
       s++)
    d->background[s] += parts->ambient[s];
  if (status == EF_OK)
    status = ef__ambient_add(settings, parts->absolute, parts->grid,
                             d->background, error);
  if (status == EF_OK)
    return &d->device;
  ef_device_free(&d->device);
  return NULL;
}

/* ---- From measured spectra --------------------------------------------- */

enum { BLACK, WHITE, AMBIENT, N_ROLES };
static const char *const role_name[N_ROLES] = {"black", "white", "ambient"};

static int role_of(const char *name) {
  for (int role = 0; role < N_ROLES; role++)
    if (ef__name_equal(name, role_name[role]))
      return role;
  return N_ROLES;
}

/* Sorts the spectra into parts; `primary` has room for EF_MAX_DRIVES. */
static ef_status sort_spectra(const ef_spectra *spectra,
                              ef__display_parts *parts, double *primary,
                              const char **primary_name, ef_error *error) {
  const double *role[N_ROLES] = {NULL, NULL, NULL};
  const size_t width = parts->grid->count;
  parts->n_primaries = 0;
  for (size_t i = 0; i < ef_spectra_count(spectra); i++) {
    const char *name = ef_spectra_name(spectra, i);
    const double *value = ef_spectra_values(spectra) + i * width;
    const int part = role_of(name);
    if (part < N_ROLES) {
      if (role[part] != NULL)
        return ef__error_set(error, EF_INVALID,
                             "two spectra are named '%s'; a display has one",
                             role_name[part]);
      role[part] = value;
    } else if (parts->n_primaries++ < EF_MAX_DRIVES) {
      memcpy(primary + (parts->n_primaries - 1) * width, value,
             width * sizeof *primary);
      primary_name[parts->n_primaries - 1] = name;
    }
  }
  parts->black = role[BLACK];
  parts->white = role[WHITE];
  parts->ambient = role[AMBIENT];
  return EF_OK;
}

ef_device *ef_display_from_spectra(const char *name, const ef_spectra *spectra,
                                   const ef_display_settings *settings,
                                   ef_error *error) {
  if (name == NULL || spectra == NULL) {
    ef__error_set(error, EF_INVALID, "a display needs a name and spectra");
    return NULL;
  }
  if (ef_spectra_kind(spectra) != EF_LIGHT) {
    ef__error_set(error, EF_INVALID,
                  "these spectra are surfaces; the primaries of a display are "
                  "lights");
    return NULL;
  }
  const char *primary_name[EF_MAX_DRIVES];
  ef__display_parts parts = {.name = name,
                             .primary_name = primary_name,
                             .grid = ef_spectra_grid(spectra),
                             .absolute = ef_spectra_absolute(spectra)};
  double *primary =
      ef__allocate(parts.grid->count, EF_MAX_DRIVES * sizeof *primary);
  if (primary == NULL) {
    ef__error_memory(error, "the primaries");
    return NULL;
  }
  parts.primary = primary;
  ef_device *device = NULL;
  if (sort_spectra(spectra, &parts, primary, primary_name, error) == EF_OK) {
    if (parts.black == NULL && settings != NULL)
      ef__note(settings->notes,
               "%s: no spectrum is named 'black', so the black is taken as "
               "zero",
               name);
    device = ef__display_new(&parts, settings, error);
  }
  free(primary);
  return device;
}

/* ---- Additivity -------------------------------------------------------- */

static ef_xyz scaled(const double xyz[3], double factor) {
  const ef_xyz out = {factor * xyz[0], factor * xyz[1], factor * xyz[2]};
  return out;
}

ef_status ef_display_additivity(const ef_device *device, ef_additivity *out,
                                ef_error *error) {
  if (device == NULL || device->kind != &display_class)
    return ef__error_set(error, EF_INVALID,
                         "additivity is a question to a display");
  const display *d = as_display(device);
  const double nan_value = nan("");
  const ef_xyz none = {nan_value, nan_value, nan_value};
  *out = (ef_additivity){false, nan_value, none, none};
  if (!d->white_known)
    return EF_OK;
  out->known = true;
  out->luminance_ratio = d->white[1] / d->sum[1];
  out->measured = scaled(d->white, 100.0 / d->white[1]);
  out->summed = scaled(d->sum, 100.0 / d->white[1]);
  return EF_OK;
}
