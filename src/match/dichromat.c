/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From white to white for eyes with two kinds of cones. */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

#include "base/base_private.h"

enum { L, M, S };

/* Von Kries: each kind of cones is scaled by what it gets from the whites. */
static void scale_cones(const double from[3], const double to[3],
                        double lms[9]) {
  memset(lms, 0, 9 * sizeof *lms);
  for (int i = 0; i < 3; ++i) lms[4 * i] = to[i] / from[i];
}

/* A tritanope's third row repeats the luminance of the other two, on a scale
 * that the white tells. */
static void repeat_luminance(const double field_matrix[9],
                             const double from[3], double lms[9]) {
  const double *const y = field_matrix + 3;
  const double scale = from[S] / (y[L] * from[L] + y[M] * from[M]);
  lms[6] = scale * y[L] * lms[0];
  lms[7] = scale * y[M] * lms[4];
  lms[8] = 0;
}

ef_status ef__dichromat_adaptation(ef_deficiency deficiency,
                                   const double field_matrix[9], ef_xyz from,
                                   ef_xyz to, double matrix[9],
                                   ef_error *error) {
  const double white[2][3] = {{from.X, from.Y, from.Z}, {to.X, to.Y, to.Z}};
  double inverse[9], cones[2][3], lms[9];
  if (!ef__mat3_inverse(field_matrix, inverse)) {
    return ef__error_set(error, EF_INVALID, "the field's matrix is singular");
  }
  for (int w = 0; w < 2; ++w) {
    ef__mat3_apply(inverse, white[w], cones[w]);
    for (int i = 0; i < 3; ++i) {
      if (isfinite(cones[w][i]) && cones[w][i] > 0) continue;
      return ef__error_set(error, EF_INVALID,
                           "white %d excites cone %d by %g; all three must be "
                           "above 0",
                           w + 1, i + 1, cones[w][i]);
    }
  }
  scale_cones(cones[0], cones[1], lms);
  if (deficiency == EF_TRITANOPE) {
    repeat_luminance(field_matrix, cones[0], lms);
  }
  ef__mat3_multiply(lms, inverse, lms);
  ef__mat3_multiply(field_matrix, lms, matrix);
  return EF_OK;
}

ef_status ef_match_adaptation(const ef_observer *observer,
                              ef_adaptation adaptation, ef_xyz from, ef_xyz to,
                              double matrix[9], ef_error *error) {
  double field_matrix[9];
  ef_cone_model model;
  const bool is_flat = ef_observer_dimensions(observer) < 3 &&
                       ef_observer_model(observer, &model);
  if (!is_flat || adaptation == EF_ADAPT_NONE) {
    return ef_adaptation_matrix(adaptation, from, to, matrix, error);
  }
  const ef_status status =
      ef_cone_xyz_matrix(model.field_deg, field_matrix, NULL, error);
  if (status != EF_OK) return status;
  return ef__dichromat_adaptation(model.deficiency, field_matrix, from, to,
                                  matrix, error);
}
