/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Shortest digits of a double. Every decimal strictly between the midpoints to
 * the two neighbouring doubles reads back to it (and so do the midpoints when
 * the last bit is even). In the range of everyday numbers the three bounds,
 * scaled to 18 or 19 digits, are integers of 107 bits divided by a power of
 * two: they are computed exactly, and digits are dropped while a shorter
 * decimal is left between the bounds (Steele & White 1990; the loop is that of
 * Adams 2018). Outside that range roundings to more and more digits are tried.
 */
#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
  MANTISSA_BITS = 52,
  MIN_SCALE = 0,  /* decimal places that keep 5^scale ... */
  MAX_SCALE = 23, /* ... below 2^54 */
  MAX_SHIFT = 63
};

/* ---- Exact, for everyday numbers --------------------------------------- */

typedef struct wide {
  uint64_t high;
  uint64_t low;
} wide;

static wide multiply(uint64_t a, uint64_t b) {
  const uint64_t mask = UINT64_C(0xFFFFFFFF);
  const uint64_t low = (a & mask) * (b & mask);
  const uint64_t cross = (a >> 32) * (b & mask) + (low >> 32);
  const uint64_t other = (a & mask) * (b >> 32) + (cross & mask);
  return (wide){(a >> 32) * (b >> 32) + (cross >> 32) + (other >> 32),
                (other << 32) | (low & mask)};
}

/* floor(x / 2^shift), shift 1 to 63, and whether nothing was lost. The quotient
 * is known to fit. */
static uint64_t shift_right(wide x, unsigned shift, bool *is_exact) {
  *is_exact = (x.low & ((UINT64_C(1) << shift) - 1)) == 0;
  return x.high << (64 - shift) | x.low >> shift;
}

/* The double and the midpoints beside it, in units of 10^-scale, rounded down;
 * a flag where nothing was lost. */
typedef struct bounds {
  uint64_t low, value, high;
  bool low_is_exact, value_is_exact, high_is_exact;
  bool include_ends;
} bounds;

/* False when the value is too large or too small for exact arithmetic. */
static bool find_bounds(double value, int *scale, bounds *b) {
  int exponent;
  const double fraction = frexp(value, &exponent); /* [0.5, 1) */
  const uint64_t mantissa = (uint64_t)ldexp(fraction, MANTISSA_BITS + 1);
  exponent -= MANTISSA_BITS + 1; /* value = mantissa x 2^exponent */
  /* 78913 / 2^18 = log10(2) + 3e-7; 18 or 19 digits before the mark. */
  const int digits = (int)floor((exponent + MANTISSA_BITS) * 78913.0 / 262144);
  *scale = 17 - digits;
  const int shift = -(exponent - 2 + *scale);
  if (*scale < MIN_SCALE || *scale > MAX_SCALE)
    return false;
  if (shift < 1 || shift > MAX_SHIFT)
    return false;
  uint64_t power = 1; /* of 5: that of 2 is in the shift */
  for (int i = 0; i < *scale; ++i)
    power *= 5;
  /* In quarters of the last bit. Below a power of two the doubles lie twice as
   * dense (none in this range is subnormal). */
  const bool is_power = mantissa == UINT64_C(1) << MANTISSA_BITS;
  const uint64_t quarters = 4 * mantissa;
  const unsigned places = (unsigned)shift;
  b->low = shift_right(multiply(quarters - (is_power ? 1 : 2), power), places,
                       &b->low_is_exact);
  b->value = shift_right(multiply(quarters, power), places, &b->value_is_exact);
  b->high =
      shift_right(multiply(quarters + 2, power), places, &b->high_is_exact);
  b->include_ends = mantissa % 2 == 0;
  return true;
}

/* Drops digits while a decimal is left between the bounds, and rounds. Returns
 * the digits as an integer; `*dropped` counts them. */
