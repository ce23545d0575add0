/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_plan.h"

#include <math.h>
#include <stdio.h>

#include "listing.h"
#include "message.h"
#include "panel_words.h"
#include "text.h"
#include "words.h"

const char *plan_procedure_words(ef_procedure procedure) {
  switch (procedure) {
  case EF_PROCEDURE_UP_DOWN:
    return "up-down run";
  case EF_PROCEDURE_ADAPTIVE:
    return "adaptive levels";
  default:
    return "constant levels";
  }
}

/* ---- Text -------------------------------------------------------------- */

static const plan_choice *best(const panel_plan *p, size_t k) {
  return p->best[k] < 0 ? NULL : &p->choice[k][p->best[k]];
}

bool plan_will_do(const plan_choice *c) {
  return c->n_observers > 0 && c->is_sound;
}

size_t plan_answers(const plan_choice *c) {
  return c->n_observers * c->row.n_trials;
}

static void add_percent(text *out, double share) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * share, words_decimals(100.0 * share, 2),
                         number);
  text_format(out, "%s %%", number);
}

static void add_answer(text *out, const panel_plan *p) {
  char number[EF_NUMBER_TEXT];
  text line = {0};
  const plan_choice *constant = best(p, 0);
  const plan_choice *adaptive = best(p, p->n_procedures - 1);
  ef_number_format(p->settings.jnd, number);
  if (constant != NULL) {
    text_format(&line,
                "%zu observers with %zu trials each, at %zu levels, give the "
                "panel's JND of about %s to within ",
                constant->n_observers, constant->row.n_trials, p->n_levels,
                number);
  } else {
    text_format(&line,
                "Constant levels need more than %zu trials of each observer "
                "for a JND of about %s to within ",
                p->choice[0][PLAN_SIZES - 1].row.n_trials, number);
  }
  add_percent(&line, p->precision);
  if (constant != NULL)
    text_format(&line, ": %zu answers", plan_answers(constant));
  if (adaptive != NULL) {
    text_format(&line,
                "; levels chosen as the answers come take %zu observers with "
                "%zu trials each, %zu answers",
                adaptive->n_observers, adaptive->row.n_trials,
                plan_answers(adaptive));
  }
  if (adaptive != NULL && constant != NULL) {
    const double saved =
        1.0 - (double)plan_answers(adaptive) / (double)plan_answers(constant);
    if (saved > 0.0) {
      text_add(&line, " (");
      add_percent(&line, saved);
      text_add(&line, " fewer)");
    }
  }
  text_add(&line, ".");
  text_paragraph(out, &line, 0);
}

static void add_alone(text *out, const panel_plan *p) {
  text line = {0};
  text_add(&line, "One observer's own JND to within ");
  add_percent(&line, p->precision);
  text_add(&line, " takes ");
  for (size_t k = 0, n = 0; k < p->n_procedures; ++k) {
    if (p->procedure[k] == EF_PROCEDURE_ADAPTIVE)
      continue;
    text_add(&line, n++ > 0 ? ", " : "");
    if (p->alone[k] > 0) {
      text_format(&line, "%zu trials by %s", p->alone[k],
                  plan_procedure_words(p->procedure[k]));
    } else {
      text_format(&line, "more than 10000 by %s",
                  plan_procedure_words(p->procedure[k]));
    }
  }
  text_add(&line, ": people are better asked in numbers than for long.");
  text_paragraph(out, &line, 0);
}

