/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The search for a recipe: Gauss-Newton steps within the limits, and whole
 * steps around what they end at. */
#include "match/recipe_private.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

enum { MOST = EF_MAX_DRIVES, MOST_STEPS = 200 };

/* The goal around some concentrations: value + gradient . d + d' hessian d / 2
 * for a step d, the Hessian positive semidefinite. */
typedef struct place {
  double c[MOST];
  double value;
  double gradient[MOST];
  double hessian[MOST * MOST];
} place;

/* ---- Mixing ------------------------------------------------------------- */

/* The base is what the others leave. */
void ef__recipe_complete(const ef__recipe_search *p, const double *c,
                         double *all) {
  for (size_t i = 0; i < p->n; i++)
    all[p->index[i]] = c[i];
  ef_mixture_complete(p->device, all);
}

/* Reflectance, and its slopes when asked for. Cannot fail: the concentrations
 * are not below zero. */
static void mix(ef__recipe_search *p, const double *c, bool with_slopes) {
  double all[EF_MAX_RECIPE] = {0.0};
  ef__recipe_complete(p, c, all);
  ef_mixture_spectrum(p->device, all, p->reflectance,
                      with_slopes ? p->slope : NULL, NULL);
}

void ef__recipe_mix(ef__recipe_search *p, const double *c) {
  mix(p, c, false);
}

/* Slope of sample s with unknown i, the base giving way. */
static double slope_of(const ef__recipe_search *p, size_t s, size_t i) {
  const double *row = p->slope + s * p->n_all;
  return row[p->index[i]] +
         (p->base < p->n_all ? p->base_slope * row[p->base] : 0.0);
}

