/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The options that say what the eye is adapted to while it compares. */
#ifndef COMMAND_VIEWING_H
#define COMMAND_VIEWING_H

#include <evenfield/difference.h>

#include "option.h"

/** --white-luminance, --background and --surround, under `white`. */
ef_status viewing_conditions(const command_options *options, ef_xyz white,
                             ef_conditions *out, ef_error *error);
/** True for formulas that ask how bright the white is and what is around. */
bool viewing_matters(const ef_metric *metric);
/** "a white of 318 cd/m2, a background of 20 % of it and an average surround".
 */
void viewing_words(const ef_conditions *conditions, char text[200]);

#endif
