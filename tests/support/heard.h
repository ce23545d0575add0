/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Keeps the notes of the library, one line each. */
#ifndef EVENFIELD_TESTS_HEARD_H
#define EVENFIELD_TESTS_HEARD_H

#include <stddef.h>
#include <string.h>

#include <evenfield/base.h>

typedef struct heard {
  size_t n;
  size_t used;
  char text[8192]; /**< lines, each ended by a line feed */
} heard;

static inline void heard_write(void *cookie, const char *line) {
  heard *const h = cookie;
  const size_t length = strlen(line);
  ++h->n;
  if (h->used + length + 2 > sizeof h->text) return;
  memcpy(h->text + h->used, line, length);
  h->used += length;
  h->text[h->used++] = '\n';
  h->text[h->used] = '\0';
}

/** Notes that end up in `h`, which starts zeroed. */
static inline ef_notes heard_notes(heard *h) {
  return (ef_notes){heard_write, h};
}

#endif
