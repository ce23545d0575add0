/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Shortest digits of a double. Every decimal strictly between the midpoints to
 * the two neighbouring doubles reads back to it (and so do the midpoints when
 * the last bit is even). In units of 10^-scale in which neighbours lie 1 to 10
 * apart there is a whole number between the midpoints, but at most one multiple
 * of 10: that one without its zeros is the shortest decimal, and where there is
 * none, the nearest whole number is (the choice of scale and the argument are
 * Giulietti's, 2020). For everyday numbers all of it is exact in whole numbers
 * of 128 bits. For others roundings to more and more digits are tried. */
#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
  MANTISSA_BITS = 52,
  EXPONENT_BIAS = 1023,
  MAX_SCALE = 26 /* ten times the scaled value still fits in 64 bits */
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

static const uint64_t power_of_5[MAX_SCALE + 1] = {
    1,
    5,
    25,
    125,
    625,
    3125,
    15625,
    78125,
    390625,
    1953125,
    9765625,
    48828125,
    244140625,
    1220703125,
    6103515625,
    30517578125,
    152587890625,
    762939453125,
    3814697265625,
    19073486328125,
    95367431640625,
    476837158203125,
    2384185791015625,
    11920928955078125,
    59604644775390625,
    298023223876953125,
    1490116119384765625,
};

/* A double in units of 10^-scale: whole + rest / 2^shift, neighbours 5^scale /
 * 2^shift apart. */
typedef struct scaled {
  int scale;
  unsigned shift;
  uint64_t whole, rest;
  uint64_t below, above; /* to the midpoints, in units of 2^-shift, rounded
                            down: no distance of a whole number is that of a
                            midpoint, an odd number of halves of the unit */
} scaled;

/* False when the value is too large or too small. */
static bool scale_exactly(double value, scaled *s) {
  uint64_t bits;
  memcpy(&bits, &value, sizeof bits);
  const int biased = (int)(bits >> MANTISSA_BITS);
  const int exponent = biased - EXPONENT_BIAS - MANTISSA_BITS;
  const uint64_t fraction = bits & ((UINT64_C(1) << MANTISSA_BITS) - 1);
  /* value = mantissa x 2^exponent */
  const uint64_t mantissa = fraction | UINT64_C(1) << MANTISSA_BITS;
  if (exponent > 0)
    return false;
  /* 78913 / 2^18 = log10(2) - 3e-8, and no power of two comes as near to one of
   * ten in the range. */
  s->scale = exponent == 0 ? 0 : (-exponent * 78913 >> 18) + 1;
  if (s->scale > MAX_SCALE)
    return false;
  s->shift = (unsigned)(-exponent - s->scale);
  const uint64_t power = power_of_5[s->scale];
  const wide product = multiply(mantissa, power);
  s->rest = product.low & ((UINT64_C(1) << s->shift) - 1);
  s->whole = s->shift == 0 ? product.low
                           : product.high << (64 - s->shift) |
                                 product.low >> s->shift;
  s->above = power / 2;
  /* Below a power of two the doubles lie twice as dense. */
  s->below = fraction == 0 ? power / 4 : power / 2;
  return true;
}

/* The multiple of 10 between the midpoints; 0 when there is none. */
static uint64_t round_number(const scaled *s) {
  const uint64_t tens = s->whole / 10;
  const uint64_t down = (s->whole - 10 * tens) << s->shift | s->rest;
  if (down <= s->below)
    return 10 * tens;
  const uint64_t up = (UINT64_C(10) << s->shift) - down;
  return up <= s->above ? 10 * (tens + 1) : 0;
}

/* The nearest whole number; 0 when it does not lie between the midpoints. */
static uint64_t nearest_number(const scaled *s) {
  const uint64_t one = UINT64_C(1) << s->shift;
  const bool is_tie = s->rest == one - s->rest;
  const bool is_up =
      s->rest > one - s->rest || (is_tie && s->whole % 2 == 1);
  const bool is_between =
      is_up ? one - s->rest <= s->above : s->rest <= s->below;
  return is_between ? s->whole + is_up : 0;
}

/* Takes zeros off the end of a number that is not 0; `*scale` goes with it. */
static uint64_t without_zeros(uint64_t number, int *scale) {
  static const uint32_t power[] = {100000000, 10000, 100, 10};
  for (int i = 0, zeros = 8; i < 4; ++i, zeros /= 2) {
    /* 8 zeros may be there twice. */
    while (number % power[i] == 0) {
      number /= power[i];
      *scale -= zeros;
    }
  }
  return number;
}

/* Digits of a number above 0, in pairs from the end; their number. */
static int put_digits(uint64_t number, char *digit) {
  static const char pairs[] =
      "00010203040506070809101112131415161718192021222324252627282930313233343536"
      "37383940414243444546474849505152535455565758596061626364656667686970717273"
      "7475767778798081828384858687888990919293949596979899";
  char text[EF__SHORTEST_DIGITS];
  int at = EF__SHORTEST_DIGITS;
  while (number >= 10) {
    at -= 2;
    memcpy(text + at, pairs + 2 * (number % 100), 2);
    number /= 100;
  }
  if (number > 0)
    text[--at] = (char)('0' + number);
  const int n = EF__SHORTEST_DIGITS - at;
  memcpy(digit, text + at, (size_t)n);
  digit[n] = '\0';
  return n;
}

static bool exact_digits(double value, char *digit, int *n, int *exponent) {
  scaled s;
  if (!scale_exactly(value, &s))
    return false;
  int scale = s.scale;
  uint64_t number = round_number(&s);
  if (number > 0) {
    number = without_zeros(number, &scale);
  } else {
    number = nearest_number(&s);
  }
  if (number == 0)
    return false;
  *n = put_digits(number, digit);
  *exponent = *n - 1 - scale;
  return true;
}

/* ---- A fixed number of decimals ---------------------------------------- */

bool ef__round_exactly(double value, int decimals, uint64_t *number) {
  uint64_t bits;
  memcpy(&bits, &value, sizeof bits);
  const int biased = (int)(bits >> MANTISSA_BITS);
  const uint64_t mantissa = (bits & ((UINT64_C(1) << MANTISSA_BITS) - 1)) |
                            UINT64_C(1) << MANTISSA_BITS;
  /* value x 10^decimals = mantissa x 5^decimals / 2^shift */
  const int shift = EXPONENT_BIAS + MANTISSA_BITS - biased - decimals;
  if (biased == 0 || shift < 1 || shift > 63)
    return false;
  const wide product = multiply(mantissa, power_of_5[decimals]);
  if (product.high >> (shift - 1) != 0)
    return false;
  const uint64_t one = UINT64_C(1) << shift;
  const uint64_t rest = product.low & (one - 1);
  *number = product.high << (64 - shift) | product.low >> shift;
  if (rest > one - rest || (rest == one - rest && *number % 2 == 1))
    ++*number;
  return true;
}

int ef__put_whole(uint64_t number, char *digit) {
  if (number > 0)
    return put_digits(number, digit);
  memcpy(digit, "0", 2);
  return 1;
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

int ef__shortest_digits(double value, char digit[EF__SHORTEST_DIGITS],
                        int *n_digits) {
  int exponent;
  if (exact_digits(value, digit, n_digits, &exponent))
    return exponent;
  exponent = tried_digits(value, digit);
  int n = (int)strlen(digit);
  while (n > 1 && digit[n - 1] == '0')
    digit[--n] = '\0';
  *n_digits = n;
  return exponent;
}
