/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The templates of CIE 170-1 as curves. Splines rather than the fifth-order
 * rule for spectra: the 1 nm tables of the CIE fundamentals were made by cubic
 * splines through these 5 nm values. */
#include <math.h>

#include "base/base_private.h"
#include "observer/model_private.h"

/* ---- Curves ------------------------------------------------------------ */

/* With unit steps and r_i = 6 (y_{i-1} - 2 y_i + y_{i+1}) the second
 * derivatives obey m_{i-1} + 4 m_i + m_{i+1} = r_i. No jump of the third
 * derivative at sample 1 means m_0 = 2 m_1 - m_2, so that 6 m_1 = r_1; at the
 * other end alike. The rest is a tridiagonal system of m_2 ... m_{n-3}. */
static void find_second(size_t n, const double *y, double *m) {
  double upper[EF__CURVE_ROOM];
  for (size_t i = 1; i + 1 < n; ++i) {
    m[i] = 6 * (y[i - 1] - 2 * y[i] + y[i + 1]);
  }
  m[1] /= 6;
  m[n - 2] /= 6;
  for (size_t i = 2; i + 2 < n; ++i) {
    const bool is_first = i == 2;
    const double pivot = is_first ? 4 : 4 - upper[i - 1];
    m[i] = (m[i] - m[i - 1] - (i + 3 == n ? m[n - 2] : 0)) / pivot;
    upper[i] = 1 / pivot;
  }
  for (size_t i = n - 3; i-- > 2;) m[i] -= upper[i] * m[i + 1];
  m[0] = 2 * m[1] - m[2];
  m[n - 1] = 2 * m[n - 2] - m[n - 3];
}

void ef__curve_fit(ef__curve *curve, size_t n, double start_nm, double step_nm,
                   const double *value) {
  curve->n = n;
  curve->start_nm = start_nm;
  curve->step_nm = step_nm;
  for (size_t i = 0; i < n; ++i) curve->value[i] = value[i];
  find_second(n, curve->value, curve->second);
}

/* Slopes per step at the two ends. */
static double first_slope(const ef__curve *c) {
  return c->value[1] - c->value[0] - (2 * c->second[0] + c->second[1]) / 6;
}

static double last_slope(const ef__curve *c) {
  const size_t k = c->n - 1;
  return c->value[k] - c->value[k - 1] +
         (2 * c->second[k] + c->second[k - 1]) / 6;
}

double ef__curve_at(const ef__curve *curve, double wavelength_nm) {
  const double at = (wavelength_nm - curve->start_nm) / curve->step_nm;
  const double last = (double)(curve->n - 1);
  if (at < 0) return curve->value[0] + at * first_slope(curve);
  if (at > last) return curve->value[curve->n - 1] +
                        (at - last) * last_slope(curve);
  const size_t i = at < last ? (size_t)at : curve->n - 2;
  const double b = at - (double)i;
  const double a = 1 - b;
  return a * curve->value[i] + b * curve->value[i + 1] +
         ((a * a * a - a) * curve->second[i] +
          (b * b * b - b) * curve->second[i + 1]) / 6;
}

/* ---- The published templates ------------------------------------------- */

/* Rows of `column` up to `last_nm`. */
static ef_status read_curve(const ef_table *table, const char *column,
                            double last_nm, ef__curve *curve, ef_error *error) {
  const size_t c = ef_table_column(table, column);
  const double *const wavelength = table->value;
  size_t n = 0;
  while (n < table->n_rows && wavelength[n] <= last_nm) ++n;
  if (c == SIZE_MAX || n < 5 || n > EF__CURVE_ROOM) {
    return ef__error_set(error, EF_MALFORMED,
                         "built-in table '%s' has no usable column '%s'",
                         table->name, column);
  }
  ef__curve_fit(curve, n, wavelength[0], wavelength[1] - wavelength[0],
                table->value + c * table->n_rows);
  return EF_OK;
}

ef_status ef__templates_read(ef__templates *templates, ef_error *error) {
  const ef_table *const cie = ef_table_find("cie-170-templates", error);
  const ef_table *const aging = ef_table_find("lens-age-1987", error);
  if (cie == NULL || aging == NULL) return EF_UNKNOWN_NAME;
  const struct {
    const ef_table *table;
    const char *column;
    double last_nm;
    ef__curve *curve;
  } wanted[] = {
      {cie, "lens_density", EF__TEMPLATE_LAST_NM, &templates->lens},
      {aging, "tl2", EF__TEMPLATE_LAST_NM, &templates->lens_fixed},
      {cie, "macular_density", EF__TEMPLATE_LAST_NM, &templates->macular},
      {cie, "log10_absorbance_l", EF__TEMPLATE_LAST_NM,
       &templates->log10_absorbance[0]},
      {cie, "log10_absorbance_m", EF__TEMPLATE_LAST_NM,
       &templates->log10_absorbance[1]},
      {cie, "log10_absorbance_s", EF__TEMPLATE_S_LAST_NM,
       &templates->log10_absorbance[2]},
  };
  for (size_t i = 0; i < sizeof wanted / sizeof *wanted; ++i) {
    const ef_status status = read_curve(wanted[i].table, wanted[i].column,
                                        wanted[i].last_nm, wanted[i].curve,
                                        error);
    if (status != EF_OK) return status;
  }
  return EF_OK;
}

/* Where the samples have come down to zero the spline would swing around it
 * by up to 1e-4. */
static double density_at(const ef__curve *curve, double wavelength_nm) {
  const double at = (wavelength_nm - curve->start_nm) / curve->step_nm;
  const double last = (double)(curve->n - 1);
  const double within = fmin(fmax(at, 0), last - 1);
  const size_t i = (size_t)within;
  if (curve->value[i] == 0 && curve->value[i + 1] == 0) return 0;
  return fmax(ef__curve_at(curve, wavelength_nm), 0);
}

/* The fixed part has no values below 400 nm: it goes on as a straight line
 * there, to 1.45 at 390 nm. Were it 0.1 more, a sensitivity at 80 years would
 * rise by half at 390 nm, where it is below a hundredth of its peak. */
ef__media ef__templates_media(const ef__templates *templates,
                              double wavelength_nm) {
  const double lens = density_at(&templates->lens, wavelength_nm);
  const double fixed =
      fmin(density_at(&templates->lens_fixed, wavelength_nm), lens);
  return (ef__media){.lens_aging = lens - fixed,
                     .lens_fixed = fixed,
                     .macular = density_at(&templates->macular, wavelength_nm)};
}
