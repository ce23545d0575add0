/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_next_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "diagram.h"
#include "message.h"
#include "panel_words.h"
#include "report.h"

/* Levels in one chart of rows, and charts of observers in a report. */
enum { NAME_ROOM = 160, MOST_ROWS = 60, MOST_CHARTS = 4 };
/* Thresholds less likely than this share of the likeliest are not drawn. */
#define LEAST_SHARE 0.002

/* ---- What is known of the thresholds ----------------------------------- */

/* Steps [from, to) that have a curve: observers with answers, or else the new
 * one. */
static size_t n_known(const panel_next *p) {
  return p->n > 1 ? p->n - 1 : 1;
}

static ef_status add_posterior(ef_chart *chart, const panel_next *p,
                               const next_step *s, int look, ef_error *error) {
  const size_t n = p->settings.n_thresholds;
  double most = 0.0;
  char name[NAME_ROOM];
  for (size_t i = 0; i < n; ++i)
    most = fmax(most, s->density[i]);
  double *block = malloc(2 * n * sizeof *block);
  if (block == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  ef_series line = ef_series_default(EF_SERIES_LINE);
  double *x = block, *y = block + n;
  for (size_t i = 0; i < n; ++i) {
    if (s->density[i] < LEAST_SHARE * most)
      continue;
    x[line.n] = s->threshold[i];
    y[line.n++] = 100.0 * s->density[i] / most;
  }
  panel_next_name(p, s, name, sizeof name);
  line.look = look;
  line.name = name;
  line.x = x;
  line.y = y;
  const ef_status status = ef_chart_add(chart, &line, error);
  free(block);
  return status;
}

static ef_status add_levels(ef_chart *chart, const panel_next *p,
                            ef_error *error) {
  double *zero = calloc(p->n_levels, sizeof *zero);
  if (zero == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = EF_LOOK_FRAME;
  marks.name = "levels in hand";
  marks.n = p->n_levels;
  marks.x = p->level;
  marks.y = zero;
  const ef_status status = ef_chart_add(chart, &marks, error);
  free(zero);
  return status;
}

/* The level to show next, named once where several have the same. */
static ef_status add_choice(ef_chart *chart, const panel_next *p, size_t first,
                            size_t at, int look, ef_error *error) {
  const next_step *s = &p->step[at];
  char name[NAME_ROOM];
  const double zero = 0.0;
  if (s->next.is_done)
    return EF_OK;
  bool is_named = false;
  for (size_t i = first; i < at; ++i) {
    is_named = is_named || (!p->step[i].next.is_done &&
                            p->step[i].next.choice == s->next.choice);
  }
  panel_next_level(p, s->next.choice, name, sizeof name);
  const char *const label = name;
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = look;
  marks.n = 1;
  marks.x = &p->level[s->next.choice];
  marks.y = &zero;
  marks.label = is_named ? NULL : &label;
  return ef_chart_add(chart, &marks, error);
}

/* The figures in words, for those who do not see the chart. */
static void describe(text *out, const panel_next *p, size_t first,
                     size_t last) {
  text_add(out, "How likely each threshold is after the answers so far, in % "
                "of the likeliest one; marks on the axis: levels in hand, and "
                "the one to show next.");
  for (size_t i = first; i < last; ++i) {
    const next_step *s = &p->step[i];
    char name[NAME_ROOM], level[NAME_ROOM];
    panel_next_name(p, s, name, sizeof name);
    panel_next_level(p, s->next.choice, level, sizeof level);
    text_format(out, " %s: %s ", name, panel_next_aim_words(s));
    panel_add_estimate(out, panel_next_aim(s), p->answers.unit);
    text_format(out, s->next.is_done ? ", done." : ", show %s next.", level);
  }
}

static ef_chart *draw(const panel_next *p, size_t first,
                      ef_chart_settings settings, ef_error *error) {
  const size_t n = n_known(p);
  const size_t last = first + EF_LOOKS < n ? first + EF_LOOKS : n;
  char x_title[100];
  text about = {0};
  describe(&about, p, first, last);
  snprintf(x_title, sizeof x_title,
           p->answers.unit[0] != '\0' ? "threshold, %.80s" : "threshold%.80s",
           p->answers.unit);
  settings.description = about.bytes;
  settings.x_title = x_title;
  settings.y_title = "how likely, % of the likeliest";
  settings.y_to = 102.0;
  ef_chart *chart = about.failed ? NULL : ef_chart_new(&settings, error);
  if (about.failed)
    message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  text_free(&about);
  if (chart == NULL)
    return NULL;
  ef_status status = add_levels(chart, p, error);
  for (size_t i = first; i < last && status == EF_OK; ++i)
    status = add_posterior(chart, p, &p->step[i], (int)(i - first), error);
  for (size_t i = first; i < last && status == EF_OK; ++i)
    status = add_choice(chart, p, first, i, (int)(i - first), error);
  if (status == EF_OK)
    return chart;
  ef_chart_free(chart);
  return NULL;
}

ef_status panel_next_chart_write(const panel_next *p, const ef_notes *notes,
                                 ef_error *error) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.title = "What is known, and what to show next";
  settings.subtitle = "Curves: how likely each threshold is after the answers "
                      "so far; marks on the axis: the levels in hand, and the "
                      "one to show next";
  settings.overwrite = p->options->force;
  diagram d = {.chart = draw(p, 0, settings, error)};
  const ef_status status =
      d.chart != NULL ? diagram_write(&d, p->options->chart, notes, error)
                      : error->status;
  diagram_free(&d);
  if (status == EF_OK && n_known(p) > EF_LOOKS) {
    message_note(notes,
                 "%s: the first %d of %zu observers are drawn; --report draws "
                 "up to %d",
                 p->options->chart, EF_LOOKS, n_known(p),
                 MOST_CHARTS * EF_LOOKS);
  }
  return status;
}

/* ---- What each level would tell ---------------------------------------- */

static ef_status add_gains(ef_chart *chart, const panel_next *p,
                           const next_step *s, bool is_choice,
                           ef_error *error) {
  double *block = malloc(2 * p->n_levels * sizeof *block);
  if (block == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  double *x = block, *y = block + p->n_levels;
  for (size_t i = 0; i < p->n_levels; ++i) {
    if ((i == s->next.choice) != is_choice)
      continue;
    x[marks.n] = s->gain[i];
    y[marks.n++] = (double)i;
  }
  marks.look = is_choice ? 1 : 0;
  marks.name = is_choice ? "shows most" : "another level in hand";
  marks.x = x;
  marks.y = y;
  const ef_status status =
      marks.n > 0 ? ef_chart_add(chart, &marks, error) : EF_OK;
  free(block);
  return status;
}

static ef_status draw_gains(const panel_next *p, const report *page,
                            ef_error *error) {
  const next_step *s = panel_next_told(p);
  char who[NAME_ROOM], title[NAME_ROOM + 40], level[NAME_ROOM];
  char about[2 * NAME_ROOM + 120];
  char(*name)[NAME_ROOM] = malloc(p->n_levels * sizeof *name);
  const char **row = malloc(p->n_levels * sizeof *row);
  if (name == NULL || row == NULL) {
    free(name);
    free(row);
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  }
  for (size_t i = 0; i < p->n_levels; ++i) {
    panel_next_level(p, i, name[i], sizeof name[i]);
    row[i] = name[i];
  }
  panel_next_name(p, s, who, sizeof who);
  panel_next_level(p, s->next.choice, level, sizeof level);
  snprintf(title, sizeof title, "What an answer would tell about %s", who);
  snprintf(
      about, sizeof about,
      "Bits by which an answer at each level in hand is expected to narrow "
      "down the threshold; most at %s.",
      level);
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = title;
  settings.description = about;
  settings.x_title = "gain, bits";
  settings.x_from = 0.0;
  settings.n_rows = p->n_levels;
  settings.row = row;
  ef_chart *chart = ef_chart_new(&settings, error);
  ef_status status = chart != NULL ? EF_OK : error->status;
  if (status == EF_OK)
    status = add_gains(chart, p, s, false, error);
  if (status == EF_OK)
    status = add_gains(chart, p, s, true, error);
  if (status == EF_OK)
    ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  free(name);
  free(row);
  return status;
}

/* ---- Report ------------------------------------------------------------ */

static ef_status add_charts(const panel_next *p, const report *page,
                            ef_error *error) {
  ef_status status = EF_OK;
  ef_report_front(page->page, "What is known");
  for (size_t k = 0; k < MOST_CHARTS && status == EF_OK; ++k) {
    const size_t first = k * EF_LOOKS;
    if (first >= n_known(p))
      break;
    ef_chart_settings settings = ef_chart_settings_default();
    settings.width_px = REPORT_CHART_PX;
    settings.title = k == 0 ? "Thresholds that are possible" : "More observers";
    ef_chart *chart = draw(p, first, settings, error);
    if (chart == NULL)
      return error->status;
    ef_report_chart(page->page, chart);
    ef_chart_free(chart);
  }
  return p->n_levels <= MOST_ROWS ? draw_gains(p, page, error) : EF_OK;
}

ef_status panel_next_report_write(const panel_next *p, const ef_notes *notes,
                                  ef_error *error) {
  report page;
  ef_status status = report_begin(&page, p->options, notes,
                                  "Evenfield: what to show next?", error);
  if (status == EF_OK) {
    text out = report_text(&page);
    report_input(&page, p->answers.file);
    panel_next_add(&out, p);
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
