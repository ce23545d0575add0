/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_panel_fit.h"

#include <math.h>

#include "message.h"
#include "record.h"

static void record_limits(record *r, const char *low, const char *high,
                          ef_estimate e) {
  record_number(r, low, e.low);
  record_number(r, high, e.high);
}

static const char *support_name(ef_support support) {
  static const char *const names[] = {
      [EF_SUPPORT_FULL] = "full",
      [EF_SUPPORT_FEW_LEVELS] = "few-levels",
      [EF_SUPPORT_ALL_POSITIVE] = "all-positive",
      [EF_SUPPORT_NONE_POSITIVE] = "none-positive",
      [EF_SUPPORT_FLAT] = "flat",
      [EF_SUPPORT_FALLING] = "falling",
      [EF_SUPPORT_STEP] = "separated",
      [EF_SUPPORT_STALLED] = "stalled"};
  return names[support];
}

/* ---- One curve --------------------------------------------------------- */

static void record_values(record *r, const ef_fit *f, const ef_goodness *g) {
  record_number(r, "threshold", f->threshold.value);
  record_number(r, "threshold_se", f->threshold.se);
  record_limits(r, "ci_low", "ci_high", f->threshold);
  record_number(r, "criterion", f->criterion);
  record_number(r, "pse", f->equality.value);
  record_number(r, "pse_se", f->equality.se);
  record_limits(r, "pse_low", "pse_high", f->equality);
  record_number(r, "jnd", f->jnd.value);
  record_number(r, "jnd_se", f->jnd.se);
  record_limits(r, "jnd_low", "jnd_high", f->jnd);
  record_number(r, "sigma", f->sigma.value);
  record_number(r, "sigma_se", f->sigma.se);
  record_limits(r, "sigma_low", "sigma_high", f->sigma);
  record_number(r, "exponent", f->exponent.value);
  record_limits(r, "exponent_low", "exponent_high", f->exponent);
  record_number(r, "intercept", f->intercept);
  record_number(r, "intercept_se", f->se_intercept);
  record_number(r, "slope", f->slope);
  record_number(r, "slope_se", f->se_slope);
  record_number(r, "guess", f->guess.value);
  record_number(r, "lapse", f->lapse.value);
  record_limits(r, "lapse_low", "lapse_high", f->lapse);
  record_number(r, "location", f->curve.location);
  record_number(r, "width", f->curve.width);
  record_number(r, "log_likelihood", f->log_likelihood);
  record_number(r, "deviance", f->deviance);
  record_number(r, "pearson", f->pearson);
  record_number(r, "degrees", (double)f->degrees);
  record_number(r, "p_value", g->p_value);
  record_number(r, "dispersion", g->dispersion);
  record_number(r, "widened_by", g->widened_by);
}

static void record_bias(record *r, const panel_fits *p, const panel_fit *f) {
  const double none = (double)NAN;
  if (!p->answers.has_place)
    return;
  record_number(r, "place_share", f->has_bias ? f->bias.share : none);
  record_number(r, "place_expected", f->has_bias ? f->bias.expected : none);
  record_number(r, "place_bias", f->has_bias ? f->bias.bias.value : none);
  record_number(r, "place_bias_low", f->has_bias ? f->bias.bias.low : none);
  record_number(r, "place_bias_high", f->has_bias ? f->bias.bias.high : none);
  record_number(r, "place_p_value", f->has_bias ? f->bias.p_value : none);
}

