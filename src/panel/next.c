/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which level to show next, and what is known so far: everything from the
 * answers, nothing remembered. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define LN_2 0.69314718055994530942

ef_next_settings ef_next_settings_default(ef_task task) {
  const bool is_difference = task == EF_TASK_2IFC || task == EF_TASK_TRIANGLE;
  const double open = (double)NAN;
  return (ef_next_settings){
      .task = task,
      .shape = is_difference ? EF_SHAPE_WEIBULL : EF_SHAPE_GAUSSIAN,
      .axis = is_difference ? EF_AXIS_LOG : EF_AXIS_LINEAR,
      .guess = open,
      .criterion = open,
      .threshold_low = open,
      .threshold_high = open,
      .width_low = open,
      .width_high = open,
      .lapse_max = 0.06,
      .n_thresholds = 81,
      .n_widths = 21,
      .n_lapses = 4,
      .aim = EF_NEXT_THRESHOLD,
      .level = 0.95,
      .precision = 0.1};
}

/* ---- Settings and limits ------------------------------------------------- */

static ef_status check_level(const ef_next_settings *s, double level, size_t i,
                             ef_error *error) {
  if (isfinite(level) && (s->axis == EF_AXIS_LINEAR || level >= 0))
    return EF_OK;
  ef__error_set(error, EF_MALFORMED, "level in hand is %g, expected %s", level,
                s->axis == EF_AXIS_LOG ? "a number of at least 0" : "a number");
  return ef__error_row(error, EF_MALFORMED, i + 1, "level");
}

static ef_status check_settings(const ef_next_settings *s, ef_error *error) {
  if (s->n_thresholds == 0 || s->n_widths == 0 || s->n_lapses == 0) {
    return ef__error_set(error, EF_INVALID,
                         "the grid has %zu x %zu x %zu places, expected at "
                         "least one each way",
                         s->n_thresholds, s->n_widths, s->n_lapses);
  }
  if (!(s->level > 0.5 && s->level < 1)) {
    return ef__error_set(error, EF_INVALID,
                         "interval level is %g, expected between 0.5 and 1",
                         s->level);
  }
  if (!(s->precision >= 0)) {
    return ef__error_set(error, EF_INVALID,
                         "precision is %g, expected at least 0", s->precision);
  }
  return EF_OK;
}

/* Lowest and highest t of the levels that are no blanks. */
static size_t extent(const ef_next_settings *s, size_t n, const double *level,
                     double range[2]) {
  size_t n_used = 0;
  for (size_t i = 0; i < n; ++i) {
    if (s->axis == EF_AXIS_LOG && level[i] == 0)
      continue;
    const double t = ef__axis_value(s->axis, level[i]);
    range[0] = n_used > 0 ? fmin(range[0], t) : t;
    range[1] = n_used > 0 ? fmax(range[1], t) : t;
    n_used++;
  }
  return n_used;
}

static ef_status check_range(const char *what, const double range[2],
                             ef_error *error) {
  if (range[0] < range[1] && isfinite(range[0]) && isfinite(range[1]))
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "%s from %g to %g: expected two numbers, the lower "
                       "first",
                       what, range[0], range[1]);
}

static ef_status limits(const ef_next_settings *s, size_t n,
                        const double *level, double threshold[2],
                        double width[2], ef_error *error) {
  double range[2] = {0, 0};
  if (extent(s, n, level, range) == 0) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "no level in hand but blanks: nothing to choose from");
  }
  double span = range[1] - range[0];
  double around = 0.5 * span;
  if (!(span > 0)) {
    span = around = s->axis == EF_AXIS_LOG ? 1 : fmax(fabs(range[0]), 1);
  }
  threshold[0] = isnan(s->threshold_low)
                     ? range[0] - around
                     : ef__axis_value(s->axis, s->threshold_low);
  threshold[1] = isnan(s->threshold_high)
                     ? range[1] + around
                     : ef__axis_value(s->axis, s->threshold_high);
  width[0] = isnan(s->width_low) ? span / 30 : s->width_low;
  width[1] = isnan(s->width_high) ? span : s->width_high;
  const ef_status status = check_range("thresholds", threshold, error);
  if (status != EF_OK)
    return status;
  if (!(width[0] > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "lowest width is %g, expected above 0", width[0]);
  }
  return s->n_widths > 1 ? check_range("widths", width, error) : EF_OK;
}

