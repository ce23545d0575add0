/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

#define SQRT_2 1.4142135623730950488
#define INVERSE_SQRT_2_PI 0.39894228040143267794

double ef__phi(double x) {
  return INVERSE_SQRT_2_PI * exp(-0.5 * x * x);
}

double ef__normal(double x) {
  return 0.5 * erfc(-x / SQRT_2);
}

double ef__normal_inverse(double p) {
  if (p <= 0)
    return -(double)INFINITY;
  if (p >= 1)
    return (double)INFINITY;
  ef__gsl_ready();
  return gsl_cdf_ugaussian_Pinv(p);
}
