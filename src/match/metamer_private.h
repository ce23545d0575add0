/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Metamer mismatch bodies as linear programmes. With the reflectances as
 * unknowns, "matches under the references" are rows, and so is "lies in
 * direction u from the centre at the distance t": the largest t is a point of
 * the boundary, and the prices of the rows are a plane that no metamer
 * passes. */
#ifndef EVENFIELD_METAMER_PRIVATE_H
#define EVENFIELD_METAMER_PRIVATE_H

#include <evenfield/match.h>

#include "base/base_private.h"

enum { EF__METAMER_ROWS = 3 * EF_METAMER_LOOKS };

struct ef_metamer_set {
  size_t n_samples;
  size_t n_rows;  /**< of the references */
  double *column; /**< n_samples x n_rows: colours under the references */
  double *test;   /**< n_samples x 3: colours under the test look */
  double right[EF__METAMER_ROWS];
  double *low, *high; /**< n_samples, then of the distance */
  ef_metamer_body body;
  size_t n_points, n_triangles;
  double (*point)[3];
  double (*plane)[4]; /**< unit normal, distance from the origin */
  double *spectrum;   /**< n_points x n_samples */
  size_t *corner;
};

/* ---- One direction (metamer_ray.c) ------------------------------------- */

/** What one thread needs to solve programmes with `n_rows` rows and
 * `n_columns` columns. */
typedef struct ef__metamer_bench {
  ef__simplex *simplex;
  double *x, *cost; /**< n_columns */
  double *column;   /**< n_columns x n_rows; used by ef__metamer_reach */
  void *block;
} ef__metamer_bench;

/** False without memory; cleared either way. With `reaches` for
 * ef__metamer_reach, else for ef__metamer_touch. */
bool ef__metamer_bench_set(const ef_metamer_set *set, bool reaches,
                           ef__metamer_bench *out);
void ef__metamer_bench_clear(ef__metamer_bench *bench);

/** The metamer whose colour is furthest along `normal`: its reflectances are
 * then in bench->x. `plane` touches the body there. */
ef__simplex_end ef__metamer_touch(const ef_metamer_set *set,
                                  ef__metamer_bench *bench,
                                  const double normal[3], double point[3],
                                  double plane[4]);
/** The one furthest from the centre in direction `u`. */
ef__simplex_end ef__metamer_reach(const ef_metamer_set *set,
                                  ef__metamer_bench *bench, const double u[3],
                                  double point[3], double plane[4]);

/* ---- The whole body (metamer_body.c) ----------------------------------- */

/** Learns where the body is and how it is shaped, then fills points, planes,
 * spectra, triangles and volumes. */
ef_status ef__metamer_build(ef_metamer_set *set, int level, int jobs,
                            ef_error *error);

#endif
