/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Experiments that have not been run yet: observers, levels, answers,
 * estimates. */
#include "panel/panel_private.h"

#include <math.h>
#include <stdlib.h>

#define LN_10 2.30258509299404568402

enum { CHUNK = 16 };

/* ---- Observers ----------------------------------------------------------- */

ef_psychometric ef__plan_observer(const ef_plan_settings *s, double factor) {
  ef_psychometric c = {
      .shape = s->shape, .axis = s->axis, .task = s->task, .lapse = s->lapse};
  const double jnd = s->jnd * factor;
  const double chance = ef_task_chance(s->task);
  c.guess = isnan(chance) ? s->false_alarms : chance;
  const ef__model model = {s->shape, s->task, false};
  if (s->task == EF_TASK_GREATER_LESS) {
    c.guess = s->lapse; /* at both ends */
    const double half = 0.5 * (ef__model_core_eta(&model, 0.75) -
                               ef__model_core_eta(&model, 0.25));
    c.width = jnd / half;
    c.location = s->equality - c.width * ef__model_core_eta(&model, 0.5);
    return c;
  }
  c.width = 1 / (s->exponent * LN_10);
  double eta = log(EF_JND_D_PRIME);
  if (s->shape != EF_SHAPE_DETECTION) {
    const double share = ef_task_proportion(s->task, c.guess, EF_JND_D_PRIME);
    eta = ef__model_core_eta(&model, (share - c.guess) / (1 - c.guess));
  }
  c.location = log10(jnd) - c.width * eta;
  return c;
}

/* ---- Layout -------------------------------------------------------------- */

/* Blanks take a quarter of the trials where false alarms matter. */
static size_t blanks_of(const ef_plan_settings *s, size_t n_trials) {
  const bool has_alarms =
      s->task == EF_TASK_YES_NO || s->task == EF_TASK_SAME_DIFFERENT;
  return has_alarms ? n_trials / 4 : 0;
}

double ef__plan_level(const ef_plan_settings *s, size_t n, size_t i) {
  const double place = (double)i / (double)(n - 1);
  if (s->task == EF_TASK_GREATER_LESS) {
    return s->equality +
           s->jnd * (s->lowest + place * (s->highest - s->lowest));
  }
  return s->jnd * s->lowest * pow(s->highest / s->lowest, place);
}

/* Levels, and trials as evenly as they go: the middle levels first. */
static void lay_out(ef__design *d) {
  ef__data *const data = &d->data;
  const size_t from = d->has_blanks ? 1 : 0;
  const size_t n = d->n_levels - from;
  const size_t n_shown = d->n_trials - d->n_blanks;
  const size_t each = n_shown / n, rest = n_shown % n;
  const size_t first = (n - rest) / 2;
  data->n = d->n_levels;
  data->has_blank = d->has_blanks;
  if (d->has_blanks) {
    d->level[0] = 0;
    data->shown[0] = (double)d->n_blanks;
  }
  for (size_t i = 0; i < n; ++i) {
    const bool has_more = i >= first && i < first + rest;
    d->level[from + i] = ef__plan_level(d->settings, n, i);
    data->shown[from + i] = (double)(each + (has_more ? 1 : 0));
    data->t[from + i] = ef__axis_value(d->settings->axis, d->level[from + i]);
  }
  ef__data_scale(data);
}

static ef_status allocate(ef__design *d, void **block, ef_error *error) {
  const size_t size = sizeof(double);
  const size_t n_chunks = d->settings->n_experiments / CHUNK + 1;
  size_t n_scratch;
  if (!ef__size_multiply(n_chunks, d->n_levels, &n_scratch))
    return ef__error_memory(error, "the plan");
  const ef__part part[] = {
      {&d->level, d->n_levels, size},
      {&d->data.t, d->n_levels, size},
      {&d->data.shown, d->n_levels, size},
      {&d->data.positive, d->n_levels, size},
      {&d->positive, n_scratch, size},
      {&d->ratio, d->settings->n_experiments, size},
  };
  *block = ef__allocate_block(sizeof part / sizeof part[0], part);
  return *block != NULL ? EF_OK : ef__error_memory(error, "the plan");
}

/* Grid around the expected observer: four standard deviations of what is not
 * known, at least the levels; widths from a third to three times. Thresholds
 * are taken at the JND, where it is one. */
