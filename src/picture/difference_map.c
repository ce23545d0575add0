/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Maps of how far pixels differ: paler or darker by multiples of a JND, one hue
 * from light to dark, so that they read without colour vision and in print; the
 * key below has the unit. Rows are drawn as they come. */
#include "picture/picture_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

enum {
  MARGIN = 10,
  KEY_WIDTH = 620,
  BOX = 100, /* of a class in the key */
  BOX_HEIGHT = 20,
  TEXT_PX = 13,
  LEAST_SIDE = 160, /* smaller pictures are enlarged by a whole factor */
  MOST_FACTOR = 16
};

/* Upper ends of all classes but the last, in JND. */
static const double ends[EF_DIFFERENCE_CLASSES - 1] = {0.5, 1.0, 2.0, 4.0, 8.0};

/* From L* 95 to L* 12 in steps of about 16, chosen by eye. */
static const uint32_t fills[EF_DIFFERENCE_CLASSES] = {
    0xEEF1F6, 0xC3CFE6, 0x95A9D6, 0x6A7FBF, 0x454F97, 0x1F1F4F};
static const uint32_t paper = 0xFFFFFF, rule = 0x6B7480, words = 0x1B222C;

int ef_difference_class(double jnds) {
  int k = 0;
  while (k + 1 < EF_DIFFERENCE_CLASSES && jnds > ends[k])
    ++k;
  return k;
}

double ef_difference_class_end(int difference_class) {
  return difference_class + 1 < EF_DIFFERENCE_CLASSES
             ? ends[difference_class]
             : (double)INFINITY;
}

static ef__pixel pixel_of(uint32_t rgb) {
  return (ef__pixel){{(uint16_t)(257 * (rgb >> 16 & 255)),
                      (uint16_t)(257 * (rgb >> 8 & 255)),
                      (uint16_t)(257 * (rgb & 255))}};
}

typedef struct sheet {
  const ef_difference_map *map;
  size_t factor;        /* pixels of the map for one of the picture */
  size_t width, height; /* of all */
  size_t bottom;        /* first row below the map and its border */
  ef__raster key;
  const double *value; /* of the row now */
  size_t row;          /* that it is, SIZE_MAX: none */
} sheet;

/* ---- The key ------------------------------------------------------------- */

static void put_number(double value, char text[EF_NUMBER_TEXT]) {
  char digits[EF_NUMBER_TEXT];
  snprintf(digits, sizeof digits, "%.3g", value);
  snprintf(text, EF_NUMBER_TEXT, "%s", digits);
}

static void label_class(const ef_difference_map *map, int k, char text[80]) {
  char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
  put_number(k > 0 ? map->jnd * ends[k - 1] : 0.0, low);
  put_number(k + 1 < EF_DIFFERENCE_CLASSES ? map->jnd * ends[k] : 0.0, high);
  if (k + 1 == EF_DIFFERENCE_CLASSES)
    snprintf(text, 80, "above %s", low);
  else
    snprintf(text, 80, "%s to %s", low, high);
}

static ef_status draw_key(sheet *s, bool *is_labelled, ef_error *error) {
  ef__pen *pen = ef__pen_new(TEXT_PX);
  const size_t line = pen != NULL ? ef__pen_line_height(pen) : 0;
  const size_t height = line + 4 + BOX_HEIGHT + 4 + line + MARGIN;
  ef_status status =
      ef__raster_init(&s->key, KEY_WIDTH, height, pixel_of(paper), error);
  *is_labelled = pen != NULL;
  char text[200], jnd[EF_NUMBER_TEXT];
  put_number(s->map->jnd, jnd);
  snprintf(text, sizeof text, "Difference in %s; one JND is %s",
           s->map->symbol, jnd);
  if (status == EF_OK && pen != NULL)
    *is_labelled = ef__pen_draw(pen, &s->key, (ef__box){0, 0, KEY_WIDTH, line},
                                text, pixel_of(words));
  for (int k = 0; status == EF_OK && k < EF_DIFFERENCE_CLASSES; ++k) {
    const size_t x = (size_t)k * (BOX + 3);
    ef__raster_fill(&s->key, (ef__box){x, line + 4, BOX, BOX_HEIGHT},
                    pixel_of(rule));
    ef__raster_fill(&s->key,
                    (ef__box){x + 1, line + 5, BOX - 2, BOX_HEIGHT - 2},
                    pixel_of(fills[k]));
    label_class(s->map, k, text);
    if (pen != NULL)
      (void)ef__pen_draw(pen, &s->key,
                         (ef__box){x, line + BOX_HEIGHT + 8, BOX, line}, text,
                         pixel_of(words));
  }
  ef__pen_free(pen);
  return status;
}

