/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What single formulas do at their edges, and what the conditions stand for. */
#include <evenfield/difference.h>

#include "metrics.h"
#include "near.h"

static const ef_xyz d65 = {95.047, 100, 108.883}; /* ASTM E308-01 */
static const ef_xyz red = {41.24, 21.26, 1.93};

static void only_cie94_and_cmc_have_a_standard(void **state) {
  (void)state;
  const double grey[3] = {50, 0, 0}, vivid[3] = {50, 60, 20};
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    const char *const name = ef_metric_name(metric);
    const bool has_standard =
        strncmp(name, "cie94", 5) == 0 || strncmp(name, "cmc", 3) == 0;
    assert_int_equal(ef_metric_symmetric(metric), !has_standard);
    const double there = ef_metric_difference(metric, grey, vivid);
    const double back = ef_metric_difference(metric, vivid, grey);
    /* A vivid standard allows more. */
    if (has_standard) {
      assert_true(back < 0.8 * there);
    } else {
      assert_near(back, there, 1e-13 * there);
    }
  }
}

/* Worked by hand: standard a* 30, b* 40, C* 50, sample one further along. */
static void weights_are_those_of_the_standard(void **state) {
  (void)state;
  const double standard[3] = {40, 30, 40}, sample[3] = {42, 30.6, 40.8};
  ef_components part;
  ef_metric *const textiles = ef_metric_new("cie94:textiles", NULL);
  ef_metric_components(textiles, standard, sample, &part);
  assert_near(part.lightness, 1, 1e-15); /* 2 / k_L */
  assert_near(part.chroma, 1 / (1 + 0.048 * 50), 1e-14);
  assert_near(part.hue, 0, 1e-14);
  ef_metric_free(textiles);
  ef_metric_components(ef_metric_find("cmc", NULL), standard, sample, &part);
  assert_near(part.lightness, 2 / (2 * 0.040975 * 40 / (1 + 0.01765 * 40)),
              1e-14);
  assert_near(part.chroma, 1 / (0.0638 * 50 / (1 + 0.0131 * 50) + 0.638),
              1e-14);
  const double dark[3] = {15.9, 0, 0}, darker[3] = {14.9, 0, 0};
  ef_metric_components(ef_metric_find("cmc", NULL), dark, darker, &part);
  assert_near(part.lightness, -1 / (2 * 0.511), 1e-14);
}

static void zero_members_stand_for_the_defaults(void **state) {
  (void)state;
  const ef_conditions plain = ef_conditions_default(d65);
  const ef_conditions spelled = {
      .white = d65,
      .white_luminance_cd_m2 = 1000 / 3.14159265358979,
      .background_Y = 20,
      .adapting_luminance_cd_m2 = 200 / 3.14159265358979,
      .surround = EF_SURROUND_AVERAGE};
  for (size_t m = 0; m < every_metric_count(); ++m) {
    double a[3], b[3];
    ef_metric_coordinates(every_metric(m), red, &plain, a);
    ef_metric_coordinates(every_metric(m), red, &spelled, b);
    for (int k = 0; k < 3; ++k)
      assert_near(a[k], b[k], 1e-11);
  }
}

/* The adapting luminance follows the white's and the background's. */
static void adapting_luminance_follows(void **state) {
  (void)state;
  const ef_metric *const metric = ef_metric_find("cam16-ucs", NULL);
  ef_conditions follows = ef_conditions_default(d65);
  follows.white_luminance_cd_m2 = 160;
  follows.background_Y = 40;
  ef_conditions given = ef_conditions_default(d65);
  given.background_Y = 40;
  given.adapting_luminance_cd_m2 = 64;
  double a[3], b[3];
  ef_metric_coordinates(metric, red, &follows, a);
  ef_metric_coordinates(metric, red, &given, b);
  for (int k = 0; k < 3; ++k)
    assert_near(a[k], b[k], 1e-12);
}

