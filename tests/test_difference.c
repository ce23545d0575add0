/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "difference/difference_private.h"

#include "gen.h"
#include "metrics.h"
#include "near.h"

static void formulas_are_found_by_name(void **state) {
  (void)state;
  ef_error error = {0};
  for (size_t i = 0; i < ef_metric_count(); ++i) {
    const ef_metric *const metric = ef_metric_at(i);
    assert_ptr_equal(ef_metric_find(ef_metric_name(metric), &error), metric);
    assert_true(strlen(ef_metric_title(metric)) > 0);
    assert_true(strlen(ef_metric_symbol(metric)) > 0);
    assert_true(strlen(ef_metric_source(metric)) > 0);
    /* A default threshold has a source, or there is none. */
    const ef_jnd jnd = ef_metric_jnd(metric);
    assert_true(jnd.value > 0 || isnan(jnd.value));
    assert_true((strlen(jnd.criterion) > 0) == (jnd.value > 0));
    assert_true((strlen(jnd.source) > 0) == (jnd.value > 0));
  }
  assert_null(ef_metric_at(ef_metric_count()));
  assert_non_null(ef_metric_find("CIEDE2000", NULL));
}

static void default_thresholds_are_the_published_ones(void **state) {
  (void)state;
  /* Mahy, Van Eycken & Oosterlinck (1994); ISO/TR 28642:2016. */
  assert_near(ef_metric_jnd(ef_metric_find("cielab", NULL)).value, 2.3, 0);
  assert_near(ef_metric_jnd(ef_metric_find("ciede2000", NULL)).value, 0.8, 0);
}

static void unknown_names_list_near_ones(void **state) {
  (void)state;
  ef_error error = {0};
  assert_null(ef_metric_find("ciede200", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "ciede2000");
  assert_null(ef_metric_find("", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "difference formula");
  assert_null(ef_metric_find(NULL, NULL));
}

static void parametric_factors_divide_their_parts(void **state) {
  (void)state;
  const ef_lab grey = {50, 0, 0}, lighter = {60, 0, 0};
  const double plain = ef_delta_e_ciede2000(grey, lighter, 1, 1, 1);
  /* S_L at mean L* 55: 1 + 0.015 * 25 / sqrt(45). */
  assert_near_relative(plain, 10 / (1 + 0.375 / sqrt(45)), 1e-15);
  assert_near_relative(ef_delta_e_ciede2000(grey, lighter, 2, 1, 1), plain / 2,
                       1e-15);
  assert_near_relative(ef_delta_e_ciede2000(grey, lighter, 1, 7, 9), plain,
                       1e-15);
}

static void achromatic_pairs_have_no_hue(void **state) {
  (void)state;
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  const double neutral[3] = {50, 0, 0}, red[3] = {50, 30, 10};
  const double lighter[3] = {52, 0, 0};
  ef_components part;
  ef_metric_components(metric, neutral, red, &part);
  assert_true(part.hue == 0 && part.chroma > 0 && part.lightness == 0);
  ef_metric_components(metric, red, neutral, &part);
  assert_true(part.hue == 0 && part.chroma < 0);
  ef_metric_components(metric, neutral, lighter, &part);
  assert_true(part.hue == 0 && part.chroma == 0 && part.lightness > 0);
}

static void neutral_tensor_is_that_of_g_one_half(void **state) {
  (void)state;
  /* On the axis G = 0.5 and all weights but S_L are 1. */
  const double grey[3] = {37.23, 0, 0};
  double g[9];
  ef_metric_tensor(ef_metric_find("ciede2000", NULL), grey, g);
  const double off = (37.23 - 50) * (37.23 - 50);
  const double s_l = 1 + 0.015 * off / sqrt(20 + off);
  const double expected[9] = {1 / (s_l * s_l), 0, 0, 0, 2.25, 0, 0, 0, 1};
  for (int i = 0; i < 9; ++i) assert_near(g[i], expected[i], 1e-15);
}

static void not_a_number_goes_through(void **state) {
  (void)state;
  const double a[3] = {50, NOT_A_NUMBER, 1}, b[3] = {50, 2, 1};
  for (size_t i = 0; i < ef_metric_count(); ++i) {
    assert_true(isnan(ef_metric_difference(ef_metric_at(i), a, b)));
    assert_true(isnan(ef_metric_difference(ef_metric_at(i), b, a)));
  }
}

/* CIELAB takes any XYZ. The other spaces end with the real colours, or have
 * slopes without a limit where a response is zero: colours in the gamut of
 * BT.2020, by its matrix to XYZ. */
static ef_xyz random_xyz(gen *g, const ef_metric *metric, double least) {
  if (metric->carry != NULL || strncmp(metric->name, "din99o", 6) == 0) {
    const double X = gen_between(g, least, 110), Y = gen_between(g, least, 110);
    return (ef_xyz){X, Y, gen_between(g, least, 110)};
  }
  const double R = gen_between(g, 0.5, 100), G = gen_between(g, 0.5, 100);
  const double B = gen_between(g, 0.5, 100);
  return (ef_xyz){0.636958 * R + 0.144617 * G + 0.168881 * B,
                  0.262700 * R + 0.677998 * G + 0.059302 * B,
                  0.028073 * G + 1.060985 * B};
}

static void coordinates_come_back(void **state) {
  (void)state;
  const ef_conditions conditions = {.white = {95.047, 100, 108.883}};
  gen g = gen_new(1);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    for (int i = 0; i < 2000; ++i) {
      const ef_xyz xyz = random_xyz(&g, every_metric(m), -5);
      double c[3];
      ef_metric_coordinates(every_metric(m), xyz, &conditions, c);
      const ef_xyz back = ef_metric_xyz(every_metric(m), c, &conditions);
      /* The flat end of a compression magnifies 1e-14 by some hundreds. */
      assert_near(back.X, xyz.X, 5e-11);
      assert_near(back.Y, xyz.Y, 5e-11);
      assert_near(back.Z, xyz.Z, 5e-11);
    }
  }
}

static void jacobian_is_the_slope_of_the_coordinates(void **state) {
  (void)state;
  const ef_conditions conditions = {.white = {95.047, 100, 108.883}};
  const double h = 1e-5;
  gen g = gen_new(2);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    for (int i = 0; i < 2000; ++i) {
      const ef_xyz xyz = random_xyz(&g, every_metric(m), 0.1);
      const double v[3] = {xyz.X, xyz.Y, xyz.Z};
      double j[9];
      ef_metric_jacobian(every_metric(m), xyz, &conditions, j);
      for (int k = 0; k < 3; ++k) {
        double u[3] = {v[0], v[1], v[2]}, w[3] = {v[0], v[1], v[2]};
        double cu[3], cw[3];
        u[k] += h;
        w[k] -= h;
        ef_metric_coordinates(every_metric(m), (ef_xyz){u[0], u[1], u[2]},
                              &conditions, cu);
        ef_metric_coordinates(every_metric(m), (ef_xyz){w[0], w[1], w[2]},
                              &conditions, cw);
        for (int r = 0; r < 3; ++r) {
          const double slope = (cu[r] - cw[r]) / (2 * h);
          /* Third derivatives near black times h^2, and rounding over h. */
          assert_near(slope, j[3 * r + k], 2e-6 * (1 + fabs(slope)));
        }
      }
    }
  }
}

