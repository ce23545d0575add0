/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_calibrate_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "diagram.h"
#include "message.h"
#include "panel_rows.h"
#include "panel_words.h"
#include "render_panel_calibrate.h"
#include "report.h"

enum { CURVE_POINTS = 200 };

/* ---- Answers at each difference ---------------------------------------- */

typedef struct point {
  double difference;
  size_t shown, positive;
} point;

static int by_difference(const void *a, const void *b) {
  const double x = ((const point *)a)->difference;
  const double y = ((const point *)b)->difference;
  return (x > y) - (x < y);
}

/* Rows of one difference together; owned by the caller, NULL without memory. */
static point *collect(const panel_calibration *c, size_t *n_points) {
  const answers *a = &c->answers;
  point *all = malloc((a->n + 1) * sizeof *all);
  size_t n = 0;
  if (all == NULL)
    return NULL;
  for (size_t i = 0; i < a->n; ++i)
    all[i] = (point){a->level[i], a->shown[i], a->positive[i]};
  qsort(all, a->n, sizeof *all, by_difference);
  for (size_t i = 0; i < a->n; ++i) {
    if (n > 0 && all[n - 1].difference == all[i].difference) {
      all[n - 1].shown += all[i].shown;
      all[n - 1].positive += all[i].positive;
    } else {
      all[n++] = all[i];
    }
  }
  *n_points = n;
  return all;
}

