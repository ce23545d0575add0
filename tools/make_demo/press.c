/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The leaflet press: three inks on paper. */
#include "demo.h"

#include <math.h>

enum { N_INKS = 3 };

static const struct curve paper = {
  0.0, {{RISE, 0.86, 396.0, 9.0}, {BELL, 0.035, 455.0, 30.0}}};
/* Density of a solid on paper. */
static const struct curve ink_density[N_INKS] = {
  {0.06, {{BELL, 1.45, 640.0, 52.0}, {BELL, 0.40, 705.0, 40.0},
          {BELL, 0.08, 540.0, 35.0}, {FALL, 0.22, 418.0, 14.0}}},
  {0.04, {{BELL, 1.20, 552.0, 24.0}, {BELL, 0.85, 515.0, 32.0},
          {BELL, 0.38, 440.0, 40.0}}},
  {0.03, {{FALL, 1.18, 484.0, 12.0}, {FALL, -0.15, 405.0, 12.0}}},
};
static const double press_n = 1.7;
/* Growth of the dots themselves at 50 %; the spread of light in the paper,
 * which n stands for, brings the tone value increase to some 18 %. */
static const double press_growth[N_INKS] = {0.051, 0.053, 0.062};
/* Share of its density that an ink keeps on each wet ink below it. */
static const double press_trap = 0.95;

/* Overprint `set` (bit 0 cyan, 1 magenta, 2 yellow, printed in this order). */
static double overprint(int set, double nm, const double load[N_INKS]) {
  double density = 0.0;
  double keep = 1.0;
  for (int k = 0; k < N_INKS; k++) {
    if (set >> k & 1) {
      density += keep * load[k] * curve_at(&ink_density[k], nm);
      keep *= press_trap;
    }
  }
  /* 0.008: what the ink's surface sends back */
  return 0.008 + (curve_at(&paper, nm) - 0.008) * pow(10.0, -density);
}

/* Yule & Nielsen 1951 with the areas of Demichel 1924. */
static double halftone(const double area[N_INKS], double nm,
                       const double load[N_INKS]) {
  double sum = 0.0;
  for (int set = 0; set < 1 << N_INKS; set++) {
    double weight = 1.0;
    for (int k = 0; k < N_INKS; k++) {
      weight *= set >> k & 1 ? area[k] : 1.0 - area[k];
    }
    sum += weight * pow(overprint(set, nm, load), 1.0 / press_n);
  }
  return pow(sum, press_n);
}

/* One patch: the press varies in dot area and in ink load, the instrument
 * little. */
static void write_patch(FILE *out, const int percent[N_INKS],
                        uint64_t *noise) {
  double area[N_INKS];
  double load[N_INKS];
  for (int k = 0; k < N_INKS; k++) {
    const double a = percent[k] / 100.0;
    const double spread = 4.0 * a * (1.0 - a);
    area[k] = a + spread * (press_growth[k] + 0.002 * normal(noise));
    load[k] = 1.0 + 0.004 * normal(noise);
  }
  fprintf(out, "%d,%d,%d", percent[0], percent[1], percent[2]);
  for (int nm = 400; nm <= 700; nm += 10) {
    const double r = halftone(area, nm, load);
    fprintf(out, ",%.4g", reading(r, 0.0005, 0.0002, noise));
  }
  fputc('\n', out);
}

void write_leaflet_press(FILE *out) {
  static const int ramp[] = {0, 10, 25, 50, 75, 90, 100};
  uint64_t noise = SEED + 4;
  write_header(out, "characterisation of the leaflet press",
               "ink values C, M, Y in percent and reflectance (radiance "
               "factor, 1 = perfect reflecting diffuser)",
               NULL,
               "the small three-ink press on which timetables and leaflets "
               "are printed: solids, a ramp of each ink, and mixtures");
  fprintf(out, "# device_max: 100\nC,M,Y");
  write_band_names(out, 400, 700);
  for (int set = 0; set < 1 << N_INKS; set++) {
    const int percent[N_INKS] = {set & 1 ? 100 : 0, set & 2 ? 100 : 0,
                                 set & 4 ? 100 : 0};
    write_patch(out, percent, &noise);
  }
  for (int k = 0; k < N_INKS; k++) {
    for (size_t i = 0; i < sizeof ramp / sizeof ramp[0]; i++) {
      int percent[N_INKS] = {0, 0, 0};
      percent[k] = ramp[i];
      write_patch(out, percent, &noise);
    }
  }
  uint64_t choice = SEED + 104;
  for (int i = 0; i < 30; i++) {
    int percent[N_INKS];
    for (int k = 0; k < N_INKS; k++) {
      percent[k] = pick(&choice, 0, 100, 5);
    }
    write_patch(out, percent, &noise);
  }
}
