/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Correlated colour temperatures and rendering indices as printed for the CIE
 * illuminants, and Robertson's points of the Planckian locus (sources in the
 * CSV files). */
#include <evenfield/colour.h>

#include "figures.h"
#include "near.h"

static const ef_grid five_nm = {.count = 95, .start_nm = 360, .step_nm = 5};
static const ef_grid visible = {.count = 81, .start_nm = 380, .step_nm = 5};

static void sample(const char *name, const ef_grid *grid, double *power) {
  ef_error error;
  ef_illuminant *const illuminant = ef_illuminant_new(name, &error);
  if (illuminant == NULL) fail_msg("%s", error.message);
  assert_int_equal(ef_illuminant_sample(illuminant, grid, power, &error),
                   EF_OK);
  ef_illuminant_free(illuminant);
}

static ef_cct cct_of(const char *name, const ef_observer *observer) {
  ef_error error;
  ef_illuminant *const illuminant = ef_illuminant_new(name, &error);
  if (illuminant == NULL) fail_msg("%s", error.message);
  double xyz[3];
  assert_int_equal(ef_observer_white(observer, EF_TRISTIMULUS, illuminant,
                                     &visible, xyz, &error),
                   EF_OK);
  ef_illuminant_free(illuminant);
  const ef_xyy xyy = ef_xyz_to_xyy((ef_xyz){xyz[0], xyz[1], xyz[2]});
  return ef_xy_to_cct((ef_xy){xyy.x, xyy.y});
}

/* Five decimals of u and v: half a unit. */
static void planckian_locus(void **state) {
  (void)state;
  figures f = figures_read("published", "robertson-1968.csv");
  deviation u = {0}, v = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const double mired = figures_number(&f, row, 0);
    const ef_uv uv = ef_xy_to_uv(ef_planck_xy(1e6 / mired));
    const char *const where = figures_text(&f, row, 0);
    deviation_add(&u, uv.u_prime, figures_number(&f, row, 1), where);
    deviation_add(&v, uv.v_prime / 1.5, figures_number(&f, row, 2), where);
  }
  deviation_print(&u, "u of 30 Planckian radiators (mired)");
  deviation_print(&v, "v of 30 Planckian radiators (mired)");
  assert_near(u.largest, 0, 5e-6 + 1e-12);
  assert_near(v.largest, 0, 5e-6 + 1e-12);
  figures_free(&f);
}

/* All points of an isotemperature line have the temperature of its foot. The
 * slopes are printed to five significant digits: over a distance of 0.02 the
 * last half unit turns the line by at most 4e-8, the printed foot is 5e-6 off,
 * and the locus moves at least 1.3e-4 a mired: 0.04 mired. The line of 10 mired
 * lies at the limit of what has a temperature, on either side of it. */
static void isotemperature_lines(void **state) {
  (void)state;
  figures f = figures_read("published", "robertson-1968.csv");
  deviation off = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const double mired = figures_number(&f, row, 0);
    const double slope = figures_number(&f, row, 3);
    if (mired < 20) continue;
    for (int side = -1; side <= 1; side += 2) {
      /* Towards larger v: every slope is negative. */
      const double step = -side * 0.02 / hypot(1, slope);
      const ef_uv at = {figures_number(&f, row, 1) + step,
                        1.5 * (figures_number(&f, row, 2) + step * slope)};
      const ef_cct cct = ef_xy_to_cct(ef_uv_to_xy(at));
      assert_true(cct.defined);
      assert_near(cct.duv, side * 0.02, 7.1e-6);
      deviation_add(&off, 1e6 / cct.cct_k, mired, figures_text(&f, row, 0));
    }
  }
  deviation_print(&off, "mired at 0.02 from the locus, both sides");
  assert_near(off.largest, 0, 0.04);
  figures_free(&f);
}

/* Printed to 10 K (FL1 to FL12) or 1 K: half a unit, and what the last decimal
 * of the chromaticities behind them is worth. 5e-5 in x, y (four decimals for
 * the lamps) is up to 1.5 K at 4000 K; the D series is nominal: D50 is daylight
 * at 5003 K whose rounded chromaticity lies at 5001.7 K. */
