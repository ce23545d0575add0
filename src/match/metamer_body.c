/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <string.h>

#include "match/metamer_private.h"
#include "match/sphere.h"

enum {
  FIRST_LEVEL = 1, /* 42 directions, to learn the shape of the body */
  CHUNK = 32       /* directions that follow one another */
};

typedef struct work {
  ef_metamer_set *set;
  double (*direction)[3]; /* of the unit sphere */
  double shape[9];        /* unit sphere to directions in X, Y, Z, row-major */
  atomic_int end;         /* an ef__simplex_end that was not the best */
  atomic_bool no_memory;
} work;

/* ---- The shape of the body --------------------------------------------- */

/* Normal of a plane that touches the sphere there, after the sphere has been
 * shaped: the inverse transpose, up to a factor (the cofactors). */
static void turn_normal(const work *w, const double on_sphere[3], double n[3]) {
  const double *const m = w->shape;
  const double cofactor[9] = {
      m[4] * m[8] - m[5] * m[7], m[5] * m[6] - m[3] * m[8],
      m[3] * m[7] - m[4] * m[6], m[2] * m[7] - m[1] * m[8],
      m[0] * m[8] - m[2] * m[6], m[1] * m[6] - m[0] * m[7],
      m[1] * m[5] - m[2] * m[4], m[2] * m[3] - m[0] * m[5],
      m[0] * m[4] - m[1] * m[3]};
  ef__mat3_apply(cofactor, on_sphere, n);
}

/* Centre: the mean of n points. Shape: a triangular root of their covariance.
 * False for a flat body: some extent is below a millionth. */
static bool learn_shape(work *w, size_t n, double (*point)[3]) {
  double mean[3] = {0}, v[9] = {0}, *const m = w->shape;
  for (size_t i = 0; i < n; ++i) {
    for (size_t k = 0; k < 3; ++k)
      mean[k] += point[i][k] / (double)n;
  }
  for (size_t i = 0; i < n; ++i) {
    const double *const q = point[i];
    for (size_t k = 0; k < 9; ++k)
      v[k] += (q[k / 3] - mean[k / 3]) * (q[k % 3] - mean[k % 3]) / (double)n;
  }
  w->set->body.center = (ef_xyz){mean[0], mean[1], mean[2]};
  memset(m, 0, sizeof w->shape);
  for (size_t r = 0; r < 3; ++r) {
    for (size_t c = 0; c <= r; ++c) {
      double sum = v[3 * r + c];
      for (size_t k = 0; k < c; ++k)
        sum -= m[3 * r + k] * m[3 * c + k];
      if (r == c && !(sum > 1e-12))
        return false;
      m[3 * r + c] = r == c ? sqrt(sum) : sum / m[3 * c + c];
    }
  }
  return true;
}

/* Two rounds of touching planes: round about any body, then about one that the
 * first has made as good as round. */
static void explore(work *w, ef__metamer_bench *bench, double (*point)[3]) {
  const size_t n = ef__sphere_points(FIRST_LEVEL);
  double unused[4], normal[3];
  for (size_t k = 0; k < 9; ++k)
    w->shape[k] = k % 4 == 0;
  for (int round = 0; round < 2; ++round) {
    for (size_t i = 0; i < n; ++i) {
      turn_normal(w, w->direction[i], normal);
      const ef__simplex_end end =
          ef__metamer_touch(w->set, bench, normal, point[i], unused);
      if (end == EF__SIMPLEX_BEST)
        continue;
      w->end = (int)end;
      return;
    }
    w->set->body.is_flat = !learn_shape(w, n, point);
    if (w->set->body.is_flat)
      return;
  }
}

/* ---- The boundary ------------------------------------------------------ */

static void sample_range(void *context, size_t begin, size_t end) {
  work *const w = context;
  ef_metamer_set *const set = w->set;
  const bool flat = set->body.is_flat;
  ef__metamer_bench bench;
  const bool has_memory = ef__metamer_bench_set(set, !flat, &bench);
  if (!has_memory)
    w->no_memory = true;
  for (size_t i = begin; i < end && has_memory; ++i) {
    double u[3];
    ef__mat3_apply(w->shape, w->direction[i], u);
    const ef__simplex_end found =
        flat ? ef__metamer_touch(set, &bench, w->direction[i], set->point[i],
                                 set->plane[i])
             : ef__metamer_reach(set, &bench, u, set->point[i], set->plane[i]);
    if (found != EF__SIMPLEX_BEST)
      w->end = (int)found;
    memcpy(set->spectrum + i * set->n_samples, bench.x,
           set->n_samples * sizeof *bench.x);
  }
  ef__metamer_bench_clear(&bench);
}

/* ---- Volumes ----------------------------------------------------------- */

static double determinant(const double a[3], const double b[3],
                          const double c[3]) {
  const double m[9] = {a[0], a[1], a[2], b[0], b[1], b[2], c[0], c[1], c[2]};
  return ef__mat3_determinant(m);
}

