/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The fast way for the numbers that tables hold: up to 19 digits and a small
 * exponent. Whatever it is not sure of goes to ef_number_parse, so that the
 * result is always the correctly rounded one. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <string.h>

enum {
  MOST_DIGITS = 19,  /* always fit in 64 bits */
  EXACT_POWER = 22,  /* 10^22 is the largest that is a double */
  LARGEST_POWER = 45 /* 10^45 is the largest that is a sum of two doubles */
};

/* 10^k = high + low, exactly. */
typedef struct power {
  double high, low;
} power;

static const power powers[LARGEST_POWER + 1] = {
    {1e0, 0},
    {1e1, 0},
    {1e2, 0},
    {1e3, 0},
    {1e4, 0},
    {1e5, 0},
    {1e6, 0},
    {1e7, 0},
    {1e8, 0},
    {1e9, 0},
    {1e10, 0},
    {1e11, 0},
    {1e12, 0},
    {1e13, 0},
    {1e14, 0},
    {1e15, 0},
    {1e16, 0},
    {1e17, 0},
    {1e18, 0},
    {1e19, 0},
    {1e20, 0},
    {1e21, 0},
    {1e22, 0},
    {1e23, 8388608},
    {1e24, 16777216},
    {1e25, -905969664},
    {1e26, -4764729344},
    {1e27, -13287555072},
    {1e28, 416880263168},
    {1e29, 8566849142784},
    {1e30, -19884624838656},
    {1e31, 364103705034752},
    {1e32, -5366162204393472},
    {1e33, 5.442476901295718e16},
    {1e34, 5.4424769012957184e17},
    {1e35, 3.1366338920820244e18},
    {1e36, -4.242063737401796e19},
    {1e37, 4.6123734179787886e20},
    {1e38, 2.251190176543966e21},
    {1e39, 6.029083362839682e22},
    {1e40, -3.037860284270037e23},
    {1e41, -6.200086450407783e23},
    {1e42, -4.488571267807592e25},
    {1e43, -1.393721169594141e26},
    {1e44, -8.821361405306423e27},
    {1e45, 7.024271097546445e28},
};

static bool is_digit(char c) {
  return c >= '0' && c <= '9';
}

/* whole / 10^k, correctly rounded, or false when that cannot be told.
 *
 * whole = hi + lo and 10^k = p.high + p.low exactly; q is the first quotient
 * and `rest` what it leaves, an exact double by fma. The quotient is then
 * q + c with c = (rest - q p.low + lo) / p.high, where c carries an error of at
 * most five roundings of its parts (2^-53 each), below `bound`. Rounding is
 * monotone: if q + c - bound and q + c + bound round to one double, the true
 * quotient rounds to it as well. */
static bool divide_exactly(uint64_t whole, int k, double *value) {
  const power p = powers[k];
  const uint64_t tail = whole >> 53 == 0 ? 0 : whole & UINT64_C(0x7FF);
  const double hi = (double)(whole - tail); /* at most 53 bits */
  const double lo = (double)tail;
  const double q = hi / p.high;
  const double rest = fma(-q, p.high, hi);
  const double low_part = q * p.low;
  const double c = (rest - low_part + lo) / p.high;
  const double size = (fabs(rest) + fabs(low_part) + lo) / p.high;
  const double bound = size * 0x1p-49;
  const double below = q + (c - bound);
  *value = q + (c + bound);
  return below == *value;
}

/* whole x 10^exponent, correctly rounded, or false when that is not sure. */
static bool convert(uint64_t whole, int exponent, double *value) {
  if (whole <= UINT64_C(1) << 53 && exponent >= -EXACT_POWER) {
    if (exponent > EXACT_POWER) return false;
    /* Both factors are doubles: one rounding. */
    *value = exponent < 0 ? (double)whole / powers[-exponent].high
                          : (double)whole * powers[exponent].high;
    return true;
  }
  if (exponent >= 0 || exponent < -LARGEST_POWER) return false;
  return divide_exactly(whole, -exponent, value);
}