/* ---- Rows ---------------------------------------------------------------- */

static void fill(uint16_t *sample, size_t first, size_t n, uint32_t rgb) {
  const ef__pixel p = pixel_of(rgb);
  for (size_t x = first; x < first + n; ++x)
    memcpy(sample + 3 * x, p.code, sizeof p.code);
}

static ef_status draw_row(sheet *s, size_t y, uint16_t *sample,
                          ef_error *error) {
  const ef_difference_map *map = s->map;
  const size_t n = s->factor * map->width, row = y / s->factor;
  if (s->row != row) {
    const ef_status status = map->give(map->cookie, row, &s->value, error);
    if (status != EF_OK)
      return status;
    s->row = row;
  }
  fill(sample, MARGIN, n + 2, rule);
  for (size_t x = 0; x < map->width; ++x) {
    const int k = ef_difference_class(s->value[x] / map->jnd);
    fill(sample, MARGIN + 1 + x * s->factor, s->factor, fills[k]);
  }
  return EF_OK;
}

static ef_status give_row(void *cookie, size_t y, uint16_t *sample,
                          ef_error *error) {
  sheet *const s = cookie;
  const size_t top = MARGIN + 1, n = s->factor * s->map->width;
  fill(sample, 0, s->width, paper);
  if (y >= top && y < top + s->factor * s->map->height)
    return draw_row(s, y - top, sample, error);
  if (y + 1 == top || y + 1 == s->bottom)
    fill(sample, MARGIN, n + 2, rule);
  if (y >= s->bottom + MARGIN)
    memcpy(sample + 3 * MARGIN,
           s->key.sample + 3 * KEY_WIDTH * (y - s->bottom - MARGIN),
           3 * KEY_WIDTH * sizeof *sample);
  return EF_OK;
}

/* ---- The picture --------------------------------------------------------- */

static void plan(sheet *s) {
  const ef_difference_map *map = s->map;
  const size_t side = map->width > map->height ? map->width : map->height;
  s->factor = side < LEAST_SIDE ? LEAST_SIDE / side : 1;
  if (s->factor > MOST_FACTOR)
    s->factor = MOST_FACTOR;
  const size_t width = s->factor * map->width + 2;
  s->width = 2 * MARGIN + (width > KEY_WIDTH ? width : KEY_WIDTH);
  s->bottom = MARGIN + 2 + s->factor * map->height;
  s->height = s->bottom + MARGIN + s->key.height;
}

ef_status ef_difference_map_write(const char *path, bool overwrite,
                                  const ef_difference_map *map,
                                  ef_difference_map_report *report,
                                  ef_error *error) {
  if (!(map->jnd > 0.0) || map->width == 0 || map->height == 0)
    return ef__error_set(error, EF_INVALID,
                         "a map needs pixels and a difference to measure by");
  sheet s = {.map = map, .row = SIZE_MAX};
  ef_status status = draw_key(&s, &report->is_labelled, error);
  if (status == EF_OK) {
    plan(&s);
    report->factor = s.factor;
    const ef_png_rows rows = {.give = give_row, .cookie = &s};
    const ef_png_tags tags = {.primaries = 1, .transfer = 13}; /* sRGB */
    status = ef_png_write_rows(path, overwrite, s.width, s.height, 8, &rows,
                               &tags, error);
  }
  free(s.key.sample);
  return status;
}
