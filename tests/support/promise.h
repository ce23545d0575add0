/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What a fuzz target holds its reader to: it ends the process when a promise
 * is broken. */
#ifndef EVENFIELD_TESTS_PROMISE_H
#define EVENFIELD_TESTS_PROMISE_H

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/base.h>

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length);

static inline void require_that(bool is_so, const char *what) {
  if (is_so)
    return;
  fprintf(stderr, "broken promise: %s\n", what);
  abort();
}

/** The error has words on one line; about `file` unless that is NULL. */
static inline void require_words(const ef_error *error, const char *file) {
  char text[1024];
  require_that(error->message[0] != '\0', "an error has a message");
  require_that(strlen(error->message) + 1 < sizeof error->message,
               "a message fits");
  if (file != NULL)
    require_that(strcmp(error->file, file) == 0, "an error has the file");
  ef_error_describe(error, text, sizeof text);
  require_that(strchr(text, '\n') == NULL, "an error is one line");
}

#endif
