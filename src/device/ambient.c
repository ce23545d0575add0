/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Room light on the screen. A diffuse screen of reflectance rho under E lux
 * shows the luminance E rho / pi (Lambert), with the distribution of the room
 * light: the screen is taken to be neutral. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>

static const double pi = 3.14159265358979323846;

ef_status ef__light_xyz_1931(const ef_grid *grid, bool absolute, size_t n,
                             const double *light, double *xyz,
                             ef_error *error) {
  if (grid == NULL) {
    for (size_t i = 0; i < 3 * n; i++)
      xyz[i] = light[i];
    return EF_OK;
  }
  ef_status status = EF_NO_MEMORY;
  ef_viewing viewing = ef_viewing_default(NULL);
  viewing.absolute = absolute;
  ef_weights *weights = NULL;
  ef_observer *observer = ef_observer_new("cie-1931", error);
  if (observer != NULL)
    weights = ef_observer_weights(observer, EF_TRISTIMULUS, grid, &viewing,
                                  NULL, error);
  if (weights != NULL)
    status = ef_weights_apply(weights, n, light, 1, xyz, error);
  ef_weights_free(weights);
  ef_observer_free(observer);
  return status;
}

/* The white point of the room light, times the luminance. */
static ef_status add_tristimulus(const ef_illuminant *illuminant,
                                 double luminance_cd_m2, double background[3],
                                 ef_error *error) {
  ef_observer *observer = ef_observer_new("cie-1931", error);
  if (observer == NULL)
    return EF_NO_MEMORY;
  const ef_grid working = ef_grid_standard();
  double white[3];
  const ef_status status = ef_observer_white(
      observer, EF_TRISTIMULUS, illuminant, &working, white, error);
  for (int c = 0; status == EF_OK && c < 3; c++)
    background[c] += luminance_cd_m2 * white[c] / 100.0;
  ef_observer_free(observer);
  return status;
}

/* The distribution sampled on the display's grid and scaled there, so that its
 * luminance is the one asked for whatever the grid leaves out. */
static ef_status add_spectrum(const ef_illuminant *illuminant,
                              double luminance_cd_m2, const ef_grid *grid,
                              double *background, ef_error *error) {
  double *power = ef__allocate(grid->count, sizeof *power);
  if (power == NULL)
    return ef__error_memory(error, "the room light");
  double xyz[3] = {0.0, 0.0, 0.0};
  ef_status status = ef_illuminant_sample(illuminant, grid, power, error);
  if (status == EF_OK)
    status = ef__light_xyz_1931(grid, true, 1, power, xyz, error);
  if (status == EF_OK && !(xyz[1] > 0.0))
    status = ef__error_set(error, EF_INVALID,
                           "room light '%s' has no luminance in the range of "
                           "the display's spectra",
                           ef_illuminant_name(illuminant));
  for (size_t s = 0; status == EF_OK && s < grid->count; s++)
    background[s] += luminance_cd_m2 / xyz[1] * power[s];
  free(power);
  return status;
}

ef_status ef__ambient_add(const ef_display_settings *settings, bool absolute,
                          const ef_grid *grid, double *background,
                          ef_error *error) {
  const double luminance_cd_m2 =
      settings->ambient_lux * settings->screen_reflectance / pi;
  if (luminance_cd_m2 == 0.0)
    return EF_OK;
  if (!absolute)
    return ef__error_set(error, EF_INVALID,
                         "room light in lux needs a display measured in W "
                         "sr-1 m-2 nm-1 or cd/m2; this one has relative "
                         "values only");
  if (grid == NULL)
    return add_tristimulus(settings->ambient_illuminant, luminance_cd_m2,
                           background, error);
  return add_spectrum(settings->ambient_illuminant, luminance_cd_m2, grid,
                      background, error);
}
