/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_rows.h"

#include <math.h>
#include <stdlib.h>

#include "message.h"
#include "panel_words.h"

bool panel_rows_new(panel_rows *r, size_t n) {
  *r = (panel_rows){.n = n};
  r->name = calloc(n + 1, sizeof *r->name);
  r->value = calloc(n + 1, sizeof *r->value);
  return r->name != NULL && r->value != NULL;
}

void panel_rows_free(panel_rows *r) {
  free(r->name);
  free(r->value);
  *r = (panel_rows){0};
}

/* The figures in words, for those who do not see the chart. */
static void describe(text *out, const panel_rows *r, size_t n) {
  text_add(out, r->about);
  for (size_t i = 0; i < n; ++i) {
    text_format(out, " %s: ", r->name[i]);
    if (isnan(r->value[i].value))
      text_add(out, "none");
    else
      panel_add_estimate(out, r->value[i], "");
    text_add(out, ".");
  }
  if (n < r->n)
    text_format(out, " The first %zu of %zu are drawn.", n, r->n);
}

/* The panel's interval behind the rows, and its value. */
static ef_status add_whole(ef_chart *chart, const panel_rows *r, size_t n,
                           ef_error *error) {
  const ef_estimate w = r->whole;
  if (isnan(w.value))
    return EF_OK;
  const double top = -0.5, bottom = (double)n - 0.5;
  const double x[4] = {w.low, w.high, w.high, w.low};
  const double y[4] = {top, top, bottom, bottom};
  const double at[2] = {w.value, w.value}, ends[2] = {top, bottom};
  ef_status status = EF_OK;
  if (isfinite(w.low) && isfinite(w.high)) {
    ef_series area = ef_series_default(EF_SERIES_REGION);
    area.look = 1;
    area.n = 4;
    area.x = x;
    area.y = y;
    status = ef_chart_add(chart, &area, error);
  }
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = 1;
  line.name = r->whole_name;
  line.n = 2;
  line.x = at;
  line.y = ends;
  return status == EF_OK ? ef_chart_add(chart, &line, error) : status;
}

static ef_status add_rows(ef_chart *chart, const panel_rows *r, size_t n,
                          ef_error *error) {
  double x[PANEL_MOST_ROWS], y[PANEL_MOST_ROWS];
  double low[PANEL_MOST_ROWS], high[PANEL_MOST_ROWS];
  ef_series spans = ef_series_default(EF_SERIES_SPANS);
  for (size_t i = 0; i < n; ++i) {
    if (!isfinite(r->value[i].value))
      continue;
    x[spans.n] = r->value[i].value;
    y[spans.n] = (double)i;
    low[spans.n] = r->value[i].low;
    high[spans.n++] = r->value[i].high;
  }
  spans.look = 0;
  spans.name = "one observer, 95 % interval";
  spans.x = x;
  spans.y = y;
  spans.low = low;
  spans.high = high;
  return ef_chart_add(chart, &spans, error);
}

ef_status panel_rows_report(const panel_rows *r, const report *page,
                            ef_error *error) {
  const size_t n = r->n < PANEL_MOST_ROWS ? r->n : PANEL_MOST_ROWS;
  text about = {0};
  describe(&about, r, n);
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = r->title;
  settings.description = about.bytes;
  settings.x_title = r->x_title;
  settings.n_rows = n;
  settings.row = r->name;
  ef_chart *chart = about.failed ? NULL : ef_chart_new(&settings, error);
  if (about.failed)
    message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  text_free(&about);
  ef_status status = chart != NULL ? EF_OK : error->status;
  if (status == EF_OK)
    status = add_whole(chart, r, n, error);
  if (status == EF_OK)
    status = add_rows(chart, r, n, error);
  if (status == EF_OK)
    ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  return status;
}