/* False alarms: of the settings, or from the blanks among the answers. */
static double guess_rate(const ef_next_settings *s,
                         const ef_responses *answers) {
  if (!isnan(s->guess))
    return s->guess;
  const double chance = ef_task_chance(s->task);
  if (!isnan(chance))
    return chance;
  double n = 0, k = 0;
  for (size_t i = 0; i < answers->n_rows; ++i) {
    if (answers->level[i] != 0)
      continue;
    n += (double)answers->shown[i];
    k += (double)answers->positive[i];
  }
  return n > 0 ? (k + 0.5) / (n + 1) : 0.02;
}

/* ---- Posterior of the answers -------------------------------------------- */

/* Logarithms of the likelihood first: a thousand answers leave the range of
 * doubles. */
static void weigh(const ef__data *data, ef__posterior *p, double *share) {
  for (size_t i = 0; i < p->n_places; ++i)
    p->weight[i] = 0;
  for (size_t row = 0; row < data->n; ++row) {
    const bool is_blank = row == 0 && data->has_blank;
    const double n = data->shown[row], k = data->positive[row];
    ef__posterior_share(p, data->centre + data->scale * data->t[row], is_blank,
                        share);
    for (size_t i = 0; i < p->n_places; ++i) {
      p->weight[i] -= ef__likelihood_part(k, n, share[i]) +
                      ef__likelihood_part(n - k, n, 1 - share[i]);
    }
  }
  double most = -(double)INFINITY, total = 0;
  for (size_t i = 0; i < p->n_places; ++i)
    most = fmax(most, p->weight[i]);
  if (!isfinite(most)) {
    ef__posterior_reset(p); /* no place allows the answers */
    return;
  }
  for (size_t i = 0; i < p->n_places; ++i) {
    p->weight[i] = exp(p->weight[i] - most);
    total += p->weight[i];
  }
  for (size_t i = 0; i < p->n_places; ++i)
    p->weight[i] /= total;
}

/* ---- What is known ------------------------------------------------------- */

/* A value with its weight, to be sorted. */
typedef struct weighed {
  double value, weight;
} weighed;

static int compare_weighed(const void *a, const void *b) {
  const double x = ((const weighed *)a)->value;
  const double y = ((const weighed *)b)->value;
  return (x > y) - (x < y);
}

/* Value below which `share` of the weight lies: each weight spreads over the
 * interval between the midpoints to its neighbours. */
static double quantile(const weighed *w, size_t n, double share) {
  double below = 0;
  for (size_t i = 0; i < n; ++i) {
    if (below + w[i].weight < share && i + 1 < n) {
      below += w[i].weight;
      continue;
    }
    const double left =
        i > 0 ? 0.5 * (w[i - 1].value + w[i].value) : w[i].value;
    const double right =
        i + 1 < n ? 0.5 * (w[i].value + w[i + 1].value) : w[i].value;
    if (!(w[i].weight > 0))
      return left;
    const double part = fmin((share - below) / w[i].weight, 1);
    return left + fmax(part, 0) * (right - left);
  }
  return (double)NAN;
}

/* Values that differ by rounding alone become one: between them there is no
 * interval for their weights to spread over. */
static size_t merge(weighed *w, size_t n) {
  const double same = 1e-9 * (w[n - 1].value - w[0].value);
  size_t kept = 0;
  for (size_t i = 1; i < n; ++i) {
    if (w[i].value - w[kept].value <= same)
      w[kept].weight += w[i].weight;
    else
      w[++kept] = w[i];
  }
  return kept + 1;
}

