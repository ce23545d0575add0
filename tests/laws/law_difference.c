/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Properties of every difference formula, and agreement with the colour
 * differences of Little CMS as a second implementation. */
#include "difference/difference_private.h"

#include "gen.h"
#include "metrics.h"
#include "near.h"

#include <lcms2.h>
#include <stdlib.h>

static void random_colour(gen *g, double coordinate[3]) {
  coordinate[0] = gen_between(g, 0, 100);
  coordinate[1] = gen_between(g, -128, 128);
  coordinate[2] = gen_between(g, -128, 128);
}

/* A third far apart, a third near each other, a third with one colour on or at
 * the neutral axis. */
static void random_pair(gen *g, int i, double a[3], double b[3]) {
  random_colour(g, a);
  random_colour(g, b);
  if (i % 3 == 1) {
    for (int k = 0; k < 3; ++k) b[k] = a[k] + gen_between(g, -3, 3);
  } else if (i % 3 == 2) {
    a[1] *= i % 2 == 0 ? 0 : 0.01;
    a[2] *= i % 2 == 0 ? 0 : 0.01;
  }
}

static void identical_colours_have_no_difference(void **state) {
  (void)state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    gen g = gen_new(1);
    for (int i = 0; i < 20000; ++i) {
      double a[3];
      random_colour(&g, a);
      ef_components part;
      assert_true(ef_metric_difference(every_metric(m), a, a) == 0);
      assert_true(ef_metric_components(every_metric(m), a, a, &part) == 0);
      assert_true(part.lightness == 0 && part.chroma == 0 && part.hue == 0);
    }
  }
}

/* Formulas that are symmetric say so; their parts change sign. */
static void differences_are_symmetric(void **state) {
  (void)state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    if (!ef_metric_symmetric(metric)) continue;
    gen g = gen_new(2);
    for (int i = 0; i < 60000; ++i) {
      double a[3], b[3];
      random_pair(&g, i, a, b);
      ef_components to, fro;
      const double there = ef_metric_components(metric, a, b, &to);
      const double back = ef_metric_components(metric, b, a, &fro);
      /* Sums of two run in the other order: a few roundings. */
      assert_near(back, there, 1e-13 * (1 + there));
      assert_near(fro.lightness, -to.lightness, 1e-12);
      assert_near(fro.chroma, -to.chroma, 1e-12);
      assert_near(fro.hue, -to.hue, 1e-12);
    }
  }
}

/* Exactly opposite hues: the sign of the hue part is that of the hue angles in
 * [0, 360), and the difference is the same both ways. */
static void opposite_hues_are_symmetric(void **state) {
  (void)state;
  gen g = gen_new(3);
  for (int i = 0; i < 20000; ++i) {
    double a[3];
    random_colour(&g, a);
    const double b[3] = {a[0] + 1, -a[1], -a[2]};
    for (size_t m = 0; m < every_metric_count(); ++m) {
      ef_components to, fro;
      if (!ef_metric_symmetric(every_metric(m))) continue;
      const double there = ef_metric_components(every_metric(m), a, b, &to);
      const double back = ef_metric_components(every_metric(m), b, a, &fro);
      assert_near(back, there, 1e-13 * (1 + there));
      assert_true(to.hue == -fro.hue);
      assert_true((to.hue > 0) == (a[2] > 0));
    }
  }
}

static void parts_make_the_difference(void **state) {
  (void)state;
  gen g = gen_new(4);
  const ef_metric *const lab = ef_metric_find("cielab", NULL);
  const ef_metric *const de2000 = ef_metric_find("ciede2000", NULL);
  for (int i = 0; i < 60000; ++i) {
    double a[3], b[3];
    random_pair(&g, i, a, b);
    ef_components p;
    double d = ef_metric_components(lab, a, b, &p);
    double sum = p.lightness * p.lightness + p.chroma * p.chroma +
                 p.hue * p.hue;
    /* Squared chromas to 3e4 lose some 1e-12 in the hue part. */
    assert_near(sum, d * d, 1e-11 * (1 + d * d));
    assert_true(d == ef_metric_difference(lab, a, b));
    d = ef_metric_components(de2000, a, b, &p);
    ef__ciede2000 t;
    ef__ciede2000_terms(a, b, &t);
    sum = p.lightness * p.lightness + p.chroma * p.chroma + p.hue * p.hue +
          t.r_t * p.chroma * p.hue;
    assert_near(sum, d * d, 1e-13 * (1 + d * d));
    assert_true(d == ef_metric_difference(de2000, a, b));
  }
}

static double form(const double g[9], const double d[3]) {
  double sum = 0;
  for (int i = 0; i < 3; ++i) {
    for (int k = 0; k < 3; ++k) sum += g[3 * i + k] * d[i] * d[k];
  }
  return sum;
}

