/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sprague's interpolation against its published coefficients, and those
 * against what defines them, since they were typed from memory. */
#include "figures.h"
#include "near.h"

#include <evenfield/spectrum.h>

enum { N = 6, N_SAMPLES = 12 };

static double coefficient[N][N]; /* a_k of each sample, over 24 */
static double before[2][N];      /* P0 and P-1, over 209 */

static int read_coefficients(void **state) {
  (void)state;
  static const char *const a[N] = {"a0", "a1", "a2", "a3", "a4", "a5"};
  static const char *const end[2] = {"P0", "P-1"};
  figures f = figures_read("published", "sprague-coefficients.csv");
  for (size_t j = 0; j < N; ++j) {
    for (size_t k = 0; k < N; ++k) {
      coefficient[k][j] = figures_number(&f, figures_row(&f, a[k]), j + 1) / 24;
    }
    for (size_t e = 0; e < 2; ++e) {
      before[e][j] = figures_number(&f, figures_row(&f, end[e]), j + 1) / 209;
    }
  }
  figures_free(&f);
  return 0;
}

/* Value at share t between the third and the fourth of six samples. */
static double published_value(const double *six, double t) {
  double sum = 0;
  for (size_t k = 0; k < N; ++k) {
    for (size_t j = 0; j < N; ++j) {
      sum += coefficient[k][j] * six[j] * pow(t, (double)k);
    }
  }
  return sum;
}

/* Our value at share t of interval i for the samples given. */
static double our_value(const double *sample, size_t i, double t) {
  const ef_grid from = {N_SAMPLES, 400, 10, NULL};
  const ef_grid to = {1, 400 + 10 * ((double)i + t), 0, NULL};
  double out = NOT_A_NUMBER;
  assert_int_equal(ef_resample(&from, 1, sample, &to, EF_INTERPOLATE_SPRAGUE,
                               EF_EXTEND_ZERO, &out, NULL),
                   EF_OK);
  return out;
}

/* Sample i, or what the published rows put in its place beyond the ends. */
static double published_sample(const double *sample, int i) {
  if (i >= 0 && i < N_SAMPLES)
    return sample[i];
  double sum = 0;
  for (int j = 0; j < N; ++j) {
    sum += i < 0 ? before[-1 - i][j] * sample[j]
                 : before[i - N_SAMPLES][j] * sample[N_SAMPLES - 1 - j];
  }
  return sum;
}

/* Every interval, every single sample at 1 and the others at 0: that is each
 * coefficient of each row, the extrapolated ends with them. */
static void rows_have_the_published_coefficients(void **state) {
  (void)state;
  deviation d = {0};
  for (size_t lit = 0; lit < N_SAMPLES; ++lit) {
    double sample[N_SAMPLES] = {0};
    sample[lit] = 1;
    for (int i = 0; i + 1 < N_SAMPLES; ++i) {
      double six[N];
      for (int j = 0; j < N; ++j) {
        six[j] = published_sample(sample, i - 2 + j);
      }
      for (int step = 1; step < 10; ++step) {
        const double t = step / 10.0;
        const double ours = our_value(sample, (size_t)i, t);
        const double published = published_value(six, t);
        char where[96];
        snprintf(where, sizeof where, "sample %zu, interval %d", lit, i);
        deviation_add(&d, ours, published, where);
        /* End coefficients reach 15; t is rounded at 500 nm / 10 nm. */
        assert_near(ours, published, 500 * 2.3e-16);
      }
    }
  }
  deviation_print(&d, "Sprague rows");
}

/* What defines the curve: it and its first two derivatives agree at both ends
 * of the interval with five-point estimates (Abramowitz & Stegun 1964, Table
 * 25.2: (1, -8, 0, 8, -1)/12 and (-1, 16, -30, 16, -1)/12). */
static void coefficients_follow_from_their_definition(void **state) {
  (void)state;
  static const double value[5] = {0, 0, 1, 0, 0};
  static const double slope[5] = {1, -8, 0, 8, -1};
  static const double bend[5] = {-1, 16, -30, 16, -1};
  for (size_t j = 0; j < N; ++j) {
    for (size_t end = 0; end < 2; ++end) {
      const double t = (double)end;
      double y[3] = {0, 0, 0}; /* value and derivatives at t */
      for (size_t k = 0; k < N; ++k) {
        const double p = (double)k, c = coefficient[k][j];
        y[0] += c * pow(t, p);
        if (k >= 1)
          y[1] += c * p * pow(t, p - 1);
        if (k >= 2)
          y[2] += c * p * (p - 1) * pow(t, p - 2);
      }
      const bool counts = j >= end && j - end < 5;
      assert_near(y[0], counts ? value[j - end] : 0, 1e-14);
      assert_near(y[1], counts ? slope[j - end] / 12 : 0, 1e-13);
      assert_near(y[2], counts ? bend[j - end] / 12 : 0, 1e-13);
    }
  }
}

/* Half way, Sprague and the six-point Lagrange formula are the same
 * (Abramowitz & Stegun 1964, Table 25.1, p = 0.5: 3, -25, 150, 150, -25, 3
 * over 256). */
static void half_way_is_the_lagrange_midpoint(void **state) {
  (void)state;
  static const double midpoint[N] = {3, -25, 150, 150, -25, 3};
  for (size_t j = 0; j < N; ++j) {
    double sample[N_SAMPLES] = {0};
    sample[3 + j] = 1;
    assert_near(our_value(sample, 5, 0.5), midpoint[j] / 256, 1e-15);
  }
}

/* Properties of the end rows that a misprint would break: they keep constants
 * and straight lines, and eliminating the sixth sample from the two leaves
 * 2 P-1 - 15 P0 + 28 P1 - 20 P2 + 6 P3 - P4 = 0, whole numbers (found here, not
 * published). */
static void end_rows_are_consistent(void **state) {
  (void)state;
  static const double relation[N] = {28, -20, 6, -1, 0, 0};
  for (size_t e = 0; e < 2; ++e) {
    double sum = 0, moment = 0;
    for (size_t j = 0; j < N; ++j) {
      sum += before[e][j];
      moment += before[e][j] * (double)(j + 1);
    }
    assert_near(sum, 1, 1e-13);
    assert_near(moment, -(double)e, 1e-13);
  }
  for (size_t j = 0; j < N; ++j) {
    assert_near(15 * before[0][j] - 2 * before[1][j], relation[j], 1e-13);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(rows_have_the_published_coefficients),
      cmocka_unit_test(coefficients_follow_from_their_definition),
      cmocka_unit_test(half_way_is_the_lagrange_midpoint),
      cmocka_unit_test(end_rows_are_consistent),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, read_coefficients, NULL);
}
