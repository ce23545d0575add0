/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Options of `isolate` that hold more than one value. */
#include <math.h>
#include <string.h>

#include "isolate.h"
#include "message.h"

/* Numbers parted by `mark`, 1 to `most` of them; 0 when they are not. */
static size_t read_list(const char *words, char mark, size_t most,
                        double *value) {
  size_t n = 0;
  for (;;) {
    const char *end = strchr(words, mark);
    const size_t length = end != NULL ? (size_t)(end - words) : strlen(words);
    if (n == most || !ef_number_parse(words, length, '.', &value[n]))
      return 0;
    ++n;
    if (end == NULL)
      return n;
    words = end + 1;
  }
}

/* ---- The background ---------------------------------------------------- */

typedef enum place_unit { UNIT_AMOUNT, UNIT_DRIVE, UNIT_CODE } place_unit;

static ef_status bad_place(const char *words, size_t n_primaries,
                           ef_error *error) {
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--background is one number, or one for each of the %zu "
                      "primaries, such as 0.5,0.5,0.5, drive:LIST, codes:LIST, "
                      "metamer:LIST, largest or largest:SHARE; \"%.100s\" is "
                      "none of them",
                      n_primaries, words);
}

static ef_status to_amount(const command_options *o, const ef_device *device,
                           place_unit unit, size_t i, double *value,
                           ef_error *error) {
  const double most = ldexp(1.0, o->bits) - 1.0;
  const double low = 0.0, high = unit == UNIT_CODE ? most : 1.0;
  static const char *const what[] = {"amount", "drive", "code"};
  if (!(*value >= low && *value <= high)) {
    return message_fail(error, EF_NO_ANSWER,
                        "--background: the %s of %.60s is %g, outside the "
                        "gamut: 0 to %g",
                        what[unit], ef_device_drive_name(device, i), *value,
                        high);
  }
  if (unit == UNIT_CODE && *value != floor(*value)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--background: the code of %.60s is %g; a code is a "
                        "whole number",
                        ef_device_drive_name(device, i), *value);
  }
  if (unit == UNIT_CODE)
    *value /= most;
  if (unit != UNIT_AMOUNT)
    *value = ef_device_amount(device, i, *value, NULL);
  return EF_OK;
}

static bool starts_with(const char **words, const char *start) {
  const size_t length = strlen(start);
  if (strncmp(*words, start, length) != 0)
    return false;
  *words += length;
  return true;
}

static ef_status read_place(const command_options *o, const ef_device *device,
                            const char *list, place_unit unit, double *amount,
                            ef_error *error) {
  const size_t n = ef_device_n_drives(device);
  const size_t given = read_list(list, ',', EF_MAX_DRIVES, amount);
  if (given != n && given != 1)
    return bad_place(o->background, n, error);
  for (size_t i = given; i < n; ++i)
    amount[i] = amount[0];
  ef_status status = EF_OK;
  for (size_t i = 0; i < n && status == EF_OK; ++i)
    status = to_amount(o, device, unit, i, &amount[i], error);
  return status;
}

ef_status isolate_background(const command_options *options,
                             const ef_device *device,
                             ef_isolate_settings *settings, ef_error *error) {
  const char *words = options->background;
  if (words == NULL)
    return EF_OK;
  if (strcmp(words, "largest") == 0) {
    settings->background_rule = EF_BACKGROUND_FREE;
    return EF_OK;
  }
  if (starts_with(&words, "largest:")) {
    settings->background_rule = EF_BACKGROUND_FREE;
    if (read_list(words, ',', 1, &settings->least_share) == 1 &&
        settings->least_share > 0.0 && settings->least_share < 1.0)
      return EF_OK;
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--background largest:SHARE takes a share between 0 "
                        "and 1, not \"%.100s\"",
                        words);
  }
  place_unit unit = UNIT_AMOUNT;
  if (starts_with(&words, "metamer:"))
    settings->background_rule = EF_BACKGROUND_SAME_CONES;
  else if (starts_with(&words, "drive:"))
    unit = UNIT_DRIVE;
  else if (starts_with(&words, "codes:"))
    unit = UNIT_CODE;
  return read_place(options, device, words, unit, settings->background, error);
}

/* ---- Luminance and pupil ----------------------------------------------- */

ef_status isolate_weights(const char *words, double weight[3],
                          ef_error *error) {
  weight[2] = 0.0;
  const size_t n = read_list(words, ':', 3, weight);
  bool is_good = n >= 2;
  for (size_t i = 0; i < 3 && is_good; ++i)
    is_good = weight[i] >= 0.0;
  if (is_good && weight[0] + weight[1] > 0.0)
    return EF_OK;
  return message_fail(
      error, EF_UNKNOWN_NAME,
      "--luminance-weights is L:M or L:M:S, such as 1.8:1, "
      "none below zero and L and M not both zero, not \"%.100s\"",
      words);
}

static ef_status bad_pupil(const char *words, ef_error *error) {
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--pupil is a diameter of 1 to 10 mm, moon-spencer, "
                      "stanley-davies, watson-yellott or watson-yellott:AGE "
                      "with an age of 20 to 83 years, not \"%.100s\"",
                      words);
}

ef_status isolate_pupil(const char *words, const ef_observer *observer,
                        ef_pupil *pupil, ef_error *error) {
  *pupil = ef_pupil_default();
  ef_cone_model model;
  if (ef_observer_model(observer, &model))
    pupil->age_years = model.age_years;
  if (words == NULL)
    return EF_OK;
  if (read_list(words, ',', 1, &pupil->diameter_mm) == 1) {
    pupil->formula = EF_PUPIL_GIVEN;
    return pupil->diameter_mm >= 1.0 && pupil->diameter_mm <= 10.0
               ? EF_OK
               : bad_pupil(words, error);
  }
  const char *age = words;
  if (starts_with(&age, "watson-yellott:")) {
    pupil->formula = EF_PUPIL_WATSON_YELLOTT;
    return read_list(age, ',', 1, &pupil->age_years) == 1 &&
                   pupil->age_years >= 20.0 && pupil->age_years <= 83.0
               ? EF_OK
               : bad_pupil(words, error);
  }
  ef_error ignored;
  if (ef_pupil_find(words, &pupil->formula, &ignored) != EF_OK ||
      pupil->formula == EF_PUPIL_GIVEN)
    return bad_pupil(words, error);
  return EF_OK;
}
