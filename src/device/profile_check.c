/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How well a profile describes measurements of its device. */
#include "device/profile_private.h"

#include "base/base_private.h"
#include "device/device_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static bool is_ink(const ef_profile *profile) {
  return profile->space != cmsSigRgbData;
}

static ef_status check_table(const ef_profile *profile,
                             const ef_measurements *table, ef_error *error) {
  if (table->n_rows == 0 || table->drive == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a table of measurements without rows");
  if ((table->xyz == NULL) == (table->spectrum == NULL))
    return ef__error_set(error, EF_INVALID,
                         "measurements are either tristimulus values or "
                         "spectra; found %s",
                         table->xyz == NULL ? "neither" : "both");
  if (table->n_drives != profile->info.n_channels)
    return ef__error_set(error, EF_INVALID,
                         "found %zu device values a row; the profile '%s' has "
                         "%zu (%s)",
                         table->n_drives, profile->name,
                         profile->info.n_channels, profile->info.space);
  if (table->spectrum != NULL && is_ink(profile))
    return ef__error_set(error, EF_INVALID,
                         "a profile of inks is checked against X, Y, Z under "
                         "D50, not against spectra");
  return table->spectrum != NULL ? ef_grid_check(&table->grid, error) : EF_OK;
}

static ef_status check_row(const ef_measurements *table, size_t row,
                           const double *xyz, ef_error *error) {
  const size_t n = table->n_drives;
  bool is_good = true;
  for (size_t i = 0; i < n; i++) {
    const double drive = table->drive[row * n + i];
    is_good &= drive >= 0.0 && drive <= 1.0;
  }
  for (size_t c = 0; c < 3; c++)
    is_good &= (bool)isfinite(xyz[c]);
  if (is_good)
    return EF_OK;
  ef__error_set(error, EF_INVALID,
                "row %zu: expected device values of 0 to 1 and finite "
                "measurements",
                row + 1);
  if (table->line != NULL)
    ef__error_place(error, NULL, table->line[row], 0, NULL);
  return EF_INVALID;
}

/* Mean of the rows of the white; false when there are none. */
static bool mean_white(const ef_profile *profile, const ef_measurements *table,
                       const double *xyz, double white[3]) {
  const double wanted = is_ink(profile) ? 0.0 : 1.0;
  size_t n = 0;
  white[0] = white[1] = white[2] = 0.0;
  for (size_t r = 0; r < table->n_rows; r++) {
    bool is_white = true;
    for (size_t i = 0; i < table->n_drives; i++)
      is_white &= table->drive[r * table->n_drives + i] == wanted;
    if (!is_white)
      continue;
    n++;
    for (size_t c = 0; c < 3; c++)
      white[c] += xyz[3 * r + c];
  }
  for (size_t c = 0; n > 0 && c < 3; c++)
    white[c] /= (double)n;
  return n > 0;
}

/* From measured values to those of the connection space. */
static ef_status find_adaptation(const ef_profile *profile,
                                 const ef_measurements *table,
                                 const double *xyz, ef_intent intent,
                                 double matrix[9], ef_error *error) {
  static const double unit[9] = {1, 0, 0, 0, 1, 0, 0, 0, 1};
  const cmsCIEXYZ *d50 = cmsD50_XYZ();
  double white[3];
  memcpy(matrix, unit, sizeof unit);
  if (intent == EF_INTENT_ABSOLUTE)
    return EF_OK;
  if (!mean_white(profile, table, xyz, white))
    return ef__error_set(error, EF_NO_ANSWER,
                         "no row shows the white (all device values %d), "
                         "which intent %s is relative to",
                         is_ink(profile) ? 0 : 1, ef_intent_name(intent));
  if (is_ink(profile)) { /* the media-relative values of ICC.1, annex A.3 */
    matrix[0] = 100.0 * d50->X / white[0];
    matrix[4] = 100.0 * d50->Y / white[1];
    matrix[8] = 100.0 * d50->Z / white[2];
    return EF_OK;
  }
  const ef_status status = ef_adaptation_matrix(
      EF_ADAPT_BRADFORD, (ef_xyz){white[0], white[1], white[2]},
      (ef_xyz){d50->X, d50->Y, d50->Z}, matrix, error);
  for (size_t i = 0; status == EF_OK && i < 9; i++)
    matrix[i] *= 100.0;
  return status;
}

static ef_status compare(const ef_profile *profile,
                         const ef_measurements *table, const double *xyz,
                         const ef_profile_settings *settings, double *predicted,
                         ef_residual *residual, ef_error *error) {
  ef_error own; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  double matrix[9];
  ef_status status =
      find_adaptation(profile, table, xyz, settings->intent, matrix, error);
  if (status != EF_OK)
    return status;
  const ef_transform_settings how = {.intent = settings->intent,
                                     .black_point_compensation =
                                         settings->black_point_compensation};
  ef_transform *transform = ef_transform_new(profile, NULL, &how, error);
  if (transform == NULL)
    return error->status;
  status = ef_transform_apply(transform, table->n_rows, table->drive, 1,
                              predicted, error);
  ef_transform_free(transform);
  const cmsCIEXYZ *d50 = cmsD50_XYZ();
  for (size_t r = 0; status == EF_OK && r < table->n_rows; r++) {
    const double *m = xyz + 3 * r, *p = predicted + 3 * r;
    residual[r] = (ef_residual){
        .row = r,
        .measured = ef_xyz_transform(matrix, (ef_xyz){m[0], m[1], m[2]}),
        .predicted = {p[0], p[1], p[2]},
        .white = {100.0 * d50->X, 100.0 * d50->Y, 100.0 * d50->Z}};
  }
  return status;
}

ef_status ef_profile_check(const ef_profile *profile,
                           const ef_measurements *measurements,
                           const ef_profile_settings *settings,
                           ef_residual *residual, ef_error *error) {
  const ef_profile_settings plain = ef_profile_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (profile == NULL || measurements == NULL || residual == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a check needs a profile, measurements and a place "
                         "for what it finds");
  const size_t n = measurements->n_rows;
  ef_status status = check_table(profile, measurements, error);
  if (status != EF_OK)
    return status;
  double *xyz, *predicted;
  const ef__part parts[] = {{&xyz, n, 3 * sizeof(double)},
                            {&predicted, n, 3 * sizeof(double)}};
  void *block = ef__allocate_block(2, parts);
  if (block == NULL)
    return ef__error_memory(error, "a check of a profile");
  status = ef__light_xyz_1931(
      measurements->spectrum != NULL ? &measurements->grid : NULL,
      measurements->absolute, n,
      measurements->spectrum != NULL ? measurements->spectrum
                                     : measurements->xyz,
      xyz, error);
  for (size_t r = 0; status == EF_OK && r < n; r++)
    status = check_row(measurements, r, xyz + 3 * r, error);
  if (status == EF_OK)
    status = compare(profile, measurements, xyz, settings, predicted, residual,
                     error);
  free(block);
  return status;
}