static ef_status make_posterior(ef__design *d, void **block, ef_error *error) {
  const ef_plan_settings *const s = d->settings;
  const ef__reading *const r = &d->reading;
  const ef_psychometric expected = ef__plan_observer(s, 1);
  const bool is_range = r->jnd == EF__JND_RANGE;
  ef__posterior *const p = &d->posterior;
  p->eta = is_range ? r->eta_threshold : r->eta_jnd;
  p->model = d->likelihood.model;
  p->guess = d->likelihood.low[EF__GUESS];
  if (ef__model_has_criterion(&p->model))
    p->guess = ef__model_guess(&p->model, s->false_alarms);
  p->grid.n_thresholds = is_range ? 21 : 41;
  p->grid.n_widths = 11;
  /* Lapses are known about as well as the JND is: a mean that is too large
   * makes thresholds too small. */
  const double lapse_max = fmin(2 * s->lapse, 0.06);
  p->grid.n_lapses = lapse_max > 0 ? 2 : 1;
  const double centre = expected.location + expected.width * p->eta;
  const double reach =
      is_range ? s->jnd : fmax(4 * s->uncertainty, log(s->highest)) / LN_10;
  const double threshold[2] = {centre - reach, centre + reach};
  const double width[2] = {expected.width / 3, expected.width * 3};
  const size_t from = d->has_blanks ? 1 : 0;
  const ef_status status = ef__posterior_new(p, d->n_levels - from, threshold,
                                             width, lapse_max, block, error);
  for (size_t i = 0; status == EF_OK && i < p->n_levels; ++i) {
    ef__posterior_share(p, ef__axis_value(s->axis, d->level[from + i]), false,
                        p->share + i * p->n_places);
  }
  return status;
}

static ef_status allocate_weights(ef__design *d, void **block,
                                  ef_error *error) {
  const size_t n_chunks = d->settings->n_experiments / CHUNK + 1;
  size_t n;
  if (!ef__size_multiply(n_chunks, d->posterior.n_places, &n))
    return ef__error_memory(error, "the plan");
  *block = d->weight = ef__allocate(n, sizeof *d->weight);
  return *block != NULL ? EF_OK : ef__error_memory(error, "the plan");
}

ef_status ef__design_make(const ef_plan_settings *s, ef_procedure procedure,
                          size_t n_trials, ef__design *d, void *block[3],
                          ef_error *error) {
  block[0] = block[1] = block[2] = NULL;
  *d = (ef__design){.settings = s,
                    .procedure = procedure,
                    .n_trials = n_trials,
                    .n_blanks = blanks_of(s, n_trials),
                    .has_blanks = blanks_of(s, 4) > 0};
  const bool is_adaptive = procedure == EF_PROCEDURE_ADAPTIVE;
  d->n_levels =
      (is_adaptive ? s->n_in_hand : s->n_levels) + (d->has_blanks ? 1 : 0);
  if (!is_adaptive && n_trials < 2 * d->n_levels) {
    return ef__error_set(error, EF_INVALID,
                         "%zu trials for %zu levels, expected at least two at "
                         "each",
                         n_trials, d->n_levels);
  }
  ef_status status = allocate(d, &block[0], error);
  if (status != EF_OK)
    return status;
  lay_out(d);
  ef_fit_settings fit = ef_fit_settings_default(s->task);
  fit.shape = s->shape;
  fit.axis = s->axis;
  status = ef__likelihood_setup(&fit, &d->data, &d->likelihood, error);
  if (status != EF_OK)
    return status;
  d->reading = ef__reading_new(&d->likelihood, &fit);
  if (is_adaptive) {
    status = make_posterior(d, &block[1], error);
    if (status == EF_OK)
      status = allocate_weights(d, &block[2], error);
  }
  return status;
}

/* ---- One experiment ------------------------------------------------------ */

