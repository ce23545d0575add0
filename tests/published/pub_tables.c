/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The built-in tables against sums, peaks and relations that were published
 * with them. pub_checksums.py compares the CIE data sets digit by digit. */
#include "near.h"

#include "figures.h"

#include <evenfield/spectrum.h>

/* ---- Access ------------------------------------------------------------ */

static const ef_table *find(const char *name) {
  ef_error error;
  const ef_table *table = ef_table_find(name, &error);
  if (table == NULL)
    fail_msg("%s", error.message);
  return table;
}

static const double *column(const ef_table *table, const char *name) {
  const size_t c = ef_table_column(table, name);
  if (c == SIZE_MAX)
    fail_msg("%s has no column %s", table->name, name);
  return table->value + c * table->n_rows;
}

/* Row of a whole number of nm; SIZE_MAX outside the table. */
static size_t row_at(const ef_table *table, int nm) {
  const double *w = table->value;
  for (size_t r = 0; r < table->n_rows; ++r) {
    if ((int)lround(w[r]) == nm)
      return r;
  }
  return SIZE_MAX;
}

static double value_at(const char *table_name, const char *column_name,
                       int nm) {
  const ef_table *table = find(table_name);
  const size_t r = row_at(table, nm);
  return r == SIZE_MAX ? 0 : column(table, column_name)[r];
}

static double sum(const char *table_name, const char *column_name, int from,
                  int to, int step) {
  double total = 0;
  for (int nm = from; nm <= to; nm += step) {
    total += value_at(table_name, column_name, nm);
  }
  return total;
}

/* Half a unit of the last of `decimals` printed decimals, and what adding up
 * some hundred doubles of about 100 can be off. */
static double half_unit(int decimals) {
  return 0.5 * pow(10, -decimals) + 1e-11;
}

/* ---- Sums and peaks ---------------------------------------------------- */

typedef struct sum_figure {
  const char *table;
  const char *column;
  int from_nm;
  int to_nm;
  int step_nm;
  double sum;
  int decimals;
  const char *source;
} sum_figure;

/* The observers' sums were kept with copies of the official tables; that the
 * CIE prints them was not verified, so they check typing, not the CIE. */
#define OBSERVER "kept with the tables of ISO/CIE 11664-1:2019"
#define METADATA "metadata of the CIE data set"

static const sum_figure sum_figures[] = {
    {"cie-1931", "x_bar", 360, 830, 1, 106.865469, 6, OBSERVER},
    {"cie-1931", "y_bar", 360, 830, 1, 106.856917, 6, OBSERVER},
    {"cie-1931", "z_bar", 360, 830, 1, 106.892251, 6, OBSERVER},
    {"cie-1931", "x_bar", 380, 780, 5, 21.371525, 6, OBSERVER},
    {"cie-1931", "y_bar", 380, 780, 5, 21.371328, 6, OBSERVER},
    {"cie-1931", "z_bar", 380, 780, 5, 21.371540, 6, OBSERVER},
    {"cie-1964", "x_bar", 360, 830, 1, 116.648520, 6, OBSERVER},
    {"cie-1964", "y_bar", 360, 830, 1, 116.661877, 6, OBSERVER},
    {"cie-1964", "z_bar", 360, 830, 1, 116.673981, 6, OBSERVER},
    {"cie-1964", "x_bar", 380, 780, 5, 23.329353, 6, OBSERVER},
    {"cie-1964", "y_bar", 380, 780, 5, 23.332038, 6, OBSERVER},
    {"cie-1964", "z_bar", 380, 780, 5, 23.334153, 6, OBSERVER},
    {"daylight-components", "S0", 300, 830, 5, 8715.51, 2, METADATA},
    {"daylight-components", "S1", 300, 830, 5, 890.13, 2, METADATA},
    {"daylight-components", "S2", 300, 830, 5, 374.95, 2, METADATA},
    {"cie-hp", "HP1", 380, 780, 5, 2534.73, 2, METADATA},
};

