/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The spaces that ellipses are drawn in: coordinates and their derivatives. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

static const struct {
  const char *name;
  const char *axis[3];
} spaces[] = {
    [EF_SPACE_XY] = {"xy", {"x", "y", "Y"}},
    [EF_SPACE_UV] = {"uv", {"u_prime", "v_prime", "Y"}},
    [EF_SPACE_LAB] = {"lab", {"a_star", "b_star", "L_star"}},
    [EF_SPACE_MB] = {"mb", {"mb_l", "mb_s", "luminance"}},
    [EF_SPACE_CONE] = {"cone",
                       {"contrast_l", "contrast_s", "contrast_luminance"}},
    [EF_SPACE_CONE_LM] = {"cone-lm",
                          {"contrast_l", "contrast_m", "contrast_s"}},
};
enum { N_SPACES = sizeof spaces / sizeof *spaces };

const char *ef_space_name(ef_space space) {
  return (size_t)space < N_SPACES ? spaces[space].name : "unknown";
}

const char *ef_space_axis(ef_space space, int i) {
  const bool known = (size_t)space < N_SPACES && i >= 0 && i < 3;
  return known ? spaces[space].axis[i] : "unknown";
}

ef_status ef_space_find(const char *name, ef_space *out, ef_error *error) {
  const char *known[N_SPACES];
  for (size_t i = 0; i < N_SPACES; ++i) {
    known[i] = spaces[i].name;
    if (name == NULL || !ef__name_equal(name, known[i]))
      continue;
    *out = (ef_space)i;
    return EF_OK;
  }
  return ef__error_unknown(error, "space for ellipses",
                           name != NULL ? name : "", known, N_SPACES);
}

static bool is_of_cones(ef_space space) {
  return space == EF_SPACE_MB || space == EF_SPACE_CONE ||
         space == EF_SPACE_CONE_LM;
}

ef_status ef_frame_set(ef_space space, const ef_observer *observer,
                       ef_frame *out, ef_error *error) {
  ef_frame frame = {.space = space};
  if ((size_t)space >= N_SPACES) {
    return ef__error_set(error, EF_INVALID, "space %d is not defined",
                         (int)space);
  }
  if (is_of_cones(space)) {
    if (observer == NULL) {
      return ef__error_set(error, EF_INVALID,
                           "the space %s needs an observer, for its cones",
                           spaces[space].name);
    }
    const ef_status status =
        ef_observer_cone_matrix(observer, frame.lms_from_xyz, NULL, error);
    if (status != EF_OK)
      return status;
    frame.mb_scale = ef_observer_mb_scale(observer);
  }
  *out = frame;
  return EF_OK;
}

/* ---- Coordinates ------------------------------------------------------- */

static ef_status no_chromaticity(ef_xyz xyz, ef_error *error) {
  return ef__error_set(error, EF_NO_ANSWER,
                       "X %g, Y %g, Z %g has no chromaticity", xyz.X, xyz.Y,
                       xyz.Z);
}

/* Two ratios p / w, q / w of linear forms, and a third form, as rows over
 * `n` variables v. */
static void ratios(const double p[3], const double q[3], const double w[3],
                   const double third[3], const double v[3], double out[3],
                   double j[9]) {
  double sum_p = 0, sum_q = 0, sum_w = 0, sum = 0;
  for (int k = 0; k < 3; ++k) {
    sum_p += p[k] * v[k];
    sum_q += q[k] * v[k];
    sum_w += w[k] * v[k];
    sum += third[k] * v[k];
  }
  out[0] = sum_p / sum_w;
  out[1] = sum_q / sum_w;
  out[2] = sum;
  for (int k = 0; k < 3; ++k) {
    j[k] = (p[k] - out[0] * w[k]) / sum_w;
    j[3 + k] = (q[k] - out[1] * w[k]) / sum_w;
    j[6 + k] = third[k];
  }
}

static const double luminance[3] = {0, 1, 0};

static ef_status chromaticity(ef_space space, ef_xyz xyz, double out[3],
                              double j[9], ef_error *error) {
  static const double x[3] = {1, 0, 0}, y[3] = {0, 1, 0}, sum[3] = {1, 1, 1};
  static const double u[3] = {4, 0, 0}, v[3] = {0, 9, 0}, uv[3] = {1, 15, 3};
  const double t[3] = {xyz.X, xyz.Y, xyz.Z};
  const double *const w = space == EF_SPACE_XY ? sum : uv;
  if (!(w[0] * t[0] + w[1] * t[1] + w[2] * t[2] > 0))
    return no_chromaticity(xyz, error);
  if (space == EF_SPACE_XY) {
    ratios(x, y, w, luminance, t, out, j);
  } else {
    ratios(u, v, w, luminance, t, out, j);
  }
  return EF_OK;
}