/* JSON only: what a chart draws. */
static void write_points(ef_json *j, const panel_fit *f) {
  const bool has_curve = f->status == EF_OK;
  ef_json_begin_array(j, "points");
  for (size_t i = 0; i < f->n_points; ++i) {
    ef_json_begin_object(j, NULL);
    ef_json_number(j, "level", f->level[i]);
    ef_json_integer(j, "n", (int64_t)f->shown[i]);
    ef_json_integer(j, "k", (int64_t)f->positive[i]);
    ef_json_number(j, "share", (double)f->positive[i] / (double)f->shown[i]);
    ef_json_number(j, "expected",
                   has_curve ? ef_psychometric_value(&f->fit.curve, f->level[i])
                             : (double)NAN);
    if (f->sensitivity != NULL && f->level[i] != 0.0) {
      const ef_sensitivity *s = &f->sensitivity[i];
      ef_json_number(j, "d_prime", s->d_prime.value);
      ef_json_number(j, "d_prime_low", s->d_prime.low);
      ef_json_number(j, "d_prime_high", s->d_prime.high);
      ef_json_number(j, "criterion", s->criterion.value);
    }
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void record_fit(record *r, const panel_fits *p, const panel_fit *f) {
  char name[160];
  text remarks = {0};
  panel_fit_remarks(p, f, &remarks);
  panel_fit_name(p, f, name, sizeof name);
  record_begin(r, NULL);
  record_text(r, "name", name);
  record_text(r, "of", f->is_pooled ? "pooled" : "observer");
  record_text(r, "observer",
              f->is_pooled ? "" : answers_observer(&p->answers, f->observer));
  record_text(r, "condition", answers_condition(&p->answers, f->condition));
  record_number(r, "n_trials", (double)f->n_trials);
  record_number(r, "n_levels", (double)f->n_points);
  record_values(r, &f->fit, &f->goodness);
  record_bias(r, p, f);
  record_text(r, "support", support_name(f->fit.support));
  record_text(r, "remarks", remarks.bytes != NULL ? remarks.bytes : "");
  if (r->json != NULL)
    write_points(r->json, f);
  record_end(r);
  text_free(&remarks);
}

/* ---- JSON -------------------------------------------------------------- */

static void write_estimate(ef_json *j, const char *key, ef_estimate e) {
  ef_json_begin_object(j, key);
  ef_json_number(j, "value", e.value);
  ef_json_number(j, "se", e.se);
  ef_json_number(j, "low", e.low);
  ef_json_number(j, "high", e.high);
  ef_json_end_object(j);
}

static void write_group(ef_json *j, const char *key, const ef_group *g) {
  ef_json_begin_object(j, key);
  ef_json_integer(j, "n", (int64_t)g->n);
  ef_json_integer(j, "left_out", (int64_t)g->n_left_out);
  write_estimate(j, "mean", g->mean);
  write_estimate(j, "spread", g->spread);
  ef_json_number(j, "next_low", g->next_low);
  ef_json_number(j, "next_high", g->next_high);
  ef_json_number(j, "q", g->q);
  ef_json_number(j, "q_p_value", g->q_p_value);
  ef_json_end_object(j);
}

static void write_summary(ef_json *j, const panel_fits *p,
                          const panel_summary *s) {
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "condition", answers_condition(&p->answers, s->condition));
  ef_json_integer(j, "n_observers", (int64_t)s->n_observers);
  static const char *const keys[] = {[PANEL_THRESHOLD] = "threshold",
                                     [PANEL_JND] = "jnd",
                                     [PANEL_EQUALITY] = "pse"};
  for (panel_figure f = PANEL_THRESHOLD; f <= PANEL_EQUALITY; ++f) {
    bool is_group;
    const ef_estimate e = panel_fits_value(p, s->condition, f, &is_group);
    ef_json_begin_object(j, keys[f]);
    ef_json_number(j, "value", e.value);
    ef_json_number(j, "low", e.low);
    ef_json_number(j, "high", e.high);
    ef_json_text(j, "from", is_group ? "group" : "pooled");
    ef_json_end_object(j);
  }
  if (s->has_threshold)
    write_group(j, "threshold_group", &s->threshold);
  if (s->has_jnd)
    write_group(j, "jnd_group", &s->jnd);
  if (s->has_equality) {
    ef_json_begin_object(j, "pse_group");
    ef_json_integer(j, "n", (int64_t)s->equality.n);
    write_estimate(j, "mean", s->equality.equality);
    write_estimate(j, "spread", s->equality.spread);
    ef_json_end_object(j);
  }
  ef_json_end_object(j);
}

static ef_status write_json(const panel_fits *p, ef_output *output,
                            ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  const bool is_bootstrap = p->intervals.method == EF_INTERVAL_BOOTSTRAP;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "file", p->answers.file);
  ef_json_text(j, "task", ef_task_name(p->answers.task));
  ef_json_text(j, "positive", ef_task_positive(p->answers.task));
  ef_json_text(j, "model", ef_shape_name(p->settings.shape));
  ef_json_text(j, "axis", p->settings.axis == EF_AXIS_LOG ? "log" : "linear");
  ef_json_text(j, "unit", p->answers.unit);
  ef_json_number(j, "lapse_fixed", p->settings.lapse);
  ef_json_number(j, "lapse_max", p->settings.lapse_max);
  ef_json_text(j, "intervals", is_bootstrap ? "bootstrap" : "profile");
  ef_json_number(j, "interval_level", p->intervals.level);
  ef_json_integer(j, "samples", (int64_t)p->intervals.n_samples);
  ef_json_integer(j, "seed", (int64_t)p->intervals.seed);
  ef_json_begin_array(j, "conditions");
  for (size_t i = 0; i < p->n_summaries; ++i)
    write_summary(j, p, &p->summary[i]);
  ef_json_end_array(j);
  ef_json_begin_array(j, "fits");
  for (size_t i = 0; i < p->n; ++i) {
    record r = record_of_json(j);
    record_fit(&r, p, &p->fit[i]);
  }
  ef_json_end_array(j);
  ef_json_end_object(j);
  return ef_json_finish(j, error);
}

