/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The cone model of CIE 170-1:2006 and the matrices of CIE 170-2:2015 against
 * the fundamentals, densities and colour-matching functions published there. */
#include <stdlib.h>

#include <evenfield/observer.h>

#include "figures.h"
#include "near.h"

static const char *const cone_names[3] = {"L", "M", "S"};

static ef_cone_model model_of(double age_years, double field_deg) {
  ef_cone_model model = ef_cone_model_default();
  model.age_years = age_years;
  model.field_deg = field_deg;
  return model;
}

static void must(ef_status status, const ef_error *error) {
  if (status != EF_OK) fail_msg("%s", error->message);
}

/* ---- Fundamentals ------------------------------------------------------ */

/* The templates have four decimals: half a unit of the logarithm is 1.2e-4,
 * the lens twice that below 450 nm, and the densities of the equations differ
 * from the nominal ones of the tables by up to 0.1 %. 1e-3 covers the sum. */
static const double model_relative = 1e-3;

static void check_fundamentals(const char *table_name, double field_deg) {
  ef_error error;
  const ef_table *const table = ef_table_find(table_name, &error);
  assert_non_null(table);
  const ef_grid grid = ef_table_grid(table);
  double *const value = malloc(3 * grid.count * sizeof *value);
  const ef_cone_model model = model_of(32, field_deg);
  must(ef_cone_model_fundamentals(&model, EF_ENERGY, &grid, value, &error),
       &error);
  for (size_t cone = 0; cone < 3; ++cone) {
    deviation relative = {0}, absolute = {0};
    for (size_t i = 0; i < grid.count; ++i) {
      const double published = table->value[(cone + 1) * grid.count + i];
      const double own = value[cone * grid.count + i];
      const double nm = ef_grid_wavelength(&grid, i);
      char where[32];
      if (nm > 700) break;
      snprintf(where, sizeof where, "%g nm", nm);
      deviation_add(&absolute, own, published, where);
      if (published == 0) {
        assert_true(own == 0); /* S above 615 nm */
      } else {
        deviation_add(&relative, own / published, 1, where);
      }
    }
    printf("# %g degrees, %s: relative %.2g at %s, absolute %.2g at %s\n",
           field_deg, cone_names[cone], relative.largest, relative.where,
           absolute.largest, absolute.where);
    assert_near(relative.largest, 0, model_relative);
  }
  free(value);
}

static void fundamentals_at_32_years(void **state) {
  (void)state;
  check_fundamentals("cie-2006-2", 2);
  check_fundamentals("cie-2006-10", 10);
}

/* ---- Densities --------------------------------------------------------- */

/* CIE 170-1:2006, nominal values to the digits printed there. */
static void peak_densities(void **state) {
  (void)state;
  const struct {
    double field_deg, l, m, s, macular;
  } nominal[] = {{2, 0.50, 0.50, 0.40, 0.35}, {10, 0.38, 0.38, 0.30, 0.095}};
  const ef_grid at_460 = {.count = 1, .start_nm = 460};
  for (size_t k = 0; k < 2; ++k) {
    ef_error error;
    double density[3], macular;
    const ef_cone_model model = model_of(32, nominal[k].field_deg);
    must(ef_cone_model_peak_densities(&model, density, &error), &error);
    must(ef_cone_model_media(&model, &at_460, NULL, &macular, &error), &error);
    printf("# %g degrees: L %.5f M %.5f S %.5f macular %.5f\n",
           nominal[k].field_deg, density[0], density[1], density[2], macular);
    assert_near(density[0], nominal[k].l, 0.005);
    assert_near(density[1], nominal[k].m, 0.005);
    assert_near(density[2], nominal[k].s, 0.005);
    assert_near(macular, nominal[k].macular, k == 0 ? 0.005 : 0.0005);
  }
}

/* Pokorny, Smith & Lutze 1987: from 460 nm on all of the lens grows, by 1.56
 * to 60 years and 2.894 to 80; below, tl2 of their Table I stays: 1.000, 0.583
 * and 0.300 at 400, 410 and 420 nm. The total at 32 years is that of CIE
 * 170-1, 1.7649, 1.1374 and 0.7240 there and 0.2279 at 460 nm. */