/* Behind the 'e'; NULL when no digit follows. */
static const char *scan_exponent(const char *at, int *exponent) {
  const bool is_negative = *at == '-';
  if (*at == '-' || *at == '+') ++at;
  if (!is_digit(*at)) return NULL;
  int power_of_ten = 0;
  for (; is_digit(*at); ++at) {
    if (power_of_ten < 100000) power_of_ten = power_of_ten * 10 + (*at - '0');
  }
  *exponent += is_negative ? -power_of_ten : power_of_ten;
  return at;
}

/* Digits of a text without the zeros in front. */
static ptrdiff_t count_digits(const char *first, const char *end,
                              ptrdiff_t n_digits, char mark) {
  for (; first < end && (*first == '0' || *first == mark); ++first) {
    if (*first == '0') --n_digits;
  }
  return n_digits;
}

const char *ef__decimal_scan(const char *at, const char *end, char mark,
                             double *value) {
  const char *const start = at;
  const bool is_negative = *at == '-';
  if (is_negative || *at == '+') ++at;
  const char *const first = at;
  uint64_t whole = 0;
  int exponent = 0;
  for (; is_digit(*at); ++at) whole = whole * 10 + (uint64_t)(*at - '0');
  ptrdiff_t n_digits = at - first;
  if (*at == mark && at < end) {
    const char *const fraction = ++at;
    for (; is_digit(*at); ++at) whole = whole * 10 + (uint64_t)(*at - '0');
    if (at - fraction > 100000) return NULL; /* beyond int: let others judge */
    exponent = -(int)(at - fraction);
    n_digits += at - fraction;
  }
  if (n_digits == 0) return NULL;
  if (n_digits > MOST_DIGITS) {
    n_digits = count_digits(first, at, n_digits, mark);
  }
  if (*at == 'e' || *at == 'E') {
    at = scan_exponent(at + 1, &exponent);
    if (at == NULL) return NULL;
  }
  double magnitude;
  if (n_digits <= MOST_DIGITS && convert(whole, exponent, &magnitude)) {
    *value = is_negative ? -magnitude : magnitude;
    return at;
  }
  return ef_number_parse(start, (size_t)(at - start), mark, value) ? at : NULL;
}

/* ---- Why not ----------------------------------------------------------- */

static char lower(char c) {
  return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

static bool is_endless(ef__span span) {
  static const char *const words[] = {"nan",  "inf",  "infinity", "#n/a",
                                      "n/a",  "#num!", "#div/0!", "null",
                                      "none", "1.#inf", "1.#qnan"};
  if (span.length > 0 && (span.text[0] == '-' || span.text[0] == '+')) {
    ++span.text;
    --span.length;
  }
  for (size_t i = 0; i < sizeof words / sizeof *words; ++i) {
    size_t n = 0;
    while (n < span.length && lower(span.text[n]) == words[i][n] &&
           words[i][n] != '\0') {
      ++n;
    }
    if (n == span.length && words[i][n] == '\0') return true;
  }
  return false;
}

/* Sign, digits with a mark between or beside them, exponent. */
static bool has_number_form(ef__span span, char mark) {
  const char *at = span.text;
  const char *const end = at + span.length;
  size_t n_digits = 0;
  if (at < end && (*at == '-' || *at == '+')) ++at;
  for (; at < end && is_digit(*at); ++at) ++n_digits;
  if (at < end && *at == mark) ++at;
  for (; at < end && is_digit(*at); ++at) ++n_digits;
  if (n_digits == 0) return false;
  if (at < end && lower(*at) == 'e') {
    ++at;
    if (at < end && (*at == '-' || *at == '+')) ++at;
    if (at == end) return false;
    while (at < end && is_digit(*at)) ++at;
  }
  return at == end;
}

ef__decimal_fault ef__decimal_read(ef__span span, char mark, double *value) {
  if (span.length == 0) return EF__DECIMAL_EMPTY;
  if (ef_number_parse(span.text, span.length, mark, value)) {
    return EF__DECIMAL_GOOD;
  }
  if (has_number_form(span, mark)) return EF__DECIMAL_TOO_LARGE;
  if (has_number_form(span, '.') || has_number_form(span, ',')) {
    return EF__DECIMAL_MARK;
  }
  return is_endless(span) ? EF__DECIMAL_ENDLESS : EF__DECIMAL_TEXT;
}
