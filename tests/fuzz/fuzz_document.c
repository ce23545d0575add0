/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Any bytes as a JSON document: texts by their pointers, or one line of words
 * about what is wrong. */
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/exchange.h>

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length);

static void require_that(bool is_so, const char *what) {
  if (is_so) return;
  fprintf(stderr, "broken promise: %s\n", what);
  abort();
}

static void check_error(const ef_error *error) {
  char text[1024];
  require_that(error->status == EF_MALFORMED, "bad bytes are malformed");
  require_that(error->message[0] != '\0', "an error has a message");
  require_that(strcmp(error->file, "d.json") == 0, "an error has the file");
  ef_error_describe(error, text, sizeof text);
  require_that(strchr(text, '\n') == NULL, "an error is one line");
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
