/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What is unusual about curves, and what they rest on. */
#include "render_panel_fit.h"

#include <math.h>

#include "panel_words.h"
#include "words.h"

enum { NAME_ROOM = 160 };

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

void panel_fit_add_basis(text *out, const panel_fits *p) {
  add_remarks(out, p);
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
  if (panel_fit_has(p, PANEL_JND)) {
    panel_add_jnd_words(&line, a->task);
    text_label(out, "JND", &line);
  }
  if (!panel_fit_threshold_is_told(p)) {
    panel_fit_add_criterion(&line, p);
    text_label(out, "Threshold", &line);
  }
  if (panel_is_open(a->task) && p->settings.shape != EF_SHAPE_DETECTION) {
    text_format(&line,
                "a %s threshold moves with the observer's criterion, how ready "
                "one is to say \"%s\"; compare d', which does not, or ask in "
                "two intervals%s",
                ef_task_name(a->task), ef_task_positive(a->task),
                panel_fit_has(p, PANEL_JND)
                    ? ""
                    : "; without trials at level 0 (blanks) there is no d'");
    text_label(out, "Criterion", &line);
  }
  add_intervals(out, p);
  bool is_group = false;
  for (size_t c = 0; c < p->n_summaries && !is_group; ++c)
    panel_fits_value(p, c, panel_fit_main(p, c), &is_group);
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
