/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Edges and errors of the appearance models; what holds for all colours is in
 * laws/law_appearance.c. */
#include <evenfield/colour.h>

#include "near.h"

static const ef_xyz d65 = {95.047, 100, 108.883}; /* ASTM E308-01 */

static ef_cam_model default_model(ef_cam_version version) {
  const ef_cam_viewing viewing = ef_cam_viewing_default(d65);
  ef_cam_model model;
  assert_int_equal(ef_cam_model_set(version, &viewing, &model, NULL), EF_OK);
  return model;
}

static void white_has_lightness_100(void **state) {
  (void)state;
  for (int version = EF_CAM_02; version <= EF_CAM_16; ++version) {
    const ef_cam_model model = default_model((ef_cam_version)version);
    const ef_cam white = ef_xyz_to_cam(d65, &model);
    assert_near(white.J, 100, 1e-13);
    /* Adaptation of 91 % leaves D65 a trace of colour. */
    assert_true(white.M > 0.1 && white.M < 3);
    ef_cam_viewing full = ef_cam_viewing_default(d65);
    full.discount_illuminant = true;
    ef_cam_model neutral;
    ef_cam_model_set((ef_cam_version)version, &full, &neutral, NULL);
    assert_near(neutral.D, 1, 0);
    /* Fully adapted, the three responses are alike: in CIECAM16 to rounding,
     * in CIECAM02 to 1e-5, the digits of its two matrices. */
    const double least = version == EF_CAM_02 ? 0.01 : 1e-10;
    assert_true(ef_xyz_to_cam(d65, &neutral).M < least);
  }
}

static void black_is_black(void **state) {
  (void)state;
  for (int version = EF_CAM_02; version <= EF_CAM_16; ++version) {
    const ef_cam_model model = default_model((ef_cam_version)version);
    const ef_cam black = ef_xyz_to_cam((ef_xyz){0, 0, 0}, &model);
    assert_true(black.J == 0 && black.Q == 0 && black.C == 0);
    assert_true(black.M == 0 && black.s == 0 && black.h_deg == 0);
    const ef_xyz back = ef_cam_to_xyz(black, &model);
    assert_true(back.X == 0 && back.Y == 0 && back.Z == 0);
    double j[9];
    ef_ucs_jacobian((ef_xyz){0, 0, 0}, &model, ef_ucs_shape_default(), 0, j);
    for (int i = 0; i < 9; ++i)
      assert_true(isfinite(j[i]));
  }
}

static void outside_the_model(void **state) {
  (void)state;
  const ef_cam_model model = default_model(EF_CAM_16);
  /* A response sum far below zero: no chroma. */
  const ef_cam dark = ef_xyz_to_cam((ef_xyz){-50, -50, -50}, &model);
  assert_true(dark.J < 0 && isnan(dark.C) && isnan(dark.h_deg));
  assert_true(isnan(dark.M) && isnan(dark.H));
  const ef_cam lost = ef_xyz_to_cam((ef_xyz){NOT_A_NUMBER, 1, 1}, &model);
  assert_true(isnan(lost.J) && isnan(lost.C));
  /* More chroma than any stimulus of the lightness has. */
  assert_true(
      isnan(ef_cam_to_xyz(ef_cam_from_jch(50, 1e6, 270, &model), &model).X));
  assert_true(
      isnan(ef_cam_to_xyz(ef_cam_from_jch(0, 10, 30, &model), &model).X));
  assert_true(isnan(ef_cam_from_jch(50, 10, NOT_A_NUMBER, &model).H));
}

/* Unique hues and half-way points of CIE 159, table 3. */
static void hue_quadrature(void **state) {
  (void)state;
  const ef_cam_model model = default_model(EF_CAM_02);
  const double unique[4] = {20.14, 90, 164.25, 237.53};
  for (int i = 0; i < 4; ++i) {
    assert_near(ef_cam_from_jch(50, 10, unique[i], &model).H, 100 * i, 1e-12);
    assert_near(ef_cam_hue_deg(100 * i), unique[i], 1e-12);
  }
  assert_near(ef_cam_hue_deg(-400), 20.14, 1e-12);
  /* A turn back, to rounding on either side of the seam. */
  const double seam = ef_cam_from_jch(50, 10, 20.14 - 360, &model).H;
  assert_near(remainder(seam, 400), 0, 1e-10);
  assert_true(seam >= 0 && seam < 400);
  for (double H = 0.5; H < 400; H += 7.3) {
    const double h_deg = ef_cam_hue_deg(H);
    assert_true(h_deg >= 0 && h_deg < 360);
    assert_near(ef_cam_from_jch(50, 10, h_deg, &model).H, H, 1e-11);
  }
  assert_true(isnan(ef_cam_hue_deg(NOT_A_NUMBER)));
}

