/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as an ICC profile: refused with words, or a device, transforms and
 * matches that end. */
#include <math.h>
#include <string.h>

#include <evenfield/match.h>

#include "promise.h"

static void check_error(const ef_error *error) {
  require_that(error->status == EF_MALFORMED || error->status == EF_NO_ANSWER ||
                   error->status == EF_INVALID,
               "a profile is refused as what it is");
  require_words(error, NULL);
}

static void check_info(const ef_profile *profile) {
  const ef_profile_info info = ef_profile_get_info(profile);
  require_that(strcmp(info.name, "t.icc") == 0, "a profile has its name");
  require_that(info.device_class[0] != '\0', "a profile has a class");
  for (const char *at = info.description; *at != '\0'; at++)
    require_that(*at >= 0x20 && *at < 0x7f, "a description is plain");
  require_that(strlen(info.space) > 0, "a profile has a space");
}

static void match_some(const ef_setup *setup) {
  static const double target[6] = {20, 15, 30, 95, 100, 80};
  const ef_match_settings settings = ef_match_settings_default();
  ef_match match[2];
  const ef_status status =
      ef_match_batch(setup, 2, target, &settings, 1, match, NULL);
  require_that(status == EF_OK || status == EF_NO_ANSWER,
               "a match is answered");
}

static void use_device(const ef_profile *profile, ef_intent intent,
                       const ef_observer *observer) {
  ef_error error = {0};
  ef_profile_settings settings = ef_profile_settings_default();
  settings.intent = intent;
  settings.black_point_compensation = intent == EF_INTENT_RELATIVE;
  ef_device *device = ef_profile_device(profile, &settings, &error);
  if (device == NULL) {
    check_error(&error);
    return;
  }
  require_that(ef_device_n_drives(device) == 3, "a device has three drives");
  ef_setup *setup = ef_setup_new(device, observer, NULL, NULL, &error);
  if (setup != NULL)
    match_some(setup);
  else
    check_error(&error);
  ef_setup_free(setup);
  ef_device_free(device);
}

static void use_transforms(const ef_profile *profile) {
  const double in[2 * EF_MAX_DRIVES] = {0.2, 0.7, 0, 1, 0.5, 1e9, -3, 0.1};
  double out[2 * EF_MAX_DRIVES];
  for (int k = 0; k < 4; k++) {
    ef_error error = {0};
    const ef_transform_settings settings = {.intent = (ef_intent)k,
                                            .lab = k % 2 == 1};
    const bool back = k >= 2;
    ef_transform *t = ef_transform_new(
        back ? NULL : profile, back ? profile : NULL, &settings, &error);
    if (t == NULL) {
      check_error(&error);
      continue;
    }
    require_that(ef_transform_inputs(t) <= EF_MAX_DRIVES &&
                     ef_transform_outputs(t) <= EF_MAX_DRIVES,
                 "no more values than there is room for");
    require_that(ef_transform_apply(t, 2, in, 1, out, NULL) == EF_OK,
                 "colours are transformed");
    ef_transform_free(t);
  }
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length) {
  static ef_observer *observer = NULL; /* lives as long as the program */
  ef_error error = {0};
  if (observer == NULL)
    observer = ef_observer_new("cie-1931", NULL);
  ef_profile *profile = ef_profile_new("t.icc", bytes, length, &error);
  if (profile == NULL) {
    check_error(&error);
    return 0;
  }
  check_info(profile);
  use_device(profile, (ef_intent)(length % 4), observer);
  use_transforms(profile);
  ef_profile_free(profile);
  return 0;
}