static void lens_density_by_age(void **state) {
  (void)state;
  const struct {
    double nm, total, fixed;
  } at[] = {{400, 1.7649, 1.000}, {410, 1.1374, 0.583}, {420, 0.7240, 0.300},
            {460, 0.2279, 0},     {555, 0.0795, 0}};
  const struct {
    double age_years, factor;
  } age[] = {{20, 0.76}, {32, 1}, {60, 1.56}, {70, 2.227}, {80, 2.894}};
  for (size_t i = 0; i < sizeof at / sizeof *at; ++i) {
    for (size_t k = 0; k < sizeof age / sizeof *age; ++k) {
      ef_error error;
      double lens;
      const ef_grid grid = {.count = 1, .start_nm = at[i].nm};
      const ef_cone_model model = model_of(age[k].age_years, 2);
      must(ef_cone_model_media(&model, &grid, &lens, NULL, &error), &error);
      const double expected =
          age[k].factor * (at[i].total - at[i].fixed) + at[i].fixed;
      /* The spline of tl2 swings by less than 1e-4 where it has reached 0. */
      assert_near(lens, expected, 2e-4);
    }
  }
}

/* ---- Colour-matching functions ----------------------------------------- */

/* The model's own functions against the tables of the CIE at 5 nm. The
 * fundamentals are within 4e-4 of a peak of 1, the coefficients of x sum to 3.7
 * in size. */
static void check_tristimulus(const char *file, double field_deg) {
  figures f = figures_read("published", file);
  const ef_grid grid = {.count = f.n_rows, .start_nm = 390, .step_nm = 5};
  double *const value = malloc(3 * grid.count * sizeof *value);
  const ef_cone_model model = model_of(32, field_deg);
  ef_error error;
  deviation off = {0};
  must(ef_cone_model_tristimulus(&model, &grid, value, &error), &error);
  for (size_t i = 0; i < grid.count; ++i) {
    for (size_t c = 0; c < 3; ++c) {
      char where[64];
      snprintf(where, sizeof where, "%c_bar %g nm", "xyz"[c],
               figures_number(&f, i, 0));
      deviation_add(&off, value[c * grid.count + i],
                    figures_number(&f, i, 1 + c), where);
    }
  }
  char what[64];
  snprintf(what, sizeof what, "%g degrees, model against x_F, y_F, z_F",
           field_deg);
  deviation_print(&off, what);
  assert_near(off.largest, 0, 1.5e-3);
  free(value);
  figures_free(&f);
}

static void tristimulus_functions_at_32_years(void **state) {
  (void)state;
  check_tristimulus("cie-2015-2-5nm.csv", 2);
  check_tristimulus("cie-2015-10-5nm.csv", 10);
}

/* CIE 170-2:2015: x = y = 1/3. At 2 and 10 degrees the matrix is the CIE's and
 * the functions are the model's; between, the matrix is ours. */
static void equal_energy_spectrum_is_neutral(void **state) {
  (void)state;
  const ef_grid grid = {.count = 441, .start_nm = 390, .step_nm = 1};
  double *const value = malloc(3 * grid.count * sizeof *value);
  const double field_deg[] = {1, 1.5, 2, 3, 4, 5, 6, 8, 10};
  for (size_t k = 0; k < sizeof field_deg / sizeof *field_deg; ++k) {
    ef_error error;
    const ef_cone_model model = model_of(32, field_deg[k]);
    double sum[3] = {0};
    must(ef_cone_model_tristimulus(&model, &grid, value, &error), &error);
    for (size_t c = 0; c < 3; ++c) {
      for (size_t i = 0; i < grid.count; ++i) {
        sum[c] += value[c * grid.count + i];
      }
    }
    const double total = sum[0] + sum[1] + sum[2];
    printf("# %g degrees: equal-energy x %.6f y %.6f\n", field_deg[k],
           sum[0] / total, sum[1] / total);
    /* 3e-4 of a sum: what the templates leave (see above). */
    assert_near(sum[0] / total, 1.0 / 3, 1e-4);
    assert_near(sum[1] / total, 1.0 / 3, 1e-4);
  }
  free(value);
}

/* Matrix and K_m of the two fields that are published, in every digit. */
static void published_matrices(void **state) {
  (void)state;
  const double two[9] = {1.94735469, -1.41445123, 0.36476327, 0.68990272,
                         0.34832189, 0, 0, 0, 1.93485343};
  const double ten[9] = {1.93986443, -1.34664359, 0.43044935, 0.69283932,
                         0.34967567, 0, 0, 0, 2.14687945};
  double matrix[9], k_m;
  ef_error error;
  must(ef_cone_xyz_matrix(2, matrix, &k_m, &error), &error);
  assert_same_bits(matrix, two, 9);
  assert_true(k_m == 683.358);
  must(ef_cone_xyz_matrix(10, matrix, &k_m, &error), &error);
  assert_same_bits(matrix, ten, 9);
  assert_true(k_m == 683.599);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(fundamentals_at_32_years),
      cmocka_unit_test(peak_densities),
      cmocka_unit_test(lens_density_by_age),
      cmocka_unit_test(tristimulus_functions_at_32_years),
      cmocka_unit_test(equal_energy_spectrum_is_neutral),
      cmocka_unit_test(published_matrices),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