/* ---- Expansions -------------------------------------------------------- */

/* The rotation term has a step of 1e-5 where the mean hue passes 0 degrees, and
 * the whole formula one at opposite hues: differences do not reach over. */
static bool near_a_step(const double reference[3], const double sample[3]) {
  ef__ciede2000 t;
  ef__ciede2000_terms(reference, sample, &t);
  const double size = t.chroma1 * t.chroma2;
  return (t.cos_h > 0 && fabs(t.sin_h) < 1e-3) ||
         fabs(fabs(t.delta_h) - 2 * sqrt(size)) < 1e-3 || t.chroma2 < 0.5;
}

static void check_expansion(const ef_metric *metric, const double reference[3],
                            const double sample[3]) {
  const double h = 1e-4;
  ef__expansion at;
  ef__metric_expand(metric, reference, sample, &at);
  const double d = ef_metric_difference(metric, reference, sample);
  assert_near(at.square, d * d, 1e-11 * (1 + d * d));
  for (int k = 0; k < 3; ++k) {
    double u[3] = {sample[0], sample[1], sample[2]};
    ef__expansion up, down;
    u[k] = sample[k] + h;
    ef__metric_expand(metric, reference, u, &up);
    u[k] = sample[k] - h;
    ef__metric_expand(metric, reference, u, &down);
    const double slope = (up.square - down.square) / (2 * h);
    assert_near(at.gradient[k], slope, 1e-6 * (1 + fabs(slope)));
    for (int i = 0; i < 3; ++i) {
      const double bend = (up.gradient[i] - down.gradient[i]) / (2 * h);
      assert_near(at.hessian[3 * i + k], bend, 1e-5 * (1 + fabs(bend)));
    }
  }
}

static void expansions_are_the_derivatives(void **state) {
  (void)state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    gen g = gen_new(3);
    for (int i = 0; i < 6000; ++i) {
      double r[3], s[3];
      for (int k = 0; k < 3; ++k) {
        r[k] = gen_between(&g, k == 0 ? 0 : -100, 100);
        s[k] = i % 3 == 0 ? r[k] + gen_between(&g, -2, 2)
                          : gen_between(&g, k == 0 ? 0 : -100, 100);
      }
      if (i % 5 == 0) r[1] = r[2] = 0;
      if (near_a_step(r, s)) continue;
      check_expansion(every_metric(m), r, s);
    }
  }
}

