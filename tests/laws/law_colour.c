/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Laws of the colour transformations on random colours. Tolerances are
 * multiples of DBL_EPSILON with the conditioning that explains them; the
 * largest multiple met is printed. */
#include <evenfield/colour.h>

#include <float.h>

#include "base/base_private.h"
#include "gen.h"
#include "near.h"

static const double eps = DBL_EPSILON;

static ef_xyz random_xyz(gen *g) {
  return (ef_xyz){gen_between(g, 0.01, 100), gen_between(g, 0.01, 100),
                  gen_between(g, 0.01, 100)};
}

static ef_xyz random_white(gen *g) {
  return (ef_xyz){gen_between(g, 85, 115), 100, gen_between(g, 30, 130)};
}

/* Largest error so far in units of eps times a scale. */
typedef struct worst {
  double multiple;
} worst;

static void note_error(worst *w, double actual, double expected, double scale) {
  const double multiple = fabs(actual - expected) / (eps * scale);
  if (!(multiple <= w->multiple)) w->multiple = multiple; /* keeps NaN */
}

static void check_worst(const worst *w, double allowed, const char *what) {
  printf("# %s: %.2f eps, allowed %g\n", what, w->multiple, allowed);
  assert_true(w->multiple <= allowed);
}

enum { N = 100000 };

/* ---- Round trips ------------------------------------------------------- */

/* 1 - x - y is off by two roundings of 1, so Z by those of X + Y + Z; dividing
 * by y makes that relative to the sum. */
static void xyy_and_back(void **state) {
  (void)state;
  gen g = gen_new(1);
  worst w = {0};
  for (int i = 0; i < N; ++i) {
    const ef_xyz a = random_xyz(&g);
    const ef_xyz b = ef_xyy_to_xyz(ef_xyz_to_xyy(a));
    const double sum = a.X + a.Y + a.Z;
    note_error(&w, b.X, a.X, a.X);
    note_error(&w, b.Y, a.Y, a.Y);
    note_error(&w, b.Z, a.Z, sum + a.Z);
  }
  check_worst(&w, 4, "xyY");
}

/* Six products and quotients; the sums do not cancel for real colours. */
static void uv_and_back(void **state) {
  (void)state;
  gen g = gen_new(2);
  worst forth = {0}, back = {0};
  for (int i = 0; i < N; ++i) {
    const ef_xyz a = random_xyz(&g);
    const ef_xyy xyy = ef_xyz_to_xyy(a);
    const ef_uv direct = ef_xyz_to_uv(a);
    const ef_uv uv = ef_xy_to_uv((ef_xy){xyy.x, xyy.y});
    const ef_xy xy = ef_uv_to_xy(uv);
    note_error(&forth, uv.u_prime, direct.u_prime, direct.u_prime);
    note_error(&forth, uv.v_prime, direct.v_prime, direct.v_prime);
    /* 6 u' - 16 v' + 12 is 12 X / (...) but is found from terms up to 12. */
    const double sum = 6 * uv.u_prime - 16 * uv.v_prime + 12;
    note_error(&back, xy.x, xyy.x, xyy.x * (1 + 12 / sum));
    note_error(&back, xy.y, xyy.y, xyy.y * (1 + 12 / sum));
  }
  check_worst(&forth, 8, "u'v' of XYZ and of xy");
  check_worst(&back, 8, "u'v' to xy");
}

/* f is off by some roundings of the largest f and of a* / 500, b* / 200 (at
 * most 1.5), and the cube triples that. */
static void lab_and_back(void **state) {
  (void)state;
  gen g = gen_new(3);
  worst w = {0};
  for (int i = 0; i < N; ++i) {
    const ef_xyz white = random_white(&g);
    ef_xyz a = random_xyz(&g);
    if (i % 4 == 0) a.X *= 1e-3; /* the straight branch, and below zero */
    if (i % 8 == 0) a.Z *= -1e-3;
    const ef_xyz b = ef_lab_to_xyz(ef_xyz_to_lab(a, white), white);
    note_error(&w, b.X, a.X, white.X);
    note_error(&w, b.Y, a.Y, white.Y);
    note_error(&w, b.Z, a.Z, white.Z);
  }
  check_worst(&w, 40, "Lab");
}

