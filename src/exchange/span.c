/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pieces of text without a terminator. */
#include "exchange/exchange_private.h"

#include <string.h>

ef__span ef__span_of(const char *text) {
  return (ef__span){text, strlen(text)};
}

static bool is_blank(char c) {
  return c == ' ' || c == '\t';
}

ef__span ef__span_trim(ef__span span) {
  while (span.length > 0 && is_blank(span.text[0])) {
    ++span.text;
    --span.length;
  }
  while (span.length > 0 && is_blank(span.text[span.length - 1])) --span.length;
  return span;
}

const char *ef__quote(ef__span span, char out[EF__QUOTED]) {
  const size_t most = EF__QUOTED - 6; /* quotes, dots, terminator */
  size_t kept = span.length < most ? span.length : most;
  if (kept < span.length) {
    /* Not in the middle of a UTF-8 character. */
    while (kept > 0 && ((unsigned char)span.text[kept] & 0xC0u) == 0x80u) {
      --kept;
    }
  }
  char *to = out;
  *to++ = '\'';
  memcpy(to, span.text, kept);
  to += kept;
  if (kept < span.length) {
    memcpy(to, "...", 3);
    to += 3;
  }
  *to++ = '\'';
  *to = '\0';
  return out;
}
