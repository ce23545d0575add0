/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A profile as a device. */
#include "device/profile_private.h"

#include "base/base_private.h"
#include "device/device_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { DRIVES = 3, MOST_ENTRIES = 4096, MOST_POINTS = 3 * MOST_ENTRIES };

static const char *const rgb[DRIVES] = {"red", "green", "blue"};
static const char *const cmy[DRIVES] = {"cyan", "magenta", "yellow"};

/* Of a drive, to both sides: wide enough for what 16-bit tables round, narrow
 * against the distance of their points. */
static const double slope_step = 1.0 / 256.0;
/* What 16-bit tables round of a colour, in shares of the white. */
static const double table_resolution = 1e-4;

typedef struct described {
  ef_device device;
  ef__cms cms;
  cmsHTRANSFORM transform; /* device values to X, Y, Z with Y = 1 */
  double unit;             /* of lcms2's device values */
  size_t n_channels;
  double black; /* of the fourth channel */
  bool additive;
  double origin[3], vector[3 * DRIVES]; /* when additive */
  double white[3];
} described;

static const described *as_described(const ef_device *device) {
  return (const described *)device;
}

/* ---- Through lcms2 ------------------------------------------------------- */

/* n colours of three drives each, at most 7. */
static void transform_some(const described *d, size_t n, const double *drive,
                           double *xyz) {
  double value[7 * 4];
  for (size_t i = 0; i < n; i++) {
    for (size_t c = 0; c < DRIVES; c++)
      value[i * d->n_channels + c] = d->unit * drive[i * DRIVES + c];
    if (d->n_channels > DRIVES)
      value[i * d->n_channels + DRIVES] = d->unit * d->black;
  }
  cmsDoTransform(d->transform, value, xyz, (cmsUInt32Number)n);
}

static double clamp_unit(double value) {
  return value < 0.0 ? 0.0 : value > 1.0 ? 1.0 : value;
}

/* The colour, and its differences over the step, in one call. */
static void xyz_of(const void *data, const double *amount, double xyz[3],
                   double *jacobian) {
  const described *d = data;
  double drive[7 * DRIVES], colour[7 * 3];
  for (size_t k = 0; k < 7; k++)
    for (size_t c = 0; c < DRIVES; c++)
      drive[k * DRIVES + c] = clamp_unit(amount[c]);
  for (size_t c = 0; c < DRIVES; c++) {
    drive[(1 + 2 * c) * DRIVES + c] = clamp_unit(drive[c] + slope_step);
    drive[(2 + 2 * c) * DRIVES + c] = clamp_unit(drive[c] - slope_step);
  }
  transform_some(d, jacobian != NULL ? 7 : 1, drive, colour);
  memcpy(xyz, colour, 3 * sizeof *xyz);
  for (size_t c = 0; jacobian != NULL && c < DRIVES; c++) {
    const size_t up = 1 + 2 * c, down = 2 + 2 * c;
    const double run = drive[up * DRIVES + c] - drive[down * DRIVES + c];
    for (size_t k = 0; k < 3; k++)
      jacobian[k * DRIVES + c] =
          (colour[up * 3 + k] - colour[down * 3 + k]) / run;
  }
}

/* ---- What every kind of device answers ----------------------------------- */

static void release(ef_device *device) {
  described *d = (described *)device;
  if (d->transform != NULL)
    cmsDeleteTransform(d->transform);
  ef__cms_end(&d->cms);
}

static ef_status see(const ef_device *device, const ef_observer *observer,
                     const ef_illuminant *illuminant, const ef_notes *notes,
                     ef__colour_map *map, ef_error *error) {
  const described *d = as_described(device);
  (void)illuminant;
  (void)notes;
  if (strcmp(ef_observer_name(observer), "cie-1931") != 0)
    return ef__error_set(error, EF_NO_ANSWER,
                         "'%s' is a profile: it knows colours of the observer "
                         "cie-1931 under D50 only; observer %s needs the "
                         "spectra of the device",
                         device->name, ef_observer_name(observer));
  memcpy(map->white, d->white, sizeof map->white);
  map->affine = d->additive;
  if (d->additive) {
    memcpy(map->origin, d->origin, sizeof d->origin);
    memcpy(map->vector, d->vector, sizeof d->vector);
    return EF_OK;
  }
  map->xyz = xyz_of;
  map->data = (void *)(uintptr_t)d; /* read only, and outlives the setup */
  map->resolution = table_resolution;
  return EF_OK;
}

static const ef__device_class profile_class = {
    .kind = "profile",
    .reflects = false,
    .release = release,
    .see = see,
};

static const ef__device_class ink_class = {
    .kind = "profile",
    .reflects = false,
    .limit_text = {" at 0 %", " at 100 %"},
    .release = release,
    .see = see,
};

