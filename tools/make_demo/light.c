/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The light of the ticket hall, and the vision laboratory. */
#include "demo.h"

#include <stdbool.h>
#include <string.h>

void write_shop_light(FILE *out) {
  static const struct curve lamp = {0.0, {{BELL, 0.92, 449.0, 9.5},
                                          {BELL, 0.72, 548.0, 38.0},
                                          {BELL, 0.86, 606.0, 36.0},
                                          {BELL, 0.10, 680.0, 40.0}}};
  uint64_t noise = SEED + 8;
  write_header(out, "light of the ticket hall",
               "relative spectral power of light",
               NULL,
               "the LED lamps under which passengers see kiosk, leaflets and "
               "the seats on show");
  fprintf(out, "wavelength_nm,ticket_hall\n");
  for (int nm = 380; nm <= 780; nm += 5) {
    fprintf(out, "%d,%.4g\n", nm,
            reading(curve_at(&lamp, nm), 0.001, 0.00005, &noise));
  }
}

void write_signal_colours(FILE *out) {
  static const struct {
    const char *name;
    double x, y, Y;
  } signals[] = {
    {"masthead white", 0.370, 0.375, 60.0},
    {"masthead white, old lamp", 0.430, 0.402, 45.0},
    {"port red", 0.670, 0.318, 14.0},
    {"port red, faded lens", 0.640, 0.332, 18.0},
    {"starboard green", 0.180, 0.560, 22.0},
    {"starboard green, bluish lens", 0.195, 0.435, 22.0},
    {"towing yellow", 0.565, 0.418, 36.0},
    {"towing yellow, reddish lens", 0.595, 0.388, 30.0},
    {"harbour blue", 0.165, 0.130, 8.0},
    {"berth amber", 0.545, 0.425, 40.0},
  };
  write_header(out, "signal colours for the crews' recognition test",
               "chromaticity x, y and luminance factor Y of light, CIE 1931 "
               "observer; Y = 100 is the white of the laboratory's stimulator",
               NULL,
               "lamps of ships and harbour, new and worn, that the crews must "
               "name in the vision laboratory");
  fprintf(out, "name,x,y,Y\n");
  for (size_t i = 0; i < sizeof signals / sizeof signals[0]; i++) {
    const bool quote = strchr(signals[i].name, ',') != NULL;
    fprintf(out, "%s%s%s,%.3f,%.3f,%g\n", quote ? "\"" : "", signals[i].name,
            quote ? "\"" : "", signals[i].x, signals[i].y, signals[i].Y);
  }
}

enum { N_LEDS = 3 };

void write_lab_display(FILE *out) {
  /* Peak radiance in W sr^-1 m^-2 nm^-1; 20 nm wide at half height, with a
   * foot: of the red towards short wavelengths, of the others towards long. */
  static const struct curve led[N_LEDS] = {
    {0.0, {{BELL, 9.6e-3, 630.0, 8.3}, {BELL, 9.0e-4, 616.0, 13.0}}},
    {0.0, {{BELL, 8.1e-3, 525.0, 8.4}, {BELL, 6.0e-4, 540.0, 16.0}}},
    {0.0, {{BELL, 8.2e-3, 465.0, 8.2}, {BELL, 5.5e-4, 480.0, 15.0}}},
  };
  uint64_t noise = SEED + 9;
  write_header(out, "primaries of the laboratory's stimulator, full drive",
               "spectral radiance of light, as measured: every column includes "
               "the stray light in column black",
               "W sr-1 m-2 nm-1",
               "the small vision laboratory tests the crews' recognition of "
               "signal colours with three narrow LEDs");
  fprintf(out, "wavelength_nm,red,green,blue,black\n");
  for (int nm = 380; nm <= 780; nm++) {
    const double stray = 2.0e-7 * (1.0 + 0.4 * (nm - 580) / 200.0);
    fprintf(out, "%d", nm);
    for (int p = 0; p <= N_LEDS; p++) {
      const double light = p < N_LEDS ? curve_at(&led[p], nm) : 0.0;
      fprintf(out, ",%.4g", reading(light + stray, 0.001, 5e-9, &noise));
    }
    fputc('\n', out);
  }
}
