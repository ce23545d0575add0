/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Swatches: target beside match, as tagged PNG. */
#ifndef EVENFIELD_PICTURE_H
#define EVENFIELD_PICTURE_H

#include <evenfield/base.h>
#include <evenfield/colour.h>

#ifdef __cplusplus
extern "C" {
#endif

/** Two colours side by side on one white. */
typedef struct ef_swatch {
  const char *name;  /**< UTF-8 */
  ef_xyz target;     /**< left half */
  ef_xyz match;      /**< right half */
  bool shown;        /**< the match shows the target; false: marked */
  double difference; /**< printed on the sheet, NaN: not printed */
} ef_swatch;

typedef struct ef_swatch_settings {
  ef_xyz white; /**< what both halves are seen against; becomes the
                     picture's white (CAT16) */
  int bits;     /**< 8 or 16 */
  size_t width; /**< pixels of one pair, 64 to 4096 */
  const char *difference_symbol; /**< beside the figure on the sheet */
  bool overwrite;
} ef_swatch_settings;
/** White of D65 with Y = 100, 8 bits, 512 pixels. */
EF_API ef_swatch_settings ef_swatch_settings_default(void);

/** What the writer could not do. */
typedef struct ef_swatch_report {
  size_t n_clipped; /**< halves outside the picture's own encoding */
  bool labelled;    /**< a sheet has its labels: false when no text could be
                         drawn (libcairo.so.2 or a font is missing), and for
                         single pictures, which have none */
} ef_swatch_report;

/** One picture: left half target, right half match, touching (the dividing
 * line is the eye's), twice as wide as high, no frame. A pair that is not
 * `shown` has stripes, dark and light by turns, across the lower outer corner
 * of the match, visible without colour vision.
 * Pixels are ITU-R BT.2020 primaries with the IEC 61966-2-1 curve, tagged by
 * cICP 9/13/0/1 and by an equal ICC profile for viewers without cICP. */
EF_API ef_status ef_swatch_write(const char *path, const ef_swatch *swatch,
                                 const ef_swatch_settings *settings,
                                 ef_swatch_report *report, ef_error *error);
/** All pairs on one sheet with a neutral grey ground (Y = 30), each with its
 * name and difference below and a line that explains the picture at the foot.
 * Text is drawn by libcairo.so.2, which is loaded here and stays loaded; where
 * that fails the sheet has no labels and the report says so. EF_INVALID for
 * more than 2^26 pixels: make `width` smaller. */
EF_API ef_status ef_swatch_write_sheet(const char *path, size_t n,
                                       const ef_swatch *swatches,
                                       const ef_swatch_settings *settings,
                                       ef_swatch_report *report,
                                       ef_error *error);

#ifdef __cplusplus
}
#endif

#endif
