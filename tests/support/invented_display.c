/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "invented_display.h"

#include "near.h"

ef_grid invented_grid(void) {
  return (ef_grid){INVENTED_SAMPLES, 380, 5, NULL};
}

void invented_bell(double peak, double centre_nm, double width_nm,
                   double out[INVENTED_SAMPLES]) {
  for (int s = 0; s < INVENTED_SAMPLES; s++) {
    const double z = (380 + 5 * s - centre_nm) / width_nm;
    out[s] = peak * exp(-0.5 * z * z);
  }
}

void invented_lights(double out[4 * INVENTED_SAMPLES]) {
  invented_bell(1.3e-5, 470, 90, out);
  invented_bell(5.1e-3, 612, 14, out + INVENTED_SAMPLES);
  invented_bell(3.7e-3, 536, 19, out + 2 * INVENTED_SAMPLES);
  invented_bell(7.2e-3, 453, 11, out + 3 * INVENTED_SAMPLES);
  for (int i = INVENTED_SAMPLES; i < 4 * INVENTED_SAMPLES; i++)
    out[i] += out[i % INVENTED_SAMPLES];
}

ef_spectra *invented_spectra(bool absolute) {
  static const char *const names[] = {"Black", "red", "green", "blue"};
  double light[4 * INVENTED_SAMPLES];
  const ef_grid grid = invented_grid();
  ef_error error;
  invented_lights(light);
  ef_spectra *spectra =
      ef_spectra_new(4, names, &grid, EF_LIGHT, light, &error);
  if (spectra == NULL)
    fail_msg("%s", error.message);
  ef_spectra_set_absolute(spectra, absolute);
  return spectra;
}

ef_device *invented_display(bool absolute) {
  static const char *const names[] = {"power:2.2", "power:2.1", "power:2.3"};
  ef_tone_curve *curve[3];
  for (int i = 0; i < 3; i++)
    curve[i] = ef_tone_curve_new(names[i], NULL);
  ef_display_settings settings = ef_display_settings_default();
  settings.n_curves = 3;
  settings.curve = (const ef_tone_curve *const *)curve;
  ef_error error;
  ef_spectra *spectra = invented_spectra(absolute);
  ef_device *device =
      ef_display_from_spectra("kiosk", spectra, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_spectra_free(spectra);
  for (int i = 0; i < 3; i++)
    ef_tone_curve_free(curve[i]);
  return device;
}
