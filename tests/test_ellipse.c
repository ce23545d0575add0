/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ellipses as forms and axes, their spaces, errors. */
#include <evenfield/difference.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

static const ef_xyz d65 = {95.047, 100, 108.883}; /* ASTM E308-01 */
static const ef_xyz red = {41.24, 21.26, 1.93};

static ef_frame frame_of(ef_space space) {
  ef_error error = {0};
  ef_observer *const observer = ef_observer_new("cie-2015-2", &error);
  assert_non_null(observer);
  ef_frame frame;
  assert_int_equal(ef_frame_set(space, observer, &frame, &error), EF_OK);
  ef_observer_free(observer);
  return frame;
}

static void axes_and_form_are_one(void **state) {
  (void)state;
  gen g = gen_new(1);
  const double at[2] = {0.3, 0.4};
  for (int i = 0; i < 2000; ++i) {
    const double b = exp(gen_between(&g, -8, 2));
    const double a = b * exp(gen_between(&g, 1e-3, 5));
    const double angle_deg = gen_between(&g, 0, 180);
    const ef_ellipse e = ef_ellipse_of_axes(at, a, b, angle_deg);
    assert_near_relative(e.semi_major, a, 1e-10);
    assert_near_relative(e.semi_minor, b, 1e-12);
    /* The angle of a near circle is known to eps / (1 - b^2 / a^2). */
    assert_near(remainder(e.angle_deg - angle_deg, 180), 0, 1e-9);
    assert_true(e.angle_deg >= 0 && e.angle_deg < 180);
    double p[2];
    ef_ellipse_point(&e, gen_between(&g, 0, 360), p);
    assert_near(ef_ellipse_steps(&e, p), 1, 1e-9);
    ef_ellipse_point(&e, 0, p);
    assert_near_relative(hypot(p[0] - at[0], p[1] - at[1]), a, 1e-9);
  }
  const ef_ellipse circle = ef_ellipse_of_axes(at, 0.5, 0.5, 33);
  assert_near(circle.semi_major, 0.5, 1e-15);
  assert_near(circle.semi_minor, 0.5, 1e-15);
  assert_near(ef_ellipse_steps(&circle, (double[2]){0.3, 1.9}), 3, 1e-15);
}

static void a_form_that_is_no_ellipse(void **state) {
  (void)state;
  const double at[2] = {0, 0};
  const double bad[][3] = {
      {1, 2, 1}, {-1, 0, -1}, {0, 0, 0}, {1, 1, 1}, {1, NOT_A_NUMBER, 1}};
  for (size_t i = 0; i < sizeof bad / sizeof *bad; ++i) {
    const ef_ellipse e =
        ef_ellipse_of_form(at, bad[i][0], bad[i][1], bad[i][2]);
    assert_true(isnan(e.semi_major) && isnan(e.semi_minor));
    assert_true(isnan(e.angle_deg));
  }
}

/* Carried ellipses hold the carried points. */
static void carried_to_other_coordinates(void **state) {
  (void)state;
  gen g = gen_new(2);
  for (int i = 0; i < 1000; ++i) {
    const double at[2] = {gen_normal(&g), gen_normal(&g)};
    const double to[2] = {gen_normal(&g), gen_normal(&g)};
    const double j[4] = {1 + gen_unit(&g), gen_unit(&g), -gen_unit(&g),
                         1 + gen_unit(&g)};
    const ef_ellipse e =
        ef_ellipse_of_axes(at, 3, 0.5 + gen_unit(&g), gen_between(&g, 0, 180));
    const ef_ellipse moved = ef_ellipse_carry(&e, to, j);
    double p[2];
    ef_ellipse_point(&e, gen_between(&g, 0, 360), p);
    const double d[2] = {p[0] - at[0], p[1] - at[1]};
    const double q[2] = {to[0] + j[0] * d[0] + j[1] * d[1],
                         to[1] + j[2] * d[0] + j[3] * d[1]};
    assert_near(ef_ellipse_steps(&moved, q), 1, 1e-12);
  }
}

