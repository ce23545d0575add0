/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Metamer sets: small ones known otherwise, flat ones, and what is refused. */
#include <stdlib.h>

#include <evenfield/match.h>

#include "fail_alloc.h"
#include "gen.h"
#include "must.h"
#include "near.h"

#include "match/sphere.h"

typedef struct eyes {
  ef_illuminant *d65, *a;
  ef_observer *cie_1931, *cie_1964;
  ef_look d65_2, a_2, d65_10;
} eyes;

static int open_eyes(void **state) {
  eyes *const e = calloc(1, sizeof *e);
  e->d65 = ef_illuminant_new("D65", NULL);
  e->a = ef_illuminant_new("A", NULL);
  e->cie_1931 = ef_observer_new("cie-1931", NULL);
  e->cie_1964 = ef_observer_new("cie-1964", NULL);
  e->d65_2 = (ef_look){e->cie_1931, ef_viewing_default(e->d65)};
  e->a_2 = (ef_look){e->cie_1931, ef_viewing_default(e->a)};
  e->d65_10 = (ef_look){e->cie_1964, ef_viewing_default(e->d65)};
  *state = e;
  return 0;
}

static int close_eyes(void **state) {
  eyes *const e = *state;
  ef_observer_free(e->cie_1931);
  ef_observer_free(e->cie_1964);
  ef_illuminant_free(e->d65);
  ef_illuminant_free(e->a);
  free(e);
  return 0;
}

