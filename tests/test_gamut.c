/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Gamut geometry against hand-made figures, against the same gamut described in
 * another way, and at its edges. */
#include <float.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "device/device_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "invented_display.h"
#include "match/gamut_private.h"
#include "plain_setup.h"

/* ---- Polygons ---------------------------------------------------------- */

static void hull_of_a_cross(void **state) {
  (void)state;
  ef_xy p[] = {{0, 1}, {1, 0}, {0, 0}, {-1, 0}, {0.5, 0.5}, {0, -1}, {0, 1}};
  const size_t n = ef__polygon_hull(7, p);
  assert_int_equal(n, 4); /* neither inside, nor on a side, nor twice */
  assert_near(ef__polygon_area(n, p), 2, 4 * DBL_EPSILON);
  ef_xy line[] = {{0, 0}, {2, 2}, {1, 1}};
  assert_near(ef__polygon_area(ef__polygon_hull(3, line), line), 0, 0);
}

/* An L of two squares and a half, cut by a window over its inner corner. */
static void overlap_with_an_angle(void **state) {
  (void)state;
  const ef_xy angle[] = {{0, 0}, {2, 0}, {2, 1}, {1, 1}, {1, 2}, {0, 2}};
  const ef_xy window[] = {{0.5, 0.5}, {1.5, 0.5}, {1.5, 1.5}, {0.5, 1.5}};
  assert_near(ef__polygon_area(6, angle), 3, 8 * DBL_EPSILON);
  assert_near(ef__polygon_overlap(6, angle, 4, window), 0.75, 8 * DBL_EPSILON);
  const ef_xy away[] = {{5, 5}, {6, 5}, {6, 6}};
  assert_near(ef__polygon_overlap(6, angle, 3, away), 0, 8 * DBL_EPSILON);
  assert_near(ef__polygon_overlap(2, angle, 3, away), 0, 0);
}

/* ---- Setups ------------------------------------------------------------ */