/* The metric is the model of colour.h, whatever the scale of XYZ. */
static void appearance_spaces_are_those_of_the_model(void **state) {
  (void)state;
  const char *const name[2] = {"cam02-ucs", "cam16-ucs"};
  for (int version = EF_CAM_02; version <= EF_CAM_16; ++version) {
    ef_cam_viewing viewing = ef_cam_viewing_default(d65);
    viewing.surround = EF_SURROUND_DIM;
    ef_cam_model model;
    ef_cam_model_set((ef_cam_version)version, &viewing, &model, NULL);
    const ef_ucs ucs =
        ef_cam_to_ucs(ef_xyz_to_cam(red, &model), ef_ucs_shape_default());
    const ef_conditions conditions = {
        .white = {1.7 * d65.X, 1.7 * d65.Y, 1.7 * d65.Z},
        .surround = EF_SURROUND_DIM};
    double c[3];
    ef_metric_coordinates(ef_metric_find(name[version], NULL),
                          (ef_xyz){1.7 * red.X, 1.7 * red.Y, 1.7 * red.Z},
                          &conditions, c);
    assert_near(c[0], ucs.J_prime, 1e-11);
    assert_near(c[1], ucs.a_prime, 1e-11);
    assert_near(c[2], ucs.b_prime, 1e-11);
  }
}

static void a_white_without_a_model_gives_nan(void **state) {
  (void)state;
  const ef_conditions bad = {.white = {1, 5, 80}};
  for (int i = 0; i < 2; ++i) {
    const ef_metric *const metric =
        ef_metric_find(i == 0 ? "cam02-ucs" : "cam16-ucs", NULL);
    double c[3], j[9];
    ef_metric_coordinates(metric, red, &bad, c);
    assert_true(isnan(c[0]) && isnan(c[1]) && isnan(c[2]));
    ef_metric_jacobian(metric, red, &bad, j);
    assert_true(isnan(j[0]) && isnan(j[8]));
    assert_true(isnan(ef_metric_xyz(metric, (double[3]){50, 0, 0}, &bad).X));
  }
}

static void itp_counts_in_cd_m2(void **state) {
  (void)state;
  const ef_metric *const itp = ef_metric_find("itp", NULL);
  /* The white of BT.2020: neutral. PQ at 10000 cd/m2 is 1. */
  const ef_xyz white = {0.3127 / 0.3290, 1, (1 - 0.3127 - 0.3290) / 0.3290};
  const ef_conditions peak = {.white = white, .white_luminance_cd_m2 = 10000};
  double c[3];
  ef_metric_coordinates(itp, white, &peak, c);
  assert_near(c[0], 720, 1e-10);
  assert_near(c[1], 0, 1e-10);
  assert_near(c[2], 0, 1e-10);
  /* Twice the luminance of the white, half the colour: the same light. */
  const ef_conditions dim = {.white = white, .white_luminance_cd_m2 = 100};
  const ef_conditions bright = {.white = white, .white_luminance_cd_m2 = 200};
  double a[3], b[3];
  ef_metric_coordinates(itp, (ef_xyz){0.5, 0.4, 0.3}, &dim, a);
  ef_metric_coordinates(itp, (ef_xyz){0.25, 0.2, 0.15}, &bright, b);
  for (int k = 0; k < 3; ++k)
    assert_near(a[k], b[k], 1e-12);
  /* No code is above the quantiser's pole. */
  assert_true(isnan(ef_metric_xyz(itp, (double[3]){2000, 0, 0}, &dim).X));
}

/* Black has slopes, finite ones, in every space. */
static void slopes_at_black_are_finite(void **state) {
  (void)state;
  const ef_conditions conditions = ef_conditions_default(d65);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    double j[9];
    ef_metric_jacobian(every_metric(m), (ef_xyz){0, 0, 0}, &conditions, j);
    for (int i = 0; i < 9; ++i)
      assert_true(isfinite(j[i]));
    assert_true(j[1] > 0); /* lightness rises with Y */
  }
  /* CIELUV: along the grey scale u*, v* stay 0. */
  double j[9];
  ef_metric_jacobian(ef_metric_find("cieluv", NULL), (ef_xyz){0, 0, 0},
                     &conditions, j);
  assert_near(j[3] * d65.X + j[4] * d65.Y + j[5] * d65.Z, 0, 1e-9);
  assert_near(j[6] * d65.X + j[7] * d65.Y + j[8] * d65.Z, 0, 1e-9);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(only_cie94_and_cmc_have_a_standard),
      cmocka_unit_test(weights_are_those_of_the_standard),
      cmocka_unit_test(zero_members_stand_for_the_defaults),
      cmocka_unit_test(adapting_luminance_follows),
      cmocka_unit_test(appearance_spaces_are_those_of_the_model),
      cmocka_unit_test(a_white_without_a_model_gives_nan),
      cmocka_unit_test(itp_counts_in_cd_m2),
      cmocka_unit_test(slopes_at_black_are_finite),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
