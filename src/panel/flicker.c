/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Flicker photometry: personal weights of L and M in luminance. */
#include "panel/panel_private.h"

#include <float.h>
#include <math.h>

#include <gsl/gsl_cdf.h>

typedef struct settings {
  size_t n;
  const double *l1, *m1, *l2, *m2;
} settings;

/* ln of the ratio of the two luminances at share s of L, and its derivative. */
static double residual(const settings *x, size_t i, double s, double *by_s) {
  const double first = s * x->l1[i] + (1 - s) * x->m1[i];
  const double second = s * x->l2[i] + (1 - s) * x->m2[i];
  *by_s = (x->l1[i] - x->m1[i]) / first - (x->l2[i] - x->m2[i]) / second;
  return log(first / second);
}

static double squares(const settings *x, double s, double *gradient,
                      double *curvature) {
  double sum = 0;
  *gradient = *curvature = 0;
  for (size_t i = 0; i < x->n; ++i) {
    double by_s;
    const double r = residual(x, i, s, &by_s);
    sum += r * r;
    *gradient += r * by_s;
    *curvature += by_s * by_s;
  }
  return sum;
}

/* Each residual is monotone in s: the least squares of their sum lie between
 * the shares that single settings ask for. Golden section from the best of a
 * grid, then Gauss-Newton to rounding. */
static double best_share(const settings *x) {
  enum { GRID = 1000 };
  double gradient, curvature, least = (double)INFINITY, s = 0;
  for (int i = 0; i <= GRID; ++i) {
    const double at = (double)i / GRID;
    const double value = squares(x, at, &gradient, &curvature);
    if (value >= least)
      continue;
    least = value;
    s = at;
  }
  for (int i = 0; i < 50; ++i) {
    squares(x, s, &gradient, &curvature);
    const double step = curvature > 0 ? -gradient / curvature : 0;
    const double next = fmin(fmax(s + step, 0), 1);
    if (fabs(next - s) <= DBL_EPSILON * 4)
      break;
    s = next;
  }
  return s;
}

static ef_status check(const settings *x, ef_error *error) {
  if (x->n < 2) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "%zu setting%s of least flicker: weights with an "
                         "interval need at least two",
                         x->n, x->n == 1 ? "" : "s");
  }
  for (size_t i = 0; i < x->n; ++i) {
    const bool is_good = x->l1[i] > 0 && x->m1[i] > 0 && x->l2[i] > 0 &&
                         x->m2[i] > 0 && isfinite(x->l1[i]) &&
                         isfinite(x->m1[i]) && isfinite(x->l2[i]) &&
                         isfinite(x->m2[i]);
    if (is_good)
      continue;
    ef__error_set(error, EF_MALFORMED,
                  "setting %zu: cone excitations %g, %g and %g, %g, expected "
                  "numbers above 0",
                  i + 1, x->l1[i], x->m1[i], x->l2[i], x->m2[i]);
    return ef__error_row(error, EF_MALFORMED, i + 1, "setting");
  }
  return EF_OK;
}

static double ratio_of(double share) {
  return share < 1 ? share / (1 - share) : (double)INFINITY;
}

ef_status ef_flicker_weights(size_t n, const double *first_l,
                             const double *first_m, const double *second_l,
                             const double *second_m, ef_flicker *out,
                             ef_error *error) {
  const settings x = {n, first_l, first_m, second_l, second_m};
  const ef_status status = check(&x, error);
  if (status != EF_OK)
    return status;
  ef__gsl_ready();
  const double s = best_share(&x);
  double gradient, curvature;
  const double sum = squares(&x, s, &gradient, &curvature);
  /* Lights of one chromaticity leave the rounding of their excitations. */
  if (!(curvature > 1e-12 * (double)n)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the two lights have the same L to M ratio in every "
                         "setting: flicker between lights of different colour, "
                         "red and green for instance, tells the weights");
  }
  if (s <= 0 || s >= 1) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the settings ask for weights of %s alone or beyond: "
                         "check that the lights, and which was adjusted, are "
                         "as recorded",
                         s <= 0 ? "M" : "L");
  }
  const double degrees = (double)(n - 1);
  out->n = n;
  out->residual = sqrt(sum / degrees);
  const double se = out->residual / sqrt(curvature);
  const double reach = se * gsl_cdf_tdist_Pinv(0.975, degrees);
  const double low = fmax(s - reach, 0), high = fmin(s + reach, 1);
  out->l_share = (ef_estimate){s, se, low, high};
  out->ratio = (ef_estimate){ratio_of(s), se / ((1 - s) * (1 - s)),
                             ratio_of(low), ratio_of(high)};
  return EF_OK;
}
