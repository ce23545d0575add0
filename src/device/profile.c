/* SPDX-License-Identifier: GPL-3.0-or-later */
/* ICC profiles through lcms2, in memory only. The one file that calls cms*. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <lcms2.h>
#include <stdlib.h>
#include <string.h>

/* lcms2's type 4 is function type 3 of ICC.1:2022, 10.18:
 * Y = (a X + b)^g from X = d on, Y = c X below. */
static cmsToneCurve *build_curve(cmsContext context, const char *name,
                                 ef_error *error) {
  ef_tone_curve *tone = ef_tone_curve_new(name, error);
  if (tone == NULL)
    return NULL;
  ef__parametric form;
  const bool closed = ef__tone_curve_parametric(tone, &form);
  ef_tone_curve_free(tone);
  cmsToneCurve *curve = NULL;
  if (closed) {
    const double whole = 1.0 + form.offset;
    const cmsFloat64Number parameter[5] = {
        form.gamma, 1.0 / whole, form.offset / whole, form.slope, form.joint};
    curve = form.joint > 0.0
                ? cmsBuildParametricToneCurve(context, 4, parameter)
                : cmsBuildGamma(context, form.gamma);
  }
  if (curve == NULL)
    ef__error_memory(error, "the curve of a profile");
  return curve;
}

static cmsCIExyY with_luminance(ef_xy xy) {
  const cmsCIExyY out = {xy.x, xy.y, 1.0};
  return out;
}

static bool write_text(cmsContext context, cmsHPROFILE profile,
                       cmsTagSignature tag, const char *text) {
  cmsMLU *mlu = cmsMLUalloc(context, 1);
  if (mlu == NULL)
    return false;
  const bool written =
      cmsMLUsetASCII(mlu, "en", "US", text) && cmsWriteTag(profile, tag, mlu);
  cmsMLUfree(mlu);
  return written;
}

/* Matrix, curve, white and `chad` by lcms2, which adapts by linear Bradford;
 * then our own texts. */
static cmsHPROFILE build_profile(cmsContext context, const char *description,
                                 const ef_encoding *encoding, ef_error *error) {
  cmsToneCurve *curve = build_curve(context, encoding->tone, error);
  if (curve == NULL)
    return NULL;
  const cmsCIExyY white = with_luminance(encoding->white);
  const cmsCIExyYTRIPLE primaries = {with_luminance(encoding->red),
                                     with_luminance(encoding->green),
                                     with_luminance(encoding->blue)};
  cmsToneCurve *const curves[3] = {curve, curve, curve};
  cmsHPROFILE profile =
      cmsCreateRGBProfileTHR(context, &white, &primaries, curves);
  cmsFreeToneCurve(curve);
  if (profile != NULL &&
      write_text(context, profile, cmsSigProfileDescriptionTag, description) &&
      write_text(context, profile, cmsSigCopyrightTag,
                 "Figures of a published standard; no rights claimed"))
    return profile;
  if (profile != NULL)
    cmsCloseProfile(profile);
  ef__error_memory(error, "a profile");
  return NULL;
}

/* Bytes 24 to 35 of the header are the moment of making (ICC.1:2022, 7.2.1).
 * One fixed moment, so that equal input gives equal bytes. */
static void fix_date(unsigned char *bytes) {
  static const unsigned char date[12] = {2000 >> 8, 2000 & 255, 0, 1, 0, 1};
  memcpy(bytes + 24, date, sizeof date);
}

static ef_status save(cmsHPROFILE profile, unsigned char **bytes,
                      size_t *length, ef_error *error) {
  cmsUInt32Number size = 0;
  unsigned char *out = NULL;
  if (cmsSaveProfileToMem(profile, NULL, &size) && size >= 128)
    out = ef__allocate(size, 1);
  if (out == NULL || !cmsSaveProfileToMem(profile, out, &size)) {
    free(out);
    return ef__error_memory(error, "the bytes of a profile");
  }
  fix_date(out);
  *bytes = out;
  *length = size;
  return EF_OK;
}

static bool is_printable_ascii(const char *text) {
  for (; *text != '\0'; text++)
    if (*text < 0x20 || *text > 0x7e)
      return false;
  return true;
}

ef_status ef_profile_make_matrix(const char *description,
                                 const ef_encoding *encoding,
                                 unsigned char **bytes, size_t *length,
                                 ef_error *error) {
  if (description == NULL || encoding == NULL || bytes == NULL ||
      length == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a profile needs a description, an encoding and a "
                         "place for its bytes");
  if (!is_printable_ascii(description))
    return ef__error_set(error, EF_INVALID,
                         "the description of a profile must be plain ASCII");
  double matrix[9];
  ef_error own;
  ef_status status = ef_encoding_matrix(encoding, matrix, error);
  if (status != EF_OK)
    return status;
  cmsContext context = cmsCreateContext(NULL, NULL);
  if (context == NULL)
    return ef__error_memory(error, "a profile");
  cmsHPROFILE profile = build_profile(context, description, encoding, &own);
  if (profile != NULL) {
    status = save(profile, bytes, length, error);
    cmsCloseProfile(profile);
  } else {
    status = ef__error_set(error, own.status, "%s", own.message);
  }
  cmsDeleteContext(context);
  return status;
}