static void test_sums(void **state) {
  (void)state;
  deviation d = {0};
  for (size_t i = 0; i < sizeof sum_figures / sizeof *sum_figures; ++i) {
    const sum_figure *f = &sum_figures[i];
    const double total =
        sum(f->table, f->column, f->from_nm, f->to_nm, f->step_nm);
    char where[96];
    snprintf(where, sizeof where, "%s %s (%s)", f->table, f->column, f->source);
    deviation_add(&d, total, f->sum, where);
    assert_near(total, f->sum, half_unit(f->decimals));
  }
  deviation_print(&d, "column sums");
}

typedef struct peak_figure {
  const char *table;
  const char *column;
  int nm; /* where it is largest */
  double peak;
  const char *source;
} peak_figure;

static const peak_figure peak_figures[] = {
    {"cie-1931", "y_bar", 555, 1, "ISO/CIE 11664-1:2019"},
    {"cie-1964", "y_bar", 557, 1, "ISO/CIE 11664-1:2019"},
    {"scotopic-1951", "v_prime", 507, 1, "CIE 018:2019"},
    {"cie-s026", "rhodopic", 507, 1, "CIE S 026:2018"},
    {"cie-s026", "melanopic", 490, 1, "CIE S 026:2018"},
    {"cie-170-templates", "macular_density", 460, 0.35, "CIE 170-1:2006"},
    {"retinal-hazard", "B", 435, 1, "IEC 62471:2006 Table 4.2"},
    {"retinal-hazard", "R_iec", 435, 10, "IEC 62471:2006 Table 4.2"},
};

static void test_peaks(void **state) {
  (void)state;
  for (size_t i = 0; i < sizeof peak_figures / sizeof *peak_figures; ++i) {
    const peak_figure *f = &peak_figures[i];
    const ef_table *table = find(f->table);
    const double *value = column(table, f->column);
    for (size_t r = 0; r < table->n_rows; ++r) {
      if (value[r] > f->peak)
        fail_msg("%s exceeds its peak", f->column);
    }
    assert_near(value[row_at(table, f->nm)], f->peak, 0);
  }
}

/* CIE 170-1:2006: every fundamental is 1 at its peak, found to the nearest
 * 0.1 nm. The largest 1 nm value is then at most 0.55 nm away from there and
 * falls short of 1 by at most half the curvature times 0.55^2. */
static void test_cone_peaks(void **state) {
  (void)state;
  static const char *const table_name[] = {"cie-2006-2", "cie-2006-10"};
  static const char *const column_name[] = {"l_bar", "m_bar", "s_bar"};
  static const int peak_nm[2][3] = {{570, 543, 442}, {569, 541, 448}};
  deviation d = {0};
  for (size_t t = 0; t < 2; ++t) {
    const ef_table *table = find(table_name[t]);
    for (size_t c = 0; c < 3; ++c) {
      const double *v = column(table, column_name[c]);
      const size_t p = row_at(table, peak_nm[t][c]);
      for (size_t r = 0; r < table->n_rows; ++r)
        assert_true(v[r] <= v[p]);
      const double curvature = 2 * v[p] - v[p - 1] - v[p + 1];
      deviation_add(&d, v[p], 1, column_name[c]);
      assert_near(v[p], 1, 0.5 * curvature * 0.55 * 0.55);
    }
  }
  deviation_print(&d, "largest 1 nm value of the cone fundamentals from 1");
}

/* Lights are 100 at 560 nm (ISO/CIE 11664-2:2022, CIE 015:2018). */
static void test_hundred_at_560(void **state) {
  (void)state;
  assert_near(value_at("cie-d50", "D50", 560), 100, 0);
  assert_near(value_at("cie-d55", "D55", 560), 100, 0);
  assert_near(value_at("cie-d65", "D65", 560), 100, 0);
  assert_near(value_at("cie-d75", "D75", 560), 100, 0);
  assert_near(value_at("daylight-components", "S0", 560), 100, 0);
  assert_near(value_at("daylight-components", "S1", 560), 0, 0);
  assert_near(value_at("daylight-components", "S2", 560), 0, 0);
}