/* Mean, deviation and interval of values with weights, which it sorts. */
static ef_estimate summarise(weighed *w, size_t n, double level) {
  qsort(w, n, sizeof *w, compare_weighed);
  n = merge(w, n);
  double mean = 0, square = 0;
  for (size_t i = 0; i < n; ++i)
    mean += w[i].weight * w[i].value;
  for (size_t i = 0; i < n; ++i)
    square += w[i].weight * (w[i].value - mean) * (w[i].value - mean);
  return (ef_estimate){mean, sqrt(square), quantile(w, n, 0.5 * (1 - level)),
                       quantile(w, n, 0.5 * (1 + level))};
}

typedef struct known {
  const ef__posterior *posterior;
  const ef_next_settings *settings;
  ef__reading reading;
  weighed *scratch; /* a place for each threshold and width */
} known;

/* Weight of one threshold and width, over lapses. */
static double pair_weight(const ef__posterior *p, size_t pair) {
  double sum = 0;
  for (size_t i = 0; i < p->grid.n_lapses; ++i)
    sum += p->weight[pair * p->grid.n_lapses + i];
  return sum;
}

/* Thresholds as levels, with their weights. */
static void weigh_thresholds(const known *k) {
  const ef__grid *const g = &k->posterior->grid;
  for (size_t i = 0; i < g->n_thresholds; ++i) {
    double sum = 0;
    for (size_t j = 0; j < g->n_widths; ++j)
      sum += pair_weight(k->posterior, i * g->n_widths + j);
    k->scratch[i] =
        (weighed){ef__axis_level(k->settings->axis, g->threshold[i]), sum};
  }
}

static ef_estimate know_threshold(const known *k) {
  weigh_thresholds(k);
  return summarise(k->scratch, k->posterior->grid.n_thresholds,
                   k->settings->level);
}

/* Each weight belongs to a cell of half a step to either side. */
static void know_density(const known *k, double *threshold, double *density) {
  const ef__grid *const g = &k->posterior->grid;
  const ef_axis axis = k->settings->axis;
  const size_t n = g->n_thresholds;
  const double half =
      n > 1 ? 0.5 * (g->threshold[1] - g->threshold[0]) : (double)NAN;
  weigh_thresholds(k);
  for (size_t i = 0; i < n; ++i) {
    threshold[i] = k->scratch[i].value;
    density[i] =
        k->scratch[i].weight / (ef__axis_level(axis, g->threshold[i] + half) -
                                ef__axis_level(axis, g->threshold[i] - half));
  }
}

static ef_estimate know_width(const known *k) {
  const ef__grid *const g = &k->posterior->grid;
  for (size_t j = 0; j < g->n_widths; ++j) {
    double sum = 0;
    for (size_t i = 0; i < g->n_thresholds; ++i)
      sum += pair_weight(k->posterior, i * g->n_widths + j);
    k->scratch[j] = (weighed){g->width[j], sum};
  }
  return summarise(k->scratch, g->n_widths, k->settings->level);
}

static double level_at(const known *k, size_t i, size_t j, double eta) {
  const ef__grid *const g = &k->posterior->grid;
  return ef__axis_level(k->settings->axis,
                        g->threshold[i] +
                            g->width[j] * (eta - k->reading.eta_threshold));
}

