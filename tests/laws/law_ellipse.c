/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ellipses of every formula in every space hold the colours they say. */
#include <evenfield/difference.h>

#include "base/base_private.h"
#include "gen.h"
#include "metrics.h"
#include "near.h"

static const ef_conditions conditions = {.white = {95.047, 100, 108.883}};
static ef_frame frames[EF_SPACE_CONE_LM + 1];

static int set_frames(void **state) {
  (void)state;
  ef_observer *const observer = ef_observer_new("cie-2015-2", NULL);
  if (observer == NULL)
    return -1;
  for (int i = 0; i <= EF_SPACE_CONE_LM; ++i) {
    if (ef_frame_set((ef_space)i, observer, &frames[i], NULL) != EF_OK)
      return -1;
  }
  ef_observer_free(observer);
  return 0;
}

/* In the gamut of BT.2020. */
static ef_xyz random_colour(gen *g) {
  const double R = gen_between(g, 2, 90), G = gen_between(g, 2, 90);
  const double B = gen_between(g, 2, 90);
  return (ef_xyz){0.636958 * R + 0.144617 * G + 0.168881 * B,
                  0.262700 * R + 0.677998 * G + 0.059302 * B,
                  0.028073 * G + 1.060985 * B};
}

/* The colour with these coordinates, near `start`: Newton's method. */
static ef_xyz colour_at(const ef_frame *frame, ef_xyz start,
                        const double target[3]) {
  double v[3] = {start.X, start.Y, start.Z};
  for (int round = 0; round < 6; ++round) {
    double c[3], j[9], inverse[9], step[3];
    const ef_status status = ef_frame_coordinates(
        frame, (ef_xyz){v[0], v[1], v[2]}, &conditions, c, j, NULL);
    assert_int_equal(status, EF_OK);
    assert_true(ef__mat3_inverse(j, inverse));
    for (int k = 0; k < 3; ++k)
      c[k] = target[k] - c[k];
    ef__mat3_apply(inverse, c, step);
    for (int k = 0; k < 3; ++k)
      v[k] += step[k];
  }
  return (ef_xyz){v[0], v[1], v[2]};
}

static double difference_from(const ef_metric *metric, ef_xyz from,
                              const ef_frame *frame, const double at[3]) {
  double a[3], b[3];
  ef_metric_coordinates(metric, from, &conditions, a);
  ef_metric_coordinates(metric, colour_at(frame, from, at), &conditions, b);
  return ef_metric_difference(metric, a, b);
}

/* Where hue turns over a step. */
static bool is_near_grey(ef_xyz xyz) {
  const ef_lab lab = ef_xyz_to_lab(xyz, conditions.white);
  return hypot(lab.a_star, lab.b_star) < 10;
}

static void boundaries_differ_by_the_size(void **state) {
  (void)state;
  const double size = 1e-4;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    deviation worst = {0, ""};
    gen g = gen_new(1);
    for (int i = 0; i < 1200; ++i) {
      const ef_xyz xyz = random_colour(&g);
      const ef_frame *const frame = &frames[i % (EF_SPACE_CONE_LM + 1)];
      const double turn_deg = gen_between(&g, 0, 360);
      if (is_near_grey(xyz))
        continue;
      ef_ellipsoid solid;
      assert_int_equal(ef_metric_ellipsoid(metric, xyz, &conditions, frame,
                                           size, &solid, NULL),
                       EF_OK);
      const double *const t = solid.tensor;
      char where[96];
      snprintf(where, sizeof where, "XYZ %.2f %.2f %.2f in %s", xyz.X, xyz.Y,
               xyz.Z, ef_space_name(frame->space));
      double at[3], least = INFINITE;
      /* On the section the third coordinate is the centre's; on the shadow the
       * point that makes the difference least has the size. */
      ef_ellipse e = ef_ellipsoid_figure(&solid, EF_ELLIPSE_SECTION);
      ef_ellipse_point(&e, turn_deg, at);
      at[2] = solid.center[2];
      const double on = difference_from(metric, xyz, frame, at) / size;
      deviation_add(&worst, on, 1, where);
      e = ef_ellipsoid_figure(&solid, EF_ELLIPSE_PROJECTION);
      ef_ellipse_point(&e, turn_deg, at);
      const double third = -(t[2] * (at[0] - solid.center[0]) +
                             t[5] * (at[1] - solid.center[1])) /
                           t[8];
      const double step = 0.2 / sqrt(t[8]);
      for (int k = -1; k <= 1; ++k) {
        at[2] = solid.center[2] + third + k * step;
        const double d = difference_from(metric, xyz, frame, at) / size;
        if (k == 0)
          deviation_add(&worst, d, 1, where);
        least = fmin(least, k == 0 ? INFINITE : d);
      }
      /* Beside it: sqrt(1 + 0.2^2). */
      assert_near(least, sqrt(1.04), 2e-3);
    }
    deviation_print(&worst, ef_metric_name(metric));
    /* Second-order terms: the size over the smallest radius of curvature,
     * some units of chroma or of dark responses. */
    assert_true(worst.largest < 1e-4);
  }
}

