/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ellipses from experiments: typed right, and how well those of the formulas
 * agree with them. */
#include "difference/difference_private.h"

#include "figures.h"
#include "near.h"

static void macadam_forms(void **state) {
  (void)state;
  figures f = figures_read("published", "macadam-1942-forms.csv");
  assert_int_equal(f.n_rows, ef_macadam_count());
  double area = 0;
  for (size_t i = 0; i < f.n_rows; ++i) {
    const ef_ellipse e = ef_macadam_at(i);
    assert_near(e.center[0], figures_number(&f, i, 1), 0);
    assert_near(e.center[1], figures_number(&f, i, 2), 0);
    /* One decimal of 1e4 to 7e6. */
    assert_near(e.g11, figures_number(&f, i, 3), 0.0501);
    assert_near(2 * e.g12, figures_number(&f, i, 4), 0.0501);
    assert_near(e.g22, figures_number(&f, i, 5), 0.0501);
    /* Drawn by hand and calculated: two readings of one experiment. */
    const double a = figures_number(&f, i, 6) * 1e-3;
    const double b = figures_number(&f, i, 7) * 1e-3;
    const double turn = remainder(e.angle_deg - figures_number(&f, i, 8), 180);
    const double ratio = log(a * b / (e.semi_major * e.semi_minor));
    assert_near(turn, 0, 9);
    assert_near(ratio, 0, log(1.3));
    area += ratio * ratio;
  }
  printf("# MacAdam drawn against calculated: area factor %.2f\n",
         exp(sqrt(area / (double)f.n_rows)));
  figures_free(&f);
}

/* Semi-axes and angles in common use for ANSI C78.377 centres, remembered apart
 * from the coefficients (3-step and 5-step values divided): a check of memory
 * by memory, 1.1 % apart at most. 2700 K has another ellipse there. */
static void lamp_ellipses(void **state) {
  (void)state;
  const struct {
    const char *name;
    double semi_major, semi_minor, angle_deg;
  } known[] = {{"F3000", 0.00278, 0.00136, 53.22},
               {"F3500", 0.00309, 0.00138, 54.00},
               {"F4000", 0.00313, 0.00134, 53.72},
               {"F5000", 0.00274, 0.00118, 59.62},
               {"F6500", 0.00223, 0.00095, 58.57}};
  for (size_t i = 0; i < sizeof known / sizeof *known; ++i) {
    const ef_lamp_colour *const lamp = ef_lamp_find(known[i].name, NULL);
    const ef_ellipse e = ef_lamp_ellipse(lamp, 1);
    assert_near_relative(e.semi_major, known[i].semi_major, 0.012);
    assert_near_relative(e.semi_minor, known[i].semi_minor, 0.012);
    assert_near(e.angle_deg, known[i].angle_deg, 0.015);
  }
}

/* ---- Agreement of two sets of ellipses --------------------------------- */

/* Logarithms and angles of one set against the other. */
typedef struct agreement {
  double n, area, area2, ratio2, n_angles, angle2;
} agreement;

static void compare(agreement *a, const ef_ellipse *e,
                    const ef_ellipse *published) {
  const double area = log(e->semi_major * e->semi_minor /
                          (published->semi_major * published->semi_minor));
  const double own = published->semi_major / published->semi_minor;
  const double ratio = log(e->semi_major / e->semi_minor / own);
  a->n += 1;
  a->area += area;
  a->area2 += area * area;
  a->ratio2 += ratio * ratio;
  if (own < 1.3)
    return; /* all but round: no angle to speak of */
  const double turn = remainder(e->angle_deg - published->angle_deg, 180);
  a->n_angles += 1;
  a->angle2 += turn * turn;
}

/* Factors: 1 is agreement. The common size is no matter of agreement. */
typedef struct figures_of_merit {
  double size, area, ratio, angle_deg;
} figures_of_merit;

static figures_of_merit merit(const agreement *a) {
  const double mean = a->area / a->n;
  return (figures_of_merit){
      exp(mean / 2), exp(sqrt(a->area2 / a->n - mean * mean)),
      exp(sqrt(a->ratio2 / a->n)), sqrt(a->angle2 / a->n_angles)};
}

static void print_merit(const char *what, figures_of_merit f) {
  printf("# %-22s size %.2f, area factor %.2f, axis ratio factor %.2f, angle "
         "%.1f deg\n",
         what, f.size, f.area, f.ratio, f.angle_deg);
}