static void add_rows(text *out, const panel_plan *p) {
  const bool has_other = !isnan(p->settings.other_jnd);
  text_table t = table_new();
  table_column(&t, "Procedure", "", true);
  table_column(&t, "Trials", "each", false);
  table_column(&t, "One observer: estimate / JND", "median", false);
  table_column(&t, NULL, "95 % from", false);
  table_column(&t, NULL, "to", false);
  table_column(&t, NULL, "none, %", false);
  table_column(&t, "Observers", "needed", false);
  table_column(&t, "Answers", "in all", false);
  if (has_other)
    table_column(&t, "Power", "%", false);
  for (size_t k = 0; k < p->n_procedures; ++k) {
    for (size_t i = 0; i < PLAN_SIZES; ++i) {
      const plan_choice *c = &p->choice[k][i];
      const bool will_do = plan_will_do(c);
      table_cell(&t, i == 0 ? plan_procedure_words(p->procedure[k]) : "");
      table_format(&t, "%zu", c->row.n_trials);
      table_number(&t, isfinite(c->row.median) ? c->row.median : (double)NAN,
                   2);
      table_number(&t, c->row.low > 0.0 ? c->row.low : (double)NAN, 2);
      panel_limit_cell(&t, c->row.high, 2);
      table_number(
          &t, 100.0 * (double)c->row.n_failed / (double)c->row.n_experiments,
          0);
      if (will_do) {
        table_format(&t, "%zu", c->n_observers);
        table_format(&t, "%zu%s", plan_answers(c),
                     p->best[k] == (int)i ? " *" : "  ");
      } else {
        table_cell(&t, "-");
        table_cell(&t, "-  ");
      }
      if (has_other)
        table_number(&t, will_do ? 100.0 * c->group_power : (double)NAN, 0);
    }
  }
  text_add(out, "\n");
  table_finish(&t, out);
  text_add(out, "  * fewest answers by this procedure\n");
}

static void add_levels(text *out, const panel_plan *p) {
  char number[EF_NUMBER_TEXT];
  text line = {0};
  for (size_t i = 0; i < p->n_levels; ++i) {
    ef_number_format_fixed(p->level[i], words_decimals(p->settings.jnd, 3),
                           number);
    text_format(&line, "%s%s", i > 0 ? ", " : "", number);
  }
  const ef_task task = p->settings.task;
  if (task == EF_TASK_YES_NO || task == EF_TASK_SAME_DIFFERENT)
    text_add(&line, "; and 0, nothing to see, in a quarter of the trials");
  if (task == EF_TASK_GREATER_LESS)
    text_add(&line, ", from the point of equality");
  text_label(out, "Levels", &line);
}

static void add_basis(text *out, const panel_plan *p) {
  const ef_plan_settings *s = &p->settings;
  char number[EF_NUMBER_TEXT], other[EF_NUMBER_TEXT];
  text line = {0};
  text_add(out, "\nWhat this rests on:\n");
  add_levels(out, p);
  ef_number_format(s->jnd, number);
  ef_number_format_fixed(exp(s->uncertainty), 2, other);
  text_format(&line,
              "%s; JND %s, known beforehand to a factor of %s, by which the "
              "levels may miss; %s; ",
              ef_task_name(s->task), number, other,
              s->shape == EF_SHAPE_DETECTION ? "d' grows with the level"
                                             : "cumulative Gaussian");
  add_percent(&line, s->lapse);
  text_add(&line, " of answers without looking");
  if (s->task == EF_TASK_YES_NO || s->task == EF_TASK_SAME_DIFFERENT) {
    text_add(&line, ", false alarms ");
    add_percent(&line, s->false_alarms);
  }
  text_label(out, "Observers", &line);
  ef_number_format_fixed(exp(s->spread), 2, number);
  text_format(&line,
              "two of three people have a JND within a factor of %s of the "
              "panel's (--spread); the precision is half of the 95 %% interval "
              "of the panel's JND, as a share of it, with what the median is "
              "off by added in squares",
              number);
  text_label(out, "People", &line);
  text_format(&line,
              "%zu experiments simulated for each row with seed %llu and "
              "analysed as real ones would be",
              s->n_experiments, (unsigned long long)s->seed);
  text_label(out, "Simulation", &line);
  if (s->task == EF_TASK_2IFC || s->task == EF_TASK_TRIANGLE) {
    ef_number_format_fixed(100.0 * ef_up_down_target(&s->rule), 1, number);
    text_format(&line,
                "%u down, %u up from the highest level: rests at %s %% right "
                "(Levitt, J. Acoust. Soc. Am. 49 (1971) 467), which its "
                "estimate is held against",
                s->rule.n_down, s->rule.n_up, number);
  } else {
    text_format(&line,
                "left out: a run finds one point of the curve, and the JND of "
                "%s lies between two (%s)",
                ef_task_name(s->task),
                s->task == EF_TASK_GREATER_LESS ? "25 % and 75 % \"greater\""
                                                : "hits and false alarms");
  }
  text_label(out, "Up-down", &line);
  text_add(&line,
           "`evenfield panel next` chooses the levels, from 15 in hand; lapses "
           "are known to twice their rate");
  if (s->task == EF_TASK_YES_NO || s->task == EF_TASK_SAME_DIFFERENT)
    text_add(&line, ", and so is the share of false alarms");
  text_label(out, "Adaptive", &line);
  if (isnan(s->other_jnd))
    return;
  ef_number_format(s->other_jnd, number);
  text_format(&line,
              "that so many observers tell the panel's JND from %s (two-sided "
              "t-test of its logarithm at 5 %%)",
              number);
  text_label(out, "Power", &line);
}

