/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A device folded for an observer: a colour map from amounts, scaled so that
 * its white has Y = 100. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>

struct ef_setup {
  const ef_device *device;
  const ef_observer *observer;
  ef__colour_map
      map; /* an affine one on the setup's scale, else the device's */
  double scale;
  ef_xyz white, black;
};

static ef_status check(const ef_device *device, const ef_observer *observer,
                       const ef_illuminant *illuminant, ef_error *error) {
  if (device == NULL || observer == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a setup needs a device and an observer");
  if (device->kind->reflects && illuminant == NULL)
    return ef__error_set(error, EF_INVALID,
                         "'%s' (%s) reflects light; say which illuminant it "
                         "stands in",
                         device->name, device->kind->kind);
  if (!device->kind->reflects && illuminant != NULL)
    return ef__error_set(error, EF_INVALID,
                         "'%s' (%s) is a light itself and takes no illuminant",
                         device->name, device->kind->kind);
  return EF_OK;
}

/* Y of the white to 100, and black and white noted. */
static ef_status scale_map(ef_setup *setup, ef_error *error) {
  ef__colour_map *map = &setup->map;
  if (!(map->white[1] > 0.0) || !isfinite(map->white[1]))
    return ef__error_set(error, EF_NO_ANSWER,
                         "the white of '%s' has no luminance for observer %s "
                         "(Y = %g)",
                         setup->device->name, ef_observer_name(setup->observer),
                         map->white[1]);
  setup->scale = 100.0 / map->white[1];
  setup->white = (ef_xyz){map->white[0] * setup->scale, 100.0,
                          map->white[2] * setup->scale};
  if (map->affine) {
    for (size_t c = 0; c < 3; c++)
      map->origin[c] *= setup->scale;
    for (size_t i = 0; i < 3 * setup->device->n_drives; i++)
      map->vector[i] *= setup->scale;
  }
  const double none[EF_MAX_DRIVES] = {0.0};
  setup->black = ef_setup_xyz(setup, none, NULL);
  return EF_OK;
}

ef_setup *ef_setup_new(const ef_device *device, const ef_observer *observer,
                       const ef_illuminant *illuminant, const ef_notes *notes,
                       ef_error *error) {
  if (check(device, observer, illuminant, error) != EF_OK)
    return NULL;
  ef_setup *setup = ef__allocate_zeroed(1, sizeof *setup);
  if (setup == NULL) {
    ef__error_memory(error, "a setup");
    return NULL;
  }
  setup->device = device;
  setup->observer = observer;
  ef_status status = device->kind->see(device, observer, illuminant, notes,
                                       &setup->map, error);
  if (status == EF_OK)
    status = scale_map(setup, error);
  if (status == EF_OK)
    return setup;
  ef_setup_free(setup);
  return NULL;
}

void ef_setup_free(ef_setup *setup) {
  if (setup == NULL)
    return;
  if (setup->map.release != NULL)
    setup->map.release(setup->map.data);
  free(setup);
}

const ef_device *ef_setup_device(const ef_setup *setup) {
  return setup->device;
}

const ef_observer *ef_setup_observer(const ef_setup *setup) {
  return setup->observer;
}

ef_xyz ef_setup_white(const ef_setup *setup) {
  return setup->white;
}

ef_xyz ef_setup_black(const ef_setup *setup) {
  return setup->black;
}

double ef_setup_luminance_cd_m2(const ef_setup *setup) {
  return setup->device->absolute ? 100.0 / setup->scale : nan("");
}

double ef_setup_scale(const ef_setup *setup) {
  return setup->scale;
}

double ef_setup_resolution(const ef_setup *setup) {
  return setup->map.resolution > 0.0 ? setup->map.resolution : 1e-10;
}

bool ef_setup_affine(const ef_setup *setup) {
  return setup->map.affine;
}

static ef_xyz affine_xyz(const ef__colour_map *map, size_t n,
                         const double *amount, double *jacobian) {
  double xyz[3];
  for (size_t c = 0; c < 3; c++) {
    xyz[c] = map->origin[c];
    for (size_t i = 0; i < n; i++)
      xyz[c] += map->vector[c * n + i] * amount[i];
  }
  for (size_t i = 0; jacobian != NULL && i < 3 * n; i++)
    jacobian[i] = map->vector[i];
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

ef_xyz ef_setup_xyz(const ef_setup *setup, const double *amount,
                    double *jacobian) {
  const ef__colour_map *map = &setup->map;
  const size_t n = setup->device->n_drives;
  if (map->affine)
    return affine_xyz(map, n, amount, jacobian);
  double xyz[3];
  map->xyz(map->data, amount, xyz, jacobian);
  for (size_t i = 0; jacobian != NULL && i < 3 * n; i++)
    jacobian[i] *= setup->scale;
  return (ef_xyz){setup->scale * xyz[0], setup->scale * xyz[1],
                  setup->scale * xyz[2]};
}

ef_status ef_setup_light_xyz(const ef_setup *setup, const ef_grid *grid,
                             size_t n, const double *spectrum,
                             const ef_notes *notes, double *xyz,
                             ef_error *error) {
  ef_error own; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  const ef_device *device = setup->device;
  if (!ef_device_has_spectra(device) || device->kind->reflects)
    return ef__error_set(error, EF_NO_ANSWER,
                         "'%s' (%s) has no spectra of lights, so a light "
                         "spectrum has no scale beside it; give a colour "
                         "instead",
                         device->name, device->kind->kind);
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = device->absolute;
  ef_weights *weights = ef_observer_weights(setup->observer, EF_TRISTIMULUS,
                                            grid, &viewing, notes, error);
  if (weights == NULL)
    return error->status;
  const ef_status status =
      ef_weights_apply(weights, n, spectrum, 0, xyz, error);
  for (size_t i = 0; status == EF_OK && i < 3 * n; i++)
    xyz[i] *= setup->scale;
  ef_weights_free(weights);
  return status;
}
