/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a table: read to the end or refused with words, and what comes
 * out keeps what the header promises. */
#include <math.h>
#include <string.h>

#include <evenfield/exchange.h>

#include "promise.h"

/* What a run through a file came to. */
typedef struct outcome {
  ef_status status;
  size_t n_rows, n_skipped;
  double sum; /* of all numbers and lengths of names */
} outcome;

static void check_error(const ef_error *error, ef_status status) {
  require_that(error->status == status, "the error has the status");
  require_that(status == EF_MALFORMED, "bad bytes are malformed");
  require_words(error, "t.csv");
}

static void check_head(const ef_reader_head *head) {
  if (head->content == EF_CONTENT_SPECTRA) {
    require_that(ef_grid_check(&head->grid, NULL) == EF_OK, "a good grid");
    require_that(head->grid.count == head->width, "a grid as wide as the rows");
  } else if (head->content == EF_CONTENT_DEVICE) {
    require_that(head->width == 0 && head->n_device >= 3, "device values");
  } else {
    require_that(head->width == 3 && head->grid.count == 0, "three values");
  }
}

static void check_values(const ef_reader_head *head, const double *value) {
  double low = -HUGE_VAL;
  double high = HUGE_VAL;
  if (head->content == EF_CONTENT_SPECTRA) {
    low = head->kind == EF_SURFACE ? -0.02 : 0;
    if (head->kind == EF_SURFACE) high = 2;
  }
  for (size_t i = 0; i < head->width; ++i) {
    require_that(isfinite(value[i]), "values are finite");
    require_that(value[i] >= low && value[i] <= high, "values in their range");
  }
}

static void check_device(const ef_reader_head *head, const double *device) {
  for (size_t i = 0; i < head->n_device; ++i) {
    require_that(device[i] >= 0 && device[i] <= 1,
                 "device values lie in 0 to 1");
  }
}

static void add_up(size_t n, const double *value, double *sum) {
  for (size_t i = 0; i < n; ++i) *sum += value[i];
}

static void check_block(const ef_reader_head *head, const ef_block *block,
                        outcome *out) {
  const size_t n_device = head->n_device;
  require_that((block->device != NULL) == (n_device > 0), "device values");
  for (size_t i = 0; i < block->n; ++i) {
    check_values(head, block->value + i * head->width);
    add_up(head->width, block->value + i * head->width, &out->sum);
    if (n_device > 0) {
      check_device(head, block->device + i * n_device);
      add_up(n_device, block->device + i * n_device, &out->sum);
    }
    require_that(block->line[i] > 0, "a row has a line");
    require_that(block->name[i][0] != '\0', "a row has a name");
    out->sum += (double)strlen(block->name[i]) + (double)block->line[i];
  }
}

static outcome read_bytes(const uint8_t *bytes, size_t length, bool skip_bad,
                          size_t max_rows) {
  outcome out = {EF_OK, 0, 0, 0};
  ef_error error = {0};
  ef_reader_settings settings = ef_reader_settings_default();
  settings.skip_bad = skip_bad;
  ef_reader *const reader = ef_reader_from_text(
      "t.csv", (const char *)bytes, length, &settings, &error);
  if (reader == NULL) {
    check_error(&error, error.status);
    out.status = error.status;
    return out;
  }
  const ef_reader_head *const head = ef_reader_get_head(reader);
  check_head(head);
  for (;;) {
    ef_block block;
    out.status = ef_reader_next(reader, max_rows, &block, &error);
    if (out.status != EF_OK) check_error(&error, out.status);
    if (block.n == 0) break;
    require_that(block.n <= max_rows, "no more rows than asked for");
    check_block(head, &block, &out);
    out.n_rows += block.n;
  }
  out.n_skipped = ef_reader_skipped(reader);
  ef_reader_free(reader);
  return out;
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length) {
  const outcome strict = read_bytes(bytes, length, false, 1000);
  const outcome lenient = read_bytes(bytes, length, true, 1000);
  const outcome single = read_bytes(bytes, length, true, 1);
  require_that(single.status == lenient.status, "the same end by single rows");
  if (single.status == EF_OK) {
    require_that(single.n_rows == lenient.n_rows &&
                     single.n_skipped == lenient.n_skipped &&
                     memcmp(&single.sum, &lenient.sum, sizeof single.sum) == 0,
                 "the same rows one by one");
  }
  if (strict.status == EF_OK) {
    require_that(strict.n_rows > 0, "a table has a row");
    require_that(lenient.status == EF_OK && lenient.n_skipped == 0 &&
                     lenient.n_rows == strict.n_rows,
                 "nothing is skipped of a good table");
  } else if (lenient.status == EF_OK) {
    require_that(lenient.n_skipped > 0, "what is wrong is skipped");
  }
  return 0;
}
