/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The interface of all devices: names, curves, and the way from a drive to a
 * stimulus. What differs stands behind ef__device_class. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* ---- The common part --------------------------------------------------- */

static const char *const limit_texts[2] = {" at zero", " at full drive"};

/* What is said of a limit: the class's own words, else the usual ones. */
static const char *limit_text(const ef__device_class *kind, int high) {
  return kind->limit_text[high] != NULL ? kind->limit_text[high]
                                        : limit_texts[high];
}

/* Appends a + b with a terminator at *at; returns its start. */
static const char *put_text(char **at, const char *a, const char *b) {
  char *const start = *at;
  const size_t length_a = strlen(a), length_b = strlen(b);
  memcpy(start, a, length_a);
  memcpy(start + length_a, b, length_b + 1);
  *at = start + length_a + length_b + 1;
  return start;
}

static size_t texts_size(const ef__device_class *kind, const char *name,
                         size_t n, const char *const *drive_name) {
  size_t size = strlen(name) + 1;
  for (size_t i = 0; i < n; i++)
    size += 3 * (strlen(drive_name[i]) + 1) + strlen(limit_text(kind, 0)) +
            strlen(limit_text(kind, 1));
  return size;
}

/* A text without a blank at its start says all, without the drive's name. */
static const char *put_limit(char **at, const char *drive_name,
                             const char *text) {
  return put_text(at, text[0] == ' ' ? drive_name : "", text);
}

static ef_status copy_names(ef_device *device, const char *name,
                            const char *const *drive_name, const ef_grid *grid,
                            ef_error *error) {
  const size_t n_listed =
      grid != NULL && grid->wavelength_nm != NULL ? grid->count : 0;
  char *text = NULL;
  double *wavelength_nm = NULL;
  const ef__part parts[] = {
      {&wavelength_nm, n_listed, sizeof(double)},
      {&text, texts_size(device->kind, name, device->n_drives, drive_name), 1}};
  device->block = ef__allocate_block(2, parts);
  if (device->block == NULL)
    return ef__error_memory(error, "a device");
  device->name = put_text(&text, name, "");
  for (size_t i = 0; i < device->n_drives; i++) {
    device->drive_name[i] = put_text(&text, drive_name[i], "");
    for (int high = 0; high < 2; high++)
      device->limit_name[i][high] =
          put_limit(&text, drive_name[i], limit_text(device->kind, high));
  }
  if (grid != NULL) {
    device->grid = *grid;
    if (n_listed > 0) {
      memcpy(wavelength_nm, grid->wavelength_nm, n_listed * sizeof(double));
      device->grid.wavelength_nm = wavelength_nm;
    }
  }
  return EF_OK;
}

ef_status ef__device_set_up(ef_device *device, const ef__device_class *kind,
                            const char *name, size_t n_drives,
                            const char *const *drive_name, const ef_grid *grid,
                            const ef_tone_curve *const *curve,
                            ef_error *error) {
  device->kind = kind;
  device->n_drives = n_drives;
  ef_status status = copy_names(device, name, drive_name, grid, error);
  for (size_t i = 0; status == EF_OK && i < n_drives; i++) {
    device->curve[i] = ef_tone_curve_copy(curve[i], error);
    if (device->curve[i] == NULL)
      status = EF_NO_MEMORY;
  }
  return status;
}

void ef_device_free(ef_device *device) {
  if (device == NULL)
    return;
  if (device->kind->release != NULL)
    device->kind->release(device);
  for (size_t i = 0; i < device->n_drives; i++)
    ef_tone_curve_free(device->curve[i]);
  free(device->block);
  free(device);
}

/* ---- Questions --------------------------------------------------------- */

const char *ef_device_kind(const ef_device *device) {
  return device->kind->kind;
}

const char *ef_device_name(const ef_device *device) {
  return device->name;
}

size_t ef_device_n_drives(const ef_device *device) {
  return device->n_drives;
}

const char *ef_device_drive_name(const ef_device *device, size_t i) {
  return i < device->n_drives ? device->drive_name[i] : NULL;
}

const char *ef_device_limit_name(const ef_device *device, size_t i, bool high) {
  return i < device->n_drives ? device->limit_name[i][high ? 1 : 0] : NULL;
}

bool ef_device_reflects(const ef_device *device) {
  return device->kind->reflects;
}

bool ef_device_has_spectra(const ef_device *device) {
  return device->grid.count > 0;
}

bool ef_device_absolute(const ef_device *device) {
  return device->absolute;
}

const ef_grid *ef_device_grid(const ef_device *device) {
  return &device->grid;
}

const char *ef_device_curve_about(const ef_device *device, size_t i) {
  return i < device->n_drives ? ef_tone_curve_about(device->curve[i]) : NULL;
}

double ef_device_amount(const ef_device *device, size_t i, double drive,
                        double *slope) {
  if (i < device->n_drives)
    return ef_tone_curve_amount(device->curve[i], drive, slope);
  if (slope != NULL)
    *slope = nan("");
  return nan("");
}

double ef_device_drive(const ef_device *device, size_t i, double amount) {
  return i < device->n_drives ? ef_tone_curve_drive(device->curve[i], amount)
                              : nan("");
}

/* ---- From drives to a spectrum ----------------------------------------- */

ef_status ef_device_spectrum(const ef_device *device, const double *drive,
                             double *spectrum, double *jacobian,
                             ef_error *error) {
  if (!ef_device_has_spectra(device))
    return ef__error_set(error, EF_NO_ANSWER,
                         "'%s' is known by tristimulus values only, so it has "
                         "no spectrum; give the spectra of its primaries",
                         device->name);
  const size_t n = device->n_drives;
  double amount[EF_MAX_DRIVES], slope[EF_MAX_DRIVES];
  for (size_t i = 0; i < n; i++) {
    if (!isfinite(drive[i]))
      return ef__error_set(error, EF_INVALID, "the drive of %s is not finite",
                           device->drive_name[i]);
    amount[i] = ef_device_amount(device, i, drive[i], &slope[i]);
  }
  device->kind->spectrum(device, amount, spectrum, jacobian);
  for (size_t s = 0; jacobian != NULL && s < device->grid.count; s++)
    for (size_t i = 0; i < n; i++)
      jacobian[s * n + i] *= slope[i];
  return EF_OK;
}
