/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Surface constants against their published values for a refractive index of
 * 1.50, and against Fresnel's equations integrated here. */
#include "near.h"

#include <evenfield/device.h>

/* J. L. Saunderson, Journal of the Optical Society of America 32, 727 (1942):
 * k1 = 0.04, k2 = 0.6; D. B. Judd, Journal of Research of the National Bureau
 * of Standards 29, 329 (1942): diffuse light from outside 0.092, from inside
 * 0.596. All from memory. */
static void index_of_one_and_a_half(void **state) {
  (void)state;
  ef_surface surface;
  double r;
  ef_surface_from_index(1.5, true, &surface, &r, NULL);
  assert_near(surface.k1, 0.04, 1e-15);
  assert_near(surface.k2, 0.596, 0.0005);
  assert_near(r, 0.092, 0.0005);
}

/* Fresnel, mean of both polarisations, light at `angle` to the normal in the
 * medium it comes from; `n` is the other medium's index over this one's. */
static double fresnel(double n, double angle) {
  const double c = cos(angle), s = sin(angle) / n;
  if (s >= 1)
    return 1;
  const double t = sqrt(1 - s * s);
  const double across = (c - n * t) / (c + n * t);
  const double along = (n * c - t) / (n * c + t);
  return 0.5 * (across * across + along * along);
}

/* Mean over diffuse light, weight sin 2a from `from` to `to`: substituted so
 * that the square root at the critical angle does no harm, midpoint rule. */
static double diffuse(double n, double from, double to) {
  enum { STEPS = 20000 };
  double sum = 0;
  for (int i = 0; i < STEPS; i++) {
    const double u = (i + 0.5) / STEPS;
    const double angle = to - (to - from) * u * u;
    sum += fresnel(n, angle) * sin(2 * angle) * 2 * u * (to - from) / STEPS;
  }
  return sum;
}

static void fresnel_integrated(void **state) {
  (void)state;
  deviation outer = {0}, inner = {0};
  for (double n = 1.05; n < 2.6; n += 0.05) {
    ef_surface surface;
    double r;
    char where[32];
    snprintf(where, sizeof where, "n = %.2f", n);
    ef_surface_from_index(n, true, &surface, &r, NULL);
    const double right = acos(0), critical = asin(1 / n);
    deviation_add(&outer, r, diffuse(n, 0, right), where);
    /* Beyond the critical angle all is reflected. */
    const double total = 1 - sin(critical) * sin(critical);
    deviation_add(&inner, surface.k2, diffuse(1 / n, 0, critical) + total,
                  where);
    assert_near(surface.k1, fresnel(n, 0), 1e-15);
  }
  deviation_print(&outer, "diffuse light from outside");
  deviation_print(&inner, "diffuse light from inside");
  assert_near(outer.largest, 0, 2e-8); /* of the midpoint rule */
  assert_near(inner.largest, 0, 2e-8);
}

/* Near 1 the closed form gives way to its limit. */
static void index_near_one(void **state) {
  (void)state;
  double below, above;
  ef_surface surface;
  ef_surface_from_index(1.001 - 1e-9, true, &surface, &below, NULL);
  ef_surface_from_index(1.001 + 1e-9, true, &surface, &above, NULL);
  assert_near(below, above, 1e-8);
  ef_surface_from_index(1.0001, true, &surface, &below, NULL);
  assert_near(below, diffuse(1.0001, 0, acos(0)), 1e-6);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(index_of_one_and_a_half),
      cmocka_unit_test(fresnel_integrated),
      cmocka_unit_test(index_near_one),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
