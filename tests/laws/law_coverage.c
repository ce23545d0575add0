/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How often the 95 % intervals hold the truth: 2000 simulated experiments for
 * each of a few ordinary designs, the same on every machine. The
 * designs were chosen for being ordinary, before they were run; the tables are
 * printed as they come. */
#include <stdlib.h>

#include "near.h"

#include "panel/panel_private.h"

enum { EXPERIMENTS = 2000, SAMPLES = 400, MAX_LEVELS = 10 };

typedef struct design {
  const char *name;
  ef_psychometric truth;
  size_t n_levels; /**< evenly spaced from -span to span widths */
  double span;
  size_t per_level;
  size_t blanks;        /**< at level 0 */
  double lapse;         /**< fixed; NaN: estimated */
  bool is_bootstrapped; /**< in that table too */
} design;

#define LN_10 2.30258509299404568402

static const design designs[] = {
    {"yes-no, gaussian, 7 x 40",
     {EF_SHAPE_GAUSSIAN, EF_AXIS_LINEAR, EF_TASK_YES_NO, 5, 1, 0, 0},
     7,
     2,
     40,
     0,
     0,
     true},
    {"greater-less, gaussian, 7 x 40",
     {EF_SHAPE_GAUSSIAN, EF_AXIS_LINEAR, EF_TASK_GREATER_LESS, 0, 1, 0, 0},
     7,
     1.8,
     40,
     0,
     0,
     false},
    {"greater-less, logistic, log axis, 7 x 40",
     {EF_SHAPE_LOGISTIC, EF_AXIS_LOG, EF_TASK_GREATER_LESS, 1, 0.05, 0, 0},
     7,
     3,
     40,
     0,
     0,
     false},
    {"greater-less, lapses 1 % fitted, 8 x 50",
     {EF_SHAPE_GAUSSIAN, EF_AXIS_LINEAR, EF_TASK_GREATER_LESS, 0, 1, 0.01,
      0.01},
     8,
     2.5,
     50,
     0,
     NOT_A_NUMBER,
     false},
    {"2ifc, gaussian, 7 x 60",
     {EF_SHAPE_GAUSSIAN, EF_AXIS_LINEAR, EF_TASK_2IFC, 3, 1, 0.5, 0},
     7,
     2,
     60,
     0,
     0,
     false},
    {"2ifc, gaussian, lapses 2 % fitted, 8 x 60",
     {EF_SHAPE_GAUSSIAN, EF_AXIS_LINEAR, EF_TASK_2IFC, 3, 1, 0.5, 0.02},
     8,
     2.5,
     60,
     0,
     NOT_A_NUMBER,
     true},
    {"2ifc, weibull, 7 x 60",
     {EF_SHAPE_WEIBULL, EF_AXIS_LOG, EF_TASK_2IFC, 0, 1 / (2 * LN_10), 0.5, 0},
     7,
     2,
     60,
     0,
     0,
     false},
    {"2ifc, detection, 7 x 60",
     {EF_SHAPE_DETECTION, EF_AXIS_LOG, EF_TASK_2IFC, 0, 1 / LN_10, 0.5, 0},
     7,
     1.2,
     60,
     0,
     0,
     false},
    {"triangle, detection, 7 x 80",
     {EF_SHAPE_DETECTION, EF_AXIS_LOG, EF_TASK_TRIANGLE, 0, 1 / LN_10, 1.0 / 3,
      0},
     7,
     1.4,
     80,
     0,
     0,
     false},
    {"same-different, detection, 6 x 50 and 100 blanks",
     {EF_SHAPE_DETECTION, EF_AXIS_LOG, EF_TASK_SAME_DIFFERENT, 0, 1 / LN_10,
      0.15, 0},
     6,
     1.2,
     50,
     100,
     0,
     true},
};
enum { DESIGNS = sizeof designs / sizeof designs[0] };

typedef struct counts {
  size_t n;
  double level[MAX_LEVELS];
  size_t shown[MAX_LEVELS], positive[MAX_LEVELS];
} counts;

/* A share that differs from level to level so that n answers have `dispersion`
 * times the binomial variance: uniform about the expected one, as far as 0 and
 * 1 let it. */
