/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From the cone fundamentals of any field to colour-matching functions. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/model_private.h"
#include "observer/observer_private.h"

enum { Y_ROW = 3 }; /* where the row of y starts in a matrix */

ef_grid ef__template_grid(void) {
  const double first = EF__TEMPLATE_FIRST_NM, last = EF__TEMPLATE_LAST_NM;
  const size_t count = EF__TEMPLATE_SAMPLES;
  return (ef_grid){.count = count,
                   .start_nm = first,
                   .step_nm = (last - first) / (double)(count - 1)};
}

/* Sums of x_F, y_F, z_F of the mean observer of a field. */
static void sum_mean(const ef__cones *cones, double field_deg,
                     const double matrix[9], double *scratch, double sum[3]) {
  ef_cone_model model = ef_cone_model_default();
  model.field_deg = field_deg;
  ef__cones_fundamentals(cones, &model, EF_ENERGY, scratch);
  double lms[3] = {0};
  for (size_t c = 0; c < 3; ++c) {
    for (size_t i = 0; i < cones->n; ++i) lms[c] += scratch[c * cones->n + i];
  }
  ef__mat3_apply(matrix, lms, sum);
}

static double mix(double a, double b, double t) {
  return a + t * (b - a);
}

/* 0 at 2 degrees and below, 1 at 10, in proportion to the macular pigment. */
static double position(double field_deg) {
  const double at_2 = exp(-2 / 6.132), at_10 = exp(-10 / 6.132);
  const double t = (at_2 - exp(-field_deg / 6.132)) / (at_2 - at_10);
  return t > 0 ? t : 0;
}

/* Scales the rows of x and z. What the sums of the two published matrices are
 * off by with the model's fundamentals (2e-4, the digits of the templates) is
 * left as it is at 2 and 10 degrees and interpolated between. */
static void balance_rows(const ef__cones *cones, double field_deg, double t,
                         double *scratch, double matrix[9]) {
  const double at_deg[3] = {2, 10, field_deg};
  const double *const of[3] = {ef__cone_field_2.to_xyz,
                               ef__cone_field_10.to_xyz, matrix};
  double sum[3][3];
  for (size_t k = 0; k < 3; ++k) {
    sum_mean(cones, at_deg[k], of[k], scratch, sum[k]);
  }
  for (size_t c = 0; c < 3; c += 2) {
    const double kept = mix(sum[0][c] / sum[0][1], sum[1][c] / sum[1][1], t);
    const double factor = kept * sum[2][1] / sum[2][c];
    for (size_t i = 0; i < 3; ++i) matrix[3 * c + i] *= factor;
  }
}

static ef_status balance(double field_deg, double t, double matrix[9],
                         ef_error *error) {
  const ef_grid grid = ef__template_grid();
  ef__cones *cones = NULL;
  ef_status status = ef__cones_new(&grid, &cones, error);
  if (status != EF_OK) return status;
  double *const scratch = ef__allocate(3 * cones->n, sizeof *scratch);
  if (scratch == NULL) {
    status = ef__error_memory(error, "matrix of a field");
  } else {
    balance_rows(cones, field_deg, t, scratch, matrix);
  }
  free(scratch);
  free(cones);
  return status;
}

ef_status ef__field_find(double field_deg, ef__field *field, ef_error *error) {
  const ef__cone_field *const small = &ef__cone_field_2;
  const ef__cone_field *const large = &ef__cone_field_10;
  const double t = position(field_deg);
  for (size_t i = 0; i < 9; ++i) {
    field->matrix[i] = mix(small->to_xyz[i], large->to_xyz[i], t);
  }
  field->k_m = mix(small->k_m, large->k_m, t);
  if (field_deg == small->field_deg) return EF_OK;
  if (field_deg == large->field_deg) {
    memcpy(field->matrix, large->to_xyz, sizeof field->matrix);
    field->k_m = large->k_m;
    return EF_OK;
  }
  return balance(field_deg, t, field->matrix, error);
}

ef_status ef_cone_xyz_matrix(double field_deg, double matrix[9], double *k_m,
                             ef_error *error) {
  ef_cone_model model = ef_cone_model_default();
  model.field_deg = field_deg;
  ef__field field;
  ef_status status = ef_cone_model_check(&model, error);
  if (status == EF_OK) status = ef__field_find(field_deg, &field, error);
  if (status != EF_OK) return status;
  memcpy(matrix, field.matrix, sizeof field.matrix);
  if (k_m != NULL) *k_m = field.k_m;
  return EF_OK;
}

/* ---- Colour-matching functions ----------------------------------------- */

void ef__field_tristimulus(const ef__field *field, size_t n,
                           ef_deficiency deficiency, double scale,
                           const double *fundamental, double *out) {
  const double *const luminance = field->matrix + Y_ROW;
  for (size_t i = 0; i < n; ++i) {
    double lms[3] = {fundamental[i], fundamental[n + i],
                     fundamental[2 * n + i]};
    if (deficiency == EF_PROTANOPE) lms[0] *= scale;
    if (deficiency == EF_DEUTERANOPE) lms[1] *= scale;
    if (deficiency == EF_TRITANOPE) {
      lms[2] = scale * (luminance[0] * lms[0] + luminance[1] * lms[1]);
    }
    double xyz[3];
    ef__mat3_apply(field->matrix, lms, xyz);
    for (size_t c = 0; c < 3; ++c) out[c * n + i] = xyz[c];
  }
}

/* ef__dichromat_scale with the cones it needs. */
static ef_status find_scale(const ef_cone_model *model, const ef__field *field,
                            double *scale, ef_error *error) {
  const ef_grid grid = ef__template_grid();
  ef__cones *cones = NULL;
  *scale = 1;
  if (model->deficiency == EF_TRICHROMAT) return EF_OK;
  const ef_status status = ef__cones_new(&grid, &cones, error);
  if (status != EF_OK) return status;
  *scale = ef__dichromat_scale(cones, model, field);
  free(cones);
  return EF_OK;
}

ef_status ef_cone_model_tristimulus(const ef_cone_model *model,
                                    const ef_grid *grid, double *out,
                                    ef_error *error) {
  ef__field field;
  double scale;
  ef_status status = ef_cone_model_check(model, error);
  if (status == EF_OK) {
    status = ef__field_find(model->field_deg, &field, error);
  }
  if (status == EF_OK) status = find_scale(model, &field, &scale, error);
  if (status == EF_OK) {
    status = ef_cone_model_fundamentals(model, EF_ENERGY, grid, out, error);
  }
  if (status != EF_OK) return status;
  ef__field_tristimulus(&field, grid->count, model->deficiency, scale, out,
                        out);
  return EF_OK;
}