/* ---- Matrix profiles as additive devices --------------------------------- */

static ef_tone_curve *linear_curve(ef_error *error) {
  return ef_tone_curve_new("linear", error);
}

/* What a point of a curve is raised by where it does not rise by itself: flat
 * parts then have an inverse, and all points together are off by 2e-6 at
 * most. */
static const double least_rise = 1e-10;
/* Beside each entry of a table, in steps between entries: the curve turns
 * within this and is straight elsewhere. */
static const double beside = 1e-3;

/* Between the entries of a table a curve is straight (ICC.1:2022, 10.6): three
 * points for each entry. */
static size_t table_points(size_t n_entries, const cmsUInt16Number *entry,
                           double *drive, double *level) {
  const double last = (double)(n_entries - 1);
  size_t n = 0;
  for (size_t k = 0; k < n_entries; k++) {
    const double at = (double)k, here = entry[k];
    if (k > 0) {
      drive[n] = (at - beside) / last;
      level[n++] = (here + beside * (entry[k - 1] - here)) / 65535.0;
    }
    drive[n] = at / last;
    level[n++] = here / 65535.0;
    if (k + 1 < n_entries) {
      drive[n] = (at + beside) / last;
      level[n++] = (here + beside * (entry[k + 1] - here)) / 65535.0;
    }
  }
  return n;
}

static size_t formula_points(const cmsToneCurve *curve, double *drive,
                             double *level) {
  for (size_t k = 0; k < MOST_ENTRIES; k++) {
    drive[k] = (double)k / (MOST_ENTRIES - 1);
    level[k] = (double)cmsEvalToneCurveFloat(curve, (cmsFloat32Number)drive[k]);
  }
  return MOST_ENTRIES;
}

/* Points of a curve, strictly increasing; how many. What raising a curve that
 * falls does to it is judged afterwards. */
static size_t curve_points(const cmsToneCurve *curve, double *drive,
                           double *level) {
  const cmsUInt32Number n_entries = cmsGetToneCurveEstimatedTableEntries(curve);
  const bool is_table = cmsGetToneCurveParametricType(curve) == 0 &&
                        n_entries >= 2 && n_entries <= MOST_ENTRIES;
  const size_t n =
      is_table ? table_points(n_entries, cmsGetToneCurveEstimatedTable(curve),
                              drive, level)
               : formula_points(curve, drive, level);
  for (size_t k = 1; k < n; k++)
    level[k] = fmax(level[k], level[k - 1] + least_rise);
  return n;
}

static ef_tone_curve *read_curve(const cmsToneCurve *curve, ef_error *error) {
  double *point = ef__allocate(2 * MOST_POINTS, sizeof *point);
  if (point == NULL) {
    ef__error_memory(error, "the curve of a profile");
    return NULL;
  }
  double *level = point + MOST_POINTS;
  const size_t n = curve_points(curve, point, level);
  ef_tone_curve *out = NULL;
  if (cmsIsToneCurveLinear(curve)) {
    out = linear_curve(error);
  } else {
    out = ef_tone_curve_from_ramp(n, point, level, error);
    if (out != NULL)
      ef__tone_curve_describe(out, "curve of the profile");
  }
  free(point);
  return out;
}

/* Curves of the three channels; false when one cannot be had. */
static bool read_curves(cmsHPROFILE handle, ef_tone_curve *curve[DRIVES]) {
  static const cmsTagSignature tags[DRIVES] = {
      cmsSigRedTRCTag, cmsSigGreenTRCTag, cmsSigBlueTRCTag};
  for (size_t i = 0; i < DRIVES; i++) {
    const cmsToneCurve *found = cmsReadTag(handle, tags[i]);
    curve[i] = found != NULL ? read_curve(found, NULL) : NULL;
    if (curve[i] == NULL)
      return false;
  }
  return true;
}

/* Black and what each channel adds, from the transform itself, so that intent
 * and compensation are in them. */
static void read_vectors(described *d) {
  static const double corner[4 * DRIVES] = {0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 1};
  double xyz[4 * 3];
  transform_some(d, 4, corner, xyz);
  for (size_t c = 0; c < 3; c++) {
    d->origin[c] = xyz[c];
    for (size_t i = 0; i < DRIVES; i++)
      d->vector[c * DRIVES + i] = xyz[3 * (1 + i) + c] - xyz[c];
  }
}

/* lcms2 rounds a drive to 16 bits before it looks into a table: where three
 * curves are as steep as 20 a colour is off by 5e-4. */
static const double least_agreement = 5e-4;

