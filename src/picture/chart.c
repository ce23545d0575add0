/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Charts as what they are put together of. */
#include "picture/chart_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

ef_series ef_series_default(ef_series_kind kind) {
  return (ef_series){.kind = kind, .magnification = 1.0};
}

ef_chart_settings ef_chart_settings_default(void) {
  const double open = (double)NAN;
  return (ef_chart_settings){.x_title = "",
                             .y_title = "",
                             .x_from = open,
                             .x_to = open,
                             .y_from = open,
                             .y_to = open,
                             .width_px = 720};
}

/* ---- Copies ------------------------------------------------------------ */

/* A clean copy; NULL stays NULL. *complete is cleared without memory. */
static const char *copy_text(const char *text, bool *complete) {
  if (text == NULL)
    return NULL;
  char *copy = ef__allocate(strlen(text) + 1, 1);
  if (copy == NULL)
    *complete = false;
  else
    ef__text_clean(copy, text);
  return copy;
}

static const double *copy_numbers(const double *number, size_t n,
                                  bool *complete) {
  if (number == NULL)
    return NULL;
  double *copy = ef__allocate(n, sizeof *copy);
  if (copy == NULL)
    *complete = false;
  else if (n > 0)
    memcpy(copy, number, n * sizeof *copy);
  return copy;
}

static const char *const *copy_labels(const char *const *label, size_t n,
                                      bool *complete) {
  if (label == NULL)
    return NULL;
  const char **copy = ef__allocate_zeroed(n, sizeof *copy);
  if (copy == NULL) {
    *complete = false;
    return NULL;
  }
  for (size_t i = 0; i < n; ++i)
    copy[i] = copy_text(label[i], complete);
  return copy;
}

/* The casts take back the const that protects owned data from the drawing. */
static void drop(const void *owned) {
  void *block;
  memcpy(&block, &owned, sizeof block);
  free(block);
}

static void drop_series(ef_series *s) {
  for (size_t i = 0; s->label != NULL && i < s->n; ++i)
    drop(s->label[i]);
  drop(s->label);
  drop(s->name);
  const double *const arrays[] = {s->x,          s->y,          s->to_x,
                                  s->to_y,       s->low,        s->high,
                                  s->semi_major, s->semi_minor, s->angle_deg};
  for (size_t i = 0; i < sizeof arrays / sizeof *arrays; ++i)
    drop(arrays[i]);
}

/* ---- Charts ------------------------------------------------------------ */

ef_chart *ef_chart_new(const ef_chart_settings *settings, ef_error *error) {
  if (settings->width_px < 240 || settings->width_px > 4000) {
    ef__error_set(error, EF_INVALID, "a chart is 240 to 4000 px wide, not %zu",
                  settings->width_px);
    return NULL;
  }
  if (settings->n_rows > 0 && settings->row == NULL) {
    ef__error_set(error, EF_INVALID, "%zu rows of a chart have no names",
                  settings->n_rows);
    return NULL;
  }
  ef_chart *chart = ef__allocate_zeroed(1, sizeof *chart);
  if (chart == NULL) {
    ef__error_memory(error, "a chart");
    return NULL;
  }
  bool complete = true;
  ef_chart_settings *s = &chart->settings;
  *s = *settings;
  s->title = copy_text(settings->title, &complete);
  s->subtitle = copy_text(settings->subtitle, &complete);
  s->x_title = copy_text(settings->x_title, &complete);
  s->y_title = copy_text(settings->y_title, &complete);
  s->description = copy_text(settings->description, &complete);
  s->row = copy_labels(settings->row, settings->n_rows, &complete);
  if (complete)
    return chart;
  ef_chart_free(chart);
  ef__error_memory(error, "a chart");
  return NULL;
}

void ef_chart_free(ef_chart *chart) {
  if (chart == NULL)
    return;
  const ef_chart_settings *s = &chart->settings;
  const char *const texts[] = {s->title, s->subtitle, s->x_title, s->y_title,
                               s->description};
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i)
    drop(texts[i]);
  for (size_t i = 0; s->row != NULL && i < s->n_rows; ++i)
    drop(s->row[i]);
  drop(s->row);
  for (size_t i = 0; i < chart->n; ++i)
    drop_series(&chart->series[i]);
  free(chart->series);
  free(chart);
}

static bool is_complete(const ef_series *s) {
  if (s->n == 0)
    return true;
  if (s->x == NULL || s->y == NULL)
    return false;
  switch (s->kind) {
  case EF_SERIES_PAIRS:
    return s->to_x != NULL && s->to_y != NULL;
  case EF_SERIES_ELLIPSES:
    return s->semi_major != NULL && s->semi_minor != NULL &&
           s->angle_deg != NULL && s->magnification > 0.0;
  case EF_SERIES_INTERVALS:
  case EF_SERIES_SPANS:
    return s->low != NULL && s->high != NULL;
  default:
    return true;
  }
}

ef_status ef_chart_add(ef_chart *chart, const ef_series *series,
                       ef_error *error) {
  if (series->look < EF_LOOK_FRAME || series->look >= EF_LOOKS) {
    return ef__error_set(error, EF_INVALID,
                         "a look of a chart is %d to %d, not %d", EF_LOOK_FRAME,
                         EF_LOOKS - 1, series->look);
  }
  if (!is_complete(series)) {
    return ef__error_set(error, EF_INVALID,
                         "a series of a chart lacks an array that its kind "
                         "needs");
  }
  if (chart->n == chart->room) {
    const size_t room = 2 * chart->room + 8;
    ef_series *grown =
        ef__reallocate(chart->series, room, sizeof *chart->series);
    if (grown == NULL)
      return ef__error_memory(error, "a chart");
    chart->series = grown;
    chart->room = room;
  }
  bool complete = true;
  ef_series copy = *series;
  const size_t n = series->n;
  copy.name = copy_text(series->name, &complete);
  copy.x = copy_numbers(series->x, n, &complete);
  copy.y = copy_numbers(series->y, n, &complete);
  copy.to_x = copy_numbers(series->to_x, n, &complete);
  copy.to_y = copy_numbers(series->to_y, n, &complete);
  copy.low = copy_numbers(series->low, n, &complete);
  copy.high = copy_numbers(series->high, n, &complete);
  copy.semi_major = copy_numbers(series->semi_major, n, &complete);
  copy.semi_minor = copy_numbers(series->semi_minor, n, &complete);
  copy.angle_deg = copy_numbers(series->angle_deg, n, &complete);
  copy.label = copy_labels(series->label, n, &complete);
  if (!complete) {
    drop_series(&copy);
    return ef__error_memory(error, "a chart");
  }
  chart->series[chart->n++] = copy;
  return EF_OK;
}