static void projections_hold_sections(void **state) {
  (void)state;
  gen g = gen_new(2);
  for (int i = 0; i < 3000; ++i) {
    const ef_metric *const metric =
        every_metric((size_t)i % every_metric_count());
    const ef_frame *const frame = &frames[i % (EF_SPACE_CONE_LM + 1)];
    ef_ellipsoid solid;
    assert_int_equal(ef_metric_ellipsoid(metric, random_colour(&g), &conditions,
                                         frame, 1, &solid, NULL),
                     EF_OK);
    const ef_ellipse inner = ef_ellipsoid_figure(&solid, EF_ELLIPSE_SECTION);
    const ef_ellipse outer = ef_ellipsoid_figure(&solid, EF_ELLIPSE_PROJECTION);
    for (int turn_deg = 0; turn_deg < 360; turn_deg += 30) {
      double p[2];
      ef_ellipse_point(&inner, turn_deg, p);
      assert_true(ef_ellipse_steps(&outer, p) < 1 + 1e-9);
    }
    /* The axes of the solid are at right angles, in order, and on it. */
    for (int k = 0; k < 3; ++k) {
      const double *const d = solid.direction + 3 * k;
      const double *const n = solid.direction + 3 * ((k + 1) % 3);
      assert_near(d[0] * d[0] + d[1] * d[1] + d[2] * d[2], 1, 1e-12);
      assert_near(d[0] * n[0] + d[1] * n[1] + d[2] * n[2], 0, 1e-12);
      double form = 0;
      for (int r = 0; r < 3; ++r) {
        for (int c = 0; c < 3; ++c)
          form += solid.tensor[3 * r + c] * d[r] * d[c];
      }
      assert_near_relative(1 / sqrt(form), solid.semi_axis[k], 1e-5);
      if (k > 0)
        assert_true(solid.semi_axis[k] <= solid.semi_axis[k - 1]);
    }
  }
}

/* Positive definite on the neutral axis too, from near black to beyond white,
 * and no leap beside it. */
static void greys_have_ellipses(void **state) {
  (void)state;
  const ef_xyz w = conditions.white;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    for (int space = 0; space <= EF_SPACE_CONE_LM; ++space) {
      for (double share = 1e-4; share < 2; share *= 1.7) {
        ef_ellipsoid on, beside;
        assert_int_equal(
            ef_metric_ellipsoid(every_metric(m),
                                (ef_xyz){share * w.X, share * w.Y, share * w.Z},
                                &conditions, &frames[space], 1, &on, NULL),
            EF_OK);
        assert_int_equal(ef_metric_ellipsoid(every_metric(m),
                                             (ef_xyz){share * w.X * (1 + 1e-9),
                                                      share * w.Y, share * w.Z},
                                             &conditions, &frames[space], 1,
                                             &beside, NULL),
                         EF_OK);
        for (int k = 0; k < 3; ++k) {
          assert_true(on.semi_axis[k] > 0 && isfinite(on.semi_axis[k]));
          /* k_C and k_H may differ: the weights beside the axis are theirs. */
          if (strstr(ef_metric_name(every_metric(m)), "kh=") == NULL)
            assert_near_relative(beside.semi_axis[k], on.semi_axis[k], 1e-6);
        }
      }
    }
  }
}

static void jacobians_of_the_spaces(void **state) {
  (void)state;
  const double h = 1e-5;
  gen g = gen_new(3);
  for (int i = 0; i < 3000; ++i) {
    const ef_frame *const frame = &frames[i % (EF_SPACE_CONE_LM + 1)];
    const ef_xyz xyz = random_colour(&g);
    double at[3], j[9];
    ef_frame_coordinates(frame, xyz, &conditions, at, j, NULL);
    for (int k = 0; k < 3; ++k) {
      double up[3], down[3];
      const ef_xyz high = {xyz.X + (k == 0 ? h : 0), xyz.Y + (k == 1 ? h : 0),
                           xyz.Z + (k == 2 ? h : 0)};
      const ef_xyz low = {xyz.X - (k == 0 ? h : 0), xyz.Y - (k == 1 ? h : 0),
                          xyz.Z - (k == 2 ? h : 0)};
      ef_frame_coordinates(frame, high, &conditions, up, NULL, NULL);
      ef_frame_coordinates(frame, low, &conditions, down, NULL, NULL);
      for (int row = 0; row < 3; ++row) {
        const double slope = (up[row] - down[row]) / (2 * h);
        /* Rounding 1e-14 over h, and third derivatives times h^2. */
        assert_near(j[3 * row + k], slope, 1e-8 + 1e-8 * fabs(slope));
      }
    }
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(boundaries_differ_by_the_size),
      cmocka_unit_test(projections_hold_sections),
      cmocka_unit_test(greys_have_ellipses),
      cmocka_unit_test(jacobians_of_the_spaces),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, set_frames, NULL);
}