static void check_positive(const double g[9]) {
  assert_true(g[1] == g[3] && g[2] == g[6] && g[5] == g[7]);
  /* Leading minors (Sylvester). */
  assert_true(g[0] > 0);
  assert_true(g[0] * g[4] - g[1] * g[3] > 0);
  const double determinant = g[0] * (g[4] * g[8] - g[5] * g[7]) -
                             g[1] * (g[3] * g[8] - g[5] * g[6]) +
                             g[2] * (g[3] * g[7] - g[4] * g[6]);
  assert_true(determinant > 0);
}

static void tensors_are_positive_definite(void **state) {
  (void)state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    gen g = gen_new(5);
    for (int i = 0; i < 60000; ++i) {
      double a[3], b[3], tensor[9];
      random_pair(&g, i, a, b);
      ef_metric_tensor(every_metric(m), a, tensor);
      check_positive(tensor);
    }
  }
}

/* The difference of a small step is the tensor's length of it. The step lies
 * symmetric about the colour, so the error is of second order in the step; on
 * the neutral axis, which has chroma on every side, it begins there. */
/* Of formulas with weights of the reference the mean of both orders. */
static double small_difference(const ef_metric *metric, const double from[3],
                               const double to[3]) {
  const double there = ef_metric_difference(metric, from, to);
  if (ef_metric_symmetric(metric)) return there;
  const double back = ef_metric_difference(metric, to, from);
  return sqrt((there * there + back * back) / 2);
}

/* The hue term of CMC has a step at 164 and 345 degrees and a kink at 55 and
 * 282, its lightness weight a step at L* = 16 (ISO 105-J03). */
static bool at_a_step(const ef_metric *metric, const double c[3]) {
  static const double hue_deg[] = {55, 164, 282, 345};
  if (strncmp(ef_metric_name(metric), "cmc", 3) != 0) return false;
  const double chroma = sqrt(c[1] * c[1] + c[2] * c[2]);
  const double h_deg = atan2(c[2], c[1]) * 57.295779513082321;
  bool at = fabs(c[0] - 16) < 0.01;
  for (int i = 0; i < 4; ++i) {
    const double turn = remainder(h_deg - hue_deg[i], 360);
    at = at || fabs(turn) * chroma < 1;
  }
  return at;
}

static void tensors_measure_small_steps(void **state) {
  (void)state;
  const double size = 1e-3;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    deviation worst = {0, ""};
    gen g = gen_new(6);
    for (int i = 0; i < 60000; ++i) {
      double c[3], tensor[9], step[3], from[3], to[3];
      random_colour(&g, c);
      if (i % 4 == 0) c[1] = c[2] = 0;
      for (int k = 0; k < 3; ++k) {
        step[k] = size * gen_between(&g, -1, 1);
        from[k] = i % 4 == 0 ? c[k] : c[k] - step[k] / 2;
        to[k] = from[k] + step[k];
      }
      if (at_a_step(metric, c)) continue;
      ef_metric_tensor(metric, c, tensor);
      const double expected = sqrt(form(tensor, step));
      const double ratio = small_difference(metric, from, to) / expected;
      char where[96];
      snprintf(where, sizeof where, "L*a*b* %.3f %.3f %.3f", c[0], c[1], c[2]);
      const double chroma = sqrt(c[1] * c[1] + c[2] * c[2]);
      /* Weights change by (step / chroma)^2 over a step across the hue. Where
       * the steps leave the neutral axis only, the formula's weights change
       * with the step: S_C, S_H by 0.045 step. */
      const double allowed =
          chroma > 0 ? 1e-8 + 4 * size * size / (chroma * chroma) : 2e-4;
      assert_near(ratio, 1, allowed);
      deviation_add(&worst, ratio, 1, where);
    }
    deviation_print(&worst, ef_metric_name(metric));
  }
}

/* The closed forms against the numeric tensor that formulas without one use. */
static void closed_tensors_equal_numeric_ones(void **state) {
  (void)state;
  for (size_t m = 0; m < every_metric_count(); ++m) {
    gen g = gen_new(7);
    for (int i = 0; i < 20000; ++i) {
      double c[3], closed[9], numeric[9];
      random_colour(&g, c);
      if (c[1] * c[1] + c[2] * c[2] < 1) continue; /* near the kink */
      if (at_a_step(every_metric(m), c)) continue;
      ef_metric_tensor(every_metric(m), c, closed);
      ef__numeric_tensor(every_metric(m), c, numeric);
      /* Rounding 1e-13 in squares of 1e-8 at worst: see tensor.c. */
      for (int k = 0; k < 9; ++k) assert_near(numeric[k], closed[k], 2e-7);
    }
  }
}

