/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Properties of the appearance models for all colours and viewings, and
 * agreement of CIECAM02 with Little CMS as a second implementation. */
#include <evenfield/colour.h>

#include <lcms2.h>

#include "base/base_private.h"
#include "gen.h"
#include "near.h"

/* Colours in and somewhat outside the gamut of BT.2020 with its D65 white:
 * mixtures of its primaries (ITU-R BT.2020, XYZ at unit drive). */
static ef_xyz random_colour(gen *g) {
  const double R = gen_between(g, 0, 100), G = gen_between(g, 0, 100);
  const double B = gen_between(g, 0, 100);
  return (ef_xyz){0.636958 * R + 0.144617 * G + 0.168881 * B,
                  0.262700 * R + 0.677998 * G + 0.059302 * B,
                  0.028073 * G + 1.060985 * B};
}

static ef_cam_viewing random_viewing(gen *g) {
  const ef_xyz white = {gen_between(g, 85, 110), 100, gen_between(g, 35, 120)};
  ef_cam_viewing v = ef_cam_viewing_default(white);
  v.adapting_luminance_cd_m2 = exp(gen_between(g, -1, 7));
  v.background_Y = gen_between(g, 5, 60);
  v.surround = (ef_surround)gen_below(g, 3);
  v.discount_illuminant = gen_below(g, 4) == 0;
  return v;
}

static void stimuli_come_back(void **state) {
  (void)state;
  deviation worst = {0, ""};
  gen g = gen_new(1);
  size_t n_defined = 0;
  for (int i = 0; i < 30000; ++i) {
    const ef_cam_viewing v = random_viewing(&g);
    const ef_xyz xyz = random_colour(&g);
    ef_cam_model model;
    assert_int_equal(
        ef_cam_model_set(i % 2 == 0 ? EF_CAM_02 : EF_CAM_16, &v, &model, NULL),
        EF_OK);
    const ef_cam cam = ef_xyz_to_cam(xyz, &model);
    if (isnan(cam.C))
      continue;
    ++n_defined;
    char where[96];
    snprintf(where, sizeof where, "XYZ %.3f %.3f %.3f, J %.3f C %.3f", xyz.X,
             xyz.Y, xyz.Z, cam.J, cam.C);
    const ef_ucs ucs = ef_cam_to_ucs(cam, ef_ucs_shape_default());
    const ef_cam again = ef_ucs_to_cam(ucs, ef_ucs_shape_default(), &model);
    const ef_xyz back[3] = {
        ef_cam_to_xyz(cam, &model), ef_cam_to_xyz(again, &model),
        ef_cam_to_xyz(ef_cam_from_qmh(cam.Q, cam.M, cam.h_deg, &model),
                      &model)};
    for (int k = 0; k < 3; ++k) {
      deviation_add(&worst, back[k].X, xyz.X, where);
      deviation_add(&worst, back[k].Y, xyz.Y, where);
      deviation_add(&worst, back[k].Z, xyz.Z, where);
    }
  }
  deviation_print(&worst, "XYZ to correlates and back");
  printf("# of 30000 colours %zu have all correlates\n", n_defined);
  /* The stretch of a response r loses 1 / (1 - r / 400) twice, some hundreds
   * at the highest levels, of 1e-14. */
  assert_true(worst.largest < 1e-9);
  assert_true(n_defined > 29000);
}

/* Surface colours in daylight: every correlate is defined and in range. */
static void correlates_keep_their_ranges(void **state) {
  (void)state;
  gen g = gen_new(2);
  for (int i = 0; i < 20000; ++i) {
    const ef_cam_viewing v =
        ef_cam_viewing_default((ef_xyz){95.047, 100, 108.883});
    ef_cam_model model;
    ef_cam_model_set(EF_CAM_16, &v, &model, NULL);
    const ef_cam cam = ef_xyz_to_cam(random_colour(&g), &model);
    assert_true(cam.J >= 0 && cam.J < 101 && cam.C >= 0 && cam.M >= 0);
    assert_true(cam.Q >= 0 && cam.s >= 0);
    assert_true(cam.h_deg >= 0 && cam.h_deg < 360);
    assert_true(cam.H >= 0 && cam.H < 400);
  }
}