static uint64_t shorten(bounds b, int *dropped) {
  bool low_is_whole = b.include_ends && b.low_is_exact;
  bool value_is_whole = b.value_is_exact;
  unsigned last = 0; /* digit dropped last */
  if (!b.include_ends && b.high_is_exact)
    --b.high;
  *dropped = 0;
  while (b.high / 10 > b.low / 10 || (low_is_whole && b.low % 10 == 0)) {
    low_is_whole = low_is_whole && b.low % 10 == 0;
    value_is_whole = value_is_whole && last == 0;
    last = (unsigned)(b.value % 10);
    b.low /= 10;
    b.value /= 10;
    b.high /= 10;
    ++*dropped;
  }
  const bool is_tie = value_is_whole && last == 5;
  const bool below = b.value == b.low && !low_is_whole;
  const bool up = below || (is_tie ? b.value % 2 == 1 : last >= 5);
  return b.value + up;
}

static bool exact_digits(double value, char *digit, int *exponent) {
  int scale, dropped;
  bounds b;
  if (!find_bounds(value, &scale, &b))
    return false;
  uint64_t whole = shorten(b, &dropped);
  char text[EF__SHORTEST_DIGITS];
  size_t n = 0;
  for (; whole > 0; whole /= 10)
    text[n++] = (char)('0' + whole % 10);
  for (size_t i = 0; i < n; ++i)
    digit[i] = text[n - 1 - i];
  digit[n] = '\0';
  *exponent = (int)n - 1 + dropped - scale;
  return true;
}

/* ---- By trial, for the others ------------------------------------------ */

/* Value rounded to n digits, without the mark, whatever byte the locale has
 * for it; returns the exponent of the first digit. */
static int round_to_digits(double value, int n, char *digit) {
  char text[40];
  snprintf(text, sizeof text, "%.*e", n - 1, value);
  const char *const e = strchr(text, 'e');
  int kept = 0;
  for (const char *at = text; at < e; ++at) {
    if (*at >= '0' && *at <= '9')
      digit[kept++] = *at;
  }
  digit[kept] = '\0';
  return atoi(e + 1);
}

static double digits_value(const char *digit, int exponent) {
  char text[EF__SHORTEST_DIGITS + 16];
  const size_t n = strlen(digit);
  memcpy(text, digit, n);
  snprintf(text + n, 16, "e%d", exponent - ((int)n - 1));
  return strtod(text, NULL); /* no mark in it */
}

/* Adds one unit to the last digit; returns the exponent of the first digit. */
static int add_unit(char *digit, int exponent) {
  size_t i = strlen(digit);
  while (i > 0 && digit[i - 1] == '9')
    digit[--i] = '0';
  if (i > 0) {
    ++digit[i - 1];
    return exponent;
  }
  digit[0] = '1'; /* 999 became 000: 100, one place up */
  return exponent + 1;
}

/* Any decimal of up to 15 digits survives the way through a normal double, so
 * where one exists the 15-digit rounding is it with zeros behind; subnormals
 * carry fewer and are searched from one digit up. The decimal next above a
 * power of two may read back where the nearest, just below it, does not. */
static int tried_digits(double value, char *digit) {
  int n = fpclassify(value) == FP_SUBNORMAL ? 1 : 15;
  for (; n < 17; ++n) {
    int exponent = round_to_digits(value, n, digit);
    double back = digits_value(digit, exponent);
    if (back < value) {
      exponent = add_unit(digit, exponent);
      back = digits_value(digit, exponent);
    }
    if (back == value)
      return exponent;
  }
  return round_to_digits(value, 17, digit);
}

int ef__shortest_digits(double value, char digit[EF__SHORTEST_DIGITS]) {
  int exponent;
  if (!exact_digits(value, digit, &exponent)) {
    exponent = tried_digits(value, digit);
  }
  size_t n = strlen(digit);
  while (n > 1 && digit[n - 1] == '0')
    digit[--n] = '\0';
  return exponent;
}