static void batches_do_not_depend_on_size_or_threads(void **state) {
  (void)state;
  enum { N = 50007 };
  double *const a = malloc(3 * N * sizeof *a);
  double *const b = malloc(3 * N * sizeof *b);
  double *const one = malloc(N * sizeof *one);
  double *const many = malloc(N * sizeof *many);
  assert_true(a != NULL && b != NULL && one != NULL && many != NULL);
  gen g = gen_new(8);
  for (int i = 0; i < N; ++i) random_pair(&g, i, a + 3 * i, b + 3 * i);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    for (size_t i = 0; i < N; ++i) {
      ef_metric_difference_batch(metric, 1, a + 3 * i, b + 3 * i, 1, one + i);
      /* The kernels round elsewhere than the single call. */
      assert_near(one[i], ef_metric_difference(metric, a + 3 * i, b + 3 * i),
                  1e-10);
    }
    for (int jobs = 0; jobs < 5; ++jobs) {
      memset(many, 0, N * sizeof *many);
      ef_metric_difference_batch(metric, N, a, b, jobs, many);
      assert_same_bits(many, one, N);
    }
    ef_metric_difference_batch(metric, 5, a + 3, b + 3, 2, many);
    assert_same_bits(many, one + 1, 5);
  }
  free(a);
  free(b);
  free(one);
  free(many);
}

static void coordinates_do_not_depend_on_the_batch(void **state) {
  (void)state;
  enum { N = 10007 };
  const ef_conditions conditions = {.white = {95.047, 100, 108.883}};
  double *const xyz = malloc(3 * N * sizeof *xyz);
  double *const one = malloc(3 * N * sizeof *one);
  double *const many = malloc(3 * N * sizeof *many);
  assert_true(xyz != NULL && one != NULL && many != NULL);
  gen g = gen_new(10);
  gen_fill(&g, 3 * N, 20, 90, xyz);
  for (size_t m = 0; m < every_metric_count(); ++m) {
    const ef_metric *const metric = every_metric(m);
    for (size_t i = 0; i < N; ++i) {
      const double *const v = xyz + 3 * i;
      double single[3];
      ef_metric_coordinates(metric, (ef_xyz){v[0], v[1], v[2]}, &conditions,
                            single);
      ef_metric_coordinates_batch(metric, 1, v, &conditions, 1, one + 3 * i);
      for (size_t c = 0; c < 3; ++c)
        assert_near(one[3 * i + c], single[c], 1e-10);
    }
    for (int jobs = 0; jobs < 4; ++jobs) {
      memset(many, 0, 3 * N * sizeof *many);
      ef_metric_coordinates_batch(metric, N, xyz, &conditions, jobs, many);
      assert_same_bits(many, one, 3 * N);
    }
    /* In place. */
    memcpy(many, xyz, 3 * N * sizeof *many);
    ef_metric_coordinates_batch(metric, N, many, &conditions, 2, many);
    assert_same_bits(many, one, 3 * N);
  }
  free(xyz);
  free(one);
  free(many);
}

static void agrees_with_little_cms(void **state) {
  (void)state;
  deviation lab = {0, ""}, de2000 = {0, ""};
  gen g = gen_new(9);
  for (int i = 0; i < 100000; ++i) {
    double a[3], b[3];
    random_pair(&g, i, a, b);
    const cmsCIELab ca = {a[0], a[1], a[2]}, cb = {b[0], b[1], b[2]};
    const ef_lab ea = {a[0], a[1], a[2]}, eb = {b[0], b[1], b[2]};
    char where[96];
    snprintf(where, sizeof where, "%.3f %.3f %.3f and %.3f %.3f %.3f", a[0],
             a[1], a[2], b[0], b[1], b[2]);
    deviation_add(&lab, ef_delta_e_cielab(ea, eb), cmsDeltaE(&ca, &cb), where);
    deviation_add(&de2000, ef_delta_e_ciede2000(ea, eb, 1, 1, 1),
                  cmsCIE2000DeltaE(&ca, &cb, 1, 1, 1), where);
    deviation_add(&de2000, ef_delta_e_ciede2000(ea, eb, 2, 1.5, 0.8),
                  cmsCIE2000DeltaE(&ca, &cb, 2, 1.5, 0.8), where);
  }
  deviation_print(&lab, "CIELAB against Little CMS, 100000 pairs");
  deviation_print(&de2000, "CIEDE2000 against Little CMS, 200000 values");
  /* Both sides round; the other one goes through powers and hue angles. */
  assert_true(lab.largest < 1e-12);
  assert_true(de2000.largest < 1e-10);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(identical_colours_have_no_difference),
      cmocka_unit_test(differences_are_symmetric),
      cmocka_unit_test(opposite_hues_are_symmetric),
      cmocka_unit_test(parts_make_the_difference),
      cmocka_unit_test(tensors_are_positive_definite),
      cmocka_unit_test(tensors_measure_small_steps),
      cmocka_unit_test(closed_tensors_equal_numeric_ones),
      cmocka_unit_test(batches_do_not_depend_on_size_or_threads),
      cmocka_unit_test(coordinates_do_not_depend_on_the_batch),
      cmocka_unit_test(agrees_with_little_cms),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