void panel_plan_add(text *out, const panel_plan *p) {
  add_answer(out, p);
  add_alone(out, p);
  add_rows(out, p);
  add_basis(out, p);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out,
            "People tire: an observer rarely keeps attention for more than "
            "some 300 trials a sitting (common practice, no source), and "
            "panels with people need their consent and, where that is the "
            "rule, an ethics board's.",
            0);
}

static ef_status write_text(const panel_plan *p, ef_output *output,
                            ef_error *error) {
  text out = {0};
  panel_plan_add(&out, p);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

/* ---- Data -------------------------------------------------------------- */

static void fill(const panel_plan *p, listing *l) {
  static const char *const numbers[] = {
      "n_trials", "n_experiments", "n_failed",  "median",      "low",
      "high",     "half_width",    "sd_ln",     "observers",   "answers",
      "power",    "group_power",   "is_fewest", "trials_alone"};
  listing_text_column(l, "procedure", NULL, NULL);
  for (size_t i = 0; i < sizeof numbers / sizeof numbers[0]; ++i)
    listing_number_column(l, numbers[i], NULL, NULL, -1);
  for (size_t k = 0; k < p->n_procedures; ++k) {
    for (size_t i = 0; i < PLAN_SIZES; ++i) {
      const plan_choice *c = &p->choice[k][i];
      const bool will_do = plan_will_do(c);
      const double none = (double)NAN;
      const double value[] = {(double)c->row.n_trials,
                              (double)c->row.n_experiments,
                              (double)c->row.n_failed,
                              c->row.median,
                              c->row.low,
                              c->row.high,
                              c->row.half_width,
                              c->row.sd_ln,
                              will_do ? (double)c->n_observers : none,
                              will_do ? (double)plan_answers(c) : none,
                              c->row.power,
                              c->group_power,
                              p->best[k] == (int)i ? 1.0 : 0.0,
                              p->alone[k] > 0 ? (double)p->alone[k] : none};
      listing_text(l, ef_procedure_name(p->procedure[k]));
      for (size_t j = 0; j < sizeof value / sizeof value[0]; ++j)
        listing_number(l, value[j]);
    }
  }
}

static ef_status write_csv(const listing *l, ef_output *output,
                           ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  ef_error late;
  const ef_status status = listing_write_csv(l, csv, error);
  const ef_status finished =
      ef_csv_finish(csv, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

static ef_status write_json(const panel_plan *p, const listing *l,
                            ef_output *output, ef_error *error) {
  const ef_plan_settings *s = &p->settings;
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "task", ef_task_name(s->task));
  ef_json_number(j, "expected_jnd", s->jnd);
  ef_json_number(j, "precision", p->precision);
  ef_json_number(j, "other_jnd", s->other_jnd);
  ef_json_number(j, "spread", s->spread);
  ef_json_number(j, "lapse", s->lapse);
  ef_json_number(j, "false_alarms", s->false_alarms);
  ef_json_integer(j, "experiments", (int64_t)s->n_experiments);
  ef_json_integer(j, "seed", (int64_t)s->seed);
  ef_json_begin_array(j, "levels");
  for (size_t i = 0; i < p->n_levels; ++i)
    ef_json_number(j, NULL, p->level[i]);
  ef_json_end_array(j);
  ef_error late;
  const ef_status status = listing_write_json(l, j, "plans", error);
  ef_json_end_object(j);
  const ef_status finished = ef_json_finish(j, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

ef_status render_panel_plan(const panel_plan *p, ef_output *output,
                            ef_error *error) {
  if (p->options->format == FORMAT_TEXT)
    return write_text(p, output, error);
  listing l = {0};
  fill(p, &l);
  const ef_status status = p->options->format == FORMAT_CSV
                               ? write_csv(&l, output, error)
                               : write_json(p, &l, output, error);
  listing_free(&l);
  return status;
}