/* u' and v' come back with the roundings of the white's (at most 0.63), and
 * the quotient by v' carries them to X / Y and Z / Y. */
static void luv_and_back(void **state) {
  (void)state;
  gen g = gen_new(4);
  worst w = {0};
  for (int i = 0; i < N; ++i) {
    const ef_xyz white = random_white(&g);
    const ef_xyz a = random_xyz(&g);
    const ef_xyz b = ef_luv_to_xyz(ef_xyz_to_luv(a, white), white);
    const double v_prime = ef_xyz_to_uv(a).v_prime;
    note_error(&w, b.X, a.X, (a.X + a.Y) / v_prime);
    note_error(&w, b.Y, a.Y, 4 * a.Y + 4);
    note_error(&w, b.Z, a.Z, (a.Z + a.Y) / v_prime);
  }
  check_worst(&w, 16, "Luv");
}

/* An angle of up to 360 degrees holds eps * 360 / 57.3 radians, half of it for
 * each of the roundings. */
static void lch_and_back(void **state) {
  (void)state;
  gen g = gen_new(5);
  worst w = {0};
  for (int i = 0; i < N; ++i) {
    const ef_lab a = {gen_between(&g, 0, 100), gen_between(&g, -120, 120),
                      gen_between(&g, -120, 120)};
    const ef_lch lch = ef_lab_to_lch(a);
    assert_true(lch.h_deg >= 0 && lch.h_deg < 360 && lch.C_star >= 0);
    const ef_lab b = ef_lch_to_lab(lch);
    assert_same_bits(&b.L_star, &a.L_star, 1);
    note_error(&w, b.a_star, a.a_star, lch.C_star);
    note_error(&w, b.b_star, a.b_star, lch.C_star);
  }
  check_worst(&w, 8, "LCh");
}

/* M comes from 1 - l, with the roundings of 1. */
static void macleod_boynton_and_back(void **state) {
  (void)state;
  gen g = gen_new(6);
  worst w = {0};
  const ef_mb_scale scale = {0.68990272, 0.34832189, 0.0371597};
  for (int i = 0; i < N; ++i) {
    const ef_lms a = {gen_between(&g, 0, 100), gen_between(&g, 0, 100),
                      gen_between(&g, 0, 100)};
    const ef_mb mb = ef_lms_to_mb(a, scale);
    const ef_lms b = ef_mb_to_lms(mb, scale);
    note_error(&w, b.cone_l, a.cone_l, a.cone_l);
    note_error(&w, b.cone_m, a.cone_m, mb.luminance / scale.k_m);
    note_error(&w, b.cone_s, a.cone_s, a.cone_s);
    assert_true(mb.mb_l >= 0 && mb.mb_l <= 1);
  }
  check_worst(&w, 4, "MacLeod-Boynton");
}

/* ---- Slopes and batches ------------------------------------------------ */

/* Central differences with steps of 1e-5 of the value: the third derivative
 * leaves 4e-11 of the slope, the roundings of f 1e-10. Colours whose step would
 * cross from one branch to the other are passed over. */
static void lab_slopes_are_central_differences(void **state) {
  (void)state;
  gen g = gen_new(7);
  double largest = 0;
  for (int i = 0; i < 20000; ++i) {
    const ef_xyz white = random_white(&g);
    double at[3] = {gen_between(&g, 0.1, 100), gen_between(&g, 0.1, 100),
                    gen_between(&g, 0.1, 100)};
    double jacobian[9];
    ef_lab_jacobian((ef_xyz){at[0], at[1], at[2]}, white, jacobian);
    const double white_of[3] = {white.X, white.Y, white.Z};
    for (int c = 0; c < 3; ++c) {
      const double ratio = at[c] / white_of[c] / (216.0 / 24389);
      if (fabs(ratio - 1) < 1e-4) continue;
      const double kept = at[c], step = 1e-5 * kept;
      at[c] = kept + step;
      const ef_lab high = ef_xyz_to_lab((ef_xyz){at[0], at[1], at[2]}, white);
      at[c] = kept - step;
      const ef_lab low = ef_xyz_to_lab((ef_xyz){at[0], at[1], at[2]}, white);
      at[c] = kept;
      const double slope[3] = {(high.L_star - low.L_star) / (2 * step),
                               (high.a_star - low.a_star) / (2 * step),
                               (high.b_star - low.b_star) / (2 * step)};
      for (int r = 0; r < 3; ++r) {
        /* 1e-10 of the largest f of any channel over the step taken. */
        const double rounding = 500 * 4 * eps / step;
        const double off = fabs(slope[r] - jacobian[3 * r + c]);
        const double allowed = 1e-10 * fabs(jacobian[3 * r + c]) + rounding;
        if (!(off / allowed <= largest)) largest = off / allowed;
      }
    }
  }
  printf("# Lab slopes: %.2f of what is allowed\n", largest);
  assert_true(largest <= 1);
}

