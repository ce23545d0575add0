/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_panel_fit.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "words.h"

enum { DIGITS = 3, NAME_ROOM = 160, MOST_NEXT_RATIO = 20 };

const char panel_caution[] =
    "A threshold holds for the people, the light, the field and the time of "
    "looking that it was measured with. Where money or safety hangs on it, "
    "plan the panel before (evenfield panel plan), keep observers who cannot "
    "know what is shown, and repeat it.";

/* ---- Numbers ----------------------------------------------------------- */

/* Three digits of the smallest of a few. */
static int decimals_of(ef_estimate e) {
  const double width = e.high - e.low;
  const double size = isfinite(width) && width > 0.0
                          ? fmin(fabs(e.value), width)
                          : fabs(e.value);
  const int decimals = words_decimals(size, DIGITS);
  return decimals > 6 ? 6 : decimals;
}

static void add_number(text *out, double value, int decimals) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(value, decimals, number);
  text_add(out, number);
}

static void add_limits(text *out, ef_estimate e, int decimals) {
  if (isinf(e.low) && isinf(e.high)) {
    text_add(out, "any value");
  } else if (isinf(e.high)) {
    text_add(out, "at least ");
    add_number(out, e.low, decimals);
  } else if (isinf(e.low)) {
    text_add(out, "at most ");
    add_number(out, e.high, decimals);
  } else {
    add_number(out, e.low, decimals);
    text_add(out, " to ");
    add_number(out, e.high, decimals);
  }
}

void panel_add_estimate(text *out, ef_estimate e, const char *unit) {
  const int decimals = decimals_of(e);
  add_number(out, e.value, decimals);
  if (unit[0] != '\0')
    text_format(out, " %s", unit);
  if (isnan(e.low) || isnan(e.high))
    return;
  text_add(out, " (95 % interval ");
  add_limits(out, e, decimals);
  text_add(out, ")");
}

void panel_add_jnd_words(text *out, ef_task task) {
  char percent[EF_NUMBER_TEXT];
  switch (task) {
  case EF_TASK_2IFC:
    text_add(out, "75 % right answers");
    break;
  case EF_TASK_TRIANGLE:
    ef_number_format_fixed(
        100.0 * ef_task_proportion(task, (double)NAN, EF_JND_D_PRIME), 1,
        percent);
    text_format(out, "%s %% right answers, which is the d' of 75 %% in 2IFC",
                percent);
    break;
  case EF_TASK_GREATER_LESS:
    text_add(out, "half of the way from 25 % to 75 % \"greater\"");
    break;
  default:
    text_add(out, "d' = 0.954 above the false alarms, the d' of 75 % right in "
                  "2IFC");
  }
}

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

static bool is_open(ef_task task) {
  return isnan(ef_task_chance(task));
}

/* What is told first of a condition. */
static panel_figure main_figure(const panel_fits *p, size_t condition) {
  bool is_group;
  if (p->answers.task == EF_TASK_GREATER_LESS)
    return PANEL_EQUALITY;
  /* A threshold that was asked for elsewhere than at the JND comes first. */
  if (!isnan(p->settings.criterion))
    return PANEL_THRESHOLD;
  const ef_estimate jnd = panel_fits_value(p, condition, PANEL_JND, &is_group);
  return isnan(jnd.value) ? PANEL_THRESHOLD : PANEL_JND;
}

static void add_criterion_words(text *out, const panel_fits *p) {
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
              is_open(p->answers.task) ? ", lapses and guesses left out"
                                       : ", lapses left out");
}

static void add_who(text *out, const panel_fits *p, size_t condition,
                    bool is_group) {
  const panel_summary *s = &p->summary[condition];
  if (s->n_observers < 2)
    return;
  text_format(out, is_group ? ", by %zu observers" : ", all answers of %zu "
                                                     "observers together",
              s->n_observers);
}

static void add_answer(text *out, const panel_fits *p, size_t condition) {
  const char *unit = p->answers.unit;
  const panel_figure figure = main_figure(p, condition);
  const bool is_panel = p->summary[condition].n_observers > 1;
  const char *owner = is_panel                    ? "panel"
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
  text_add(&line, figure == PANEL_JND         ? "JND is "
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
    add_criterion_words(&line, p);
    if (is_open(p->answers.task) && p->settings.shape != EF_SHAPE_DETECTION)
      text_add(&line, "; it moves with the observer's criterion");
  }
  text_add(&line, ".");
  text_paragraph(out, &line, 0);
}

