/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The nearest colour of an sRGB display by CIEDE2000, for targets anywhere in
 * CIELAB that it cannot show (L* 0 to 100, a* and b* -128 to 128, most of them
 * far away), beside general optimisers of the same difference over the same box:
 * NLopt's BOBYQA, its SLSQP with slopes by differences, and GSL's simplex. They
 * call the difference as our own search does for single values, which is at
 * least as fast as a user's through the public functions, and stop where amounts
 * change by 1e-7. First they start once, from the clipped amounts, and miss
 * some; then also from eight points inside the box, and keep the best, which
 * brings them nearer to ours. The reach is the share of targets within 1e-6 of
 * the least difference that anyone found, a search by bounds with a descent
 * from its codes among them. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include <gsl/gsl_multimin.h>
#include <nlopt.h>

#include "base/base_private.h"
#include "bench.h"
#include "gen.h"
#include "match/match_private.h"

enum { N = 1000, CODES = 256 };

static ef_setup *setup;
static ef__mixing mixing;
static const ef_metric *metric;
static double target_xyz[N][3], target[N][3], exact[N][3];
static double best_known[N];

/* Differences that a contestant reached. */
typedef struct contest {
  int n_starts;
  double reached[N];
} contest;

static ef__search search_for(size_t i) {
  ef__search search = {.mixing = &mixing, .metric = metric};
  memcpy(search.target, target[i], sizeof search.target);
  return search;
}

static void run_ours(void *context) {
  contest *const c = context;
  for (size_t i = 0; i < N; ++i) {
    ef__search search = search_for(i);
    ef__minima minima;
    ef__nearest(&search, exact[i], &minima);
    c->reached[i] = sqrt(minima.at[0].square);
  }
}

/* ---- Peers -------------------------------------------------------------- */

static double difference_at(const double amount[3], void *context) {
  return sqrt(ef__search_value(context, amount));
}

enum { STARTS = 9 };

static void start_at(size_t i, int start, double amount[3]) {
  for (int c = 0; c < 3; ++c) {
    amount[c] = start == 0 ? ef__clamp(exact[i][c], 0, 1)
                           : (start - 1) >> c & 1 ? 0.8 : 0.1;
  }
}

/* Central differences, at the bounds to the inside. */
static double nlopt_value(unsigned n, const double *amount, double *slope,
                          void *context) {
  const double step = 1e-6;
  for (unsigned c = 0; slope != NULL && c < n; ++c) {
    double up[3], down[3];
    memcpy(up, amount, sizeof up);
    memcpy(down, amount, sizeof down);
    up[c] = fmin(amount[c] + step, 1);
    down[c] = fmax(amount[c] - step, 0);
    slope[c] = (difference_at(up, context) - difference_at(down, context)) /
               (up[c] - down[c]);
  }
  return difference_at(amount, context);
}

static void run_nlopt(nlopt_algorithm algorithm, contest *c) {
  static const double low[3] = {0, 0, 0}, high[3] = {1, 1, 1};
  nlopt_opt optimiser = nlopt_create(algorithm, 3);
  nlopt_set_lower_bounds(optimiser, low);
  nlopt_set_upper_bounds(optimiser, high);
  nlopt_set_xtol_abs1(optimiser, 1e-7);
  nlopt_set_ftol_rel(optimiser, 1e-10);
  nlopt_set_maxeval(optimiser, 2000);
  for (size_t i = 0; i < N; ++i) {
    ef__search search = search_for(i);
    c->reached[i] = (double)INFINITY;
    nlopt_set_min_objective(optimiser, nlopt_value, &search);
    for (int start = 0; start < c->n_starts; ++start) {
      double amount[3], reached = (double)INFINITY;
      start_at(i, start, amount);
      nlopt_optimize(optimiser, amount, &reached);
      c->reached[i] = fmin(c->reached[i], reached);
    }
  }
  nlopt_destroy(optimiser);
}

static void run_bobyqa(void *context) {
  run_nlopt(NLOPT_LN_BOBYQA, context);
}

