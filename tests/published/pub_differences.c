/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Check values of the other formulas, and CMC against Little CMS. */
#include <evenfield/difference.h>

#include <lcms2.h>

#include "figures.h"
#include "gen.h"
#include "near.h"

static const ef_conditions d65 = {.white = {95.047, 100, 108.883}};

static double of_labs(const ef_metric *metric, const figures *pairs,
                      size_t row) {
  double at[2][3];
  for (size_t k = 0; k < 2; ++k) {
    const ef_lab lab = {figures_number(pairs, row, 3 * k),
                        figures_number(pairs, row, 3 * k + 1),
                        figures_number(pairs, row, 3 * k + 2)};
    ef_metric_coordinates(metric, ef_lab_to_xyz(lab, d65.white), &d65, at[k]);
  }
  return ef_metric_difference(metric, at[0], at[1]);
}

static void second_implementation(void **state) {
  (void)state;
  figures pairs = figures_read("published", "ciede2000_pairs.csv");
  figures f = figures_read("published", "other-differences.csv");
  assert_int_equal(f.n_rows, 34);
  for (size_t column = 1; column < f.n_columns; ++column) {
    ef_metric *const metric = ef_metric_new(f.column[column], NULL);
    assert_non_null(metric);
    deviation worst = {0, ""};
    for (size_t row = 0; row < f.n_rows; ++row) {
      const double d = of_labs(metric, &pairs, row);
      char where[32];
      snprintf(where, sizeof where, "pair %zu", row + 1);
      deviation_add(&worst, d, figures_number(&f, row, column), where);
      /* Half a unit of the sixth decimal, and rounding. */
      assert_near(d, figures_number(&f, row, column), 0.501e-6);
    }
    deviation_print(&worst, f.column[column]);
    ef_metric_free(metric);
  }
  figures_free(&f);
  figures_free(&pairs);
}

static void cmc_agrees_with_little_cms(void **state) {
  (void)state;
  const double factor[2][2] = {{1, 1}, {2, 1}};
  ef_metric *const metric[2] = {ef_metric_new("cmc:1:1", NULL),
                                ef_metric_new("cmc:2:1", NULL)};
  deviation worst = {0, ""};
  gen g = gen_new(1);
  for (int i = 0; i < 100000; ++i) {
    double a[3], b[3];
    for (int k = 0; k < 3; ++k) {
      a[k] = k == 0 ? gen_between(&g, 0, 100) : gen_between(&g, -128, 128);
      b[k] = i % 2 == 0 ? a[k] + gen_between(&g, -3, 3)
                        : gen_between(&g, k == 0 ? 0 : -128, 100);
    }
    cmsCIELab ca = {a[0], a[1], a[2]}, cb = {b[0], b[1], b[2]};
    char where[96];
    snprintf(where, sizeof where, "%.3f %.3f %.3f and %.3f %.3f %.3f", a[0],
             a[1], a[2], b[0], b[1], b[2]);
    for (int k = 0; k < 2; ++k) {
      const double theirs = cmsCMCdeltaE(&ca, &cb, factor[k][0], factor[k][1]);
      deviation_add(&worst, ef_metric_difference(metric[k], a, b), theirs,
                    where);
    }
  }
  deviation_print(&worst, "CMC against Little CMS, 200000 values");
  /* Both round; its hue part is the root of a difference of squares to 3e4,
   * 4e-12 of them, over a weight down to 0.6 and a difference from 1 up. */
  assert_true(worst.largest < 1e-10);
  for (int k = 0; k < 2; ++k)
    ef_metric_free(metric[k]);
}

/* ---- ITP --------------------------------------------------------------- */

/* XYZ in cd/m2 of linear R, G, B: the inverse of the matrix in ITU-R BT.2020's
 * terms, made from its primaries and white here. */
