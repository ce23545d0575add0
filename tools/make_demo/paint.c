/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The livery: paints and the colourants to mix them from. */
#include "demo.h"

struct paint {
  const char *name;
  struct curve absorption; /* K/S */
};

/* The step near 395 nm is the white pigment's edge, common to all. */
static const struct paint livery[] = {
  {"cabin white", {0.0016, {{FALL, 6.0, 392.0, 6.0},
                            {FALL, 0.006, 460.0, 30.0}}}},
  {"deck grey", {0.42, {{FALL, 6.0, 392.0, 6.0},
                        {RISE, 0.05, 600.0, 40.0}}}},
  {"timetable black", {12.5, {{FALL, 1.2, 480.0, 60.0}}}},
  {"mast buff", {0.035, {{FALL, 5.0, 393.0, 6.0},
                         {FALL, 0.62, 488.0, 20.0},
                         {BELL, 0.07, 560.0, 30.0}}}},
  {"rail yellow", {0.016, {{FALL, 4.8, 496.5, 7.5},
                           {FALL, 0.11, 540.0, 16.0}}}},
  {"lifejacket orange", {0.005, {{FALL, 19.0, 548.0, 5.0},
                                 {FALL, 0.02, 594.0, 9.0}}}},
  {"funnel red", {0.040, {{FALL, 10.0, 592.0, 7.0},
                          {FALL, 0.12, 640.0, 12.0}}}},
  {"seafoam green", {0.040, {{FALL, 5.0, 392.0, 6.0},
                             {FALL, 0.30, 445.0, 16.0},
                             {BELL, 0.42, 640.0, 48.0}}}},
  {"harbour turquoise", {0.070, {{FALL, 1.4, 402.0, 14.0},
                                 {BELL, 2.6, 634.0, 42.0},
                                 {BELL, 0.9, 705.0, 28.0}}}},
  {"hull navy", {1.7, {{BELL, 11.0, 620.0, 55.0},
                       {BELL, 5.0, 700.0, 50.0},
                       {BELL, 3.0, 530.0, 40.0},
                       {FALL, 2.0, 410.0, 12.0}}}},
};

enum { N_LIVERY = sizeof livery / sizeof livery[0] };

void write_livery(FILE *out) {
  uint64_t noise = SEED + 1;
  write_header(out, "painted livery colours of the ferries",
               "reflectance (radiance factor, 1 = perfect reflecting diffuser)",
               NULL,
               "the ticket kiosk is to show these colours as passengers know "
               "them from the ships, and the paint shop is to mix them again");
  fprintf(out, "wavelength_nm");
  for (int i = 0; i < N_LIVERY; i++) {
    fprintf(out, ",%s", livery[i].name);
  }
  fputc('\n', out);
  for (int nm = 380; nm <= 730; nm += 10) {
    fprintf(out, "%d", nm);
    for (int i = 0; i < N_LIVERY; i++) {
      const double r = opaque(curve_at(&livery[i].absorption, nm));
      fprintf(out, ",%.4g", reading(r, 0.0005, 0.0002, &noise));
    }
    fputc('\n', out);
  }
}

struct colourant {
  const char *name;
  struct curve absorption, scattering;
};

static const struct colourant colourants[] = {
  {"white", {0.0010, {{FALL, 5.0, 392.0, 6.0}}},
            {0.72, {{FALL, 0.52, 545.0, 95.0}}}},
  {"red", {0.030, {{FALL, 4.2, 594.0, 8.5}, {BELL, -0.9, 440.0, 35.0}}},
          {0.22, {{RISE, 0.24, 612.0, 14.0}}}},
  {"yellow", {0.008, {{FALL, 3.4, 499.0, 8.5}, {FALL, 0.05, 545.0, 15.0}}},
             {0.30, {{RISE, 0.22, 515.0, 15.0}}}},
  {"blue", {0.050, {{FALL, 0.9, 402.0, 12.0},
                    {BELL, 5.6, 622.0, 42.0},
                    {BELL, 3.4, 700.0, 36.0}}},
           {0.07, {{BELL, 0.12, 465.0, 40.0}}}},
};

enum { N_COLOURANTS = sizeof colourants / sizeof colourants[0] };

void write_livery_colourants(FILE *out) {
  write_header(out, "colourants of the livery paint shop",
               "Kubelka-Munk absorption (_k) and scattering (_s) per unit "
               "concentration, in one arbitrary unit",
               NULL,
               "four pastes from which the paint shop mixes the livery "
               "colours; the old paints were made with other pigments");
  fprintf(out, "wavelength_nm");
  for (int i = 0; i < N_COLOURANTS; i++) {
    fprintf(out, ",%s_k,%s_s", colourants[i].name, colourants[i].name);
  }
  fputc('\n', out);
  for (int nm = 380; nm <= 730; nm += 10) {
    fprintf(out, "%d", nm);
    for (int i = 0; i < N_COLOURANTS; i++) {
      fprintf(out, ",%.5g,%.5g", curve_at(&colourants[i].absorption, nm),
              curve_at(&colourants[i].scattering, nm));
    }
    fputc('\n', out);
  }
}
