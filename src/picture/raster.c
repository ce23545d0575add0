/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/picture_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/device.h>
#include <evenfield/exchange.h>

#include "base/base_private.h"
#include "exchange/exchange_private.h"

/* Largest code of the 16-bit range. */
#define TOP 65535.0
#define MOST_PIXELS ((size_t)1 << 26)
/* Stripes of the mark, and its share of the height. */
#define STRIPES 6
#define MARK_SHARE 3

/* Names of the picture's encoding: wide enough for every painted colour the
 * demo scenario has, and its curve is the one viewers without colour
 * management assume, so that an untagged reading is near the truth too. */
static const char primaries_name[] = "bt2020";
static const char curve_name[] = "iec61966-2-1";
/* Code points of ITU-T H.273: primaries 9 = BT.2020, transfer 13 =
 * IEC 61966-2-1. */
enum { PRIMARIES_CODE = 9, TRANSFER_CODE = 13 };

/* ---- Colours as pixels ------------------------------------------------- */

ef_status ef__encoder_init(ef__encoder *encoder, ef_xyz white,
                           ef_error *error) {
  const ef_encoding *encoding = ef_encoding_find(primaries_name, error);
  if (encoding == NULL)
    return EF_UNKNOWN_NAME;
  double to_xyz[9], from_xyz[9], adapt[9];
  ef_status status = ef_encoding_matrix(encoding, to_xyz, error);
  if (status != EF_OK)
    return status;
  if (!ef__mat3_inverse(to_xyz, from_xyz)) {
    return ef__error_set(error, EF_INVALID, "the primaries of %s are dependent",
                         primaries_name);
  }
  const ef_xyz own_white =
      ef_xyy_to_xyz((ef_xyy){encoding->white.x, encoding->white.y, 1.0});
  status = ef_adaptation_matrix(EF_ADAPT_CAT16, white, own_white, adapt, error);
  if (status != EF_OK)
    return status;
  ef__mat3_multiply(from_xyz, adapt, encoder->to_linear);
  return EF_OK;
}

/* IEC 61966-2-1, clause 5.2: linear light to code, odd below zero. */
static double code_from_linear(double linear) {
  const double a = fabs(linear);
  const double code =
      a <= 0.0031308 ? 12.92 * a : 1.055 * pow(a, 1.0 / 2.4) - 0.055;
  return copysign(code, linear);
}

static double linear_from_code(double code) {
  return code <= 0.04045 ? code / 12.92 : pow((code + 0.055) / 1.055, 2.4);
}

/* Out of range only when the rounded code is: a white that is above 1 in the
 * sixteenth digit is no clipped colour. */
static uint16_t encode_channel(double linear, bool *clipped) {
  const double code = round(TOP * code_from_linear(linear));
  if (code >= 0.0 && code <= TOP)
    return (uint16_t)code;
  *clipped = true;
  return code > TOP ? (uint16_t)TOP : 0;
}

ef__pixel ef__encode(const ef__encoder *encoder, ef_xyz xyz, bool *clipped) {
  const double in[3] = {xyz.X, xyz.Y, xyz.Z};
  double linear[3];
  ef__mat3_apply(encoder->to_linear, in, linear);
  ef__pixel pixel;
  for (size_t c = 0; c < 3; ++c) {
    pixel.code[c] = encode_channel(linear[c], clipped);
  }
  return pixel;
}

/* ---- Rasters ----------------------------------------------------------- */

static void put(ef__raster *raster, size_t x, size_t y, ef__pixel pixel) {
  uint16_t *sample = raster->sample + (y * raster->width + x) * 3;
  for (size_t c = 0; c < 3; ++c)
    sample[c] = pixel.code[c];
}

void ef__raster_fill(ef__raster *raster, ef__box box, ef__pixel pixel) {
  for (size_t y = box.y; y < box.y + box.height; ++y) {
    for (size_t x = box.x; x < box.x + box.width; ++x)
      put(raster, x, y, pixel);
  }
}

