/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Directions in receptor space: contrasts, cone-opponent axes, steps of
 * chromaticity. All come to one contrast for each receptor. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "stimulus/stimulus_private.h"

/* ---- Cone-opponent axes ------------------------------------------------- */

static ef_status check_cones(const double excitation[3], ef_error *error) {
  for (size_t c = 0; c < 3; ++c) {
    if (excitation[c] > 0 && isfinite(excitation[c]))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "the background gives %s an excitation of %g; a "
                         "cone-opponent direction needs all three above 0",
                         ef_receptor_symbol((ef_receptor)c), excitation[c]);
  }
  return EF_OK;
}

ef_status ef_dkl_space_make(const ef_stimulator *stimulator,
                            const double excitation[3], ef_dkl_space *out,
                            ef_error *error) {
  const double *const weight = stimulator->luminance_weight;
  double share[3], sum = 0; /* of each cone in the background's luminance */
  const ef_status status = check_cones(excitation, error);
  if (status != EF_OK)
    return status;
  if (!(weight[0] > 0 && weight[1] > 0)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "with luminance weights %g:%g:%g one of L and M alone "
                         "is luminance, and no red-green axis is left",
                         weight[0], weight[1], weight[2]);
  }
  for (size_t c = 0; c < 3; ++c)
    sum += weight[c] * excitation[c];
  for (size_t c = 0; c < 3; ++c)
    share[c] = weight[c] * excitation[c] / sum;
  /* Contrasts that leave the two other mechanisms at zero. */
  const double lm = share[0] + share[1];
  const double axis[3][3] = {
      {1, 1, 1}, {share[1], -share[0], 0}, {-share[2], -share[2], lm}};
  for (size_t k = 0; k < 3; ++k) {
    const double length =
        sqrt(axis[k][0] * axis[k][0] + axis[k][1] * axis[k][1] +
             axis[k][2] * axis[k][2]);
    /* The mechanism's answer to the axis, so that it answers 1 to the unit. */
    const double mechanism[3][3] = {{share[0], share[1], share[2]},
                                    {1, -1, 0},
                                    {-share[0], -share[1], 1 - share[2]}};
    double answer = 0;
    for (size_t c = 0; c < 3; ++c) {
      out->from_dkl[3 * c + k] = axis[k][c] / length;
      answer += mechanism[k][c] * axis[k][c] / length;
    }
    for (size_t c = 0; c < 3; ++c)
      out->to_dkl[3 * k + c] = mechanism[k][c] / answer;
  }
  return EF_OK;
}

/* ---- Contrasts of the cones --------------------------------------------- */

static ef_status from_dkl(const ef_stimulator *stimulator, const double dkl[3],
                          const double excitation[3], double contrast[3],
                          ef_error *error) {
  ef_dkl_space space;
  const ef_status status =
      ef_dkl_space_make(stimulator, excitation, &space, error);
  if (status == EF_OK)
    ef__mat3_apply(space.from_dkl, dkl, contrast);
  return status;
}

/* Sine and cosine of degrees, exact at the multiples of 90. */
static void isoluminant(double angle_deg, double dkl[3]) {
  const double degree = 3.14159265358979323846 / 180;
  const double turned = remainder(angle_deg, 360);
  dkl[0] = 0;
  dkl[1] = fabs(turned) == 90 ? 0 : cos(turned * degree);
  dkl[2] = fabs(turned) == 180 ? 0 : sin(turned * degree);
}

/* At constant V = k_l L + k_m M: l_MB = k_l L / V, 1 - l_MB = k_m M / V, and
 * s_MB = k_s S / V, all linear. */
static ef_status from_mb(const ef_stimulator *stimulator, const double mb[2],
                         const double excitation[3], double contrast[3],
                         ef_error *error) {
  const ef_mb_scale scale = ef_observer_mb_scale(stimulator->observer);
  const ef_status status = check_cones(excitation, error);
  if (status != EF_OK)
    return status;
  const double luminance_sum =
      scale.k_l * excitation[0] + scale.k_m * excitation[1];
  contrast[0] = mb[0] * luminance_sum / (scale.k_l * excitation[0]);
  contrast[1] = -mb[0] * luminance_sum / (scale.k_m * excitation[1]);
  contrast[2] = mb[1] * luminance_sum / (scale.k_s * excitation[2]);
  return EF_OK;
}

static ef_status resolve_cones(const ef_stimulator *stimulator,
                               const ef_direction *direction,
                               const double excitation[3], double contrast[3],
                               ef_error *error) {
  double dkl[3];
  switch (direction->kind) {
  case EF_DIRECTION_ISOLUMINANT:
    isoluminant(direction->angle_deg, dkl);
    return from_dkl(stimulator, dkl, excitation, contrast, error);
  case EF_DIRECTION_DKL:
    return from_dkl(stimulator, direction->dkl, excitation, contrast, error);
  case EF_DIRECTION_MB:
    return from_mb(stimulator, direction->mb, excitation, contrast, error);
  case EF_DIRECTION_CONTRAST:
    break;
  }
  return ef__error_set(error, EF_INVALID, "there is no direction of kind %d",
                       (int)direction->kind);
}

/* ---- All receptors ------------------------------------------------------ */

static ef_status check_receptor(ef_receptor receptor, ef_receptor_role role,
                                double contrast, double excitation,
                                ef_error *error) {
  const char *const symbol = ef_receptor_symbol(receptor);
  if (!isfinite(contrast)) {
    return ef__error_set(error, EF_INVALID,
                         "a contrast of %g for %s; expected a finite number",
                         contrast, symbol);
  }
  if (role == EF_RECEPTOR_IGNORED || (excitation > 0 && isfinite(excitation)))
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the background gives %s an excitation of %g, against "
                       "which there is no contrast; expected more than 0",
                       symbol, excitation);
}

ef_status ef_direction_resolve(const ef_stimulator *stimulator,
                               const ef_direction *direction,
                               const double excitation[EF_N_RECEPTORS],
                               ef_receptor_role role[EF_N_RECEPTORS],
                               double contrast[EF_N_RECEPTORS],
                               ef_error *error) {
  const bool plain = direction->kind == EF_DIRECTION_CONTRAST;
  double cone[3];
  if (!plain) {
    const ef_status status =
        resolve_cones(stimulator, direction, excitation, cone, error);
    if (status != EF_OK)
      return status;
  }
  bool changes = false;
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    if (r < 3 && !plain) {
      role[r] = cone[r] != 0 ? EF_RECEPTOR_CHANGED : EF_RECEPTOR_SILENT;
      contrast[r] = cone[r];
    } else {
      role[r] = direction->role[r];
      contrast[r] = role[r] == EF_RECEPTOR_CHANGED ? direction->contrast[r] : 0;
      if (role[r] == EF_RECEPTOR_CHANGED && contrast[r] == 0)
        role[r] = EF_RECEPTOR_SILENT;
    }
    const ef_status status = check_receptor((ef_receptor)r, role[r],
                                            contrast[r], excitation[r], error);
    if (status != EF_OK)
      return status;
    changes = changes || role[r] == EF_RECEPTOR_CHANGED;
  }
  if (changes)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the direction changes no receptor; name at least one");
}