static void batches_are_one_by_one(void **state) {
  (void)state;
  gen g = gen_new(8);
  enum { MANY = 1000 };
  double xyz[3 * MANY], lab[3 * MANY];
  const ef_xyz white = random_white(&g);
  gen_fill(&g, 3 * MANY, -1, 110, xyz);
  ef_xyz_to_lab_batch(MANY, xyz, white, lab);
  for (size_t i = 0; i < MANY; ++i) {
    const ef_lab one = ef_xyz_to_lab(
        (ef_xyz){xyz[3 * i], xyz[3 * i + 1], xyz[3 * i + 2]}, white);
    assert_near(lab[3 * i], one.L_star, 1e-12);
    assert_near(lab[3 * i + 1], one.a_star, 1e-12);
    assert_near(lab[3 * i + 2], one.b_star, 1e-12);
    double alone[3];
    ef_xyz_to_lab_batch(1, xyz + 3 * i, white, alone);
    assert_same_bits(lab + 3 * i, alone, 3);
  }
  ef_cam_model model;
  const ef_cam_viewing viewing = ef_cam_viewing_default(white);
  assert_int_equal(ef_cam_model_set(EF_CAM_16, &viewing, &model, NULL), EF_OK);
  const ef_ucs_shape shape = ef_ucs_shape_default();
  double ucs[3 * MANY];
  ef_xyz_to_ucs_batch(MANY, xyz, &model, shape, ucs);
  for (size_t i = 0; i < MANY; ++i) {
    const ef_xyz v = {xyz[3 * i], xyz[3 * i + 1], xyz[3 * i + 2]};
    const ef_ucs one = ef_cam_to_ucs(ef_xyz_to_cam(v, &model), shape);
    const double expected[3] = {one.J_prime, one.a_prime, one.b_prime};
    for (int c = 0; c < 3; ++c) {
      if (isnan(expected[c])) assert_true(isnan(ucs[3 * i + (size_t)c]));
      else assert_near(ucs[3 * i + (size_t)c], expected[c], 1e-10);
    }
    double alone[3];
    ef_xyz_to_ucs_batch(1, xyz + 3 * i, &model, shape, alone);
    assert_same_bits(ucs + 3 * i, alone, 3);
  }
}

/* ---- Adaptation -------------------------------------------------------- */

/* The cone matrices have condition numbers of about 3, the whites' ratios up
 * to 4. */
static void adaptation_of_whites_and_inverse(void **state) {
  (void)state;
  gen g = gen_new(9);
  worst to_white = {0}, identity = {0};
  for (int i = 0; i < 20000; ++i) {
    const ef_adaptation method = i % 2 ? EF_ADAPT_BRADFORD : EF_ADAPT_CAT16;
    const ef_xyz from = random_white(&g), to = random_white(&g);
    double there[9], back[9], both[9];
    assert_int_equal(ef_adaptation_matrix(method, from, to, there, NULL),
                     EF_OK);
    assert_int_equal(ef_adaptation_matrix(method, to, from, back, NULL), EF_OK);
    const ef_xyz adapted = ef_xyz_transform(there, from);
    note_error(&to_white, adapted.X, to.X, 100);
    note_error(&to_white, adapted.Y, to.Y, 100);
    note_error(&to_white, adapted.Z, to.Z, 100);
    ef__mat3_multiply(there, back, both);
    for (int k = 0; k < 9; ++k) note_error(&identity, both[k], k % 4 == 0, 1);
  }
  check_worst(&to_white, 16, "white to white");
  check_worst(&identity, 32, "there and back");
}

