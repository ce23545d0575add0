/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Transforms through lcms2, in its floating-point formats. */
#include "device/profile_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>

struct ef_transform {
  ef__cms cms;
  cmsHTRANSFORM transform;
  size_t n_in, n_out;
  double unit_in, unit_out;   /* lcms2's numbers are ours times this */
  bool clamps_in, clamps_out; /* device values */
};

/* ---- Formats ------------------------------------------------------------- */

double ef__profile_unit(cmsColorSpaceSignature space) {
  switch ((cmsUInt32Number)space) {
  case cmsSigCmyData:
  case cmsSigCmykData:
  case cmsSig5colorData:
  case cmsSig6colorData:
  case cmsSig7colorData:
  case cmsSig8colorData:
  case cmsSig9colorData:
  case cmsSig10colorData:
  case cmsSig11colorData:
  case cmsSig12colorData:
  case cmsSig13colorData:
  case cmsSig14colorData:
  case cmsSig15colorData:
  case cmsSigMCH5Data:
  case cmsSigMCH6Data:
  case cmsSigMCH7Data:
  case cmsSigMCH8Data:
  case cmsSigMCH9Data:
  case cmsSigMCHAData:
  case cmsSigMCHBData:
  case cmsSigMCHCData:
  case cmsSigMCHDData:
  case cmsSigMCHEData:
  case cmsSigMCHFData:
    return 100.0;
  default:
    return 1.0;
  }
}

cmsUInt32Number ef__profile_format(cmsColorSpaceSignature space, size_t n) {
  return FLOAT_SH(1) |
         COLORSPACE_SH((cmsUInt32Number)_cmsLCMScolorSpace(space)) |
         CHANNELS_SH((cmsUInt32Number)n) | BYTES_SH(0);
}

static const cmsUInt32Number flags_of_all =
    cmsFLAGS_NOCACHE | cmsFLAGS_NOOPTIMIZE | cmsFLAGS_HIGHRESPRECALC;

static cmsUInt32Number flags_for(bool compensate) {
  return flags_of_all | (compensate ? cmsFLAGS_BLACKPOINTCOMPENSATION : 0);
}

/* The connection space as a profile. Its version is set back to 2: between
 * profiles of which the second is of version 4, lcms2 scales the black of the
 * perceptual and saturation intents whether asked to or not. */
static cmsHPROFILE connection(ef__cms *cms, bool lab) {
  cmsHPROFILE handle = lab ? cmsCreateLab4ProfileTHR(cms->context, NULL)
                           : cmsCreateXYZProfileTHR(cms->context);
  if (handle != NULL)
    cmsSetProfileVersion(handle, 2.1);
  return handle;
}

cmsHTRANSFORM ef__profile_to_xyz(const ef_profile *profile, ef__cms *cms,
                                 ef_intent intent, bool compensate,
                                 ef_error *error) {
  cmsHTRANSFORM transform = NULL;
  cmsHPROFILE from = ef__profile_open(profile, cms, error);
  if (from == NULL)
    return NULL;
  cmsHPROFILE to = connection(cms, false);
  if (to != NULL) {
    transform = cmsCreateTransformTHR(
        cms->context, from,
        ef__profile_format(profile->space, profile->info.n_channels), to,
        TYPE_XYZ_DBL, ef__profile_intent(intent), flags_for(compensate));
    cmsCloseProfile(to);
  }
  cmsCloseProfile(from);
  if (transform == NULL) {
    ef__error_set(error, EF_NO_ANSWER,
                  "has no transform from its device values to colours with "
                  "intent %s%s",
                  ef_intent_name(intent), ef__cms_complaint(cms));
    ef__error_place(error, profile->name, 0, 0, NULL);
  }
  return transform;
}

/* ---- Between two spaces -------------------------------------------------- */

ef_transform_settings ef_transform_settings_default(void) {
  return (ef_transform_settings){.intent = EF_INTENT_RELATIVE,
                                 .black_point_compensation = false,
                                 .lab = false};
}

/* One end of a transform, opened. */
typedef struct end {
  cmsHPROFILE handle;
  cmsUInt32Number format;
  size_t n;
  double unit;
  bool is_device;
} end;

static ef_status check_class(const ef_profile *profile, ef_error *error) {
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
    return ef__error_place(error, profile->name, 0, 0, NULL), EF_NO_ANSWER;
  }
  const size_t n = profile->info.n_channels;
  if (n >= 1 && n <= EF_MAX_DRIVES)
    return EF_OK;
  ef__error_set(error, EF_NO_ANSWER,
                "has %zu device values of space %s; 1 to %d are possible", n,
                profile->info.space, EF_MAX_DRIVES);
  return ef__error_place(error, profile->name, 0, 0, NULL), EF_NO_ANSWER;
}

static bool is_colour(cmsColorSpaceSignature space) {
  return space == cmsSigLabData || space == cmsSigXYZData ||
         space == cmsSigLuvData || space == cmsSigYxyData;
}

static ef_status open_profile(const ef_profile *profile, ef__cms *cms, end *out,
                              ef_error *error) {
  const ef_status status = check_class(profile, error);
  if (status != EF_OK)
    return status;
  out->handle = ef__profile_open(profile, cms, error);
  if (out->handle == NULL)
    return EF_MALFORMED;
  out->n = profile->info.n_channels;
  out->format = ef__profile_format(profile->space, out->n);
  out->unit = ef__profile_unit(profile->space);
  /* Profiles of colour spaces take their colours as they are: X, Y, Z with Y =
   * 1 to lcms2. */
  out->is_device = !is_colour(profile->space);
  if (profile->space == cmsSigXYZData)
    out->unit = 0.01;
  return EF_OK;
}

