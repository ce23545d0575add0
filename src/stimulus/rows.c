/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a direction asks of the primaries at a background, as independent rows:
 * contrast of a receptor = gain . modulation. */
#include "stimulus/stimulus_private.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/base_private.h"

static double length_of(size_t n, const double *v) {
  double sum = 0;
  for (size_t i = 0; i < n; ++i)
    sum += v[i] * v[i];
  return sqrt(sum);
}

/* "L, M, rod", the controlled receptors. */
static void list_receptors(const ef_receptor_role role[EF_N_RECEPTORS],
                           size_t size, char *text) {
  size_t used = 0;
  text[0] = '\0';
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (role[r] == EF_RECEPTOR_IGNORED || used + 8 > size)
      continue;
    used +=
        (size_t)snprintf(text + used, size - used, "%s%s", used > 0 ? ", " : "",
                         ef_receptor_symbol((ef_receptor)r));
  }
}

static ef_status not_separable(const ef_receptor_role role[EF_N_RECEPTORS],
                               const ef__rows *rows, ef_error *error) {
  char list[48];
  list_receptors(role, sizeof list, list);
  if (rows->n_controlled > rows->n_primaries) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "%zu receptors (%s) cannot be controlled by %zu "
                         "primaries; ignore some or add primaries",
                         rows->n_controlled, list, rows->n_primaries);
  }
  return ef__error_set(error, EF_NO_ANSWER,
                       "the primaries cannot separate %s: rank %zu of %zu",
                       list, rows->n, rows->n_controlled);
}

/* A copy of the rows that is orthogonalised as they are taken in. */
typedef struct basis {
  double row[EF_N_RECEPTORS * EF_MAX_DRIVES]; /* unit length */
  double target[EF_N_RECEPTORS];
} basis;

/* What of `row` and `target` the rows taken so far leave (Gram-Schmidt, twice,
 * which is enough for orthogonality to rounding). */
static void reduce(const basis *b, const ef__rows *rows, double *row,
                   double *target) {
  const size_t n = rows->n_primaries;
  for (int pass = 0; pass < 2; ++pass) {
    for (size_t k = 0; k < rows->n; ++k) {
      double along = 0;
      for (size_t i = 0; i < n; ++i)
        along += b->row[k * n + i] * row[i];
      for (size_t i = 0; i < n; ++i)
        row[i] -= along * b->row[k * n + i];
      *target -= along * b->target[k];
    }
  }
}

/* Takes a receptor's row in unless it depends on those before to rounding;
 * false when it does and asks for something else than they give. */
static bool take_row(basis *b, ef__rows *rows, ef_receptor receptor,
                     const double *gain, double target) {
  const size_t n = rows->n_primaries;
  double row[EF_MAX_DRIVES], left = target;
  memcpy(row, gain, n * sizeof *row);
  reduce(b, rows, row, &left);
  const double length = length_of(n, row);
  const double rounding = 64 * DBL_EPSILON;
  if (!(length > rounding * length_of(n, gain)))
    return fabs(left) <= rounding * (fabs(target) + length_of(n, gain));
  const size_t k = rows->n++;
  rows->receptor[k] = receptor;
  rows->target[k] = target;
  memcpy(rows->gain + k * n, gain, n * sizeof *gain);
  b->target[k] = left / length;
  for (size_t i = 0; i < n; ++i)
    b->row[k * n + i] = row[i] / length;
  return true;
}

static ef_status check_condition(const ef_receptor_role role[EF_N_RECEPTORS],
                                 ef__rows *rows, ef_error *error) {
  /* Where half of the digits of an amount are lost. */
  const double greatest = 1 / sqrt(DBL_EPSILON);
  double scratch[EF_N_RECEPTORS * EF_MAX_DRIVES +
                 EF_N_RECEPTORS * EF_N_RECEPTORS + EF_N_RECEPTORS];
  const ef_status status =
      ef__condition(rows->n, rows->n_primaries, rows->gain, scratch, NULL,
                    &rows->condition_number, error);
  if (status != EF_OK || rows->condition_number <= greatest)
    return status;
  char list[48];
  list_receptors(role, sizeof list, list);
  return ef__error_set(error, EF_NO_ANSWER,
                       "the primaries cannot separate %s: condition number "
                       "%.3g, so that no more than half of the digits are left",
                       list, rows->condition_number);
}

ef_status ef__rows_make(const ef_stimulator *stimulator,
                        const ef_receptor_role role[EF_N_RECEPTORS],
                        const double contrast[EF_N_RECEPTORS],
                        const double excitation[EF_N_RECEPTORS], ef__rows *out,
                        ef_error *error) {
  const size_t n = stimulator->n;
  basis b;
  *out = (ef__rows){.n_primaries = n};
  bool fits = true;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (role[r] == EF_RECEPTOR_IGNORED)
      continue;
    ++out->n_controlled;
    double gain[EF_MAX_DRIVES];
    for (size_t i = 0; i < n; ++i)
      gain[i] = stimulator->matrix[r * n + i] / excitation[r];
    fits = take_row(&b, out, (ef_receptor)r, gain, contrast[r]) && fits;
  }
  if (!fits)
    return not_separable(role, out, error);
  return check_condition(role, out, error);
}
