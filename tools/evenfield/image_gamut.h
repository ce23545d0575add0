/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `image gamut`: which pixels of a picture a display cannot show. */
#ifndef COMMAND_IMAGE_GAMUT_H
#define COMMAND_IMAGE_GAMUT_H

#include "display.h"
#include "profile_fit.h"

/** files[1], and files[2] for the map; writes map and report. `*fails` when
 * --check finds a pixel that is off by more than the tolerance. */
ef_status image_gamut(const command_options *options, ef_output *output,
                      const ef_notes *notes, bool *fails, ef_error *error);

#endif
