/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every halftone print. */
#include <stdlib.h>

#include "device/device_private.h"
#include "gen.h"
#include "invented_print.h"
#include "near.h"

enum { N = PRINT_SAMPLES, TRIALS = 300 };

/* Random primaries that darken as inks are added, random n and curves. */
typedef struct print {
  double primary[8 * N];
  double n;
  ef_tone_curve *curve[3];
  ef_device *device;
} print;

static void darken(gen *g, double *primary) {
  double ink[N], paper[N];
  gen_smooth(g, N, paper);
  memcpy(primary, paper, sizeof paper);
  for (size_t i = 0; i < 3; i++) {
    gen_smooth(g, N, ink);
    for (size_t k = 0; k < (size_t)1 << i; k++)
      for (size_t s = 0; s < N; s++)
        primary[(k + ((size_t)1 << i)) * N + s] = primary[k * N + s] * ink[s];
  }
}

static print random_print(gen *g, double n) {
  print p = {.n = n};
  char name[40];
  const ef_grid grid = print_grid();
  darken(g, p.primary);
  for (size_t i = 0; i < 3; i++) {
    snprintf(name, sizeof name, "power:%.3f", gen_between(g, 0.6, 1.6));
    p.curve[i] = ef_tone_curve_new(name, NULL);
  }
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = n;
  settings.n_curves = 3;
  settings.curve = (const ef_tone_curve *const *)p.curve;
  ef_error error;
  p.device =
      ef_halftone_new("random", NULL, &grid, p.primary, &settings, &error);
  if (p.device == NULL)
    fail_msg("%s", error.message);
  return p;
}

static void free_print(print *p) {
  for (size_t i = 0; i < 3; i++)
    ef_tone_curve_free(p->curve[i]);
  ef_device_free(p->device);
}

/* Every corner of the box is its primary: zero ink is paper, full coverage of
 * all inks the last primary. */
static void corners_are_the_primaries(void **state) {
  (void)state;
  gen g = gen_new(3201);
  deviation off = {0};
  for (int trial = 0; trial < TRIALS; trial++) {
    print p = random_print(&g, gen_between(&g, 1, 10));
    for (size_t k = 0; k < 8; k++) {
      const double drive[3] = {k & 1 ? 1 : 0, k & 2 ? 1 : 0, k & 4 ? 1 : 0};
      double spectrum[N];
      ef_device_spectrum(p.device, drive, spectrum, NULL, NULL);
      for (size_t s = 0; s < N; s++)
        deviation_add(&off, spectrum[s] / p.primary[k * N + s], 1, "a corner");
    }
    free_print(&p);
  }
  deviation_print(&off, "corners against primaries, relative");
  /* Two powers of a rounding each, the outer one times n. */
  assert_near(off.largest, 0, 32 * 2.3e-16);
}

/* In [0, 1], and for one sample never beyond the primaries' range. */
static void reflectances_stay_inside(void **state) {
  (void)state;
  gen g = gen_new(3202);
  for (int trial = 0; trial < TRIALS; trial++) {
    print p = random_print(&g, gen_between(&g, 1, 10));
    double drive[3], spectrum[N];
    gen_fill(&g, 3, 0, 1, drive);
    ef_device_spectrum(p.device, drive, spectrum, NULL, NULL);
    for (size_t s = 0; s < N; s++) {
      double low = 1, high = 0;
      for (size_t k = 0; k < 8; k++) {
        low = fmin(low, p.primary[k * N + s]);
        high = fmax(high, p.primary[k * N + s]);
      }
      assert_true(low >= 0 && high <= 1);
      assert_true(spectrum[s] >= low * (1 - 1e-14));
      assert_true(spectrum[s] <= high * (1 + 1e-14));
    }
    free_print(&p);
  }
}

/* n = 1: reflectances of one ink's tints mix linearly (Murray & Davies), and
 * the tone value of any sample is the area that was printed. */
static void n_of_one_is_murray_davies(void **state) {
  (void)state;
  gen g = gen_new(3203);
  deviation off = {0};
  for (int trial = 0; trial < TRIALS; trial++) {
    print p = random_print(&g, 1);
    for (size_t i = 0; i < 3; i++) {
      double drive[3] = {0}, spectrum[N];
      drive[i] = gen_unit(&g);
      const double area = ef_device_amount(p.device, i, drive[i], NULL);
      const double *solid = p.primary + ((size_t)1 << i) * N;
      ef_device_spectrum(p.device, drive, spectrum, NULL, NULL);
      for (size_t s = 0; s < N; s++) {
        deviation_add(&off, spectrum[s],
                      (1 - area) * p.primary[s] + area * solid[s], "a tint");
        const double step = p.primary[s] - solid[s];
        if (step > 0.1)
          deviation_add(&off,
                        ef_tone_value(p.primary[s], solid[s], spectrum[s], 1),
                        area, "a tone value");
      }
    }
    free_print(&p);
  }
  deviation_print(&off, "Murray-Davies");
  assert_near(off.largest, 0, 1e-14);
}

/* The tone value with the print's own n is the area at every wavelength. */
static void tone_value_is_the_area(void **state) {
  (void)state;
  gen g = gen_new(3204);
  deviation off = {0};
  for (int trial = 0; trial < TRIALS; trial++) {
    print p = random_print(&g, gen_between(&g, 1, 10));
    double drive[3] = {0, gen_unit(&g), 0}, spectrum[N];
    const double area = ef_device_amount(p.device, 1, drive[1], NULL);
    ef_device_spectrum(p.device, drive, spectrum, NULL, NULL);
    for (size_t s = 0; s < N; s++)
      if (p.primary[s] > 1.5 * p.primary[2 * N + s])
        deviation_add(
            &off,
            ef_tone_value(p.primary[s], p.primary[2 * N + s], spectrum[s], p.n),
            area, "a sample");
    free_print(&p);
  }
  deviation_print(&off, "tone value against area");
  /* Roundings of the powers, over the step between paper and solid: at n = 10
   * a ratio of 1.5 is a step of 0.04. */
  assert_near(off.largest, 0, 1e-12);
}