/* Additive and through lcms2, at one colour. */
static bool agrees(const described *d, ef_tone_curve *const curve[DRIVES],
                   const double *drive) {
  double xyz[3];
  transform_some(d, 1, drive, xyz);
  for (size_t c = 0; c < 3; c++) {
    double sum = d->origin[c];
    for (size_t i = 0; i < DRIVES; i++)
      sum += d->vector[c * DRIVES + i] *
             ef_tone_curve_amount(curve[i], drive[i], NULL);
    if (!(fabs(sum - xyz[c]) <= least_agreement))
      return false;
  }
  return true;
}

/* On a grid of the box, and finely along the greys, which shows every part of
 * every curve. */
static bool agrees_everywhere(const described *d,
                              ef_tone_curve *const curve[DRIVES]) {
  enum { SIDE = 6, GREYS = 1021 };
  for (int p = 0; p < SIDE * SIDE * SIDE; p++) {
    const double drive[DRIVES] = {(double)(p % SIDE) / (SIDE - 1),
                                  (double)(p / SIDE % SIDE) / (SIDE - 1),
                                  (double)(p / SIDE / SIDE) / (SIDE - 1)};
    if (!agrees(d, curve, drive))
      return false;
  }
  for (int p = 0; p <= GREYS; p++) {
    const double grey = (double)p / GREYS;
    const double drive[DRIVES] = {grey, grey, grey};
    if (!agrees(d, curve, drive))
      return false;
  }
  return true;
}

/* Tries to be additive; the curves are then those of the profile. */
static void try_additive(described *d, const ef_profile *profile,
                         ef_tone_curve *curve[DRIVES]) {
  ef__cms cms;
  if (!profile->info.is_matrix || ef__cms_start(&cms, NULL) != EF_OK)
    return;
  cmsHPROFILE handle = ef__profile_open(profile, &cms, NULL);
  if (handle != NULL && read_curves(handle, curve)) {
    read_vectors(d);
    d->additive = agrees_everywhere(d, curve);
  }
  if (handle != NULL)
    cmsCloseProfile(handle);
  ef__cms_end(&cms);
  for (size_t i = 0; !d->additive && i < DRIVES; i++) {
    ef_tone_curve_free(curve[i]);
    curve[i] = NULL;
  }
}

/* ---- Checks -------------------------------------------------------------- */

ef_profile_settings ef_profile_settings_default(void) {
  return (ef_profile_settings){.intent = EF_INTENT_RELATIVE,
                               .black_point_compensation = false,
                               .black = 0.0,
                               .notes = NULL};
}

/* After the error is set. */
static ef_status refuse(const ef_profile *profile, ef_error *error) {
  ef__error_place(error, profile->name, 0, 0, NULL);
  return EF_NO_ANSWER;
}

static ef_status check(const ef_profile *profile,
                       const ef_profile_settings *settings, ef_error *error) {
  switch ((cmsUInt32Number)profile->device_class) {
  case cmsSigInputClass:
  case cmsSigDisplayClass:
  case cmsSigOutputClass:
  case cmsSigColorSpaceClass:
    break;
  default:
    ef__error_set(error, EF_NO_ANSWER,
                  "is a profile of class %s, which describes no device",
                  profile->info.device_class);
    return refuse(profile, error);
  }
  if (profile->space != cmsSigRgbData && profile->space != cmsSigCmyData &&
      profile->space != cmsSigCmykData) {
    ef__error_set(error, EF_NO_ANSWER,
                  "has device values of space %s; profiles of RGB, CMY and "
                  "CMYK can be matched with",
                  profile->info.space);
    return refuse(profile, error);
  }
  if (!(settings->black >= 0.0 && settings->black <= 1.0))
    return ef__error_set(error, EF_INVALID,
                         "black fixed at %g; expected a drive from 0 to 1",
                         settings->black);
  if (settings->black > 0.0 && profile->space != cmsSigCmykData)
    return ef__error_set(error, EF_INVALID,
                         "black is fixed at %g, but '%s' has no black (%s)",
                         settings->black, profile->name, profile->info.space);
  return EF_OK;
}

/* ---- Construction -------------------------------------------------------- */

/* The white of the setup: what the display shows at full, or D50, to which the
 * medium's white is brought unless the intent is absolute. */
static ef_status take_white(described *d, const ef_profile *profile,
                            ef_error *error) {
  static const double full[DRIVES] = {1.0, 1.0, 1.0};
  const cmsCIEXYZ *d50 = cmsD50_XYZ();
  d->white[0] = d50->X;
  d->white[1] = d50->Y;
  d->white[2] = d50->Z;
  if (profile->device_class == cmsSigDisplayClass &&
      profile->space == cmsSigRgbData)
    transform_some(d, 1, full, d->white);
  if (d->white[1] > 0.0 && isfinite(d->white[0] + d->white[1] + d->white[2]))
    return EF_OK;
  ef__error_set(error, EF_NO_ANSWER, "shows no light at full drive");
  return refuse(profile, error);
}

