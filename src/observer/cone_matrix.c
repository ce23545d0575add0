/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From an observer's tristimulus values to its cone excitations. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/observer_private.h"

/* Normal equations of the cones on the colour-matching functions. */
static bool solve(const ef_channels *xyz, const ef_channels *lms,
                  double matrix[9]) {
  const size_t n = xyz->grid.count;
  double left[9] = {0}, right[9] = {0}, rows[9];
  for (size_t s = 0; s < n; ++s) {
    for (size_t i = 0; i < 3; ++i) {
      for (size_t k = 0; k < 3; ++k) {
        const double function = xyz->value[i * n + s];
        left[3 * i + k] += function * xyz->value[k * n + s];
        right[3 * i + k] += function * lms->value[k * n + s];
      }
    }
  }
  memcpy(rows, right, sizeof rows);
  if (!ef__solve(3, left, 3, rows))
    return false;
  ef__mat3_transpose(rows, matrix);
  return true;
}

static double largest_residual(const ef_channels *xyz, const ef_channels *lms,
                               const double matrix[9]) {
  const size_t n = xyz->grid.count;
  double largest = 0;
  for (size_t s = 0; s < n; ++s) {
    for (size_t i = 0; i < 3; ++i) {
      double sum = -lms->value[i * n + s];
      for (size_t k = 0; k < 3; ++k)
        sum += matrix[3 * i + k] * xyz->value[k * n + s];
      largest = fmax(largest, fabs(sum));
    }
  }
  return largest;
}

ef_status ef_observer_cone_matrix(const ef_observer *observer,
                                  double lms_from_xyz[9], double *residual,
                                  ef_error *error) {
  const ef_channels xyz = ef_observer_channels(observer, EF_TRISTIMULUS);
  const ef_channels lms = ef_observer_channels(observer, EF_CONES);
  double matrix[9];
  if (observer->dimensions < 3 || !solve(&xyz, &lms, matrix)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "the functions of observer %s do not span three "
                         "dimensions, so its XYZ do not give three cone "
                         "excitations",
                         observer->name);
  }
  memcpy(lms_from_xyz, matrix, sizeof matrix);
  if (residual != NULL)
    *residual = largest_residual(&xyz, &lms, matrix);
  return EF_OK;
}
