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

static ef_frame xy_frame(void) {
  ef_frame frame;
  assert_int_equal(ef_frame_set(EF_SPACE_XY, NULL, &frame, NULL), EF_OK);
  return frame;
}

static ef_ellipsoid solid_of(const ef_metric *metric, ef_xyz xyz,
                             const ef_conditions *conditions) {
  const ef_frame frame = xy_frame();
  ef_ellipsoid e;
  ef_error error = {0};
  if (ef_metric_ellipsoid(metric, xyz, conditions, &frame, 1, &e, &error) !=
      EF_OK)
    fail_msg("%s", error.message);
  return e;
}

static figures_of_merit against_macadam(const char *name,
                                        const ef_conditions *conditions) {
  ef_metric *const metric = ef_metric_new(name, NULL);
  agreement a = {0};
  for (size_t i = 0; i < ef_macadam_count(); ++i) {
    const ef_ellipse published = ef_macadam_at(i);
    const ef_xyz xyz =
        ef_xyy_to_xyz((ef_xyy){published.center[0], published.center[1], 50});
    const ef_ellipsoid solid = solid_of(metric, xyz, conditions);
    const ef_ellipse e = ef_ellipsoid_figure(&solid, EF_ELLIPSE_SECTION);
    compare(&a, &e, &published);
  }
  ef_metric_free(metric);
  const figures_of_merit result = merit(&a);
  print_merit(name, result);
  return result;
}

/* ---- Experiments on surface colours ------------------------------------ */

/* D65, 10 degrees (ASTM E308). */
static const ef_conditions d65 = {.white = {94.811, 100, 107.304}};

static ef_xyz center_xyz(const ef_experiment *e, size_t i) {
  ef_lab lab;
  assert_non_null(ef_experiment_center(e, i, &lab));
  return ef_lab_to_xyz(lab, d65.white);
}

static ef_ellipsoid published_at(const ef_experiment *e, size_t i,
                                 ef_space space) {
  ef_frame frame;
  ef_ellipsoid out;
  ef_nearest_center nearest;
  ef_frame_set(space, NULL, &frame, NULL);
  assert_int_equal(ef_experiment_ellipsoid(e, center_xyz(e, i), &d65, &frame, 1,
                                           &out, &nearest, NULL),
                   EF_OK);
  assert_true(nearest.difference < 1e-9);
  return out;
}

static void luo_and_rigg_as_printed(void **state) {
  (void)state;
  figures f = figures_read("published", "luo-rigg-1986.csv");
  ef_experiment *const e = ef_experiment_new("luo-rigg-1986", NULL);
  assert_int_equal(f.n_rows, 88);
  assert_int_equal(ef_experiment_center_count(e), 88);
  assert_false(ef_experiment_is_solid(e));
  for (size_t i = 0; i < f.n_rows; ++i) {
    const ef_ellipsoid solid = published_at(e, i, EF_SPACE_XY);
    const ef_ellipse at = ef_ellipsoid_figure(&solid, EF_ELLIPSE_SECTION);
    const double major = figures_number(&f, i, 4) * 1e-4;
    assert_near(at.center[0], figures_number(&f, i, 1), 1e-12);
    assert_near(at.center[1], figures_number(&f, i, 2), 1e-12);
    assert_near(solid.center[2], figures_number(&f, i, 3), 1e-11);
    /* Through CIELAB and its logarithm and back. */
    assert_near_relative(at.semi_major, major, 1e-10);
    assert_near_relative(at.semi_minor, major / figures_number(&f, i, 5),
                         1e-10);
    assert_near(remainder(at.angle_deg - figures_number(&f, i, 6), 180), 0,
                1e-8);
  }
  ef_experiment_free(e);
  figures_free(&f);
}

/* The same paper fits ellipsoids in x, y, Y apart from those in CIELAB. */
static void melgosa_in_xyy(void **state) {
  (void)state;
  figures f = figures_read("published", "melgosa-1997-xyy.csv");
  ef_experiment *const e = ef_experiment_new("rit-dupont-1997", NULL);
  assert_int_equal(f.n_rows, 19);
  assert_true(ef_experiment_is_solid(e));
  double largest = 0, sum = 0, n = 0;
  for (size_t i = 0; i < f.n_rows; ++i) {
    const ef_ellipsoid at = published_at(e, i, EF_SPACE_XY);
    /* 1e4; Y there runs to 1 */
    const double g[3] = {at.tensor[0] * 1e-4, at.tensor[4] * 1e-4,
                         at.tensor[8]};
    const bool is_doubtful = i + 1 == 11 || i + 1 == 15;
    for (int k = 0; k < 3; ++k) {
      const double ratio = log(g[k] / figures_number(&f, i, 1 + (size_t)k));
      if (is_doubtful && k == 1)
        continue; /* g22 of these two is 19 and 32 % off: said in the file */
      /* Two fits to the same vectors in different coordinates: 7 % smaller on
       * average and up to 18 %. */
      assert_near(ratio, 0, log(1.22));
      largest = fmax(largest, fabs(ratio));
      sum += ratio;
      n += 1;
    }
  }
  printf(
      "# ellipsoids fitted in CIELAB against those fitted in x, y, Y: %.0f %% "
      "on average, at most a factor of %.2f\n",
      100 * (exp(sum / n) - 1), exp(largest));
  assert_near(sum / n, log(0.935), 0.01);
  ef_experiment_free(e);
  figures_free(&f);
}