/* ---- CSV --------------------------------------------------------------- */

/* A group as a row of the same columns: threshold and JND with their limits. */
static void record_group(record *r, const panel_fits *p,
                         const panel_summary *s) {
  const ef_estimate none = {(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  panel_fit f = {.condition = s->condition, .is_pooled = true};
  f.fit = (ef_fit){.threshold = s->has_threshold ? s->threshold.mean : none,
                   .jnd = s->has_jnd ? s->jnd.mean : none,
                   .equality = s->has_equality ? s->equality.equality : none,
                   .sigma = none,
                   .exponent = none,
                   .guess = none,
                   .lapse = none};
  double *const unknown[] = {
      &f.fit.criterion,      &f.fit.intercept,      &f.fit.se_intercept,
      &f.fit.slope,          &f.fit.se_slope,       &f.fit.curve.location,
      &f.fit.curve.width,    &f.fit.log_likelihood, &f.fit.deviance,
      &f.fit.pearson,        &f.goodness.p_value,   &f.goodness.dispersion,
      &f.goodness.widened_by};
  for (size_t i = 0; i < sizeof unknown / sizeof unknown[0]; ++i)
    *unknown[i] = (double)NAN;
  size_t n_trials = 0;
  const panel_fit *whole = panel_fits_whole(p, s->condition);
  if (whole != NULL)
    n_trials = whole->n_trials;
  record_begin(r, NULL);
  record_text(r, "name", "group");
  record_text(r, "of", "group");
  record_text(r, "observer", "");
  record_text(r, "condition", answers_condition(&p->answers, s->condition));
  record_number(r, "n_trials", (double)n_trials);
  record_number(r, "n_levels", (double)NAN);
  record_values(r, &f.fit, &f.goodness);
  record_bias(r, p, &f);
  record_text(r, "support", "");
  record_text(r, "remarks", "");
  record_end(r);
}

static ef_status write_csv(const panel_fits *p, ef_output *output,
                           ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record head = record_of_csv(csv, true);
  record_fit(&head, p, &p->fit[0]);
  for (size_t i = 0; i < p->n; ++i) {
    record r = record_of_csv(csv, false);
    record_fit(&r, p, &p->fit[i]);
  }
  for (size_t i = 0; i < p->n_summaries; ++i) {
    const panel_summary *s = &p->summary[i];
    if (!s->has_threshold && !s->has_jnd && !s->has_equality)
      continue;
    record r = record_of_csv(csv, false);
    record_group(&r, p, s);
  }
  return ef_csv_finish(csv, error);
}

ef_status render_panel_fit_data(const panel_fits *p, ef_output *output,
                                ef_error *error) {
  return p->options->format == FORMAT_CSV ? write_csv(p, output, error)
                                          : write_json(p, output, error);
}
