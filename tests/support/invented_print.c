/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "invented_print.h"

#include "near.h"

#include <stdlib.h>

ef_grid print_grid(void) {
  return (ef_grid){PRINT_SAMPLES, 400, 10, NULL};
}

static double bell(double peak, double nm, double centre_nm, double width_nm) {
  const double z = (nm - centre_nm) / width_nm;
  return peak * exp(-0.5 * z * z);
}

/* Optical density of a solid on paper. */
static double density(size_t ink, double nm) {
  switch (ink) {
  case 0:
    return 0.05 + bell(1.37, nm, 635, 48) + bell(0.21, nm, 405, 14);
  case 1:
    return 0.04 + bell(1.23, nm, 547, 34) + bell(0.36, nm, 447, 37);
  case 2:
    return 0.02 + bell(1.11, nm, 438, 37);
  default:
    return 1.53 - 0.0004 * (nm - 550);
  }
}

void print_primaries(size_t n_inks, double *out) {
  for (size_t set = 0; set < (size_t)1 << n_inks; set++) {
    for (size_t s = 0; s < PRINT_SAMPLES; s++) {
      const double nm = 400 + 10 * (double)s;
      double sum = 0;
      for (size_t i = 0; i < n_inks; i++)
        sum += set >> i & 1 ? 0.96 * density(i, nm) : 0;
      const double paper = 0.84 + bell(0.05, nm, 452, 33);
      out[set * PRINT_SAMPLES + s] = 0.007 + (paper - 0.007) * pow(10, -sum);
    }
  }
}

double print_area(size_t ink, double drive) {
  static const double growth[4] = {0.061, 0.048, 0.057, 0.066};
  return drive + growth[ink] * 4 * drive * (1 - drive);
}

void print_patch(double n, size_t n_inks, const double *drive,
                 double out[PRINT_SAMPLES]) {
  double primary[16 * PRINT_SAMPLES], area[4], share[16];
  print_primaries(n_inks, primary);
  for (size_t i = 0; i < n_inks; i++)
    area[i] = print_area(i, drive[i]);
  for (size_t k = 0; k < (size_t)1 << n_inks; k++) {
    share[k] = 1;
    for (size_t i = 0; i < n_inks; i++)
      share[k] *= k >> i & 1 ? area[i] : 1 - area[i];
  }
  for (size_t s = 0; s < PRINT_SAMPLES; s++) {
    double sum = 0;
    for (size_t k = 0; k < (size_t)1 << n_inks; k++)
      sum += share[k] * pow(primary[k * PRINT_SAMPLES + s], 1 / n);
    out[s] = pow(sum, n);
  }
}

/* ---- Tables ------------------------------------------------------------- */

static void keep_note(void *cookie, const char *line) {
  char *text = cookie;
  const size_t used = strlen(text);
  snprintf(text + used, 2000 - used, "%s\n", line);
}

print_table *print_table_new(double n, size_t n_inks) {
  print_table *table = calloc(1, sizeof *table);
  assert_non_null(table);
  table->n = n;
  table->n_inks = n_inks;
  table->sink = (ef_notes){keep_note, table->notes};
  return table;
}

void print_table_free(print_table *table) {
  free(table);
}

static void fill_xyz(const double *spectrum, double *xyz) {
  const ef_grid grid = print_grid();
  ef_illuminant *d50 = ef_illuminant_new("D50", NULL);
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  const ef_viewing viewing = ef_viewing_default(d50);
  ef_weights *weights = ef_observer_weights(observer, EF_TRISTIMULUS, &grid,
                                            &viewing, NULL, NULL);
  assert_int_equal(ef_weights_apply(weights, 1, spectrum, 1, xyz, NULL), EF_OK);
  ef_weights_free(weights);
  ef_observer_free(observer);
  ef_illuminant_free(d50);
}

void print_table_add(print_table *table, double c, double m, double y,
                     double k) {
  const size_t r = table->n_rows++;
  const double drive[4] = {c, m, y, k};
  assert_true(r < PRINT_ROWS);
  memcpy(table->drive + r * table->n_inks, drive,
         table->n_inks * sizeof *drive);
  table->line[r] = r + 11;
  print_patch(table->n, table->n_inks, drive,
              table->spectrum + r * PRINT_SAMPLES);
  fill_xyz(table->spectrum + r * PRINT_SAMPLES, table->xyz + 3 * r);
}

void print_table_fill(print_table *table) {
  static const double ramp[] = {0.1, 0.25, 0.5, 0.75, 0.9};
  for (int set = 0; set < 1 << table->n_inks; set++)
    print_table_add(table, set & 1, set >> 1 & 1, set >> 2 & 1, set >> 3 & 1);
  for (size_t i = 0; i < table->n_inks; i++)
    for (size_t k = 0; k < sizeof ramp / sizeof *ramp; k++)
      print_table_add(table, i == 0 ? ramp[k] : 0, i == 1 ? ramp[k] : 0,
                      i == 2 ? ramp[k] : 0, i == 3 ? ramp[k] : 0);
}

ef_measurements print_table_view(const print_table *table, bool spectral) {
  const ef_measurements view = {
      .n_rows = table->n_rows,
      .n_drives = table->n_inks,
      .drive = table->drive,
      .xyz = spectral ? NULL : table->xyz,
      .spectrum = spectral ? table->spectrum : NULL,
      .grid = print_grid(),
      .line = table->line,
  };
  return view;
}
