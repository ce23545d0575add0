/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Missing and shifted pigments, and a picture of what they leave. Which pigment
 * stands in for which is in cones.c. */
#include <assert.h>
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/model_private.h"

enum { L, M, S };

/* ---- Colour-matching functions of a dichromat -------------------------- */

static double sum(size_t n, const double *value) {
  double total = 0;
  for (size_t i = 0; i < n; ++i) total += value[i];
  return total;
}

double ef__dichromat_scale(const ef__cones *cones, const ef_cone_model *model,
                           const ef__field *field) {
  enum { n = EF__TEMPLATE_SAMPLES };
  double own[3 * n], normal[3 * n];
  if (model->deficiency == EF_TRICHROMAT) return 1;
  assert(cones->n == n);
  ef_cone_model complete = *model;
  complete.deficiency = EF_TRICHROMAT;
  ef__cones_fundamentals(cones, model, EF_ENERGY, own);
  ef__cones_fundamentals(cones, &complete, EF_ENERGY, normal);
  if (model->deficiency == EF_PROTANOPE) return sum(n, normal) / sum(n, own);
  if (model->deficiency == EF_DEUTERANOPE) {
    return sum(n, normal + n) / sum(n, own + n);
  }
  const double *const luminance = field->matrix + 3;
  return sum(n, normal + 2 * n) /
         (luminance[L] * sum(n, own) + luminance[M] * sum(n, own + n));
}

/* ---- Anomalous trichromats --------------------------------------------- */

ef_status ef_cone_model_make_anomalous(ef_cone_model *model, ef_anomaly anomaly,
                                       double shift_nm, ef_error *error) {
  enum { MEETING_NM = 32 };
  const bool is_protan = anomaly == EF_PROTANOMALOUS;
  if (!(shift_nm > 0 && shift_nm <= MEETING_NM)) {
    return ef__error_set(error, EF_INVALID,
                         "a shift of %g nm of the %s pigment towards %s; it "
                         "must be above 0 and at most %d nm, where the two "
                         "meet",
                         shift_nm, is_protan ? "L" : "M", is_protan ? "M" : "L",
                         MEETING_NM);
  }
  if (model->deficiency != EF_TRICHROMAT) {
    return ef__error_set(error, EF_INVALID,
                         "a %s has no second pigment to shift one towards",
                         ef_deficiency_name(model->deficiency));
  }
  if (is_protan) {
    model->shift_nm[L] -= shift_nm;
  } else {
    model->shift_nm[M] += shift_nm;
  }
  return EF_OK;
}

/* ---- What a dichromat sees --------------------------------------------- */

static void cross(const double a[3], const double b[3], double out[3]) {
  out[0] = a[1] * b[2] - a[2] * b[1];
  out[1] = a[2] * b[0] - a[0] * b[2];
  out[2] = a[0] * b[1] - a[1] * b[0];
}

static void excite(const ef_observer *observer, double wavelength_nm,
                   double lms[3]) {
  const ef_channels cones = ef_observer_channels(observer, EF_CONES);
  const double place =
      (wavelength_nm - cones.grid.start_nm) / cones.grid.step_nm;
  const size_t i = (size_t)lround(place);
  for (size_t c = 0; c < 3; ++c) lms[c] = cones.value[c * cones.grid.count + i];
}

/* The cones a dichromat is without. */
static size_t missing_cone(ef_deficiency deficiency) {
  if (deficiency == EF_PROTANOPE) return L;
  return deficiency == EF_DEUTERANOPE ? M : S;
}

ef_status ef_dichromat_view_make(ef_deficiency deficiency,
                                 const ef_observer *observer,
                                 const double neutral[3],
                                 ef_dichromat_view *out, ef_error *error) {
  if (deficiency == EF_TRICHROMAT || ef_observer_dimensions(observer) != 3) {
    return ef__error_set(error, EF_INVALID,
                         "a dichromat's view is drawn for the eyes of a "
                         "trichromat: two observers are needed, one of each");
  }
  for (size_t i = 0; i < 3; ++i) {
    if (isfinite(neutral[i]) && neutral[i] > 0) continue;
    return ef__error_set(error, EF_INVALID,
                         "the neutral colour excites cone %zu by %g; all three "
                         "must be above 0",
                         i + 1, neutral[i]);
  }
  out->deficiency = deficiency;
  memcpy(out->neutral, neutral, sizeof out->neutral);
  const bool is_tritan = deficiency == EF_TRITANOPE;
  const double anchor_nm[2] = {is_tritan ? 485 : 475, is_tritan ? 660 : 575};
  for (size_t side = 0; side < 2; ++side) {
    double anchor[3];
    excite(observer, anchor_nm[side], anchor);
    cross(neutral, anchor, out->half_plane[side]);
  }
  return EF_OK;
}

/* Which side of the plane through the neutral and the missing axis a colour
 * lies on shows in the ratio of the two kinds of cones that are left: the one
 * more sensitive to long waves is in the denominator. */
void ef_dichromat_view_apply(const ef_dichromat_view *view, const double lms[3],
                             double out[3]) {
  const size_t axis = missing_cone(view->deficiency);
  const size_t below = axis == S ? M : S;
  const size_t above = axis == L ? M : L;
  const bool is_long = lms[below] * view->neutral[above] <
                       lms[above] * view->neutral[below];
  const double *const normal = view->half_plane[is_long ? 1 : 0];
  const double one = lms[below], other = lms[above];
  memmove(out, lms, 3 * sizeof *out);
  out[axis] = -(normal[below] * one + normal[above] * other) / normal[axis];
}
