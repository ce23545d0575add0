/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Single values and edges; what holds for all colours is in laws/law_colour.c,
 * what was published elsewhere in published/. */
#include <evenfield/colour.h>

#include <float.h>

#include "fail_alloc.h"
#include "near.h"

static const ef_xyz d65 = {95.047, 100, 108.883}; /* ASTM E308-01 */

/* ---- XYZ --------------------------------------------------------------- */

static void chromaticity_of_d65(void **state) {
  (void)state;
  const ef_xyy xyy = ef_xyz_to_xyy(d65);
  assert_near(xyy.x, 0.31273, 5e-6); /* CIE 015:2018, 1 nm sums */
  assert_near(xyy.y, 0.32902, 5e-6);
  assert_near(xyy.Y, 100, 0);
  const ef_uv uv = ef_xyz_to_uv(d65);
  assert_near(uv.u_prime, 0.1978, 5e-5); /* IEC 61966-2-1 white, u' v' */
  assert_near(uv.v_prime, 0.4683, 5e-5);
}

static void black_has_no_chromaticity(void **state) {
  (void)state;
  const ef_xyz dark[] = {{0, 0, 0}, {1, -2, 0.5}, {NOT_A_NUMBER, 1, 1}};
  for (size_t i = 0; i < 3; ++i) {
    const ef_xyy xyy = ef_xyz_to_xyy(dark[i]);
    assert_true(isnan(xyy.x) && isnan(xyy.y));
    assert_same_bits(&xyy.Y, &dark[i].Y, 1);
    const ef_uv uv = ef_xyz_to_uv(dark[i]);
    assert_true(isnan(uv.u_prime) && isnan(uv.v_prime));
  }
  const ef_xyz back = ef_xyy_to_xyz(ef_xyz_to_xyy((ef_xyz){0, 0, 0}));
  assert_true(back.X == 0 && back.Y == 0 && back.Z == 0);
  const ef_xyz no_height = ef_xyy_to_xyz((ef_xyy){0.3, 0, 5});
  assert_true(isnan(no_height.X) && no_height.Y == 5 && isnan(no_height.Z));
}

static void uv_outside_its_domain(void **state) {
  (void)state;
  /* 3 - 2x + 12y and 6u' - 16v' + 12 are zero. */
  assert_true(isnan(ef_xy_to_uv((ef_xy){1.5, 0}).u_prime));
  assert_true(isnan(ef_uv_to_xy((ef_uv){0, 0.75}).x));
  assert_true(isnan(ef_xy_to_uv((ef_xy){NOT_A_NUMBER, 0.3}).v_prime));
  assert_true(isnan(ef_uv_to_xy((ef_uv){0.2, NOT_A_NUMBER}).y));
}

/* ---- Lab, Luv ---------------------------------------------------------- */

static void lab_of_white_grey_black(void **state) {
  (void)state;
  const ef_lab white = ef_xyz_to_lab(d65, d65);
  assert_near(white.L_star, 100, 0);
  assert_near(white.a_star, 0, 0);
  assert_near(white.b_star, 0, 0);
  /* L* = 50 is Y = 100 (66 / 116)^3, on the cubic branch. */
  const double third = 66.0 / 116;
  const double share = third * third * third;
  const ef_lab grey = ef_xyz_to_lab(
      (ef_xyz){share * d65.X, share * d65.Y, share * d65.Z}, d65);
  assert_near(grey.L_star, 50, 1e-13);
  assert_near(grey.a_star, 0, 1e-13);
  const ef_lab black = ef_xyz_to_lab((ef_xyz){0, 0, 0}, d65);
  assert_near(black.L_star, 0, 0);
  assert_near(black.a_star, 0, 0);
  assert_near(black.b_star, 0, 0);
  /* Straight branch: L* = 24389 / 27 Y / Yn, 216 / 24389 at its end. */
  const ef_lab dark = ef_xyz_to_lab((ef_xyz){0, 0.3, 0}, d65);
  assert_near(dark.L_star, 24389.0 / 27 * 0.003, 1e-13);
  const ef_lab below = ef_xyz_to_lab((ef_xyz){0, -0.3, 0}, d65);
  assert_near(below.L_star, -24389.0 / 27 * 0.003, 1e-13);
  const ef_lab join = ef_xyz_to_lab((ef_xyz){0, 100 * 216.0 / 24389, 0}, d65);
  assert_near(join.L_star, 8, 1e-14);
}

