/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The kernels of every target this processor can run: their error against
 * libm (long double for the elementary functions), the same bits on every
 * target and in every place of a batch. */
#include "kernel/kernels.h"

#include <float.h>
#include <stdlib.h>

#include "gen.h"
#include "near.h"
#include "plain_formulas.h"

enum { N = 20000 };

static double x_of[N], y_of[N], out[N], second[N];

/* Largest error in units in the last place of the exact value. */
typedef struct ulps {
  double largest, at;
} ulps;

static void add(ulps *u, double actual, long double exact, double at) {
  int exponent;
  (void)frexp((double)exact, &exponent);
  const long double unit = ldexpl(1, exponent - DBL_MANT_DIG);
  const double off = (double)(fabsl((long double)actual - exact) / unit);
  if (off <= u->largest) return;
  u->largest = off; /* NaN too */
  u->at = at;
}

static void within(const ulps *u, double allowed, const char *what) {
  printf("# %s: %.3f ulp at %.17g\n", what, u->largest, u->at);
  if (!(u->largest <= allowed)) {
    fail_msg("%s is off by %.3f ulp at %.17g, allowed %.2f", what, u->largest,
             u->at, allowed);
  }
}

/* 2^u with u even between the limits. */
static double draw_scale(gen *g, double low, double high) {
  return exp2(gen_between(g, low, high));
}

static void cube_roots(void **state) {
  (void)state;
  gen g = gen_new(1);
  for (size_t i = 0; i < N; ++i) x_of[i] = draw_scale(&g, -60, 60);
  /* One octave thrice is a period; the ends of the double range, and 0. */
  for (size_t i = 0; i < 6000; ++i) x_of[i] = exp2((double)i / 2000);
  const double edge[] = {1, 8, 27, 0.008856451679035631, DBL_MIN, DBL_MAX};
  memcpy(x_of, edge, sizeof edge);
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->cube_root(N, x_of, out);
    ulps u = {0};
    for (size_t i = 0; i < N; ++i) add(&u, out[i], cbrtl((long double)x_of[i]), x_of[i]);
    within(&u, 1, "cube root");
    const double zero = 0;
    k->cube_root(1, &zero, out);
    assert_true(out[0] == 0);
  }
}

static void near_cube_roots(void **state) {
  (void)state;
  gen g = gen_new(9);
  for (size_t i = 0; i < N; ++i)
    x_of[i] = i % 2 ? draw_scale(&g, -100, 100) : draw_scale(&g, -7, 1);
  for (size_t i = 0; i < 6000; ++i) x_of[i] = exp2((double)i / 2000);
  const double edge[] = {1, 8, 27, 0.008856451679035631, 0x1p-100, 0x1p100};
  memcpy(x_of, edge, sizeof edge);
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->near_cube_root(N, x_of, out);
    ulps u = {0};
    for (size_t i = 0; i < N; ++i) add(&u, out[i], cbrtl((long double)x_of[i]), x_of[i]);
    within(&u, 2, "near cube root");
    assert_true(out[0] == 1);
  }
}

static void exponentials(void **state) {
  (void)state;
  gen g = gen_new(2);
  for (size_t i = 0; i < N; ++i)
    x_of[i] = gen_between(&g, i % 2 ? -708 : -2, i % 2 ? 709 : 2);
  const double edge[] = {0, -0.0, 1, -1, 1e-300, 0.34657359027997264, -708, 709};
  memcpy(x_of, edge, sizeof edge);
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->exp(N, x_of, out);
    ulps u = {0};
    for (size_t i = 0; i < N; ++i) add(&u, out[i], expl((long double)x_of[i]), x_of[i]);
    within(&u, 1, "exp");
    const double far[] = {-708.5, -1e6, -1e300};
    k->exp(3, far, out);
    assert_true(out[0] == 0 && out[1] == 0 && out[2] == 0);
  }
}

static void logarithms(void **state) {
  (void)state;
  gen g = gen_new(3);
  for (size_t i = 0; i < N; ++i) {
    x_of[i] = i % 2 ? draw_scale(&g, -1021, 1023) : gen_between(&g, 0.5, 2);
  }
  const double edge[] = {1, 2, 0.5, 1 + DBL_EPSILON, 1 - DBL_EPSILON / 2,
                         DBL_MIN, DBL_MAX, 0.70710678118654746,
                         0.70710678118654757, 1.4142135623730951};
  memcpy(x_of, edge, sizeof edge);
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->log(N, x_of, out);
    ulps u = {0};
    for (size_t i = 0; i < N; ++i) {
      if (x_of[i] == 1) assert_true(out[i] == 0);
      else add(&u, out[i], logl((long double)x_of[i]), x_of[i]);
    }
    within(&u, 1, "log");
  }
}