static void cielab_is_round_in_its_own_plane(void **state) {
  (void)state;
  const ef_conditions conditions = ef_conditions_default(d65);
  const ef_frame frame = frame_of(EF_SPACE_LAB);
  const ef_metric *const lab = ef_metric_find("cielab", NULL);
  ef_ellipsoid e;
  assert_int_equal(
      ef_metric_ellipsoid(lab, red, &conditions, &frame, 2.3, &e, NULL), EF_OK);
  const ef_lab at = ef_xyz_to_lab(red, d65);
  assert_near(e.center[0], at.a_star, 1e-12);
  assert_near(e.center[1], at.b_star, 1e-12);
  assert_near(e.center[2], at.L_star, 1e-12);
  for (int i = 0; i < 3; ++i)
    assert_near(e.semi_axis[i], 2.3, 1e-11);
  for (int kind = 0; kind < 2; ++kind) {
    const ef_ellipse f = ef_ellipsoid_figure(&e, (ef_ellipse_kind)kind);
    assert_near(f.semi_major, 2.3, 1e-11);
    assert_near(f.semi_minor, 2.3, 1e-11);
  }
}

/* CIE94 at C* 50, hue 0: semi-axes S_C, S_H and k_L. */
static void axes_of_cie94(void **state) {
  (void)state;
  const ef_conditions conditions = ef_conditions_default(d65);
  const ef_frame frame = frame_of(EF_SPACE_LAB);
  const ef_xyz at = ef_lab_to_xyz((ef_lab){50, 50, 0}, d65);
  ef_metric *const metric = ef_metric_new("cie94:kl=2", NULL);
  ef_ellipse e;
  assert_int_equal(ef_metric_ellipse(metric, at, &conditions, &frame,
                                     EF_ELLIPSE_SECTION, 1, &e, NULL),
                   EF_OK);
  assert_near(e.semi_major, 3.25, 1e-11);
  assert_near(e.semi_minor, 1.75, 1e-11);
  assert_near(remainder(e.angle_deg, 180), 0, 1e-9);
  ef_ellipsoid solid;
  ef_metric_ellipsoid(metric, at, &conditions, &frame, 1, &solid, NULL);
  assert_near(solid.semi_axis[0], 3.25, 1e-11);
  assert_near(solid.semi_axis[1], 2, 1e-11);
  assert_near(solid.semi_axis[2], 1.75, 1e-11);
  assert_near(fabs(solid.direction[3 + 2]), 1, 1e-12); /* L* */
  ef_metric_free(metric);
}

static void size_scales_the_axes(void **state) {
  (void)state;
  const ef_conditions conditions = ef_conditions_default(d65);
  const ef_frame frame = frame_of(EF_SPACE_XY);
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  ef_ellipse one, three;
  ef_metric_ellipse(metric, red, &conditions, &frame, EF_ELLIPSE_PROJECTION,
                    0.8, &one, NULL);
  ef_metric_ellipse(metric, red, &conditions, &frame, EF_ELLIPSE_PROJECTION,
                    2.4, &three, NULL);
  assert_near_relative(three.semi_major, 3 * one.semi_major, 1e-12);
  assert_near_relative(three.semi_minor, 3 * one.semi_minor, 1e-12);
}

/* A grey has an ellipse in the appearance spaces too, along the chord: one
 * unit of chroma wide in its own plane, whatever the direction. */
