/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Chromatic adaptation: the responses of three cone-like channels are scaled
 * by the ratio of the two whites (von Kries). */
#include <evenfield/colour.h>

#include "base/base_private.h"

#include <string.h>

/* XYZ to sharpened cone responses. */
static const double bradford[9] = { /* Lam 1985; linear form: ICC.1:2022 E */
    0.8951,  0.2664,  -0.1614,
    -0.7502, 1.7135,  0.0367,
    0.0389,  -0.0685, 1.0296};
static const double cat16[9] = { /* Li et al. 2017; CIE 248:2022 */
    0.401288,  0.650173, -0.051461,
    -0.250268, 1.204414, 0.045854,
    -0.002079, 0.048952, 0.953127};

static const char *const names[] = {
    [EF_ADAPT_NONE] = "none",
    [EF_ADAPT_BRADFORD] = "bradford",
    [EF_ADAPT_CAT16] = "cat16",
};
enum { N_NAMES = sizeof names / sizeof *names };

const char *ef_adaptation_name(ef_adaptation adaptation) {
  return (size_t)adaptation < N_NAMES ? names[adaptation] : "unknown";
}

ef_status ef_adaptation_find(const char *name, ef_adaptation *out,
                             ef_error *error) {
  for (size_t i = 0; i < N_NAMES; ++i) {
    if (!ef__name_equal(name, names[i])) continue;
    *out = (ef_adaptation)i;
    return EF_OK;
  }
  return ef__error_unknown(error, "adaptation", name, names, N_NAMES);
}

static bool is_positive(const double response[3]) {
  return response[0] > 0 && response[1] > 0 && response[2] > 0;
}

static bool same_white(ef_xyz a, ef_xyz b) {
  return a.X == b.X && a.Y == b.Y && a.Z == b.Z;
}

static void set_diagonal(double matrix[9], double value) {
  for (int i = 0; i < 9; ++i) matrix[i] = i % 4 == 0 ? value : 0;
}

/* cone^-1 diag(to / from) cone. */
static ef_status scale_responses(const double cone[9], ef_xyz from, ef_xyz to,
                                 double matrix[9], ef_error *error) {
  const double white[2][3] = {{from.X, from.Y, from.Z}, {to.X, to.Y, to.Z}};
  double response[2][3];
  for (int i = 0; i < 2; ++i) {
    ef__mat3_apply(cone, white[i], response[i]);
    if (is_positive(response[i])) continue;
    return ef__error_set(error, EF_INVALID,
                         "white X %g, Y %g, Z %g has a cone response that is "
                         "not positive, so nothing can be adapted to it",
                         white[i][0], white[i][1], white[i][2]);
  }
  double inverse[9];
  ef__mat3_inverse(cone, inverse); /* both matrices are well conditioned */
  double scaled[9];
  for (int i = 0; i < 9; ++i) {
    scaled[i] = cone[i] * response[1][i / 3] / response[0][i / 3];
  }
  ef__mat3_multiply(inverse, scaled, matrix);
  return EF_OK;
}

ef_status ef_adaptation_matrix(ef_adaptation adaptation, ef_xyz from,
                               ef_xyz to, double matrix[9], ef_error *error) {
  if ((size_t)adaptation >= N_NAMES) {
    return ef__error_set(error, EF_INVALID, "adaptation %d is not defined",
                         (int)adaptation);
  }
  if (!(from.Y > 0 && to.Y > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "Y of the two whites is %g and %g; both must be "
                         "above zero",
                         from.Y, to.Y);
  }
  if (adaptation == EF_ADAPT_NONE) {
    set_diagonal(matrix, to.Y / from.Y);
    return EF_OK;
  }
  const double *const cone =
      adaptation == EF_ADAPT_BRADFORD ? bradford : cat16;
  double scaled[9];
  const ef_status status = scale_responses(cone, from, to, scaled, error);
  if (status != EF_OK) return status;
  /* One white: the identity to the last bit. */
  if (same_white(from, to)) set_diagonal(scaled, 1);
  memcpy(matrix, scaled, sizeof scaled);
  return EF_OK;
}
