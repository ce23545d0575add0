/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as the header of a spectral image: sizes and bands that hold
 * together, or one line of words about what is wrong. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "exchange/exchange_private.h"
#include "promise.h"

static void check_error(const ef_error *error) {
  require_that(error->status == EF_MALFORMED, "bad bytes are malformed");
  require_words(error, "c.hdr");
}

static void check_head(const ef_cube_head *head) {
  const size_t size = ef_sample_type_bytes(head->type);
  ef_error error = {0};
  require_that(size > 0, "a type has bytes");
  require_that(head->width > 0 && head->height > 0, "an image has pixels");
  const size_t all = ef__cube_header_bytes(head);
  require_that(all / size / head->n_bands / head->height == head->width,
               "sizes do not wrap around");
  require_that(all <= INT64_MAX - head->offset_bytes, "a file can be as long");
  require_that(head->n_used > 0 && head->n_used + head->n_repeated +
                                           head->n_marked_bad ==
                                       head->n_bands,
               "every band is used or left out");
  require_that(head->grid.count == head->n_used, "each band is on the grid");
  require_that(ef_grid_check(&head->grid, &error) == EF_OK,
               "wavelengths rise");
  for (size_t k = 0; k < head->n_used; ++k) {
    require_that(head->band[k] < head->n_bands, "a band is in the file");
    require_that(isfinite(head->gain[k]) && isfinite(head->offset[k]),
                 "scales are finite");
  }
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length) {
  ef_error error = {.status = EF_OK};
  ef__cube_header header;
  char *text = malloc(length + 1); /* as much as there is, and no more */
  if (text == NULL) return 0;
  if (length > 0) memcpy(text, bytes, length);
  if (ef__cube_header_read("c.hdr", text, length, NULL, &header, &error) ==
      EF_OK)
    check_head(&header.head);
  else
    check_error(&error);
  ef__cube_header_clear(&header);
  free(text);
  return 0;
}