static void greys_have_ellipses(void **state) {
  (void)state;
  ef_conditions conditions = ef_conditions_default(d65);
  conditions.discount_illuminant = true;
  const ef_metric *const metric = ef_metric_find("cam16-ucs", NULL);
  const ef_xyz grey = {0.2 * d65.X, 0.2 * d65.Y, 0.2 * d65.Z};
  const ef_frame frame = frame_of(EF_SPACE_XY);
  double at[3];
  ef_metric_coordinates(metric, grey, &conditions, at);
  ef_ellipse e;
  assert_int_equal(ef_metric_ellipse(metric, grey, &conditions, &frame,
                                     EF_ELLIPSE_SECTION, 1, &e, NULL),
                   EF_OK);
  for (int turn_deg = 0; turn_deg < 360; turn_deg += 15) {
    double p[2], c[3];
    ef_ellipse_point(&e, turn_deg, p);
    const ef_xyz moved = ef_xyy_to_xyz((ef_xyy){p[0], p[1], grey.Y});
    ef_metric_coordinates(metric, moved, &conditions, c);
    /* To the spread of the eccentricity over the hues, and curvature. */
    const double d = ef_metric_difference(metric, at, c);
    assert_true(d > 0.7 && d < 1.4);
  }
}

static void contrasts_are_against_the_background(void **state) {
  (void)state;
  const ef_conditions conditions = ef_conditions_default(d65);
  ef_frame frame = frame_of(EF_SPACE_CONE_LM);
  double c[3];
  ef_frame_coordinates(&frame, d65, &conditions, c, NULL, NULL);
  for (int i = 0; i < 3; ++i)
    assert_near(c[i], 0, 1e-14);
  frame.background = (ef_xyz){d65.X / 4, d65.Y / 4, d65.Z / 4};
  ef_frame_coordinates(&frame, d65, &conditions, c, NULL, NULL);
  for (int i = 0; i < 3; ++i)
    assert_near(c[i], 3, 1e-13);
  /* Luminance contrast is that of Y for the CIE 2015 observers. */
  frame.space = EF_SPACE_CONE;
  ef_frame_coordinates(&frame, red, &conditions, c, NULL, NULL);
  assert_near(c[2], red.Y / 25 - 1, 1e-8);
  /* And the MacLeod-Boynton coordinates are those of colour.h. */
  frame.space = EF_SPACE_MB;
  ef_frame_coordinates(&frame, red, &conditions, c, NULL, NULL);
  double lms[3];
  for (int i = 0; i < 3; ++i) {
    const double *const m = frame.lms_from_xyz + 3 * i;
    lms[i] = m[0] * red.X + m[1] * red.Y + m[2] * red.Z;
  }
  const ef_mb mb =
      ef_lms_to_mb((ef_lms){lms[0], lms[1], lms[2]}, frame.mb_scale);
  assert_near(c[0], mb.mb_l, 1e-14);
  assert_near(c[1], mb.mb_s, 1e-14);
  assert_near(c[2], mb.luminance, 1e-12);
}

static void spaces_by_name(void **state) {
  (void)state;
  ef_space space = EF_SPACE_XY;
  ef_error error = {0};
  for (int i = EF_SPACE_XY; i <= EF_SPACE_CONE_LM; ++i) {
    assert_int_equal(ef_space_find(ef_space_name((ef_space)i), &space, &error),
                     EF_OK);
    assert_int_equal(space, i);
  }
  assert_string_equal(ef_space_axis(EF_SPACE_UV, 1), "v_prime");
  assert_string_equal(ef_space_axis(EF_SPACE_UV, 3), "unknown");
  assert_string_equal(ef_space_name((ef_space)17), "unknown");
  ef_space_find("xyy", &space, &error);
  assert_error(&error, EF_UNKNOWN_NAME, "xy");
  ef_space_find(NULL, &space, &error);
  assert_error(&error, EF_UNKNOWN_NAME, "space");
}