static ef_xyz colour_of(const ef_look *look, const ef_grid *grid,
                        const double *spectrum) {
  ef_weights *const weights = must_weights(look, grid);
  double xyz[3];
  ef_weights_apply(weights, 1, spectrum, 1, xyz, NULL);
  ef_weights_free(weights);
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

static ef_metamer_set *make(const ef_look *reference, ef_xyz xyz,
                            const ef_look *test,
                            const ef_metamer_settings *settings) {
  ef_error error;
  ef_metamer_set *const set =
      ef_metamer_set_new(1, reference, &xyz, test, settings, 0, &error);
  if (set == NULL)
    fail_msg("%s", error.message);
  return set;
}

/* Four samples leave one way to vary: metamers lie on a line, which ends where
 * the first sample comes to a limit. Its ends by elimination. */
static void four_samples_leave_a_line(void **state) {
  const eyes *const e = *state;
  ef_metamer_settings settings = ef_metamer_settings_default();
  settings.grid = (ef_grid){.count = 4, .start_nm = 420, .step_nm = 70};
  settings.level = 1;
  const double r[4] = {0.3, 0.6, 0.4, 0.7};
  ef_weights *const weights = must_weights(&e->d65_2, &settings.grid);
  const double *const w = ef_weights_matrix(weights);
  /* w (v, 1) = 0: Cramer's rule for v, with w's rows of four. */
  double v[4] = {0, 0, 0, 1};
  const double whole = w[0] * (w[5] * w[10] - w[6] * w[9]) -
                       w[1] * (w[4] * w[10] - w[6] * w[8]) +
                       w[2] * (w[4] * w[9] - w[5] * w[8]);
  for (size_t k = 0; k < 3; ++k) {
    double m[3][3];
    for (size_t i = 0; i < 3; ++i) {
      for (size_t j = 0; j < 3; ++j)
        m[i][j] = j == k ? -w[4 * i + 3] : w[4 * i + j];
    }
    v[k] = (m[0][0] * (m[1][1] * m[2][2] - m[1][2] * m[2][1]) -
            m[0][1] * (m[1][0] * m[2][2] - m[1][2] * m[2][0]) +
            m[0][2] * (m[1][0] * m[2][1] - m[1][1] * m[2][0])) /
           whole;
  }
  double low = -INFINITE, high = INFINITE;
  for (size_t k = 0; k < 4; ++k) {
    const double down = (v[k] > 0 ? 0 - r[k] : 1 - r[k]) / v[k];
    const double up = (v[k] > 0 ? 1 - r[k] : 0 - r[k]) / v[k];
    low = fmax(low, down);
    high = fmin(high, up);
  }
  double end[2][4];
  for (size_t k = 0; k < 4; ++k) {
    end[0][k] = r[k] + low * v[k];
    end[1][k] = r[k] + high * v[k];
  }
  const ef_xyz ends[2] = {colour_of(&e->a_2, &settings.grid, end[0]),
                          colour_of(&e->a_2, &settings.grid, end[1])};
  ef_metamer_set *const set =
      make(&e->d65_2, colour_of(&e->d65_2, &settings.grid, r), &e->a_2,
           &settings);
  const ef_metamer_body body = ef_metamer_set_body(set);
  assert_true(body.is_flat);
  assert_true(body.volume_low == 0 && body.volume_high == 0 &&
              body.volume_lab == 0);
  assert_int_equal(ef_metamer_set_count(set), 42);
  bool reached[2] = {false, false};
  for (size_t i = 0; i < 42; ++i) {
    const ef_xyz p = ef_metamer_set_point(set, i);
    const size_t k = fabs(p.X - ends[0].X) < 1e-9 ? 0 : 1;
    reached[k] = true;
    assert_near(p.X, ends[k].X, 1e-9);
    assert_near(p.Y, ends[k].Y, 1e-9);
    assert_near(p.Z, ends[k].Z, 1e-9);
  }
  assert_true(reached[0] && reached[1]);
  const size_t *corner;
  assert_int_equal(ef_metamer_set_triangles(set, &corner), 0);
  /* How far the two part, either way round. */
  const ef_metric *const metric = ef_metric_find("cielab", NULL);
  const ef_lab lab[2] = {ef_xyz_to_lab(ends[0], body.white),
                         ef_xyz_to_lab(ends[1], body.white)};
  const double apart = ef_delta_e_cielab(lab[0], lab[1]);
  ef_xyz standard, sample;
  double widest, farthest;
  assert_int_equal(ef_metamer_set_widest(set, metric, NULL, 1, &standard,
                                         &sample, &widest, NULL),
                   EF_OK);
  assert_near(widest, apart, 1e-8);
  assert_int_equal(ef_metamer_set_farthest(set, metric, NULL, ends[0], &sample,
                                           &farthest, NULL),
                   EF_OK);
  assert_near(farthest, apart, 1e-8);
  assert_near(sample.X, ends[1].X, 1e-9);
  ef_metamer_set_free(set);
  ef_weights_free(weights);
}

/* Two looks leave a set of metamers that each alone does not. */
static void more_looks_leave_less(void **state) {
  const eyes *const e = *state;
  const ef_metamer_settings settings = ef_metamer_settings_default();
  double spectrum[81];
  gen g = gen_new(71);
  gen_smooth(&g, 81, spectrum);
  const ef_look both[2] = {e->d65_2, e->a_2};
  const ef_xyz xyz[2] = {colour_of(&e->d65_2, &settings.grid, spectrum),
                         colour_of(&e->a_2, &settings.grid, spectrum)};
  ef_error error;
  ef_metamer_set *const one =
      ef_metamer_set_new(1, both, xyz, &e->d65_10, &settings, 0, &error);
  ef_metamer_set *const two =
      ef_metamer_set_new(2, both, xyz, &e->d65_10, &settings, 0, &error);
  assert_non_null(one);
  assert_non_null(two);
  assert_true(ef_metamer_set_body(two).volume_high <
              0.5 * ef_metamer_set_body(one).volume_low);
  for (size_t i = 0; i < ef_metamer_set_count(two); ++i)
    assert_true(ef_metamer_set_outside(one, ef_metamer_set_point(two, i)) <
                1e-8);
  ef_metamer_set_free(one);
  ef_metamer_set_free(two);
}

/* White, black and the reference look itself leave no freedom. */
static void no_freedom(void **state) {
  const eyes *const e = *state;
  const ef_metamer_settings settings = ef_metamer_settings_default();
  double level[81];
  for (int k = 0; k < 3; ++k) {
    for (size_t i = 0; i < 81; ++i)
      level[i] = 0.5 * k;
    const ef_look *const test = k == 1 ? &e->d65_2 : &e->a_2;
    ef_metamer_set *const set = make(
        &e->d65_2, colour_of(&e->d65_2, &settings.grid, level), test,
        &settings);
    const ef_xyz expected = colour_of(test, &settings.grid, level);
    assert_true(ef_metamer_set_body(set).is_flat);
    for (size_t i = 0; i < ef_metamer_set_count(set); ++i) {
      assert_near(ef_metamer_set_point(set, i).X, expected.X, 1e-7);
      assert_near(ef_metamer_set_point(set, i).Z, expected.Z, 1e-7);
    }
    double difference;
    ef_xyz farthest;
    assert_int_equal(
        ef_metamer_set_farthest(set, ef_metric_find("ciede2000", NULL), NULL,
                                expected, &farthest, &difference, NULL),
        EF_OK);
    assert_near(difference, 0, 1e-5);
    ef_metamer_set_free(set);
  }
}

static void refused(void **state) {
  const eyes *const e = *state;
  const ef_metamer_settings good = ef_metamer_settings_default();
  const ef_xyz grey = {19, 20, 21.8}, bright = {98, 101, 109},
               broken = {1, NOT_A_NUMBER, 1};
  const ef_look light = {e->cie_1931, ef_viewing_default(NULL)};
  ef_error error;
  assert_null(
      ef_metamer_set_new(1, &e->d65_2, &bright, &e->a_2, &good, 1, &error));
  assert_int_equal(error.status, EF_NO_ANSWER);
  assert_string_equal(error.message,
                      "no surface with reflectances from 0 to 1 has X 98.0000, "
                      "Y 101.0000, Z 109.0000 under the reference look");
  const ef_look both[2] = {e->d65_2, e->a_2};
  const ef_xyz unlike[2] = {{20, 20, 20}, {20, 60, 5}};
  assert_null(ef_metamer_set_new(2, both, unlike, &e->a_2, &good, 1, &error));
  assert_string_equal(error.message,
                      "no surface with reflectances from 0 to 1 has X 20.0000, "
                      "Y 20.0000, Z 20.0000 under the reference look and its "
                      "colours under the others");
  assert_null(
      ef_metamer_set_new(1, &e->d65_2, &broken, &e->a_2, &good, 1, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_string_equal(error.message,
                      "the colour under look 1 is not a number");
  assert_null(ef_metamer_set_new(1, &light, &grey, &e->a_2, &good, 1, &error));
  assert_string_equal(error.message, "a look at lights has no metamers among "
                                     "surfaces: give its illuminant");
  assert_null(ef_metamer_set_new(0, &e->d65_2, &grey, &e->a_2, &good, 1,
                                 &error));
  assert_string_equal(error.message,
                      "0 looks to match under, expected 1 to 4");
  const struct {
    ef_metamer_settings settings;
    const char *message;
  } rows[] = {
      {{.grid = {1001, 300, 0.5, NULL}, .high = 1},
       "1001 samples of a reflectance, expected at most 1000"},
      {{.grid = good.grid, .high = 1, .level = 6},
       "level 6 of directions, expected 0 to 5"},
      {{.grid = good.grid, .high = 1, .level = -1},
       "level -1 of directions, expected 0 to 5"},
      {{.grid = good.grid, .low = -0.1, .high = 1},
       "reflectances from -0.1 to 1, expected limits from 0 in increasing "
       "order"},
      {{.grid = good.grid, .low = 0.5, .high = 0.5},
       "reflectances from 0.5 to 0.5, expected limits from 0 in increasing "
       "order"},
  };
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    assert_null(ef_metamer_set_new(1, &e->d65_2, &grey, &e->a_2,
                                   &rows[i].settings, 1, &error));
    assert_int_equal(error.status, EF_INVALID);
    assert_string_equal(error.message, rows[i].message);
  }
  ef_metamer_set_free(NULL);
}

/* Unit vectors, each triangle seen counterclockwise from outside, every edge
 * between two triangles (Euler), all of it once round (4 pi / 3 from inside as
 * the triangles get small). */
static void directions(void **state) {
  (void)state;
  enum { MOST = 10242, TRIANGLES = 20480 };
  static double point[MOST][3];
  static size_t corner[3 * TRIANGLES], scratch[12 * MOST];
  for (int level = 0; level <= EF__SPHERE_LEVELS; ++level) {
    ef__sphere_set(level, point, corner, scratch);
    const size_t n = ef__sphere_points(level), m = ef__sphere_triangles(level);
    assert_int_equal(n + m - 3 * m / 2, 2);
    double volume = 0;
    size_t used[MOST] = {0};
    for (size_t t = 0; t < m; ++t) {
      const double *const a = point[corner[3 * t]];
      const double *const b = point[corner[3 * t + 1]];
      const double *const c = point[corner[3 * t + 2]];
      const double part = a[0] * (b[1] * c[2] - b[2] * c[1]) -
                          a[1] * (b[0] * c[2] - b[2] * c[0]) +
                          a[2] * (b[0] * c[1] - b[1] * c[0]);
      assert_true(part > 0);
      volume += part / 6;
      for (size_t k = 0; k < 3; ++k)
        ++used[corner[3 * t + k]];
    }
    for (size_t i = 0; i < n; ++i) {
      assert_near(hypot(hypot(point[i][0], point[i][1]), point[i][2]), 1,
                  1e-15);
      assert_int_equal(used[i], i < 12 ? 5 : 6);
    }
    if (level == EF__SPHERE_LEVELS)
      assert_near_relative(volume, 4 * acos(-1) / 3, 0.002);
  }
}

static bool attempt(void *context) {
  const eyes *const e = context;
  ef_metamer_settings settings = ef_metamer_settings_default();
  settings.grid = (ef_grid){.count = 11, .start_nm = 400, .step_nm = 30};
  settings.level = 0;
  const ef_xyz grey = {19, 20, 21.8};
  ef_error error = {0};
  ef_metamer_set *const set =
      ef_metamer_set_new(1, &e->d65_2, &grey, &e->a_2, &settings, 1, &error);
  ef_xyz a, b;
  double difference;
  ef_status status = error.status;
  if (set != NULL)
    status = ef_metamer_set_widest(set, ef_metric_find("cielab", NULL), NULL, 1,
                                   &a, &b, &difference, &error);
  if (status == EF_OK)
    status = ef_metamer_set_farthest(set, ef_metric_find("cielab", NULL), NULL,
                                     a, &b, &difference, &error);
  assert_true(status == EF_OK || error.status == EF_NO_MEMORY);
  ef_metamer_set_free(set);
  return status == EF_OK;
}

static void without_memory(void **state) {
  assert_true(fail_alloc_each(attempt, *state) > 8);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(four_samples_leave_a_line),
      cmocka_unit_test(more_looks_leave_less),
      cmocka_unit_test(no_freedom),
      cmocka_unit_test(refused),
      cmocka_unit_test(directions),
      cmocka_unit_test(without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, open_eyes, close_eyes);
}