static double spread(ef__random *random, double share, double n,
                     double dispersion) {
  if (!(dispersion > 1))
    return share;
  const double sd = sqrt(share * (1 - share) * (dispersion - 1) / (n - 1));
  const double half = fmin(sqrt(3) * sd, fmin(share, 1 - share));
  return share + half * (2 * ef__random_unit(random) - 1);
}

static void draw(const design *d, double dispersion, uint64_t i, counts *c) {
  ef__random random = ef__random_stream(20, i);
  c->n = 0;
  for (size_t k = 0; k < d->n_levels; ++k) {
    const double place = -1 + 2 * (double)k / (double)(d->n_levels - 1);
    c->level[c->n] = ef__axis_level(
        d->truth.axis, d->truth.location + d->truth.width * d->span * place);
    c->shown[c->n++] = d->per_level;
  }
  if (d->blanks > 0) {
    c->level[c->n] = 0;
    c->shown[c->n++] = d->blanks;
  }
  for (size_t k = 0; k < c->n; ++k) {
    const double share = ef_psychometric_value(&d->truth, c->level[k]);
    const double n = (double)c->shown[k];
    c->positive[k] = (size_t)ef__draw_binomial(
        &random, n, spread(&random, share, n, dispersion));
  }
}

/* ---- Experiments --------------------------------------------------------- */

enum { THRESHOLD, JND, WIDTH, QUANTITIES };

/* What one experiment came to: did the interval hold the truth? */
typedef struct outcome {
  bool is_refused, holds[QUANTITIES];
} outcome;

typedef struct run {
  const design *design;
  ef_interval_method method;
  bool widen;
  double dispersion; /**< variance of the answers over the binomial one */
  double truth[QUANTITIES];
  outcome outcome[EXPERIMENTS];
} run;

static bool is_held(const ef_estimate *e, double truth) {
  return e->low <= truth && truth <= e->high;
}

static void find_truth(run *r) {
  ef_psychometric c = r->design->truth;
  const bool is_detection = c.shape == EF_SHAPE_DETECTION;
  c.lapse = 0;
  if (c.task == EF_TASK_GREATER_LESS)
    c.guess = 0;
  const bool has_criterion = is_detection && c.task == EF_TASK_SAME_DIFFERENT;
  const double criterion = c.task == EF_TASK_2IFC       ? 0.75
                           : c.task == EF_TASK_TRIANGLE ? 2.0 / 3
                                                        : 0.5;
  r->truth[THRESHOLD] =
      has_criterion ? 1 : ef_psychometric_level(&c, criterion);
  r->truth[JND] = NOT_A_NUMBER;
  if (c.task == EF_TASK_GREATER_LESS) {
    r->truth[JND] = 0.5 * (ef_psychometric_level(&c, 0.75) -
                           ef_psychometric_level(&c, 0.25));
  } else if (is_detection) {
    r->truth[JND] = pow(10, c.location + c.width * log(EF_JND_D_PRIME));
  } else if (c.task == EF_TASK_2IFC) {
    r->truth[JND] = ef_psychometric_level(&c, 0.75);
  }
  r->truth[WIDTH] = is_detection ? 1 / c.width / LN_10
                                 : c.width * ef__shape_deviation(c.shape);
}

static void run_experiment(run *r, uint64_t i) {
  const design *const d = r->design;
  outcome *const out = &r->outcome[i];
  ef_fit_settings settings = ef_fit_settings_default(d->truth.task);
  settings.shape = d->truth.shape;
  settings.axis = d->truth.axis;
  settings.lapse = d->lapse;
  ef_interval_settings intervals = ef_interval_settings_default();
  intervals.method = r->method;
  intervals.widen = r->widen;
  intervals.n_samples = r->method == EF_INTERVAL_BOOTSTRAP ? SAMPLES : 0;
  intervals.seed = i;
  intervals.jobs = 1;
  counts c;
  draw(d, r->dispersion, i, &c);
  const ef_responses responses = {c.n, c.level, c.shown, c.positive};
  ef_fit fit;
  ef_goodness goodness;
  *out = (outcome){.is_refused = true};
  if (ef_fit_responses(&responses, &settings, &fit, NULL) != EF_OK ||
      ef_fit_intervals(&responses, &settings, &intervals, &fit, &goodness,
                       NULL) != EF_OK)
    return;
  out->is_refused = false;
  out->holds[THRESHOLD] = is_held(&fit.threshold, r->truth[THRESHOLD]);
  out->holds[JND] = is_held(&fit.jnd, r->truth[JND]);
  const bool is_detection = d->truth.shape == EF_SHAPE_DETECTION;
  out->holds[WIDTH] =
      is_held(is_detection ? &fit.exponent : &fit.sigma, r->truth[WIDTH]);
}