/* ---- Cone fundamentals and CIE 170-2:2015 ------------------------------ */

/* CIE 170-2:2015: tristimulus functions from the cone fundamentals. */
static const double lms_to_xyz[2][3][3] = {
    {{1.94735469, -1.41445123, 0.36476327},
     {0.68990272, 0.34832189, 0},
     {0, 0, 1.93485343}},
    {{1.93986443, -1.34664359, 0.43044935},
     {0.69283932, 0.34967567, 0},
     {0, 0, 2.14687945}},
};
static const char *const cone_table[2] = {"cie-2006-2", "cie-2006-10"};

static void xyz_at(size_t field, int nm, double xyz[3]) {
  const ef_table *cones = find(cone_table[field]);
  const size_t r = row_at(cones, nm);
  for (size_t i = 0; i < 3; ++i) {
    xyz[i] = 0;
    for (size_t j = 0; j < 3; ++j) {
      xyz[i] +=
          lms_to_xyz[field][i][j] * cones->value[(j + 1) * cones->n_rows + r];
    }
  }
}

/* CIE 170-2:2015 Tables 10.7a and 10.8, the CSV files beside this one. 1.4e-6
 * is what the six figures of the cone tables and the seven of the check tables
 * leave: half a unit of the sixth figure, 5e-7, times the absolute sum of a
 * matrix row (3.73 at most) would be 1.9e-6. */
static void test_cie_2015_functions(void **state) {
  (void)state;
  static const char *const file[2] = {"cie-2015-2-5nm.csv",
                                      "cie-2015-10-5nm.csv"};
  for (size_t field = 0; field < 2; ++field) {
    figures f = figures_read("published", file[field]);
    assert_int_equal(f.n_rows, 89);
    deviation d = {0};
    for (size_t r = 0; r < f.n_rows; ++r) {
      double xyz[3];
      xyz_at(field, (int)figures_number(&f, r, 0), xyz);
      for (size_t c = 0; c < 3; ++c) {
        const double printed = figures_number(&f, r, c + 1);
        deviation_add(&d, xyz[c], printed, figures_text(&f, r, 0));
        assert_near(xyz[c], printed, 1.4e-6);
      }
    }
    deviation_print(&d, file[field]);
    figures_free(&f);
  }
}

/* CIE 170-2:2015: equal energy is neutral, so the three sums are equal. The
 * matrices have eight decimals and the cone tables six figures: rounding makes
 * some 1e-5 in sums of 441 values up to 1. */
static void test_cie_2015_sums(void **state) {
  (void)state;
  static const double expected[2] = {113.0423, 118.5181};
  deviation d = {0};
  for (size_t field = 0; field < 2; ++field) {
    double total[3] = {0, 0, 0};
    for (int nm = 390; nm <= 830; ++nm) {
      double xyz[3];
      xyz_at(field, nm, xyz);
      for (size_t c = 0; c < 3; ++c)
        total[c] += xyz[c];
    }
    for (size_t c = 0; c < 3; ++c) {
      deviation_add(&d, total[c], total[1], cone_table[field]);
      assert_near(total[c], total[1], 2e-5);
      assert_near(total[c], expected[field], half_unit(4));
    }
  }
  deviation_print(&d, "sums of the CIE 2015 functions from each other");
}

/* CIE 170-1:2006 equations: the fundamentals of both fields from the templates
 * with the nominal peak densities. The templates have four decimals: half a
 * unit in lens, macular pigment and absorbance is 3 x 5e-5 x ln 10 = 3.5e-4
 * relative, and the same again for the absorbance at the peak. */