/* ---- Weights ----------------------------------------------------------- */

/* Grassmann: the values of a sum are the sums of the values, and those of a
 * multiple the multiples; 71 products in a row are off by 36 roundings and the
 * samples by some more, at worst. */
static void weights_are_additive(void **state) {
  (void)state;
  gen g = gen_new(10);
  worst w = {0};
  const char *const *names;
  const size_t n_names = ef_observer_names(&names);
  enum { MANY = 71 };
  for (int i = 0; i < 400; ++i) {
    ef_observer *const observer =
        ef_observer_new(names[gen_below(&g, n_names)], NULL);
    ef_illuminant *const light = ef_illuminant_new("FL11", NULL);
    const bool surface = i % 2 == 0;
    const ef_viewing viewing = ef_viewing_default(surface ? light : NULL);
    const ef_grid grid = {.count = MANY,
                          .start_nm = gen_between(&g, 360, 400),
                          .step_nm = gen_between(&g, 1, 7)};
    const ef_channel_role role = i % 3 == 0 ? EF_CONES : EF_TRISTIMULUS;
    ef_weights *const weights =
        ef_observer_weights(observer, role, &grid, &viewing, NULL, NULL);
    assert_non_null(weights);
    double sample[3 * MANY], out[9];
    gen_smooth(&g, MANY, sample);
    gen_smooth(&g, MANY, sample + MANY);
    const double a = gen_between(&g, 0, 3), b = gen_between(&g, 0, 3);
    for (size_t k = 0; k < MANY; ++k) {
      sample[2 * MANY + k] = a * sample[k] + b * sample[MANY + k];
    }
    assert_int_equal(ef_weights_apply(weights, 3, sample, 1, out, NULL), EF_OK);
    for (size_t c = 0; c < 3; ++c) {
      double size = 0;
      for (size_t k = 0; k < MANY; ++k) {
        size += fabs(ef_weights_matrix(weights)[c * MANY + k]) *
                sample[2 * MANY + k];
      }
      note_error(&w, out[6 + c], a * out[c] + b * out[3 + c], size);
    }
    ef_weights_free(weights);
    ef_illuminant_free(light);
    ef_observer_free(observer);
  }
  check_worst(&w, 40, "additivity");
}

/* ---- Temperature ------------------------------------------------------- */

/* The locus moves by 1.3e-4 a mired or more, so the roundings of x and y, with
 * those of u and v some 1e-15, are worth 1e-11 mired: one part in 1e12 at 1e5 K
 * (10 mired). */
static void temperature_of_radiators(void **state) {
  (void)state;
  gen g = gen_new(11);
  double largest = 0, farthest = 0;
  for (int i = 0; i < 5000; ++i) {
    const double temperature_k = pow(10, gen_between(&g, 3, 5));
    const ef_cct cct = ef_xy_to_cct(ef_planck_xy(temperature_k));
    assert_true(cct.defined);
    largest = fmax(largest, fabs(cct.cct_k / temperature_k - 1));
    farthest = fmax(farthest, fabs(cct.duv));
  }
  printf("# radiators: temperature to %.1e, duv to %.1e\n", largest, farthest);
  assert_true(largest <= 2e-12 && farthest <= 5e-15);
}

static double squared_distance(ef_xy xy, double mired) {
  const ef_uv a = ef_xy_to_uv(xy), b = ef_xy_to_uv(ef_planck_xy(1e6 / mired));
  const double du = a.u_prime - b.u_prime;
  const double dv = (a.v_prime - b.v_prime) / 1.5;
  return du * du + dv * dv;
}

/* The nearest of many points of the locus, then narrowed by thirds. */
static double search_mired(ef_xy xy, const double *mired, const double *square,
                           size_t n) {
  size_t best = 1;
  for (size_t i = 1; i + 1 < n; ++i) {
    if (square[i] < square[best]) best = i;
  }
  double low = mired[best - 1], high = mired[best + 1];
  for (int i = 0; i < 60; ++i) {
    const double a = low + (high - low) / 3, b = high - (high - low) / 3;
    if (squared_distance(xy, a) < squared_distance(xy, b)) high = b;
    else low = a;
  }
  return 0.5 * (low + high);
}