static void shares_sum_to_one(void **state) {
  (void)state;
  gen g = gen_new(3205);
  for (int trial = 0; trial < TRIALS; trial++) {
    double area[4], share[16];
    const size_t n = 1 + gen_below(&g, 4);
    gen_fill(&g, n, 0, 1, area);
    ef_demichel(n, area, share);
    double sum = 0;
    for (size_t k = 0; k < (size_t)1 << n; k++) {
      assert_true(share[k] >= 0);
      sum += share[k];
    }
    assert_near(sum, 1, 1e-15);
    /* The shares in which an ink prints are its area. */
    for (size_t i = 0; i < n; i++) {
      double printed = 0;
      for (size_t k = 0; k < (size_t)1 << n; k++)
        printed += k >> i & 1 ? share[k] : 0;
      assert_near(printed, area[i], 1e-15);
    }
  }
}

/* Central differences of step h are wrong by h^2/6 of the third derivative and
 * by rounding / h: some 1e-9 for both at 1e-5. */
static const double step = 1e-5, allowed = 2e-8;

static void spectrum_jacobian_is_the_derivative(void **state) {
  (void)state;
  gen g = gen_new(3206);
  deviation off = {0};
  for (int trial = 0; trial < TRIALS; trial++) {
    print p = random_print(&g, gen_between(&g, 1, 6));
    double drive[3], jacobian[3 * N], value[N], up[N], down[N];
    gen_fill(&g, 3, 0.05, 0.95, drive);
    ef_device_spectrum(p.device, drive, value, jacobian, NULL);
    for (size_t i = 0; i < 3; i++) {
      double other[3];
      memcpy(other, drive, sizeof other);
      other[i] = drive[i] + step;
      ef_device_spectrum(p.device, other, up, NULL, NULL);
      other[i] = drive[i] - step;
      ef_device_spectrum(p.device, other, down, NULL, NULL);
      for (size_t s = 0; s < N; s++)
        deviation_add(&off, jacobian[3 * s + i], (up[s] - down[s]) / (2 * step),
                      "a sample");
    }
    free_print(&p);
  }
  deviation_print(&off, "d spectrum / d drive");
  assert_near(off.largest, 0, allowed);
}

static void xyz_jacobian_is_the_derivative(void **state) {
  (void)state;
  gen g = gen_new(3207);
  deviation off = {0}, same = {0};
  ef_observer *observer = ef_observer_new("cie-1964", NULL);
  ef_illuminant *light = ef_illuminant_new("FL11", NULL);
  const ef_grid grid = print_grid();
  const ef_viewing viewing = ef_viewing_default(light);
  ef_weights *weights = ef_observer_weights(observer, EF_TRISTIMULUS, &grid,
                                            &viewing, NULL, NULL);
  for (int trial = 0; trial < TRIALS; trial++) {
    print p = random_print(&g, gen_between(&g, 1, 6));
    ef_setup *setup = ef_setup_new(p.device, observer, light, NULL, NULL);
    double area[3], drive[3], jacobian[9], spectrum[N], seen[3];
    gen_fill(&g, 3, 0.05, 0.95, area);
    const ef_xyz xyz = ef_setup_xyz(setup, area, jacobian);
    for (size_t i = 0; i < 3; i++)
      drive[i] = ef_device_drive(p.device, i, area[i]);
    ef_device_spectrum(p.device, drive, spectrum, NULL, NULL);
    ef_weights_apply(weights, 1, spectrum, 1, seen, NULL);
    deviation_add(&same, xyz.X, seen[0], "X");
    deviation_add(&same, xyz.Y, seen[1], "Y");
    deviation_add(&same, xyz.Z, seen[2], "Z");
    for (size_t i = 0; i < 3; i++) {
      double other[3];
      memcpy(other, area, sizeof other);
      other[i] = area[i] + step;
      const ef_xyz up = ef_setup_xyz(setup, other, NULL);
      other[i] = area[i] - step;
      const ef_xyz down = ef_setup_xyz(setup, other, NULL);
      deviation_add(&off, jacobian[i], (up.X - down.X) / (2 * step), "X");
      deviation_add(&off, jacobian[3 + i], (up.Y - down.Y) / (2 * step), "Y");
      deviation_add(&off, jacobian[6 + i], (up.Z - down.Z) / (2 * step), "Z");
    }
    assert_false(ef_setup_affine(setup));
    ef_setup_free(setup);
    free_print(&p);
  }
  deviation_print(&off, "d XYZ / d area");
  deviation_print(&same, "XYZ of the setup against XYZ of the spectrum");
  assert_near(off.largest, 0, 100 * allowed); /* Y is up to 100 */
  assert_near(same.largest, 0, 1e-12);
  ef_weights_free(weights);
  ef_illuminant_free(light);
  ef_observer_free(observer);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(corners_are_the_primaries),
      cmocka_unit_test(reflectances_stay_inside),
      cmocka_unit_test(n_of_one_is_murray_davies),
      cmocka_unit_test(tone_value_is_the_area),
      cmocka_unit_test(shares_sum_to_one),
      cmocka_unit_test(spectrum_jacobian_is_the_derivative),
      cmocka_unit_test(xyz_jacobian_is_the_derivative),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
