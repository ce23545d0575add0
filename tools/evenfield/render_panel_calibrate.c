/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_panel_calibrate.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "jnd.h"
#include "message.h"
#include "panel_words.h"
#include "text.h"
#include "words.h"

enum { DIGITS = 3 };

/* The share of answers at which JNDs are kept. */
static const char criterion[] = "75%";

/* ---- Text -------------------------------------------------------------- */

static void add_number(text *out, double value) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(value, words_decimals(value, DIGITS), number);
  text_add(out, number);
}

static void add_answer(text *out, const panel_calibration *c) {
  const ef_calibration *r = &c->result;
  text line = {0};
  text_add(&line, "The panel's JND is ");
  panel_add_estimate(&line, r->jnd, ef_metric_symbol(c->metric));
  text_add(&line, ", at 75 % right answers in two intervals");
  if (r->is_pooled) {
    text_format(&line, ", all answers of %zu %s together", c->n_observers,
                c->n_observers == 1 ? "observer" : "observers");
  } else {
    text_format(&line, ", by %zu observers; ", r->group.n);
    panel_add_factor(&line, r->group.spread.value);
  }
  text_add(&line, ".");
  text_paragraph(out, &line, 0);
}

static const panel_formula *asked(const panel_calibration *c, size_t *rank) {
  for (size_t i = 0; i < c->n_formulas; ++i) {
    *rank = i + 1;
    if (c->formula[i].is_asked)
      return &c->formula[i];
  }
  return NULL;
}

static void add_ranking(text *out, const panel_calibration *c) {
  size_t rank;
  char best[EF_NUMBER_TEXT], own[EF_NUMBER_TEXT], chance[WORDS_ROOM];
  const panel_formula *f = asked(c, &rank);
  if (f == NULL)
    return;
  text line = {0};
  ef_number_format_fixed(c->formula[0].score.stress, 1, best);
  ef_number_format_fixed(f->score.stress, 1, own);
  if (rank == 1) {
    text_format(&line,
                "Of %zu formulas %s orders the %zu pairs best (STRESS %s).",
                c->n_formulas, ef_metric_title(f->metric), c->n_scored, own);
  } else {
    words_chance(f->score.p_value, chance);
    text_format(&line,
                "Of %zu formulas %s orders the %zu pairs best (STRESS %s); %s "
                "with %s is %s (%s).",
                c->n_formulas, ef_metric_title(c->formula[0].metric),
                c->n_scored, best, ef_metric_title(f->metric), own,
                f->score.p_value < 0.05 ? "clearly worse" : "not clearly worse",
                chance);
  }
  text_paragraph(out, &line, 0);
}

