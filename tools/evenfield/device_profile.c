/* SPDX-License-Identifier: GPL-3.0-or-later */
/* --profile: any RGB, CMY or CMYK device, as its ICC profile describes it. */
#include "device.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "match.h"
#include "message.h"
#include "profile_file.h"

typedef struct own_profile {
  ef_profile *profile;
  ef_profile_info info;
  ef_profile_settings settings;
} own_profile;

/* ---- Loading ------------------------------------------------------------- */

static bool is_ink(const own_profile *own) {
  return strcmp(own->info.space, "RGB") != 0;
}

/* Code values for RGB, steps of 1 % for inks, unless asked otherwise. */
static void set_steps(const command_options *o, const own_profile *own,
                      chosen_device *out) {
  if (o->match_bits >= 0 || !is_ink(own)) {
    out->bits = o->match_bits >= 0 ? o->match_bits : 8;
    return;
  }
  const double step = isnan(o->step_percent) ? 1.0 : o->step_percent;
  char number[EF_NUMBER_TEXT];
  out->n_steps = (int)lround(100.0 / step);
  ef_number_format(step, number);
  snprintf(out->step, sizeof out->step, "%.16s %%", number);
}

static ef_status check_black(const command_options *o, const own_profile *own,
                             ef_error *error) {
  if (!isnan(o->black_percent) && strcmp(own->info.space, "CMYK") != 0) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--black is the black of CMYK, and the profile is of "
                        "%s",
                        own->info.space);
  }
  if (!isnan(o->step_percent) && !is_ink(own)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--step is for inks, and the profile is of RGB, which "
                        "has code values (--bits)");
  }
  return EF_OK;
}

static ef_status load(const device_basis *b, chosen_device *out,
                      ef_error *error) {
  const command_options *o = b->options;
  own_profile *own = calloc(1, sizeof *own);
  out->own = own;
  if (own == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for a profile");
  ef_status status = profile_settings_load(o->intent, o->scale_black,
                                           &own->settings, error);
  if (status != EF_OK)
    return status;
  own->profile = profile_file_load(out->source, "profile", error);
  if (own->profile == NULL)
    return error->status;
  own->info = ef_profile_get_info(own->profile);
  status = check_black(o, own, error);
  if (status != EF_OK)
    return status;
  own->settings.black = isnan(o->black_percent) ? 0.0 : o->black_percent / 100;
  own->settings.notes = b->notes;
  out->device = ef_profile_device(own->profile, &own->settings, error);
  out->is_subtractive = is_ink(own);
  out->has_black = own->info.n_channels == 4;
  out->black_percent = 100.0 * own->settings.black;
  set_steps(o, own, out);
  return out->device != NULL ? EF_OK : error->status;
}

static void free_own(chosen_device *d) {
  own_profile *own = d->own;
  if (own != NULL)
    ef_profile_free(own->profile);
  free(own);
}

/* ---- What it rests on ---------------------------------------------------- */

static void describe(text *out, const match_scene *s) {
  const own_profile *own = s->device.own;
  text t = {0};
  text_format(&t, "%s, \"%s\": ", s->device.source, own->info.description);
  profile_file_words(&own->info, &t);
  if (strcmp(own->info.space, "CMYK") == 0) {
    char number[EF_NUMBER_TEXT];
    ef_number_format(100.0 * own->settings.black, number);
    text_format(&t, "; black stays at %s %%%s", number,
                isnan(s->options->black_percent)
                    ? " (--black names another; what the profile itself would "
                      "take, `evenfield profile convert` tells)"
                    : "");
  }
  text_label(out, "Profile", &t);
  profile_intent_words(own->settings.intent,
                       own->settings.black_point_compensation, &t);
  text_label(out, "Intent", &t);
  text_add(&t, "the way from device values to colours (the profile's A to B), "
               "searched for each target; the profile's own way back is not "
               "used. How true the profile is to its device, `evenfield profile "
               "check` tells");
  text_label(out, "Matched by", &t);
  if (!is_ink(own))
    return;
  text_add(&t, "D50 only: what others do follows from spectra, and a profile "
               "has none");
  text_label(out, "Lights", &t);
}

/* ---- As data ------------------------------------------------------------- */

static void write(ef_json *j, const match_scene *s) {
  const own_profile *own = s->device.own;
  const ef_device *device = s->device.device;
  ef_json_text(j, "description", own->info.description);
  ef_json_text(j, "class", own->info.device_class);
  ef_json_text(j, "space", own->info.space);
  ef_json_boolean(j, "is_matrix", own->info.is_matrix);
  ef_json_text(j, "intent", ef_intent_name(own->settings.intent));
  ef_json_boolean(j, "scales_black", own->settings.black_point_compensation);
  if (strcmp(own->info.space, "CMYK") == 0)
    ef_json_number(j, "black", own->settings.black);
  ef_json_begin_array(j, "channels");
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "name", ef_device_drive_name(device, i));
    ef_json_text(j, "tone_curve", ef_device_curve_about(device, i));
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

const device_kind device_profile = {
    .key = "profile",
    .option = "profile",
    .illuminant = "D50",
    .demo_story = "on the device of a profile",
    .demo_device = "the device of a profile",
    .words = {.noun = "device",
              .title = "Profile",
              .shows = "show",
              .shown = "shown",
              .amounts = "Amount, %",
              .channel = "channel",
              .channels = "channels",
              .spectra = "spectra, which profiles have none of",
              .none = "all channels at zero",
              .all = "all channels at full"},
    .load = load,
    .free = free_own,
    .describe = describe,
    .write = write};