static ef_estimate know_jnd(const known *k) {
  const ef__reading *const r = &k->reading;
  if (r->jnd != EF__JND_AT_ETA && r->jnd != EF__JND_RANGE) {
    return (ef_estimate){(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  }
  const ef__grid *const g = &k->posterior->grid;
  size_t pair = 0;
  for (size_t i = 0; i < g->n_thresholds; ++i) {
    for (size_t j = 0; j < g->n_widths; ++j, ++pair) {
      const double value = r->jnd == EF__JND_AT_ETA
                               ? level_at(k, i, j, r->eta_jnd)
                               : 0.5 * (level_at(k, i, j, r->eta_high) -
                                        level_at(k, i, j, r->eta_low));
      k->scratch[pair] = (weighed){value, pair_weight(k->posterior, pair)};
    }
  }
  return summarise(k->scratch, pair, k->settings->level);
}

static double know_lapse(const ef__posterior *p) {
  double mean = 0;
  for (size_t i = 0; i < p->n_places; ++i)
    mean += p->weight[i] * p->grid.lapse[i % p->grid.n_lapses];
  return mean;
}

static double know_edge(const ef__posterior *p) {
  const size_t size = p->grid.n_widths * p->grid.n_lapses;
  double sum = 0;
  for (size_t i = 0; i < size; ++i)
    sum += p->weight[i] + p->weight[p->n_places - 1 - i];
  return p->grid.n_thresholds > 1 ? sum : 0;
}

/* ---- Choice -------------------------------------------------------------- */

static void choose(const ef__posterior *p, ef_next_aim aim, ef_next *out,
                   double *gain) {
  const double now = ef__posterior_entropy(p, aim);
  out->entropy_bits = now / LN_2;
  out->choice = 0;
  for (size_t i = 0; i < p->n_levels; ++i) {
    const double bits = (now - ef__posterior_expected(p, i, aim)) / LN_2;
    if (gain != NULL)
      gain[i] = bits;
    if (i > 0 && !(bits > out->gain_bits))
      continue;
    out->choice = i;
    out->gain_bits = bits;
  }
}

static void judge(const ef_next_settings *s, ef_next *out) {
  const double unit =
      isnan(out->jnd.value) ? out->threshold.value : out->jnd.value;
  const double half = 0.5 * (out->threshold.high - out->threshold.low);
  out->is_precise = s->precision > 0 && half <= s->precision * fabs(unit);
  out->is_done = out->is_precise ||
                 (s->most_trials > 0 && out->n_trials >= s->most_trials);
  if (out->edge_share > 0.05) {
    ef__note(s->notes,
             "%.0f %% of the posterior lies on the outermost thresholds: the "
             "threshold may lie outside the range looked at; show other "
             "levels or widen the limits",
             100 * out->edge_share);
  }
}

/* ---- Public -------------------------------------------------------------- */

/* Size of one place of the grid, as bits: entropy is told in places of the
 * first grid. */
static double cell_bits(const ef__grid *g, ef_next_aim aim) {
  double bits = 0;
  if (g->n_thresholds > 1)
    bits += log2(g->threshold[1] - g->threshold[0]);
  if (aim == EF_NEXT_BOTH && g->n_widths > 1)
    bits += log2(log(g->width[1] / g->width[0]));
  return bits;
}

/* What is wanted of the posterior; NULL for what is not. */
typedef struct wanted {
  ef_next *next;
  double *gain;
  double *threshold, *density;
} wanted;

static ef_status with_posterior(const ef__data *data, const double *level,
                                const ef_next_settings *s,
                                const ef__reading *reading, ef__posterior *p,
                                const wanted *out, ef_error *error) {
  double *share;
  known k = {.posterior = p, .settings = s, .reading = *reading};
  const size_t n_pairs = p->grid.n_thresholds * p->grid.n_widths;
  const ef__part part[] = {{&share, p->n_places, sizeof *share},
                           {&k.scratch, n_pairs, sizeof *k.scratch}};
  void *const block = ef__allocate_block(2, part);
  if (block == NULL)
    return ef__error_memory(error, "the grid");
  const double prior_bits = cell_bits(&p->grid, s->aim);
  weigh(data, p, share);
  const double edge_share = know_edge(p);
  /* With many answers the posterior is finer than the grid. */
  for (int pass = 0; pass < 4 && ef__posterior_narrow(p, share); ++pass)
    weigh(data, p, share);
  if (out->density != NULL)
    know_density(&k, out->threshold, out->density);
  for (size_t i = 0; i < p->n_levels; ++i) {
    const bool is_blank = s->axis == EF_AXIS_LOG && level[i] == 0;
    ef__posterior_share(p, is_blank ? 0 : ef__axis_value(s->axis, level[i]),
                        is_blank, p->share + i * p->n_places);
  }
  if (out->next != NULL) {
    ef_next *const next = out->next;
    choose(p, s->aim, next, out->gain);
    next->entropy_bits += cell_bits(&p->grid, s->aim) - prior_bits;
    next->edge_share = edge_share;
    next->threshold = know_threshold(&k);
    next->jnd = know_jnd(&k);
    next->width = know_width(&k);
    next->lapse = know_lapse(p);
    judge(s, next);
  }
  free(block);
  return EF_OK;
}

/* The checks and limits of a fit, which here only bring model and guess. */
static ef_status model_of(const ef_next_settings *s, const ef__data *data,
                          const ef_responses *answers, ef__likelihood *out,
                          ef_error *error) {
  const double guess = guess_rate(s, answers);
  ef_fit_settings fit = ef_fit_settings_default(s->task);
  fit.shape = s->shape;
  fit.axis = s->axis;
  fit.criterion = s->criterion;
  fit.lapse = s->lapse_max;
  /* Where the task knows its chance, so does the model. */
  fit.guess =
      isnan(ef_task_chance(s->task)) || !isnan(s->guess) ? guess : (double)NAN;
  return ef__likelihood_setup(&fit, data, out, error);
}

static ef_status look(const ef_responses *answers, size_t n_levels,
                      const double *level, const ef_next_settings *s,
                      const wanted *out, ef_error *error) {
  ef__gsl_ready();
  ef_status status = check_settings(s, error);
  for (size_t i = 0; i < n_levels && status == EF_OK; ++i)
    status = check_level(s, level[i], i, error);
  double threshold[2], width[2];
  if (status == EF_OK)
    status = limits(s, n_levels, level, threshold, width, error);
  if (status != EF_OK)
    return status;
  ef__data data;
  void *answers_block, *grid_block = NULL;
  status = ef__data_new(answers, s->axis, &data, &answers_block, error);
  ef__likelihood likelihood;
  ef__reading reading;
  if (status == EF_OK)
    status = model_of(s, &data, answers, &likelihood, error);
  ef__posterior p = {.grid = {.n_thresholds = s->n_thresholds,
                              .n_widths = s->n_widths,
                              .n_lapses = s->n_lapses}};
  if (status == EF_OK) {
    p.model = likelihood.model;
    p.guess = likelihood.low[EF__GUESS];
    const ef_fit_settings fit = {
        .task = s->task, .axis = s->axis, .criterion = s->criterion};
    reading = ef__reading_new(&likelihood, &fit);
    p.eta = reading.eta_threshold;
    status = ef__posterior_new(&p, n_levels, threshold, width, s->lapse_max,
                               &grid_block, error);
  }
  if (status == EF_OK) {
    status = with_posterior(&data, level, s, &reading, &p, out, error);
  }
  free(answers_block);
  free(grid_block);
  return status;
}

ef_status ef_next_choose(const ef_responses *answers, size_t n_levels,
                         const double *level, const ef_next_settings *s,
                         ef_next *out, double *gain, ef_error *error) {
  out->n_trials = 0;
  for (size_t i = 0; i < answers->n_rows; ++i)
    out->n_trials += answers->shown[i];
  const wanted all = {.next = out, .gain = gain};
  return look(answers, n_levels, level, s, &all, error);
}

ef_status ef_next_posterior(const ef_responses *answers, size_t n_levels,
                            const double *level, const ef_next_settings *s,
                            double *threshold, double *density,
                            ef_error *error) {
  const wanted some = {.threshold = threshold, .density = density};
  return look(answers, n_levels, level, s, &some, error);
}
