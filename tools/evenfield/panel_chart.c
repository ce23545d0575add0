/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "diagram.h"
#include "message.h"
#include "panel_rows.h"
#include "render_panel_fit.h"
#include "report.h"

enum { CURVE_POINTS = 200 };

/* ---- One curve --------------------------------------------------------- */

/* The answers at each level, with 95 % intervals. */
static ef_status add_answers(ef_chart *chart, const panel_fit *f, int look,
                             const char *name, ef_error *error) {
  double *block = malloc(4 * (f->n_points + 1) * sizeof *block);
  if (block == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  double *share = block, *low = block + f->n_points,
         *high = block + 2 * f->n_points;
  for (size_t i = 0; i < f->n_points; ++i) {
    const ef_estimate e = ef_share_estimate(f->shown[i], f->positive[i]);
    share[i] = 100.0 * e.value;
    low[i] = 100.0 * e.low;
    high[i] = 100.0 * e.high;
  }
  ef_series points = ef_series_default(EF_SERIES_INTERVALS);
  points.look = look;
  points.name = name;
  points.n = f->n_points;
  points.x = f->level;
  points.y = share;
  points.low = low;
  points.high = high;
  const ef_status status = ef_chart_add(chart, &points, error);
  free(block);
  return status;
}

static ef_status add_curve(ef_chart *chart, const panel_fit *f, int look,
                           ef_error *error) {
  double x[CURVE_POINTS], y[CURVE_POINTS];
  const double from = f->level[0], to = f->level[f->n_points - 1];
  for (size_t i = 0; i < CURVE_POINTS; ++i) {
    x[i] = from + (to - from) * (double)i / (CURVE_POINTS - 1);
    y[i] = 100.0 * ef_psychometric_value(&f->fit.curve, x[i]);
  }
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = look;
  line.n = CURVE_POINTS;
  line.x = x;
  line.y = y;
  return ef_chart_add(chart, &line, error);
}

/* The threshold with its interval, lying on the curve. */
static ef_status add_threshold(ef_chart *chart, const panel_fit *f, int look,
                               ef_error *error) {
  const ef_estimate e = f->fit.threshold;
  const double y = 100.0 * ef_psychometric_value(&f->fit.curve, e.value);
  const double x[2] = {e.low, e.high}, both[2] = {y, y};
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(e.value, 3, number);
  const char *const label = number;
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = look;
  line.n = 2;
  line.x = x;
  line.y = both;
  ef_series mark = ef_series_default(EF_SERIES_MARKS);
  mark.look = EF_LOOK_FRAME;
  mark.n = 1;
  mark.x = &e.value;
  mark.y = &y;
  mark.label = &label;
  const ef_status status = ef_chart_add(chart, &line, error);
  return status == EF_OK ? ef_chart_add(chart, &mark, error) : status;
}

static ef_status add_fit(ef_chart *chart, const panel_fit *f, int look,
                         const char *name, ef_error *error) {
  ef_status status = EF_OK;
  if (f->n_points == 0)
    return status;
  if (f->status == EF_OK)
    status = add_curve(chart, f, look, error);
  if (status == EF_OK && f->status == EF_OK)
    status = add_threshold(chart, f, look, error);
  return status == EF_OK ? add_answers(chart, f, look, name, error) : status;
}

/* ---- Charts ------------------------------------------------------------ */

static void set_titles(const panel_fits *p, ef_chart_settings *settings,
                       char x_title[100], char y_title[100]) {
  const char *unit = p->answers.unit;
  snprintf(x_title, 100, unit[0] != '\0' ? "level, %.80s" : "level%.80s", unit);
  snprintf(y_title, 100, "answers \"%.60s\", %%",
           ef_task_positive(p->answers.task));
  settings->x_title = x_title;
  settings->y_title = y_title;
}

/* The whole of each condition, up to as many as there are looks. */
static ef_status draw(const panel_fits *p, ef_chart_settings settings,
                      ef_chart **out, ef_error *error) {
  char x_title[100], y_title[100];
  set_titles(p, &settings, x_title, y_title);
  *out = ef_chart_new(&settings, error);
  if (*out == NULL)
    return error->status;
  ef_status status = EF_OK;
  for (size_t c = 0; c < p->n_summaries && c < EF_LOOKS && status == EF_OK;
       ++c) {
    const panel_fit *f = panel_fits_whole(p, p->summary[c].condition);
    char name[200];
    if (f == NULL)
      continue;
    panel_fit_name(p, f, name, sizeof name);
    status = add_fit(*out, f, (int)c, name, error);
  }
  return status;
}

ef_status panel_chart_write(const panel_fits *p, const ef_notes *notes,
                            ef_error *error) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.title = "Answers, and the curve through them";
  settings.subtitle =
      "Bars: 95 % intervals of the shares (Wilson 1927); the line across: that "
      "of the threshold of these answers";
  settings.overwrite = p->options->force;
  diagram d = {0};
  ef_status status = draw(p, settings, &d.chart, error);
  if (status == EF_OK)
    status = diagram_write(&d, p->options->chart, notes, error);
  diagram_free(&d);
  return status;
}

