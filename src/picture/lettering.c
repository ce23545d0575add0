/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/drawing.h"

#include <stdint.h>
#include <string.h>

/* Advance widths of ASCII 32 to 126 in thousandths of the size, as measured of
 * DejaVu Sans, which is wide among the usual sans-serif faces. */
static const uint16_t advance[95] = {
    318, 401, 460, 838, 636,  950, 780, 275, 390, 390, 500, 838, 318, 361,
    318, 337, 636, 636, 636,  636, 636, 636, 636, 636, 636, 636, 337, 337,
    838, 838, 838, 531, 1000, 684, 686, 698, 770, 632, 575, 775, 752, 295,
    295, 656, 557, 863, 748,  787, 603, 787, 695, 635, 611, 732, 684, 989,
    685, 611, 685, 390, 337,  390, 838, 500, 500, 613, 635, 550, 635, 615,
    352, 635, 634, 278, 278,  579, 278, 974, 634, 612, 635, 635, 411, 521,
    392, 634, 592, 818, 592,  592, 525, 636, 337, 636, 838};
/* Bold letters are wider by at most a tenth; letters beyond ASCII take as much
 * as wide Latin ones, those of East Asia a whole square. */
#define BOLD 1.1
#define OTHER 0.75
#define SQUARE 1.0
#define FIRST_SQUARE 0x1100u

/* The character at `text` and its length in bytes; 0 where the bytes are no
 * character of Unicode or one that XML 1.0 (2.2) leaves out. */
static size_t decode(const char *text, uint32_t *character) {
  const unsigned char *byte = (const unsigned char *)text;
  const unsigned char lead = byte[0];
  const size_t length = lead < 0x80u   ? 1
                        : lead < 0xC2u ? 0
                        : lead < 0xE0u ? 2
                        : lead < 0xF0u ? 3
                        : lead < 0xF5u ? 4
                                       : 0;
  if (length < 2) {
    *character = lead;
    return length;
  }
  static const uint32_t least[5] = {0, 0, 0x80u, 0x800u, 0x10000u};
  uint32_t c = lead & (0x7Fu >> length);
  for (size_t i = 1; i < length; ++i) {
    if ((byte[i] & 0xC0u) != 0x80u)
      return 0;
    c = c << 6 | (byte[i] & 0x3Fu);
  }
  const bool is_surrogate = c >= 0xD800u && c <= 0xDFFFu;
  if (c < least[length] || c > 0x10FFFFu || is_surrogate || c == 0xFFFEu ||
      c == 0xFFFFu)
    return 0;
  *character = c;
  return length;
}

void ef__text_clean(char *to, const char *text) {
  while (*text != '\0') {
    uint32_t character;
    const size_t length = decode(text, &character);
    if (length == 0) {
      *to++ = '?';
      ++text;
    } else if (character < 0x20u || character == 0x7Fu) {
      *to++ = ' ';
      ++text;
    } else {
      memcpy(to, text, length);
      to += length;
      text += length;
    }
  }
  *to = '\0';
}

/* Width of one character in sizes, and its length. */
static double character_width(const char *text, size_t *length) {
  uint32_t c;
  *length = decode(text, &c);
  if (*length == 0) {
    *length = 1;
    return OTHER;
  }
  if (c < 0x20u || c == 0x7Fu)
    return OTHER;
  if (c < 0x7Fu)
    return advance[c - 0x20u] / 1000.0;
  return c >= FIRST_SQUARE && (c < 0x2000u || c > 0x2BFFu) ? SQUARE : OTHER;
}

double ef__text_width(const char *text, double size_px, bool bold) {
  double sizes = 0.0;
  for (size_t length; *text != '\0'; text += length)
    sizes += character_width(text, &length);
  return sizes * size_px * (bold ? BOLD : 1.0);
}

size_t ef__text_line(const char *text, double size_px, bool bold,
                     double width_px) {
  const double room = width_px / (size_px * (bold ? BOLD : 1.0));
  double sizes = 0.0;
  size_t blank = 0, at = 0;
  while (text[at] != '\0') {
    size_t length;
    sizes += character_width(text + at, &length);
    if (text[at] == ' ')
      blank = at;
    if (sizes > room && at > 0)
      return blank > 0 ? blank : at;
    at += length;
  }
  return at;
}