static ef_status lab(ef_xyz xyz, ef_xyz white, double out[3], double j[9]) {
  const ef_lab value = ef_xyz_to_lab(xyz, white);
  double rows[9];
  ef_lab_jacobian(xyz, white, rows);
  out[0] = value.a_star;
  out[1] = value.b_star;
  out[2] = value.L_star;
  memcpy(j, rows + 3, 6 * sizeof *j);
  memcpy(j + 6, rows, 3 * sizeof *j);
  return EF_OK;
}

/* The factors make rows of k_l L, k_m M and k_s S. */
static ef_status macleod_boynton(const ef_frame *frame, ef_xyz xyz,
                                 double out[3], double j[9], ef_error *error) {
  const double t[3] = {xyz.X, xyz.Y, xyz.Z};
  const double *const m = frame->lms_from_xyz;
  double l[3], s[3], v[3], sum = 0;
  for (int k = 0; k < 3; ++k) {
    l[k] = frame->mb_scale.k_l * m[k];
    v[k] = l[k] + frame->mb_scale.k_m * m[3 + k];
    s[k] = frame->mb_scale.k_s * m[6 + k];
    sum += v[k] * t[k];
  }
  if (!(sum > 0))
    return no_chromaticity(xyz, error);
  ratios(l, s, v, v, t, out, j);
  return EF_OK;
}

static ef_status cone_contrast(const ef_frame *frame, ef_xyz xyz, ef_xyz white,
                               double out[3], double j[9], ef_error *error) {
  const ef_xyz b = frame->background;
  const ef_xyz base = b.X == 0 && b.Y == 0 && b.Z == 0 ? white : b;
  const double t[3] = {xyz.X, xyz.Y, xyz.Z};
  const double from[3] = {base.X, base.Y, base.Z};
  double row[9]; /* of the three forms whose contrasts are the coordinates */
  memcpy(row, frame->lms_from_xyz, sizeof row);
  if (frame->space == EF_SPACE_CONE) {
    for (int k = 0; k < 3; ++k) {
      row[3 + k] = frame->lms_from_xyz[6 + k];
      row[6 + k] = frame->mb_scale.k_l * frame->lms_from_xyz[k] +
                   frame->mb_scale.k_m * frame->lms_from_xyz[3 + k];
    }
  }
  for (int i = 0; i < 3; ++i) {
    const double *const r = row + 3 * i;
    const double whole = r[0] * from[0] + r[1] * from[1] + r[2] * from[2];
    if (!(whole > 0)) {
      return ef__error_set(error, EF_NO_ANSWER,
                           "background X %g, Y %g, Z %g excites a cone by %g; "
                           "contrasts need more than zero",
                           base.X, base.Y, base.Z, whole);
    }
    out[i] = (r[0] * t[0] + r[1] * t[1] + r[2] * t[2]) / whole - 1;
    for (int k = 0; k < 3; ++k)
      j[3 * i + k] = r[k] / whole;
  }
  return EF_OK;
}

ef_status ef_frame_coordinates(const ef_frame *frame, ef_xyz xyz,
                               const ef_conditions *conditions,
                               double coordinate[3], double jacobian[9],
                               ef_error *error) {
  double j[9], c[3];
  ef_status status = EF_OK;
  switch (frame->space) {
  case EF_SPACE_XY:
  case EF_SPACE_UV:
    status = chromaticity(frame->space, xyz, c, j, error);
    break;
  case EF_SPACE_LAB:
    status = lab(xyz, conditions->white, c, j);
    break;
  case EF_SPACE_MB:
    status = macleod_boynton(frame, xyz, c, j, error);
    break;
  case EF_SPACE_CONE:
  case EF_SPACE_CONE_LM:
    status = cone_contrast(frame, xyz, conditions->white, c, j, error);
    break;
  default:
    return ef__error_set(error, EF_INVALID, "space %d is not defined",
                         (int)frame->space);
  }
  if (status != EF_OK)
    return status;
  memcpy(coordinate, c, sizeof c);
  if (jacobian != NULL)
    memcpy(jacobian, j, sizeof j);
  return EF_OK;
}