static void run_range(void *ctx, size_t begin, size_t end) {
  for (size_t i = begin; i < end; ++i)
    run_experiment(ctx, i);
}

/* Runs a design and prints its row; `share` in percent. */
static void run_design(run *r, double share[QUANTITIES]) {
  find_truth(r);
  ef__parallel_for(EXPERIMENTS, 50, 0, run_range, r);
  size_t n_refused = 0, n[QUANTITIES] = {0};
  for (size_t i = 0; i < EXPERIMENTS; ++i) {
    n_refused += r->outcome[i].is_refused;
    for (size_t q = 0; q < QUANTITIES; ++q)
      n[q] += r->outcome[i].holds[q];
  }
  printf("# %-52s", r->design->name);
  for (size_t q = 0; q < QUANTITIES; ++q) {
    /* Refused experiments count as missed. */
    share[q] = 100.0 * (double)n[q] / EXPERIMENTS;
    if (isnan(r->truth[q])) {
      share[q] = NOT_A_NUMBER;
      printf("      -");
    } else {
      printf("  %5.2f", share[q]);
    }
  }
  printf("  %7zu\n", n_refused);
}

static void print_head(const char *title) {
  printf("# %s, %d experiments a row: %% of intervals that hold the truth\n",
         title, EXPERIMENTS);
  printf("# %-52s  thres.  jnd  width  refused\n", "");
}

static void assert_between(const double share[QUANTITIES], double low,
                           double high) {
  for (size_t q = 0; q < QUANTITIES; ++q) {
    if (isnan(share[q]))
      continue;
    if (!(share[q] >= low && share[q] <= high))
      fail_msg("%.2f %% lies outside %g to %g", share[q], low, high);
  }
}

static run shared; /* too large for a stack */

static void profile_likelihood(void **state) {
  (void)state;
  print_head("profile likelihood, 95 %");
  for (size_t i = 0; i < DESIGNS; ++i) {
    shared = (run){.design = &designs[i], .method = EF_INTERVAL_PROFILE};
    double share[QUANTITIES];
    run_design(&shared, share);
    assert_between(share, 93, 97);
  }
}

static void bootstrap(void **state) {
  (void)state;
  print_head("parametric bootstrap of 400 samples, 95 %");
  for (size_t i = 0; i < DESIGNS; ++i) {
    if (!designs[i].is_bootstrapped)
      continue;
    shared = (run){.design = &designs[i], .method = EF_INTERVAL_BOOTSTRAP};
    double share[QUANTITIES];
    run_design(&shared, share);
    assert_between(share, 93, 97);
  }
}

/* Answers that vary 2.5 times as much as binomial ones, as when days differ:
 * plain intervals miss, widened ones much less. They are widened only when the
 * answers show it, which seven levels do not always. */
static void overdispersion(void **state) {
  (void)state;
  double plain[QUANTITIES], widened[QUANTITIES];
  print_head("dispersion 2.5, 95 % profile, not widened and widened");
  shared = (run){.design = &designs[0], .dispersion = 2.5};
  run_design(&shared, plain);
  shared = (run){.design = &designs[0], .dispersion = 2.5, .widen = true};
  run_design(&shared, widened);
  assert_true(plain[THRESHOLD] < 82);
  assert_true(widened[THRESHOLD] > plain[THRESHOLD] + 6);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(profile_likelihood),
      cmocka_unit_test(bootstrap),
      cmocka_unit_test(overdispersion),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
