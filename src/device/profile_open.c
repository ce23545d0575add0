/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Profiles as bytes in memory, and what they say of themselves. */
#include "device/profile_private.h"

#include "base/base_private.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* ---- Names --------------------------------------------------------------- */

static const char *const intent_names[] = {"perceptual", "relative",
                                           "saturation", "absolute"};
enum { N_INTENTS = sizeof intent_names / sizeof intent_names[0] };

const char *ef_intent_name(ef_intent intent) {
  return (size_t)intent < N_INTENTS ? intent_names[intent] : "unknown";
}

ef_status ef_intent_find(const char *name, ef_intent *out, ef_error *error) {
  for (size_t i = 0; i < N_INTENTS; i++) {
    if (!ef__name_equal(name, intent_names[i]))
      continue;
    *out = (ef_intent)i;
    return EF_OK;
  }
  return ef__error_unknown(error, "intent", name, intent_names, N_INTENTS);
}

cmsUInt32Number ef__profile_intent(ef_intent intent) {
  static const cmsUInt32Number numbers[N_INTENTS] = {
      INTENT_PERCEPTUAL, INTENT_RELATIVE_COLORIMETRIC, INTENT_SATURATION,
      INTENT_ABSOLUTE_COLORIMETRIC};
  return numbers[intent];
}

static const char *class_name(cmsProfileClassSignature signature) {
  switch ((cmsUInt32Number)signature) {
  case cmsSigDisplayClass:
    return "display";
  case cmsSigOutputClass:
    return "output";
  case cmsSigInputClass:
    return "input";
  case cmsSigColorSpaceClass:
    return "colour space";
  case cmsSigLinkClass:
    return "device link";
  case cmsSigAbstractClass:
    return "abstract";
  case cmsSigNamedColorClass:
    return "named colours";
  default:
    return "unknown";
  }
}

/* A signature without blanks at its end. */
static void write_signature(cmsUInt32Number signature, char out[5]) {
  for (int i = 0; i < 4; i++) {
    const unsigned char c = (unsigned char)(signature >> (24 - 8 * i));
    out[i] = c >= 0x20 && c < 0x7f ? (char)c : '?';
  }
  out[4] = '\0';
  for (int i = 3; i > 0 && out[i] == ' '; i--)
    out[i] = '\0';
}

/* ---- lcms2 --------------------------------------------------------------- */

static void keep_complaint(cmsContext context, cmsUInt32Number code,
                           const char *text) {
  ef__cms *cms = cmsGetContextUserData(context);
  (void)code;
  if (cms != NULL && cms->complaint[0] == '\0')
    snprintf(cms->complaint, sizeof cms->complaint, ": %s", text);
}

ef_status ef__cms_start(ef__cms *cms, ef_error *error) {
  cms->complaint[0] = '\0';
  cms->context = cmsCreateContext(NULL, cms);
  if (cms->context == NULL)
    return ef__error_memory(error, "a profile");
  cmsSetLogErrorHandlerTHR(cms->context, keep_complaint);
  return EF_OK;
}

void ef__cms_end(ef__cms *cms) {
  if (cms->context != NULL)
    cmsDeleteContext(cms->context);
  cms->context = NULL;
}

const char *ef__cms_complaint(const ef__cms *cms) {
  return cms->complaint;
}

cmsHPROFILE ef__profile_open(const ef_profile *profile, ef__cms *cms,
                             ef_error *error) {
  cmsHPROFILE handle = cmsOpenProfileFromMemTHR(
      cms->context, profile->bytes, (cmsUInt32Number)profile->length);
  if (handle == NULL) {
    ef__error_set(error, EF_MALFORMED, "lcms2 cannot read the profile%s",
                  ef__cms_complaint(cms));
    ef__error_place(error, profile->name, 0, 0, NULL);
  }
  return handle;
}

/* ---- What the profile says ----------------------------------------------- */

/* Tags that ICC.1:2022 requires, by class (8.2 to 8.6), ended by NO_TAG. `chad`
 * is required where the white was adapted, which the bytes do not tell. */
#define NO_TAG ((cmsTagSignature)0)
static const cmsTagSignature for_none[] = {NO_TAG};
static const cmsTagSignature for_all[] = {cmsSigProfileDescriptionTag,
                                          cmsSigCopyrightTag,
                                          cmsSigMediaWhitePointTag, NO_TAG};
static const cmsTagSignature for_matrix[] = {cmsSigRedColorantTag,
                                             cmsSigGreenColorantTag,
                                             cmsSigBlueColorantTag,
                                             cmsSigRedTRCTag,
                                             cmsSigGreenTRCTag,
                                             cmsSigBlueTRCTag,
                                             NO_TAG};
static const cmsTagSignature for_grey[] = {cmsSigGrayTRCTag, NO_TAG};
static const cmsTagSignature for_input[] = {cmsSigAToB0Tag, NO_TAG};
static const cmsTagSignature for_both_ways[] = {cmsSigAToB0Tag, cmsSigBToA0Tag,
                                                NO_TAG};
static const cmsTagSignature for_output[] = {
    cmsSigAToB0Tag, cmsSigAToB1Tag, cmsSigAToB2Tag, cmsSigBToA0Tag,
    cmsSigBToA1Tag, cmsSigBToA2Tag, cmsSigGamutTag, NO_TAG};