static ef_gamut measure(const ef_setup *setup) {
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef_gamut out;
  ef_error error;
  if (ef_gamut_measure(setup, d65, EF_ADAPT_CAT16, 0, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  ef_illuminant_free(d65);
  return out;
}

static void display_with_a_black(void **state) {
  (void)state;
  plain_setup p = plain_setup_of(invented_display(true));
  const ef_gamut g = measure(p.setup);
  const ef_xyz white = ef_setup_white(p.setup), black = ef_setup_black(p.setup);
  assert_near(g.contrast, white.Y / black.Y, 0);
  const double red[3] = {1, 0, 0};
  const ef_xyy xyy = ef_xyz_to_xyy(ef_setup_xyz(p.setup, red, NULL));
  assert_near(g.primary[0].x, xyy.x, 0);
  assert_near(g.primary[0].y, xyy.y, 0);
  assert_true(isnan(g.primary[3].x));
  const ef_xyy w = ef_xyz_to_xyy(white);
  assert_near(g.white.x, w.x, 0);
  const ef_xy *const q = g.primary;
  const double twice = (q[1].x - q[0].x) * (q[2].y - q[0].y) -
                       (q[1].y - q[0].y) * (q[2].x - q[0].x);
  assert_near(g.area_xy, fabs(twice) / 2, 4 * DBL_EPSILON);
  assert_in_range(g.locus_share_xy * 1000, 1, 999);
  assert_true(g.solid_share > 0.3 && g.solid_share < 1);
  plain_setup_free(&p);
  p = plain_setup_named("srgb");
  assert_true(isinf(measure(p.setup).contrast));
  plain_setup_free(&p);
}

/* A box small enough lies in the solid, and its share is its own volume: two
 * ways to one figure, over faces and over sections. */
static void small_box_is_its_own_share(void **state) {
  (void)state;
  plain_setup p = plain_setup_named("srgb");
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef__solid solid;
  assert_int_equal(ef__solid_set(p.observer, d65, &solid, NULL), EF_OK);
  ef__box box;
  assert_true(ef__box_from_setup(p.setup, &box));
  for (int k = 0; k < 3; k++) {
    box.low[k] = 0.2;
    box.high[k] = 0.7;
  }
  size_t n;
  double *triangle = ef__box_triangles(&box, &n, NULL);
  assert_int_equal(n, 12);
  double volume, whole, part;
  ef__box_volume(&box, solid.white, 64, 1, &volume, NULL);
  ef__solid_overlap(&solid, solid.white, n, triangle, 400, 1, &whole, &part,
                    NULL);
  assert_near_relative(part, volume, 1e-4);
  free(triangle);
  ef_illuminant_free(d65);
  plain_setup_free(&p);
}

/* ---- More than three drives -------------------------------------------- */

/* Green divided between two primaries, one with three tenths of it. */
static ef_device *divided_display(void) {
  enum { N = INVENTED_SAMPLES };
  static const char *const names[] = {"red", "lime", "green", "blue"};
  double light[4 * N];
  invented_bell(5.1e-3, 612, 14, light);
  invented_bell(0.3 * 3.7e-3, 536, 19, light + N);
  invented_bell(0.7 * 3.7e-3, 536, 19, light + 2 * N);
  invented_bell(7.2e-3, 453, 11, light + 3 * N);
  const ef_grid grid = invented_grid();
  ef_spectra *spectra = ef_spectra_new(4, names, &grid, EF_LIGHT, light, NULL);
  ef_error error;
  ef_device *device = ef_display_from_spectra("divided", spectra, NULL, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_spectra_free(spectra);
  return device;
}

static ef_device *whole_display(void) {
  enum { N = INVENTED_SAMPLES };
  static const char *const names[] = {"red", "green", "blue"};
  double light[3 * N];
  invented_bell(5.1e-3, 612, 14, light);
  invented_bell(3.7e-3, 536, 19, light + N);
  invented_bell(7.2e-3, 453, 11, light + 2 * N);
  const ef_grid grid = invented_grid();
  ef_spectra *spectra = ef_spectra_new(3, names, &grid, EF_LIGHT, light, NULL);
  ef_device *device = ef_display_from_spectra("whole", spectra, NULL, NULL);
  ef_spectra_free(spectra);
  return device;
}

/* Both have the same colours. The mesh of the divided one is finer, so that
 * the volumes agree to what the mesh of the other leaves. */
static void divided_primary(void **state) {
  (void)state;
  plain_setup four = plain_setup_of(divided_display());
  plain_setup three = plain_setup_of(whole_display());
  const ef_gamut a = measure(four.setup), b = measure(three.setup);
  assert_near(a.area_xy, b.area_xy, 8 * DBL_EPSILON);
  assert_near(a.locus_share_uv, b.locus_share_uv, 1e-13);
  assert_near_relative(a.volume_lab, b.volume_lab, 1e-4);
  /* Apart by a billionth, where corners of sections come and go. */
  assert_near(a.solid_share, b.solid_share, 1e-8);
  plain_setup_free(&four);
  plain_setup_free(&three);
}

/* ---- Where colours do not add ------------------------------------------ */

/* A device whose amounts are squared before they mix as in sRGB, so that it has
 * the colours of sRGB; or with four drives, the last of which does nothing. */
static void squared_xyz(const void *data, const double *amount, double xyz[3],
                        double *jacobian) {
  const double *const m = data;
  for (int c = 0; c < 3; c++) {
    xyz[c] = 0;
    for (int i = 0; i < 3; i++)
      xyz[c] += m[3 * c + i] * amount[i] * amount[i];
  }
  assert_null(jacobian);
}

static double srgb[9];

static ef_status squared_see(const ef_device *device,
                             const ef_observer *observer,
                             const ef_illuminant *illuminant,
                             const ef_notes *notes, ef__colour_map *map,
                             ef_error *error) {
  (void)device, (void)observer, (void)illuminant, (void)notes, (void)error;
  for (int c = 0; c < 3; c++)
    map->white[c] = srgb[3 * c] + srgb[3 * c + 1] + srgb[3 * c + 2];
  map->data = srgb;
  map->xyz = squared_xyz;
  return EF_OK;
}

static ef_device *squared_device(size_t n_drives) {
  static const ef__device_class kind = {.kind = "squares", .see = squared_see};
  static const char *const names[] = {"red", "green", "blue", "idle"};
  ef_encoding_matrix(ef_encoding_find("srgb", NULL), srgb, NULL);
  ef_tone_curve *linear = ef_tone_curve_new("linear", NULL);
  const ef_tone_curve *const curve[4] = {linear, linear, linear, linear};
  ef_device *device = ef__allocate_zeroed(1, sizeof *device);
  assert_int_equal(ef__device_set_up(device, &kind, "squares", n_drives, names,
                                     NULL, curve, NULL),
                   EF_OK);
  ef_tone_curve_free(linear);
  return device;
}

static void mesh_of_what_does_not_add(void **state) {
  (void)state;
  plain_setup squares = plain_setup_of(squared_device(3));
  plain_setup plain = plain_setup_named("srgb");
  const ef_gamut a = measure(squares.setup), b = measure(plain.setup);
  assert_near_relative(a.volume_lab, b.volume_lab, 1e-3);
  assert_near(a.solid_share, b.solid_share, 1e-4);
  /* Mixtures of two primaries lie on the sides. */
  assert_near(a.area_xy, b.area_xy, 1e-15);
  assert_true(isinf(a.contrast));
  plain_setup_free(&squares);
  squares = plain_setup_of(squared_device(4));
  const ef_gamut c = measure(squares.setup);
  assert_true(isnan(c.volume_lab) && isnan(c.solid_share));
  assert_near(c.area_xy, b.area_xy, 1e-15);
  plain_setup_free(&squares);
  plain_setup_free(&plain);
}

/* ---- Observers --------------------------------------------------------- */

static void dichromat_has_no_volume(void **state) {
  (void)state;
  ef_device *device = invented_display(false);
  ef_observer *observer = ef_observer_new("deuteranope", NULL);
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  const ef_gamut g = measure(setup);
  assert_near(g.area_xy, 0, 0);
  assert_near(g.volume_lab, 0, 0);
  assert_true(isnan(g.locus_share_uv) && isnan(g.solid_share));
  double volume;
  assert_int_equal(ef_object_solid_volume(observer, d65, &volume, NULL), EF_OK);
  assert_near(volume, 0, 0);
  ef_illuminant_free(d65);
  ef_setup_free(setup);
  ef_device_free(device);
  ef_observer_free(observer);
}

/* Three bells one of which has a second peak between the other two: there the
 * locus is dented. */
static ef_observer *dented_observer(void) {
  enum { N = INVENTED_SAMPLES };
  double f[3 * N], second[N];
  invented_bell(1, 600, 30, f);
  invented_bell(1, 540, 30, f + N);
  invented_bell(1, 450, 25, f + 2 * N);
  invented_bell(0.5, 570, 8, second);
  for (int i = 0; i < N; i++)
    f[2 * N + i] += second[i];
  const ef_grid grid = invented_grid();
  ef_spectra *spectra = ef_spectra_new(3, NULL, &grid, EF_LIGHT, f, NULL);
  ef_observer *observer = ef_observer_from_spectra("dented", spectra, NULL);
  assert_non_null(observer);
  ef_spectra_free(spectra);
  return observer;
}

static void dented_locus(void **state) {
  (void)state;
  ef_device *device = invented_display(false);
  ef_observer *observer = dented_observer();
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, NULL);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef_error error;
  double volume;
  assert_int_equal(ef_object_solid_volume(observer, d65, &volume, &error),
                   EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "is not convex");
  const ef_gamut g = measure(setup);
  assert_true(isnan(g.solid_share) && g.volume_lab > 1000);
  ef_illuminant_free(d65);
  ef_setup_free(setup);
  ef_device_free(device);
  ef_observer_free(observer);
}

/* The farthest point of the solid in any direction is white in the bands on the
 * right side of a plane. That the farthest rectangular spectrum comes as far is
 * what makes them the boundary. */
static double farthest_gap(const ef__solid *solid, const double d[3]) {
  double reach = 0, most = 0;
  for (size_t i = 0; i < EF__BANDS; i++) {
    double along = 0;
    for (size_t c = 0; c < 3; c++)
      along += d[c] * (solid->sum[i + 1][c] - solid->sum[i][c]);
    reach += fmax(along, 0);
    for (size_t j = i; j <= i + EF__BANDS; j++) {
      double run = 0;
      for (size_t c = 0; c < 3; c++)
        run += d[c] * (solid->sum[j][c] - solid->sum[i][c]);
      most = fmax(most, run);
    }
  }
  return reach - most;
}

/* Directions at random, and those of planes through a far-red band, where
 * the last digits of the tables jitter and the locus is not convex. */
static void random_direction(gen *g, const ef__solid *solid, bool red,
                             double d[3]) {
  double size = 0; /* 0 for bands that look alike: no direction */
  const double(*const s)[3] = solid->sum;
  const size_t i = 310 + gen_below(g, 90), j = gen_below(g, EF__BANDS);
  for (size_t c = 0; c < 3; c++) {
    const size_t p = (c + 1) % 3, q = (c + 2) % 3;
    d[c] = (s[i + 1][p] - s[i][p]) * (s[j + 1][q] - s[j][q]) -
           (s[i + 1][q] - s[i][q]) * (s[j + 1][p] - s[j][p]);
    if (!red || i == j)
      d[c] = gen_normal(g);
    size = hypot(size, d[c]);
  }
  for (size_t c = 0; c < 3 && size > 0; c++)
    d[c] /= size;
}

static double worst_gap(gen *g, const ef__solid *solid, bool red) {
  double gap = 0;
  for (int k = 0; k < 60; k++) {
    double d[3];
    random_direction(g, solid, red, d);
    gap = fmax(gap, farthest_gap(solid, d));
  }
  return gap;
}

static void rectangular_spectra_are_the_boundary(void **state) {
  (void)state;
  const char *const *names;
  const size_t n_names = ef_observer_names(&names);
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  gen g = gen_new(29);
  for (size_t i = 0; i < n_names; i++) {
    ef_observer *observer = ef_observer_new(names[i], NULL);
    ef__solid solid;
    assert_int_equal(ef__solid_set(observer, d65, &solid, NULL), EF_OK);
    const double gap = worst_gap(&g, &solid, false);
    const double red_gap = worst_gap(&g, &solid, true);
    printf("# %s: boundary within %.2g of X, Y, Z to 100, far red %.2g\n",
           names[i], gap, red_gap);
    assert_near(gap, 0, 1e-10);
    /* A hundred-thousandth of the white: less than any volume told here. */
    assert_near(red_gap, 0, 1e-3);
    ef_observer_free(observer);
  }
  ef_illuminant_free(d65);
}

/* ---- Errors ------------------------------------------------------------ */

static void errors_say_what_is_missing(void **state) {
  (void)state;
  plain_setup p = plain_setup_named("srgb");
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  ef_gamut out;
  double volume;
  ef_error error;
  ef_gamut_measure(NULL, d65, EF_ADAPT_NONE, 1, &out, &error);
  assert_error(&error, EF_INVALID, "a gamut needs a setup");
  ef_gamut_measure(p.setup, NULL, EF_ADAPT_NONE, 1, &out, &error);
  assert_error(&error, EF_INVALID, "an illuminant");
  ef_object_solid_volume(p.observer, NULL, &volume, &error);
  assert_error(&error, EF_INVALID, "the object colours need");
  const double infrared[2] = {1, 1};
  const ef_grid grid = {2, 900, 10, NULL};
  ef_spectra *spectra =
      ef_spectra_new(1, NULL, &grid, EF_LIGHT, infrared, NULL);
  ef_illuminant *dark = ef_illuminant_from_spectra(spectra, 0, NULL);
  assert_non_null(dark);
  ef_object_solid_volume(p.observer, dark, &volume, &error);
  assert_error(&error, EF_INVALID, "sees nothing of illuminant");
  ef_gamut_measure(p.setup, dark, EF_ADAPT_NONE, 1, &out, &error);
  assert_error(&error, EF_INVALID, "sees nothing of illuminant");
  ef_illuminant_free(dark);
  ef_spectra_free(spectra);
  ef_illuminant_free(d65);
  plain_setup_free(&p);
}

typedef struct attempt {
  const ef_setup *setup;
  const ef_illuminant *d65;
} attempt;

static bool try_measure(void *context) {
  const attempt *const a = context;
  ef_gamut out;
  double volume;
  ef_error error;
  const ef_status status =
      ef_gamut_measure(a->setup, a->d65, EF_ADAPT_NONE, 1, &out, &error);
  if (status != EF_OK) {
    assert_error(&error, EF_NO_MEMORY, "memory");
    return false;
  }
  return ef_object_solid_volume(ef_setup_observer(a->setup), a->d65, &volume,
                                NULL) == EF_OK;
}

static void survives_a_lack_of_memory(void **state) {
  (void)state;
  plain_setup p = plain_setup_named("srgb");
  ef_illuminant *d65 = ef_illuminant_new("D65", NULL);
  attempt a = {p.setup, d65};
  assert_true(fail_alloc_each(try_measure, &a) >= 4);
  ef_illuminant_free(d65);
  plain_setup_free(&p);
}

/* ---- Sections ---------------------------------------------------------- */

static double section_area(const ef_setup *setup, double L_star,
                           size_t *n_loops) {
  ef_gamut_section section;
  assert_int_equal(ef_gamut_section_new(setup, L_star, &section, NULL), EF_OK);
  double area = 0;
  const ef_lab *p = section.point;
  for (size_t k = 0; k < section.n_loops; p += section.n[k++]) {
    double twice = 0;
    for (size_t i = 0; i < section.n[k]; ++i) {
      const ef_lab *q = &p[(i + 1) % section.n[k]];
      twice += p[i].a_star * q->b_star - q->a_star * p[i].b_star;
      assert_near(p[i].L_star, L_star, 1e-9);
    }
    area += fabs(twice) / 2;
  }
  *n_loops = section.n_loops;
  ef_gamut_section_free(&section);
  return area;
}

/* Cut into slices, a gamut has the volume that is found without slices: by the
 * middle of each, which is off by the square of its thickness. */
static void slices_make_the_volume(void **state) {
  (void)state;
  enum { SLICES = 100 };
  plain_setup p[2] = {plain_setup_named("srgb"),
                      plain_setup_of(invented_display(true))};
  for (size_t k = 0; k < 2; ++k) {
    const double volume = measure(p[k].setup).volume_lab;
    double sum = 0;
    for (size_t i = 0; i < SLICES; ++i) {
      size_t n_loops;
      sum += section_area(p[k].setup, 100.0 * ((double)i + 0.5) / SLICES,
                          &n_loops);
      assert_true(n_loops <= 1);
    }
    print_message("# 100 slices over the volume: %.5f\n", sum / volume);
    assert_near(sum / volume, 1, 2e-4);
    plain_setup_free(&p[k]);
  }
}

/* Every corner has an amount at 0 or 1 and none beyond, the section holds the
 * neutral, and there is none beyond black and white. */
static void sections_are_the_boundary(void **state) {
  (void)state;
  plain_setup p = plain_setup_of(invented_display(true));
  const ef_match_settings settings = ef_match_settings_default();
  for (double L = 15; L < 100; L += 14) {
    ef_gamut_section section;
    assert_int_equal(ef_gamut_section_new(p.setup, L, &section, NULL), EF_OK);
    assert_int_equal(section.n_loops, 1);
    double turn = 0;
    for (size_t i = 0; i < section.n[0]; ++i) {
      const ef_lab a = section.point[i];
      const ef_lab b = section.point[(i + 1) % section.n[0]];
      turn += atan2(a.a_star * b.b_star - a.b_star * b.a_star,
                    a.a_star * b.a_star + a.b_star * b.b_star);
      ef_match m;
      const ef_xyz xyz = ef_lab_to_xyz(a, ef_setup_white(p.setup));
      const double target[3] = {xyz.X, xyz.Y, xyz.Z};
      assert_int_equal(
          ef_match_batch(p.setup, 1, target, &settings, 1, &m, NULL), EF_OK);
      double least = INFINITE, most = -INFINITE;
      for (size_t k = 0; k < 3; ++k) {
        least = fmin(least, fmin(m.amount[k], 1 - m.amount[k]));
        most = fmax(most, fmax(-m.amount[k], m.amount[k] - 1));
      }
      assert_near(least, 0, 1e-9);
      assert_true(most < 1e-9);
    }
    assert_near(fabs(turn), 2 * acos(-1.0), 1e-9);
    ef_gamut_section_free(&section);
  }
  size_t n_loops;
  assert_near(section_area(p.setup, 100.001, &n_loops), 0, 0);
  assert_int_equal(n_loops, 0);
  assert_near(section_area(p.setup, 0, &n_loops), 0, 0);
  assert_int_equal(n_loops, 0);
  ef_gamut_section none;
  ef_error error;
  ef_gamut_section_new(p.setup, NOT_A_NUMBER, &none, &error);
  assert_error(&error, EF_INVALID, "at a lightness that is a number");
  plain_setup_free(&p);
}

static bool try_section(void *context) {
  const attempt *const a = context;
  ef_gamut_section section;
  const ef_status status = ef_gamut_section_new(a->setup, 50, &section, NULL);
  ef_gamut_section_free(&section);
  return status == EF_OK;
}

static void sections_survive_a_lack_of_memory(void **state) {
  (void)state;
  plain_setup p = plain_setup_named("srgb");
  attempt a = {.setup = p.setup};
  assert_true(fail_alloc_each(try_section, &a) >= 4);
  plain_setup_free(&p);
}

int main(void) {
  cmocka_set_message_output(CM_OUTPUT_TAP);
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(hull_of_a_cross),
      cmocka_unit_test(overlap_with_an_angle),
      cmocka_unit_test(display_with_a_black),
      cmocka_unit_test(small_box_is_its_own_share),
      cmocka_unit_test(divided_primary),
      cmocka_unit_test(mesh_of_what_does_not_add),
      cmocka_unit_test(dichromat_has_no_volume),
      cmocka_unit_test(dented_locus),
      cmocka_unit_test(rectangular_spectra_are_the_boundary),
      cmocka_unit_test(errors_say_what_is_missing),
      cmocka_unit_test(survives_a_lack_of_memory),
      cmocka_unit_test(slices_make_the_volume),
      cmocka_unit_test(sections_are_the_boundary),
      cmocka_unit_test(sections_survive_a_lack_of_memory),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
