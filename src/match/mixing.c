/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

#include "base/base_private.h"

ef_xyz ef__mixing_xyz(const ef__mixing *mixing, const double a[3],
                      double jacobian[9]) {
  if (!mixing->affine) return mixing->xyz(mixing->context, a, jacobian);
  const double *const v = mixing->vector, *const b = mixing->black;
  if (jacobian != NULL) memcpy(jacobian, v, sizeof mixing->vector);
  return (ef_xyz){b[0] + v[0] * a[0] + v[1] * a[1] + v[2] * a[2],
                  b[1] + v[3] * a[0] + v[4] * a[1] + v[5] * a[2],
                  b[2] + v[6] * a[0] + v[7] * a[1] + v[8] * a[2]};
}

ef_status ef__mixing_finish(ef__mixing *mixing, ef_error *error) {
  const double limit = 1e8;
  double scratch[64];
  double condition = 0;
  if (ef__condition_scratch(3, 3) > sizeof scratch / sizeof scratch[0]) {
    return ef__error_set(error, EF_INVALID, "scratch too small");
  }
  const ef_status status = ef__condition(3, 3, mixing->vector, scratch, NULL,
                                         &condition, error);
  if (status != EF_OK) return status;
  if (!(condition <= limit) ||
      !ef__mat3_inverse(mixing->vector, mixing->inverse)) {
    return ef__error_set(
        error, EF_NO_ANSWER,
        "the primaries are linearly dependent to this observer (condition "
        "number %.3g, at most %.0g can be solved): take primaries of three "
        "different colours",
        condition, limit);
  }
  return EF_OK;
}

static ef_xyz setup_xyz(const void *context, const double *amount,
                        double *jacobian) {
  return ef_setup_xyz(context, amount, jacobian);
}

ef_status ef__mixing_from_setup(const ef_setup *setup, ef__mixing *out,
                                ef_error *error) {
  const ef_status status = ef__mixing_copy(setup, out, error);
  if (status != EF_OK || !out->affine) return status;
  return ef__mixing_finish(out, error);
}

ef_status ef__mixing_copy(const ef_setup *setup, ef__mixing *out,
                          ef_error *error) {
  const size_t n = ef_device_n_drives(ef_setup_device(setup));
  if (n != 3) {
    return ef__error_set(error, EF_INVALID,
                         "the setup has %zu drives; matching takes exactly 3",
                         n);
  }
  memset(out, 0, sizeof *out);
  out->affine = ef_setup_affine(setup);
  out->conditions.white = ef_setup_white(setup);
  out->xyz = setup_xyz;
  out->context = setup;
  out->resolution = ef_setup_resolution(setup);
  /* What is worked out, not looked up, resolves far more. */
  out->has_kinks = !ef_setup_affine(setup) && out->resolution > 1e-6;
  const double zero[EF_MAX_DRIVES] = {0};
  const ef_xyz black = ef_setup_xyz(setup, zero, out->vector);
  out->black[0] = black.X;
  out->black[1] = black.Y;
  out->black[2] = black.Z;
  return EF_OK;
}