/* The error of a power is that of its logarithm times the exponent: about
 * 1 ulp for each unit of y ln x, and what exp adds. */
static void powers(void **state) {
  (void)state;
  gen g = gen_new(4);
  const double exponent[] = {0.42, 0.9, 0.69 * 1.9272, 1 / 2.4, 2.4};
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    for (size_t j = 0; j < sizeof exponent / sizeof *exponent; ++j) {
      const double y = exponent[j];
      for (size_t i = 0; i < N; ++i) x_of[i] = draw_scale(&g, -30, 14);
      const double edge[] = {1, 1e-100, 1e100, 1 + DBL_EPSILON};
      memcpy(x_of, edge, sizeof edge);
      k->power(N, x_of, y, out);
      ulps u = {0};
      for (size_t i = 0; i < N; ++i) {
        const long double exact = powl((long double)x_of[i], (long double)y);
        const double off = (double)fabsl((long double)out[i] / exact - 1) / DBL_EPSILON /
                           (1 + fabs(y * log(x_of[i])));
        if (!(off <= u.largest)) u = (ulps){off, x_of[i]};
      }
      within(&u, 1, "power, over 1 + |y ln x|");
    }
    const double zero = 0;
    k->power(1, &zero, 0.42, out);
    assert_true(out[0] == 0);
  }
}

/* Beside full scale, which is 1. */
static void powers_as_shares(void **state) {
  (void)state;
  gen g = gen_new(10);
  const double exponent[] = {0.3, 1, 1.8, 2.2, 2.4, 2.6, 4};
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    double largest = 0;
    for (size_t j = 0; j < sizeof exponent / sizeof *exponent; ++j) {
      const double y = exponent[j];
      for (size_t i = 0; i < N; ++i)
        x_of[i] = i % 2 ? gen_unit(&g) : draw_scale(&g, -1000, 0);
      const double edge[] = {1, 1 - DBL_EPSILON / 2, 0.5, DBL_MIN, 0,
                             0.70710678118654746, 0.70710678118654757};
      memcpy(x_of, edge, sizeof edge);
      k->share_power(N, x_of, y, out);
      assert_true(out[0] == 1);
      for (size_t i = 0; i < N; ++i) {
        const long double exact = powl((long double)x_of[i], (long double)y);
        const double off = (double)fabsl((long double)out[i] - exact);
        if (!(off <= largest)) largest = off;
      }
    }
    printf("# power as a share: %.3g\n", largest);
    assert_true(largest <= 4 * DBL_EPSILON);
  }
}

static void sines_and_cosines(void **state) {
  (void)state;
  gen g = gen_new(5);
  for (size_t i = 0; i < N; ++i) {
    const double range = i % 3 == 0 ? 1 : i % 3 == 1 ? 10 : 1e5;
    x_of[i] = gen_between(&g, -range, range);
  }
  /* Multiples of pi / 4 as near as doubles come, and small ones. */
  for (int i = 0; i < 4000; ++i)
    x_of[i] = (i - 2000) * 0.78539816339744831;
  x_of[4000] = 1e-300;
  x_of[4001] = -1e-9;
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->sin_cos(N, x_of, out, second);
    ulps u = {0}, v = {0};
    for (size_t i = 0; i < N; ++i) {
      add(&u, out[i], sinl((long double)x_of[i]), x_of[i]);
      add(&v, second[i], cosl((long double)x_of[i]), x_of[i]);
    }
    within(&u, 2, "sin");
    within(&v, 2, "cos");
  }
}