/* JND of a fit. */
static double constant_run(const ef__design *d, size_t chunk,
                           const ef_psychometric *observer,
                           ef__random *random) {
  ef__data data = d->data;
  data.positive = d->positive + chunk * data.n;
  for (size_t i = 0; i < data.n; ++i) {
    data.positive[i] = ef__draw_binomial(
        random, data.shown[i], ef_psychometric_value(observer, d->level[i]));
  }
  ef__likelihood likelihood = d->likelihood;
  likelihood.data = &data;
  if (ef__support_before(&likelihood).support != EF_SUPPORT_FULL)
    return (double)NAN;
  ef__minimum found;
  ef__maximise(&likelihood, NULL, true, EF__TOLERANCE_QUICK, &found);
  const ef__verdict verdict = ef__support_after(&likelihood, &found);
  if (verdict.support == EF_SUPPORT_STEP && d->reading.jnd != EF__JND_RANGE) {
    const double middle =
        0.5 * (data.t[verdict.row_low] + data.t[verdict.row_high]);
    return ef__axis_level(d->reading.axis, data.centre + data.scale * middle);
  }
  if (verdict.support != EF_SUPPORT_FULL)
    return (double)NAN;
  return ef__reading_jnd(&d->reading, &likelihood, found.x);
}

/* Level of the run. */
static double up_down_run(const ef__design *d, const ef_psychometric *observer,
                          ef__random *random) {
  const ef_plan_settings *const s = d->settings;
  ef__run run = ef__run_begin(&s->rule, s->jnd * s->highest);
  for (size_t i = 0; i < d->n_trials; ++i) {
    const double p = ef_psychometric_value(observer, exp(run.t));
    ef__run_answer(&run, ef__random_unit(random) < p);
  }
  return ef__run_estimate(&run);
}

/* Mean of ln JND over the posterior; of JND itself where it is a width. */
static double posterior_jnd(const ef__design *d, const ef__posterior *p) {
  const ef__reading *const r = &d->reading;
  const ef__grid *const g = &p->grid;
  if (r->jnd != EF__JND_RANGE) {
    double variance;
    return ef__axis_level(r->axis, ef__posterior_mean(p, &variance));
  }
  double width = 0;
  for (size_t i = 0; i < p->n_places; ++i)
    width += p->weight[i] * g->width[i / g->n_lapses % g->n_widths];
  return 0.5 * width * (r->eta_high - r->eta_low);
}

static double adaptive_run(const ef__design *d, size_t chunk,
                           const ef_psychometric *observer,
                           ef__random *random) {
  ef__posterior p = d->posterior;
  p.weight = d->weight + chunk * p.n_places;
  ef__posterior_reset(&p);
  const size_t from = d->has_blanks ? 1 : 0;
  const ef_next_aim aim =
      d->reading.jnd == EF__JND_RANGE ? EF_NEXT_BOTH : EF_NEXT_THRESHOLD;
  for (size_t trial = 0; trial < d->n_trials - d->n_blanks; ++trial) {
    size_t best = 0;
    double least = (double)INFINITY;
    for (size_t i = 0; i < p.n_levels; ++i) {
      const double entropy = ef__posterior_expected(&p, i, aim);
      if (entropy >= least)
        continue;
      least = entropy;
      best = i;
    }
    const double share = ef_psychometric_value(observer, d->level[from + best]);
    ef__posterior_update(&p, best, ef__random_unit(random) < share);
  }
  return posterior_jnd(d, &p);
}

static double run_ratio(const ef__design *d, size_t chunk, size_t i) {
  const ef_plan_settings *const s = d->settings;
  ef__random random = ef__random_stream(s->seed, i);
  const double factor = exp(s->uncertainty * ef__random_normal(&random));
  const ef_psychometric observer = ef__plan_observer(s, factor);
  const double truth = s->jnd * factor;
  switch (d->procedure) {
  case EF_PROCEDURE_CONSTANT:
    return constant_run(d, chunk, &observer, &random) / truth;
  case EF_PROCEDURE_UP_DOWN:
    return up_down_run(d, &observer, &random) /
           ef_psychometric_level(&observer, ef_up_down_target(&s->rule));
  case EF_PROCEDURE_ADAPTIVE:
    return adaptive_run(d, chunk, &observer, &random) / truth;
  }
  return (double)NAN;
}

static void run_range(void *ctx, size_t begin, size_t end) {
  const ef__design *const d = ctx;
  for (size_t i = begin; i < end; ++i)
    d->ratio[i] = run_ratio(d, begin / CHUNK, i);
}

void ef__design_run(ef__design *design) {
  ef__parallel_for(design->settings->n_experiments, CHUNK,
                   design->settings->jobs, run_range, design);
}
