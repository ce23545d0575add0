/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The panel's own JND in a difference formula. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define LN_10 2.30258509299404568402

ef_calibration_settings ef_calibration_settings_default(ef_task task) {
  return (ef_calibration_settings){.task = task,
                                   .exponent = 1,
                                   .lapse = (double)NAN,
                                   .lapse_max = 0.06,
                                   .intervals = ef_interval_settings_default(),
                                   .least_observers = 3};
}

/* The link of compare: d' a power of the difference. */
static ef_fit_settings fit_settings(const ef_calibration_settings *s) {
  ef_fit_settings fit = ef_fit_settings_default(s->task);
  fit.shape = EF_SHAPE_DETECTION;
  fit.axis = EF_AXIS_LOG;
  fit.lapse = s->lapse;
  fit.lapse_max = s->lapse_max;
  fit.width = isnan(s->exponent) ? (double)NAN : 1 / (s->exponent * LN_10);
  fit.notes = s->notes;
  return fit;
}

static ef_status check(const ef_calibration_settings *s, ef_error *error) {
  if (s->task == EF_TASK_GREATER_LESS) {
    return ef__error_set(error, EF_INVALID,
                         "a formula's difference has no sign: greater-less "
                         "answers give no JND in it");
  }
  if (!isnan(s->exponent) && !(s->exponent > 0 && isfinite(s->exponent))) {
    return ef__error_set(error, EF_INVALID,
                         "exponent is %g, expected a number above 0",
                         s->exponent);
  }
  return EF_OK;
}

/* ---- Observers ----------------------------------------------------------- */

/* Rows of all, and room for those of one. */
typedef struct table {
  size_t n_rows;
  const double *difference;
  const size_t *observer, *shown, *positive;
  double *own_difference;
  size_t *own_shown, *own_positive;
} table;

static ef_responses rows_of(const table *t, size_t observer) {
  size_t n = 0;
  for (size_t i = 0; i < t->n_rows; ++i) {
    if (t->observer[i] != observer)
      continue;
    t->own_difference[n] = t->difference[i];
    t->own_shown[n] = t->shown[i];
    t->own_positive[n++] = t->positive[i];
  }
  return (ef_responses){n, t->own_difference, t->own_shown, t->own_positive};
}

/* One observer, exponent and lapses those of all: a few answers carry a JND,
 * not a curve. */
