/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CAM02-UCS (M. R. Luo, G. Cui, C. Li, Color Res. Appl. 31 (2006) 320-330) and
 * CAM16-UCS (Li et al., Color Res. Appl. 42 (2017) 703-718): the distance of
 * J', a', b', with J' divided by K_L. */
#include <math.h>

#include "difference/difference_private.h"

enum { K_L, C_1, C_2 };

static ef_ucs_shape shape(const ef_metric *self) {
  return (ef_ucs_shape){self->parameter[C_1].value, self->parameter[C_2].value};
}

/* XYZ to the scale of the models, on which the white has Y = 100. */
static double unit(const ef_conditions *conditions) {
  return 100 / conditions->white.Y;
}

static ef_xyz scaled(ef_xyz xyz, double factor) {
  return (ef_xyz){factor * xyz.X, factor * xyz.Y, factor * xyz.Z};
}

static bool set_model(const ef_metric *self, const ef_conditions *conditions,
                      ef_cam_model *model) {
  const ef_cam_viewing viewing = {
      .white = scaled(conditions->white, unit(conditions)),
      .adapting_luminance_cd_m2 = ef__adapting_luminance_cd_m2(conditions),
      .background_Y = ef__background_Y(conditions),
      .surround = conditions->surround,
      .discount_illuminant = conditions->discount_illuminant};
  const ef_cam_version version =
      self->base == EF__ON_CAM02 ? EF_CAM_02 : EF_CAM_16;
  return ef_cam_model_set(version, &viewing, model, NULL) == EF_OK;
}

static void coordinates_of_many(const ef_metric *self, size_t n,
                                const double *xyz,
                                const ef_conditions *conditions,
                                double *coordinate) {
  ef_cam_model model;
  const bool is_set = set_model(self, conditions, &model);
  if (!is_set) {
    for (size_t i = 0; i < 3 * n; ++i) coordinate[i] = (double)NAN;
    return;
  }
  /* The scale of the models goes into the responses. */
  for (int i = 0; i < 9; ++i) model.response[i] *= unit(conditions);
  ef_xyz_to_ucs_batch(n, xyz, &model, shape(self), coordinate);
}

static void coordinates(const ef_metric *self, ef_xyz xyz,
                        const ef_conditions *conditions, double coordinate[3]) {
  ef_cam_model model;
  ef_ucs ucs = {(double)NAN, (double)NAN, (double)NAN};
  if (set_model(self, conditions, &model)) {
    const ef_cam cam = ef_xyz_to_cam(scaled(xyz, unit(conditions)), &model);
    ucs = ef_cam_to_ucs(cam, shape(self));
  }
  coordinate[0] = ucs.J_prime;
  coordinate[1] = ucs.a_prime;
  coordinate[2] = ucs.b_prime;
}

static ef_xyz inverse(const ef_metric *self, const double coordinate[3],
                      const ef_conditions *conditions) {
  ef_cam_model model;
  if (!set_model(self, conditions, &model))
    return (ef_xyz){(double)NAN, (double)NAN, (double)NAN};
  const ef_ucs ucs = {coordinate[0], coordinate[1], coordinate[2]};
  const ef_cam cam = ef_ucs_to_cam(ucs, shape(self), &model);
  return scaled(ef_cam_to_xyz(cam, &model), 1 / unit(conditions));
}

static void chord(const ef_metric *self, ef_xyz xyz,
                  const ef_conditions *conditions, double size, double j[9]) {
  ef_cam_model model;
  const bool is_set = set_model(self, conditions, &model);
  const double factor = unit(conditions);
  if (is_set) {
    /* M of the chord's end, from M' = size. */
    const double secant_M = expm1(shape(self).c2 * size) / shape(self).c2;
    ef_ucs_jacobian(scaled(xyz, factor), &model, shape(self), secant_M, j);
  }
  for (int i = 0; i < 9; ++i)
    j[i] = is_set ? j[i] * factor : (double)NAN;
}

static void jacobian(const ef_metric *self, ef_xyz xyz,
                     const ef_conditions *conditions, double j[9]) {
  chord(self, xyz, conditions, 0, j);
}

static ef__scale scale(const ef_metric *self) {
  return (ef__scale){self->parameter[K_L].value, 1};
}

/* For large and small differences, and the compromise that is the default
 * (Luo, Cui & Li 2006, table II). */
static const ef__parameter_set sets[] = {{"lcd", {0.77, 0.007, 0.0053}},
                                         {"scd", {1.24, 0.007, 0.0363}},
                                         {"ucs", {1, 0.007, 0.0228}},
                                         {NULL, {0}}};

#define SHARED_PARTS                                                           \
  .jnd = {(double)NAN, "", ""},                                                \
  .parameter = {{"kl", 1, "divides the lightness difference"},                 \
                {"c1", 0.007, "compression of lightness"},                     \
                {"c2", 0.0228, "compression of colourfulness"}},               \
  .parameter_set = sets, .coordinates = coordinates,                           \
  .coordinates_of_many = coordinates_of_many, .inverse = inverse,              \
  .jacobian = jacobian, .chord = chord, .kinked_axis = true,                   \
  .scale = scale, .difference = ef__euclidean_difference,                      \
  .differences = ef__euclidean_differences,                                    \
  .components = ef__euclidean_components, .tensor = ef__euclidean_tensor,      \
  .expand = ef__euclidean_expand

const ef_metric ef__metric_cam02_ucs = {
    .name = "cam02-ucs",
    .title = "CAM02-UCS",
    .symbol = "Delta E' (CAM02-UCS)",
    .source = "Luo, Cui, Li, Color Res. Appl. 31 (2006) 320-330, on CIECAM02 "
              "(CIE 159:2004)",
    .base = EF__ON_CAM02,
    SHARED_PARTS,
};

const ef_metric ef__metric_cam16_ucs = {
    .name = "cam16-ucs",
    .title = "CAM16-UCS",
    .symbol = "Delta E' (CAM16-UCS)",
    .source = "Li et al., Color Res. Appl. 42 (2017) 703-718, on CIECAM16 "
              "(CIE 248:2022)",
    .base = EF__ON_CAM16,
    SHARED_PARTS,
};
