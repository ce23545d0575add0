/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_panel_fit.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "panel_words.h"
#include "words.h"

enum { DIGITS = 3 };

void panel_fit_name(const panel_fits *p, const panel_fit *f, char *name,
                    size_t room) {
  const char *who = f->is_pooled ? "all"
                    : p->answers.has_observer
                        ? answers_observer(&p->answers, f->observer)
                        : "all answers";
  const char *condition = answers_condition(&p->answers, f->condition);
  snprintf(name, room, "%s%s%s", who, condition[0] != '\0' ? ", " : "",
           condition);
}

/* ---- The answer -------------------------------------------------------- */

/* What is told first of a condition. */
panel_figure panel_fit_main(const panel_fits *p, size_t condition) {
  bool is_group;
  if (p->answers.task == EF_TASK_GREATER_LESS)
    return PANEL_EQUALITY;
  /* A threshold that was asked for elsewhere than at the JND comes first. */
  if (!isnan(p->settings.criterion))
    return PANEL_THRESHOLD;
  const ef_estimate jnd = panel_fits_value(p, condition, PANEL_JND, &is_group);
  return isnan(jnd.value) ? PANEL_THRESHOLD : PANEL_JND;
}

void panel_fit_add_criterion(text *out, const panel_fits *p) {
  const panel_fit *whole = NULL;
  for (size_t i = 0; i < p->n && whole == NULL; ++i)
    whole = p->fit[i].status == EF_OK ? &p->fit[i] : NULL;
  if (whole == NULL || isnan(whole->fit.criterion)) {
    text_add(out, "d' = 1");
    return;
  }
  char percent[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * whole->fit.criterion,
                         words_decimals(100.0 * whole->fit.criterion, 3),
                         percent);
  char *point = strchr(percent, '.');
  if (point != NULL && strspn(point + 1, "0") == strlen(point + 1))
    *point = '\0';
  text_format(out, "%s %% \"%s\"%s", percent, ef_task_positive(p->answers.task),
              panel_is_open(p->answers.task) ? ", lapses and guesses left out"
                                             : ", lapses left out");
}

static void add_who(text *out, const panel_fits *p, size_t condition,
                    bool is_group) {
  const panel_summary *s = &p->summary[condition];
  if (s->n_observers < 2)
    return;
  text_format(out,
              is_group ? ", by %zu observers"
                       : ", all answers of %zu "
                         "observers together",
              s->n_observers);
}

static void add_answer(text *out, const panel_fits *p, size_t condition) {
  const char *unit = p->answers.unit;
  const panel_figure figure = panel_fit_main(p, condition);
  const bool is_panel = p->summary[condition].n_observers > 1;
  const char *owner = is_panel                  ? "panel"
                      : p->answers.has_observer ? "observer"
                                                : "answers'";
  bool is_group;
  const ef_estimate e = panel_fits_value(p, condition, figure, &is_group);
  text line = {0};
  const char *name = answers_condition(&p->answers, condition);
  if (name[0] != '\0')
    text_format(&line, "%s: ", name);
  if (isnan(e.value)) {
    text_format(&line, "no threshold: %s.",
                panel_fits_whole(p, condition)->reason);
    text_paragraph(out, &line, 0);
    return;
  }
  if (owner[0] == 'a') {
    text_add(&line, name[0] != '\0' ? "the " : "The ");
  } else {
    text_format(&line, "%she %s's ", name[0] != '\0' ? "t" : "T", owner);
  }
  text_add(&line, figure == PANEL_JND        ? "JND is "
                  : figure == PANEL_EQUALITY ? "point of equality is "
                                             : "threshold is ");
  panel_add_estimate(&line, e, unit);
  add_who(&line, p, condition, is_group);
  if (figure == PANEL_EQUALITY) {
    const ef_estimate jnd =
        panel_fits_value(p, condition, PANEL_JND, &is_group);
    text_add(&line, "; its JND is ");
    panel_add_estimate(&line, jnd, unit);
  } else if (figure == PANEL_THRESHOLD) {
    text_add(&line, ", at ");
    panel_fit_add_criterion(&line, p);
    if (panel_is_open(p->answers.task) &&
        p->settings.shape != EF_SHAPE_DETECTION)
      text_add(&line, "; it moves with the observer's criterion");
  }
  text_add(&line, ".");
  text_paragraph(out, &line, 0);
}

/* ---- Curves ------------------------------------------------------------ */

static ef_estimate figure_of(const panel_fit *f, panel_figure figure) {
  return figure == PANEL_JND        ? f->fit.jnd
         : figure == PANEL_EQUALITY ? f->fit.equality
                                    : f->fit.threshold;
}

static void start_figure(text_table *t, const char *head) {
  table_column(t, head, "", false);
  table_column(t, "95 %", "from", false);
  table_column(t, NULL, "to", false);
}

static void figure_cells(text_table *t, ef_estimate e, int decimals) {
  table_number(t, e.value, decimals);
  panel_limit_cell(t, e.low, decimals);
  panel_limit_cell(t, e.high, decimals);
}

