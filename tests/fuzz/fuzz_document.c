/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a JSON document: texts by their pointers, or one line of words
 * about what is wrong. */
#include <string.h>

#include <evenfield/exchange.h>

#include "promise.h"

static void check_error(const ef_error *error) {
  require_that(error->status == EF_MALFORMED, "bad bytes are malformed");
  require_words(error, "d.json");
}

static void look(const ef_document *document, const char *pointer) {
  size_t length = 0;
  const char *const text = ef_document_text(document, pointer, &length);
  if (text == NULL) return;
  require_that(strlen(text) == length, "a text has its length");
  require_that(ef_document_count(document, pointer) == 0,
               "a text has no elements");
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length) {
  ef_error error = {.status = EF_OK};
  ef_document *const document = ef_document_from_text(
      "d.json", (const char *)bytes, length, &error);
  if (document == NULL) {
    check_error(&error);
    return 0;
  }
  static const char *const pointers[] = {
      "", "/record", "/arguments/0", "/files/0/name", "/files/0/text", "/a~1b"};
  for (size_t i = 0; i < sizeof pointers / sizeof pointers[0]; ++i)
    look(document, pointers[i]);
  ef_document_free(document);
  return 0;
}
