/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "words.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

const char words_two_dimensions[] =
    "for these eyes colours have two dimensions only: X, Y, Z and what follows "
    "from them lie on one plane, and differences are taken within it";

/* The unique hues' words on the CIELAB axes, anticlockwise from +a*. */
static const char *const hue_words[] = {"redder", "yellower", "greener",
                                        "bluer"};

/* Turning anticlockwise leads to the next axis, clockwise to the last one. */
static const char *hue_word(double h_deg, bool anticlockwise) {
  const double quadrant =
      anticlockwise ? floor(h_deg / 90.0) + 1.0 : ceil(h_deg / 90.0) - 1.0;
  return hue_words[((int)quadrant + 4) % 4];
}

typedef struct part {
  double size;
  const char *word;
} part;

static void sort_parts(part parts[3]) {
  for (int i = 1; i < 3; ++i) {
    for (int j = i; j > 0 && parts[j].size > parts[j - 1].size; --j) {
      const part swap = parts[j];
      parts[j] = parts[j - 1];
      parts[j - 1] = swap;
    }
  }
}

void words_direction(ef_components components, double h_deg,
                     char text[WORDS_ROOM]) {
  part parts[3] = {
      {fabs(components.lightness),
       components.lightness > 0.0 ? "lighter" : "darker"},
      {fabs(components.chroma),
       components.chroma > 0.0 ? "more vivid" : "duller"},
      {fabs(components.hue), hue_word(h_deg, components.hue > 0.0)}};
  const double whole =
      sqrt(parts[0].size * parts[0].size + parts[1].size * parts[1].size +
           parts[2].size * parts[2].size);
  sort_parts(parts);
  text[0] = '\0';
  for (int i = 0; i < 3; ++i) {
    if (!(parts[i].size > 0.0) || parts[i].size < 0.1 * whole)
      break;
    char amount[EF_NUMBER_TEXT];
    words_amount(parts[i].size, amount);
    const size_t length = strlen(text);
    snprintf(text + length, WORDS_ROOM - length, "%s%s by %s",
             i == 0 ? "" : ", ", parts[i].word, amount);
  }
  if (text[0] == '\0')
    snprintf(text, WORDS_ROOM, "alike");
}

void words_amount(double value, char text[EF_NUMBER_TEXT]) {
  int decimals = 2;
  const double size = fabs(value);
  if (size > 0.0 && size < 0.005) {
    decimals = (int)ceil(-log10(size));
    if (decimals > 6)
      decimals = 2;
  }
  ef_number_format_fixed(value, decimals, text);
}

int words_decimals(double value, int digits) {
  const double size = fabs(value);
  if (!(size > 0.0) || isinf(size))
    return 2;
  const int decimals = digits - 1 - (int)floor(log10(size));
  return decimals < 0 ? 0 : decimals > 9 ? 9 : decimals;
}

void words_chance(double p, char text[WORDS_ROOM]) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(p, p < 0.01 ? 4 : p < 0.1 ? 3 : 2, number);
  if (p < 0.0001)
    snprintf(text, WORDS_ROOM, "p < 0.0001");
  else
    snprintf(text, WORDS_ROOM, "p = %s", number);
}

void words_count(size_t n, const char *one, const char *many,
                 char text[WORDS_ROOM]) {
  snprintf(text, WORDS_ROOM, "%zu %s", n, n == 1 ? one : many);
}