/* Decimals that show three digits of the smallest value in a column. */
static int figure_decimals(const panel_fits *p, panel_figure figure) {
  double least = (double)INFINITY;
  for (size_t i = 0; i < p->n; ++i) {
    if (p->fit[i].status != EF_OK)
      continue;
    const ef_estimate e = figure_of(&p->fit[i], figure);
    const double size = fabs(e.value);
    if (size > 0.0)
      least = fmin(least, size);
    if (figure == PANEL_EQUALITY && e.high > e.low && isfinite(e.high - e.low))
      least = fmin(least, e.high - e.low);
  }
  const int decimals = words_decimals(least, DIGITS);
  return decimals > 4 ? 4 : decimals;
}

bool panel_fit_has(const panel_fits *p, panel_figure figure) {
  for (size_t i = 0; i < p->n; ++i) {
    if (p->fit[i].status == EF_OK &&
        !isnan(figure_of(&p->fit[i], figure).value))
      return true;
  }
  return false;
}

/* The threshold is the JND, or the point of equality. */
bool panel_fit_threshold_is_told(const panel_fits *p) {
  for (size_t i = 0; i < p->n; ++i) {
    const ef_fit *f = &p->fit[i].fit;
    if (p->fit[i].status != EF_OK)
      continue;
    const double same = p->answers.task == EF_TASK_GREATER_LESS
                            ? f->equality.value
                            : f->jnd.value;
    return fabs(f->threshold.value - same) <= 1e-9 * fabs(same);
  }
  return true;
}

static double width_of(const panel_fit *f) {
  return isnan(f->fit.exponent.value) ? f->fit.sigma.value
                                      : f->fit.exponent.value;
}

static int width_decimals(const panel_fits *p) {
  double least = (double)INFINITY;
  for (size_t i = 0; i < p->n; ++i) {
    const double width = width_of(&p->fit[i]);
    if (p->fit[i].status == EF_OK && width > 0.0)
      least = fmin(least, width);
  }
  const int decimals = words_decimals(least, DIGITS);
  return decimals > 4 ? 4 : decimals;
}

/* Estimated from the blanks, which tell how observers set their criterion. */
static bool any_alarms(const panel_fits *p) {
  for (size_t i = 0; i < p->n; ++i) {
    if (p->fit[i].status == EF_OK && p->fit[i].fit.guess_estimated)
      return true;
  }
  return false;
}

static void add_curves(text *out, const panel_fits *p) {
  const bool is_detection = p->settings.shape == EF_SHAPE_DETECTION;
  const panel_figure figures[] = {PANEL_EQUALITY, PANEL_JND, PANEL_THRESHOLD};
  static const char *const heads[] = {"Equality", "JND", "Threshold"};
  bool told[3];
  const bool has_alarms = any_alarms(p);
  text_table t = table_new();
  table_column(&t, "Observer", "", true);
  if (p->answers.has_condition)
    table_column(&t, "Condition", "", true);
  table_column(&t, "Trials", "", false);
  for (size_t k = 0; k < 3; ++k) {
    told[k] = panel_fit_has(p, figures[k]) &&
              (k < 2 || !panel_fit_threshold_is_told(p));
    if (told[k])
      start_figure(&t, heads[k]);
  }
  table_column(&t, is_detection ? "Exponent" : "Sigma", "", false);
  if (has_alarms)
    table_column(&t, "False alarms", "%", false);
  table_column(&t, "Lapses", "%", false);
  table_column(&t, "Deviance", "", false);
  table_column(&t, "df", "", false);
  table_column(&t, "p", "", false);
  for (size_t i = 0; i < p->n; ++i) {
    const panel_fit *f = &p->fit[i];
    if (f->status != EF_OK)
      continue;
    table_cell(&t, f->is_pooled ? "all"
                   : p->answers.has_observer
                       ? answers_observer(&p->answers, f->observer)
                       : "all answers");
    if (p->answers.has_condition)
      table_cell(&t, answers_condition(&p->answers, f->condition));
    table_format(&t, "%zu", f->n_trials);
    for (size_t k = 0; k < 3; ++k) {
      if (told[k])
        figure_cells(&t, figure_of(f, figures[k]),
                     figure_decimals(p, figures[k]));
    }
    table_number(&t, width_of(f), width_decimals(p));
    if (has_alarms)
      table_number(&t, 100.0 * f->fit.guess.value, 1);
    table_number(&t, 100.0 * f->fit.lapse.value, 1);
    table_number(&t, f->fit.deviance, 2);
    table_format(&t, "%zu", f->fit.degrees);
    panel_chance_cell(&t, f->goodness.p_value);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

/* ---- All of it --------------------------------------------------------- */

void panel_fit_add(text *out, const panel_fits *p) {
  for (size_t c = 0; c < p->n_summaries; ++c)
    add_answer(out, p, c);
  if (p->is_demo) {
    text_wrap(out,
              "No file was named, so this is the built-in demo: twelve "
              "passengers said which of two intervals held a pair of unlike "
              "seats (demo:panel-responses).",
              0);
  }
  add_curves(out, p);
  panel_fit_add_people(out, p);
  panel_fit_add_basis(out, p);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out, panel_caution, 0);
}

ef_status render_panel_fit_text(const panel_fits *p, ef_output *output,
                                ef_error *error) {
  text out = {0};
  panel_fit_add(&out, p);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}
