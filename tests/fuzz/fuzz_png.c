/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a PNG picture: refused with words, or read to its end in bounded
 * memory; its tags come to a profile or to words. */
#include <stdlib.h>

#include <evenfield/image.h>

#include "promise.h"

static void check_error(const ef_error *error) {
  require_that(error->status == EF_MALFORMED || error->status == EF_NO_ANSWER,
               "a picture is refused as what it is");
  require_words(error, NULL);
}

static void read_rows(ef_png *png) {
  const ef_png_head *head = ef_png_get_head(png);
  uint16_t *row = malloc(3 * head->width * sizeof *row);
  size_t n = 0;
  bool has_row = true;
  ef_error error = {0};
  ef_status status = EF_OK;
  require_that(row != NULL, "there is memory");
  while (status == EF_OK && has_row) {
    status = ef_png_next_row(png, row, &has_row, &error);
    n += has_row;
  }
  if (status != EF_OK)
    check_error(&error);
  else
    require_that(n == head->height, "every row comes once");
  require_that(ef_png_next_row(png, row, &has_row, &error) == EF_OK && !has_row,
               "nothing comes behind the end");
  free(row);
}

static void read_colours(const uint8_t *bytes, size_t length,
                         const ef_picture_settings *settings) {
  ef_error error = {0};
  ef_picture *picture =
      ef_picture_from_bytes("t.png", bytes, length, settings, &error);
  if (picture == NULL) {
    check_error(&error);
    return;
  }
  require_that(ef_picture_get_profile(picture) != NULL, "colours are known");
  require_that(ef_picture_get_colours(picture)->about[0] != '\0',
               "and said in words");
  ef_distinct *distinct = ef_distinct_of(picture, 16, &error);
  if (distinct == NULL)
    check_error(&error);
  else
    require_that(ef_distinct_count(distinct) <= 16, "no more than asked for");
  ef_distinct_free(distinct);
  ef_picture_free(picture);
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length) {
  ef_picture_settings settings = ef_picture_settings_default();
  settings.png.max_pixels = 1 << 20;
  settings.png.max_bytes = 1 << 24;
  ef_error error = {0};
  ef_png *png =
      ef_png_from_bytes("t.png", bytes, length, &settings.png, &error);
  if (png == NULL) {
    check_error(&error);
    return 0;
  }
  read_rows(png);
  ef_png_free(png);
  read_colours(bytes, length, &settings);
  return 0;
}