static void moved(ef_xyz xyz, int k, double step, const ef_cam_model *model,
                  double out[3]) {
  if (k == 0)
    xyz.X += step;
  if (k == 1)
    xyz.Y += step;
  if (k == 2)
    xyz.Z += step;
  const ef_ucs u =
      ef_cam_to_ucs(ef_xyz_to_cam(xyz, model), ef_ucs_shape_default());
  out[0] = u.J_prime;
  out[1] = u.a_prime;
  out[2] = u.b_prime;
}

static void jacobian_is_the_slope(void **state) {
  (void)state;
  deviation worst = {0, ""};
  gen g = gen_new(3);
  size_t n_checked = 0;
  for (int i = 0; i < 20000; ++i) {
    const ef_cam_viewing v = random_viewing(&g);
    const ef_xyz xyz = random_colour(&g);
    ef_cam_model model;
    ef_cam_model_set(i % 2 == 0 ? EF_CAM_02 : EF_CAM_16, &v, &model, NULL);
    const ef_cam cam = ef_xyz_to_cam(xyz, &model);
    /* Where a response passes zero, or hue is undefined, differences reach
     * over a kink. */
    if (isnan(cam.C) || cam.J < 1 || cam.M < 0.5)
      continue;
    double p[3] = {0, 0, 0};
    for (int k = 0; k < 3; ++k) {
      const double *const row = model.response + 3 * k;
      p[k] = row[0] * xyz.X + row[1] * xyz.Y + row[2] * xyz.Z;
    }
    const double near_zero = 0.01 * model.F_L;
    if (fabs(p[0]) < near_zero || fabs(p[1]) < near_zero ||
        fabs(p[2]) < near_zero) {
      continue;
    }
    ++n_checked;
    const double h = 1e-4;
    double j[9];
    ef_ucs_jacobian(xyz, &model, ef_ucs_shape_default(), 0, j);
    char where[96];
    snprintf(where, sizeof where, "XYZ %.3f %.3f %.3f", xyz.X, xyz.Y, xyz.Z);
    for (int k = 0; k < 3; ++k) {
      double up[3], down[3];
      moved(xyz, k, h, &model, up);
      moved(xyz, k, -h, &model, down);
      for (int row = 0; row < 3; ++row) {
        const double slope = (up[row] - down[row]) / (2 * h);
        const double size = 1 + fabs(slope);
        deviation_add(&worst, j[3 * row + k] / size, slope / size, where);
      }
    }
  }
  deviation_print(&worst, "Jacobian against central differences");
  printf("# at %zu colours\n", n_checked);
  /* Third derivatives times h^2: at responses 0.01 some 1e-8 * 1e4 / 6. */
  assert_true(worst.largest < 2e-5);
  assert_true(n_checked > 10000);
}

/* Nothing but the level of compression and the adaptation depends on the
 * scale: at full adaptation a change of unit of all but L_A is lightness. */
static void lightness_is_relative(void **state) {
  (void)state;
  gen g = gen_new(4);
  for (int i = 0; i < 2000; ++i) {
    const ef_cam_viewing v = random_viewing(&g);
    ef_cam_model model;
    ef_cam_model_set(EF_CAM_16, &v, &model, NULL);
    assert_near(ef_xyz_to_cam(v.white, &model).J, 100, 1e-12);
    /* Lightness rises along the grey scale. */
    double last = -1;
    for (int k = 0; k <= 20; ++k) {
      const double share = k / 20.0;
      const ef_xyz grey = {share * v.white.X, share * v.white.Y,
                           share * v.white.Z};
      const double J = ef_xyz_to_cam(grey, &model).J;
      assert_true(J > last);
      last = J;
    }
  }
}