static void run_slsqp(void *context) {
  run_nlopt(NLOPT_LD_SLSQP, context);
}

/* Without bounds of its own: amounts beyond the box count as on it. */
static double simplex_value(const gsl_vector *x, void *context) {
  double amount[3];
  for (size_t c = 0; c < 3; ++c) {
    amount[c] = ef__clamp(gsl_vector_get(x, c), 0, 1);
  }
  return difference_at(amount, context);
}

static void run_simplex(void *context) {
  contest *const c = context;
  gsl_multimin_fminimizer *const minimiser =
      gsl_multimin_fminimizer_alloc(gsl_multimin_fminimizer_nmsimplex2, 3);
  gsl_vector *const x = gsl_vector_alloc(3), *const step = gsl_vector_alloc(3);
  for (size_t i = 0; i < N; ++i) {
    ef__search search = search_for(i);
    gsl_multimin_function f = {simplex_value, 3, &search};
    c->reached[i] = (double)INFINITY;
    for (int start = 0; start < c->n_starts; ++start) {
      double amount[3];
      start_at(i, start, amount);
      for (size_t k = 0; k < 3; ++k)
        gsl_vector_set(x, k, amount[k]);
      gsl_vector_set_all(step, 0.1);
      gsl_multimin_fminimizer_set(minimiser, &f, x, step);
      for (int k = 0; k < 1000; ++k) {
        if (gsl_multimin_fminimizer_iterate(minimiser) != 0 ||
            gsl_multimin_fminimizer_size(minimiser) < 1e-7) {
          break;
        }
      }
      c->reached[i] = fmin(c->reached[i], minimiser->fval);
    }
  }
  gsl_vector_free(step);
  gsl_vector_free(x);
  gsl_multimin_fminimizer_free(minimiser);
}

/* ---- The whole match ---------------------------------------------------- */

static void run_match(void *context) {
  static ef_match out[N];
  ef_match_batch(setup, N, target_xyz[0], context, 1, out, NULL);
}

/* ---- Targets ------------------------------------------------------------ */

static bool in_box(const double a[3]) {
  return a[0] >= 0 && a[0] <= 1 && a[1] >= 0 && a[1] <= 1 && a[2] >= 0 &&
         a[2] <= 1;
}

static void draw_targets(void) {
  gen g = gen_new(1);
  for (size_t i = 0; i < N;) {
    const ef_lab lab = {gen_between(&g, 0, 100), gen_between(&g, -128, 128),
                        gen_between(&g, -128, 128)};
    const ef_xyz xyz = ef_lab_to_xyz(lab, mixing.conditions.white);
    ef__exact(&mixing, xyz, exact[i]);
    if (in_box(exact[i]))
      continue;
    ef_metric_coordinates(metric, xyz, &mixing.conditions, target[i]);
    memcpy(target_xyz[i], &xyz, sizeof target_xyz[i]);
    ++i;
  }
}

/* By bounds on boxes of codes, then down from the best. */
static void search_widely(const ef_device *device) {
  static double amounts[3][CODES];
  ef__lattice lattice = {.n_codes = CODES};
  for (size_t c = 0; c < 3; ++c) {
    for (size_t k = 0; k < CODES; ++k) {
      amounts[c][k] =
          ef_device_amount(device, c, (double)k / (CODES - 1), NULL);
    }
    lattice.amount[c] = amounts[c];
  }
  for (size_t i = 0; i < N; ++i) {
    ef__search search = search_for(i);
    uint32_t code[3];
    double square = (double)INFINITY;
    ef__place place;
    ef__search_boxes(&search, &lattice, code, &square);
    for (int c = 0; c < 3; ++c)
      place.amount[c] = amounts[c][code[c]];
    if (!ef__descend(&search, &place))
      ef__descend_edge(&search, &place);
    best_known[i] = sqrt(fmin(square, place.square));
  }
}

