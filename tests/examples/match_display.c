/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Can this display show these paints? Code values of a display whose light is
 * in proportion to the code: spectra of a display and of painted
 * surfaces, seen by the CIE 1931 observer; for each paint the code values, and
 * how far the nearest colour is off. `demo:` names are built in: a path to a
 * file serves as well. */
#include <stdio.h>
#include <stdlib.h>

#include <evenfield.h>

static void end(const ef_error *error) {
  char text[1024];
  ef_error_describe(error, text, sizeof text);
  fprintf(stderr, "%s\n", text);
  exit(1);
}

int main(void) {
  ef_error error = {.status = EF_OK};
  ef_spectra *primaries =
      ef_spectra_read("demo:kiosk-primaries", NULL, &error);
  ef_spectra *paints = ef_spectra_read("demo:livery", NULL, &error);
  ef_observer *observer = ef_observer_new("cie-1931", &error);
  ef_illuminant *daylight = ef_illuminant_new("D65", &error);
  if (primaries == NULL || paints == NULL || observer == NULL ||
      daylight == NULL) {
    end(&error);
  }
  const ef_display_settings as_measured = ef_display_settings_default();
  ef_device *display =
      ef_display_from_spectra("kiosk", primaries, &as_measured, &error);
  ef_setup *setup =
      display == NULL ? NULL
                      : ef_setup_new(display, observer, NULL, NULL, &error);
  if (setup == NULL) end(&error);

  /* Observer, light and interpolation fold into one small matrix. */
  const ef_grid *grid = ef_spectra_grid(paints);
  const ef_viewing viewing = ef_viewing_default(daylight);
  ef_weights *weights = ef_observer_weights(observer, EF_TRISTIMULUS, grid,
                                            &viewing, NULL, &error);
  if (weights == NULL) end(&error);
  const size_t n = ef_spectra_count(paints);
  double *xyz = malloc(3 * n * sizeof *xyz);
  ef_match *match = malloc(n * sizeof *match);
  if (xyz == NULL || match == NULL) return 1;
  if (ef_weights_apply(weights, n, ef_spectra_values(paints), 0, xyz, &error) !=
      EF_OK) {
    end(&error);
  }

  /* The white of daylight becomes the display's white. */
  double white[3], to_display[9];
  const ef_grid working = ef_grid_standard();
  if (ef_observer_white(observer, EF_TRISTIMULUS, daylight, &working, white,
                        &error) != EF_OK) {
    end(&error);
  }
  const ef_xyz from = {100 * white[0] / white[1], 100,
                       100 * white[2] / white[1]};
  if (ef_adaptation_matrix(EF_ADAPT_CAT16, from, ef_setup_white(setup), to_display,
                           &error) != EF_OK) {
    end(&error);
  }
  for (size_t i = 0; i < n; ++i) {
    const ef_xyz adapted = ef_xyz_transform(
        to_display, (ef_xyz){xyz[3 * i], xyz[3 * i + 1], xyz[3 * i + 2]});
    xyz[3 * i] = adapted.X;
    xyz[3 * i + 1] = adapted.Y;
    xyz[3 * i + 2] = adapted.Z;
  }

  const ef_match_settings settings = ef_match_settings_default();
  if (ef_match_batch(setup, n, xyz, &settings, 0, match, &error) != EF_OK) {
    end(&error);
  }
  for (size_t i = 0; i < n; ++i) {
    printf("%-18s %-3s codes %3u %3u %3u, off by %.2f %s\n",
           ef_spectra_name(paints, i), match[i].in_gamut ? "yes" : "no",
           (unsigned)match[i].code[0], (unsigned)match[i].code[1],
           (unsigned)match[i].code[2], match[i].coded.difference,
           ef_metric_symbol(settings.metric));
  }
  free(match);
  free(xyz);
  ef_weights_free(weights);
  ef_setup_free(setup);
  ef_device_free(display);
  ef_illuminant_free(daylight);
  ef_observer_free(observer);
  ef_spectra_free(paints);
  ef_spectra_free(primaries);
  return 0;
}