/* The corner of the body in the cone of a triangle lies within the cone up to
 * any of its three planes: the least of them. */
static double cone_volume(const ef_metamer_set *set, const size_t *corner) {
  const ef_xyz c = set->body.center;
  double ray[3][3], least = (double)INFINITY;
  for (size_t i = 0; i < 3; ++i) {
    const double *const p = set->point[corner[i]];
    ray[i][0] = p[0] - c.X;
    ray[i][1] = p[1] - c.Y;
    ray[i][2] = p[2] - c.Z;
  }
  const double volume = determinant(ray[0], ray[1], ray[2]) / 6;
  for (size_t i = 0; i < 3; ++i) {
    const double *const plane = set->plane[corner[i]];
    const double room = plane[3] - plane[0] * c.X - plane[1] * c.Y -
                        plane[2] * c.Z;
    double stretch = volume;
    for (size_t k = 0; k < 3; ++k) {
      const double along = plane[0] * ray[k][0] + plane[1] * ray[k][1] +
                           plane[2] * ray[k][2];
      stretch = along > 0 ? stretch * room / along : (double)INFINITY;
      if (!isfinite(stretch))
        break;
    }
    least = fmin(least, stretch);
  }
  return least;
}

static void lab_ray(ef_xyz xyz, const ef_metamer_body *body, double out[3]) {
  const ef_lab a = ef_xyz_to_lab(xyz, body->white);
  const ef_lab b = ef_xyz_to_lab(body->center, body->white);
  out[0] = a.L_star - b.L_star;
  out[1] = a.a_star - b.a_star;
  out[2] = a.b_star - b.b_star;
}

static void measure(ef_metamer_set *set) {
  ef_metamer_body *const body = &set->body;
  const double *const c = (const double[3]){body->center.X, body->center.Y,
                                            body->center.Z};
  for (size_t t = 0; t < set->n_triangles; ++t) {
    const size_t *const corner = set->corner + 3 * t;
    double ray[3][3], lab[3][3];
    for (size_t i = 0; i < 3; ++i) {
      for (size_t k = 0; k < 3; ++k)
        ray[i][k] = set->point[corner[i]][k] - c[k];
      lab_ray(ef_metamer_set_point(set, corner[i]), body, lab[i]);
    }
    body->volume_low += determinant(ray[0], ray[1], ray[2]) / 6;
    body->volume_lab += determinant(lab[0], lab[1], lab[2]) / 6;
    body->volume_high += cone_volume(set, corner);
  }
  body->volume_lab = fabs(body->volume_lab);
}

/* ---- All of it --------------------------------------------------------- */

static ef_status status_of(const work *w, ef_error *error) {
  const double *const z = w->set->right;
  if (w->no_memory)
    return ef__error_memory(error, "a metamer mismatch body");
  if (w->end == EF__SIMPLEX_INFEASIBLE)
    return ef__error_set(
        error, EF_NO_ANSWER,
        "no surface with reflectances from %g to %g has X %.4f, Y %.4f, Z %.4f "
        "under the reference look%s",
        w->set->low[0], w->set->high[0], z[0], z[1], z[2],
        w->set->n_rows > 3 ? " and its colours under the others" : "");
  if (w->end != EF__SIMPLEX_BEST)
    return ef__error_set(error, EF_NO_ANSWER,
                         "the boundary of the metamer mismatch body was not "
                         "found: the samples of the reflectance are too close "
                         "for double precision");
  return EF_OK;
}

ef_status ef__metamer_build(ef_metamer_set *set, int level, int jobs,
                            ef_error *error) {
  const int larger = level > FIRST_LEVEL ? level : FIRST_LEVEL;
  const size_t n = ef__sphere_points(larger);
  double(*point)[3];
  size_t *corner, *scratch;
  work w = {.set = set};
  const ef__part parts[] = {
      {&w.direction, n, sizeof *w.direction},
      {&point, n, sizeof *point},
      {&scratch, 12 * n, sizeof *scratch},
      {&corner, 3 * ef__sphere_triangles(larger), sizeof *corner}};
  void *const block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  ef__metamer_bench bench;
  const bool has_memory = ef__metamer_bench_set(set, false, &bench);
  w.no_memory = block == NULL || !has_memory;
  if (!w.no_memory) {
    ef__sphere_set(FIRST_LEVEL, w.direction, corner, scratch);
    explore(&w, &bench, point);
  }
  ef__metamer_bench_clear(&bench);
  if (!w.no_memory && w.end == EF__SIMPLEX_BEST) {
    ef__sphere_set(level, w.direction, set->corner, scratch);
    ef__parallel_for(set->n_points, CHUNK, jobs, sample_range, &w);
  }
  free(block);
  const ef_status status = status_of(&w, error);
  if (status != EF_OK || set->body.is_flat)
    return status;
  set->n_triangles = ef__sphere_triangles(level);
  measure(set);
  return EF_OK;
}