ef_status ef__raster_init(ef__raster *raster, size_t width, size_t height,
                          ef__pixel ground, ef_error *error) {
  size_t n_pixels;
  if (!ef__size_multiply(width, height, &n_pixels) || n_pixels > MOST_PIXELS) {
    return ef__error_set(
        error, EF_INVALID,
        "a picture of %zu x %zu pixels is larger than the "
        "limit of %zu pixels; draw fewer pairs or smaller ones",
        width, height, MOST_PIXELS);
  }
  raster->sample = ef__allocate(n_pixels, 3 * sizeof *raster->sample);
  if (raster->sample == NULL)
    return ef__error_memory(error, "a picture");
  raster->width = width;
  raster->height = height;
  ef__raster_fill(raster, (ef__box){0, 0, width, height}, ground);
  return EF_OK;
}

void ef__raster_mark(ef__raster *raster, ef__box box, ef__pixel dark,
                     ef__pixel light) {
  const size_t shorter = box.width < box.height ? box.width : box.height;
  const size_t wanted = shorter / MARK_SHARE / STRIPES;
  const size_t band = wanted > 0 ? wanted : 1;
  const size_t leg = band * STRIPES;
  for (size_t down = 0; down < leg; ++down) {
    for (size_t across = 0; across + down < leg; ++across) {
      const bool is_dark = (across + down) / band % 2 == 1;
      put(raster, box.x + box.width - 1 - across, box.y + box.height - 1 - down,
          is_dark ? dark : light);
    }
  }
}

static uint16_t mix(uint16_t under, uint16_t over, double share) {
  const double linear = (1.0 - share) * linear_from_code(under / TOP) +
                        share * linear_from_code(over / TOP);
  bool clipped = false;
  return encode_channel(linear, &clipped);
}

void ef__raster_blend(ef__raster *raster, ef__box box,
                      const unsigned char *mask, size_t stride, ef__pixel ink) {
  for (size_t y = 0; y < box.height; ++y) {
    for (size_t x = 0; x < box.width; ++x) {
      const unsigned char coverage = mask[y * stride + x];
      if (coverage == 0)
        continue;
      uint16_t *sample =
          raster->sample + ((box.y + y) * raster->width + box.x + x) * 3;
      for (size_t c = 0; c < 3; ++c) {
        sample[c] = mix(sample[c], ink.code[c], coverage / 255.0);
      }
    }
  }
}

/* The tags of our own encoding; *profile is released with free(). */
static ef_status make_tags(ef_png_tags *tags, unsigned char **profile,
                           ef_error *error) {
  const ef_encoding *primaries = ef_encoding_find(primaries_name, error);
  if (primaries == NULL)
    return EF_UNKNOWN_NAME;
  ef_encoding own = *primaries;
  own.tone = curve_name;
  *tags =
      (ef_png_tags){.primaries = PRIMARIES_CODE,
                    .transfer = TRANSFER_CODE,
                    .profile_name = "BT.2020 primaries, IEC 61966-2-1 curve"};
  const ef_status status = ef_profile_make_matrix(
      tags->profile_name, &own, profile, &tags->profile_length, error);
  tags->profile = *profile;
  return status;
}

ef_status ef__raster_write(const ef__raster *raster, const char *path,
                           bool overwrite, int bits, ef_error *error) {
  ef_png_tags tags;
  unsigned char *profile = NULL;
  ef_status status = make_tags(&tags, &profile, error);
  if (status == EF_OK) {
    status = ef_png_write(path, overwrite, raster->width, raster->height, bits,
                          raster->sample, &tags, error);
  }
  free(profile);
  return status;
}

static void copy_row(void *cookie, size_t y, uint16_t *sample) {
  const ef__raster *raster = cookie;
  const size_t n = 3 * raster->width;
  memcpy(sample, raster->sample + y * n, n * sizeof *sample);
}

ef_status ef__raster_write_to(ef__raster *raster, ef_output *output, int bits,
                              ef_error *error) {
  ef_png_tags tags;
  unsigned char *profile = NULL;
  ef_status status = make_tags(&tags, &profile, error);
  if (status == EF_OK) {
    const ef_png_rows rows = {.fill = copy_row, .cookie = raster};
    status = ef__png_write_to(output, raster->width, raster->height, bits,
                              &rows, &tags, error);
  }
  free(profile);
  return status;
}