/* Both branches and their slopes meet: ISO/CIE 11664-4. */
static void lab_branches_meet(void **state) {
  (void)state;
  const double at = 216.0 / 24389;
  const ef_xyz unit = {1, 1, 1};
  const double below = at * (1 - 1e-12), above = at * (1 + 1e-12);
  const double low = ef_xyz_to_lab((ef_xyz){below, below, below}, unit).L_star;
  const double high = ef_xyz_to_lab((ef_xyz){above, above, above}, unit).L_star;
  assert_true(low < high);
  assert_near(high - low, 24389.0 / 27 * (above - below), 2e-14);
  double left[9], right[9];
  ef_lab_jacobian((ef_xyz){below, below, below}, unit, left);
  ef_lab_jacobian((ef_xyz){above, above, above}, unit, right);
  for (size_t i = 0; i < 9; ++i) assert_near_relative(left[i], right[i], 1e-11);
  assert_near_relative(left[1], 24389.0 / 27, 1e-15);
}

static void white_must_be_positive(void **state) {
  (void)state;
  const ef_xyz bad[] = {{0, 100, 100}, {95, -1, 100}, {95, 100, NOT_A_NUMBER}};
  for (size_t i = 0; i < 3; ++i) {
    assert_true(isnan(ef_xyz_to_lab(d65, bad[i]).L_star));
    assert_true(isnan(ef_lab_to_xyz((ef_lab){50, 0, 0}, bad[i]).Y));
    assert_true(isnan(ef_xyz_to_luv(d65, bad[i]).L_star));
    assert_true(isnan(ef_luv_to_xyz((ef_luv){50, 0, 0}, bad[i]).Y));
    double jacobian[9];
    ef_lab_jacobian(d65, bad[i], jacobian);
    assert_true(isnan(jacobian[3]));
  }
}

static void luv_of_white_and_black(void **state) {
  (void)state;
  const ef_luv white = ef_xyz_to_luv(d65, d65);
  assert_near(white.L_star, 100, 0);
  assert_near(white.u_star, 0, 0);
  assert_near(white.v_star, 0, 0);
  const ef_luv black = ef_xyz_to_luv((ef_xyz){0, 0, 0}, d65);
  assert_true(black.L_star == 0 && black.u_star == 0 && black.v_star == 0);
  const ef_xyz back = ef_luv_to_xyz(black, d65);
  assert_true(back.X == 0 && back.Y == 0 && back.Z == 0);
  /* v' = 0 cannot carry luminance. */
  const ef_uv n = ef_xyz_to_uv(d65);
  const ef_xyz none =
      ef_luv_to_xyz((ef_luv){1, 0, -13 * n.v_prime}, d65);
  assert_true(isnan(none.X) && none.Y > 0 && isnan(none.Z));
}

static void hue_angles(void **state) {
  (void)state;
  const struct {
    double a, b, h_deg;
  } known[] = {{1, 0, 0},    {1, 1, 45},    {0, 2, 90},   {-3, 0, 180},
               {-1, -1, 225}, {0, -5, 270}, {0, 0, 0},    {-0.0, -0.0, 0}};
  for (size_t i = 0; i < sizeof known / sizeof *known; ++i) {
    const ef_lch lch = ef_lab_to_lch((ef_lab){50, known[i].a, known[i].b});
    assert_near(lch.h_deg, known[i].h_deg, 6e-14);
    assert_near(lch.C_star, hypot(known[i].a, known[i].b), 1e-15);
    const ef_lch same = ef_luv_to_lch((ef_luv){50, known[i].a, known[i].b});
    assert_same_bits(&same.h_deg, &lch.h_deg, 1);
  }
  /* The smallest turn below zero is not 360. */
  const ef_lch almost = ef_lab_to_lch((ef_lab){50, 1, -DBL_MIN});
  assert_true(almost.h_deg >= 0 && almost.h_deg < 360);
  assert_true(isnan(ef_lab_to_lch((ef_lab){50, NOT_A_NUMBER, 1}).h_deg));
  const ef_lab back = ef_lch_to_lab((ef_lch){40, 10, 450}); /* any turn */
  assert_near(back.a_star, 0, 2e-14);
  assert_near(back.b_star, 10, 1e-14);
}