static double cone_from_templates(int nm, size_t cone, double density,
                                  double macular_peak) {
  static const char *const absorbance[] = {
      "log10_absorbance_l", "log10_absorbance_m", "log10_absorbance_s"};
  const char *t = "cie-170-templates";
  const double a = pow(10, value_at(t, absorbance[cone], nm));
  const double media = value_at(t, "lens_density", nm) +
                       value_at(t, "macular_density", nm) * macular_peak / 0.35;
  return nm * (1 - pow(10, -density * a)) * pow(10, -media);
}

static void test_templates(void **state) {
  (void)state;
  static const double density[2][3] = {{0.50, 0.50, 0.40}, {0.38, 0.38, 0.30}};
  static const double macular[2] = {0.35, 0.095};
  static const char *const bar[] = {"l_bar", "m_bar", "s_bar"};
  static const int scale_nm[3] = {570, 540, 445}; /* a row near the peak */
  deviation d = {0};
  for (size_t field = 0; field < 2; ++field) {
    for (size_t c = 0; c < 3; ++c) {
      const double dens = density[field][c], mac = macular[field];
      const double scale = value_at(cone_table[field], bar[c], scale_nm[c]) /
                           cone_from_templates(scale_nm[c], c, dens, mac);
      for (int nm = 390; nm <= (c == 2 ? 615 : 700); nm += 5) {
        const double ratio = scale * cone_from_templates(nm, c, dens, mac) /
                             value_at(cone_table[field], bar[c], nm);
        char where[96];
        snprintf(where, sizeof where, "%s %d nm", bar[c], nm);
        deviation_add(&d, ratio, 1, where);
        assert_near(ratio, 1, 7e-4);
      }
    }
  }
  deviation_print(&d, "fundamentals from the templates, relative");
}

/* ---- CIE S 026 --------------------------------------------------------- */

/* CIE S 026:2018: the cones are those of 10 degrees, rhodopic is V'. */
static void test_s026_columns(void **state) {
  (void)state;
  for (int nm = 380; nm <= 780; ++nm) {
    assert_near(value_at("cie-s026", "l_cone", nm),
                value_at("cie-2006-10", "l_bar", nm), 0);
    assert_near(value_at("cie-s026", "m_cone", nm),
                value_at("cie-2006-10", "m_bar", nm), 0);
    assert_near(value_at("cie-s026", "s_cone", nm),
                value_at("cie-2006-10", "s_bar", nm), 0);
    assert_near(value_at("cie-s026", "rhodopic", nm),
                value_at("scotopic-1951", "v_prime", nm), 0);
  }
}

/* CIE S 026:2018: efficacies of D65 in mW/lm, sums at 1 nm. The melanopic
 * column has three figures only; it moves the result by up to a unit. */
static void test_s026_efficacies(void **state) {
  (void)state;
  static const struct {
    const char *column;
    double mw_per_lm, tolerance;
  } figure[] = {
      {"s_cone", 0.8173, 0.5e-4},    {"m_cone", 1.4558, 0.5e-4},
      {"l_cone", 1.6289, 0.5e-4},    {"rhodopic", 1.4497, 0.5e-4},
      {"melanopic", 1.3262, 1.0e-4},
  };
  double lumens = 0;
  for (int nm = 380; nm <= 780; ++nm) {
    /* 683 lm/W at 555.016 nm of air, so 683.002 at the peak: CIE 018:2019 */
    lumens += 683.002 * value_at("cie-d65", "D65", nm) *
              value_at("cie-1931", "y_bar", nm);
  }
  deviation d = {0};
  for (size_t i = 0; i < sizeof figure / sizeof *figure; ++i) {
    double watts = 0;
    for (int nm = 380; nm <= 780; ++nm) {
      watts += value_at("cie-d65", "D65", nm) *
               value_at("cie-s026", figure[i].column, nm);
    }
    const double efficacy = 1000 * watts / lumens;
    deviation_add(&d, efficacy, figure[i].mw_per_lm, figure[i].column);
    assert_near(efficacy, figure[i].mw_per_lm, figure[i].tolerance);
  }
  deviation_print(&d, "efficacies of D65, mW/lm");
}

