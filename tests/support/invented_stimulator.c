/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "invented_stimulator.h"

#include "invented_display.h"
#include "near.h"

enum { MOST = 8 };

ef_device *invented_primaries(size_t n) {
  static const char *const names[1 + MOST] = {"black",  "blue",     "green",
                                              "red",    "cyan",     "amber",
                                              "violet", "deep red", "teal"};
  static const double peak[MOST] = {5.2e-3, 4.1e-3, 6.3e-3, 3.9e-3,
                                    4.4e-3, 5.8e-3, 7.1e-3, 3.3e-3};
  static const double centre_nm[MOST] = {453, 536, 627, 496,
                                         589, 421, 661, 515};
  static const double width_nm[MOST] = {10, 16, 9, 12, 8, 9, 10, 14};
  double light[(1 + MOST) * INVENTED_SAMPLES];
  const ef_grid grid = invented_grid();
  ef_error error;
  invented_bell(1.1e-5, 480, 80, light);
  for (size_t i = 0; i < n; i++) {
    double *row = light + (1 + i) * INVENTED_SAMPLES;
    invented_bell(peak[i], centre_nm[i], width_nm[i], row);
    for (size_t k = 0; k < INVENTED_SAMPLES; k++)
      row[k] += light[k];
  }
  ef_spectra *spectra =
      ef_spectra_new(1 + n, names, &grid, EF_LIGHT, light, &error);
  if (spectra == NULL)
    fail_msg("%s", error.message);
  ef_spectra_set_absolute(spectra, true);
  ef_tone_curve *curve = ef_tone_curve_new("power:2.2", NULL);
  ef_display_settings settings = ef_display_settings_default();
  settings.n_curves = 1;
  settings.curve = (const ef_tone_curve *const *)&curve;
  ef_device *device =
      ef_display_from_spectra("bench lights", spectra, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_tone_curve_free(curve);
  ef_spectra_free(spectra);
  return device;
}

invented invented_new(size_t n, const char *observer) {
  ef_error error;
  invented i = {.device = invented_primaries(n),
                .observer = ef_observer_new(observer, &error)};
  if (i.observer == NULL)
    fail_msg("%s", error.message);
  i.stimulator = ef_stimulator_new(i.device, i.observer, NULL, NULL, &error);
  if (i.stimulator == NULL)
    fail_msg("%s", error.message);
  return i;
}

void invented_free(invented *i) {
  ef_stimulator_free(i->stimulator);
  ef_observer_free(i->observer);
  ef_device_free(i->device);
}

ef_direction invented_direction(const char *text, const char *silent) {
  ef_direction direction;
  ef_error error;
  ef_status status = ef_direction_parse(text, &direction, &error);
  if (status == EF_OK && silent[0] != '\0')
    status =
        ef_direction_set_role(&direction, silent, EF_RECEPTOR_SILENT, &error);
  if (status != EF_OK)
    fail_msg("%s, silent %s: %s", text, silent, error.message);
  return direction;
}

ef_frame_settings invented_frame(size_t width_px, size_t height_px) {
  ef_frame_settings s = ef_frame_settings_default();
  s.width_px = width_px;
  s.height_px = height_px;
  s.distance_mm = 1000;
  s.pixels_per_mm = 2;
  return s;
}

ef_frames *invented_frames(const invented *i, const ef_isolation *way,
                           const ef_frame_settings *settings) {
  ef_error error;
  ef_frames *const frames =
      ef_frames_new(i->stimulator, way, settings, NULL, &error);
  if (frames == NULL)
    fail_msg("%s", error.message);
  return frames;
}