static void batch_may_write_over_its_input(void **state) {
  (void)state;
  double values[6] = {41.24, 21.26, 1.93, 0, 0, 0};
  const ef_lab first = ef_xyz_to_lab((ef_xyz){41.24, 21.26, 1.93}, d65);
  const double expected[6] = {first.L_star, first.a_star, first.b_star};
  ef_xyz_to_lab_batch(2, values, d65, values);
  for (size_t i = 0; i < 6; ++i) assert_near(values[i], expected[i], 1e-13);
  /* The white itself has no trace of a colour. */
  double white[3] = {d65.X, d65.Y, d65.Z};
  ef_xyz_to_lab_batch(1, white, d65, white);
  assert_true(white[0] == 100 && white[1] == 0 && white[2] == 0);
  ef_xyz_to_lab_batch(1, white, (ef_xyz){0, 1, 1}, white);
  assert_true(isnan(white[0]) && isnan(white[1]) && isnan(white[2]));
}

/* ---- Adaptation -------------------------------------------------------- */

static void adaptation_names(void **state) {
  (void)state;
  const ef_adaptation all[] = {EF_ADAPT_NONE, EF_ADAPT_BRADFORD,
                               EF_ADAPT_CAT16};
  for (size_t i = 0; i < 3; ++i) {
    ef_adaptation found;
    assert_int_equal(
        ef_adaptation_find(ef_adaptation_name(all[i]), &found, NULL), EF_OK);
    assert_int_equal(found, all[i]);
  }
  ef_error error;
  ef_adaptation found = EF_ADAPT_CAT16;
  assert_int_equal(ef_adaptation_find("bradfort", &found, &error),
                   EF_UNKNOWN_NAME);
  assert_error(&error, EF_UNKNOWN_NAME, "bradford");
  assert_int_equal(found, EF_ADAPT_CAT16);
  assert_string_equal(ef_adaptation_name((ef_adaptation)77), "unknown");
}

static void adaptation_none_scales(void **state) {
  (void)state;
  double m[9];
  const ef_xyz to = {50, 60, 40};
  assert_int_equal(ef_adaptation_matrix(EF_ADAPT_NONE, d65, to, m, NULL),
                   EF_OK);
  for (int i = 0; i < 9; ++i) assert_near(m[i], i % 4 == 0 ? 0.6 : 0, 0);
}

static void adaptation_to_the_same_white(void **state) {
  (void)state;
  double m[9];
  const double identity[9] = {1, 0, 0, 0, 1, 0, 0, 0, 1};
  for (int a = EF_ADAPT_NONE; a <= EF_ADAPT_CAT16; ++a) {
    assert_int_equal(ef_adaptation_matrix((ef_adaptation)a, d65, d65, m, NULL),
                     EF_OK);
    assert_same_bits(m, identity, 9);
  }
}

