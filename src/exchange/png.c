/* SPDX-License-Identifier: GPL-3.0-or-later */
/* RGB pictures through libpng, and those of few colours with a palette. It
 * leaves its calls by longjmp on failure: that stays in this file. */
#include "exchange/exchange_private.h"

#include <setjmp.h>
#include <stdlib.h>
#include <string.h>

#include <png.h>
#include <zlib.h> /* Z_RLE */

#include "base/base_private.h"

enum {
  CHANNELS = 3,
  MEMORY_LEVEL = 6,
  MOST_PIXELS_A_SIDE = 1000000 /* what readers on libpng accept */
};

/* All that lives across the jump. */
typedef struct picture {
  ef_output *output;
  png_structp png;
  png_infop info;
  png_byte *row;
  uint16_t *sample; /* of the row */
  const ef__png_palette *palette; /* NULL: RGB */
  ef_error error; /* of the output, if it failed */
  char reason[160]; /* of libpng */
} picture;

/* ---- What libpng calls ------------------------------------------------- */

static void write_bytes(png_structp png, png_bytep bytes, size_t length) {
  picture *const p = png_get_io_ptr(png);
  if (ef_output_write(p->output, bytes, length, &p->error) != EF_OK) {
    png_error(png, "the output failed");
  }
}

static void flush_nothing(png_structp png) {
  (void)png; /* ef_output_commit does it */
}

static void keep_reason(png_structp png, png_const_charp message) {
  picture *const p = png_get_error_ptr(png);
  const size_t length = strlen(message);
  const size_t most = sizeof p->reason - 1;
  memcpy(p->reason, message, length < most ? length : most);
  p->reason[length < most ? length : most] = '\0';
  png_longjmp(png, 1);
}

/* Warnings are about details of a profile that is written all the same. */
static void ignore_warning(png_structp png, png_const_charp message) {
  (void)png;
  (void)message;
}

/* ---- The picture ------------------------------------------------------- */

/* Code points of ITU-T H.273: primaries, transfer, matrix 0 (RGB), full range
 * (PNG third edition, 11.3.2.6). libpng 1.6.39 does not know the chunk. */
static void write_cicp(png_structp png, const ef_png_tags *tags) {
  const png_byte name[5] = {'c', 'I', 'C', 'P', 0};
  const png_byte bytes[4] = {(png_byte)tags->primaries,
                             (png_byte)tags->transfer, 0, 1};
  png_write_chunk(png, name, bytes, sizeof bytes);
}

/* H.273: the primaries of BT.709 and the transfer of IEC 61966-2-1. */
static bool is_srgb(const ef_png_tags *tags) {
  return tags->primaries == 1 && tags->transfer == 13;
}

/* Frames and swatches are smooth or flat: what is left of a row after the one
 * above it is short runs, which run lengths and one pass of Huffman's codes hold
 * nearly as well as libpng's search for longer matches, several times as fast.
 * Measured on gratings, Gabor patches, discs and dithered frames of 8 and 16
 * bits: 3 to 10 times, in 0.97 to 1.7 of the size. */
static void set_compression(png_structp png, bool is_indexed) {
  if (is_indexed) { /* drawings: small, and repeated far away */
    png_set_filter(png, PNG_FILTER_TYPE_BASE, PNG_FILTER_NONE);
    png_set_compression_level(png, Z_BEST_COMPRESSION);
    return;
  }
  png_set_filter(png, PNG_FILTER_TYPE_BASE, PNG_FILTER_UP);
  png_set_compression_level(png, 1);
  png_set_compression_strategy(png, Z_RLE);
  /* zlib keeps a table of matches in order, of 2^(7 + this), that run lengths
   * never look at: a third of the time of a grating. Codes are made anew every
   * 2^(6 + this) symbols, which noise pays for if it is less. */
  png_set_compression_mem_level(png, MEMORY_LEVEL);
}