static ef_status fit_observer(const table *t, size_t observer,
                              const ef_calibration_settings *s,
                              const ef_fit *pooled, ef_observer_jnd *out,
                              ef_error *error) {
  const ef_responses own = rows_of(t, observer);
  ef_fit_settings settings = fit_settings(s);
  settings.width = pooled->curve.width;
  settings.lapse = pooled->curve.lapse;
  settings.notes = NULL;
  ef_fit fit;
  ef_error reason;
  out->n_trials = 0;
  for (size_t i = 0; i < own.n_rows; ++i)
    out->n_trials += own.shown[i];
  ef_status status = ef_fit_responses(&own, &settings, &fit, &reason);
  out->support = fit.support;
  out->jnd = (ef_estimate){(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  if (status == EF_NO_ANSWER) {
    ef__note(s->notes, "observer %zu has no JND: %s", observer + 1,
             reason.message);
    return EF_OK;
  }
  ef_interval_settings intervals = s->intervals;
  intervals.method = EF_INTERVAL_PROFILE;
  intervals.n_samples = 0;
  ef_goodness unused;
  if (status == EF_OK) {
    status =
        ef_fit_intervals(&own, &settings, &intervals, &fit, &unused, &reason);
  }
  if (status != EF_OK)
    return ef__error_set(error, status, "%s", reason.message);
  out->jnd = fit.jnd;
  return EF_OK;
}

/* ---- Panel --------------------------------------------------------------- */

static ef_status summarise(const ef_calibration_settings *s, size_t n_observers,
                           const ef_observer_jnd *each, ef_calibration *out,
                           ef_error *error) {
  double *value, *se;
  const ef__part part[] = {{&value, n_observers, sizeof *value},
                           {&se, n_observers, sizeof *se}};
  void *const block = ef__allocate_block(2, part);
  if (block == NULL)
    return ef__error_memory(error, "the observers");
  for (size_t i = 0; i < n_observers; ++i) {
    value[i] = each[i].jnd.value;
    se[i] = each[i].jnd.se;
    out->n_observers += isnan(value[i]) ? 0 : 1;
  }
  ef_error reason;
  const ef_status status =
      ef_group_summary(n_observers, value, se, EF_GROUP_RESTRICTED,
                       s->intervals.level, s->notes, &out->group, &reason);
  free(block);
  if (status == EF_NO_ANSWER)
    out->group.n = 0;
  else if (status != EF_OK)
    return ef__error_set(error, status, "%s", reason.message);
  out->is_pooled = out->group.n < s->least_observers || out->group.n < 2;
  out->jnd = out->is_pooled ? out->pooled.jnd : out->group.mean;
  if (out->is_pooled) {
    ef__note(s->notes,
             "%zu of %zu observers have a JND of their own, expected at least "
             "%zu for the panel's to be that of a group: all answers pooled, "
             "and the interval does not hold for other people",
             out->n_observers, n_observers, s->least_observers);
  }
  return EF_OK;
}

static ef_status check_observers(const table *t, size_t n_observers,
                                 ef_error *error) {
  for (size_t i = 0; i < t->n_rows; ++i) {
    if (t->observer[i] < n_observers)
      continue;
    ef__error_set(error, EF_INVALID,
                  "observer %zu of %zu, expected to be counted from 0",
                  t->observer[i], n_observers);
    return ef__error_row(error, EF_INVALID, i + 1, "observer");
  }
  return EF_OK;
}

ef_status ef_calibrate(size_t n_rows, const double *difference,
                       const size_t *observer, const size_t *shown,
                       const size_t *positive, size_t n_observers,
                       const ef_calibration_settings *settings,
                       ef_calibration *out, ef_observer_jnd *each,
                       ef_error *error) {
  table t = {.n_rows = n_rows,
             .difference = difference,
             .observer = observer,
             .shown = shown,
             .positive = positive};
  ef_status status = check(settings, error);
  if (status == EF_OK)
    status = check_observers(&t, n_observers, error);
  if (status != EF_OK)
    return status;
  memset(out, 0, sizeof *out);
  const ef_responses all = {n_rows, difference, shown, positive};
  const ef_fit_settings fit = fit_settings(settings);
  status = ef_fit_responses(&all, &fit, &out->pooled, error);
  if (status != EF_OK)
    return status;
  status = ef_fit_intervals(&all, &fit, &settings->intervals, &out->pooled,
                            &out->goodness, error);
  if (status != EF_OK)
    return status;
  out->exponent = out->pooled.exponent.value;
  const ef__part part[] = {
      {&t.own_difference, n_rows, sizeof *t.own_difference},
      {&t.own_shown, n_rows, sizeof *t.own_shown},
      {&t.own_positive, n_rows, sizeof *t.own_positive}};
  void *const block = ef__allocate_block(3, part);
  if (block == NULL)
    return ef__error_memory(error, "the observers");
  for (size_t i = 0; i < n_observers && status == EF_OK; ++i)
    status = fit_observer(&t, i, settings, &out->pooled, &each[i], error);
  free(block);
  if (status == EF_OK)
    status = summarise(settings, n_observers, each, out, error);
  return status;
}

static void copy_text(char *to, size_t size, const char *from) {
  const size_t length = strlen(from);
  const size_t kept = length < size ? length : size - 1;
  memcpy(to, from, kept);
  to[kept] = '\0';
}

void ef_calibration_record(const ef_calibration *calibration,
                           const char *metric, const char *source,
                           ef_jnd_record *out) {
  const bool is_pooled = calibration->is_pooled;
  memset(out, 0, sizeof *out);
  copy_text(out->metric, sizeof out->metric, metric);
  copy_text(out->source, sizeof out->source, source);
  out->value = calibration->jnd.value;
  out->criterion = (ef_criterion){.task = EF_TASK_2IFC,
                                  .proportion = EF_JND_PROPORTION,
                                  .false_alarms = (double)NAN,
                                  .d_prime = (double)NAN};
  out->exponent = calibration->exponent;
  out->observer_log_sd = is_pooled ? 0 : calibration->group.spread.value;
  out->low = calibration->jnd.low;
  out->high = calibration->jnd.high;
  out->n_observers = is_pooled ? 1 : calibration->group.n;
}

/* ---- Formulas ------------------------------------------------------------ */

/* Pairs that differ, with the d' seen in each, and room for one formula. */
typedef struct scores {
  size_t n_pairs, n_seen;
  size_t *pair; /* n_seen */
  double *seen, *computed;
} scores;

static bool is_same(size_t n_pairs, size_t n_formulas, const double *difference,
                    size_t pair) {
  for (size_t f = 0; f < n_formulas; ++f) {
    if (difference[f * n_pairs + pair] != 0)
      return false;
  }
  return true;
}

static double corrected(size_t k, size_t n) {
  return ((double)k + 0.5) / ((double)n + 1);
}

/* d' of the answers to each pair that differs. */
static ef_status see(size_t n_formulas, const double *difference,
                     const size_t *shown, const size_t *positive, ef_task task,
                     scores *out, ef_error *error) {
  size_t n_same = 0, k_same = 0;
  out->n_seen = 0;
  for (size_t i = 0; i < out->n_pairs; ++i) {
    if (positive[i] > shown[i] || shown[i] == 0) {
      ef__error_set(error, EF_MALFORMED,
                    "pair %zu: %zu positive answers of %zu, expected at least "
                    "one answer and no more positive ones",
                    i + 1, positive[i], shown[i]);
      return ef__error_row(error, EF_MALFORMED, i + 1, "k");
    }
    if (is_same(out->n_pairs, n_formulas, difference, i)) {
      n_same += shown[i];
      k_same += positive[i];
    } else {
      out->pair[out->n_seen++] = i;
    }
  }
  const double chance = ef_task_chance(task);
  if (isnan(chance) && n_same == 0) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "no pair without a difference: the d' of %s needs its "
                         "false alarms",
                         ef_task_name(task));
  }
  const double alarms = corrected(k_same, n_same);
  const double least = isnan(chance) ? alarms : chance;
  for (size_t i = 0; i < out->n_seen; ++i) {
    const size_t pair = out->pair[i];
    const double rate = corrected(positive[pair], shown[pair]);
    out->seen[i] = rate > least ? ef_task_d_prime(task, alarms, rate) : 0;
  }
  return EF_OK;
}

