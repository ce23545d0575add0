/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_plan_chart.h"

#include <math.h>
#include <stdio.h>

#include "diagram.h"
#include "message.h"
#include "report.h"
#include "text.h"
#include "words.h"

/* What is drawn against the trials of one observer. */
typedef enum plan_view { VIEW_PRECISION, VIEW_POWER, VIEW_ANSWERS } plan_view;

static double value_of(const plan_choice *c, plan_view view) {
  switch (view) {
  case VIEW_POWER:
    return 100.0 * c->row.power;
  case VIEW_ANSWERS:
    return plan_will_do(c) ? (double)plan_answers(c) : (double)NAN;
  default:
    return isfinite(c->row.half_width) ? 100.0 * c->row.half_width
                                       : (double)NAN;
  }
}

/* ---- Words ------------------------------------------------------------- */

static const char *view_words(plan_view view) {
  switch (view) {
  case VIEW_POWER:
    return "Power of one observer, %, against the number of trials.";
  case VIEW_ANSWERS:
    return "Answers that the whole panel gives, against the number of trials "
           "of one observer, for the precision wanted.";
  default:
    return "Half of the 95 % interval of one observer's JND, in % of the JND, "
           "against the number of trials.";
  }
}

/* The figures in words, for those who do not see the chart. */
static void describe(text *out, const panel_plan *p, plan_view view) {
  text_add(out, view_words(view));
  for (size_t k = 0; k < p->n_procedures; ++k) {
    text_format(out, " By %s: ", plan_procedure_words(p->procedure[k]));
    for (size_t i = 0; i < PLAN_SIZES; ++i) {
      const plan_choice *c = &p->choice[k][i];
      const double value = value_of(c, view);
      char number[EF_NUMBER_TEXT] = "none";
      if (isfinite(value))
        ef_number_format_fixed(value, 0, number);
      text_format(out, "%s%s at %zu", i > 0 ? ", " : "", number,
                  c->row.n_trials);
    }
    text_add(out, ".");
  }
}

/* ---- Drawing ----------------------------------------------------------- */

static ef_status add_procedure(ef_chart *chart, const panel_plan *p, size_t k,
                               plan_view view, ef_error *error) {
  double x[PLAN_SIZES], y[PLAN_SIZES];
  double known_x[PLAN_SIZES], known_y[PLAN_SIZES];
  size_t n_known = 0;
  for (size_t i = 0; i < PLAN_SIZES; ++i) {
    x[i] = (double)p->choice[k][i].row.n_trials;
    y[i] = value_of(&p->choice[k][i], view);
    if (!isfinite(y[i]))
      continue;
    known_x[n_known] = x[i];
    known_y[n_known++] = y[i];
  }
  if (n_known == 0)
    return EF_OK;
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = (int)k;
  line.n = PLAN_SIZES;
  line.x = x;
  line.y = y;
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = (int)k;
  marks.n = n_known;
  marks.x = known_x;
  marks.y = known_y;
  marks.name = plan_procedure_words(p->procedure[k]);
  const ef_status status = ef_chart_add(chart, &line, error);
  return status == EF_OK ? ef_chart_add(chart, &marks, error) : status;
}

/* The precision that the panel is to have, or the power that is usual. */
static ef_status add_goal(ef_chart *chart, const panel_plan *p, plan_view view,
                          ef_error *error) {
  if (view == VIEW_ANSWERS)
    return EF_OK;
  const bool is_power = view == VIEW_POWER;
  const double goal = is_power ? 80.0 : 100.0 * p->precision;
  const double x[2] = {(double)p->choice[0][0].row.n_trials,
                       (double)p->choice[0][PLAN_SIZES - 1].row.n_trials};
  const double y[2] = {goal, goal};
  char number[EF_NUMBER_TEXT], name[80];
  ef_number_format(goal, number);
  snprintf(name, sizeof name,
           is_power ? "%s %%, which is mostly asked for"
                    : "%s %%, wanted of the panel",
           number);
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = EF_LOOK_FRAME;
  line.name = name;
  line.n = 2;
  line.x = x;
  line.y = y;
  return ef_chart_add(chart, &line, error);
}