static void adaptation_refuses(void **state) {
  (void)state;
  double m[9] = {7};
  ef_error error;
  const ef_xyz blue = {18, 7.2, 120}; /* a primary is no white */
  const ef_xyz red_edge = {1000, 100, 0};
  assert_int_equal(
      ef_adaptation_matrix(EF_ADAPT_CAT16, red_edge, d65, m, &error),
      EF_INVALID);
  assert_error(&error, EF_INVALID, "not positive");
  assert_int_equal(
      ef_adaptation_matrix(EF_ADAPT_BRADFORD, d65, blue, m, &error),
      EF_INVALID);
  assert_error(&error, EF_INVALID, "X 18, Y 7.2, Z 120");
  const ef_xyz none = {0, 0, 0}, odd = {95, NOT_A_NUMBER, 108};
  assert_int_equal(ef_adaptation_matrix(EF_ADAPT_NONE, none, d65, m, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "above zero");
  assert_int_equal(ef_adaptation_matrix(EF_ADAPT_CAT16, d65, odd, m, &error),
                   EF_INVALID);
  assert_int_equal(
      ef_adaptation_matrix((ef_adaptation)9, d65, d65, m, &error), EF_INVALID);
  assert_near(m[0], 7, 0); /* untouched */
}

/* ---- Cone spaces ------------------------------------------------------- */

static void macleod_boynton(void **state) {
  (void)state;
  const ef_mb_scale scale = {0.68990272, 0.34832189, 0.0371597};
  const ef_mb mb = ef_lms_to_mb((ef_lms){2, 1, 3}, scale);
  const double luminance = 2 * 0.68990272 + 0.34832189;
  assert_near(mb.luminance, luminance, 1e-15);
  assert_near(mb.mb_l, 2 * 0.68990272 / luminance, 1e-15);
  assert_near(mb.mb_s, 3 * 0.0371597 / luminance, 1e-15);
  const ef_mb dark = ef_lms_to_mb((ef_lms){0, 0, 0}, scale);
  assert_true(isnan(dark.mb_l) && isnan(dark.mb_s) && dark.luminance == 0);
  const ef_lms back = ef_mb_to_lms(dark, scale);
  assert_true(back.cone_l == 0 && back.cone_m == 0 && back.cone_s == 0);
  /* S alone has no luminance. */
  assert_true(isnan(ef_lms_to_mb((ef_lms){0, 0, 1}, scale).mb_s));
}

/* ---- Temperature ------------------------------------------------------- */

/* Illuminant A: 2855.5 K with this c2; x, y of CIE 015:2018, sums from 380 to
 * 780 nm at 5 nm, which differ from 1 nm sums over the whole range by 1e-5. */
static void planckian_chromaticity(void **state) {
  (void)state;
  const ef_xy a = ef_planck_xy(2848 * 1.4388 / 1.4350);
  assert_near(a.x, 0.44758, 1.5e-5);
  assert_near(a.y, 0.40745, 1.5e-5);
  assert_true(isnan(ef_planck_xy(499).x));
  assert_true(isnan(ef_planck_xy(1.01e6).y));
  assert_true(isnan(ef_planck_xy(-3000).x));
  assert_true(isnan(ef_planck_xy(0).x));
  assert_true(isnan(ef_planck_xy(NOT_A_NUMBER).x));
  assert_true(ef_planck_xy(500).x > 0.6);
  assert_true(ef_planck_xy(1e6).x < 0.2402);
}

static void temperature_limits(void **state) {
  (void)state;
  assert_true(ef_xy_to_cct(ef_planck_xy(1000)).defined);
  assert_true(ef_xy_to_cct(ef_planck_xy(100000)).defined);
  assert_false(ef_xy_to_cct(ef_planck_xy(999.9)).defined);
  assert_false(ef_xy_to_cct(ef_planck_xy(100100)).defined);
  assert_false(ef_xy_to_cct(ef_planck_xy(1e6)).defined);
  const ef_xy far[] = {{0.735, 0.265}, {0.17, 0.01}, {0.1, 0.1}, {0.08, 0.83},
                       {0, 0},         {1, 0},       {0, 1}};
  for (size_t i = 0; i < sizeof far / sizeof *far; ++i) {
    const ef_cct cct = ef_xy_to_cct(far[i]);
    assert_false(cct.defined);
    assert_true(isnan(cct.cct_k));
  }
  const ef_cct odd = ef_xy_to_cct((ef_xy){NOT_A_NUMBER, 0.3});
  assert_true(!odd.defined && isnan(odd.cct_k) && isnan(odd.duv));
  assert_false(ef_xy_to_cct((ef_xy){INFINITE, 0.3}).defined);
}

/* Too far from the locus there is no temperature, but the distance is told. */
static void distance_beyond_the_limit(void **state) {
  (void)state;
  const ef_cct green = ef_xy_to_cct((ef_xy){0.3, 0.5});
  assert_false(green.defined);
  assert_true(isnan(green.cct_k));
  assert_true(green.duv > 0.05 && green.duv < 0.1);
  const ef_cct purple = ef_xy_to_cct((ef_xy){0.38, 0.24});
  assert_true(!purple.defined && purple.duv < -0.05);
}

/* ---- Dominant wavelength ----------------------------------------------- */

static const ef_xy equal_energy = {1.0 / 3, 1.0 / 3};

static ef_observer *cie_1931(void) {
  ef_observer *const observer = ef_observer_new("cie-1931", NULL);
  assert_non_null(observer);
  return observer;
}

static ef_dominant dominant_of(ef_xy xy, ef_xy white) {
  ef_observer *const observer = cie_1931();
  ef_dominant out;
  ef_error error;
  if (ef_xy_to_dominant(xy, white, observer, &out, &error) != EF_OK) {
    fail_msg("%s", error.message);
  }
  ef_observer_free(observer);
  return out;
}

static void dominant_of_white_and_halfway(void **state) {
  (void)state;
  const ef_dominant white = dominant_of(equal_energy, equal_energy);
  assert_true(isnan(white.dominant_nm) && !white.complementary);
  assert_near(white.purity, 0, 0);
  ef_observer *const observer = cie_1931();
  const double wavelength_nm[1] = {520.25};
  ef_xy locus;
  assert_int_equal(ef_locus_xy(observer, 1, wavelength_nm, &locus, NULL),
                   EF_OK);
  const ef_dominant half =
      dominant_of((ef_xy){0.5 * (locus.x + equal_energy.x),
                          0.5 * (locus.y + equal_energy.y)},
                  equal_energy);
  assert_near(half.dominant_nm, 520.25, 1e-11);
  assert_near(half.purity, 0.5, 1e-14);
  ef_observer_free(observer);
}

/* A purple: on the line from a green through the white, beyond it. */
static void dominant_of_a_purple(void **state) {
  (void)state;
  ef_observer *const observer = cie_1931();
  const double ends_nm[3] = {520, 380, 780};
  ef_xy locus[3];
  assert_int_equal(ef_locus_xy(observer, 3, ends_nm, locus, NULL), EF_OK);
  const ef_xy away = {equal_energy.x - 0.2 * (locus[0].x - equal_energy.x),
                      equal_energy.y - 0.2 * (locus[0].y - equal_energy.y)};
  const ef_dominant purple = dominant_of(away, equal_energy);
  assert_true(purple.complementary);
  assert_near(purple.dominant_nm, 520, 1e-10);
  assert_true(purple.purity > 0.2 && purple.purity < 1);
  /* In the middle of the purple line: the tables' jitter at the ends moves the
   * line by some 1e-5. */
  const ef_dominant edge =
      dominant_of((ef_xy){0.5 * (locus[1].x + locus[2].x),
                          0.5 * (locus[1].y + locus[2].y)},
                  equal_energy);
  assert_true(edge.complementary);
  assert_near(edge.purity, 1, 1e-4);
  ef_observer_free(observer);
}

/* Imaginary colours have a purity above 1. */
static void dominant_outside_the_locus(void **state) {
  (void)state;
  const ef_dominant out = dominant_of((ef_xy){0, 0.9}, equal_energy);
  assert_false(out.complementary);
  assert_true(out.purity > 1);
}

static void dominant_refuses(void **state) {
  (void)state;
  ef_observer *const observer = cie_1931();
  ef_dominant out;
  ef_error error;
  assert_int_equal(ef_xy_to_dominant((ef_xy){NOT_A_NUMBER, NOT_A_NUMBER},
                                     equal_energy, observer, &out, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "black has no chromaticity");
  assert_int_equal(ef_xy_to_dominant(equal_energy, (ef_xy){0.8, 0.5}, observer,
                                     &out, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "x 0.8, y 0.5 lies outside");
  const double outside[2] = {500, 359};
  ef_xy locus[2];
  assert_int_equal(ef_locus_xy(observer, 2, outside, locus, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "wavelength 2 is 359 nm");
  ef_observer_free(observer);
}

static void locus_of_the_ends(void **state) {
  (void)state;
  ef_observer *const observer = cie_1931();
  const double wavelength_nm[3] = {360, 700, 830};
  ef_xy locus[3];
  assert_int_equal(ef_locus_xy(observer, 3, wavelength_nm, locus, NULL), EF_OK);
  assert_near(locus[1].x, 0.73469, 5e-6); /* ISO/CIE 11664-1:2019 */
  assert_near(locus[1].y, 0.26531, 5e-6);
  assert_true(isfinite(locus[0].x) && isfinite(locus[2].x));
  ef_observer_free(observer);
  /* No cones below 390 nm, so no chromaticity. */
  ef_observer *const cones = ef_observer_new("cie-2015-2", NULL);
  const double below[2] = {389.5, 390};
  assert_int_equal(ef_locus_xy(cones, 2, below, locus, NULL), EF_OK);
  assert_true(isnan(locus[0].x) && isfinite(locus[1].x));
  ef_observer_free(cones);
}

/* ---- Colour rendering -------------------------------------------------- */

static void sample_light(const char *name, const ef_grid *grid, double *power) {
  ef_illuminant *const light = ef_illuminant_new(name, NULL);
  assert_non_null(light);
  assert_int_equal(ef_illuminant_sample(light, grid, power, NULL), EF_OK);
  ef_illuminant_free(light);
}

static ef_rendering rendering_of(const ef_grid *grid, const double *power) {
  ef_rendering out;
  ef_error error;
  if (ef_rendering_index(grid, power, &out, &error) != EF_OK) {
    fail_msg("%s", error.message);
  }
  return out;
}

static const ef_grid five_nm = {.count = 95, .start_nm = 360, .step_nm = 5};

static void rendering_fields(void **state) {
  (void)state;
  double power[95];
  sample_light("HP1", &five_nm, power);
  const ef_rendering sodium = rendering_of(&five_nm, power);
  assert_false(sodium.reference_is_daylight);
  assert_near(sodium.cct_k, 1959, 1); /* CIE 15:2004 Table T.9 */
  assert_true(sodium.tolerable);
  double sum = 0;
  for (size_t i = 0; i < 8; ++i) sum += sodium.R[i];
  assert_near(sodium.Ra, sum / 8, 1e-12);
  /* Against a black body the distance is that from its locus; FL6 is greenish:
   * x 0.3779, y 0.3882 (CIE 15:2004 Table T.7). */
  sample_light("FL6", &five_nm, power);
  const ef_rendering greenish = rendering_of(&five_nm, power);
  assert_false(greenish.reference_is_daylight);
  const double duv = ef_xy_to_cct((ef_xy){0.3779, 0.3882}).duv;
  assert_near(greenish.delta_c, duv, 5e-5);
  assert_false(greenish.tolerable);
  /* An equal-energy light lies below the locus, daylight above. */
  for (size_t i = 0; i < 95; ++i) power[i] = 1;
  const ef_rendering flat = rendering_of(&five_nm, power);
  assert_true(flat.reference_is_daylight);
  assert_false(flat.tolerable);
  assert_true(flat.delta_c > 5.4e-3);
}

/* Lines between the 5 nm points are not lost: gathered into bands, three of
 * them keep their chromaticity, and so their temperature, as far as the
 * observer's functions are straight over 5 nm. */
static void rendering_of_narrow_lines(void **state) {
  (void)state;
  const ef_grid one_nm = ef_grid_standard();
  double power[471] = {0};
  power[458 - 360] = 0.62;
  power[533 - 360] = 0.62;
  power[608 - 360] = 1;
  ef_observer *const observer = cie_1931();
  const ef_channels c = ef_observer_channels(observer, EF_TRISTIMULUS);
  double xyz[3] = {0, 0, 0};
  for (size_t k = 0; k < 3; ++k) {
    for (size_t i = 0; i < 471; ++i) xyz[k] += power[i] * c.value[k * 471 + i];
  }
  const ef_xyy xyy = ef_xyz_to_xyy((ef_xyz){xyz[0], xyz[1], xyz[2]});
  const ef_cct exact = ef_xy_to_cct((ef_xy){xyy.x, xyy.y});
  assert_true(exact.defined);
  const ef_rendering r = rendering_of(&one_nm, power);
  assert_near_relative(r.cct_k, exact.cct_k, 5e-3);
  assert_true(r.Ra < 80);
  ef_observer_free(observer);
}

/* The grid may have any shape: fine, uneven, coarse, or short. */
static void rendering_on_other_grids(void **state) {
  (void)state;
  const ef_grid one_nm = ef_grid_standard();
  double power[471];
  sample_light("planck:3000", &five_nm, power);
  const ef_rendering exact = rendering_of(&five_nm, power);
  assert_near(exact.Ra, 100, 1e-3);
  assert_near(exact.cct_k, 3000, 0.01);
  sample_light("planck:3000", &one_nm, power);
  assert_near(rendering_of(&one_nm, power).Ra, 100, 0.02);
  const ef_grid coarse = {.count = 41, .start_nm = 380, .step_nm = 10};
  sample_light("planck:3000", &coarse, power);
  assert_near(rendering_of(&coarse, power).Ra, 100, 0.02);
  double wavelength_nm[120];
  for (size_t i = 0; i < 120; ++i) {
    wavelength_nm[i] = 370 + 3.5 * (double)i + (i % 2 == 0 ? 0.7 : 0);
  }
  const ef_grid uneven = {.count = 120, .wavelength_nm = wavelength_nm};
  sample_light("planck:3000", &uneven, power);
  assert_near(rendering_of(&uneven, power).Ra, 100, 0.05);
}

static ef_status try_rendering(const ef_grid *grid, double level,
                               ef_error *error) {
  double power[95];
  for (size_t i = 0; i < 95; ++i) power[i] = level;
  ef_rendering out;
  return ef_rendering_index(grid, power, &out, error);
}

static void rendering_refuses(void **state) {
  (void)state;
  ef_error error;
  assert_int_equal(try_rendering(&five_nm, 0, &error), EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "dark");
  const ef_grid infrared = {.count = 5, .start_nm = 900, .step_nm = 5};
  assert_int_equal(try_rendering(&infrared, 1, &error), EF_NO_ANSWER);
  assert_int_equal(try_rendering(&five_nm, NOT_A_NUMBER, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "value 1 is not a finite number");
  assert_int_equal(try_rendering(&five_nm, -1, &error), EF_NO_ANSWER);
  const ef_grid red = {.count = 3, .start_nm = 650, .step_nm = 5};
  assert_int_equal(try_rendering(&red, 1, &error), EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "1000 and 25000 K");
  double power[95];
  ef_rendering out;
  sample_light("planck:40000", &five_nm, power);
  assert_int_equal(ef_rendering_index(&five_nm, power, &out, &error),
                   EF_NO_ANSWER);
  const ef_grid empty = {.count = 0, .start_nm = 400, .step_nm = 5};
  assert_int_equal(try_rendering(&empty, 1, &error), EF_INVALID);
}

static bool index_of_a(void *context) {
  const double *const power = context;
  ef_rendering out;
  ef_error error = {.status = EF_OK};
  const ef_status status = ef_rendering_index(&five_nm, power, &out, &error);
  if (status != EF_OK) assert_int_equal(status, EF_NO_MEMORY);
  return status == EF_OK;
}

static void rendering_out_of_memory(void **state) {
  (void)state;
  double power[95];
  sample_light("A", &five_nm, power);
  assert_true(fail_alloc_each(index_of_a, power) > 0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(chromaticity_of_d65),
      cmocka_unit_test(black_has_no_chromaticity),
      cmocka_unit_test(uv_outside_its_domain),
      cmocka_unit_test(lab_of_white_grey_black),
      cmocka_unit_test(lab_branches_meet),
      cmocka_unit_test(white_must_be_positive),
      cmocka_unit_test(luv_of_white_and_black),
      cmocka_unit_test(hue_angles),
      cmocka_unit_test(batch_may_write_over_its_input),
      cmocka_unit_test(adaptation_names),
      cmocka_unit_test(adaptation_none_scales),
      cmocka_unit_test(adaptation_to_the_same_white),
      cmocka_unit_test(adaptation_refuses),
      cmocka_unit_test(macleod_boynton),
      cmocka_unit_test(planckian_chromaticity),
      cmocka_unit_test(temperature_limits),
      cmocka_unit_test(distance_beyond_the_limit),
      cmocka_unit_test(dominant_of_white_and_halfway),
      cmocka_unit_test(dominant_of_a_purple),
      cmocka_unit_test(dominant_outside_the_locus),
      cmocka_unit_test(dominant_refuses),
      cmocka_unit_test(locus_of_the_ends),
      cmocka_unit_test(rendering_fields),
      cmocka_unit_test(rendering_of_narrow_lines),
      cmocka_unit_test(rendering_on_other_grids),
      cmocka_unit_test(rendering_refuses),
      cmocka_unit_test(rendering_out_of_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