static void write_head(picture *p, size_t width, size_t height, int bits,
                       const ef_png_tags *tags) {
  png_set_IHDR(p->png, p->info, (png_uint_32)width, (png_uint_32)height, bits,
               p->palette != NULL ? PNG_COLOR_TYPE_PALETTE
                                  : PNG_COLOR_TYPE_RGB,
               PNG_INTERLACE_NONE, PNG_COMPRESSION_TYPE_BASE,
               PNG_FILTER_TYPE_BASE);
  if (p->palette != NULL) {
    png_color colour[EF__PNG_COLOURS];
    for (size_t i = 0; i < p->palette->n; ++i) {
      const unsigned char *rgb = p->palette->rgb[i];
      colour[i] = (png_color){rgb[0], rgb[1], rgb[2]};
    }
    png_set_PLTE(p->png, p->info, colour, (int)p->palette->n);
  }
  if (tags != NULL && tags->profile != NULL) {
    png_set_iCCP(p->png, p->info, tags->profile_name,
                 PNG_COMPRESSION_TYPE_BASE, tags->profile,
                 (png_uint_32)tags->profile_length);
    if (png_get_valid(p->png, p->info, PNG_INFO_iCCP) == 0) {
      png_error(p->png, "the ICC profile is not accepted");
    }
  }
  if (tags != NULL && tags->profile == NULL && is_srgb(tags)) {
    png_set_sRGB_gAMA_and_cHRM(p->png, p->info, PNG_sRGB_INTENT_RELATIVE);
  }
  png_write_info_before_PLTE(p->png, p->info);
  if (tags != NULL && tags->primaries != 0) write_cicp(p->png, tags);
  png_write_info(p->png, p->info);
}

/* 16 bits to 8, rounded: sample / 257 to the nearest, without a division; right
 * for all 65536 (test_png.c). All of it fits into 16 bits, so that compilers
 * can take many at once. */
static png_byte to_8_bits(uint16_t sample) {
  return (png_byte)((uint16_t)(sample - (sample >> 8) + 127 + (sample >> 15)) >>
                    8);
}

static void fill_row(png_byte *restrict row, size_t n, int bits,
                     const uint16_t *restrict sample) {
  if (bits == 8) {
    enum { MANY = 32 }; /* a number known to compilers, which they can unroll */
    size_t i = 0;
    for (; i + MANY <= n; i += MANY) {
      for (size_t k = 0; k < MANY; ++k) row[i + k] = to_8_bits(sample[i + k]);
    }
    for (; i < n; ++i) row[i] = to_8_bits(sample[i]);
    return;
  }
  for (size_t i = 0; i < n; ++i) {
    row[2 * i] = (png_byte)(sample[i] >> 8);
    row[2 * i + 1] = (png_byte)(sample[i] & 0xFFu);
  }
}

static bool give_row(picture *p, const ef_png_rows *rows, size_t y) {
  if (rows->give != NULL)
    return rows->give(rows->cookie, y, p->sample, &p->error) == EF_OK;
  rows->fill(rows->cookie, y, p->sample);
  return true;
}

/* Everything that may jump; false when it did. */
static bool write_indexed(picture *p, size_t width, size_t height,
                          const unsigned char *index, const ef_png_tags *tags) {
  if (setjmp(png_jmpbuf(p->png)) != 0) return false;
  png_set_write_fn(p->png, p, write_bytes, flush_nothing);
  set_compression(p->png, true);
  write_head(p, width, height, 8, tags);
  for (size_t y = 0; y < height; ++y)
    png_write_row(p->png, index + y * width);
  png_write_end(p->png, p->info);
  return true;
}

static bool write_picture(picture *p, size_t width, size_t height, int bits,
                          const ef_png_rows *rows, const ef_png_tags *tags) {
  const size_t n = width * CHANNELS;
  if (setjmp(png_jmpbuf(p->png)) != 0) return false;
  png_set_write_fn(p->png, p, write_bytes, flush_nothing);
  set_compression(p->png, false);
  write_head(p, width, height, bits, tags);
  for (size_t y = 0; y < height; ++y) {
    if (!give_row(p, rows, y)) return false;
    fill_row(p->row, n, bits, p->sample);
    png_write_row(p->png, p->row);
  }
  png_write_end(p->png, p->info);
  return true;
}

/* ---- Around it --------------------------------------------------------- */

static bool has_good_tags(const ef_png_tags *tags) {
  if (tags == NULL) return true;
  if (tags->primaries < 0 || tags->primaries > 255 || tags->transfer < 0 ||
      tags->transfer > 255) {
    return false;
  }
  if (tags->profile == NULL) return true;
  const size_t length =
      tags->profile_name != NULL ? strlen(tags->profile_name) : 0;
  return length >= 1 && length <= 79 && tags->profile_length > 0 &&
         tags->profile_length <= UINT32_MAX;
}

static ef_status check(size_t width, size_t height, int bits,
                       const ef_png_tags *tags, ef_error *error) {
  if (width == 0 || height == 0 || width > MOST_PIXELS_A_SIDE ||
      height > MOST_PIXELS_A_SIDE) {
    return ef__error_set(error, EF_INVALID,
                         "a picture of %zu x %zu pixels cannot be written; "
                         "expected 1 to %d on each side",
                         width, height, (int)MOST_PIXELS_A_SIDE);
  }
  if (bits != 8 && bits != 16) {
    return ef__error_set(error, EF_INVALID,
                         "pictures have 8 or 16 bits, not %d", bits);
  }
  if (!has_good_tags(tags)) {
    return ef__error_set(error, EF_INVALID,
                         "colour tags need code points of 0 to 255 and, with a "
                         "profile, a name of 1 to 79 characters");
  }
  return EF_OK;
}