static ef_chart *draw(const panel_plan *p, plan_view view,
                      ef_chart_settings settings, ef_error *error) {
  text about = {0};
  describe(&about, p, view);
  settings.description = about.bytes;
  settings.x_title = "trials of one observer";
  settings.y_title = view == VIEW_POWER ? "power of one observer, %"
                     : view == VIEW_ANSWERS
                         ? "answers of the whole panel"
                         : "half of the 95 % interval, % of the JND";
  settings.x_from = 0.0;
  settings.y_from = 0.0;
  if (view == VIEW_POWER)
    settings.y_to = 100.0;
  ef_chart *chart = about.failed ? NULL : ef_chart_new(&settings, error);
  if (about.failed)
    message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  text_free(&about);
  ef_status status = chart != NULL ? EF_OK : error->status;
  if (status == EF_OK)
    status = add_goal(chart, p, view, error);
  for (size_t k = 0; k < p->n_procedures && status == EF_OK; ++k)
    status = add_procedure(chart, p, k, view, error);
  if (status == EF_OK)
    return chart;
  ef_chart_free(chart);
  return NULL;
}

static void title_of(const panel_plan *p, plan_view view, char title[120]) {
  char jnd[EF_NUMBER_TEXT], other[EF_NUMBER_TEXT];
  ef_number_format(p->settings.jnd, jnd);
  ef_number_format(p->settings.other_jnd, other);
  switch (view) {
  case VIEW_POWER:
    snprintf(title, 120, "Can one observer's JND be told from %s?", other);
    break;
  case VIEW_ANSWERS:
    snprintf(title, 120, "What does the panel have to answer?");
    break;
  default:
    snprintf(title, 120, "How well is one observer's JND of %s known?", jnd);
  }
}

ef_status panel_plan_chart_write(const panel_plan *p, const ef_notes *notes,
                                 ef_error *error) {
  const plan_view view =
      isnan(p->settings.other_jnd) ? VIEW_PRECISION : VIEW_POWER;
  char title[120], subtitle[160];
  title_of(p, view, title);
  snprintf(subtitle, sizeof subtitle,
           "%s; %zu experiments simulated for each mark with seed %llu; no "
           "mark: too many without a JND",
           ef_task_name(p->settings.task), p->settings.n_experiments,
           (unsigned long long)p->settings.seed);
  ef_chart_settings settings = ef_chart_settings_default();
  settings.title = title;
  settings.subtitle = subtitle;
  settings.overwrite = p->options->force;
  diagram d = {.chart = draw(p, view, settings, error)};
  const ef_status status =
      d.chart != NULL ? diagram_write(&d, p->options->chart, notes, error)
                      : error->status;
  diagram_free(&d);
  return status;
}

/* ---- Report ------------------------------------------------------------ */

static ef_status add_chart(const panel_plan *p, const report *page,
                           plan_view view, ef_error *error) {
  char title[120];
  title_of(p, view, title);
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = title;
  ef_chart *chart = draw(p, view, settings, error);
  if (chart == NULL)
    return error->status;
  ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  return EF_OK;
}

ef_status panel_plan_report_write(const panel_plan *p, const ef_notes *notes,
                                  ef_error *error) {
  report page;
  ef_status status =
      report_begin(&page, p->options, notes,
                   "Evenfield: how many people and trials?", error);
  if (status == EF_OK) {
    text out = report_text(&page);
    page.has_seed = true;
    page.seed = (double)p->settings.seed;
    panel_plan_add(&out, p);
    status = text_flush(&out, error);
    text_free(&out);
  }
  if (status == EF_OK) {
    ef_report_front(page.page, "What more trials bring");
    status = add_chart(p, &page, VIEW_PRECISION, error);
  }
  if (status == EF_OK && !isnan(p->settings.other_jnd))
    status = add_chart(p, &page, VIEW_POWER, error);
  if (status == EF_OK)
    status = add_chart(p, &page, VIEW_ANSWERS, error);
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