static ef_xyz of_rgb(double R, double G, double B) {
  const double x[4] = {0.708, 0.170, 0.131, 0.3127};
  const double y[4] = {0.292, 0.797, 0.046, 0.3290};
  double column[4][3], share[3];
  for (int k = 0; k < 4; ++k) {
    column[k][0] = x[k] / y[k];
    column[k][1] = 1;
    column[k][2] = (1 - x[k] - y[k]) / y[k];
  }
  /* Cramer's rule: amounts of the primaries in the white. */
  double det[4];
  for (int m = 0; m < 4; ++m) {
    const double *const p = m == 1 ? column[3] : column[0];
    const double *const q = m == 2 ? column[3] : column[1];
    const double *const r = m == 3 ? column[3] : column[2];
    det[m] = p[0] * (q[1] * r[2] - q[2] * r[1]) -
             q[0] * (p[1] * r[2] - p[2] * r[1]) +
             r[0] * (p[1] * q[2] - p[2] * q[1]);
  }
  for (int k = 0; k < 3; ++k)
    share[k] = det[k + 1] / det[0];
  const double rgb[3] = {R * share[0], G * share[1], B * share[2]};
  double v[3] = {0, 0, 0};
  for (int k = 0; k < 3; ++k) {
    for (int i = 0; i < 3; ++i)
      v[i] += rgb[k] * column[k][i];
  }
  return (ef_xyz){v[0], v[1], v[2]};
}

/* Colours in cd/m2: a white of that luminance. */
static const ef_conditions absolute = {.white = {95.0456, 100, 108.9058},
                                       .white_luminance_cd_m2 = 100};

static void itp_colours(void **state) {
  (void)state;
  const ef_metric *const itp = ef_metric_find("itp", NULL);
  figures f = figures_read("published", "itp-colours.csv");
  deviation worst = {0, ""};
  for (size_t row = 0; row < f.n_rows; ++row) {
    double c[3];
    const ef_xyz xyz =
        of_rgb(figures_number(&f, row, 1), figures_number(&f, row, 2),
               figures_number(&f, row, 3));
    ef_metric_coordinates(itp, xyz, &absolute, c);
    const double ictcp[3] = {c[0] / 720, 2 * c[1] / 720, c[2] / 720};
    for (size_t k = 0; k < 3; ++k) {
      const double published = figures_number(&f, row, 4 + k);
      assert_near(ictcp[k], published, 0.501e-8);
      deviation_add(&worst, ictcp[k], published, figures_text(&f, row, 0));
    }
  }
  deviation_print(&worst, "ICtCp of linear BT.2020 values");
  figures_free(&f);
}

static void itp_pairs(void **state) {
  (void)state;
  const ef_metric *const itp = ef_metric_find("itp", NULL);
  figures f = figures_read("published", "itp-pairs.csv");
  deviation worst = {0, ""};
  for (size_t row = 0; row < f.n_rows; ++row) {
    double c[2][3];
    for (size_t k = 0; k < 2; ++k) {
      const ef_xyz xyz = of_rgb(figures_number(&f, row, 3 * k + 1),
                                figures_number(&f, row, 3 * k + 2),
                                figures_number(&f, row, 3 * k + 3));
      ef_metric_coordinates(itp, xyz, &absolute, c[k]);
    }
    const double d = ef_metric_difference(itp, c[0], c[1]);
    assert_near(d, figures_number(&f, row, 7), 0.501e-6);
    deviation_add(&worst, d, figures_number(&f, row, 7),
                  figures_text(&f, row, 0));
  }
  deviation_print(&worst, "Delta E ITP of pairs");
  figures_free(&f);
}

/* Two check values in circulation for BT.2124, of pairs of IC_TC_P given to 10
 * digits, so that the last of the result are not theirs. */
static void itp_published_pairs(void **state) {
  (void)state;
  const double pair[2][6] = {
      {0.4885468072, -0.04739350675, 0.07475401302, 0.4899203231,
       -0.04567508203, 0.07361341775},
      {0.7538438727, 0, 0, 0.7538912244, 0.001930922514, -0.0003599955951}};
  const double published[2] = {1.426572247, 0.7426668055};
  const ef_metric *const itp = ef_metric_find("itp", NULL);
  for (int i = 0; i < 2; ++i) {
    double c[2][3];
    for (int k = 0; k < 2; ++k) {
      c[k][0] = 720 * pair[i][3 * k];
      c[k][1] = 720 * pair[i][3 * k + 1] / 2;
      c[k][2] = 720 * pair[i][3 * k + 2];
    }
    /* 5e-11 in each of six coordinates, times 720. */
    assert_near(ef_metric_difference(itp, c[0], c[1]), published[i], 1e-7);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(second_implementation),
      cmocka_unit_test(cmc_agrees_with_little_cms),
      cmocka_unit_test(itp_colours),
      cmocka_unit_test(itp_pairs),
      cmocka_unit_test(itp_published_pairs),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