static ef_status refuse(const picture *p, const char *path, ef_error *error) {
  if (p->error.status != EF_OK) {
    if (error != NULL) *error = p->error;
    return p->error.status;
  }
  ef__error_set(error, EF_UNWRITABLE, "the picture cannot be written: %s",
                p->reason);
  ef__error_place(error, path, 0, 0, NULL);
  return EF_UNWRITABLE;
}

static void create(picture *p) {
  p->png = png_create_write_struct(PNG_LIBPNG_VER_STRING, p, keep_reason,
                                   ignore_warning);
  if (p->png != NULL) p->info = png_create_info_struct(p->png);
}

static ef_status write_to(picture *p, const char *path, size_t width,
                          size_t height, int bits, const ef_png_rows *rows,
                          const ef_png_tags *tags, ef_error *error) {
  create(p);
  p->row = ef__allocate(width * CHANNELS, (size_t)bits / 8);
  p->sample = ef__allocate(width * CHANNELS, sizeof *p->sample);
  ef_status status;
  if (p->png == NULL || p->info == NULL || p->row == NULL ||
      p->sample == NULL) {
    status = ef__error_memory(error, "a picture");
  } else if (write_picture(p, width, height, bits, rows, tags)) {
    status = EF_OK;
  } else {
    status = refuse(p, path, error);
  }
  png_destroy_write_struct(&p->png, &p->info);
  free(p->sample);
  free(p->row);
  return status;
}

ef_status ef__png_write_to(ef_output *output, size_t width, size_t height,
                           int bits, const ef_png_rows *rows,
                           const ef_png_tags *tags, ef_error *error) {
  const ef_status status = check(width, height, bits, tags, error);
  if (status != EF_OK) return status;
  picture p = {.output = output};
  return write_to(&p, NULL, width, height, bits, rows, tags, error);
}

ef_status ef_png_write_rows(const char *path, bool overwrite, size_t width,
                            size_t height, int bits, const ef_png_rows *rows,
                            const ef_png_tags *tags, ef_error *error) {
  ef_status status = check(width, height, bits, tags, error);
  if (status != EF_OK) return status;
  ef_error opening = {0};
  picture p = {.output = ef_output_open(path, overwrite, &opening)};
  if (p.output == NULL) {
    if (error != NULL) *error = opening;
    return opening.status;
  }
  status = write_to(&p, path, width, height, bits, rows, tags, error);
  if (status == EF_OK) return ef_output_commit(p.output, error);
  ef_output_discard(p.output);
  return status;
}

ef_status ef__png_write_indexed(const char *path, bool overwrite, size_t width,
                                size_t height, const unsigned char *index,
                                const ef__png_palette *palette,
                                const ef_png_tags *tags, ef_error *error) {
  ef_status status = check(width, height, 8, tags, error);
  if (status != EF_OK) return status;
  ef_error opening = {0};
  picture p = {.output = ef_output_open(path, overwrite, &opening),
               .palette = palette};
  if (p.output == NULL) {
    if (error != NULL) *error = opening;
    return opening.status;
  }
  create(&p);
  if (p.png == NULL || p.info == NULL) {
    status = ef__error_memory(error, "a picture");
  } else if (!write_indexed(&p, width, height, index, tags)) {
    status = refuse(&p, path, error);
  }
  png_destroy_write_struct(&p.png, &p.info);
  if (status == EF_OK) return ef_output_commit(p.output, error);
  ef_output_discard(p.output);
  return status;
}

/* ---- Pictures in memory ------------------------------------------------ */

typedef struct whole {
  const uint16_t *sample;
  size_t n; /* a row */
} whole;

static void copy_row(void *cookie, size_t y, uint16_t *sample) {
  const whole *const w = cookie;
  memcpy(sample, w->sample + y * w->n, w->n * sizeof *sample);
}

ef_status ef_png_write(const char *path, bool overwrite, size_t width,
                       size_t height, int bits, const uint16_t *sample,
                       const ef_png_tags *tags, ef_error *error) {
  whole w = {sample, width * CHANNELS};
  const ef_png_rows rows = {.fill = copy_row, .cookie = &w};
  return ef_png_write_rows(path, overwrite, width, height, bits, &rows, tags,
                           error);
}