/* Against a search that knows nothing of derivatives or starting values. It
 * finds a minimum to the root of the rounding only: 1e-16 of a squared
 * distance of at most 0.0025 is 5e-10 in u, v or 1e-5 mired. */
static void temperature_is_the_nearest(void **state) {
  (void)state;
  gen g = gen_new(12);
  enum { DENSE = 400 };
  double mired[DENSE], square[DENSE];
  double largest = 0;
  size_t n_defined = 0;
  for (int i = 0; i < 150; ++i) {
    const double t = pow(10, gen_between(&g, 3.02, 4.9));
    const ef_uv foot = ef_xy_to_uv(ef_planck_xy(t));
    const ef_xy xy = ef_uv_to_xy(
        (ef_uv){foot.u_prime + gen_between(&g, -0.04, 0.04),
                foot.v_prime + gen_between(&g, -0.06, 0.06)});
    for (size_t k = 0; k < DENSE; ++k) {
      const double share = (double)k / (DENSE - 1);
      mired[k] = 1 + 1999 * share * share;
      square[k] = squared_distance(xy, mired[k]);
    }
    const double nearest = search_mired(xy, mired, square, DENSE);
    const double distance = sqrt(squared_distance(xy, nearest));
    const bool inside = nearest > 10.01 && nearest < 999.9;
    const ef_cct cct = ef_xy_to_cct(xy);
    if (inside) assert_int_equal(cct.defined, distance <= 0.05);
    if (!cct.defined) continue;
    ++n_defined;
    assert_near(fabs(cct.duv), distance, 1e-12);
    largest = fmax(largest, fabs(1e6 / cct.cct_k - nearest));
  }
  printf("# %zu colours off the locus: within %.1e mired of a search\n",
         n_defined, largest);
  assert_true(n_defined > 100);
  assert_true(largest < 5e-5);
}

/* Signed: above the locus (larger v) positive. A step across the locus leaves
 * the temperature where it is. */
static void duv_is_the_step_across(void **state) {
  (void)state;
  gen g = gen_new(13);
  double largest = 0;
  for (int i = 0; i < 5000; ++i) {
    const double t = pow(10, gen_between(&g, 3.001, 4.99));
    const ef_uv hot = ef_xy_to_uv(ef_planck_xy(t * 1.0001));
    const ef_uv cold = ef_xy_to_uv(ef_planck_xy(t / 1.0001));
    const ef_uv foot = ef_xy_to_uv(ef_planck_xy(t));
    const double du = cold.u_prime - hot.u_prime;
    const double dv = (cold.v_prime - hot.v_prime) / 1.5;
    const double duv = gen_between(&g, -0.0499, 0.0499);
    const double share = duv / hypot(du, dv);
    const ef_cct cct = ef_xy_to_cct(ef_uv_to_xy((ef_uv){
        foot.u_prime - share * dv, foot.v_prime + 1.5 * share * du}));
    assert_true(cct.defined);
    assert_near(cct.duv, duv, 1e-13);
    largest = fmax(largest, fabs(cct.cct_k / t - 1));
  }
  /* The direction across is that of a chord over 2e-4 of the temperature. */
  printf("# steps across the locus: temperature to %.1e\n", largest);
  assert_true(largest < 1e-7);
}

/* ---- Dominant wavelength ----------------------------------------------- */

static ef_xy random_interior_white(gen *g) {
  return (ef_xy){gen_between(g, 0.29, 0.45), gen_between(g, 0.3, 0.41)};
}

/* From 430 to 660 nm neighbouring points of all loci are 1e-4 apart or more,
 * so that roundings of x, y are worth 1e-11 nm; towards the ends the tables
 * have too few digits to tell wavelengths apart. */
