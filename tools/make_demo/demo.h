/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the files of the demo's generator share: noise, shapes, header lines,
 * and the writers themselves. */
#ifndef MAKE_DEMO_DEMO_H
#define MAKE_DEMO_DEMO_H

#include <stdint.h>
#include <stdio.h>

/* Each file's noise starts at SEED plus a number of its own. */
enum { SEED = 4711 };

/* ---- Noise (shape.c) --------------------------------------------------- */

/* Uniform in [0, 1); steps `state`. */
double uniform(uint64_t *state);

/* Near-normal, mean 0, standard deviation 1. */
double normal(uint64_t *state);

/* A multiple of `step` from `low` to `high`, each equally likely. */
int pick(uint64_t *state, int low, int high, int step);

/* What an instrument shows that errs by a share of the value and by a fixed
 * amount (standard deviations) and shows nothing below zero. */
double reading(double value, double relative, double absolute, uint64_t *state);

/* ---- Shapes (shape.c) -------------------------------------------------- */

enum shape { NONE, BELL, RISE, FALL };

/* BELL: width is the standard deviation. RISE and FALL: a logistic step. */
struct term {
  enum shape shape;
  double height, centre_nm, width_nm;
};

enum { MAX_TERMS = 5 };

/* A base and terms up to the first NONE. */
struct curve {
  double base;
  struct term term[MAX_TERMS];
};

double curve_at(const struct curve *curve, double nm);

/* Reflectance of an opaque layer of absorption to scattering `ratio`. */
double opaque(double ratio);

/* ---- Text (shape.c) ---------------------------------------------------- */

/* `unit` may be NULL. */
void write_header(FILE *out, const char *title, const char *quantity,
                  const char *unit, const char *story);

/* The rest of a header row: a column each 10 nm. */
void write_band_names(FILE *out, int first_nm, int last_nm);

/* ---- Files ------------------------------------------------------------- */

void write_colour_pairs(FILE *out);
void write_flicker_settings(FILE *out);
void write_kiosk_measurements(FILE *out);
void write_kiosk_primaries(FILE *out);
void write_lab_display(FILE *out);
void write_leaflet_press(FILE *out);
void write_livery(FILE *out);
void write_livery_colourants(FILE *out);
void write_pair_answers(FILE *out);
void write_panel_responses(FILE *out);
void write_seats_deliveries(FILE *out);
void write_seats_standard(FILE *out);
void write_shop_light(FILE *out);
void write_signal_colours(FILE *out);

#endif
