/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matrix profiles made with lcms2, in memory only. */
#include "device/profile_private.h"

#include "base/base_private.h"
#include "device/device_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* lcms2's type 4 is function type 3 of ICC.1:2022, 10.18:
 * Y = (a X + b)^g from X = d on, Y = c X below. */
static cmsToneCurve *build_parametric(cmsContext context,
                                      const ef__parametric *form) {
  const double whole = 1.0 + form->offset;
  const cmsFloat64Number parameter[5] = {
      form->gamma, 1.0 / whole, form->offset / whole, form->slope, form->joint};
  return form->joint > 0.0 ? cmsBuildParametricToneCurve(context, 4, parameter)
                           : cmsBuildGamma(context, form->gamma);
}

static cmsToneCurve *build_curve(cmsContext context, const char *name,
                                 ef_error *error) {
  ef_tone_curve *tone = ef_tone_curve_new(name, error);
  if (tone == NULL)
    return NULL;
  ef__parametric form;
  const bool closed = ef__tone_curve_parametric(tone, &form);
  ef_tone_curve_free(tone);
  cmsToneCurve *curve = closed ? build_parametric(context, &form) : NULL;
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

/* What a matrix profile is made of. */
typedef struct parts {
  const char *description, *copyright;
  ef_xy white, red, green, blue;
  cmsToneCurve *const *curve; /* three */
  double luminance_cd_m2;     /* NaN: not known */
} parts;

static bool write_luminance(cmsHPROFILE profile, double luminance_cd_m2) {
  const cmsCIEXYZ light = {0.0, luminance_cd_m2, 0.0};
  return isnan(luminance_cd_m2) ||
         cmsWriteTag(profile, cmsSigLuminanceTag, &light);
}

/* Matrix, curves, white and `chad` by lcms2, which adapts by linear Bradford;
 * then our own texts. */
static cmsHPROFILE build_profile(cmsContext context, const parts *from,
                                 ef_error *error) {
  const cmsCIExyY white = with_luminance(from->white);
  const cmsCIExyYTRIPLE primaries = {with_luminance(from->red),
                                     with_luminance(from->green),
                                     with_luminance(from->blue)};
  cmsHPROFILE profile =
      cmsCreateRGBProfileTHR(context, &white, &primaries, from->curve);
  if (profile != NULL &&
      write_text(context, profile, cmsSigProfileDescriptionTag,
                 from->description) &&
      write_text(context, profile, cmsSigCopyrightTag, from->copyright) &&
      write_luminance(profile, from->luminance_cd_m2))
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

static ef_status check_description(const char *description, ef_error *error) {
  return is_printable_ascii(description)
             ? EF_OK
             : ef__error_set(error, EF_INVALID,
                             "the description of a profile must be plain "
                             "ASCII");
}

/* ---- Of a published encoding --------------------------------------------- */

static ef_status make_encoding(cmsContext context, const char *description,
                               const ef_encoding *encoding,
                               unsigned char **bytes, size_t *length,
                               ef_error *error) {
  cmsToneCurve *curve = build_curve(context, encoding->tone, error);
  if (curve == NULL)
    return EF_NO_MEMORY;
  cmsToneCurve *const curves[3] = {curve, curve, curve};
  const parts from = {
      .description = description,
      .copyright = "Figures of a published standard; no rights claimed",
      .white = encoding->white,
      .red = encoding->red,
      .green = encoding->green,
      .blue = encoding->blue,
      .curve = curves,
      .luminance_cd_m2 = nan(""),
  };
  cmsHPROFILE profile = build_profile(context, &from, error);
  cmsFreeToneCurve(curve);
  if (profile == NULL)
    return EF_NO_MEMORY;
  const ef_status status = save(profile, bytes, length, error);
  cmsCloseProfile(profile);
  return status;
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
  double matrix[9];
  ef_status status = check_description(description, error);
  if (status == EF_OK)
    status = ef_encoding_matrix(encoding, matrix, error);
  if (status != EF_OK)
    return status;
  cmsContext context = cmsCreateContext(NULL, NULL);
  if (context == NULL)
    return ef__error_memory(error, "a profile");
  status = make_encoding(context, description, encoding, bytes, length, error);
  cmsDeleteContext(context);
  return status;
}

/* ---- Of a display -------------------------------------------------------- */

enum { CURVE_STEPS = 4096 };

/* A display as a matrix profile has it. */
typedef struct profiled {
  const ef_device *device;
  double vector[9]; /* what each primary adds, Y of the white = 100 */
  double black[3];  /* in shares of the primaries, none below zero */
  ef_xyz white;     /* of the profile */
  ef_xyz left;      /* of the black, which the shares do not make */
  double luminance_cd_m2;
} profiled;

/* Shares of the primaries that make the black. */
static ef_status lay_black(const ef_setup *setup, profiled *out,
                           ef_error *error) {
  const double none[EF_MAX_DRIVES] = {0.0};
  double inverse[9], share[3];
  const ef_xyz black = ef_setup_xyz(setup, none, out->vector);
  if (!ef__mat3_inverse(out->vector, inverse))
    return ef__error_set(error, EF_NO_ANSWER,
                         "the primaries of '%s' are linearly dependent",
                         ef_device_name(out->device));
  const double xyz[3] = {black.X, black.Y, black.Z};
  double white[3] = {0.0}, made[3] = {0.0};
  ef__mat3_apply(inverse, xyz, share);
  for (size_t i = 0; i < 3; i++)
    out->black[i] = fmax(share[i], 0.0);
  ef__mat3_apply(out->vector, out->black, made);
  for (size_t c = 0; c < 3; c++) {
    white[c] = made[c];
    for (size_t i = 0; i < 3; i++)
      white[c] += out->vector[3 * c + i];
  }
  out->white = (ef_xyz){white[0], white[1], white[2]};
  out->left = (ef_xyz){xyz[0] - made[0], xyz[1] - made[1], xyz[2] - made[2]};
  return EF_OK;
}

static ef_status see_display(profiled *p, const ef_notes *notes,
                             ef_error *error) {
  ef_error own; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  ef_observer *observer = ef_observer_new("cie-1931", error);
  if (observer == NULL)
    return error->status;
  ef_setup *setup = ef_setup_new(p->device, observer, NULL, notes, error);
  ef_status status = setup == NULL ? error->status : EF_OK;
  if (status == EF_OK && !ef_setup_affine(setup))
    status =
        ef__error_set(error, EF_NO_ANSWER,
                      "'%s' (%s) is not additive, so no matrix describes "
                      "it",
                      ef_device_name(p->device), ef_device_kind(p->device));
  if (status == EF_OK) {
    status = lay_black(setup, p, error);
    p->luminance_cd_m2 = ef_setup_luminance_cd_m2(setup);
  }
  ef_setup_free(setup);
  ef_observer_free(observer);
  return status;
}

/* Curve of channel i with the black in it: (black + amount) / (black + 1). */
static cmsToneCurve *channel_curve(cmsContext context, const profiled *p,
                                   size_t i) {
  ef__parametric form;
  const double black = p->black[i];
  if (black == 0.0 && ef__tone_curve_parametric(p->device->curve[i], &form))
    return build_parametric(context, &form);
  cmsUInt16Number entry[CURVE_STEPS];
  for (size_t k = 0; k < CURVE_STEPS; k++) {
    const double drive = (double)k / (CURVE_STEPS - 1);
    const double amount = ef_device_amount(p->device, i, drive, NULL);
    entry[k] =
        (cmsUInt16Number)lround(65535.0 * (black + amount) / (black + 1.0));
  }
  return cmsBuildTabulatedToneCurve16(context, CURVE_STEPS, entry);
}

static ef_xy chromaticity(const profiled *p, size_t i) {
  const double *v = p->vector;
  const double sum = v[i] + v[3 + i] + v[6 + i];
  return (ef_xy){v[i] / sum, v[3 + i] / sum};
}

static ef_status make_display(cmsContext context, const char *description,
                              const profiled *p, unsigned char **bytes,
                              size_t *length, ef_error *error) {
  cmsToneCurve *curve[3] = {NULL, NULL, NULL};
  bool has_curves = true;
  for (size_t i = 0; i < 3; i++) {
    curve[i] = channel_curve(context, p, i);
    has_curves &= curve[i] != NULL;
  }
  const ef_xyy white = ef_xyz_to_xyy(p->white);
  const parts from = {
      .description = description,
      .copyright = "Made from measurements of a display",
      .white = {white.x, white.y},
      .red = chromaticity(p, 0),
      .green = chromaticity(p, 1),
      .blue = chromaticity(p, 2),
      .curve = curve,
      .luminance_cd_m2 = p->luminance_cd_m2,
  };
  cmsHPROFILE profile =
      has_curves ? build_profile(context, &from, error) : NULL;
  for (size_t i = 0; i < 3; i++)
    if (curve[i] != NULL)
      cmsFreeToneCurve(curve[i]);
  if (profile == NULL)
    return ef__error_memory(error, "a profile");
  const ef_status status = save(profile, bytes, length, error);
  cmsCloseProfile(profile);
  return status;
}

static void note_black(const profiled *p, const ef_notes *notes) {
  /* What 16 bits of a curve would round away is not worth a word. */
  const double least = 100.0 / 65535.0;
  const ef_xyz left = p->left;
  if (fabs(left.X) > least || fabs(left.Y) > least || fabs(left.Z) > least)
    ef__note(notes,
             "%s: the black is no mixture of the primaries, which is all that "
             "a matrix profile can say; left out of it (white Y = 100): X "
             "%.4f Y %.4f Z %.4f",
             ef_device_name(p->device), left.X, left.Y, left.Z);
}

ef_status ef_profile_make_display(const char *description,
                                  const ef_device *display,
                                  const ef_notes *notes, unsigned char **bytes,
                                  size_t *length, ef_error *error) {
  if (description == NULL || display == NULL || bytes == NULL || length == NULL)
    return ef__error_set(error, EF_INVALID,
                         "a profile needs a description, a display and a place "
                         "for its bytes");
  if (display->kind->reflects)
    return ef__error_set(error, EF_NO_ANSWER,
                         "'%s' (%s) reflects light; a matrix profile describes "
                         "displays",
                         display->name, display->kind->kind);
  if (display->n_drives != 3)
    return ef__error_set(error, EF_NO_ANSWER,
                         "'%s' has %zu primaries; a matrix profile has 3",
                         display->name, display->n_drives);
  profiled p = {.device = display};
  ef_status status = check_description(description, error);
  if (status == EF_OK)
    status = see_display(&p, notes, error);
  if (status != EF_OK)
    return status;
  note_black(&p, notes);
  cmsContext context = cmsCreateContext(NULL, NULL);
  if (context == NULL)
    return ef__error_memory(error, "a profile");
  status = make_display(context, description, &p, bytes, length, error);
  cmsDeleteContext(context);
  return status;
}
