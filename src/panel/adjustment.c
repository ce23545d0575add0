/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Method of adjustment: settings made by hand. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>

#include <gsl/gsl_cdf.h>

#define PROBABLE_ERROR 0.67448975019608174320 /* z(0.75) */

ef_status ef_adjustment_summary(size_t n, const double *setting,
                                double standard, ef_adjustment *out,
                                ef_error *error) {
  if (n < 2) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "%zu setting%s: a spread needs at least two", n,
                         n == 1 ? "" : "s");
  }
  double mean = 0;
  for (size_t i = 0; i < n; ++i) {
    if (!isfinite(setting[i])) {
      ef__error_set(error, EF_MALFORMED, "setting %zu is not a number", i + 1);
      return ef__error_row(error, EF_MALFORMED, i + 1, "setting");
    }
    mean += setting[i] / (double)n;
  }
  double square = 0, largest = 0;
  for (size_t i = 0; i < n; ++i) {
    square += (setting[i] - mean) * (setting[i] - mean);
    largest = fmax(largest, fabs(setting[i]));
  }
  const double degrees = (double)(n - 1);
  const double spread = sqrt(square / degrees);
  /* Equal settings leave the rounding of their mean. */
  if (!(spread > 4 * DBL_EPSILON * largest)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "all %zu settings are %g: no spread to take a JND "
                         "from; record them with more digits",
                         n, setting[0]);
  }
  ef__gsl_ready();
  const double se = spread / sqrt((double)n);
  const double reach = se * gsl_cdf_tdist_Pinv(0.975, degrees);
  out->n = n;
  out->equality = (ef_estimate){mean, se, mean - reach, mean + reach};
  const double off = mean - standard;
  out->error = (ef_estimate){off, se, off - reach, off + reach};
  out->spread = (ef_estimate){
      spread, spread / sqrt(2 * degrees),
      spread * sqrt(degrees / gsl_cdf_chisq_Pinv(0.975, degrees)),
      spread * sqrt(degrees / gsl_cdf_chisq_Pinv(0.025, degrees))};
  out->jnd = PROBABLE_ERROR * spread;
  return EF_OK;
}
