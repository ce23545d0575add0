/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Agreement of computed with seen differences. */
#include "panel/panel_private.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

ef_status ef_stress(size_t n, const double *computed, const double *seen,
                    double *stress, ef_error *error) {
  double ee = 0, ev = 0, vv = 0;
  for (size_t i = 0; i < n; ++i) {
    if (!isfinite(computed[i]) || !isfinite(seen[i])) {
      ef__error_set(error, EF_MALFORMED, "pair %zu has no difference", i + 1);
      return ef__error_row(error, EF_MALFORMED, i + 1, "difference");
    }
    ee += computed[i] * computed[i];
    ev += computed[i] * seen[i];
    vv += seen[i] * seen[i];
  }
  if (n < 2 || !(ev > 0)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "STRESS of %zu pair%s: expected at least two, with "
                         "differences above 0 on both sides",
                         n, n == 1 ? "" : "s");
  }
  /* sum (E - f V)^2 is summed, not expanded: it may be a small difference. */
  const double f = ee / ev;
  double square = 0;
  for (size_t i = 0; i < n; ++i) {
    const double off = computed[i] - f * seen[i];
    square += off * off;
  }
  *stress = 100 * sqrt(square / (f * f * vv));
  return EF_OK;
}

void ef_stress_compare(size_t n, double a, double b, double *f,
                       double *p_value) {
  ef__gsl_ready();
  const double degrees = (double)n - 1;
  *f = a == b ? 1 : a * a / (b * b); /* also two that are 0 */
  *p_value = 2 * fmin(gsl_cdf_fdist_P(*f, degrees, degrees),
                      gsl_cdf_fdist_Q(*f, degrees, degrees));
}
