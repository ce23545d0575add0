/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "viewing.h"

#include <math.h>
#include <stdio.h>

#include "message.h"

ef_status viewing_conditions(const command_options *options, ef_xyz white,
                             ef_conditions *out, ef_error *error) {
  ef_conditions c = ef_conditions_default(white);
  if (!isnan(options->white_cd_m2))
    c.white_luminance_cd_m2 = options->white_cd_m2;
  if (!isnan(options->background_Y))
    c.background_Y = options->background_Y;
  if (options->surround != NULL &&
      ef_surround_find(options->surround, &c.surround, error) != EF_OK) {
    return message_option(error, "surround", "");
  }
  *out = c;
  return EF_OK;
}

/* A middling grey tells which ones do. */
bool viewing_matters(const ef_metric *metric) {
  ef_conditions conditions = ef_conditions_default((ef_xyz){95, 100, 109});
  const ef_xyz grey = {30, 32, 30};
  double dim[3], bright[3];
  conditions.white_luminance_cd_m2 = 50.0;
  ef_metric_coordinates(metric, grey, &conditions, dim);
  conditions.white_luminance_cd_m2 = 5000.0;
  ef_metric_coordinates(metric, grey, &conditions, bright);
  return dim[0] != bright[0] || dim[1] != bright[1] || dim[2] != bright[2];
}

void viewing_words(const ef_conditions *conditions, char text[200]) {
  const double pi = 3.141592653589793;
  const double white_cd_m2 = conditions->white_luminance_cd_m2 > 0.0
                                 ? conditions->white_luminance_cd_m2
                                 : 1000.0 / pi;
  const double background =
      conditions->background_Y > 0.0 ? conditions->background_Y : 20.0;
  char white[EF_NUMBER_TEXT], share[EF_NUMBER_TEXT];
  ef_number_format_fixed(white_cd_m2, white_cd_m2 < 10.0 ? 2 : 0, white);
  ef_number_format(background, share);
  snprintf(text, 200,
           "a white of %s cd/m2, a background of %s %% of it and %s %s "
           "surround",
           white, share,
           conditions->surround == EF_SURROUND_AVERAGE ? "an" : "a",
           ef_surround_name(conditions->surround));
}
