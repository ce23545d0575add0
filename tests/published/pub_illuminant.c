/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Illuminants by formula against their tables, and white points summed through
 * folded weights against the printed ones. */
#include "figures.h"
#include "near.h"

#include <evenfield/spectrum.h>

enum { MOST_ROWS = 531 };

static const ef_grid cie_5nm = {81, 380, 5, NULL};   /* to 780 nm */
static const ef_grid whole_5nm = {95, 360, 5, NULL}; /* to 830 nm */

static void sample_light(const char *name, const ef_grid *grid, double *power) {
  ef_error error;
  ef_illuminant *const light = ef_illuminant_new(name, &error);
  if (light == NULL)
    fail_msg("%s", error.message);
  assert_int_equal(ef_illuminant_sample(light, grid, power, NULL), EF_OK);
  ef_illuminant_free(light);
}

/* ---- Formulas ---------------------------------------------------------- */

static void illuminant_a_equals_its_table(void **state) {
  (void)state;
  figures f = figures_read("published", "illuminant-a.csv");
  const ef_grid grid = {f.n_rows, 300, 5, NULL};
  double power[MOST_ROWS];
  deviation d = {0};
  assert_int_equal(f.n_rows, 107);
  sample_light("A", &grid, power);
  for (size_t i = 0; i < f.n_rows; ++i) {
    const double printed = figures_number(&f, i, 1);
    assert_near(figures_number(&f, i, 0), ef_grid_wavelength(&grid, i), 0);
    /* Six significant figures. */
    const double unit = pow(10, floor(log10(printed)) - 5);
    deviation_add(&d, power[i] / unit, printed / unit, figures_text(&f, i, 0));
    assert_near(power[i], printed, 0.5 * unit * (1 + 1e-9));
  }
  deviation_print(&d, "A, in units of the last printed digit");
  figures_free(&f);
}

/* CIE 015:2018: the temperature of the D series is the nominal one times
 * 1.4388 / 1.4380. Its tables round M1 and M2 to three decimals, the formula
 * for any temperature does not: they may differ by 0.0005 (|S1| + |S2|), and by
 * half a unit of the last figure printed. */
static void daylight_formula_comes_to_the_d_series(void **state) {
  (void)state;
  static const struct {
    const char *name, *table;
    double nominal_k;
  } series[] = {{"D50", "cie-d50", 5000},
                {"D55", "cie-d55", 5500},
                {"D65", "cie-d65", 6500},
                {"D75", "cie-d75", 7500}};
  const ef_table *const parts = ef_table_find("daylight-components", NULL);
  assert_non_null(parts);
  const double *const s1 = parts->value + 2 * parts->n_rows;
  const double *const s2 = parts->value + 3 * parts->n_rows;
  const ef_grid grid = ef_table_grid(parts);
  deviation d = {0};
  for (size_t k = 0; k < 4; ++k) {
    char name[48];
    snprintf(name, sizeof name, "daylight:%.6f",
             series[k].nominal_k * 1.4388 / 1.4380);
    const ef_table *const table = ef_table_find(series[k].table, NULL);
    assert_non_null(table);
    double by_formula[MOST_ROWS], printed[MOST_ROWS];
    sample_light(name, &grid, by_formula);
    sample_light(series[k].name, &grid, printed);
    for (size_t i = 0; i < grid.count; ++i) {
      const double at = ef_grid_wavelength(&grid, i);
      if (at > table->value[table->n_rows - 1])
        break; /* D55, D75: 780 nm */
      char where[96];
      snprintf(where, sizeof where, "%s %g nm", series[k].name, at);
      deviation_add(&d, by_formula[i], printed[i], where);
      assert_near(by_formula[i], printed[i],
                  0.0005 * (fabs(s1[i]) + fabs(s2[i])) + 0.0005);
    }
  }
  deviation_print(&d, "daylight formula against D50 to D75, 100 at 560 nm");
}

/* ---- White points ------------------------------------------------------ */