static void more_light_more_brightness(void **state) {
  (void)state;
  /* Hunt and Stevens effects: brightness and colourfulness rise with the
   * level; a darker surround lifts the lightness. */
  ef_cam_viewing v = ef_cam_viewing_default(d65);
  const ef_xyz red = {41.2, 21.3, 1.9};
  ef_cam_model low, high, dark;
  v.adapting_luminance_cd_m2 = 4;
  ef_cam_model_set(EF_CAM_16, &v, &low, NULL);
  v.surround = EF_SURROUND_DARK;
  ef_cam_model_set(EF_CAM_16, &v, &dark, NULL);
  v.surround = EF_SURROUND_AVERAGE;
  v.adapting_luminance_cd_m2 = 400;
  ef_cam_model_set(EF_CAM_16, &v, &high, NULL);
  assert_true(ef_xyz_to_cam(red, &high).Q > ef_xyz_to_cam(red, &low).Q);
  assert_true(ef_xyz_to_cam(red, &high).M > ef_xyz_to_cam(red, &low).M);
  assert_true(ef_xyz_to_cam(red, &dark).J > ef_xyz_to_cam(red, &low).J);
}

static void bad_viewings_are_named(void **state) {
  (void)state;
  const ef_cam_viewing good = ef_cam_viewing_default(d65);
  assert_near(good.adapting_luminance_cd_m2, 200 / 3.14159265358979323846,
              1e-13);
  assert_near(good.background_Y, 20, 1e-14);
  ef_cam_model model = {.c = 37.23};
  ef_error error = {0};
  ef_cam_viewing v = good;
  v.white.Z = 0;
  assert_int_equal(ef_cam_model_set(EF_CAM_02, &v, &model, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "Z of the white is 0");
  v = good;
  v.adapting_luminance_cd_m2 = -1;
  ef_cam_model_set(EF_CAM_02, &v, &model, &error);
  assert_error(&error, EF_INVALID, "adapting luminance in cd/m2 is -1");
  v = good;
  v.background_Y = INFINITE;
  ef_cam_model_set(EF_CAM_02, &v, &model, &error);
  assert_error(&error, EF_INVALID, "Y of the background is inf");
  v = good;
  v.surround = (ef_surround)3;
  ef_cam_model_set(EF_CAM_02, &v, &model, &error);
  assert_error(&error, EF_INVALID, "surround 3");
  ef_cam_model_set((ef_cam_version)7, &good, &model, &error);
  assert_error(&error, EF_INVALID, "appearance model 7");
  v = good;
  v.white = (ef_xyz){1, 5, 80};
  ef_cam_model_set(EF_CAM_16, &v, &model, &error);
  assert_error(&error, EF_INVALID, "cone response");
  assert_true(model.c == 37.23); /* left alone */
}

static void surrounds_by_name(void **state) {
  (void)state;
  ef_surround surround = EF_SURROUND_AVERAGE;
  ef_error error = {0};
  assert_int_equal(ef_surround_find("Dim", &surround, &error), EF_OK);
  assert_int_equal(surround, EF_SURROUND_DIM);
  assert_string_equal(ef_surround_name(EF_SURROUND_DARK), "dark");
  assert_string_equal(ef_surround_name((ef_surround)9), "unknown");
  ef_surround_find("avrage", &surround, &error);
  assert_error(&error, EF_UNKNOWN_NAME, "average");
  ef_surround_find(NULL, &surround, &error);
  assert_error(&error, EF_UNKNOWN_NAME, "surround");
}

/* On and near the neutral axis the chord takes the place of the slope. */
static void neutral_axis_has_a_chord(void **state) {
  (void)state;
  ef_cam_viewing v = ef_cam_viewing_default(d65);
  v.discount_illuminant = true;
  ef_cam_model model;
  ef_cam_model_set(EF_CAM_16, &v, &model, NULL);
  const ef_ucs_shape shape = ef_ucs_shape_default();
  /* The neutral colour itself, to the rounding of XYZ. */
  const ef_xyz grey = ef_cam_to_xyz((ef_cam){.J = 50}, &model);
  double chord[9], steep[9];
  ef_ucs_jacobian(grey, &model, shape, 1, chord);
  ef_ucs_jacobian(grey, &model, shape, 0, steep);
  /* Ten to the minus six in M is steeper by the ratio of M^(-1/9). */
  for (int i = 3; i < 9; ++i) {
    assert_near_relative(steep[i] / chord[i], pow(1e-6, -1.0 / 9), 0.02);
  }
  /* A step of half the chord along +-b': M' is right to the spread of the
   * eccentricity over the hues, a factor (1.2 / 0.95)^0.9 at most. */
  for (int side = -1; side <= 1; side += 2) {
    const ef_ucs to = {
        ef_cam_to_ucs(ef_xyz_to_cam(grey, &model), shape).J_prime, 0, side};
    const ef_xyz moved =
        ef_cam_to_xyz(ef_ucs_to_cam(to, shape, &model), &model);
    const double d[3] = {moved.X - grey.X, moved.Y - grey.Y, moved.Z - grey.Z};
    const double b = chord[6] * d[0] + chord[7] * d[1] + chord[8] * d[2];
    assert_true(b * side > 0.75 && b * side < 1.35);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(white_has_lightness_100),
      cmocka_unit_test(black_is_black),
      cmocka_unit_test(outside_the_model),
      cmocka_unit_test(hue_quadrature),
      cmocka_unit_test(more_light_more_brightness),
      cmocka_unit_test(bad_viewings_are_named),
      cmocka_unit_test(surrounds_by_name),
      cmocka_unit_test(neutral_axis_has_a_chord),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
