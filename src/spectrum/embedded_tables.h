/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What tools/embed_tables makes of the CSV files in spectra/. */
#ifndef EVENFIELD_SPECTRUM_EMBEDDED_TABLES_H
#define EVENFIELD_SPECTRUM_EMBEDDED_TABLES_H

#include <evenfield/spectrum.h>

/* Sorted by group, then name; no two names are equal without regard to case,
 * nor two columns of one table; column 0 is "wavelength_nm" and increases. */
extern const ef_table ef__tables[];
extern const size_t ef__table_count;
/* Their names, in the same order. */
extern const char *const ef__table_names[];

#endif