/* Each centre from the other 24. */
static void macadam_left_out_one_by_one(void **state) {
  (void)state;
  agreement a = {0};
  for (size_t i = 0; i < ef_macadam_count(); ++i) {
    const ef_ellipse own = ef_macadam_at(i);
    ef_ellipse e;
    assert_int_equal(ef__macadam_without((ef_xy){own.center[0], own.center[1]},
                                         1, i, &e, NULL),
                     EF_OK);
    compare(&a, &e, &own);
  }
  const figures_of_merit f = merit(&a);
  print_merit("interpolation", f);
  const double area = exp(sqrt(a.area2 / a.n));
  /* What macadam.c says of itself. */
  assert_near(area, 1.40, 0.02);
  assert_near(f.ratio, 1.25, 0.02);
  assert_near(f.angle_deg, 9, 0.5);
}

static const char *const metrics[] = {
    "cielab", "cieluv",    "cie94",     "cmc:1:1",       "ciede2000",
    "din99o", "cam02-ucs", "cam16-ucs", "cam16-ucs:scd", "itp"};
enum { N_METRICS = sizeof metrics / sizeof *metrics };

static figures_of_merit
against(const char *name, const figures *f, const ef_conditions *conditions,
        ef_ellipse (*at)(const figures *, size_t, double *)) {
  ef_metric *const metric = ef_metric_new(name, NULL);
  ef_frame frame;
  ef_frame_set(EF_SPACE_XY, NULL, &frame, NULL);
  agreement a = {0};
  for (size_t i = 0; i < f->n_rows; ++i) {
    double Y;
    const ef_ellipse published = at(f, i, &Y);
    const ef_xyz xyz =
        ef_xyy_to_xyz((ef_xyy){published.center[0], published.center[1], Y});
    ef_ellipse e;
    ef_error error = {0};
    if (ef_metric_ellipse(metric, xyz, conditions, &frame, EF_ELLIPSE_SECTION,
                          1, &e, &error) != EF_OK)
      fail_msg("%s", error.message);
    compare(&a, &e, &published);
  }
  ef_metric_free(metric);
  const figures_of_merit result = merit(&a);
  print_merit(name, result);
  return result;
}

static ef_ellipse macadam_row(const figures *f, size_t row, double *Y) {
  (void)f;
  *Y = 50;
  return ef_macadam_at(row);
}

static ef_ellipse luo_rigg_row(const figures *f, size_t row, double *Y) {
  *Y = figures_number(f, row, 3);
  const double center[2] = {figures_number(f, row, 1),
                            figures_number(f, row, 2)};
  const double major = figures_number(f, row, 4) * 1e-4;
  return ef_ellipse_of_axes(center, major, major / figures_number(f, row, 5),
                            figures_number(f, row, 6));
}

/* Lights seen in a small field say little of formulas for surfaces: one
 * standard deviation of a match, some of the centres outside all surface
 * colours. No white was in view; illuminant C (about the surround) at twice the
 * luminance of the field stands for it. */
static void formulas_against_macadam(void **state) {
  (void)state;
  const ef_conditions conditions = {.white = {98.074, 100, 118.232},
                                    .white_luminance_cd_m2 = 96};
  figures f = figures_read("published", "macadam-1942-forms.csv");
  for (size_t m = 0; m < N_METRICS; ++m) {
    const figures_of_merit r =
        against(metrics[m], &f, &conditions, macadam_row);
    /* Chance gives 52 degrees. */
    assert_true(r.angle_deg < 40);
    assert_true(r.area < 3 && r.ratio < 2.2);
  }
  figures_free(&f);
}

static void formulas_against_luo_and_rigg(void **state) {
  (void)state;
  /* D65, 10 degrees (ASTM E308). */
  const ef_conditions conditions = {.white = {94.811, 100, 107.304}};
  figures f = figures_read("published", "luo-rigg-1986.csv");
  assert_int_equal(f.n_rows, 88);
  double of_cielab = 0;
  for (size_t m = 0; m < N_METRICS; ++m) {
    const figures_of_merit r =
        against(metrics[m], &f, &conditions, luo_rigg_row);
    assert_true(r.angle_deg < 40);
    assert_true(r.area < 3 && r.ratio < 2.2);
    if (m == 0)
      of_cielab = r.area;
    /* Formulas made on such data do better than CIELAB. */
    if (strcmp(metrics[m], "ciede2000") == 0 ||
        strcmp(metrics[m], "cie94") == 0)
      assert_true(r.area < of_cielab);
  }
  figures_free(&f);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(macadam_forms),
      cmocka_unit_test(lamp_ellipses),
      cmocka_unit_test(macadam_left_out_one_by_one),
      cmocka_unit_test(formulas_against_macadam),
      cmocka_unit_test(formulas_against_luo_and_rigg),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
