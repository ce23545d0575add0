/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The decimal mark of strtod and snprintf follows the process-wide locale.
 * Neither is given the chance: text for strtod holds whole digits and an
 * exponent, and from snprintf's text only the digits are taken. */
#include "base/base_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
  /* A decimal can differ from the midpoint of two doubles in its 767th digit
   * at the latest; what follows matters only as zero or not. */
  MAX_DIGITS = 770,
  FAST_DIGITS = 19, /* always fit in 64 bits */
  /* Exponents beyond this overflow or vanish whatever the digits are, as
   * texts are shorter than 2^31 bytes in any sane input. */
  MAX_EXPONENT = 1000000000,
  FIRST_PLAIN = -5, /* decimal exponents written without an exponent */
  LAST_PLAIN = 16
};

/* ---- Reading ----------------------------------------------------------- */

/* A decimal number, taken apart: digit[0 .. n) x 10^exponent. */
typedef struct decimal {
  bool is_negative;
  size_t n;         /* leading zeros are not kept */
  uint64_t leading; /* the first FAST_DIGITS of them as an integer */
  long long exponent;
  char digit[MAX_DIGITS + 1];
} decimal;

static bool is_digit(char c) {
  return c >= '0' && c <= '9';
}

static void add_digit(decimal *d, char c) {
  if (d->n == 0 && c == '0')
    return;
  if (d->n < FAST_DIGITS)
    d->leading = d->leading * 10 + (uint64_t)(c - '0');
  if (d->n < MAX_DIGITS) {
    d->digit[d->n++] = c;
    return;
  }
  if (c != '0')
    d->digit[MAX_DIGITS - 1] = '1'; /* not a tie any more */
  ++d->exponent;
}

static const char *scan_digits(const char *at, const char *end, decimal *d,
                               bool in_fraction, bool *any) {
  for (; at < end && is_digit(*at); ++at) {
    add_digit(d, *at);
    if (in_fraction)
      --d->exponent;
    *any = true;
  }
  return at;
}

/* After the 'e': optional sign and at least one digit. NULL if not so. */
static const char *scan_exponent(const char *at, const char *end,
                                 long long *exponent) {
  const bool is_negative = at < end && *at == '-';
  if (at < end && (*at == '-' || *at == '+'))
    ++at;
  if (at == end || !is_digit(*at))
    return NULL;
  long long value = 0;
  for (; at < end && is_digit(*at); ++at) {
    if (value < MAX_EXPONENT)
      value = value * 10 + (*at - '0');
  }
  *exponent += is_negative ? -value : value;
  return at;
}

static bool scan(const char *text, size_t length, char mark, decimal *d) {
  const char *const end = text + length;
  const char *at = text;
  bool any = false;
  d->is_negative = at < end && *at == '-';
  d->n = 0;
  d->leading = 0;
  d->exponent = 0;
  if (at < end && (*at == '-' || *at == '+'))
    ++at;
  at = scan_digits(at, end, d, false, &any);
  if (at < end && *at == mark)
    at = scan_digits(at + 1, end, d, true, &any);
  if (!any)
    return false;
  if (at < end && (*at == 'e' || *at == 'E')) {
    at = scan_exponent(at + 1, end, &d->exponent);
  }
  return at == end;
}

/* Both factors are exact doubles, so the one rounding is the right one
 * (Clinger 1990). False when they are not. */
static bool convert_exactly(const decimal *d, double *value) {
  static const double power[] = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                 1e8,  1e9,  1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
                                 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};
  if (d->n > FAST_DIGITS || d->leading > UINT64_C(1) << 53)
    return false;
  if (d->exponent < -22 || d->exponent > 22)
    return false;
  const double whole = (double)d->leading;
  *value = d->exponent < 0 ? whole / power[-d->exponent]
                           : whole * power[d->exponent];
  return true;
}

static double convert(decimal *d) {
  double value;
  if (d->n == 0)
    return 0;
  if (convert_exactly(d, &value))
    return value;
  char text[MAX_DIGITS + 32];
  d->digit[d->n] = '\0';
  snprintf(text, sizeof text, "%se%lld", d->digit, d->exponent);
  return strtod(text, NULL);
}

bool ef_number_parse(const char *text, size_t length, char decimal_mark,
                     double *value) {
  decimal d;
  if (!scan(text, length, decimal_mark, &d))
    return false;
  const double magnitude = convert(&d);
  if (!isfinite(magnitude))
    return false;
  *value = d.is_negative ? -magnitude : magnitude;
  return true;
}