/* ---- Curves ------------------------------------------------------------ */

static ef_estimate figure_of(const panel_fit *f, panel_figure figure) {
  return figure == PANEL_JND         ? f->fit.jnd
         : figure == PANEL_EQUALITY ? f->fit.equality
                                     : f->fit.threshold;
}

static void start_figure(text_table *t, const char *head) {
  table_column(t, head, "", false);
  table_column(t, "95 %", "from", false);
  table_column(t, NULL, "to", false);
}

static void limit_cell(text_table *t, double value, int decimals) {
  if (isinf(value))
    table_cell(t, value < 0.0 ? "-" : "open");
  else
    table_number(t, value, decimals);
}

static void figure_cells(text_table *t, ef_estimate e, int decimals) {
  table_number(t, e.value, decimals);
  limit_cell(t, e.low, decimals);
  limit_cell(t, e.high, decimals);
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

static bool any_figure(const panel_fits *p, panel_figure figure) {
  for (size_t i = 0; i < p->n; ++i) {
    if (p->fit[i].status == EF_OK &&
        !isnan(figure_of(&p->fit[i], figure).value))
      return true;
  }
  return false;
}

/* The threshold is the JND, or the point of equality. */
static bool threshold_is_told(const panel_fits *p) {
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
    told[k] = any_figure(p, figures[k]) && (k < 2 || !threshold_is_told(p));
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
    table_number(&t, f->goodness.p_value, 3);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

/* ---- Groups ------------------------------------------------------------ */

static void add_group(text *out, const panel_fits *p, const panel_summary *s,
                      const ef_group *g, const char *what) {
  char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
  text line = {0};
  const char *name = answers_condition(&p->answers, s->condition);
  if (name[0] != '\0')
    text_format(&line, "%s: ", name);
  text_format(&line, "geometric mean of %zu %s ", g->n, what);
  add_number(&line, g->mean.value, words_decimals(g->mean.value, DIGITS));
  ef_number_format_fixed(exp(g->spread.value), 2, low);
  text_format(&line,
              "; two of three people have one within a factor of %s of it", low);
  if (g->n >= PANEL_LEAST_OBSERVERS && isfinite(g->spread.high)) {
    ef_number_format_fixed(exp(g->spread.low), 2, low);
    ef_number_format_fixed(exp(g->spread.high), 2, high);
    text_format(&line, " (95 %% interval of the factor %s to %s)", low, high);
  }
  /* Of three or four observers next to nothing follows for a fifth. */
  if (g->next_high < MOST_NEXT_RATIO * g->next_low) {
    text_add(&line, "; the next observer's is expected from ");
    add_number(&line, g->next_low, words_decimals(g->next_low, DIGITS));
    text_add(&line, " to ");
    add_number(&line, g->next_high, words_decimals(g->next_high, DIGITS));
  } else {
    text_add(&line, "; too few observers to say where the next one's may lie");
  }
  char chance[WORDS_ROOM];
  words_chance(g->q_p_value, chance);
  text_format(&line,
              "; were all people alike, they would look as different as this "
              "with %s",
              chance);
  if (g->n_left_out > 0)
    text_format(&line, "; %zu without a standard error left out", g->n_left_out);
  text_label(out, "People", &line);
}

static void add_groups(text *out, const panel_fits *p) {
  bool has_any = false;
  for (size_t i = 0; i < p->n_summaries; ++i)
    has_any = has_any || p->summary[i].has_jnd || p->summary[i].has_threshold;
  if (!has_any)
    return;
  text_add(out, "\nAcross observers:\n");
  for (size_t i = 0; i < p->n_summaries; ++i) {
    const panel_summary *s = &p->summary[i];
    if (s->has_jnd)
      add_group(out, p, s, &s->jnd, "JNDs");
    else if (s->has_threshold)
      add_group(out, p, s, &s->threshold, "thresholds");
    if (!s->has_equality)
      continue;
    text line = {0};
    const char *name = answers_condition(&p->answers, s->condition);
    if (name[0] != '\0')
      text_format(&line, "%s: ", name);
    text_format(&line, "mean of %zu points of equality ", s->equality.n);
    panel_add_estimate(&line, s->equality.equality, "");
    text_add(&line, ", standard deviation across people ");
    add_number(&line, s->equality.spread.value,
               words_decimals(s->equality.spread.value, DIGITS));
    text_label(out, "Equality", &line);
  }
}

/* ---- Other criteria ---------------------------------------------------- */

/* Where the pooled curve stands at the criteria of the trade. */
static void add_conversions(text *out, const panel_fits *p) {
  const ef_task task = p->answers.task;
  if (is_open(task))
    return;
  static const char *const words[] = {"75 %", "84.1 %", "d' = 1"};
  const double share[] = {EF_JND_PROPORTION, 0.84134474606854293,
                          ef_task_proportion(task, (double)NAN, 1.0)};
  bool has_any = false;
  for (size_t c = 0; c < p->n_summaries; ++c) {
    const panel_fit *f = panel_fits_whole(p, c);
    if (f == NULL || f->status != EF_OK || !(f->fit.sigma.value != 0.0))
      continue;
    text line = {0};
    const char *name = answers_condition(&p->answers, c);
    if (name[0] != '\0')
      text_format(&line, "%s: ", name);
    for (size_t k = 0; k < 3; ++k) {
      const double level = ef_psychometric_level(&f->fit.curve, share[k]);
      text_format(&line, "%s%s at ", k > 0 ? ", " : "", words[k]);
      add_number(&line, level, words_decimals(level, DIGITS));
    }
    if (!has_any)
      text_format(out, "\nOther criteria, on the curve of %s:\n",
                  f->is_pooled ? "all answers" : "these answers");
    has_any = true;
    text_label(out, "Levels", &line);
  }
  if (!has_any || task == EF_TASK_GREATER_LESS)
    return;
  text line = {0};
  char percent[3][EF_NUMBER_TEXT];
  const ef_task tasks[] = {EF_TASK_2IFC, EF_TASK_TRIANGLE,
                           EF_TASK_SAME_DIFFERENT};
  for (size_t k = 0; k < 3; ++k) {
    ef_number_format_fixed(
        100.0 * ef_task_best_correct(tasks[k], EF_JND_D_PRIME), 1, percent[k]);
  }
  text_format(&line,
              "one JND gives %s %% right answers in 2IFC, %s %% in triangle "
              "tests, %s %% in same-different tests with the best criterion",
              percent[0], percent[1], percent[2]);
  text_label(out, "Tasks", &line);
}

/* ---- Sensitivity and bias ---------------------------------------------- */

static void add_sensitivity(text *out, const panel_fits *p,
                            const panel_fit *f) {
  text_table t = table_new();
  table_column(&t, "Level", "", false);
  table_column(&t, "Trials", "", false);
  table_column(&t, "Positive", "%", false);
  table_column(&t, "d'", "", false);
  table_column(&t, "95 %", "from", false);
  table_column(&t, NULL, "to", false);
  table_column(&t, "Criterion", "", false);
  int decimals = 0;
  for (size_t i = 0; i < f->n_points; ++i) {
    const int wanted =
        f->level[i] == 0.0 ? 0 : words_decimals(f->level[i], DIGITS);
    decimals = wanted > decimals ? wanted : decimals;
  }
  for (size_t i = 0; i < f->n_points; ++i) {
    const bool is_blank = f->level[i] == 0.0;
    const ef_sensitivity *s = &f->sensitivity[i];
    table_number(&t, f->level[i], decimals);
    table_format(&t, "%zu", f->shown[i]);
    table_number(&t, 100.0 * (double)f->positive[i] / (double)f->shown[i], 1);
    table_number(&t, is_blank ? (double)NAN : s->d_prime.value, 2);
    table_number(&t, is_blank ? (double)NAN : s->d_prime.low, 2);
    table_number(&t, is_blank ? (double)NAN : s->d_prime.high, 2);
    table_number(&t, is_blank ? (double)NAN : s->criterion.value, 2);
  }
  const char *name = answers_condition(&p->answers, f->condition);
  text_format(out, "\nSensitivity apart from the criterion%s%s:\n",
              name[0] != '\0' ? ", " : "", name);
  table_finish(&t, out);
}

static void add_bias(text *out, const panel_fits *p, const panel_fit *f) {
  char share[EF_NUMBER_TEXT], expected[EF_NUMBER_TEXT], chance[WORDS_ROOM];
  const ef_place_bias *b = &f->bias;
  char name[NAME_ROOM];
  panel_fit_name(p, f, name, sizeof name);
  ef_number_format_fixed(100.0 * b->share, 1, share);
  ef_number_format_fixed(100.0 * b->expected, 1, expected);
  words_chance(b->p_value, chance);
  const bool leans = b->p_value < 0.05;
  text line = {0};
  text_format(&line, "%s: ", name);
  text_format(&line,
              "%s %% of answers name the first place, where the difference was "
              "in %s %% of trials; %s (%s), leaning of ",
              share, expected,
              !leans              ? "no sign of a leaning"
              : b->bias.value > 0 ? "leans to the first"
                                  : "leans to the second",
              chance);
  add_number(&line, b->bias.value, 2);
  text_add(&line, " standard deviations (95 % interval ");
  add_limits(&line, b->bias, 2);
  text_add(&line, leans ? "); the JND of a leaning observer comes out too "
                          "large"
                        : ")");
  text_label(out, "Place", &line);
}

static void add_aside(text *out, const panel_fits *p) {
  bool has_bias = false;
  for (size_t c = 0; c < p->n_summaries; ++c) {
    const panel_fit *f = panel_fits_whole(p, c);
    if (f != NULL && f->sensitivity != NULL)
      add_sensitivity(out, p, f);
  }
  for (size_t i = 0; i < p->n; ++i) {
    const panel_fit *f = &p->fit[i];
    const bool is_whole = f == panel_fits_whole(p, f->condition);
    if (!f->has_bias || (!is_whole && f->bias.p_value >= 0.05))
      continue;
    if (!has_bias)
      text_add(out, "\nLeaning to a place:\n");
    has_bias = true;
    add_bias(out, p, f);
  }
}

/* ---- What is unusual --------------------------------------------------- */

static void begin_clause(text *out, size_t n) {
  text_add(out, n > 0 ? "; " : "");
}

size_t panel_fit_remarks(const panel_fits *p, const panel_fit *f, text *out) {
  size_t n = 0;
  char number[EF_NUMBER_TEXT], other[EF_NUMBER_TEXT];
  if (f->status != EF_OK) {
    text_format(out, "no threshold: %s", f->reason);
    return 1;
  }
  if (f->fit.support == EF_SUPPORT_STEP) {
    ef_number_format(f->fit.bracket_low, number);
    ef_number_format(f->fit.bracket_high, other);
    if (f->fit.bracket_low < f->fit.bracket_high) {
      text_format(out,
                  "separated: the answers change all at once between %s and "
                  "%s, so there is no slope and the threshold may lie anywhere "
                  "between; show levels there",
                  number, other);
    } else {
      text_format(out,
                  "separated: the answers change all at once at %s, so there "
                  "is no slope; show levels close to it",
                  number);
    }
    ++n;
  }
  if (f->fit.extrapolated) {
    begin_clause(out, n++);
    text_add(out, "the threshold lies outside the levels shown and rests on "
                  "the shape of the curve");
  }
  if (f->fit.lapse_at_limit) {
    begin_clause(out, n++);
    ef_number_format(100.0 * p->settings.lapse_max, number);
    text_format(out,
                "lapses at their limit of %s %%: the observer may not have "
                "attended, or the curve has another shape",
                number);
  }
  if (f->goodness.is_overdispersed) {
    begin_clause(out, n++);
    ef_number_format_fixed(f->goodness.dispersion, 1, number);
    ef_number_format_fixed(f->goodness.widened_by, 2, other);
    text_format(out,
                "the answers vary %s times as much as chance would have them; "
                "the intervals are widened by %s",
                number, other);
  }
  return n;
}

static void add_remarks(text *out, const panel_fits *p) {
  bool has_any = false;
  for (size_t i = 0; i < p->n; ++i) {
    text line = {0}, remarks = {0};
    if (panel_fit_remarks(p, &p->fit[i], &remarks) > 0) {
      char name[NAME_ROOM];
      panel_fit_name(p, &p->fit[i], name, sizeof name);
      text_format(&line, "%s: ", name);
      text_add(&line, remarks.bytes != NULL ? remarks.bytes : "");
      if (!has_any)
        text_add(out, "\nLook again at:\n");
      has_any = true;
      text_add(out, "  ");
      text_paragraph(out, &line, 4);
    }
    text_free(&remarks);
  }
}

/* ---- What it rests on -------------------------------------------------- */

static const char *shape_words(ef_shape shape) {
  switch (shape) {
  case EF_SHAPE_LOGISTIC:
    return "logistic function";
  case EF_SHAPE_WEIBULL:
    return "Weibull function";
  case EF_SHAPE_DETECTION:
    return "d' a power of the level";
  default:
    return "cumulative Gaussian";
  }
}

static void add_model(text *out, const panel_fits *p) {
  char number[EF_NUMBER_TEXT];
  const bool is_log = p->settings.axis == EF_AXIS_LOG;
  text line = {0};
  text_format(&line, "%s%s, by maximum likelihood",
              shape_words(p->settings.shape),
              p->settings.shape == EF_SHAPE_DETECTION ? ""
              : is_log ? " of the logarithm of the level (sigma in log10 units)"
                       : " of the level");
  const double chance = ef_task_chance(p->answers.task);
  if (chance > 0.0) {
    ef_number_format_fixed(100.0 * chance, chance == 0.5 ? 0 : 1, number);
    text_format(&line, "; %s %% right by guessing", number);
  }
  if (isnan(p->settings.lapse)) {
    ef_number_format(100.0 * p->settings.lapse_max, number);
    text_format(&line, "; lapses estimated, up to %s %%", number);
  } else {
    ef_number_format(100.0 * p->settings.lapse, number);
    text_format(&line, "; lapses fixed at %s %%", number);
  }
  text_label(out, "Curve", &line);
}

static void add_intervals(text *out, const panel_fits *p) {
  const ef_interval_settings *s = &p->intervals;
  text line = {0};
  if (s->method == EF_INTERVAL_BOOTSTRAP) {
    text_format(&line,
                "95 %%, parametric bootstrap of %zu simulated experiments with "
                "seed %llu",
                s->n_samples, (unsigned long long)s->seed);
  } else {
    text_add(&line, "95 %, profile likelihood");
  }
  text_label(out, "Intervals", &line);
  if (s->n_samples > 0) {
    text_format(&line,
                "p is the share of %zu simulated experiments (seed %llu) with "
                "a deviance as large, were the curve true; below 0.05 look for "
                "another shape, lapses, or days that differ",
                s->n_samples, (unsigned long long)s->seed);
  } else {
    text_add(&line, "p by the chi-square distribution, which is rough for few "
                    "trials a level");
  }
  text_label(out, "Fit", &line);
}

static void add_basis(text *out, const panel_fits *p) {
  const answers *a = &p->answers;
  char rows[WORDS_ROOM], who[WORDS_ROOM];
  text line = {0};
  text_add(out, "\nWhat this rests on:\n");
  size_t n_trials = 0;
  for (size_t i = 0; i < a->n; ++i)
    n_trials += a->shown[i];
  words_count(n_trials, "answer", "answers", rows);
  words_count(a->observers.n > 0 ? a->observers.n : 1, "observer", "observers",
              who);
  text_format(&line, "%s: %s by %s; %s, positive is \"%s\"", a->file, rows, who,
              ef_task_name(a->task), ef_task_positive(a->task));
  text_label(out, "Answers", &line);
  add_model(out, p);
  if (any_figure(p, PANEL_JND)) {
    panel_add_jnd_words(&line, a->task);
    text_label(out, "JND", &line);
  }
  if (!threshold_is_told(p)) {
    add_criterion_words(&line, p);
    text_label(out, "Threshold", &line);
  }
  if (is_open(a->task) && p->settings.shape != EF_SHAPE_DETECTION) {
    text_format(&line,
                "a %s threshold moves with the observer's criterion, how ready "
                "one is to say \"%s\"; compare d', which does not, or ask in "
                "two intervals%s",
                ef_task_name(a->task), ef_task_positive(a->task),
                any_figure(p, PANEL_JND)
                    ? ""
                    : "; without trials at level 0 (blanks) there is no d'");
    text_label(out, "Criterion", &line);
  }
  add_intervals(out, p);
  bool is_group = false;
  for (size_t c = 0; c < p->n_summaries && !is_group; ++c)
    panel_fits_value(p, c, main_figure(p, c), &is_group);
  if (is_group) {
    text_format(&line,
                "people differ: the panel's value is the geometric mean of "
                "observers by restricted maximum likelihood (points of "
                "equality: the mean), and its interval holds for other people "
                "of the same kind; the row \"all\" pools the answers, and its "
                "interval does not");
    text_label(out, "Panel", &line);
  }
}

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
  add_groups(out, p);
  add_conversions(out, p);
  add_aside(out, p);
  add_remarks(out, p);
  add_basis(out, p);
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
