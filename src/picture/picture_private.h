/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of picture/ share: colours as pixels, rasters, and a pen for
 * labels. */
#ifndef EVENFIELD_PICTURE_PRIVATE_H
#define EVENFIELD_PICTURE_PRIVATE_H

#include <evenfield/exchange.h>
#include <evenfield/picture.h>

/* ---- Colours as pixels (raster.c) -------------------------------------- */

/** XYZ to the linear light of the picture's primaries, 1 at its white. */
typedef struct ef__encoder {
  double to_linear[9];
} ef__encoder;

/** Encoded samples in the 16-bit range. */
typedef struct ef__pixel {
  uint16_t code[3];
} ef__pixel;

/** Of colours seen against `white`, which becomes the picture's white by
 * CAT16. */
ef_status ef__encoder_init(ef__encoder *encoder, ef_xyz white, ef_error *error);
/** The pixel of a colour; *clipped is set (never cleared) when the colour lies
 * outside the encoding, so that the pixel is another. */
ef__pixel ef__encode(const ef__encoder *encoder, ef_xyz xyz, bool *clipped);

/* ---- Rasters (raster.c) ------------------------------------------------ */

typedef struct ef__raster {
  size_t width, height;
  uint16_t *sample; /**< height x width x 3; owned, released with free() */
} ef__raster;

/** A rectangle in pixels, which must lie inside the raster. */
typedef struct ef__box {
  size_t x, y, width, height;
} ef__box;

/** EF_INVALID for more than 2^26 pixels. */
ef_status ef__raster_init(ef__raster *raster, size_t width, size_t height,
                          ef__pixel ground, ef_error *error);
void ef__raster_fill(ef__raster *raster, ef__box box, ef__pixel pixel);
/** Stripes by turns of `dark` and `light` across the lower right corner of
 * `box`: a triangle with legs of about a third of its height, six stripes
 * parallel to the cut. */
void ef__raster_mark(ef__raster *raster, ef__box box, ef__pixel dark,
                     ef__pixel light);
/** Mixes `ink` over `box` by a mask of coverages 0 to 255, in linear light. */
void ef__raster_blend(ef__raster *raster, ef__box box,
                      const unsigned char *mask, size_t stride, ef__pixel ink);
/** As PNG with its colour tags. */
ef_status ef__raster_write(const ef__raster *raster, const char *path,
                           bool overwrite, int bits, ef_error *error);

/** The same into an output that goes on. */
ef_status ef__raster_write_to(ef__raster *raster, ef_output *output, int bits,
                              ef_error *error);

/* ---- Swatches (swatch.c) ----------------------------------------------- */

/** The picture of ef_swatch_write into an output that goes on. */
ef_status ef__swatch_write_to(ef_output *output, const ef_swatch *swatch,
                              const ef_swatch_settings *settings,
                              ef_swatch_report *report, ef_error *error);

/* ---- Labels (text.c) --------------------------------------------------- */

typedef struct ef__pen ef__pen;

/** A pen for text `size_px` high, or NULL where no text can be drawn. */
ef__pen *ef__pen_new(double size_px);
void ef__pen_free(ef__pen *pen);
/** Pixels from one line of text to the next. */
size_t ef__pen_line_height(const ef__pen *pen);
/** Advance width of the text in pixels. */
double ef__pen_width(const ef__pen *pen, const char *text);
/** Draws one line of UTF-8 into `box`, from its left edge; what is too long
 * ends in an ellipsis. False when nothing could be drawn. */
bool ef__pen_draw(const ef__pen *pen, ef__raster *raster, ef__box box,
                  const char *text, ef__pixel ink);

#endif
