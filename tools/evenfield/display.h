/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --display: the device, and what its file tells about how far an additive
 * model holds. */
#ifndef COMMAND_DISPLAY_H
#define COMMAND_DISPLAY_H

#include <evenfield/device.h>
#include <evenfield/difference.h>

#include "option.h"
#include "residuals.h"

/** Bits of a code value where none are asked for. */
enum { DISPLAY_BITS = 8 };

typedef enum display_origin {
  DISPLAY_PRIMARIES,    /**< spectra of the primaries */
  DISPLAY_MEASUREMENTS, /**< measured rows with their device values */
  DISPLAY_ENCODING      /**< a published encoding */
} display_origin;

typedef struct display {
  ef_device *device;
  const char *source; /**< as named on the command line */
  display_origin origin;
  const ef_encoding *encoding; /**< of DISPLAY_ENCODING */
  ef_additivity additivity;
  double additivity_difference; /**< NaN when not known */
  residuals residuals;          /**< of mixtures, against the additive model */
} display;

/** The display named by the options, which must name one. Failures count as bad
 * input, whatever the library calls them. Free with display_free in every
 * case. */
ef_status display_load(const command_options *options, const ef_metric *metric,
                       const ef_notes *notes, display *out, ef_error *error);
void display_free(display *d);
/** "measured rows of the display" ... Static. */
const char *display_origin_text(display_origin origin);

#endif
