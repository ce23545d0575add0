/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * An invented three-ink print for tests: smooth inks on a bluish paper, 400 to
 * 700 nm at 10 nm, and a table of its patches that grows row by row. */
#ifndef EVENFIELD_TESTS_INVENTED_PRINT_H
#define EVENFIELD_TESTS_INVENTED_PRINT_H

#include <evenfield/device.h>

enum { PRINT_SAMPLES = 31, PRINT_ROWS = 128 };

/** 400 to 700 nm, 10 nm. */
ef_grid print_grid(void);

/** The eight Neugebauer primaries, 8 x PRINT_SAMPLES; those with black (bit 3)
 * behind them where `n_inks` is 4: 16 x PRINT_SAMPLES. */
void print_primaries(size_t n_inks, double *out);

/** Coverage that the inks print: drive + growth * 4 drive (1 - drive). */
double print_area(size_t ink, double drive);

/** Reflectance of a patch with Yule-Nielsen factor n. */
void print_patch(double n, size_t n_inks, const double *drive,
                 double out[PRINT_SAMPLES]);

typedef struct print_table {
  double n;
  size_t n_inks, n_rows;
  double drive[4 * PRINT_ROWS];
  double spectrum[PRINT_SAMPLES * PRINT_ROWS];
  double xyz[3 * PRINT_ROWS]; /**< CIE 1931, D50 */
  size_t line[PRINT_ROWS];    /**< row + 11 */
  char notes[2000];           /**< what was noted, one line each */
  ef_notes sink;
} print_table;

print_table *print_table_new(double n, size_t n_inks);
void print_table_free(print_table *table);
void print_table_add(print_table *table, double c, double m, double y,
                     double k);
/** All primaries, and for each ink its drives 0.1, 0.25, 0.5, 0.75, 0.9. */
void print_table_fill(print_table *table);
/** As measurements, spectra or tristimulus values. */
ef_measurements print_table_view(const print_table *table, bool spectral);

#endif