static void angles(void **state) {
  (void)state;
  gen g = gen_new(6);
  for (size_t i = 0; i < N; ++i) {
    const double h = gen_between(&g, -3.2, 3.2);
    const double r = draw_scale(&g, -40, 40);
    x_of[i] = r * cos(h);
    y_of[i] = r * sin(h);
  }
  const double edge[][2] = {{1, 0}, {0, 1}, {-1, 0}, {0, -1}, {1, 1}, {-1, 1},
                            {1, -1}, {-1, -1}, {1, 1e-300}, {1e-300, 1},
                            {-1, 1e-17}, {-1, -1e-17}, {1, 0.41421356237309503},
                            {1, 0.41421356237309509}};
  const size_t n_edges = sizeof edge / sizeof *edge;
  for (size_t i = 0; i < n_edges; ++i) {
    x_of[i] = edge[i][0];
    y_of[i] = edge[i][1];
  }
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->atan2(N, y_of, x_of, out);
    ulps u = {0};
    for (size_t i = 0; i < N; ++i) {
      const long double exact = atan2l((long double)y_of[i], (long double)x_of[i]);
      if (exact == 0) assert_true(out[i] == 0);
      else add(&u, out[i], exact, y_of[i] / x_of[i]);
    }
    within(&u, 2, "atan2");
    const double zero = 0;
    k->atan2(1, &zero, &zero, out);
    assert_true(out[0] == 0);
  }
}

static void nothing_becomes_a_number(void **state) {
  (void)state;
  double nan[3] = {NOT_A_NUMBER, NOT_A_NUMBER, NOT_A_NUMBER};
  const double one[3] = {1, 1, 1};
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    k->cube_root(1, nan, out);
    k->near_cube_root(1, nan, out + 8);
    k->share_power(1, nan, 2.2, out + 9);
    k->exp(1, nan, out + 1);
    k->log(1, nan, out + 2);
    k->power(1, nan, 0.42, out + 3);
    k->sin_cos(1, nan, out + 4, out + 5);
    k->atan2(1, nan, one, out + 6);
    k->atan2(1, one, nan, out + 7);
    for (size_t i = 0; i < 10; ++i) assert_true(isnan(out[i]));
  }
}

/* ---- Differences ------------------------------------------------------- */

static double reference[3 * N], sample[3 * N];
static float narrow_rgb[3 * N];

/* Pairs of every kind: anywhere, close, neutral on either or both sides, of
 * the same and of opposite hue, around the boundaries of the cases. */
static void draw_pairs(void) {
  gen g = gen_new(7);
  for (size_t i = 0; i < N; ++i) {
    double *const r = reference + 3 * i, *const s = sample + 3 * i;
    r[0] = gen_between(&g, 0, 100);
    s[0] = gen_between(&g, 0, 100);
    for (int c = 1; c < 3; ++c) {
      r[c] = gen_between(&g, -110, 110);
      s[c] = gen_between(&g, -110, 110);
    }
    const double apart = draw_scale(&g, -12, 4);
    switch (i % 10) {
    case 1:
    case 2:
    case 3:
      for (int c = 0; c < 3; ++c) s[c] = r[c] + gen_between(&g, -apart, apart);
      break;
    case 4: r[1] = r[2] = 0; break;
    case 5: s[1] = s[2] = 0; break;
    case 6: r[1] = r[2] = s[1] = s[2] = 0; break;
    case 7:
      s[1] = 2 * r[1];
      s[2] = 2 * r[2];
      break;
    case 8: /* axes, where opposite hues are opposite in rounding too */
      r[1 + i / 10 % 2] = s[1 + i / 10 % 2] = 0;
      break;
    case 9: memcpy(s, r, 3 * sizeof *s); break;
    default: break;
    }
  }
}

typedef double plain_formula(const double r[3], const double s[3]);

static void check_formula(void (*kernel)(size_t n, const double *r,
                                         const double *s, const double *factor,
                                         double *difference),
                          const double *factor, plain_formula *plain,
                          const char *what) {
  kernel(N, reference, sample, factor, out);
  deviation d = {0};
  for (size_t i = 0; i < N; ++i) {
    char where[96];
    const double *const r = reference + 3 * i, *const s = sample + 3 * i;
    snprintf(where, sizeof where, "%g %g %g and %g %g %g", r[0], r[1], r[2],
             s[0], s[1], s[2]);
    deviation_add(&d, out[i], plain(r, s), where);
  }
  deviation_print(&d, what);
  assert_true(d.largest <= 1e-10);
}

static void differences_are_the_plain_formulas(void **state) {
  (void)state;
  draw_pairs();
  const double ones[] = {1, 1, 1}, cie94[] = {1, 1, 1, 0.045, 0.015};
  const double cmc[] = {2, 1};
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    check_formula(k->ciede2000, ones, plain_ciede2000, "CIEDE2000");
    check_formula(k->cie94, cie94, plain_cie94, "CIE94");
    check_formula(k->cmc, cmc, plain_cmc, "CMC");
    check_formula(k->distance, ones, plain_cielab, "CIELAB");
  }
}