/* ---- Illuminants ------------------------------------------------------- */

/* CIE 015:2018: a D illuminant is S0 + M1 S1 + M2 S2 with M1, M2 of three
 * decimals, rounded. Only D65 (at 1 nm) is rounded at whole tens of nm first,
 * then drawn straight from one rounded entry to the next and rounded again. */
typedef struct d_figure {
  const char *table;
  const char *column;
  double m1, m2;
  int to_nm, step_nm;
  int figures; /* significant figures printed, 0: three decimals */
  bool from_rounded;
} d_figure;

static const d_figure d_figures[] = {
    {"cie-d50", "D50", -1.039, 0.363, 830, 1, 6, false},
    {"cie-d55", "D55", -0.785, -0.198, 780, 5, 0, false},
    {"cie-d65", "D65", -0.295, -0.689, 830, 1, 6, true},
    {"cie-d75", "D75", 0.145, -0.760, 780, 5, 0, false},
};

static double daylight(const d_figure *f, int nm) {
  const char *t = "daylight-components";
  return value_at(t, "S0", nm) + f->m1 * value_at(t, "S1", nm) +
         f->m2 * value_at(t, "S2", nm);
}

static double d_value(const d_figure *f, int nm) {
  const int low = nm - nm % 10;
  const double part = nm % 10 / 10.0;
  if (part == 0)
    return daylight(f, nm);
  if (f->from_rounded) {
    return (1 - part) * value_at(f->table, f->column, low) +
           part * value_at(f->table, f->column, low + 10);
  }
  return (1 - part) * daylight(f, low) + part * daylight(f, low + 10);
}

static void test_d_series(void **state) {
  (void)state;
  deviation d = {0};
  for (size_t i = 0; i < sizeof d_figures / sizeof *d_figures; ++i) {
    const d_figure *f = &d_figures[i];
    for (int nm = 300; nm <= f->to_nm; nm += f->step_nm) {
      const double value = d_value(f, nm);
      const double printed = value_at(f->table, f->column, nm);
      const int decimals =
          f->figures ? f->figures - 1 - (int)floor(log10(value)) : 3;
      char where[96];
      snprintf(where, sizeof where, "%s %d nm", f->column, nm);
      const double unit = pow(10, -decimals);
      deviation_add(&d, value / unit, printed / unit, where);
      assert_near(printed, value, half_unit(decimals));
    }
  }
  deviation_print(&d, "D50 to D75 from the components, in last-digit units");
}

/* Name of the table that has a column for this illuminant. */
static const ef_table *illuminant_table(const char *name) {
  for (size_t i = 0; i < ef_table_count(); ++i) {
    const ef_table *t = ef_table_at(i);
    if (strcmp(t->group, "illuminants") == 0 &&
        ef_table_column(t, name) != SIZE_MAX) {
      return t;
    }
  }
  fail_msg("no illuminant %s", name);
  return NULL;
}

static void chromaticity(const char *illuminant, const char *observer, int from,
                         int to, int step, double xy[2]) {
  static const char *const bar[] = {"x_bar", "y_bar", "z_bar"};
  const ef_table *t = illuminant_table(illuminant);
  double xyz[3] = {0, 0, 0};
  for (int nm = from; nm <= to; nm += step) {
    const double power = value_at(t->name, illuminant, nm);
    for (size_t c = 0; c < 3; ++c) {
      xyz[c] += power * value_at(observer, bar[c], nm);
    }
  }
  xy[0] = xyz[0] / (xyz[0] + xyz[1] + xyz[2]);
  xy[1] = xyz[1] / (xyz[0] + xyz[1] + xyz[2]);
}