static void add_observers(text *out, const panel_calibration *c) {
  text_table t = table_new();
  double least = c->result.jnd.value;
  for (size_t i = 0; i < c->n_observers; ++i) {
    if (c->each[i].jnd.value > 0.0)
      least = fmin(least, c->each[i].jnd.value);
  }
  const int decimals = words_decimals(least, DIGITS);
  table_column(&t, "Observer", "", true);
  table_column(&t, "Trials", "", false);
  table_column(&t, "JND", "", false);
  table_column(&t, "95 %", "from", false);
  table_column(&t, NULL, "to", false);
  for (size_t i = 0; i < c->n_observers; ++i) {
    const ef_observer_jnd *e = &c->each[i];
    table_cell(&t, c->answers.has_observer ? answers_observer(&c->answers, i)
                                           : "all answers");
    table_format(&t, "%zu", e->n_trials);
    table_number(&t, e->jnd.value, decimals);
    panel_limit_cell(&t, e->jnd.low, decimals);
    panel_limit_cell(&t, e->jnd.high, decimals);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

static void add_formulas(text *out, const panel_calibration *c) {
  if (c->n_formulas == 0)
    return;
  text_table t = table_new();
  double least = (double)INFINITY;
  for (size_t i = 0; i < c->n_formulas; ++i) {
    if (c->formula[i].score.jnd > 0.0)
      least = fmin(least, c->formula[i].score.jnd);
  }
  const int decimals = words_decimals(least, DIGITS);
  table_column(&t, "Formula", "", true);
  table_column(&t, "STRESS", "%", false);
  table_column(&t, "F", "", false);
  table_column(&t, "p", "", false);
  table_column(&t, "JND", "", false);
  table_column(&t, "Log likelihood", "", false);
  for (size_t i = 0; i < c->n_formulas; ++i) {
    const panel_formula *f = &c->formula[i];
    table_cell(&t, ef_metric_name(f->metric));
    table_number(&t, f->score.stress, 1);
    table_number(&t, f->score.f, 2);
    panel_chance_cell(&t, f->score.p_value);
    table_number(&t, f->score.jnd, decimals);
    table_number(&t, f->score.log_likelihood, 1);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

static void add_saved(text *out, const panel_calibration *c) {
  const char *save = c->options->save;
  text line = {0};
  if (save != NULL) {
    text_format(&line,
                "The JND is in %s: `evenfield compare --jnd %s` predicts with "
                "it.",
                save, save);
  } else {
    text_add(&line, "--save FILE keeps the JND for `evenfield compare --jnd "
                    "FILE`.");
  }
  text_paragraph(out, &line, 0);
}

/* How often a deviance as large is seen where the curve holds. */
static void add_chance(text *out, const panel_calibration *c) {
  const ef_goodness *g = &c->result.goodness;
  const ef_interval_settings *s = &c->settings.intervals;
  char chance[EF_NUMBER_TEXT];
  if (isnan(g->p_value))
    return;
  ef_number_format_fixed(g->p_value, 3, chance);
  text_format(out, ", p %s", chance);
  if (s->n_samples > 0) {
    text_format(out, " by %zu simulated experiments with seed %llu",
                s->n_samples, (unsigned long long)s->seed);
  }
}

static void add_basis(text *out, const panel_calibration *c) {
  const answers *a = &c->answers;
  const ef_calibration *r = &c->result;
  char number[EF_NUMBER_TEXT];
  text line = {0};
  text_add(out, "\nWhat this rests on:\n");
  text_format(&line, "%s: %zu answers by %zu %s; %s", a->file,
              r->pooled.n_trials, c->n_observers,
              c->n_observers == 1 ? "observer" : "observers",
              ef_task_name(a->task));
  text_label(out, "Answers", &line);
  if (c->pairs_path != NULL) {
    text_format(&line, "%s", c->pairs_path);
    if (c->samples_path != NULL)
      text_format(&line, ", samples of %s", c->samples_path);
    text_format(&line, "; %s, observer %s", c->pairs.illuminant,
                c->pairs.observer);
    text_label(out, "Pairs", &line);
  }
  text_format(&line, "%s (%s)", ef_metric_title(c->metric),
              ef_metric_source(c->metric));
  text_label(out, "Difference", &line);
  ef_number_format_fixed(r->exponent, fabs(r->exponent - 1.0) < 1e-9 ? 0 : 2,
                         number);
  text_format(&line, "d' grows with power %s of the difference%s", number,
              isnan(c->settings.exponent) ? ", estimated from all answers"
                                          : "");
  ef_number_format_fixed(100.0 * r->pooled.lapse.value, 1, number);
  text_format(&line, "; lapses %s %%%s; deviance of all answers on one curve ",
              number, isnan(c->settings.lapse) ? "" : ", fixed");
  add_number(&line, r->pooled.deviance);
  text_format(&line, " with %zu degrees of freedom", r->pooled.degrees);
  add_chance(&line, c);
  text_label(out, "Curve", &line);
  if (!r->is_pooled) {
    text_add(&line, "geometric mean of the observers by restricted maximum "
                    "likelihood; its interval holds for other people of the "
                    "same kind");
    text_label(out, "Panel", &line);
  } else {
    text_format(&line,
                "fewer than %zu observers have a JND of their own: the answers "
                "are pooled, the interval does not hold for other people, and "
                "how people differ is left open",
                c->settings.least_observers);
    text_label(out, "Panel", &line);
  }
  if (c->n_formulas == 0)
    return;
  text_add(&line,
           "0 when differences are proportional to the d' of the answers "
           "(Garcia et al., J. Opt. Soc. Am. A 24 (2007) 1823-1829); F-test "
           "against the best formula; d' of pairs that are always told apart "
           "is open upwards and cut off by the number of answers");
  text_label(out, "STRESS", &line);
}

static void add_without(text *out, const panel_calibration *c) {
  size_t n = 0;
  for (size_t i = 0; i < c->n_observers; ++i) {
    if (!isnan(c->each[i].jnd.value))
      continue;
    text line = {0};
    const ef_support why = c->each[i].support;
    text_format(
        &line, "%s: %s", answers_observer(&c->answers, i),
        why == EF_SUPPORT_ALL_POSITIVE
            ? "always right: the JND lies below the differences shown"
        : why == EF_SUPPORT_NONE_POSITIVE
            ? "never right: the JND lies above the differences shown"
        : why == EF_SUPPORT_FLAT ? "the answers do not depend on the difference"
        : why == EF_SUPPORT_FALLING ? "larger differences are seen less often"
                                    : "too few levels");
    if (n++ == 0)
      text_add(out, "\nWithout a JND:\n");
    text_add(out, "  ");
    text_paragraph(out, &line, 4);
  }
}

void panel_calibration_add(text *out, const panel_calibration *c) {
  add_answer(out, c);
  add_ranking(out, c);
  add_saved(out, c);
  if (c->is_demo) {
    text_wrap(out,
              "No file was named, so this is the built-in demo: the vision "
              "laboratory's observers said which of two intervals held the "
              "unlike plates (demo:pair-answers, demo:colour-pairs).",
              0);
  }
  add_observers(out, c);
  add_formulas(out, c);
  add_without(out, c);
  add_basis(out, c);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out, panel_caution, 0);
}

static ef_status write_text(const panel_calibration *c, ef_output *output,
                            ef_error *error) {
  text out = {0};
  panel_calibration_add(&out, c);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

/* ---- The record -------------------------------------------------------- */

ef_status render_panel_jnd(const panel_calibration *c, ef_output *output,
                           ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  ef_jnd_record record = c->record;
  if (c->result.is_pooled)
    record.observer_log_sd = (double)NAN; /* not known, which is not none */
  jnd_write_csv(csv, &record, criterion);
  return ef_csv_finish(csv, error);
}

/* ---- JSON -------------------------------------------------------------- */

static void write_estimate(ef_json *j, ef_estimate e) {
  ef_json_number(j, "jnd", e.value);
  ef_json_number(j, "se", e.se);
  ef_json_number(j, "low", e.low);
  ef_json_number(j, "high", e.high);
}

static void write_formulas(ef_json *j, const panel_calibration *c) {
  ef_json_begin_array(j, "formulas");
  for (size_t i = 0; i < c->n_formulas; ++i) {
    const panel_formula *f = &c->formula[i];
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "metric", ef_metric_name(f->metric));
    ef_json_number(j, "stress", f->score.stress);
    ef_json_number(j, "f", f->score.f);
    ef_json_number(j, "p_value", f->score.p_value);
    ef_json_number(j, "jnd", f->score.jnd);
    ef_json_number(j, "exponent", f->score.exponent);
    ef_json_number(j, "log_likelihood", f->score.log_likelihood);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static ef_status write_json(const panel_calibration *c, ef_output *output,
                            ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  const ef_calibration *r = &c->result;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "file", c->answers.file);
  ef_json_text(j, "pairs", c->pairs_path);
  ef_json_text(j, "task", ef_task_name(c->answers.task));
  ef_json_text(j, "metric", ef_metric_name(c->metric));
  ef_json_text(j, "criterion", criterion);
  write_estimate(j, r->jnd);
  ef_json_text(j, "from", r->is_pooled ? "pooled" : "group");
  ef_json_number(j, "observer_log_sd",
                 r->is_pooled ? (double)NAN : r->group.spread.value);
  ef_json_number(j, "observer_log_sd_low",
                 r->is_pooled ? (double)NAN : r->group.spread.low);
  ef_json_number(j, "observer_log_sd_high",
                 r->is_pooled ? (double)NAN : r->group.spread.high);
  ef_json_number(j, "exponent", r->exponent);
  ef_json_number(j, "lapse", r->pooled.lapse.value);
  ef_json_number(j, "deviance", r->pooled.deviance);
  ef_json_number(j, "p_value", r->goodness.p_value);
  ef_json_integer(j, "seed", (int64_t)c->settings.intervals.seed);
  ef_json_begin_array(j, "observers");
  for (size_t i = 0; i < c->n_observers; ++i) {
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "name", answers_observer(&c->answers, i));
    ef_json_integer(j, "n_trials", (int64_t)c->each[i].n_trials);
    write_estimate(j, c->each[i].jnd);
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
  ef_json_integer(j, "n_pairs", (int64_t)c->n_scored);
  write_formulas(j, c);
  ef_json_end_object(j);
  return ef_json_finish(j, error);
}

ef_status render_panel_calibrate(const panel_calibration *c, ef_output *output,
                                 ef_error *error) {
  switch (c->options->format) {
  case FORMAT_CSV:
    return render_panel_jnd(c, output, error);
  case FORMAT_JSON:
    return write_json(c, output, error);
  default:
    return write_text(c, output, error);
  }
}
