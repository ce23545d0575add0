/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The formulas by name, and the calls that go through their tables. */
#include "difference/difference_private.h"

#include "base/base_private.h"

#include <math.h>
#include <string.h>

/* Every formula, in the order outputs list them. */
static const ef_metric *const formulas[] = {
    &ef__metric_cielab,    &ef__metric_cieluv,    &ef__metric_cie94,
    &ef__metric_cmc,       &ef__metric_ciede2000, &ef__metric_din99o,
    &ef__metric_cam02_ucs, &ef__metric_cam16_ucs, &ef__metric_itp,
};
enum { N_FORMULAS = sizeof formulas / sizeof formulas[0] };

size_t ef_metric_count(void) { return N_FORMULAS; }

const ef_metric *ef_metric_at(size_t i) {
  return i < N_FORMULAS ? formulas[i] : NULL;
}

const ef_metric *ef__metric_find(const char *name, size_t length,
                                 ef_error *error) {
  enum { LONGEST = 63 }; /* what an error quotes */
  char whole[LONGEST + 1];
  const size_t kept = length < LONGEST ? length : LONGEST;
  memcpy(whole, name, kept);
  whole[kept] = '\0';
  const char *known[N_FORMULAS];
  for (size_t i = 0; i < N_FORMULAS; ++i) {
    known[i] = formulas[i]->name;
    if (ef__name_equal(whole, known[i])) return formulas[i];
  }
  ef__error_unknown(error, "difference formula", whole, known, N_FORMULAS);
  return NULL;
}

const ef_metric *ef_metric_find(const char *name, ef_error *error) {
  if (name == NULL) name = "";
  return ef__metric_find(name, strlen(name), error);
}

const char *ef_metric_name(const ef_metric *metric) { return metric->name; }
const char *ef_metric_title(const ef_metric *metric) { return metric->title; }
const char *ef_metric_symbol(const ef_metric *metric) {
  return metric->symbol;
}
const char *ef_metric_source(const ef_metric *metric) {
  return metric->source;
}
ef_jnd ef_metric_jnd(const ef_metric *metric) { return metric->jnd; }
bool ef_metric_symmetric(const ef_metric *metric) {
  return !metric->asymmetric;
}

void ef_metric_coordinates(const ef_metric *metric, ef_xyz xyz,
                           const ef_conditions *conditions,
                           double coordinate[3]) {
  metric->coordinates(metric, xyz, conditions, coordinate);
}

typedef struct coordinate_batch {
  const ef_metric *metric;
  const ef_conditions *conditions;
  const double *xyz;
  double *coordinate;
} coordinate_batch;

static void coordinate_range(void *context, size_t begin, size_t end) {
  const coordinate_batch *const b = context;
  const ef_metric *const metric = b->metric;
  if (metric->coordinates_of_many != NULL) {
    metric->coordinates_of_many(metric, end - begin, b->xyz + 3 * begin,
                                b->conditions, b->coordinate + 3 * begin);
    return;
  }
  for (size_t i = begin; i < end; ++i) {
    const double *const v = b->xyz + 3 * i;
    metric->coordinates(metric, (ef_xyz){v[0], v[1], v[2]}, b->conditions,
                        b->coordinate + 3 * i);
  }
}

void ef_metric_coordinates_batch(const ef_metric *metric, size_t n,
                                 const double *xyz,
                                 const ef_conditions *conditions, int jobs,
                                 double *coordinate) {
  enum { CHUNK = 4096 };
  coordinate_batch b = {metric, conditions, xyz, coordinate};
  ef__parallel_for(n, CHUNK, jobs, coordinate_range, &b);
}

ef_xyz ef_metric_xyz(const ef_metric *metric, const double coordinate[3],
                     const ef_conditions *conditions) {
  return metric->inverse(metric, coordinate, conditions);
}

void ef_metric_jacobian(const ef_metric *metric, ef_xyz xyz,
                        const ef_conditions *conditions, double jacobian[9]) {
  metric->jacobian(metric, xyz, conditions, jacobian);
}

