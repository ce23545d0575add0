/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Answers: counted, checked, sorted and scaled. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

ef_status ef__error_row(ef_error *error, ef_status status, size_t row,
                        const char *field) {
  ef__error_place(error, NULL, row, 0, field);
  return status;
}

static int compare_doubles(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Sorted values without repeats; returns how many are left. */
static size_t sort_unique(size_t n, double *value) {
  qsort(value, n, sizeof *value, compare_doubles);
  size_t kept = 0;
  for (size_t i = 0; i < n; ++i) {
    if (kept == 0 || value[i] > value[kept - 1])
      value[kept++] = value[i];
  }
  return kept;
}

static size_t index_of(size_t n, const double *sorted, double value) {
  const double *found =
      bsearch(&value, sorted, n, sizeof *sorted, compare_doubles);
  return (size_t)(found - sorted);
}

size_t ef_responses_collect(size_t n_trials, const double *level,
                            const bool *is_positive, double *out_level,
                            size_t *out_shown, size_t *out_positive) {
  if (n_trials == 0)
    return 0;
  memcpy(out_level, level, n_trials * sizeof *level);
  const size_t n = sort_unique(n_trials, out_level);
  memset(out_shown, 0, n * sizeof *out_shown);
  memset(out_positive, 0, n * sizeof *out_positive);
  for (size_t i = 0; i < n_trials; ++i) {
    const size_t row = index_of(n, out_level, level[i]);
    out_shown[row]++;
    out_positive[row] += is_positive[i];
  }
  return n;
}

static ef_status check_row(const ef_responses *r, size_t i, ef_axis axis,
                           ef_error *error) {
  const double level = r->level[i];
  if (!isfinite(level)) {
    ef__error_set(error, EF_MALFORMED, "level is %g, expected a number", level);
    return ef__error_row(error, EF_MALFORMED, i + 1, "level");
  }
  if (axis == EF_AXIS_LOG && level < 0) {
    ef__error_set(error, EF_MALFORMED,
                  "level is %g, and a logarithmic axis has no place below 0: "
                  "use a linear axis, or the size of the difference",
                  level);
    return ef__error_row(error, EF_MALFORMED, i + 1, "level");
  }
  if (r->shown[i] == 0) {
    ef__error_set(error, EF_MALFORMED,
                  "n is 0: a level without answers says nothing; leave it out");
    return ef__error_row(error, EF_MALFORMED, i + 1, "n");
  }
  if (r->positive[i] > r->shown[i]) {
    ef__error_set(error, EF_MALFORMED,
                  "k is %zu and n is %zu: more answers are positive than were "
                  "given",
                  r->positive[i], r->shown[i]);
    return ef__error_row(error, EF_MALFORMED, i + 1, "k");
  }
  return EF_OK;
}

static double weighted_scale(size_t n, const double *t, const double *weight,
                             double *centre) {
  double total = 0, sum = 0, square = 0;
  for (size_t i = 0; i < n; ++i) {
    total += weight[i];
    sum += weight[i] * t[i];
  }
  *centre = total > 0 ? sum / total : 0;
  for (size_t i = 0; i < n; ++i)
    square += weight[i] * (t[i] - *centre) * (t[i] - *centre);
  return square > 0 ? sqrt(square / total) : 1;
}

void ef__data_scale(ef__data *data) {
  const size_t from = data->has_blank ? 1 : 0;
  data->scale = weighted_scale(data->n - from, data->t + from,
                               data->shown + from, &data->centre);
  data->least_gap = 0;
  for (size_t i = from; i < data->n; ++i) {
    data->t[i] = (data->t[i] - data->centre) / data->scale;
    if (i == from)
      continue;
    const double gap = data->t[i] - data->t[i - 1];
    if (data->least_gap == 0 || gap < data->least_gap)
      data->least_gap = gap;
  }
}

ef_status ef__data_new(const ef_responses *responses, ef_axis axis,
                       ef__data *out, void **block, ef_error *error) {
  const size_t n_rows = responses->n_rows;
  *block = NULL;
  for (size_t i = 0; i < n_rows; ++i) {
    const ef_status status = check_row(responses, i, axis, error);
    if (status != EF_OK)
      return status;
  }
  double *level;
  const ef__part part[] = {{&level, n_rows, sizeof *level},
                           {&out->t, n_rows, sizeof *out->t},
                           {&out->shown, n_rows, sizeof *out->shown},
                           {&out->positive, n_rows, sizeof *out->positive}};
  *block = ef__allocate_block(4, part);
  if (*block == NULL)
    return ef__error_memory(error, "the answers");
  if (n_rows > 0)
    memcpy(level, responses->level, n_rows * sizeof *level);
  out->n = sort_unique(n_rows, level);
  out->level = level;
  for (size_t i = 0; i < n_rows; ++i) {
    const size_t row = index_of(out->n, level, responses->level[i]);
    out->shown[row] += (double)responses->shown[i];
    out->positive[row] += (double)responses->positive[i];
  }
  out->has_blank = axis == EF_AXIS_LOG && out->n > 0 && level[0] == 0;
  for (size_t i = out->has_blank ? 1 : 0; i < out->n; ++i)
    out->t[i] = ef__axis_value(axis, level[i]);
  ef__data_scale(out);
  return EF_OK;
}
