/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * ICC profiles by name: files, and published encodings made into profiles. */
#ifndef COMMAND_PROFILE_FILE_H
#define COMMAND_PROFILE_FILE_H

#include <evenfield/device.h>

#include <evenfield/exchange.h>

#include "text.h"

/** A file, or the name of a published encoding ("srgb" ...). `option` NULL: an
 * operand, which is a file. */
ef_profile *profile_file_load(const char *name, const char *option,
                              ef_error *error);
/** The bytes of the same; free with free(). */
ef_status profile_file_bytes(const char *name, const char *option,
                             unsigned char **bytes, size_t *length,
                             ef_error *error);
/** "RGB display profile of version 4.4, three curves and a matrix". */
void profile_file_words(const ef_profile_info *info, text *out);
/** What an intent does to white and black, for people. */
void profile_intent_words(ef_intent intent, bool scales_black, text *out);
/** --intent and --scale-black; the intent is relative unless asked. */
ef_status profile_settings_load(const char *intent, bool scales_black,
                                ef_profile_settings *out, ef_error *error);
/** Names of the channels of a space ("R", "G", "B" ...), as many as it has. */
void profile_channel_names(const ef_profile_info *info,
                           const char *names[EF_MAX_DRIVES]);
/** Refuses a file whose device values are not those of the profile called
 * `name`. */
ef_status profile_check_columns(const ef_profile_info *info, const char *name,
                                const char *file, const ef_reader_head *head,
                                ef_error *error);

#endif