/* A vector that ends on its ellipsoid has the length 1. */
static void melgosa_fits_the_vectors(void **state) {
  (void)state;
  figures f = figures_read("published", "rit-dupont-1991.csv");
  ef_experiment *const e = ef_experiment_new("rit-dupont-1997", NULL);
  ef_frame frame;
  ef_frame_set(EF_SPACE_LAB, NULL, &frame, NULL);
  double sum = 0, squares = 0;
  for (size_t i = 0; i < f.n_rows; ++i) {
    const ef_lab at = {figures_number(&f, i, 0), figures_number(&f, i, 1),
                       figures_number(&f, i, 2)};
    ef_ellipsoid solid;
    ef_nearest_center nearest;
    assert_int_equal(ef_experiment_ellipsoid(e, ef_lab_to_xyz(at, d65.white),
                                             &d65, &frame, 1, &solid, &nearest,
                                             NULL),
                     EF_OK);
    assert_true(nearest.difference < 4); /* its own centre */
    const double t50 = figures_number(&f, i, 6);
    const double d[3] = {t50 * figures_number(&f, i, 4),
                         t50 * figures_number(&f, i, 5),
                         t50 * figures_number(&f, i, 3)}; /* a*, b*, L* */
    double square = 0;
    for (int k = 0; k < 9; ++k)
      square += d[k / 3] * solid.tensor[k] * d[k % 3];
    sum += sqrt(square);
    squares += square;
  }
  const double n = (double)f.n_rows, mean = sum / n;
  const double sd = sqrt(squares / n - mean * mean);
  printf("# %zu vectors in units of their ellipsoids: mean %.3f, sd %.3f\n",
         f.n_rows, mean, sd);
  assert_near(mean, 1, 0.02);
  assert_true(sd < 0.15);
  ef_experiment_free(e);
  figures_free(&f);
}

/* Areas are printed for two of the centres, 2.26 and 3.05: pi times the axis
 * over the axis ratio. */
static void huang_as_printed(void **state) {
  (void)state;
  ef_experiment *const e = ef_experiment_new("huang-2012", NULL);
  const double printed[2] = {2.26, 3.05};
  assert_int_equal(ef_experiment_center_count(e), 17);
  for (size_t i = 0; i < 2; ++i) {
    const ef_ellipsoid solid = published_at(e, i, EF_SPACE_LAB);
    const ef_ellipse at = ef_ellipsoid_figure(&solid, EF_ELLIPSE_SECTION);
    assert_near(3.14159265 * at.semi_minor, printed[i], 0.006);
  }
  const ef_ellipsoid last = published_at(e, 16, EF_SPACE_LAB);
  const ef_ellipse purple = ef_ellipsoid_figure(&last, EF_ELLIPSE_SECTION);
  assert_near(purple.semi_major, 1.96, 1e-10);
  assert_near(purple.angle_deg, 128.78, 1e-8);
  assert_near(purple.center[0], 26.3, 1e-10);
  ef_experiment_free(e);
}

/* Each centre from the others, as far as they go. */
static void experiments_left_out_one_by_one(void **state) {
  (void)state;
  const ef_frame frame = xy_frame();
  for (size_t k = 0; k < ef_experiment_count(); ++k) {
    ef_experiment *const e = ef_experiment_new(ef_experiment_name_at(k), NULL);
    agreement a = {0};
    for (size_t i = 0; i < ef_experiment_center_count(e); ++i) {
      const ef_ellipsoid own = published_at(e, i, EF_SPACE_XY);
      ef_ellipsoid others;
      assert_int_equal(ef__experiment_without(e, center_xyz(e, i), &d65, &frame,
                                              1, i, &others, NULL, NULL),
                       EF_OK);
      const ef_ellipse found = ef_ellipsoid_figure(&others, EF_ELLIPSE_SECTION);
      const ef_ellipse wanted = ef_ellipsoid_figure(&own, EF_ELLIPSE_SECTION);
      compare(&a, &found, &wanted);
    }
    const figures_of_merit f = merit(&a);
    print_merit(ef_experiment_name_at(k), f);
    assert_true(f.angle_deg < 35);
    assert_true(f.area < 1.8 && f.ratio < 1.8);
    ef_experiment_free(e);
  }
}

