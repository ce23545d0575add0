/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What members of the conditions that are zero stand for. */
#include "difference/difference_private.h"

ef_conditions ef_conditions_default(ef_xyz white) {
  return (ef_conditions){.white = white};
}

double ef__white_luminance_cd_m2(const ef_conditions *conditions) {
  const double under_1000_lx = 318.30988618379067; /* 1000 / pi */
  return conditions->white_luminance_cd_m2 > 0
             ? conditions->white_luminance_cd_m2
             : under_1000_lx;
}

double ef__background_Y(const ef_conditions *conditions) {
  return conditions->background_Y > 0 ? conditions->background_Y : 20;
}

double ef__adapting_luminance_cd_m2(const ef_conditions *conditions) {
  if (conditions->adapting_luminance_cd_m2 > 0)
    return conditions->adapting_luminance_cd_m2;
  return ef__white_luminance_cd_m2(conditions) * ef__background_Y(conditions) /
         100;
}