static ef_estimate figure_of(const panel_fit *f, panel_figure figure) {
  const double none = (double)NAN;
  if (f->status != EF_OK)
    return (ef_estimate){none, none, none, none};
  return figure == PANEL_JND        ? f->fit.jnd
         : figure == PANEL_EQUALITY ? f->fit.equality
                                    : f->fit.threshold;
}

/* The figure that is told first, of every observer of a condition. */
static ef_status add_people(const panel_fits *p, size_t condition,
                            const report *page, ef_error *error) {
  static const char *const words[] = {"threshold", "JND", "point of equality"};
  const panel_figure figure = panel_fit_main(p, condition);
  const char *unit = p->answers.unit;
  const char *name = answers_condition(&p->answers, condition);
  char title[200], x_title[120];
  bool is_group;
  panel_rows r;
  if (p->summary[condition].n_observers < 2)
    return EF_OK;
  if (!panel_rows_new(&r, p->n)) {
    panel_rows_free(&r);
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  }
  r.n = 0;
  for (size_t i = 0; i < p->n; ++i) {
    const panel_fit *f = &p->fit[i];
    if (f->is_pooled || f->condition != condition)
      continue;
    r.name[r.n] = answers_observer(&p->answers, f->observer);
    r.value[r.n++] = figure_of(f, figure);
  }
  snprintf(title, sizeof title, "How people differ%s%.120s",
           name[0] != '\0' ? ", " : "", name);
  snprintf(x_title, sizeof x_title, unit[0] != '\0' ? "%s, %.80s" : "%s%.80s",
           words[figure], unit);
  r.title = title;
  r.x_title = x_title;
  r.about = "Each observer with the 95 % interval; the band is that of the "
            "panel.";
  r.whole = panel_fits_value(p, condition, figure, &is_group);
  r.whole_name = is_group ? "the panel" : "all answers together";
  const ef_status status = panel_rows_report(&r, page, error);
  panel_rows_free(&r);
  return status;
}

/* Each curve by itself, as many as a person looks at. */
static ef_status add_each(const panel_fits *p, const report *page,
                          ef_error *error) {
  enum { MOST_CHARTS = 24 };
  size_t n = 0;
  ef_status status = EF_OK;
  for (size_t i = 0; i < p->n && n < MOST_CHARTS && status == EF_OK; ++i) {
    const panel_fit *f = &p->fit[i];
    if (f->is_pooled || f->n_points == 0)
      continue;
    char name[200], x_title[100], y_title[100];
    panel_fit_name(p, f, name, sizeof name);
    ef_chart_settings settings = ef_chart_settings_default();
    settings.width_px = REPORT_CHART_PX;
    settings.title = name;
    set_titles(p, &settings, x_title, y_title);
    ef_chart *chart = ef_chart_new(&settings, error);
    status = chart != NULL ? add_fit(chart, f, 0, NULL, error) : error->status;
    if (status == EF_OK) {
      if (n++ == 0)
        ef_report_section(page->page, "Observer by observer");
      ef_report_chart(page->page, chart);
    }
    ef_chart_free(chart);
  }
  return status;
}

static ef_status add_charts(const panel_fits *p, const report *page,
                            ef_error *error) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = "All answers";
  settings.description =
      "Shares of answers at each level, with 95 % intervals (Wilson 1927), "
      "and the curve through them; the line across the curve is the interval "
      "of the threshold of these answers, which holds for these people alone.";
  ef_chart *chart = NULL;
  ef_status status = draw(p, settings, &chart, error);
  if (status == EF_OK) {
    ef_report_front(page->page, "The curve");
    ef_report_chart(page->page, chart);
  }
  ef_chart_free(chart);
  for (size_t c = 0; c < p->n_summaries && status == EF_OK; ++c)
    status = add_people(p, c, page, error);
  return status == EF_OK && p->n > p->n_summaries ? add_each(p, page, error)
                                                  : status;
}

ef_status panel_report_write(const panel_fits *p, const ef_notes *notes,
                             ef_error *error) {
  report page;
  ef_status status = report_begin(&page, p->options, notes,
                                  "Evenfield: what does the panel say?", error);
  if (status == EF_OK) {
    text out = report_text(&page);
    report_input(&page, p->answers.file);
    page.has_seed = p->intervals.n_samples > 0;
    page.seed = (double)p->intervals.seed;
    panel_fit_add(&out, p);
    status = text_flush(&out, error);
    text_free(&out);
  }
  if (status == EF_OK)
    status = add_charts(p, &page, error);
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