/* A formula without an expansion of its own gets one by differences. */
static void numeric_expansions_agree(void **state) {
  (void)state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    ef_metric plain = *every_metric(m);
    plain.expand = NULL;
    gen g = gen_new(4);
    for (int i = 0; i < 1000; ++i) {
      double r[3], s[3];
      for (int k = 0; k < 3; ++k) {
        r[k] = gen_between(&g, k == 0 ? 0 : -100, 100);
        s[k] = gen_between(&g, k == 0 ? 0 : -100, 100);
      }
      if (near_a_step(r, s)) continue;
      ef__expansion closed, numeric;
      ef__metric_expand(every_metric(m), r, s, &closed);
      ef__metric_expand(&plain, r, s, &numeric);
      for (int k = 0; k < 3; ++k) {
        assert_near(numeric.gradient[k], closed.gradient[k],
                    1e-5 * (1 + fabs(closed.gradient[k])));
      }
      for (int k = 0; k < 9; ++k) {
        assert_near(numeric.hessian[k], closed.hessian[k],
                    1e-4 * (1 + closed.square));
      }
    }
  }
}

/* Carried to XYZ, gradient and Hessian are those of the composition, for
 * formulas that carry the bending of their coordinates too. */
static void carried_expansions_are_the_derivatives(void **state) {
  (void)state;
  const ef_conditions conditions = {.white = {95.047, 100, 108.883}};
  const double h = 1e-5;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    if (metric->carry == NULL) continue;
    gen g = gen_new(5);
    for (int i = 0; i < 1000; ++i) {
      const double r[3] = {gen_between(&g, 0, 100), gen_between(&g, -90, 90),
                           gen_between(&g, -90, 90)};
      const double v[3] = {gen_between(&g, 2, 90), gen_between(&g, 2, 90),
                           gen_between(&g, 2, 90)};
      ef__expansion out[3];
      bool steps = false;
      for (int k = 0; k < 3; ++k) {
        for (int side = -1; side <= 1; ++side) {
          double u[3] = {v[0], v[1], v[2]}, c[3];
          u[k] += side * h;
          const ef_xyz xyz = {u[0], u[1], u[2]};
          ef__expansion in;
          ef_metric_coordinates(metric, xyz, &conditions, c);
          steps = steps || near_a_step(r, c);
          ef__metric_expand(metric, r, c, &in);
          ef__metric_carry(metric, xyz, c, &conditions, &in, &out[side + 1]);
        }
        if (steps) break;
        const double slope = (out[2].square - out[0].square) / (2 * h);
        assert_near(out[1].gradient[k], slope, 1e-5 * (1 + fabs(slope)));
        for (int j = 0; j < 3; ++j) {
          const double bend = (out[2].gradient[j] - out[0].gradient[j]) /
                              (2 * h);
          assert_near(out[1].hessian[3 * j + k], bend, 1e-4 * (1 + fabs(bend)));
        }
      }
    }
  }
}

/* Without `carry` the Jacobian does the work and the bending is left out: at
 * the target itself, where the gradient is zero, nothing is missing. */
static void plain_carry_is_exact_without_a_gradient(void **state) {
  (void)state;
  const ef_conditions conditions = {.white = {95.047, 100, 108.883}};
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    ef_metric plain = *metric;
    plain.carry = NULL;
    const ef_xyz xyz = {37.23, 20.1, 11.7};
    double c[3];
    ef_metric_coordinates(metric, xyz, &conditions, c);
    ef__expansion in, with, without;
    ef__metric_expand(metric, c, c, &in);
    ef__metric_carry(metric, xyz, c, &conditions, &in, &with);
    ef__metric_carry(&plain, xyz, c, &conditions, &in, &without);
    for (int k = 0; k < 9; ++k) {
      assert_near(without.hessian[k], with.hessian[k],
                  1e-12 * (1 + fabs(with.hessian[k])));
    }
    for (int k = 0; k < 3; ++k) assert_near(without.gradient[k], 0, 1e-9);
  }
}

static void the_kink_of_the_neutral_axis_has_a_slope_beside_it(void **state) {
  (void)state;
  const ef_metric *const metric = ef_metric_find("ciede2000", NULL);
  const double red[3] = {50, 30, 10}, grey[3] = {50, 0, 0};
  ef__expansion e;
  ef__metric_expand(metric, red, grey, &e);
  assert_true(isfinite(e.square) && isfinite(e.hessian[4]));
  /* Towards the reference the difference falls. */
  assert_true(e.gradient[1] * red[1] + e.gradient[2] * red[2] < 0);
  ef__metric_expand(metric, grey, grey, &e);
  assert_true(isfinite(e.square) && e.square < 1e-12);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(formulas_are_found_by_name),
      cmocka_unit_test(default_thresholds_are_the_published_ones),
      cmocka_unit_test(unknown_names_list_near_ones),
      cmocka_unit_test(parametric_factors_divide_their_parts),
      cmocka_unit_test(achromatic_pairs_have_no_hue),
      cmocka_unit_test(neutral_tensor_is_that_of_g_one_half),
      cmocka_unit_test(not_a_number_goes_through),
      cmocka_unit_test(coordinates_come_back),
      cmocka_unit_test(jacobian_is_the_slope_of_the_coordinates),
      cmocka_unit_test(expansions_are_the_derivatives),
      cmocka_unit_test(numeric_expansions_agree),
      cmocka_unit_test(carried_expansions_are_the_derivatives),
      cmocka_unit_test(plain_carry_is_exact_without_a_gradient),
      cmocka_unit_test(the_kink_of_the_neutral_axis_has_a_slope_beside_it),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