/* One printed chromaticity against `xy`, in units of its last digit. */
static void check_xy(const figures *f, size_t row, size_t column,
                     const double xy[2], deviation *d) {
  const char *name = figures_text(f, row, 0);
  const double unit = strlen(figures_text(f, row, column)) > 6 ? 1e-5 : 1e-4;
  /* Printed values are rounded: half a unit. FL3.13 alone is off by 0.52. */
  const double allowed = strcmp(name, "FL3.13") == 0 ? 0.53 : 0.5;
  for (size_t i = 0; i < 2; ++i) {
    const double printed = figures_number(f, row, column + i);
    deviation_add(d, xy[i] / unit, printed / unit, name);
    assert_near(xy[i] / unit, printed / unit, allowed);
  }
}

static void test_chromaticities(void **state) {
  (void)state;
  figures f = figures_read("published", "illuminant-chromaticities.csv");
  assert_int_equal(f.n_rows, 42);
  const size_t step_column = figures_column(&f, "step_10deg_nm");
  deviation d = {0};
  for (size_t r = 0; r < f.n_rows; ++r) {
    const char *name = figures_text(&f, r, 0);
    double xy[2];
    chromaticity(name, "cie-1931", 380, 780, 5, xy);
    check_xy(&f, r, figures_column(&f, "x_2deg"), xy, &d);
    const double step = figures_number(&f, r, step_column);
    if (isnan(step))
      continue;
    if (step == 1)
      chromaticity(name, "cie-1964", 360, 830, 1, xy);
    else
      chromaticity(name, "cie-1964", 380, 780, 5, xy);
    check_xy(&f, r, figures_column(&f, "x_10deg"), xy, &d);
  }
  deviation_print(&d, "chromaticities, in units of the last printed digit");
  figures_free(&f);
}

/* ---- Hazard weights ---------------------------------------------------- */

/* IEC 62471:2006 Table 4.2 prints these ranges as formulas. */
static double hazard_b(double nm) {
  return nm <= 600 ? pow(10, (450 - nm) / 50) : 0.001;
}

static double hazard_r(double nm) {
  if (nm <= 1050)
    return pow(10, (700 - nm) / 500);
  if (nm <= 1150)
    return 0.2;
  return nm <= 1200 ? 0.2 * pow(10, 0.02 * (1150 - nm)) : 0.02;
}

static void test_hazard_formulas(void **state) {
  (void)state;
  const double four_figures = 0.5e-3; /* half a unit of the fourth figure */
  const char *t = "retinal-hazard";
  for (int nm = 505; nm <= 700; nm += 5) {
    assert_near_relative(value_at(t, "B", nm), hazard_b(nm), four_figures);
  }
  for (int nm = 700; nm <= 1400; nm += 5) {
    const double r = hazard_r(nm);
    assert_near_relative(value_at(t, "R_iec", nm), r, four_figures);
    assert_near_relative(value_at(t, "R_icnirp", nm), r, four_figures);
  }
  /* The same table: R is ten times B up to 500 nm. */
  for (int nm = 380; nm <= 500; nm += 5) {
    assert_near_relative(value_at(t, "R_iec", nm), 10 * value_at(t, "B", nm),
                         1e-15);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_sums),
      cmocka_unit_test(test_peaks),
      cmocka_unit_test(test_cone_peaks),
      cmocka_unit_test(test_hundred_at_560),
      cmocka_unit_test(test_cie_2015_functions),
      cmocka_unit_test(test_cie_2015_sums),
      cmocka_unit_test(test_templates),
      cmocka_unit_test(test_s026_columns),
      cmocka_unit_test(test_s026_efficacies),
      cmocka_unit_test(test_d_series),
      cmocka_unit_test(test_chromaticities),
      cmocka_unit_test(test_hazard_formulas),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests_name("pub_tables", tests, NULL, NULL);
}