static ef_status add_answers(ef_chart *chart, size_t n, const point *p,
                             ef_error *error) {
  double *block = malloc(4 * (n + 1) * sizeof *block);
  if (block == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  double *x = block, *share = x + n, *low = x + 2 * n, *high = x + 3 * n;
  for (size_t i = 0; i < n; ++i) {
    const ef_estimate e = ef_share_estimate(p[i].shown, p[i].positive);
    x[i] = p[i].difference;
    share[i] = 100.0 * e.value;
    low[i] = 100.0 * e.low;
    high[i] = 100.0 * e.high;
  }
  ef_series points = ef_series_default(EF_SERIES_INTERVALS);
  points.look = 0;
  points.name = "answers of all, 95 % interval";
  points.n = n;
  points.x = x;
  points.y = share;
  points.low = low;
  points.high = high;
  const ef_status status = ef_chart_add(chart, &points, error);
  free(block);
  return status;
}

/* ---- Curves ------------------------------------------------------------ */

static ef_status add_curve(ef_chart *chart, const ef_psychometric *curve,
                           double to, int look, const char *name,
                           ef_error *error) {
  double x[CURVE_POINTS], y[CURVE_POINTS];
  for (size_t i = 0; i < CURVE_POINTS; ++i) {
    x[i] = to * (double)i / (CURVE_POINTS - 1);
    y[i] = 100.0 * ef_psychometric_value(curve, x[i]);
  }
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = look;
  line.name = name;
  line.n = CURVE_POINTS;
  line.x = x;
  line.y = y;
  return ef_chart_add(chart, &line, error);
}

/* Every observer has the curve of all, moved to the own JND: where the task
 * knows its chance nothing else differs. */
static ef_status add_observers(ef_chart *chart, const panel_calibration *c,
                               double to, ef_error *error) {
  const ef_fit *all = &c->result.pooled;
  ef_status status = EF_OK;
  bool has_any = false;
  if (panel_is_open(c->answers.task) || c->n_observers < 2)
    return status;
  for (size_t i = 0; i < c->n_observers && status == EF_OK; ++i) {
    const double jnd = c->each[i].jnd.value;
    if (!(jnd > 0.0))
      continue;
    ef_psychometric own = all->curve;
    own.location += log10(jnd / all->jnd.value);
    status = add_curve(chart, &own, to, EF_LOOK_FRAME,
                       has_any ? NULL : "each observer", error);
    has_any = true;
  }
  return status;
}

/* The panel's JND with its interval, on the curve of all answers. */
static ef_status add_jnd(ef_chart *chart, const panel_calibration *c,
                         ef_error *error) {
  const ef_estimate e = c->result.jnd;
  const double y =
      100.0 * ef_psychometric_value(&c->result.pooled.curve, e.value);
  const double x[2] = {e.low, e.high}, both[2] = {y, y};
  char number[EF_NUMBER_TEXT], name[80];
  ef_number_format_fixed(e.value, 3, number);
  snprintf(name, sizeof name, "the panel's JND, %s, 95 %% interval", number);
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = 1;
  line.n = 2;
  line.x = x;
  line.y = both;
  ef_series mark = ef_series_default(EF_SERIES_MARKS);
  mark.look = 1;
  mark.name = name;
  mark.n = 1;
  mark.x = &e.value;
  mark.y = &y;
  const ef_status status = ef_chart_add(chart, &line, error);
  return status == EF_OK ? ef_chart_add(chart, &mark, error) : status;
}

static void describe(text *out, const panel_calibration *c, size_t n) {
  text_format(out,
              "Share of answers \"%s\" at each of %zu differences, with 95 %% "
              "intervals (Wilson 1927), and the curve of all answers. The "
              "panel's JND is ",
              ef_task_positive(c->answers.task), n);
  panel_add_estimate(out, c->result.jnd, ef_metric_symbol(c->metric));
  text_add(out, ".");
}

static ef_status draw(const panel_calibration *c, ef_chart_settings settings,
                      ef_chart **out, ef_error *error) {
  char x_title[120], y_title[100];
  size_t n = 0;
  *out = NULL;
  point *p = collect(c, &n);
  text about = {0};
  describe(&about, c, n);
  if (p == NULL || about.failed) {
    free(p);
    text_free(&about);
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  }
  snprintf(x_title, sizeof x_title, "difference, %.80s",
           ef_metric_symbol(c->metric));
  snprintf(y_title, sizeof y_title, "answers \"%.60s\", %%",
           ef_task_positive(c->answers.task));
  settings.x_title = x_title;
  settings.y_title = y_title;
  settings.description = about.bytes;
  *out = ef_chart_new(&settings, error);
  text_free(&about);
  const double to = fmax(p[n - 1].difference, c->result.jnd.value);
  ef_status status = *out != NULL ? EF_OK : error->status;
  if (status == EF_OK)
    status = add_observers(*out, c, to, error);
  if (status == EF_OK)
    status = add_answers(*out, n, p, error);
  if (status == EF_OK)
    status =
        add_curve(*out, &c->result.pooled.curve, to, 0, "all answers", error);
  if (status == EF_OK)
    status = add_jnd(*out, c, error);
  free(p);
  return status;
}

ef_status panel_calibration_chart_write(const panel_calibration *c,
                                        const ef_notes *notes,
                                        ef_error *error) {
  char title[120];
  ef_chart_settings settings = ef_chart_settings_default();
  snprintf(title, sizeof title, "What the panel tells apart, by %.60s",
           ef_metric_title(c->metric));
  settings.title = title;
  settings.subtitle = "Each mark: the answers to pairs of one difference";
  settings.overwrite = c->options->force;
  diagram d = {0};
  ef_status status = draw(c, settings, &d.chart, error);
  if (status == EF_OK)
    status = diagram_write(&d, c->options->chart, notes, error);
  diagram_free(&d);
  return status;
}

/* ---- Report ------------------------------------------------------------ */

static ef_status report_curve(const panel_calibration *c, const report *page,
                              ef_error *error) {
  ef_chart_settings settings = ef_chart_settings_default();
  ef_chart *chart;
  settings.width_px = REPORT_CHART_PX;
  settings.title = "The answers over the difference";
  const ef_status status = draw(c, settings, &chart, error);
  if (status == EF_OK)
    ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  return status;
}

static ef_status report_observers(const panel_calibration *c,
                                  const report *page, ef_error *error) {
  panel_rows r;
  char x_title[120];
  if (c->n_observers < 2)
    return EF_OK;
  if (!panel_rows_new(&r, c->n_observers)) {
    panel_rows_free(&r);
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  }
  for (size_t i = 0; i < c->n_observers; ++i) {
    r.name[i] = answers_observer(&c->answers, i);
    r.value[i] = c->each[i].jnd;
  }
  snprintf(x_title, sizeof x_title, "JND, %.80s", ef_metric_symbol(c->metric));
  r.title = "How people differ";
  r.x_title = x_title;
  r.about = "JND of each observer with its 95 % interval; the band is that of "
            "the panel.";
  r.whole = c->result.jnd;
  r.whole_name = c->result.is_pooled ? "all answers together" : "the panel";
  const ef_status status = panel_rows_report(&r, page, error);
  panel_rows_free(&r);
  return status;
}

/* Marks of the formulas that are clearly worse than the best, or of the rest.
 */
static ef_status add_formulas(ef_chart *chart, const panel_calibration *c,
                              bool is_worse, ef_error *error) {
  double x[PANEL_MOST_ROWS], y[PANEL_MOST_ROWS];
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  for (size_t i = 0; i < c->n_formulas && i < PANEL_MOST_ROWS; ++i) {
    const ef_formula_score *s = &c->formula[i].score;
    if ((s->p_value < 0.05) != is_worse)
      continue;
    x[marks.n] = s->stress;
    y[marks.n++] = (double)i;
  }
  if (marks.n == 0)
    return EF_OK;
  marks.look = is_worse ? 1 : 0;
  marks.name =
      is_worse ? "clearly worse (p < 0.05)" : "best, or not clearly worse";
  marks.x = x;
  marks.y = y;
  return ef_chart_add(chart, &marks, error);
}

static ef_status report_formulas(const panel_calibration *c, const report *page,
                                 ef_error *error) {
  const char *row[PANEL_MOST_ROWS];
  char name[PANEL_MOST_ROWS][60];
  const size_t n =
      c->n_formulas < PANEL_MOST_ROWS ? c->n_formulas : PANEL_MOST_ROWS;
  if (n == 0)
    return EF_OK;
  text about = {0};
  text_format(&about,
              "STRESS of each formula on %zu pairs, %%: 0 when its differences "
              "are proportional to what was seen; F-test against the best.",
              c->n_scored);
  for (size_t i = 0; i < n; ++i) {
    char stress[EF_NUMBER_TEXT];
    snprintf(name[i], sizeof name[i], "%.40s%s",
             ef_metric_name(c->formula[i].metric),
             c->formula[i].is_asked ? ", asked for" : "");
    ef_number_format_fixed(c->formula[i].score.stress, 1, stress);
    text_format(&about, "%s %s %s", i > 0 ? "," : "", name[i], stress);
    row[i] = name[i];
  }
  text_add(&about, ".");
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = "How well each formula orders the pairs";
  settings.description = about.bytes;
  settings.x_title = "STRESS, %";
  settings.x_from = 0.0;
  settings.n_rows = n;
  settings.row = row;
  ef_chart *chart = about.failed ? NULL : ef_chart_new(&settings, error);
  if (about.failed)
    message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  text_free(&about);
  ef_status status = chart != NULL ? EF_OK : error->status;
  if (status == EF_OK)
    status = add_formulas(chart, c, false, error);
  if (status == EF_OK)
    status = add_formulas(chart, c, true, error);
  if (status == EF_OK)
    ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  return status;
}

ef_status panel_calibration_report_write(const panel_calibration *c,
                                         const ef_notes *notes,
                                         ef_error *error) {
  report page;
  ef_status status =
      report_begin(&page, c->options, notes,
                   "Evenfield: what is a just-noticeable difference to this "
                   "panel?",
                   error);
  if (status == EF_OK) {
    text out = report_text(&page);
    report_input(&page, c->answers.file);
    report_input(&page, c->pairs_path);
    page.has_seed = c->settings.intervals.n_samples > 0;
    page.seed = (double)c->settings.intervals.seed;
    panel_calibration_add(&out, c);
    status = text_flush(&out, error);
    text_free(&out);
  }
  if (status == EF_OK) {
    ef_report_front(page.page, "The JND");
    status = report_curve(c, &page, error);
  }
  if (status == EF_OK)
    status = report_observers(c, &page, error);
  if (status == EF_OK)
    status = report_formulas(c, &page, error);
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
