/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Colour tags of PNG pictures as profiles. */
#include "image/image_private.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* ---- Encodings as profiles ------------------------------------------------ */

static ef_profile *encoding_profile(const char *name,
                                    const ef_encoding *encoding,
                                    ef_error *error) {
  unsigned char *bytes = NULL;
  size_t length = 0;
  if (ef_profile_make_matrix(name, encoding, &bytes, &length, error) != EF_OK)
    return NULL;
  ef_profile *profile = ef_profile_new(name, bytes, length, error);
  free(bytes);
  return profile;
}

/* ---- cICP ----------------------------------------------------------------- */

/* TransferCharacteristics of ITU-T H.273, table 3, that are relative to a
 * white, and the curve of a display for each. */
static const struct {
  int code;
  const char *tone, *about;
} curves[] = {{1, "power:2.4", "BT.709, shown per BT.1886"},
              {4, "power:2.2", "power 2.2"},
              {5, "power:2.8", "power 2.8"},
              {6, "power:2.4", "BT.601, shown per BT.1886"},
              {8, "linear", "linear"},
              {13, "iec61966-2-1", "IEC 61966-2-1"},
              {14, "power:2.4", "BT.2020, shown per BT.1886"},
              {15, "power:2.4", "BT.2020, shown per BT.1886"}};
enum { N_CURVES = sizeof curves / sizeof curves[0] };

static const ef_encoding *find_primaries(int code) {
  for (size_t i = 0; code > 0 && i < ef_encoding_count(); ++i) {
    if (ef_encoding_at(i)->h273 == code)
      return ef_encoding_at(i);
  }
  return NULL;
}

static size_t find_curve(int code) {
  size_t i = 0;
  while (i < N_CURVES && curves[i].code != code)
    ++i;
  return i;
}

static ef_profile *from_cicp(const ef_png_head *head, char about[240],
                             ef_error *error) {
  const ef_encoding *primaries = find_primaries(head->primaries);
  const size_t curve = find_curve(head->transfer);
  if (head->matrix != 0 || !head->is_full_range) {
    ef__error_set(error, EF_NO_ANSWER,
                  head->matrix != 0
                      ? "chunk cICP says matrix %d; samples of PNG are RGB, "
                        "matrix 0"
                      : "chunk cICP says narrow range, which is not read",
                  head->matrix);
    return NULL;
  }
  if (primaries == NULL || curve == N_CURVES) {
    ef__error_set(error, EF_NO_ANSWER,
                  "chunk cICP says %s %d of ITU-T H.273, which %s",
                  primaries == NULL ? "primaries" : "transfer",
                  primaries == NULL ? head->primaries : head->transfer,
                  primaries == NULL ? "are not known here"
                                    : "is not known here or is not relative to "
                                      "a white");
    return NULL;
  }
  ef_encoding encoding = *primaries;
  encoding.tone = curves[curve].tone;
  snprintf(about, 240, "chunk cICP: primaries %d (%s), transfer %d (%s)",
           head->primaries, primaries->name, head->transfer,
           curves[curve].about);
  return encoding_profile("cICP", &encoding, error);
}

/* ---- iCCP ----------------------------------------------------------------- */

ef_status ef__tags_check(const ef_png_head *head, const ef_profile *profile,
                         ef_error *error) {
  const ef_profile_info info = ef_profile_get_info(profile);
  if (strcmp(info.space, "RGB") == 0 ||
      (strcmp(info.space, "GRAY") == 0 && head->is_grey))
    return EF_OK;
  return ef__error_set(error, EF_NO_ANSWER,
                       "the profile '%s' is of %s, and the picture is %s",
                       info.name, info.space, head->layout);
}

static ef_profile *from_iccp(const ef_png_head *head, char about[240],
                             ef_error *error) {
  ef_profile *profile =
      ef_profile_new("iCCP", head->profile, head->profile_length, error);
  if (profile == NULL)
    return NULL;
  const ef_profile_info info = ef_profile_get_info(profile);
  snprintf(about, 240, "chunk iCCP: \"%.100s\", %s %s profile of version %d.%d",
           info.description, info.space, info.device_class, info.major,
           info.minor);
  if (ef__tags_check(head, profile, error) == EF_OK)
    return profile;
  ef_profile_free(profile);
  return NULL;
}

/* ---- sRGB, gAMA, cHRM ----------------------------------------------------- */

