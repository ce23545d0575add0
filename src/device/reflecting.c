/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What devices that reflect have in common when an observer looks at them. */
#include "device/device_private.h"

#include <stdlib.h>

ef_weights *ef__reflecting_weights(const ef_observer *observer,
                                   const ef_illuminant *illuminant,
                                   const ef_grid *grid, const ef_notes *notes,
                                   double white[3], ef_error *error) {
  if (ef_observer_white(observer, EF_TRISTIMULUS, illuminant, NULL, white,
                        error) != EF_OK)
    return NULL;
  const ef_viewing viewing = ef_viewing_default(illuminant);
  return ef_observer_weights(observer, EF_TRISTIMULUS, grid, &viewing, notes,
                             error);
}