/* What a lane holds does not reach its neighbours, and a short vector takes
 * the path of a whole one: each pair alone gives the bits it has in the batch,
 * on every target. */
static void check_places(void (*const kernel[])(size_t n, const double *r,
                                                const double *s,
                                                const double *factor,
                                                double *difference),
                         size_t n_targets, const double *factor) {
  kernel[0](N, reference, sample, factor, out);
  for (size_t t = 0; t < n_targets; ++t) {
    kernel[t](N, reference, sample, factor, second);
    assert_same_bits(second, out, N);
    for (size_t i = 0; i < 500; ++i) {
      kernel[t](1, reference + 3 * i, sample + 3 * i, factor, second);
      assert_same_bits(second, out + i, 1);
    }
    for (size_t n = 2; n < 150; ++n) {
      kernel[t](n, reference + 3 * n, sample + 3 * n, factor, second);
      assert_same_bits(second, out + n, n);
    }
  }
}

static void every_target_and_place_gives_the_same_bits(void **state) {
  (void)state;
  enum { MOST = 4 };
  void (*kernel[4][MOST])(size_t n, const double *r, const double *s,
                          const double *factor, double *difference);
  draw_pairs();
  size_t n = 0;
  for (const ef__kernel_table *k; (k = ef__kernels_at(n)) != NULL; ++n) {
    assert_true(n < MOST);
    kernel[0][n] = k->ciede2000;
    kernel[1][n] = k->cie94;
    kernel[2][n] = k->cmc;
    kernel[3][n] = k->distance;
  }
  printf("# %zu targets\n", n);
  const double factor[4][5] = {
      {1, 2, 0.5}, {1, 1, 1, 0.048, 0.014}, {2, 1}, {0.77, 1}};
  for (size_t f = 0; f < 4; ++f) check_places(kernel[f], n, factor[f]);
}

/* ---- Colours ----------------------------------------------------------- */

enum { COLOURS = 300 };

/* The conversions of k, one after the other, of n colours from place `at`. */
static void convert(const ef__kernel_table *k, size_t at, size_t n,
                    double *to) {
  static const double white[3] = {95.047, 100, 108.883};
  static const double matrix[9] = {0.41, 0.36, 0.18, 0.21, 0.72,
                                   0.07, 0.02, 0.12, 0.95};
  static const double tone[4] = {2.4, 0.055, 1 / 12.92, 0.04045};
  static const double ucs[EF__UCS_CONSTANTS] = {
      0.4, 0.65, -0.05, -0.25, 1.2, 0.046, 0, 0.05, 0.95,
      0.03, 1.3, 45, 0.007, 0.0228};
  uint8_t code[3 * COLOURS];
  for (size_t i = 0; i < 3 * n; ++i)
    code[i] = (uint8_t)(17 * (3 * at + i) + (3 * at + i) / 256);
  double level[256];
  for (int i = 0; i < 256; ++i) level[i] = i / 255.0 * i / 255.0;
  k->xyz_to_lab(n, reference + 3 * at, white, to);
  k->codes_to_lab(n, code, level, matrix, to + 3 * n);
  k->rgb_to_xyz(n, narrow_rgb + 3 * at, tone, matrix, to + 6 * n);
  k->xyz_to_ucs(n, reference + 3 * at, ucs, to + 9 * n);
}

/* Also beside colours far beyond any white, and below zero. */
static void colours_have_the_same_bits_everywhere(void **state) {
  (void)state;
  static double first[12 * COLOURS], again[12 * COLOURS];
  gen g = gen_new(11);
  for (size_t i = 0; i < 3 * COLOURS; ++i) {
    reference[i] = i % 11 == 5 ? 1e40 : gen_between(&g, i % 7 ? 0 : -3, 110);
    narrow_rgb[i] = (float)gen_between(&g, -0.1, 1.1);
  }
  convert(ef__kernels_at(0), 0, COLOURS, first);
  assert_near_relative(first[15], 116 * cbrt(reference[16] / 100) - 16,
                       4 * DBL_EPSILON);
  assert_near(first[9], 116 * cbrt(reference[10] / 100) - 16, 1e-11);
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    convert(k, 0, COLOURS, again);
    assert_same_bits(again, first, 12 * COLOURS);
    for (size_t n = 1; n < 80; ++n) {
      const size_t at = 2 * n;
      convert(k, at, n, again);
      for (size_t part = 0; part < 4; ++part)
        assert_same_bits(again + 3 * n * part,
                         first + 3 * (COLOURS * part + at), 3 * n);
    }
  }
}

