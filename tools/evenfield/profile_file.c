/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "profile_file.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <evenfield/exchange.h>

#include "message.h"

/* No profile of three or four channels comes near it. */
#define MOST_BYTES ((size_t)256 << 20)

static ef_status encoding_bytes(const char *name, const char *option,
                                unsigned char **bytes, size_t *length,
                                ef_error *error) {
  const ef_encoding *encoding = ef_encoding_find(name, error);
  if (encoding == NULL)
    return message_option(error, option, "; and there is no such file");
  return ef_profile_make_matrix(encoding->standard, encoding, bytes, length,
                                error);
}

static bool ends_with(const char *name, const char *end) {
  const size_t n = strlen(name), m = strlen(end);
  return n >= m && strcmp(name + n - m, end) == 0;
}

static bool is_file(const char *name) {
  return strcmp(name, "-") == 0 || strchr(name, '/') != NULL ||
         ends_with(name, ".icc") || ends_with(name, ".icm") ||
         access(name, F_OK) == 0;
}

ef_status profile_file_bytes(const char *name, const char *option,
                             unsigned char **bytes, size_t *length,
                             ef_error *error) {
  return option != NULL && !is_file(name)
             ? encoding_bytes(name, option, bytes, length, error)
             : ef_bytes_read(name, MOST_BYTES, bytes, length, error);
}

ef_profile *profile_file_load(const char *name, const char *option,
                              ef_error *error) {
  unsigned char *bytes = NULL;
  size_t length = 0;
  if (profile_file_bytes(name, option, &bytes, &length, error) != EF_OK)
    return NULL;
  ef_profile *profile = ef_profile_new(name, bytes, length, error);
  free(bytes);
  return profile;
}

ef_status profile_settings_load(const char *intent, bool scales_black,
                                ef_profile_settings *out, ef_error *error) {
  *out = ef_profile_settings_default();
  out->black_point_compensation = scales_black;
  if (intent != NULL && ef_intent_find(intent, &out->intent, error) != EF_OK)
    return message_option(error, "intent", "");
  if (scales_black && out->intent == EF_INTENT_ABSOLUTE) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--scale-black does not go with --intent absolute, "
                        "which keeps black and white as measured");
  }
  return EF_OK;
}

/* ---- Words --------------------------------------------------------------- */

static void add_tables(const ef_profile_info *info, text *out) {
  size_t n = 0;
  for (int i = EF_INTENT_PERCEPTUAL; i <= EF_INTENT_SATURATION; ++i) {
    if (!info->has_intent[i])
      continue;
    text_format(out, "%s%s", n++ == 0 ? ", tables for " : ", ",
                ef_intent_name((ef_intent)i));
  }
}

void profile_file_words(const ef_profile_info *info, text *out) {
  text_format(out, "%s %s profile of ICC version %d.%d", info->space,
              info->device_class, info->major, info->minor);
  if (info->is_matrix)
    text_add(out, ", three curves and a matrix");
  else
    add_tables(info, out);
}

void profile_intent_words(ef_intent intent, bool scales_black, text *out) {
  static const char *const words[] = {
      "perceptual: the profile's maker has changed colours so that pictures "
      "look right; they are not those measured",
      "relative: colours relative to the white of the medium, which goes to "
      "D50",
      "saturation: the profile's maker has changed colours to keep them "
      "vivid; they are not those measured",
      "absolute: colours with the white of the medium in them"};
  text_add(out, words[intent]);
  text_add(out, scales_black ? "; lightness is scaled so that black goes to "
                               "black (black point compensation)"
                             : "; black is left as it is");
}

void profile_channel_names(const ef_profile_info *info,
                           const char *names[EF_MAX_DRIVES]) {
  static const char *const numbered[EF_MAX_DRIVES] = {
      "ink_1", "ink_2", "ink_3", "ink_4", "ink_5", "ink_6", "ink_7", "ink_8"};
  static const char *const rgb[] = {"R", "G", "B"};
  static const char *const cmyk[] = {"C", "M", "Y", "K"};
  const char *const *from = numbered;
  static const char *const grey[] = {"grey"};
  if (strcmp(info->space, "RGB") == 0)
    from = rgb;
  else if (strcmp(info->space, "CMY") == 0 || strcmp(info->space, "CMYK") == 0)
    from = cmyk;
  else if (strcmp(info->space, "GRAY") == 0)
    from = grey;
  for (size_t i = 0; i < info->n_channels && i < EF_MAX_DRIVES; ++i)
    names[i] = from[i];
}

/* ---- Columns ------------------------------------------------------------- */

ef_status profile_check_columns(const ef_profile_info *info, const char *name,
                                const char *file, const ef_reader_head *head,
                                ef_error *error) {
  if (head->n_device == 0) {
    message_fail(error, EF_MALFORMED,
                 "has no device values (R,G,B or C,M,Y ...) for the profile "
                 "%.200s, only %s",
                 name, ef_content_text(head->content));
    return message_place(error, file);
  }
  const bool wants_rgb = strcmp(info->space, "RGB") == 0;
  const bool has_rgb = strcmp(head->device_name[0], "red") == 0;
  if (head->n_device == info->n_channels && has_rgb == wants_rgb)
    return EF_OK;
  message_fail(error, EF_MALFORMED,
               "has %zu device values a row, %s first; the profile %.200s is "
               "of %s",
               head->n_device, head->device_name[0], name, info->space);
  return message_place(error, file);
}