static void questions_without_an_answer(void **state) {
  (void)state;
  const ef_conditions conditions = ef_conditions_default(d65);
  const ef_metric *const lab = ef_metric_find("cielab", NULL);
  const ef_xyz black = {0, 0, 0};
  ef_error error = {0};
  ef_frame frame = {.space = EF_SPACE_LAB};
  ef_ellipse e = {.angle_deg = 37.23};
  ef_frame_set(EF_SPACE_MB, NULL, &frame, &error);
  assert_error(&error, EF_INVALID, "needs an observer");
  ef_frame_set((ef_space)9, NULL, &frame, &error);
  assert_error(&error, EF_INVALID, "space 9");
  assert_int_equal(frame.space, EF_SPACE_LAB);
  for (int i = EF_SPACE_XY; i <= EF_SPACE_MB; ++i) {
    if (i == EF_SPACE_LAB)
      continue;
    frame = frame_of((ef_space)i);
    assert_int_equal(ef_metric_ellipse(lab, black, &conditions, &frame,
                                       EF_ELLIPSE_SECTION, 1, &e, &error),
                     EF_NO_ANSWER);
    assert_error(&error, EF_NO_ANSWER, "no chromaticity");
  }
  frame = frame_of(EF_SPACE_CONE);
  frame.background = (ef_xyz){-1, -1, -1};
  ef_metric_ellipse(lab, red, &conditions, &frame, EF_ELLIPSE_SECTION, 1, &e,
                    &error);
  assert_error(&error, EF_NO_ANSWER, "background");
  frame = frame_of(EF_SPACE_XY);
  ef_metric_ellipse(lab, red, &conditions, &frame, EF_ELLIPSE_SECTION, 0, &e,
                    &error);
  assert_error(&error, EF_INVALID, "size 0");
  ef_metric_ellipse(lab, red, &conditions, &frame, (ef_ellipse_kind)2, 1, &e,
                    &error);
  assert_error(&error, EF_INVALID, "figure 2");
  frame.space = (ef_space)9;
  ef_metric_ellipse(lab, red, &conditions, &frame, EF_ELLIPSE_SECTION, 1, &e,
                    &error);
  assert_error(&error, EF_INVALID, "space 9");
  /* A colour outside the appearance model. */
  frame = frame_of(EF_SPACE_LAB);
  ef_metric_ellipse(ef_metric_find("cam16-ucs", NULL), (ef_xyz){-50, -50, -50},
                    &conditions, &frame, EF_ELLIPSE_SECTION, 1, &e, &error);
  assert_error(&error, EF_NO_ANSWER, "cam16-ucs has no ellipse in lab");
  assert_true(e.angle_deg == 37.23); /* left alone */
}

/* ---- Steps and MacAdam ------------------------------------------------- */

static void steps_in_uv_are_circles(void **state) {
  (void)state;
  const ef_uv center = {0.2200, 0.4800}, at = {0.2233, 0.4844};
  const ef_ellipse e = ef_step_circle(center, 5);
  assert_near(e.semi_major, 0.0055, 1e-16);
  assert_near(e.semi_minor, 0.0055, 1e-16);
  assert_near(ef_step_count(center, at), 5, 1e-10);
  assert_near(ef_ellipse_steps(&e, (double[2]){at.u_prime, at.v_prime}), 1,
              1e-10);
}