static ef_status open_connection(bool lab, ef__cms *cms, end *out,
                                 ef_error *error) {
  out->handle = connection(cms, lab);
  if (out->handle == NULL)
    return ef__error_memory(error, "a transform");
  out->n = 3;
  out->format = lab ? TYPE_Lab_DBL : TYPE_XYZ_DBL;
  out->unit = lab ? 1.0 : 0.01;
  return EF_OK;
}

static ef_status open_end(const ef_profile *profile,
                          const ef_transform_settings *settings, ef__cms *cms,
                          end *out, ef_error *error) {
  return profile != NULL ? open_profile(profile, cms, out, error)
                         : open_connection(settings->lab, cms, out, error);
}

static ef_status join(ef_transform *t, const end *from, const end *to,
                      const ef_transform_settings *settings, const char *name,
                      ef_error *error) {
  t->transform = cmsCreateTransformTHR(
      t->cms.context, from->handle, from->format, to->handle, to->format,
      ef__profile_intent(settings->intent),
      flags_for(settings->black_point_compensation));
  if (t->transform == NULL) {
    ef__error_set(error, EF_NO_ANSWER,
                  "there is no transform in this direction with intent %s%s",
                  ef_intent_name(settings->intent), ef__cms_complaint(&t->cms));
    return ef__error_place(error, name, 0, 0, NULL), EF_NO_ANSWER;
  }
  t->n_in = from->n;
  t->n_out = to->n;
  t->unit_in = from->unit;
  t->unit_out = to->unit;
  t->clamps_in = from->is_device;
  t->clamps_out = to->is_device;
  return EF_OK;
}

static ef_status make(ef_transform *t, const ef_profile *from,
                      const ef_profile *to,
                      const ef_transform_settings *settings, ef_error *error) {
  end ends[2] = {{0}, {0}};
  ef_status status = ef__cms_start(&t->cms, error);
  if (status == EF_OK)
    status = open_end(from, settings, &t->cms, &ends[0], error);
  if (status == EF_OK)
    status = open_end(to, settings, &t->cms, &ends[1], error);
  if (status == EF_OK)
    status = join(t, &ends[0], &ends[1], settings,
                  to != NULL ? to->name : from->name, error);
  for (int i = 0; i < 2; i++)
    if (ends[i].handle != NULL)
      cmsCloseProfile(ends[i].handle);
  return status;
}

ef_transform *ef_transform_new(const ef_profile *from, const ef_profile *to,
                               const ef_transform_settings *settings,
                               ef_error *error) {
  const ef_transform_settings plain = ef_transform_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (from == NULL && to == NULL) {
    ef__error_set(error, EF_INVALID, "a transform needs a profile");
    return NULL;
  }
  ef_transform *t = ef__allocate_zeroed(1, sizeof *t);
  if (t == NULL) {
    ef__error_memory(error, "a transform");
    return NULL;
  }
  if (make(t, from, to, settings, error) == EF_OK)
    return t;
  ef_transform_free(t);
  return NULL;
}

void ef_transform_free(ef_transform *transform) {
  if (transform == NULL)
    return;
  if (transform->transform != NULL)
    cmsDeleteTransform(transform->transform);
  ef__cms_end(&transform->cms);
  free(transform);
}

size_t ef_transform_inputs(const ef_transform *transform) {
  return transform->n_in;
}

size_t ef_transform_outputs(const ef_transform *transform) {
  return transform->n_out;
}

/* ---- Many colours -------------------------------------------------------- */

enum { CHUNK = 256 };

typedef struct batch {
  const ef_transform *transform;
  const double *in;
  double *out;
} batch;

static double clamp_unit(double value) {
  return value < 0.0 ? 0.0 : value > 1.0 ? 1.0 : value;
}

static void apply_range(void *context, size_t begin, size_t end_at) {
  const batch *b = context;
  const ef_transform *t = b->transform;
  double scaled[CHUNK * EF_MAX_DRIVES];
  const size_t n = end_at - begin;
  for (size_t i = 0; i < n * t->n_in; i++) {
    const double value = b->in[begin * t->n_in + i];
    scaled[i] = t->unit_in * (t->clamps_in ? clamp_unit(value) : value);
  }
  double *out = b->out + begin * t->n_out;
  cmsDoTransform(t->transform, scaled, out, (cmsUInt32Number)n);
  for (size_t i = 0; i < n * t->n_out; i++) {
    const double value = out[i] / t->unit_out;
    out[i] = t->clamps_out ? clamp_unit(value) : value;
  }
}

ef_status ef_transform_apply(const ef_transform *transform, size_t n,
                             const double *in, int jobs, double *out,
                             ef_error *error) {
  for (size_t i = 0; i < n * transform->n_in; i++)
    if (!isfinite(in[i]))
      return ef__error_set(error, EF_INVALID,
                           "value %zu of colour %zu is not finite",
                           i % transform->n_in + 1, i / transform->n_in + 1);
  batch b = {transform, in, out};
  ef__parallel_for(n, CHUNK, jobs, apply_range, &b);
  return EF_OK;
}