/* How large a step in lightness is beside one in chromaticity. */
static double lightness_step(const ef_ellipsoid *in_lab) {
  const ef_ellipse plane = ef_ellipsoid_figure(in_lab, EF_ELLIPSE_SECTION);
  return log(1 / sqrt(in_lab->tensor[8])) -
         log(plane.semi_major * plane.semi_minor) / 2;
}

static figures_of_merit against_experiment(const char *name,
                                           const ef_experiment *e) {
  ef_metric *const metric = ef_metric_new(name, NULL);
  ef_frame lab;
  ef_frame_set(EF_SPACE_LAB, NULL, &lab, NULL);
  agreement a = {0};
  double lightness = 0;
  const size_t n = ef_experiment_center_count(e);
  for (size_t i = 0; i < n; ++i) {
    const ef_ellipsoid published = published_at(e, i, EF_SPACE_XY);
    const ef_ellipsoid own = solid_of(metric, center_xyz(e, i), &d65);
    const ef_ellipse figure[2] = {
        ef_ellipsoid_figure(&own, EF_ELLIPSE_SECTION),
        ef_ellipsoid_figure(&published, EF_ELLIPSE_SECTION)};
    compare(&a, &figure[0], &figure[1]);
    ef_ellipsoid in_lab;
    assert_int_equal(ef_metric_ellipsoid(metric, center_xyz(e, i), &d65, &lab,
                                         1, &in_lab, NULL),
                     EF_OK);
    const ef_ellipsoid other = published_at(e, i, EF_SPACE_LAB);
    const double far = lightness_step(&in_lab) - lightness_step(&other);
    lightness += far * far;
  }
  ef_metric_free(metric);
  const figures_of_merit result = merit(&a);
  print_merit(name, result);
  if (ef_experiment_is_solid(e))
    printf("# %-22s lightness to chromaticity factor %.2f\n", "",
           exp(sqrt(lightness / (double)n)));
  return result;
}

/* Lights seen in a small field say little of formulas for surfaces: one
 * standard deviation of a match, some of the centres outside all surface
 * colours. No white was in view; illuminant C (about the surround) at twice the
 * luminance of the field stands for it. */
static void formulas_against_macadam(void **state) {
  (void)state;
  const ef_conditions conditions = {.white = {98.074, 100, 118.232},
                                    .white_luminance_cd_m2 = 96};
  printf("# MacAdam (1942)\n");
  for (size_t m = 0; m < N_METRICS; ++m) {
    const figures_of_merit r = against_macadam(metrics[m], &conditions);
    /* Chance gives 52 degrees. */
    assert_true(r.angle_deg < 40);
    assert_true(r.area < 3 && r.ratio < 2.2);
  }
}

static void formulas_against_surface_colours(void **state) {
  (void)state;
  for (size_t k = 0; k < ef_experiment_count(); ++k) {
    ef_experiment *const e = ef_experiment_new(ef_experiment_name_at(k), NULL);
    figures_of_merit of_cielab = {0};
    const bool is_huang = strstr(ef_experiment_title(e), "Huang") != NULL;
    printf("# %s\n", ef_experiment_title(e));
    for (size_t m = 0; m < N_METRICS; ++m) {
      const figures_of_merit r = against_experiment(metrics[m], e);
      assert_true(r.angle_deg < 40);
      assert_true(r.area < 3 && r.ratio < 2.2);
      if (m == 0)
        of_cielab = r;
      /* Formulas made on such data do better than CIELAB: everywhere in
       * proportions and angles, and in area where it is not in doubt. */
      if (strcmp(metrics[m], "ciede2000") == 0 ||
          strcmp(metrics[m], "cie94") == 0) {
        assert_true(r.ratio < of_cielab.ratio);
        assert_true(r.angle_deg < of_cielab.angle_deg);
        assert_true(r.area < of_cielab.area || is_huang);
      }
    }
    ef_experiment_free(e);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(macadam_forms),
      cmocka_unit_test(lamp_ellipses),
      cmocka_unit_test(macadam_left_out_one_by_one),
      cmocka_unit_test(formulas_against_macadam),
      cmocka_unit_test(luo_and_rigg_as_printed),
      cmocka_unit_test(melgosa_in_xyy),
      cmocka_unit_test(melgosa_fits_the_vectors),
      cmocka_unit_test(huang_as_printed),
      cmocka_unit_test(experiments_left_out_one_by_one),
      cmocka_unit_test(formulas_against_surface_colours),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
