/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --tone: curves by name or from a file with measured ramps. */
#ifndef COMMAND_TONE_H
#define COMMAND_TONE_H

#include <evenfield/device.h>

#include "option.h"

typedef struct tone_curves {
  size_t n; /**< 0: none asked for; 1: one for all; else one a channel */
  ef_tone_curve *curve[EF_MAX_DRIVES];
} tone_curves;

/** Free with tone_free in every case. */
ef_status tone_load(const command_options *options, const ef_notes *notes,
                    tone_curves *out, ef_error *error);
void tone_free(tone_curves *curves);

#endif