/* One reference to blocks of samples in floats: near the formula, and the same
 * bits on every target and in every place. */
static void rough_squares_are_near(void **state) {
  (void)state;
  enum { BLOCKS = 101, POINTS = BLOCKS * EF__ROUGH_BLOCK };
  static float block[3 * POINTS], square[POINTS], again[POINTS];
  const float ones[3] = {1, 1, 1};
  gen g = gen_new(7);
  deviation d = {0};
  for (int run = 0; run < 60; ++run) {
    const float r[3] = {(float)gen_between(&g, -10, 120),
                        run == 0 ? 0 : (float)gen_between(&g, -150, 150),
                        run == 0 ? 0 : (float)gen_between(&g, -150, 150)};
    const double size = run % 2 == 0 ? 150 : 10;
    for (int i = 0; i < POINTS; ++i) {
      float *const at = block + 3 * EF__ROUGH_BLOCK * (i / EF__ROUGH_BLOCK) +
                        i % EF__ROUGH_BLOCK;
      at[0] = (float)gen_between(&g, -10, 120);
      at[EF__ROUGH_BLOCK] = (float)gen_between(&g, -size, size);
      at[2 * EF__ROUGH_BLOCK] = (float)gen_between(&g, -size, size);
    }
    block[EF__ROUGH_BLOCK] = block[2 * EF__ROUGH_BLOCK] = 0; /* neutral */
    ef__kernels()->ciede2000_rough(BLOCKS, r, ones, block, square);
    for (int i = 0; i < POINTS; ++i) {
      const float *const at = block +
                              3 * EF__ROUGH_BLOCK * (i / EF__ROUGH_BLOCK) +
                              i % EF__ROUGH_BLOCK;
      const double pair[2][3] = {
          {(double)r[0], (double)r[1], (double)r[2]},
          {(double)at[0], (double)at[EF__ROUGH_BLOCK],
           (double)at[2 * EF__ROUGH_BLOCK]}};
      const double exact = plain_ciede2000(pair[0], pair[1]);
      deviation_add(&d, sqrt((double)square[i]) / (1 + exact),
                    exact / (1 + exact), "a pair");
    }
    const ef__kernel_table *k;
    for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
      k->ciede2000_rough(BLOCKS, r, ones, block, again);
      assert_memory_equal(again, square, sizeof square);
      const size_t alone = (size_t)run;
      k->ciede2000_rough(1, r, ones, block + 3 * EF__ROUGH_BLOCK * alone,
                         again);
      assert_memory_equal(again, square + EF__ROUGH_BLOCK * alone,
                          EF__ROUGH_BLOCK * sizeof *again);
    }
  }
  deviation_print(&d, "rough CIEDE2000, over 1 + the difference");
  assert_true(d.largest < 0.002);
}

/* ---- Spectra ----------------------------------------------------------- */

enum { MOST_SAMPLES = 700, MOST_CHANNELS = 20, MOST_SPECTRA = 40 };

static double weight[MOST_CHANNELS * MOST_SAMPLES];
static double spectrum[MOST_SPECTRA * MOST_SAMPLES];
static float narrow[MOST_SPECTRA * MOST_SAMPLES];
static double value[MOST_SPECTRA * MOST_CHANNELS];
static double other[MOST_SPECTRA * MOST_CHANNELS];

/* The sum in the order that kernels.h gives. */
static double eight_parts(size_t n, const double *w, const double *x) {
  double p[8] = {0};
  for (size_t i = 0; i < n; ++i) p[i % 8] += w[i] * x[i];
  return ((p[0] + p[4]) + (p[1] + p[5])) + ((p[2] + p[6]) + (p[3] + p[7]));
}

static void check_spectra(const ef__kernel_table *k, size_t n_samples,
                          size_t n_channels, size_t n) {
  /* Beside the outputs nothing is written, beside the inputs nothing counts. */
  const size_t n_out = n * n_channels;
  for (size_t i = 0; i < MOST_SPECTRA * MOST_CHANNELS; ++i)
    value[i] = other[i] = -7;
  k->apply(n_samples, n_channels, weight, n, spectrum, value);
  k->apply_float(n_samples, n_channels, weight, n, narrow, other);
  for (size_t i = 0; i < n; ++i) {
    for (size_t c = 0; c < n_channels; ++c) {
      const double sum = eight_parts(n_samples, weight + c * n_samples,
                                     spectrum + i * n_samples);
      assert_same_bits(value + i * n_channels + c, &sum, 1);
    }
  }
  assert_same_bits(other, value, n_out); /* samples are floats */
  for (size_t i = n_out; i < MOST_SPECTRA * MOST_CHANNELS; ++i)
    assert_true(value[i] == -7 && other[i] == -7);
}

