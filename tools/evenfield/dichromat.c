/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "dichromat.h"

#include "message.h"

static ef_deficiency deficiency_of(int seen_by) {
  static const ef_deficiency kinds[] = {EF_PROTANOPE, EF_DEUTERANOPE,
                                        EF_TRITANOPE};
  return kinds[seen_by];
}

const char *dichromat_name(int seen_by) {
  return ef_deficiency_name(deficiency_of(seen_by));
}

/* By cofactors. */
static ef_status invert(const double m[9], double out[9], ef_error *error) {
  for (size_t i = 0; i < 3; ++i) {
    const size_t a = (i + 1) % 3, b = (i + 2) % 3;
    for (size_t k = 0; k < 3; ++k) {
      const size_t c = (k + 1) % 3, d = (k + 2) % 3;
      out[3 * k + i] =
          m[3 * a + c] * m[3 * b + d] - m[3 * a + d] * m[3 * b + c];
    }
  }
  const double determinant = m[0] * out[0] + m[1] * out[3] + m[2] * out[6];
  if (determinant == 0.0) {
    return message_fail(error, EF_NO_ANSWER,
                        "the cones of this observer do not tell colours apart");
  }
  for (size_t i = 0; i < 9; ++i)
    out[i] /= determinant;
  return EF_OK;
}

ef_status dichromat_init(dichromat *d, int seen_by, const ef_observer *observer,
                         ef_xyz white, ef_error *error) {
  ef_status status =
      ef_observer_cone_matrix(observer, d->to_cones, NULL, error);
  if (status == EF_OK)
    status = invert(d->to_cones, d->from_cones, error);
  if (status != EF_OK)
    return status;
  const ef_xyz cones = ef_xyz_transform(d->to_cones, white);
  const double neutral[3] = {cones.X, cones.Y, cones.Z};
  return ef_dichromat_view_make(deficiency_of(seen_by), observer, neutral,
                                &d->view, error);
}

ef_xyz dichromat_see(const dichromat *d, ef_xyz colour) {
  const ef_xyz cones = ef_xyz_transform(d->to_cones, colour);
  double lms[3] = {cones.X, cones.Y, cones.Z};
  ef_dichromat_view_apply(&d->view, lms, lms);
  return ef_xyz_transform(d->from_cones, (ef_xyz){lms[0], lms[1], lms[2]});
}