/* Little CMS has the inverse of CAT02 rounded to 6 decimals. The same is put
 * into the model here; A_w follows from the lightness of the white. */
static void round_matrix(ef_cam_model *model, const ef_cam_viewing *v) {
  static const double rounded[9] = {1.096124,  -0.278869, 0.182745,
                                    0.454369,  0.473533,  0.072098,
                                    -0.009628, -0.005698, 1.015326};
  static const double cat02[9] = {0.7328, 0.4296, -0.1624, -0.7036, 1.6975,
                                  0.0061, 0.0030, 0.0136,  0.9834};
  static const double hpe[9] = {0.38971, 0.68898, -0.07868, -0.22981, 1.18340,
                                0.04641, 0,       0,        1};
  double back[9], m[9];
  assert_true(ef__mat3_inverse(hpe, back));
  ef__mat3_multiply(cat02, back, m);
  ef__mat3_multiply(rounded, m, m);
  ef__mat3_multiply(hpe, m, m);
  ef__mat3_multiply(m, model->response, model->response);
  const double J = ef_xyz_to_cam(v->white, model).J;
  assert_near(J, 100, 1e-3);
  model->A_w *= pow(J / 100, 1 / (model->c * model->z));
}

/* Its dim surround has another N_c (0.95) and its own D another place for F,
 * as before CIE 159: average and dark surrounds, with D given. */
static void check_against_lcms(gen *g, deviation *worst) {
  ef_cam_viewing v = random_viewing(g);
  if (v.surround == EF_SURROUND_DIM)
    v.surround = EF_SURROUND_DARK;
  ef_cam_model model;
  ef_cam_model_set(EF_CAM_02, &v, &model, NULL);
  const cmsViewingConditions conditions = {
      {v.white.X, v.white.Y, v.white.Z},
      v.background_Y,
      v.adapting_luminance_cd_m2,
      v.surround == EF_SURROUND_AVERAGE ? AVG_SURROUND : DARK_SURROUND,
      model.D};
  const cmsHANDLE handle = cmsCIECAM02Init(NULL, &conditions);
  assert_non_null(handle);
  round_matrix(&model, &v);
  for (int i = 0; i < 500; ++i) {
    const ef_xyz xyz = random_colour(g);
    const ef_cam cam = ef_xyz_to_cam(xyz, &model);
    const cmsCIEXYZ in = {xyz.X, xyz.Y, xyz.Z};
    cmsJCh out;
    cmsCIECAM02Forward(handle, &in, &out);
    char where[96];
    snprintf(where, sizeof where, "XYZ %.3f %.3f %.3f", xyz.X, xyz.Y, xyz.Z);
    deviation_add(worst, cam.J, out.J, where);
    deviation_add(worst, cam.C, out.C, where);
    const double turn = remainder(cam.h_deg - out.h, 360);
    deviation_add(worst, turn * cam.C / 60, 0, where);
  }
  cmsCIECAM02Done(handle);
}

static void ciecam02_agrees_with_little_cms(void **state) {
  (void)state;
  deviation worst = {0, ""};
  gen g = gen_new(5);
  for (int i = 0; i < 200; ++i)
    check_against_lcms(&g, &worst);
  deviation_print(&worst, "CIECAM02 J, C and hue times C against Little CMS, "
                          "100000 colours");
  /* It has pi to 9 decimals: 1.3e-10 of a hue to 360, times C / 60. */
  assert_true(worst.largest < 1e-7);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(stimuli_come_back),
      cmocka_unit_test(correlates_keep_their_ranges),
      cmocka_unit_test(jacobian_is_the_slope),
      cmocka_unit_test(lightness_is_relative),
      cmocka_unit_test(ciecam02_agrees_with_little_cms),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