double ef_metric_difference(const ef_metric *metric, const double reference[3],
                            const double sample[3]) {
  return metric->difference(metric, reference, sample);
}

double ef_metric_components(const ef_metric *metric, const double reference[3],
                            const double sample[3],
                            ef_components *components) {
  return metric->components(metric, reference, sample, components);
}

void ef_metric_tensor(const ef_metric *metric, const double coordinate[3],
                      double tensor[9]) {
  metric->tensor(metric, coordinate, tensor);
}

typedef struct batch {
  const ef_metric *metric;
  const double *reference;
  const double *sample;
  double *difference;
} batch;

static void batch_range(void *context, size_t begin, size_t end) {
  const batch *const b = context;
  const ef_metric *const metric = b->metric;
  if (metric->differences != NULL) {
    metric->differences(metric, end - begin, b->reference + 3 * begin,
                        b->sample + 3 * begin, b->difference + begin);
    return;
  }
  for (size_t i = begin; i < end; ++i) {
    b->difference[i] =
        metric->difference(metric, b->reference + 3 * i, b->sample + 3 * i);
  }
}

void ef_metric_difference_batch(const ef_metric *metric, size_t n,
                                const double *reference, const double *sample,
                                int jobs, double *difference) {
  enum { CHUNK = 16384 }; /* some 0.1 to 0.3 ms of work: enough for a thread */
  batch b = {metric, reference, sample, difference};
  ef__parallel_for(n, CHUNK, jobs, batch_range, &b);
}

static double square_at(const ef_metric *metric, const double reference[3],
                        const double sample[3], const double step[3]) {
  const double moved[3] = {sample[0] + step[0], sample[1] + step[1],
                           sample[2] + step[2]};
  const double d = metric->difference(metric, reference, moved);
  return d * d;
}

/* Central differences; coordinates of every formula run to about 100, so that
 * one step serves all. */
static void expand_numerically(const ef_metric *metric,
                               const double reference[3],
                               const double sample[3], ef__expansion *out) {
  const double step = 1e-3;
  const double none[3] = {0, 0, 0};
  out->square = square_at(metric, reference, sample, none);
  for (int i = 0; i < 3; ++i) {
    double d[3] = {0, 0, 0};
    d[i] = step;
    const double up = square_at(metric, reference, sample, d);
    d[i] = -step;
    const double down = square_at(metric, reference, sample, d);
    out->gradient[i] = (up - down) / (2 * step);
    out->hessian[4 * i] = (up - 2 * out->square + down) / (step * step);
    for (int k = 0; k < i; ++k) {
      double s[4];
      for (int corner = 0; corner < 4; ++corner) {
        d[i] = corner & 1 ? step : -step;
        d[k] = corner & 2 ? step : -step;
        s[corner] = square_at(metric, reference, sample, d);
      }
      d[k] = 0;
      out->hessian[3 * i + k] = out->hessian[3 * k + i] =
          (s[3] - s[2] - s[1] + s[0]) / (4 * step * step);
    }
  }
}

void ef__metric_expand(const ef_metric *metric, const double reference[3],
                       const double sample[3], ef__expansion *out) {
  if (metric->expand != NULL) {
    metric->expand(metric, reference, sample, out);
  } else {
    expand_numerically(metric, reference, sample, out);
  }
}

void ef__metric_carry(const ef_metric *metric, ef_xyz xyz,
                      const double sample[3], const ef_conditions *conditions,
                      const ef__expansion *in, ef__expansion *out) {
  if (metric->carry != NULL) {
    metric->carry(metric, sample, conditions, in, out);
    return;
  }
  double j[9], transposed[9], hj[9];
  metric->jacobian(metric, xyz, conditions, j);
  ef__mat3_transpose(j, transposed);
  ef__mat3_apply(transposed, in->gradient, out->gradient);
  ef__mat3_multiply(in->hessian, j, hj);
  ef__mat3_multiply(transposed, hj, out->hessian);
  out->square = in->square;
}