ef_xyz ef__recipe_colour(const ef__recipe_search *p, const ef__look *light) {
  const double *weight = ef_weights_matrix(light->weights);
  double xyz[3] = {0.0};
  for (size_t c = 0; c < 3; c++)
    for (size_t s = 0; s < p->count; s++)
      xyz[c] += weight[c * p->count + s] * p->reflectance[s];
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

/* ---- The goals ---------------------------------------------------------- */

double ef__recipe_mean_square(const ef__recipe_search *p) {
  double sum = 0.0;
  for (size_t s = 0; s < p->count; s++) {
    const double off = p->reflectance[s] - p->standard[s];
    sum += off * off;
  }
  return sum / (double)p->count;
}

/* Error of reflectance at sample s for i = n, else its slope with unknown i. */
static double error_at(const ef__recipe_search *p, size_t s, size_t i) {
  return i < p->n ? slope_of(p, s, i) : p->reflectance[s] - p->standard[s];
}

/* Its mean by the weights of each channel: what the white takes along when the
 * light changes. */
static void mean_error(const ef__recipe_search *p, const ef__look *light,
                       size_t i, double mean[3]) {
  const double *weight = ef_weights_matrix(light->weights);
  for (size_t c = 0; c < 3; c++) {
    double sum = 0.0, white = 0.0;
    for (size_t s = 0; s < p->count; s++) {
      sum += weight[c * p->count + s] * error_at(p, s, i);
      white += weight[c * p->count + s];
    }
    mean[c] = sum / white;
  }
}

/* How far it moves X, Y, Z, against the white, when the light has twice its
 * power at sample s. */
static void move_at(const ef__recipe_search *p, const ef__look *light, size_t s,
                    size_t i, const double mean[3], double move[3]) {
  const double *weight = ef_weights_matrix(light->weights);
  for (size_t c = 0; c < 3; c++)
    move[c] = weight[c * p->count + s] * (error_at(p, s, i) - mean[c]);
}

static double product(const double matrix[9], const double a[3],
                      const double b[3]) {
  double sum = 0.0;
  for (size_t r = 0; r < 9; r++)
    sum += matrix[r] * a[r / 3] * b[r % 3];
  return sum;
}

/* What the peaks of the light add to the squared difference. */
static double ripple_square(const ef__recipe_search *p, const ef__look *light) {
  double mean[3], move[3], sum = 0.0;
  mean_error(p, light, p->n, mean);
  for (size_t s = 0; s < p->count; s++) {
    move_at(p, light, s, p->n, mean, move);
    sum += product(light->ripple, move, move);
  }
  return sum;
}

/* How much a light counts, all of them 1 in sum. */
static double weight_of(const ef__recipe_search *p, ef__recipe_goal g,
                        size_t k) {
  return g == EF__GOAL_SPECTRUM ? 1.0 / (double)p->n_lights
                                : p->light[k].weight;
}

static const double *target_of(const ef__look *light, ef__recipe_goal g) {
  return g == EF__GOAL_SPECTRUM ? light->sampled : light->target;
}

static double square_in(const ef__recipe_search *p, const ef__look *light,
                        ef__recipe_goal g) {
  double at[3];
  ef_metric_coordinates(p->metric, ef__recipe_colour(p, light),
                        &light->conditions, at);
  const double d = ef_metric_difference(p->metric, target_of(light, g), at);
  return d * d;
}

/* Of what was mixed last. */
static double goal_value(const ef__recipe_search *p, ef__recipe_goal g) {
  double sum = 0.0;
  for (size_t k = 0; k < p->n_lights; k++) {
    const ef__look *light = &p->light[k];
    const double weight = weight_of(p, g, k);
    if (weight > 0.0)
      sum += weight * square_in(p, light, g);
    if (g == EF__GOAL_SPECTRUM)
      sum += weight * ripple_square(p, light);
  }
  return sum;
}

double ef__recipe_expected_square(const ef__recipe_search *p) {
  return goal_value(p, EF__GOAL_SPECTRUM);
}

static double value_of(ef__recipe_search *p, ef__recipe_goal g,
                       const double *c) {
  mix(p, c, false);
  return goal_value(p, g);
}

/* Its value, slopes and the curvature of a sum of squares. */
static void expand_ripple(const ef__recipe_search *p, const ef__look *light,
                          double weight, place *at) {
  double mean[MOST + 1][3], move[MOST + 1][3];
  const size_t n = p->n;
  for (size_t i = 0; i <= n; i++)
    mean_error(p, light, i, mean[i]);
  for (size_t s = 0; s < p->count; s++) {
    for (size_t i = 0; i <= n; i++)
      move_at(p, light, s, i, mean[i], move[i]);
    at->value += weight * product(light->ripple, move[n], move[n]);
    for (size_t i = 0; i < n; i++) {
      at->gradient[i] +=
          weight * 2.0 * product(light->ripple, move[n], move[i]);
      for (size_t j = 0; j < n; j++)
        at->hessian[i * n + j] +=
            weight * 2.0 * product(light->ripple, move[i], move[j]);
    }
  }
}

/* d coordinate / d concentration, 3 x n. */
static void coordinate_slopes(const ef__recipe_search *p, const ef__look *light,
                              ef_xyz xyz, double *out) {
  const double *weight = ef_weights_matrix(light->weights);
  double of_xyz[9];
  ef_metric_jacobian(p->metric, xyz, &light->conditions, of_xyz);
  for (size_t i = 0; i < p->n; i++) {
    double move[3] = {0.0};
    for (size_t s = 0; s < p->count; s++) {
      const double slope = slope_of(p, s, i);
      for (size_t c = 0; c < 3; c++)
        move[c] += weight[c * p->count + s] * slope;
    }
    for (size_t r = 0; r < 3; r++)
      out[r * p->n + i] = of_xyz[3 * r] * move[0] +
                          of_xyz[3 * r + 1] * move[1] +
                          of_xyz[3 * r + 2] * move[2];
  }
}

/* The formula's own gradient, and for the curvature its local tensor half way
 * between standard and mixture, which is positive definite. */
static void expand_colour(const ef__recipe_search *p, const ef__look *light,
                          const double target[3], double weight, place *at) {
  double here[3], middle[3], tensor[9], m[3 * MOST];
  ef__expansion own;
  const ef_xyz xyz = ef__recipe_colour(p, light);
  ef_metric_coordinates(p->metric, xyz, &light->conditions, here);
  ef__metric_expand(p->metric, target, here, &own);
  for (size_t r = 0; r < 3; r++)
    middle[r] = 0.5 * (here[r] + target[r]);
  ef_metric_tensor(p->metric, middle, tensor);
  coordinate_slopes(p, light, xyz, m);
  at->value += weight * own.square;
  for (size_t i = 0; i < p->n; i++) {
    for (size_t r = 0; r < 3; r++)
      at->gradient[i] += weight * own.gradient[r] * m[r * p->n + i];
    for (size_t j = 0; j < p->n; j++)
      for (size_t r = 0; r < 9; r++)
        at->hessian[i * p->n + j] += weight * 2.0 * tensor[r] *
                                     m[r / 3 * p->n + i] * m[r % 3 * p->n + j];
  }
}

static void expand(ef__recipe_search *p, ef__recipe_goal g, place *at) {
  mix(p, at->c, true);
  at->value = 0.0;
  memset(at->gradient, 0, sizeof at->gradient);
  memset(at->hessian, 0, sizeof at->hessian);
  for (size_t k = 0; k < p->n_lights; k++) {
    const ef__look *light = &p->light[k];
    const double weight = weight_of(p, g, k);
    if (weight > 0.0)
      expand_colour(p, light, target_of(light, g), weight, at);
    if (g == EF__GOAL_SPECTRUM)
      expand_ripple(p, light, weight, at);
  }
}

/* ---- Descent within the limits ------------------------------------------ */

/* Concentrations that make the damped quadratic form least, none below zero and
 * their sum at most the loading. */
static bool step_from(const ef__recipe_search *p, const place *at,
                      double damping, double *to) {
  const size_t n = p->n;
  double matrix[MOST * MOST], linear[MOST];
  double limit[(MOST + 1) * MOST] = {0.0}, bound[MOST + 1] = {0.0};
  double trace = 0.0;
  memcpy(matrix, at->hessian, n * n * sizeof *matrix);
  for (size_t i = 0; i < n; i++)
    trace += matrix[i * n + i];
  if (!(trace > 0.0))
    return false;
  for (size_t i = 0; i < n; i++)
    /* Its own curvature, and a little of all for what has none. */
    matrix[i * n + i] +=
        damping * (matrix[i * n + i] + 1e-6 * trace) + DBL_EPSILON * trace;
  for (size_t i = 0; i < n; i++) {
    linear[i] = at->gradient[i];
    for (size_t j = 0; j < n; j++)
      linear[i] -= matrix[i * n + j] * at->c[j];
    limit[i * n + i] = 1.0;
    limit[n * n + i] = -1.0;
  }
  bound[n] = -p->most;
  if (!ef__least_quadratic(n, matrix, linear, n + 1, limit, bound, to))
    return false;
  double sum = 0.0;
  for (size_t i = 0; i < n; i++) {
    to[i] = fmax(to[i], 0.0);
    sum += to[i];
  }
  for (size_t i = 0; sum > p->most && i < n; i++)
    to[i] *= p->most / sum; /* by the rounding of the sum */
  return true;
}

static bool is_same(const ef__recipe_search *p, const double *a,
                    const double *b) {
  for (size_t i = 0; i < p->n; i++)
    if (fabs(a[i] - b[i]) > 1e-14 * p->most)
      return false;
  return true;
}

/* Walks down to a local minimum. */
static void descend(ef__recipe_search *p, ef__recipe_goal g, place *at) {
  double damping = 1e-3;
  expand(p, g, at);
  for (int step = 0; step < MOST_STEPS && damping < 1e12; step++) {
    double to[MOST];
    if (!step_from(p, at, damping, to)) {
      damping = 10.0 * fmax(damping, 1e-12);
      continue;
    }
    if (is_same(p, at->c, to))
      return;
    if (!(value_of(p, g, to) < at->value)) {
      damping = 10.0 * fmax(damping, 1e-12);
      continue;
    }
    memcpy(at->c, to, sizeof to);
    expand(p, g, at);
    damping = damping > 1e-12 ? 0.1 * damping : 0.0;
  }
}

/* Start number `which`: all alike, little of all, then mostly one. False when
 * there are no more. */
static bool start_at(const ef__recipe_search *p, size_t which, double *c) {
  if (which >= p->n + 2)
    return false;
  const double alike = which == 1 ? 0.02 : 1.0 / (double)(p->n + 1);
  for (size_t i = 0; i < p->n; i++) {
    c[i] = p->most * (which < 2 ? alike : 0.1 / (double)p->n);
    if (which == i + 2)
      c[i] += 0.7 * p->most;
  }
  return true;
}

void ef__recipe_least(ef__recipe_search *p, ef__recipe_goal g,
                      const double *start, double *c) {
  place best = {.value = HUGE_VAL}, at;
  if (start != NULL) {
    memcpy(at.c, start, p->n * sizeof *start);
    descend(p, g, &at);
    best = at;
  }
  for (size_t k = 0; start_at(p, k, at.c); k++) {
    descend(p, g, &at);
    if (at.value < best.value)
      best = at;
  }
  memcpy(c, best.c, p->n * sizeof *c);
}

/* ---- Whole steps -------------------------------------------------------- */

typedef struct steps {
  double size;
  double value;
  double c[MOST];
} steps;

/* Takes the concentrations over when they are allowed and better. */
static bool try_steps(ef__recipe_search *p, steps *best, const double *c) {
  double sum = 0.0;
  for (size_t i = 0; i < p->n; i++) {
    if (c[i] < 0.0)
      return false;
    sum += c[i];
  }
  /* Sums of steps round. */
  if (sum > p->most * (1.0 + 1e-12))
    return false;
  const double value = value_of(p, EF__GOAL_COLOUR, c);
  if (!(value < best->value))
    return false;
  best->value = value;
  memcpy(best->c, c, p->n * sizeof *c);
  return true;
}

static void round_all_ways(ef__recipe_search *p, const double *exact,
                           steps *best) {
  for (size_t ways = 0; ways < (size_t)1 << p->n; ways++) {
    double c[MOST];
    for (size_t i = 0; i < p->n; i++) {
      const double n_steps = floor(exact[i] / best->size);
      c[i] = best->size * (n_steps + (ways >> i & 1 ? 1.0 : 0.0));
    }
    try_steps(p, best, c);
  }
}

/* One step up or down of colourant i, none, and of j; true when any is
 * better. */
static bool move_pair(ef__recipe_search *p, steps *best, size_t i, size_t j) {
  for (int a = -1; a <= 1; a++) {
    for (int b = -1; b <= 1; b++) {
      double c[MOST];
      memcpy(c, best->c, sizeof c);
      /* From whole steps, not from sums: nothing adds up. */
      c[i] = best->size * (round(c[i] / best->size) + a);
      if (i != j)
        c[j] = best->size * (round(c[j] / best->size) + b);
      if (try_steps(p, best, c))
        return true;
    }
  }
  return false;
}

static bool move_any(ef__recipe_search *p, steps *best) {
  for (size_t i = 0; i < p->n; i++)
    for (size_t j = i; j < p->n; j++)
      if (move_pair(p, best, i, j))
        return true;
  return false;
}

void ef__recipe_whole_steps(ef__recipe_search *p, const double *exact,
                            double size, double *c) {
  steps best = {.size = size, .value = HUGE_VAL};
  round_all_ways(p, exact, &best); /* all down is always allowed */
  while (move_any(p, &best))
    ;
  memcpy(c, best.c, p->n * sizeof *c);
}
