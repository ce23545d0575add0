/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How people differ, how one curve reads at other criteria, and what stands
 * apart from sensitivity: the criterion, and leaning to a place. */
#include "render_panel_fit.h"

#include <math.h>

#include "panel_words.h"
#include "words.h"

enum { DIGITS = 3, NAME_ROOM = 160, MOST_NEXT_RATIO = 20 };

/* ---- Groups ------------------------------------------------------------ */

static void add_group(text *out, const panel_fits *p, const panel_summary *s,
                      const ef_group *g, const char *what) {
  char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
  text line = {0};
  const char *name = answers_condition(&p->answers, s->condition);
  if (name[0] != '\0')
    text_format(&line, "%s: ", name);
  text_format(&line, "geometric mean of %zu %s ", g->n, what);
  panel_add_number(&line, g->mean.value, words_decimals(g->mean.value, DIGITS));
  text_add(&line, "; ");
  panel_add_factor(&line, g->spread.value);
  if (g->n >= PANEL_LEAST_OBSERVERS && isfinite(g->spread.high)) {
    ef_number_format_fixed(exp(g->spread.low), 2, low);
    ef_number_format_fixed(exp(g->spread.high), 2, high);
    text_format(&line, " (95 %% interval of the factor%s %s to %s)",
                exp(g->spread.value) < 1.005 ? " that holds two of three" : "",
                low, high);
  }
  /* Of three or four observers next to nothing follows for a fifth. */
  if (g->next_high < MOST_NEXT_RATIO * g->next_low) {
    text_add(&line, "; the next observer's is expected from ");
    panel_add_number(&line, g->next_low, words_decimals(g->next_low, DIGITS));
    text_add(&line, " to ");
    panel_add_number(&line, g->next_high, words_decimals(g->next_high, DIGITS));
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
    text_format(&line, "; %zu without a standard error left out",
                g->n_left_out);
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
    panel_add_number(&line, s->equality.spread.value,
                     words_decimals(s->equality.spread.value, DIGITS));
    text_label(out, "Equality", &line);
  }
}

/* ---- Other criteria ---------------------------------------------------- */

/* A step has none; without blanks no d' is known where the criterion is the
 * observer's. */
static bool has_slope(ef_task task, const ef_fit *fit) {
  return panel_is_open(task) ? fit->exponent.value > 0.0
                             : fit->sigma.value != 0.0;
}

/* Levels at the criteria of the trade. Where the criterion is the observer's,
 * they go by the d' that they stand for: a power of the level, 1 at the
 * threshold. */
static void add_levels(text *out, ef_task task, const ef_fit *fit) {
  static const char *const words[] = {"75 %", "84.1 %", "d' = 1"};
  static const double normal_one = 0.84134474606854293; /* Phi(1) */
  const bool is_open = panel_is_open(task);
  for (size_t k = 0; k < 3; ++k) {
    double level;
    if (is_open) {
      const double d_prime[] = {EF_JND_D_PRIME, sqrt(2.0), 1.0};
      level = fit->threshold.value * pow(d_prime[k], 1.0 / fit->exponent.value);
    } else {
      const double share[] = {EF_JND_PROPORTION, normal_one,
                              ef_task_proportion(task, (double)NAN, 1.0)};
      level = ef_psychometric_level(&fit->curve, share[k]);
    }
    text_format(out, "%s%s%s at ", k > 0 ? ", " : "", words[k],
                is_open && k < 2 ? " in 2IFC" : "");
    panel_add_number(out, level, words_decimals(level, DIGITS));
  }
}

/* Where the pooled curve stands at the criteria of the trade. */
static void add_conversions(text *out, const panel_fits *p) {
  const ef_task task = p->answers.task;
  bool has_any = false;
  for (size_t c = 0; c < p->n_summaries; ++c) {
    const panel_fit *f = panel_fits_whole(p, c);
    if (f == NULL || f->status != EF_OK || !has_slope(task, &f->fit))
      continue;
    text line = {0};
    const char *name = answers_condition(&p->answers, c);
    if (name[0] != '\0')
      text_format(&line, "%s: ", name);
    add_levels(&line, task, &f->fit);
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
  if (!f->is_pooled)
    return;
  text line = {0};
  text_add(&line, "answers of people with different criteria together show a "
                  "smaller d' than each of them has: false alarms above tell "
                  "how far the criteria lie apart");
  text_label(out, "Pooled", &line);
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
  panel_add_number(&line, b->bias.value, 2);
  text_add(&line, " standard deviations (95 % interval ");
  panel_add_limits(&line, b->bias, 2);
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

void panel_fit_add_people(text *out, const panel_fits *p) {
  add_groups(out, p);
  add_conversions(out, p);
  add_aside(out, p);
}