static void dominant_of_the_locus(void **state) {
  (void)state;
  gen g = gen_new(14);
  const char *const *names;
  const size_t n_names = ef_observer_names(&names);
  double off_nm = 0, off_purity = 0;
  for (size_t k = 0; k < n_names; ++k) {
    ef_observer *const observer = ef_observer_new(names[k], NULL);
    for (int i = 0; i < 1000; ++i) {
      const double wavelength_nm[1] = {gen_between(&g, 430, 660)};
      ef_xy xy;
      ef_dominant d;
      assert_int_equal(ef_locus_xy(observer, 1, wavelength_nm, &xy, NULL),
                       EF_OK);
      assert_int_equal(ef_xy_to_dominant(xy, random_interior_white(&g),
                                         observer, &d, NULL),
                       EF_OK);
      assert_false(d.complementary);
      off_nm = fmax(off_nm, fabs(d.dominant_nm - wavelength_nm[0]));
      off_purity = fmax(off_purity, fabs(d.purity - 1));
    }
    ef_observer_free(observer);
  }
  printf("# locus: wavelength to %.1e nm, purity to %.1e\n", off_nm,
         off_purity);
  assert_true(off_nm < 1e-9 && off_purity < 1e-13);
}

/* A batch is its single colours, also where there is no answer. */
static void dominants_at_once(void **state) {
  (void)state;
  enum { N_AT_ONCE = 700 };
  gen g = gen_new(16);
  ef_observer *const observer = ef_observer_new("cie-2015-10", NULL);
  static ef_xy xy[N_AT_ONCE];
  static ef_dominant many[N_AT_ONCE];
  for (int round = 0; round < 8; ++round) {
    const ef_xy white = round == 7 ? (ef_xy){0.8, 0.5}
                                   : random_interior_white(&g);
    for (size_t i = 0; i < N_AT_ONCE; ++i)
      xy[i] = (ef_xy){gen_between(&g, -0.1, 0.9), gen_between(&g, -0.1, 0.9)};
    xy[3] = white;
    xy[5].y = (double)NAN;
    assert_int_equal(ef_xy_to_dominant_batch(N_AT_ONCE, xy, white, observer, 2,
                                             many, NULL),
                     EF_OK);
    for (size_t i = 0; i < N_AT_ONCE; ++i) {
      ef_dominant one = {(double)NAN, false, (double)NAN};
      ef_xy_to_dominant(xy[i], white, observer, &one, NULL);
      assert_memory_equal(&one.dominant_nm, &many[i].dominant_nm,
                          sizeof one.dominant_nm);
      assert_memory_equal(&one.purity, &many[i].purity, sizeof one.purity);
      assert_int_equal(one.complementary, many[i].complementary);
    }
  }
  ef_observer_free(observer);
}

/* Mixed with white, a colour keeps its dominant wavelength (complementary or
 * not) and its purity is multiplied. */
static void purity_scales(void **state) {
  (void)state;
  gen g = gen_new(15);
  ef_observer *const observer = ef_observer_new("cie-1931", NULL);
  double off_nm = 0, off_purity = 0;
  size_t n_purple = 0;
  for (int i = 0; i < 5000; ++i) {
    const ef_xy white = random_interior_white(&g);
    const ef_xy xy = {gen_between(&g, 0.2, 0.5), gen_between(&g, 0.2, 0.5)};
    const double share = gen_between(&g, 0.01, 1);
    const ef_xy mixed = {white.x + share * (xy.x - white.x),
                         white.y + share * (xy.y - white.y)};
    ef_dominant a, b;
    assert_int_equal(ef_xy_to_dominant(xy, white, observer, &a, NULL), EF_OK);
    assert_int_equal(ef_xy_to_dominant(mixed, white, observer, &b, NULL),
                     EF_OK);
    if (hypot(xy.x - white.x, xy.y - white.y) < 0.01) continue;
    n_purple += a.complementary;
    off_purity = fmax(off_purity, fabs(b.purity - share * a.purity));
    if (a.dominant_nm < 430 || a.dominant_nm > 660) continue;
    assert_int_equal(a.complementary, b.complementary);
    off_nm = fmax(off_nm, fabs(a.dominant_nm - b.dominant_nm));
  }
  printf("# mixed with white: wavelength to %.1e nm, purity to %.1e; %zu "
         "purples\n",
         off_nm, off_purity, n_purple);
  assert_true(n_purple > 500);
  /* The direction of 1e-4 in x, y holds 1e-12 of itself. */
  assert_true(off_nm < 1e-9 && off_purity < 1e-13);
  ef_observer_free(observer);
}

