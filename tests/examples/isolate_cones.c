/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A light that only the S cones notice: how the primaries of a display must
 * change around a grey, and the largest contrast it can reach. Before anyone
 * looks at it: ef_cautions, the local safety code, the ethics board. */
#include <stdio.h>

#include <evenfield.h>

int main(void) {
  ef_error error = {.status = EF_OK};
  ef_spectra *primaries = ef_spectra_read("demo:lab-display", NULL, &error);
  ef_observer *observer = ef_observer_new("cie-2015-2", &error);
  const ef_display_settings as_measured = ef_display_settings_default();
  ef_device *display =
      primaries == NULL
          ? NULL
          : ef_display_from_spectra("lab", primaries, &as_measured, &error);
  ef_stimulator *stimulator =
      display == NULL || observer == NULL
          ? NULL
          : ef_stimulator_new(display, observer, NULL, NULL, &error);
  ef_direction direction;
  ef_isolation found;
  const ef_isolate_settings settings = ef_isolate_settings_default();
  const bool done =
      stimulator != NULL &&
      ef_direction_parse("S", &direction, &error) == EF_OK &&
      ef_isolate(stimulator, &direction, &settings, &found, &error) == EF_OK;
  if (done) {
    printf("largest contrast of S: %.3f\n", found.largest);
    for (size_t i = 0; i < found.n_primaries; ++i) {
      printf("  %-6s %.3f of full drive, %+.4f\n",
             ef_device_drive_name(display, i), found.background[i],
             found.modulation[i]);
    }
    printf("luminance of the background %.1f cd/m2, condition number %.2f\n",
           found.luminance_cd_m2, found.condition_number);
  } else {
    fprintf(stderr, "%s\n", error.message);
  }
  ef_stimulator_free(stimulator);
  ef_device_free(display);
  ef_observer_free(observer);
  ef_spectra_free(primaries);
  return done ? 0 : 1;
}