/* X Y Z of the perfect diffuser, Y = 100, through the folded weights. */
static void white_point(const char *light_name, bool is_10_degrees,
                        const ef_grid *grid, double xyz[3]) {
  const ef_table *const table =
      ef_table_find(is_10_degrees ? "cie-1964" : "cie-1931", NULL);
  assert_non_null(table);
  static const char *const bar[3] = {"x_bar", "y_bar", "z_bar"};
  const ef_grid rows = ef_table_grid(table);
  double channel[3 * MOST_ROWS], light[MOST_ROWS], white[MOST_ROWS];
  for (size_t c = 0; c < 3; ++c) {
    const size_t column = ef_table_column(table, bar[c]);
    assert_true(column != SIZE_MAX);
    assert_int_equal(ef_resample(&rows, 1, table->value + column * rows.count,
                                 grid, EF_INTERPOLATE_LINEAR, EF_EXTEND_ZERO,
                                 channel + c * grid->count, NULL),
                     EF_OK);
  }
  sample_light(light_name, grid, light);
  for (size_t i = 0; i < grid->count; ++i)
    white[i] = 1;
  ef_fold_settings settings = ef_fold_settings_default();
  settings.working = *grid;
  const double scale[3] = {1, 1, 1};
  ef_weights *const weights =
      ef_weights_fold(grid, 3, channel, light, scale, &settings, NULL);
  assert_non_null(weights);
  assert_int_equal(ef_weights_apply(weights, 1, white, 1, xyz, NULL), EF_OK);
  ef_weights_free(weights);
  const double to_100 = 100 / xyz[1];
  for (size_t c = 0; c < 3; ++c)
    xyz[c] *= to_100;
}

static void check_white_points(const char *source, double tolerance) {
  figures f = figures_read("published", "white-points.csv");
  deviation d = {0};
  size_t n_checked = 0;
  for (size_t i = 0; i < f.n_rows; ++i) {
    if (strcmp(figures_text(&f, i, 0), source) != 0)
      continue;
    const char *const light = figures_text(&f, i, 1);
    const bool is_10 = figures_number(&f, i, 2) > 5;
    const ef_grid standard = ef_grid_standard();
    const ef_grid *grid = &cie_5nm;
    if (strncmp(source, "ASTM", 4) == 0) {
      grid = strcmp(light, "D65") == 0 ? &standard : &whole_5nm;
    }
    double xyz[3];
    white_point(light, is_10, grid, xyz);
    for (size_t c = 0; c < 3; ++c) {
      char where[96];
      snprintf(where, sizeof where, "%s %c, %d degrees", light, "XYZ"[c],
               is_10 ? 10 : 2);
      const double printed = figures_number(&f, i, 3 + c);
      deviation_add(&d, xyz[c], printed, where);
      assert_near(xyz[c], printed, tolerance);
    }
    ++n_checked;
  }
  assert_true(n_checked >= 12);
  char what[96];
  snprintf(what, sizeof what, "%zu white points of %s", n_checked, source);
  deviation_print(&d, what);
  figures_free(&f);
}

static void white_points_of_the_cie(void **state) {
  (void)state;
  check_white_points("CIE 015:2018", 0.005 + 1e-9); /* half the last digit */
}

/* ASTM E308 sums with its own interpolated weights: the last of three decimals
 * is not ours to reproduce, the second is. */
static void white_points_of_astm(void **state) {
  (void)state;
  check_white_points("ASTM E308-01", 0.005);
}

static void chromaticity_of_a(void **state) {
  (void)state;
  /* CIE 15:2004 Table T.3: A is the only illuminant there without a table. */
  static const double printed[2][2] = {{0.44758, 0.40745}, {0.45117, 0.40594}};
  deviation d = {0};
  for (size_t k = 0; k < 2; ++k) {
    double xyz[3];
    white_point("A", k == 1, &cie_5nm, xyz);
    const double sum = xyz[0] + xyz[1] + xyz[2];
    for (size_t c = 0; c < 2; ++c) {
      deviation_add(&d, xyz[c] / sum, printed[k][c], k == 1 ? "10" : "2");
      assert_near(xyz[c] / sum, printed[k][c], 0.5e-5);
    }
  }
  deviation_print(&d, "x, y of A");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(illuminant_a_equals_its_table),
      cmocka_unit_test(daylight_formula_comes_to_the_d_series),
      cmocka_unit_test(white_points_of_the_cie),
      cmocka_unit_test(white_points_of_astm),
      cmocka_unit_test(chromaticity_of_a),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