static void lamps_by_name(void **state) {
  (void)state;
  ef_error error = {0};
  for (size_t i = 0; i < ef_lamp_count(); ++i) {
    const ef_lamp_colour *const lamp = ef_lamp_at(i);
    assert_ptr_equal(ef_lamp_find(lamp->name, NULL), lamp);
    const ef_ellipse one = ef_lamp_ellipse(lamp, 1);
    const ef_ellipse seven = ef_lamp_ellipse(lamp, 7);
    assert_near_relative(seven.semi_major, 7 * one.semi_major, 1e-13);
    assert_near(seven.angle_deg, one.angle_deg, 1e-10);
  }
  assert_null(ef_lamp_at(ef_lamp_count()));
  assert_null(ef_lamp_find("F400", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "F4000");
  assert_null(ef_lamp_find(NULL, &error));
}

static void macadam_at_and_between_his_centres(void **state) {
  (void)state;
  for (size_t i = 0; i < ef_macadam_count(); ++i) {
    const ef_ellipse own = ef_macadam_at(i);
    ef_ellipse e;
    bool between = false;
    assert_int_equal(ef_macadam_ellipse((ef_xy){own.center[0], own.center[1]},
                                        3, &e, &between, NULL),
                     EF_OK);
    assert_true(between);
    /* There and back through u', v' and the logarithm. */
    assert_near_relative(e.semi_major, 3 * own.semi_major, 1e-10);
    assert_near_relative(e.semi_minor, 3 * own.semi_minor, 1e-10);
    assert_near(remainder(e.angle_deg - own.angle_deg, 180), 0, 1e-7);
    /* Continuous: a step beside it next to nothing has changed. */
    ef_macadam_ellipse((ef_xy){own.center[0] + 1e-5, own.center[1]}, 3, &e,
                       NULL, NULL);
    assert_near_relative(e.semi_major, 3 * own.semi_major, 1e-2);
  }
  const struct {
    ef_xy at;
    bool between;
  } places[] = {{{0.3127, 0.3290}, true}, {{0.72, 0.27}, false},
                {{0.07, 0.83}, false},    {{0.17, 0.07}, true},
                {{0.17, 0.06}, false},    {{0.155, 0.3685}, true},
                {{1.0, 0.0}, false},      {{0.3780, 0.1050}, false},
                {{0.30, 0.155}, true}};
  for (size_t i = 0; i < sizeof places / sizeof *places; ++i) {
    ef_ellipse e;
    bool between = !places[i].between;
    assert_int_equal(ef_macadam_ellipse(places[i].at, 1, &e, &between, NULL),
                     EF_OK);
    assert_int_equal(between, places[i].between);
    assert_true(e.semi_minor > 0 && isfinite(e.semi_major));
  }
  assert_true(isnan(ef_macadam_at(25).semi_major));
}

static void macadam_refuses_what_is_no_chromaticity(void **state) {
  (void)state;
  ef_error error = {0};
  ef_ellipse e;
  ef_macadam_ellipse((ef_xy){1.5, 0}, 1, &e, NULL, &error);
  assert_error(&error, EF_INVALID, "x 1.5");
  ef_macadam_ellipse((ef_xy){NOT_A_NUMBER, 0.3}, 1, &e, NULL, &error);
  assert_error(&error, EF_INVALID, "nan");
  ef_macadam_ellipse((ef_xy){0.3, 0.3}, -1, &e, NULL, &error);
  assert_error(&error, EF_INVALID, "size -1");
}

/* ---- Experiments on surface colours ------------------------------------ */

static const ef_conditions daylight = {.white = {94.811, 100, 107.304}};

static void experiments_by_name(void **state) {
  (void)state;
  ef_error error = {0};
  for (size_t i = 0; i < ef_experiment_count(); ++i) {
    ef_experiment *const e =
        ef_experiment_new(ef_experiment_name_at(i), &error);
    assert_non_null(e);
    assert_true(strlen(ef_experiment_source(e)) > 40);
    assert_true(strlen(ef_experiment_remark(e)) > 40);
    assert_null(ef_experiment_center(e, ef_experiment_center_count(e), NULL));
    ef_experiment_free(e);
  }
  assert_null(ef_experiment_name_at(ef_experiment_count()));
  assert_null(ef_experiment_new("huang-2021", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "huang-2012");
  assert_null(ef_experiment_new(NULL, NULL));
  ef_experiment_free(NULL);
}

static ef_ellipsoid experiment_at(const ef_experiment *e, ef_lab lab,
                                  double size, ef_nearest_center *nearest) {
  const ef_frame frame = frame_of(EF_SPACE_LAB);
  ef_ellipsoid out;
  ef_error error = {0};
  if (ef_experiment_ellipsoid(e, ef_lab_to_xyz(lab, daylight.white), &daylight,
                              &frame, size, &out, nearest, &error) != EF_OK)
    fail_msg("%s", error.message);
  return out;
}

/* Half way between two centres and far from the others both count alike; a
 * step beside a centre changes little; sizes are lengths. */
static void between_the_centres(void **state) {
  (void)state;
  ef_experiment *const e = ef_experiment_new("rit-dupont-1997", NULL);
  ef_nearest_center nearest;
  const ef_lab yellow = {76.057, 18.226, 79.894}; /* the last centre */
  const ef_ellipsoid own = experiment_at(e, yellow, 1, &nearest);
  assert_string_equal(nearest.name, "strong orange yellow");
  assert_near(nearest.difference, 0, 1e-9);
  assert_near(own.tensor[8], 0.4228, 1e-12);  /* gLL */
  assert_near(own.tensor[0], 0.2896, 1e-12);  /* gaa */
  assert_near(own.tensor[1], 0.0023, 1e-12);  /* gab */
  assert_near(own.tensor[5], -0.0288, 1e-12); /* gLb */
  const ef_lab beside = {76.057, 18.226, 79.794};
  const ef_ellipsoid near = experiment_at(e, beside, 1, &nearest);
  assert_near(nearest.difference, 0.1, 1e-9);
  /* Weights of (0.1 / 44)^4 or less. */
  for (int k = 0; k < 9; ++k)
    assert_near(near.tensor[k], own.tensor[k], 1e-9);
  const ef_ellipsoid twice = experiment_at(e, yellow, 2, NULL);
  for (int k = 0; k < 3; ++k)
    assert_near_relative(twice.semi_axis[k], 2 * own.semi_axis[k], 1e-12);
  ef_experiment_free(e);
}

static void experiments_refuse(void **state) {
  (void)state;
  ef_experiment *const e = ef_experiment_new("luo-rigg-1986", NULL);
  const ef_frame frame = frame_of(EF_SPACE_XY);
  ef_ellipsoid out;
  ef_error error = {0};
  const ef_xyz grey = {19, 20, 21};
  assert_int_equal(ef_experiment_ellipsoid(e, grey, &daylight, &frame, 0, &out,
                                           NULL, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "size 0");
  assert_int_equal(ef_experiment_ellipsoid(e, (ef_xyz){NOT_A_NUMBER, 20, 21},
                                           &daylight, &frame, 1, &out, NULL,
                                           &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "no colour");
  assert_int_equal(ef_experiment_ellipsoid(e, (ef_xyz){0, 0, 0}, &daylight,
                                           &frame, 1, &out, NULL, &error),
                   EF_NO_ANSWER);
  fail_alloc_at(1);
  assert_null(ef_experiment_new("huang-2012", &error));
  assert_true(fail_alloc_stop());
  assert_error(&error, EF_NO_MEMORY, "experiment");
  ef_experiment_free(e);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(axes_and_form_are_one),
      cmocka_unit_test(a_form_that_is_no_ellipse),
      cmocka_unit_test(carried_to_other_coordinates),
      cmocka_unit_test(cielab_is_round_in_its_own_plane),
      cmocka_unit_test(axes_of_cie94),
      cmocka_unit_test(size_scales_the_axes),
      cmocka_unit_test(greys_have_ellipses),
      cmocka_unit_test(contrasts_are_against_the_background),
      cmocka_unit_test(spaces_by_name),
      cmocka_unit_test(questions_without_an_answer),
      cmocka_unit_test(steps_in_uv_are_circles),
      cmocka_unit_test(lamps_by_name),
      cmocka_unit_test(macadam_at_and_between_his_centres),
      cmocka_unit_test(macadam_refuses_what_is_no_chromaticity),
      cmocka_unit_test(experiments_by_name),
      cmocka_unit_test(between_the_centres),
      cmocka_unit_test(experiments_refuse),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
