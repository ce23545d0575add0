/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a table of two named columns: numbers from its rows, or one line
 * of words about what is wrong. */
#include <math.h>

#include <evenfield/exchange.h>

#include "promise.h"

static void check_error(const ef_error *error) {
  require_that(error->status == EF_MALFORMED, "bad bytes are malformed");
  require_words(error, "t.csv");
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length) {
  static const char *const names[] = {"age", "share"};
  ef_error error = {.status = EF_OK};
  ef_columns *const columns = ef_columns_from_text(
      "t.csv", (const char *)bytes, length, 2, names, NULL, &error);
  if (columns == NULL) {
    check_error(&error);
    return 0;
  }
  require_that(ef_columns_rows(columns) > 0, "a table has a row");
  for (size_t i = 0; i < ef_columns_rows(columns); ++i) {
    require_that(ef_columns_line(columns, i) > 0, "a row has a line");
    require_that(isfinite(ef_columns_at(columns, i, 0)) &&
                     isfinite(ef_columns_at(columns, i, 1)),
                 "values are finite");
  }
  ef_columns_free(columns);
  return 0;
}