static void spectra_are_summed_in_one_order(void **state) {
  (void)state;
  gen g = gen_new(8);
  gen_fill(&g, MOST_CHANNELS * MOST_SAMPLES, -1, 2, weight);
  for (size_t i = 0; i < MOST_SPECTRA * MOST_SAMPLES; ++i) {
    narrow[i] = (float)gen_unit(&g);
    spectrum[i] = (double)narrow[i];
  }
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    for (size_t n_samples = 1; n_samples <= 26; ++n_samples) {
      for (size_t n = 1; n < 12; ++n) check_spectra(k, n_samples, 3, n);
    }
    for (size_t n_channels = 1; n_channels <= MOST_CHANNELS; ++n_channels) {
      check_spectra(k, 31, n_channels, 1);
      check_spectra(k, 81, n_channels, 9);
      check_spectra(k, 401, n_channels, MOST_SPECTRA);
      check_spectra(k, MOST_SAMPLES, n_channels, 10); /* too long to pack */
    }
  }
}

/* Band by band, with room between the bands: the same sums to the bit. */
static void check_bands(const ef__kernel_table *k, size_t n_samples, size_t n) {
  enum { STEP = 61 };
  static float floats[90 * STEP];
  static int16_t whole[90 * STEP];
  static uint16_t natural[90 * STEP];
  gen g = gen_new(n_samples * 100 + n);
  for (size_t i = 0; i < n_samples * STEP; ++i) {
    floats[i] = (float)gen_unit(&g);
    whole[i] = (int16_t)((int)gen_below(&g, 65536) - 32768);
    natural[i] = (uint16_t)gen_below(&g, 65536);
  }
  for (int type = 0; type < 3; ++type) {
    for (size_t i = 0; i < 3 * n + 3; ++i) value[i] = -7;
    if (type == 0) k->bands_float(n_samples, weight, n, floats, STEP, value);
    if (type == 1) k->bands_int16(n_samples, weight, n, whole, STEP, value);
    if (type == 2) k->bands_uint16(n_samples, weight, n, natural, STEP, value);
    for (size_t i = 0; i < n; ++i) {
      double x[90];
      for (size_t j = 0; j < n_samples; ++j) {
        const size_t at = j * STEP + i;
        x[j] = type == 0   ? (double)floats[at]
               : type == 1 ? (double)whole[at]
                           : (double)natural[at];
      }
      for (size_t c = 0; c < 3; ++c) {
        const double sum = eight_parts(n_samples, weight + c * n_samples, x);
        assert_same_bits(value + 3 * i + c, &sum, 1);
      }
    }
    for (size_t i = 3 * n; i < 3 * n + 3; ++i) assert_true(value[i] == -7);
  }
}

static void bands_are_summed_in_the_same_order(void **state) {
  (void)state;
  gen g = gen_new(8);
  gen_fill(&g, MOST_CHANNELS * MOST_SAMPLES, -1, 2, weight);
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t) {
    for (size_t n_samples = 1; n_samples <= 20; ++n_samples)
      check_bands(k, n_samples, 37);
    for (size_t n = 1; n <= 61; n += 4) check_bands(k, 81, n);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(cube_roots),
      cmocka_unit_test(near_cube_roots),
      cmocka_unit_test(exponentials),
      cmocka_unit_test(logarithms),
      cmocka_unit_test(powers),
      cmocka_unit_test(powers_as_shares),
      cmocka_unit_test(sines_and_cosines),
      cmocka_unit_test(angles),
      cmocka_unit_test(nothing_becomes_a_number),
      cmocka_unit_test(differences_are_the_plain_formulas),
      cmocka_unit_test(every_target_and_place_gives_the_same_bits),
      cmocka_unit_test(colours_have_the_same_bits_everywhere),
      cmocka_unit_test(rough_squares_are_near),
      cmocka_unit_test(spectra_are_summed_in_one_order),
      cmocka_unit_test(bands_are_summed_in_the_same_order),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
