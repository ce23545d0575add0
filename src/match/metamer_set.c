/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Metamer sets: making them and asking them. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "match/metamer_private.h"
#include "match/sphere.h"

enum { MOST_SAMPLES = 1000 };

/* ---- Making one -------------------------------------------------------- */

ef_metamer_settings ef_metamer_settings_default(void) {
  return (ef_metamer_settings){.grid = {.count = 81,
                                        .start_nm = 380,
                                        .step_nm = 5},
                               .low = 0,
                               .high = 1,
                               .level = 3};
}

static ef_status check_settings(const ef_metamer_settings *settings,
                                size_t n_references, ef_error *error) {
  const ef_status status = ef_grid_check(&settings->grid, error);
  if (status != EF_OK)
    return status;
  if (settings->grid.count > MOST_SAMPLES)
    return ef__error_set(error, EF_INVALID,
                         "%zu samples of a reflectance, expected at most %d",
                         settings->grid.count, MOST_SAMPLES);
  if (n_references < 1 || n_references > EF_METAMER_LOOKS)
    return ef__error_set(error, EF_INVALID,
                         "%zu looks to match under, expected 1 to %d",
                         n_references, EF_METAMER_LOOKS);
  if (settings->level < 0 || settings->level > EF__SPHERE_LEVELS)
    return ef__error_set(error, EF_INVALID,
                         "level %d of directions, expected 0 to %d",
                         settings->level, EF__SPHERE_LEVELS);
  if (!(settings->low >= 0) || !(settings->low < settings->high) ||
      !isfinite(settings->high))
    return ef__error_set(error, EF_INVALID,
                         "reflectances from %g to %g, expected limits from 0 "
                         "in increasing order",
                         settings->low, settings->high);
  return EF_OK;
}

/* Colours of the samples under a look: `out` has a sample every `stride`. */
static ef_status look_at(const ef_look *look,
                         const ef_metamer_settings *settings, double *out,
                         size_t stride, ef_error *error) {
  if (look->viewing.kind != EF_SURFACE || look->viewing.illuminant == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a look at lights has no metamers among surfaces: "
                         "give its illuminant");
  ef_viewing viewing = look->viewing;
  viewing.interpolation = EF_INTERPOLATE_LINEAR; /* keeps to the limits */
  viewing.extension = EF_EXTEND_HOLD;
  viewing.correct_bandpass = false;
  ef_error why;
  ef_weights *const weights =
      ef_observer_weights(look->observer, EF_TRISTIMULUS, &settings->grid,
                          &viewing, settings->notes, &why);
  if (weights == NULL) {
    if (error != NULL)
      *error = why;
    return why.status;
  }
  const double *const matrix = ef_weights_matrix(weights);
  const size_t n = settings->grid.count;
  for (size_t j = 0; j < n; ++j) {
    for (size_t k = 0; k < 3; ++k)
      out[j * stride + k] = matrix[k * n + j];
  }
  ef_weights_free(weights);
  return EF_OK;
}

/* A block with the set and its arrays: one free() releases all. */
static ef_metamer_set *set_new(const ef_metamer_settings *settings,
                               size_t n_references) {
  ef_metamer_set *set;
  ef_metamer_set filled = {.n_samples = settings->grid.count,
                           .n_rows = 3 * n_references,
                           .n_points = ef__sphere_points(settings->level)};
  const size_t n = filled.n_samples, n_points = filled.n_points;
  const ef__part parts[] = {
      {&set, 1, sizeof *set},
      {&filled.column, n * filled.n_rows, sizeof(double)},
      {&filled.test, 3 * n, sizeof(double)},
      {&filled.low, n + 1, sizeof(double)},
      {&filled.high, n + 1, sizeof(double)},
      {&filled.point, n_points, sizeof *filled.point},
      {&filled.plane, n_points, sizeof *filled.plane},
      {&filled.spectrum, n_points * n, sizeof(double)},
      {&filled.corner, 3 * ef__sphere_triangles(settings->level),
       sizeof *filled.corner}};
  if (ef__allocate_block(sizeof parts / sizeof parts[0], parts) == NULL)
    return NULL;
  for (size_t j = 0; j < n; ++j) {
    filled.low[j] = settings->low;
    filled.high[j] = settings->high;
  }
  filled.high[n] = 100; /* of the body's own extents: more than any body has */
  *set = filled;
  return set;
}

static ef_status look_at_all(ef_metamer_set *set,
                             const ef_metamer_settings *settings,
                             size_t n_references, const ef_look *reference,
                             const ef_xyz *xyz, const ef_look *test,
                             ef_error *error) {
  for (size_t r = 0; r < n_references; ++r) {
    if (!isfinite(xyz[r].X) || !isfinite(xyz[r].Y) || !isfinite(xyz[r].Z))
      return ef__error_set(error, EF_INVALID,
                           "the colour under look %zu is not a number", r + 1);
    const ef_status status = look_at(&reference[r], settings,
                                     set->column + 3 * r, set->n_rows, error);
    if (status != EF_OK)
      return status;
    memcpy(set->right + 3 * r, (double[3]){xyz[r].X, xyz[r].Y, xyz[r].Z},
           3 * sizeof *set->right);
  }
  ef_status status = look_at(test, settings, set->test, 3, error);
  double white[3];
  if (status == EF_OK)
    status = ef_observer_white(test->observer, EF_TRISTIMULUS,
                               test->viewing.illuminant,
                               &test->viewing.working, white, error);
  if (status == EF_OK)
    set->body.white = (ef_xyz){white[0], white[1], white[2]};
  return status;
}

ef_metamer_set *ef_metamer_set_new(size_t n_references,
                                   const ef_look *reference, const ef_xyz *xyz,
                                   const ef_look *test,
                                   const ef_metamer_settings *settings,
                                   int jobs, ef_error *error) {
  if (check_settings(settings, n_references, error) != EF_OK)
    return NULL;
  ef_metamer_set *const set = set_new(settings, n_references);
  if (set == NULL) {
    ef__error_memory(error, "a metamer mismatch body");
    return NULL;
  }
  ef_status status = look_at_all(set, settings, n_references, reference, xyz,
                                 test, error);
  if (status == EF_OK)
    status = ef__metamer_build(set, settings->level, jobs, error);
  if (status == EF_OK)
    return set;
  ef_metamer_set_free(set);
  return NULL;
}

void ef_metamer_set_free(ef_metamer_set *set) {
  free(set);
}

/* ---- Asking it --------------------------------------------------------- */

ef_metamer_body ef_metamer_set_body(const ef_metamer_set *set) {
  return set->body;
}

size_t ef_metamer_set_count(const ef_metamer_set *set) {
  return set->n_points;
}

ef_xyz ef_metamer_set_point(const ef_metamer_set *set, size_t i) {
  return (ef_xyz){set->point[i][0], set->point[i][1], set->point[i][2]};
}

const double *ef_metamer_set_spectrum(const ef_metamer_set *set, size_t i) {
  return set->spectrum + i * set->n_samples;
}

size_t ef_metamer_set_triangles(const ef_metamer_set *set,
                                const size_t **corner) {
  *corner = set->corner;
  return set->n_triangles;
}

double ef_metamer_set_outside(const ef_metamer_set *set, ef_xyz xyz) {
  double most = -(double)INFINITY;
  for (size_t i = 0; i < set->n_points; ++i) {
    const double *const p = set->plane[i];
    most = fmax(most, p[0] * xyz.X + p[1] * xyz.Y + p[2] * xyz.Z - p[3]);
  }
  return most;
}