static ef_profile *from_srgb(char about[240], ef_error *error) {
  const ef_encoding *encoding = ef_encoding_find("srgb", error);
  snprintf(about, 240, "chunk sRGB: IEC 61966-2-1");
  return encoding != NULL ? encoding_profile("sRGB", encoding, error) : NULL;
}

static ef_profile *from_gama(const ef_png_head *head, const ef_notes *notes,
                             char about[240], ef_error *error) {
  const ef_encoding *bt709 = ef_encoding_find("srgb", error);
  if (bt709 == NULL)
    return NULL;
  ef_encoding encoding = *bt709;
  char number[EF_NUMBER_TEXT], tone[EF_NUMBER_TEXT + 8] = "iec61966-2-1";
  if (head->has_gamma) {
    /* The chunk holds the power of the camera, 1 / 2.2 as 45455. */
    ef_number_format(1.0 / head->gamma, number);
    snprintf(tone, sizeof tone, "power:%s", number);
    encoding.tone = tone;
  }
  if (head->has_chromaticities) {
    encoding.name = "cHRM";
    encoding.white = head->white;
    encoding.red = head->red;
    encoding.green = head->green;
    encoding.blue = head->blue;
  }
  if (!head->has_gamma)
    ef__note(notes, "%s: chunk cHRM without gAMA: the curve of IEC 61966-2-1 "
                    "is assumed",
             head->file);
  if (!head->has_chromaticities)
    ef__note(notes, "%s: chunk gAMA without cHRM: the primaries of ITU-R "
                    "BT.709 and the white of D65 are assumed",
             head->file);
  snprintf(about, 240, "chunk%s: %s, primaries %s",
           head->has_gamma && head->has_chromaticities ? "s gAMA and cHRM"
           : head->has_gamma                           ? " gAMA"
                                                       : " cHRM",
           tone, head->has_chromaticities ? "of its own" : "of BT.709, assumed");
  return encoding_profile("gAMA and cHRM", &encoding, error);
}

/* ---- In their order ------------------------------------------------------- */

static ef_profile *try_source(const ef_png_head *head, ef_png_source source,
                              const ef_notes *notes, char about[240],
                              ef_error *error) {
  switch (source) {
  case EF_PNG_CICP:
    return from_cicp(head, about, error);
  case EF_PNG_ICCP:
    return from_iccp(head, about, error);
  case EF_PNG_SRGB:
    return from_srgb(about, error);
  case EF_PNG_GAMA:
    return from_gama(head, notes, about, error);
  case EF_PNG_UNTAGGED:
    break;
  }
  return NULL;
}

static bool has_source(const ef_png_head *head, ef_png_source source) {
  return source == EF_PNG_CICP   ? head->has_cicp
         : source == EF_PNG_ICCP ? head->has_iccp
         : source == EF_PNG_SRGB ? head->has_srgb
                                 : head->has_gamma || head->has_chromaticities;
}

ef_profile *ef__tags_profile(const ef_png_head *head, const ef_notes *notes,
                             ef_picture_colours *colours, ef_error *error) {
  static const ef_png_source order[] = {EF_PNG_CICP, EF_PNG_ICCP, EF_PNG_SRGB,
                                        EF_PNG_GAMA};
  ef_error reason = {0};
  for (size_t i = 0; i < sizeof order / sizeof order[0]; ++i) {
    if (!has_source(head, order[i]))
      continue;
    if (reason.status != EF_OK) /* of the one before */
      ef__note(notes, "%s: a colour tag is passed over: %s", head->file,
               reason.message);
    colours->source = order[i];
    ef_profile *profile =
        try_source(head, order[i], notes, colours->about, &reason);
    if (profile != NULL)
      return profile;
    if (reason.status == EF_NO_MEMORY)
      break;
  }
  if (reason.status == EF_OK && head->damage[0] != '\0')
    ef__error_set(error, EF_NO_ANSWER,
                  "has a damaged colour tag (%s) and no other, so its colours "
                  "are not known",
                  head->damage);
  else if (reason.status == EF_OK)
    ef__error_set(error, EF_NO_ANSWER,
                  "has no colour tags (cICP, iCCP, sRGB, gAMA, cHRM), so its "
                  "colours are not known");
  else
    ef__error_set(error, reason.status == EF_NO_MEMORY ? EF_NO_MEMORY
                                                       : EF_NO_ANSWER,
                  "%s", reason.message);
  ef__error_place(error, head->file, 0, 0, NULL);
  return NULL;
}