static bool has_tables(cmsHPROFILE handle) {
  return cmsIsTag(handle, cmsSigAToB0Tag) || cmsIsTag(handle, cmsSigBToA0Tag);
}

static const cmsTagSignature *required_of(const ef_profile *p,
                                          cmsHPROFILE handle) {
  const bool tables = has_tables(handle);
  switch ((cmsUInt32Number)p->device_class) {
  case cmsSigInputClass:
  case cmsSigDisplayClass:
    if (p->space == cmsSigGrayData && !tables)
      return for_grey;
    if (p->space == cmsSigRgbData && !tables)
      return for_matrix;
    return p->device_class == cmsSigInputClass ? for_input : for_both_ways;
  case cmsSigOutputClass:
    return p->space == cmsSigGrayData && !tables ? for_grey : for_output;
  case cmsSigColorSpaceClass:
    return for_both_ways;
  case cmsSigLinkClass:
  case cmsSigAbstractClass:
    return for_input;
  default:
    return for_none;
  }
}

static void list_missing(ef_profile *p, cmsHPROFILE handle,
                         const cmsTagSignature *tags) {
  for (; *tags != NO_TAG; tags++) {
    char signature[5];
    const size_t used = strlen(p->missing);
    if (cmsIsTag(handle, *tags))
      continue;
    write_signature(*tags, signature);
    snprintf(p->missing + used, sizeof p->missing - used, "%s%s",
             used > 0 ? " " : "", signature);
  }
}

static void read_intents(ef_profile *p, cmsHPROFILE handle) {
  /* A table of an absolute intent is that of the relative one. */
  static const cmsTagSignature table[N_INTENTS] = {
      cmsSigAToB0Tag, cmsSigAToB1Tag, cmsSigAToB2Tag, cmsSigAToB1Tag};
  p->info.is_matrix = cmsIsMatrixShaper(handle) && !has_tables(handle) &&
                      p->space == cmsSigRgbData;
  for (size_t i = 0; i < N_INTENTS; i++)
    p->info.has_intent[i] = p->info.is_matrix || cmsIsTag(handle, table[i]);
}

static void read_white(ef_profile *p, cmsHPROFILE handle) {
  const cmsCIEXYZ *white = cmsReadTag(handle, cmsSigMediaWhitePointTag);
  if (white == NULL)
    white = cmsD50_XYZ();
  p->info.media_white =
      (ef_xyz){100.0 * white->X, 100.0 * white->Y, 100.0 * white->Z};
}

static void read_info(ef_profile *p, cmsHPROFILE handle) {
  ef_profile_info *info = &p->info;
  p->space = cmsGetColorSpace(handle);
  p->device_class = cmsGetDeviceClass(handle);
  cmsGetProfileInfoASCII(handle, cmsInfoDescription, "en", "US", p->description,
                         sizeof p->description);
  p->description[sizeof p->description - 1] = '\0';
  for (char *at = p->description; *at != '\0'; at++)
    if (*at < 0x20 || *at > 0x7e)
      *at = '?';
  info->name = p->name;
  info->description = p->description;
  info->missing = p->missing;
  info->device_class = class_name(p->device_class);
  info->major = p->bytes[8];
  info->minor = p->bytes[9] >> 4;
  info->n_channels = cmsChannelsOf(p->space);
  write_signature(p->space, info->space);
  write_signature(cmsGetPCS(handle), info->pcs);
  list_missing(p, handle, for_all);
  list_missing(p, handle, required_of(p, handle));
  read_intents(p, handle);
  read_white(p, handle);
}

ef_profile_info ef_profile_get_info(const ef_profile *profile) {
  return profile->info;
}

/* ---- Construction -------------------------------------------------------- */

static ef_status read_profile(ef_profile *p, ef_error *error) {
  ef__cms cms;
  ef_status status = ef__cms_start(&cms, error);
  if (status != EF_OK)
    return status;
  cmsHPROFILE handle = ef__profile_open(p, &cms, error);
  if (handle != NULL) {
    read_info(p, handle);
    cmsCloseProfile(handle);
  } else {
    status = EF_MALFORMED;
  }
  ef__cms_end(&cms);
  return status;
}

ef_profile *ef_profile_new(const char *name, const void *bytes, size_t length,
                           ef_error *error) {
  size_t size;
  if (name == NULL || bytes == NULL) {
    ef__error_set(error, EF_INVALID, "a profile needs a name and its bytes");
    return NULL;
  }
  if (ef__profile_check_bytes(name, bytes, length, &size, error) != EF_OK)
    return NULL;
  ef_profile *p = ef__allocate_zeroed(1, sizeof *p);
  if (p != NULL) {
    p->name = ef__copy_text(name, strlen(name));
    p->bytes = ef__allocate(size, 1);
  }
  if (p == NULL || p->name == NULL || p->bytes == NULL) {
    ef__error_memory(error, "a profile");
    ef_profile_free(p);
    return NULL;
  }
  memcpy(p->bytes, bytes, size);
  p->length = size;
  if (read_profile(p, error) == EF_OK)
    return p;
  ef_profile_free(p);
  return NULL;
}

void ef_profile_free(ef_profile *profile) {
  if (profile == NULL)
    return;
  free(profile->name);
  free(profile->bytes);
  free(profile);
}
