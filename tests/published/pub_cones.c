/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The observers of CIE 170-2:2015 as their users get them: tristimulus
 * functions on the standard grid against the published tables, and the
 * MacLeod-Boynton factor of the S cones. */
#include <evenfield/observer.h>

#include "figures.h"
#include "near.h"

static ef_observer *make(const char *name) {
  ef_error error;
  ef_observer *const observer = ef_observer_new(name, &error);
  if (observer == NULL) fail_msg("%s", error.message);
  return observer;
}

/* Six figures of the cones, of which the largest are 1, times coefficients up
 * to 2.1: half a unit of the sixth figure, each, gives 2e-6. */
static void check_functions(const char *name, const char *file) {
  figures f = figures_read("published", file);
  ef_observer *const observer = make(name);
  const ef_channels channels = ef_observer_channels(observer, EF_TRISTIMULUS);
  deviation off = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const size_t i = (size_t)(figures_number(&f, row, 0) -
                              channels.grid.start_nm);
    for (size_t c = 0; c < 3; ++c) {
      char where[96];
      snprintf(where, sizeof where, "%s %s nm", channels.name[c],
               figures_text(&f, row, 0));
      deviation_add(&off, channels.value[c * channels.grid.count + i],
                    figures_number(&f, row, 1 + c), where);
    }
  }
  assert_int_equal(f.n_rows, 89);
  deviation_print(&off, name);
  assert_near(off.largest, 0, 2e-6);
  ef_observer_free(observer);
  figures_free(&f);
}

static void tristimulus_functions(void **state) {
  (void)state;
  check_functions("cie-2015-2", "cie-2015-2-5nm.csv");
  check_functions("cie-2015-10", "cie-2015-10-5nm.csv");
}

/* k_s makes the largest s_MB on the spectrum locus 1 (CIE 170-2:2015). From
 * six-figure cones at whole nm it comes out with a relative difference of up
 * to 1.3e-5 from the published six figures, found at steps of 0.1 nm. */
static void check_k_s(const char *name) {
  ef_observer *const observer = make(name);
  const ef_channels cones = ef_observer_channels(observer, EF_CONES);
  const ef_mb_scale scale = ef_observer_mb_scale(observer);
  const size_t n = cones.grid.count;
  double largest = 0;
  size_t where = 0;
  for (size_t i = 0; i < n; ++i) {
    const double luminance =
        scale.k_l * cones.value[i] + scale.k_m * cones.value[n + i];
    if (!(luminance > 0)) continue;
    const double ratio = cones.value[2 * n + i] / luminance;
    if (ratio > largest) {
      largest = ratio;
      where = i;
    }
  }
  printf("# %s: k_s %.7f, 1 / max(s / V) %.7f at %g nm\n", name, scale.k_s,
         1 / largest, ef_grid_wavelength(&cones.grid, where));
  assert_near_relative(1 / largest, scale.k_s, 1.4e-5);
  ef_observer_free(observer);
}

static void macleod_boynton_factor(void **state) {
  (void)state;
  check_k_s("cie-2015-2");
  check_k_s("cie-2015-10");
}

/* The luminous efficiency of the observer is k_l l + k_m m exactly. */
static void luminance_is_that_of_the_cones(void **state) {
  (void)state;
  const char *const names[] = {"cie-2015-2", "cie-2015-10"};
  for (size_t k = 0; k < 2; ++k) {
    ef_observer *const observer = make(names[k]);
    const ef_channels cones = ef_observer_channels(observer, EF_CONES);
    const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
    const ef_mb_scale scale = ef_observer_mb_scale(observer);
    const size_t n = cones.grid.count;
    for (size_t i = 0; i < n; ++i) {
      const double expected =
          scale.k_l * cones.value[i] + scale.k_m * cones.value[n + i];
      assert_near_relative(xyz.value[n + i], expected, 1e-15);
    }
    ef_observer_free(observer);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(tristimulus_functions),
      cmocka_unit_test(macleod_boynton_factor),
      cmocka_unit_test(luminance_is_that_of_the_cones),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