/* Corners tell whether there is any colour at all. */
static ef_status check_corners(const described *d, const ef_profile *profile,
                               ef_error *error) {
  double least = HUGE_VAL, most = -HUGE_VAL;
  for (int p = 0; p < 8; p++) {
    const double drive[DRIVES] = {p & 1, p >> 1 & 1, p >> 2};
    double xyz[3];
    transform_some(d, 1, drive, xyz);
    for (size_t c = 0; c < 3; c++) {
      if (isfinite(xyz[c]))
        continue;
      ef__error_set(error, EF_NO_ANSWER, "gives colours that are not finite");
      return refuse(profile, error);
    }
    least = fmin(least, xyz[1]);
    most = fmax(most, xyz[1]);
  }
  if (most > least)
    return EF_OK;
  ef__error_set(error, EF_NO_ANSWER, "gives one colour for all drives");
  return refuse(profile, error);
}

static ef_status set_up(described *d, const ef_profile *profile,
                        ef_tone_curve *curve[DRIVES], ef_error *error) {
  const bool is_rgb = profile->space == cmsSigRgbData;
  for (size_t i = 0; i < DRIVES; i++) {
    if (curve[i] == NULL)
      curve[i] = linear_curve(error);
    if (curve[i] == NULL)
      return EF_NO_MEMORY;
  }
  return ef__device_set_up(&d->device, is_rgb ? &profile_class : &ink_class,
                           profile->name, DRIVES, is_rgb ? rgb : cmy, NULL,
                           (const ef_tone_curve *const *)curve, error);
}

static ef_status fill(described *d, const ef_profile *profile,
                      const ef_profile_settings *settings,
                      ef_tone_curve *curve[DRIVES], ef_error *error) {
  ef_status status = ef__cms_start(&d->cms, error);
  if (status != EF_OK)
    return status;
  d->n_channels = profile->info.n_channels;
  d->unit = ef__profile_unit(profile->space);
  d->black = settings->black;
  d->transform = ef__profile_to_xyz(profile, &d->cms, settings->intent,
                                    settings->black_point_compensation, error);
  if (d->transform == NULL)
    return EF_NO_ANSWER;
  status = check_corners(d, profile, error);
  if (status == EF_OK)
    status = take_white(d, profile, error);
  if (status != EF_OK)
    return status;
  try_additive(d, profile, curve);
  return set_up(d, profile, curve, error);
}

static void tell(const described *d, const ef_profile *profile,
                 const ef_profile_settings *settings) {
  const ef_xyz white = profile->info.media_white;
  ef__note(settings->notes, "%s: %s profile of version %d.%d, intent %s; %s",
           profile->name, profile->info.device_class, profile->info.major,
           profile->info.minor, ef_intent_name(settings->intent),
           d->additive
               ? "a matrix with curves, taken as an additive device"
               : "evaluated in single precision, slopes over 1/256 of a drive");
  if (settings->intent == EF_INTENT_ABSOLUTE)
    ef__note(settings->notes,
             "%s: colours are absolute under D50; the medium's white is X %.2f "
             "Y %.2f Z %.2f",
             profile->name, white.X, white.Y, white.Z);
  else
    ef__note(settings->notes,
             "%s: colours are relative to the medium, whose white stands at "
             "D50%s",
             profile->name,
             settings->black_point_compensation
                 ? "; its black is scaled to no light"
                 : "; its black stays as it is");
  if (d->n_channels > DRIVES)
    ef__note(settings->notes, "%s: black is fixed at %g %%", profile->name,
             100.0 * d->black);
}

ef_device *ef_profile_device(const ef_profile *profile,
                             const ef_profile_settings *settings,
                             ef_error *error) {
  const ef_profile_settings plain = ef_profile_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (profile == NULL) {
    ef__error_set(error, EF_INVALID, "there is no profile");
    return NULL;
  }
  if (check(profile, settings, error) != EF_OK)
    return NULL;
  described *d = ef__allocate_zeroed(1, sizeof *d);
  if (d == NULL) {
    ef__error_memory(error, "a device");
    return NULL;
  }
  d->device.kind = &profile_class;
  ef_tone_curve *curve[DRIVES] = {NULL, NULL, NULL};
  const ef_status status = fill(d, profile, settings, curve, error);
  for (size_t i = 0; i < DRIVES; i++)
    ef_tone_curve_free(curve[i]);
  if (status != EF_OK) {
    ef_device_free(&d->device);
    return NULL;
  }
  tell(d, profile, settings);
  return &d->device;
}