static double reach(const contest *c) {
  size_t n = 0;
  for (size_t i = 0; i < N; ++i)
    n += c->reached[i] <= best_known[i] + 1e-6;
  return (double)n / N;
}

enum {
  OURS,
  BOBYQA,
  SLSQP,
  SIMPLEX,
  BOBYQA_9,
  SLSQP_9,
  SIMPLEX_9,
  N_CONTESTS,
  KEPT = N_CONTESTS,
  CODED,
  ALL
};

int main(void) {
  static contest contests[N_CONTESTS];
  ef_error error = {0};
  ef__gsl_ready();
  ef_observer *const observer = ef_observer_new("cie-1931", &error);
  ef_device *const device = ef_display_from_encoding("srgb", NULL, &error);
  setup = ef_setup_new(device, observer, NULL, NULL, &error);
  metric = ef_metric_find("ciede2000", &error);
  if (setup == NULL || ef__mixing_from_setup(setup, &mixing, &error) != EF_OK) {
    fprintf(stderr, "%s\n", error.message);
    return 1;
  }
  ef__scout *const scout = ef__scout_new(&mixing, metric, &error);
  mixing.scout = scout;
  draw_targets();
  ef_match_settings kept = ef_match_settings_default();
  ef_match_settings coded = ef_match_settings_default();
  kept.bits = 0;
  coded.hue_kept = false;
  bench_entry entry[ALL] = {
      [OURS] = {"nearest", run_ours, &contests[OURS], false, 0},
      [BOBYQA] = {"bobyqa", run_bobyqa, &contests[BOBYQA], false, 0},
      [SLSQP] = {"slsqp", run_slsqp, &contests[SLSQP], false, 0},
      [SIMPLEX] = {"simplex", run_simplex, &contests[SIMPLEX], false, 0},
      [BOBYQA_9] = {"bobyqa_9", run_bobyqa, &contests[BOBYQA_9], false, 0},
      [SLSQP_9] = {"slsqp_9", run_slsqp, &contests[SLSQP_9], false, 0},
      [SIMPLEX_9] = {"simplex_9", run_simplex, &contests[SIMPLEX_9], false,
                     0},
      [KEPT] = {"match_hue_kept", run_match, &kept, false, 0},
      [CODED] = {"match_8_bits", run_match, &coded, false, 0}};
  for (int c = 0; c < N_CONTESTS; ++c)
    contests[c].n_starts = c >= BOBYQA_9 ? STARTS : 1;
  bench_run(ALL, entry);
  bench_per_item(ALL, entry, N);
  search_widely(device);
  for (size_t i = 0; i < N; ++i) {
    for (int c = 0; c < N_CONTESTS; ++c) {
      best_known[i] = fmin(best_known[i], contests[c].reached[i]);
    }
  }
  for (int c = 0; c < N_CONTESTS; ++c) {
    char name[64];
    snprintf(name, sizeof name, "%s_reach", entry[c].name);
    bench_value(name, reach(&contests[c]), "of the targets");
  }
  bench_value("nearest_rate", N / entry[OURS].seconds, "targets/s");
  const char *const what = "nearest colour by CIEDE2000, out of gamut";
  bench_row(what, "NLopt BOBYQA", &entry[OURS], &entry[BOBYQA], 10);
  bench_row(what, "NLopt SLSQP, numeric slopes", &entry[OURS], &entry[SLSQP],
            5);
  bench_row(what, "GSL simplex", &entry[OURS], &entry[SIMPLEX], 12);
  bench_row(what, "NLopt BOBYQA, 9 starts", &entry[OURS], &entry[BOBYQA_9], 0);
  bench_row(what, "NLopt SLSQP, 9 starts", &entry[OURS], &entry[SLSQP_9], 0);
  bench_row(what, "GSL simplex, 9 starts", &entry[OURS], &entry[SIMPLEX_9], 0);
  ef__scout_free(scout);
  ef_setup_free(setup);
  ef_device_free(device);
  ef_observer_free(observer);
  return 0;
}