/* ---- Writing ----------------------------------------------------------- */

static size_t put(char text[EF_NUMBER_TEXT], const char *word) {
  const size_t length = strlen(word);
  memcpy(text, word, length + 1);
  return length;
}

/* Digits, mark and zeros for an exponent in the plain range. */
static char *put_plain(char *to, const char *digit, int n, int exponent) {
  const int n_whole = exponent + 1; /* digits before the mark */
  if (n_whole <= 0) {
    memcpy(to, "0.00000000", 10);
    to += 2 - n_whole;
    memcpy(to, digit, (size_t)n);
    return to + n;
  }
  if (n_whole >= n) {
    memcpy(to, digit, (size_t)n);
    memset(to + n, '0', (size_t)(n_whole - n));
    return to + n_whole;
  }
  memcpy(to, digit, (size_t)n_whole);
  to += n_whole;
  *to = '.';
  memcpy(to + 1, digit + n_whole, (size_t)(n - n_whole));
  return to + 1 + n - n_whole;
}

static char *put_scientific(char *to, const char *digit, int n, int exponent) {
  *to++ = digit[0];
  if (n > 1)
    *to++ = '.';
  memcpy(to, digit + 1, (size_t)n - 1);
  to += n - 1;
  return to + snprintf(to, 8, "e%d", exponent);
}

size_t ef_number_format(double value, char text[EF_NUMBER_TEXT]) {
  if (isnan(value))
    return put(text, "nan");
  if (isinf(value))
    return put(text, value < 0 ? "-inf" : "inf");
  if (value == 0)
    return put(text, signbit(value) ? "-0" : "0");
  char digit[EF__SHORTEST_DIGITS];
  int n;
  const int exponent = ef__shortest_digits(fabs(value), digit, &n);
  char *to = text;
  if (value < 0)
    *to++ = '-';
  to = exponent >= FIRST_PLAIN && exponent <= LAST_PLAIN
           ? put_plain(to, digit, n, exponent)
           : put_scientific(to, digit, n, exponent);
  *to = '\0';
  return (size_t)(to - text);
}

/* Replaces whatever stands between two groups of digits by one '.'. */
static size_t set_decimal_point(char *text, size_t length) {
  size_t from = text[0] == '-';
  while (from < length && is_digit(text[from]))
    ++from;
  size_t to = from;
  while (to < length && !is_digit(text[to]))
    ++to;
  if (to == length)
    return length;
  text[from++] = '.';
  memmove(text + from, text + to, length - to + 1);
  return length - (to - from);
}

/* `shown` decimals of a number above zero, where that is exact; 0 if not. */
static size_t put_fixed(double value, int shown, char text[EF_NUMBER_TEXT]) {
  uint64_t number;
  char digit[24];
  if (!(value > 0) || !ef__round_exactly(value, shown, &number))
    return 0;
  int n = ef__put_whole(number, digit);
  const int n_zeros = shown >= n ? shown + 1 - n : 0; /* in front */
  memmove(digit + n_zeros, digit, (size_t)n + 1);
  memset(digit, '0', (size_t)n_zeros);
  n += n_zeros;
  memcpy(text, digit, (size_t)(n - shown));
  if (shown == 0) {
    text[n] = '\0';
    return (size_t)n;
  }
  text[n - shown] = '.';
  memcpy(text + n - shown + 1, digit + n - shown, (size_t)shown + 1);
  return (size_t)n + 1;
}

static bool is_all_zeros(const char *text) {
  return strspn(text, "-0.") == strlen(text);
}

size_t ef_number_format_fixed(double value, int decimals,
                              char text[EF_NUMBER_TEXT]) {
  if (!isfinite(value))
    return ef_number_format(value, text);
  const int shown = decimals < 0 ? 0 : decimals > 12 ? 12 : decimals;
  const size_t exact = put_fixed(value, shown, text);
  if (exact > 0)
    return exact;
  const int wanted = snprintf(text, EF_NUMBER_TEXT, "%.*f", shown, value);
  if (wanted < 0 || wanted >= EF_NUMBER_TEXT)
    return ef_number_format(value, text);
  size_t length = set_decimal_point(text, (size_t)wanted);
  if (text[0] == '-' && is_all_zeros(text)) {
    memmove(text, text + 1, length);
    --length;
  }
  return length;
}