static ef_status score(const scores *all, const double *difference,
                       const size_t *shown, const size_t *positive,
                       const ef_calibration_settings *s, ef_formula_score *out,
                       ef_error *error) {
  for (size_t i = 0; i < all->n_seen; ++i)
    all->computed[i] = difference[all->pair[i]];
  const ef_status status =
      ef_stress(all->n_seen, all->computed, all->seen, &out->stress, error);
  if (status != EF_OK)
    return status;
  const ef_responses responses = {all->n_pairs, difference, shown, positive};
  ef_fit_settings settings = fit_settings(s);
  settings.notes = NULL;
  ef_fit fit;
  const bool has_fit =
      ef_fit_responses(&responses, &settings, &fit, NULL) == EF_OK;
  /* The constant part of the likelihood depends on how pairs of equal
   * difference are merged: it is left out. */
  out->log_likelihood = (double)NAN;
  out->jnd = has_fit ? fit.jnd.value : (double)NAN;
  out->exponent = has_fit ? fit.exponent.value : (double)NAN;
  if (!has_fit)
    return EF_OK;
  out->log_likelihood = 0;
  for (size_t i = 0; i < all->n_pairs; ++i) {
    const double p = ef_psychometric_value(&fit.curve, difference[i]);
    const double k = (double)positive[i], n = (double)shown[i];
    out->log_likelihood +=
        (k > 0 ? k * log(p) : 0) + (n - k > 0 ? (n - k) * log1p(-p) : 0);
  }
  return EF_OK;
}

ef_status ef_formulas_score(size_t n_pairs, size_t n_formulas,
                            const double *difference, const size_t *shown,
                            const size_t *positive,
                            const ef_calibration_settings *settings,
                            ef_formula_score *out, size_t *best,
                            ef_error *error) {
  ef_status status = check(settings, error);
  if (status != EF_OK)
    return status;
  scores all = {.n_pairs = n_pairs};
  const ef__part part[] = {{&all.pair, n_pairs, sizeof *all.pair},
                           {&all.seen, n_pairs, sizeof *all.seen},
                           {&all.computed, n_pairs, sizeof *all.computed}};
  void *const block = ef__allocate_block(3, part);
  if (block == NULL)
    return ef__error_memory(error, "the pairs");
  ef__gsl_ready();
  status =
      see(n_formulas, difference, shown, positive, settings->task, &all, error);
  *best = 0;
  for (size_t f = 0; f < n_formulas && status == EF_OK; ++f) {
    status = score(&all, difference + f * n_pairs, shown, positive, settings,
                   &out[f], error);
    if (status == EF_OK && out[f].stress < out[*best].stress)
      *best = f;
  }
  for (size_t f = 0; f < n_formulas && status == EF_OK; ++f) {
    ef_stress_compare(all.n_seen, out[f].stress, out[*best].stress, &out[f].f,
                      &out[f].p_value);
  }
  free(block);
  return status;
}
