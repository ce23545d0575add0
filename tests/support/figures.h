/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Figures that stand in a CSV file beside a test: '#' lines, a header row, rows
 * of numbers whose first cell may be a name. No quotes. */
#ifndef EVENFIELD_TESTS_FIGURES_H
#define EVENFIELD_TESTS_FIGURES_H

#include <stdbool.h>
#include <stddef.h>

typedef struct figures {
  size_t n_rows;
  size_t n_columns;
  char **column; /**< names */
  char **cell;   /**< row by row, as they are written */
  char *text;    /**< what the pointers point into */
} figures;

/** Reads `folder`/`file`, with `folder` relative to the tests; the test fails
 * when there is no such file or a row is ragged. Free with figures_free. */
figures figures_read(const char *folder, const char *file);
/** Reads surfaces/`file` of the folder that EVENFIELD_REFERENCE names. */
figures figures_reference(const char *file);
/** True, and `what` are said to be skipped, when it names none. */
bool figures_no_reference(const char *what);
void figures_free(figures *f);
/** Number of that column; the test fails when there is none. */
size_t figures_column(const figures *f, const char *column);
const char *figures_text(const figures *f, size_t row, size_t column);
/** The cell as a number, NaN when it is empty; the test fails for other text.
 */
double figures_number(const figures *f, size_t row, size_t column);
/** Row whose first cell is `name`; the test fails when there is none. */
size_t figures_row(const figures *f, const char *name);

#endif