static void temperatures(void **state) {
  (void)state;
  figures f = figures_read("published", "cct-ra.csv");
  ef_observer *const observer = ef_observer_new("cie-1931", NULL);
  deviation coarse = {0}, fine = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const char *const name = figures_text(&f, row, 0);
    const ef_cct cct = cct_of(name, observer);
    assert_true(cct.defined);
    const double printed = figures_number(&f, row, 1);
    const double step_k = figures_number(&f, row, 2);
    deviation_add(step_k > 1 ? &coarse : &fine, cct.cct_k, printed, name);
  }
  deviation_print(&coarse, "temperatures printed to 10 K");
  deviation_print(&fine, "temperatures printed to 1 K");
  assert_near(coarse.largest, 0, 5 + 1.5);
  assert_near(fine.largest, 0, 0.5 + 1.5);
  ef_observer_free(observer);
  figures_free(&f);
}

static ef_rendering rendering_of(const char *name) {
  double power[95];
  sample(name, &five_nm, power);
  ef_rendering out;
  ef_error error;
  if (ef_rendering_index(&five_nm, power, &out, &error) != EF_OK) {
    fail_msg("%s: %s", name, error.message);
  }
  return out;
}

/* Ra is printed as a whole number: half a unit. FL8 and FL10 have 4997.2 and
 * 4998.3 K: black body by the rule of CIE 13.3, and so they are printed. */
static void general_index(void **state) {
  (void)state;
  figures f = figures_read("published", "cct-ra.csv");
  deviation off = {0};
  size_t n = 0;
  for (size_t row = 0; row < f.n_rows; ++row) {
    const char *const name = figures_text(&f, row, 0);
    const double printed = figures_number(&f, row, 3);
    if (isnan(printed) || strncmp(name, "FL3.", 4) == 0) continue;
    const ef_rendering r = rendering_of(name);
    char where[96];
    snprintf(where, sizeof where, "%s (%.2f)", name, r.Ra);
    deviation_add(&off, r.Ra, printed, where);
    assert_int_equal(r.reference_is_daylight, r.cct_k >= 5000);
    ++n;
  }
  assert_int_equal(n, 18);
  deviation_print(&off, "Ra of A, D50 to D75, FL1 to FL12, HP1");
  assert_near(off.largest, 0, 0.5);
  figures_free(&f);
}

/* Whole numbers: half a unit, and what stays unexplained: the printed figures
 * are no rounding of any sum tried (360 or 380 to 830 or 780 nm, c2 1.438 or
 * 1.4388e-2 m K). Largest for R9, printed -37 for FL3.2 and -38.05 here, less
 * than 1 % of the shift of 30 units behind it. Only the ten lamps for which the
 * printed reference is that of CIE 13.3 (see the CSV file); for the other five
 * the difference that the 4000 K rule makes is printed here. */
static void special_indices(void **state) {
  (void)state;
  figures f = figures_read("published", "rendering-fl3.csv");
  deviation general = {0}, special = {0}, other_rule = {0};
  for (size_t row = 0; row < f.n_rows; ++row) {
    const char *const name = figures_text(&f, row, 0);
    const ef_rendering r = rendering_of(name);
    const bool same_rule = figures_number(&f, row, 1) == 1;
    assert_int_equal(same_rule, r.cct_k < 4000 || r.cct_k >= 5000);
    if (same_rule) {
      deviation_add(&general, r.Ra, figures_number(&f, row, 2), name);
    }
    for (size_t i = 0; i < 14; ++i) {
      char where[96];
      snprintf(where, sizeof where, "%s R%zu (%.2f)", name, i + 1, r.R[i]);
      deviation_add(same_rule ? &special : &other_rule, r.R[i],
                    figures_number(&f, row, 3 + i), where);
    }
  }
  deviation_print(&general, "Ra of ten lamps of the FL3 series");
  deviation_print(&special, "R1 to R14 of ten lamps of the FL3 series");
  deviation_print(&other_rule, "R1 to R14 of the five by the other rule");
  assert_near(general.largest, 0, 0.6);
  assert_near(special.largest, 0, 1.1);
  figures_free(&f);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(planckian_locus),
      cmocka_unit_test(isotemperature_lines),
      cmocka_unit_test(temperatures),
      cmocka_unit_test(general_index),
      cmocka_unit_test(special_indices),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