/* No light is purer than the boundary, but for the jitter of the last digits
 * at the ends of the tables and chords between 1 nm points. */
static void lights_are_inside(void **state) {
  (void)state;
  gen g = gen_new(16);
  const char *const *names;
  const size_t n_names = ef_observer_names(&names);
  for (size_t k = 0; k < n_names; ++k) {
    ef_observer *const observer = ef_observer_new(names[k], NULL);
    double purest = 0;
    for (int i = 0; i < 3000; ++i) {
      const double ends_nm[2] = {gen_between(&g, 390, 780),
                                 gen_between(&g, 390, 780)};
      const double share = gen_unit(&g);
      ef_xy end[2];
      ef_dominant d;
      assert_int_equal(ef_locus_xy(observer, 2, ends_nm, end, NULL), EF_OK);
      const ef_xy xy = {end[0].x + share * (end[1].x - end[0].x),
                        end[0].y + share * (end[1].y - end[0].y)};
      assert_int_equal(ef_xy_to_dominant(xy, (ef_xy){1.0 / 3, 1.0 / 3},
                                         observer, &d, NULL),
                       EF_OK);
      purest = fmax(purest, d.purity);
    }
    printf("# %s: purest mixture 1 + %.1e\n", names[k], purest - 1);
    assert_true(purest < 1 + 5e-4);
    ef_observer_free(observer);
  }
}

/* ---- Colour rendering -------------------------------------------------- */

/* A reference renders like itself, whatever its power: a black body but for
 * the difference between 5 nm sums and the 1 nm locus, which shifts its
 * temperature by some 1e-6; a daylight but for its formula, by which the
 * chromaticity for T has a temperature a few K from T. */
static void references_render_perfectly(void **state) {
  (void)state;
  gen g = gen_new(17);
  const ef_grid grid = {.count = 95, .start_nm = 360, .step_nm = 5};
  double least[2] = {100, 100};
  for (int i = 0; i < 200; ++i) {
    const bool daylight = i % 2 == 0;
    char name[40];
    snprintf(name, sizeof name, "%s:%.3f", daylight ? "daylight" : "planck",
             daylight ? gen_between(&g, 5050, 24000)
                      : gen_between(&g, 1500, 4990));
    ef_illuminant *const light = ef_illuminant_new(name, NULL);
    double power[95];
    assert_int_equal(ef_illuminant_sample(light, &grid, power, NULL), EF_OK);
    const double level = pow(10, gen_between(&g, -8, 8));
    for (size_t k = 0; k < 95; ++k) power[k] *= level;
    ef_rendering r;
    assert_int_equal(ef_rendering_index(&grid, power, &r, NULL), EF_OK);
    assert_int_equal(r.reference_is_daylight, daylight);
    for (size_t k = 0; k < 14; ++k) {
      assert_true(r.R[k] <= 100);
      least[daylight] = fmin(least[daylight], r.R[k]);
    }
    ef_illuminant_free(light);
  }
  printf("# least special index: black bodies %.5f, daylights %.5f\n", least[0],
         least[1]);
  assert_true(least[0] > 99.999 && least[1] > 99.9);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(xyy_and_back),
      cmocka_unit_test(uv_and_back),
      cmocka_unit_test(lab_and_back),
      cmocka_unit_test(luv_and_back),
      cmocka_unit_test(lch_and_back),
      cmocka_unit_test(macleod_boynton_and_back),
      cmocka_unit_test(lab_slopes_are_central_differences),
      cmocka_unit_test(batches_are_one_by_one),
      cmocka_unit_test(adaptation_of_whites_and_inverse),
      cmocka_unit_test(weights_are_additive),
      cmocka_unit_test(temperature_of_radiators),
      cmocka_unit_test(temperature_is_the_nearest),
      cmocka_unit_test(duv_is_the_step_across),
      cmocka_unit_test(dominant_of_the_locus),
      cmocka_unit_test(dominants_at_once),
      cmocka_unit_test(purity_scales),
      cmocka_unit_test(lights_are_inside),
      cmocka_unit_test(references_render_perfectly),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
