/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <stdlib.h>

#include "gen.h"
#include "near.h"

static void check_round_trip(double value) {
  char text[EF_NUMBER_TEXT];
  const size_t length = ef_number_format(value, text);
  assert_true(length < EF_NUMBER_TEXT && length == strlen(text));
  double back = 0;
  assert_true(ef_number_parse(text, length, '.', &back));
  assert_same_bits(&back, &value, 1);
}

static void any_double_survives_as_text(void **state) {
  (void)state;
  gen g = gen_new(1);
  for (int i = 0; i < 60000; ++i)
    check_round_trip(gen_any_double(&g));
  for (int i = 0; i < 20000; ++i) {
    check_round_trip(gen_between(&g, -100, 100));
    check_round_trip((double)(int64_t)gen_bits(&g));
    check_round_trip(floor(gen_between(&g, -1e6, 1e6)) / 1000);
    check_round_trip(gen_unit(&g) * DBL_MIN);
  }
}

static int significant_digits(const char *text) {
  int n = 0, zeros = 0;
  for (; *text != '\0' && *text != 'e'; ++text) {
    if (*text < '0' || *text > '9')
      continue;
    if (*text == '0') {
      zeros += n > 0; /* counted if a digit follows */
      continue;
    }
    n += zeros + 1;
    zeros = 0;
  }
  return n;
}

/* No decimal with one digit fewer reads back: the two around the value, at
 * every power of two, where the doubles lie unevenly, and at random ones. */
static void check_shortest(double value) {
  char text[EF_NUMBER_TEXT];
  ef_number_format(value, text);
  const int n = significant_digits(text);
  if (n < 2)
    return;
  char digits[40];
  snprintf(digits, sizeof digits, "%.*e", n - 2, value);
  char *end;
  const double nearest = strtod(digits, NULL);
  if (nearest == value)
    fail_msg("%s reads back to %s", digits, text);
  const long exponent = strtol(strchr(digits, 'e') + 1, &end, 10);
  char other[80];
  for (int step = -1; step <= 1; step += 2) {
    long long whole = 0;
    for (const char *at = digits; *at != 'e'; ++at) {
      if (*at != '.')
        whole = whole * 10 + (*at - '0');
    }
    snprintf(other, sizeof other, "%llde%ld", whole + step, exponent - (n - 2));
    if (strtod(other, NULL) == value) {
      fail_msg("%s reads back to %s", other, text);
    }
  }
}

/* Of all decimals of that length that read back, the nearest was taken: the
 * C library's rounding, wherever that reads back. */
static void check_nearest(double value) {
  char text[EF_NUMBER_TEXT], rounded[40], normal[40];
  ef_number_format(value, text);
  const int n = significant_digits(text);
  snprintf(rounded, sizeof rounded, "%.*e", n - 1, value);
  if (strtod(rounded, NULL) != value)
    return;
  /* Ours in the same form: its digits are exact there. */
  snprintf(normal, sizeof normal, "%.*e", n - 1, strtod(text, NULL));
  assert_string_equal(normal, rounded);
  int kept = 0;
  for (const char *at = text; *at != '\0' && *at != 'e' && kept < n; ++at) {
    if (*at < '0' || *at > '9' || (kept == 0 && *at == '0'))
      continue;
    const char digit = rounded[kept == 0 ? 0 : kept + 1];
    if (*at != digit)
      fail_msg("%s is not the nearest, %s is", text, rounded);
    ++kept;
  }
}

static void check_both(double value) {
  check_round_trip(value);
  check_shortest(value);
  check_nearest(value);
}

/* Where digits are computed exactly (1e-10 to 1e16) and just beyond. */
static void everyday_text_is_shortest_and_nearest(void **state) {
  (void)state;
  gen g = gen_new(5);
  for (int i = 0; i < 40000; ++i) {
    const double size = pow(10, gen_between(&g, -12, 18));
    check_both(size * gen_unit(&g));
    check_both((double)gen_below(&g, 1000000) / 1000);
    check_both(nextafter((double)gen_below(&g, 1000000), 0) + 1e-9);
    check_both(
        ldexp((double)(1 + gen_below(&g, 999)), (int)gen_below(&g, 80) - 30));
  }
  for (int e = -30; e < 25; ++e) {
    const double power = pow(10, e);
    check_both(power);
    check_both(nextafter(power, 0));
    check_both(nextafter(power, DBL_MAX));
  }
}

static void text_is_the_shortest(void **state) {
  (void)state;
  for (int e = -1074; e < 1024; ++e)
    check_both(ldexp(1, e));
  gen g = gen_new(2);
  for (int i = 0; i < 50000; ++i)
    check_shortest(fabs(gen_any_double(&g)));
  for (int i = 0; i < 5000; ++i)
    check_shortest(gen_unit(&g) * DBL_MIN);
}

/* The C library's own reading, in the C locale, is the reference. */
static void reading_is_correctly_rounded(void **state) {
  (void)state;
  gen g = gen_new(3);
  for (int i = 0; i < 40000; ++i) {
    char text[64];
    const int n_digits = 1 + (int)gen_below(&g, 25);
    int length = 0;
    for (int k = 0; k < n_digits; ++k) {
      text[length++] = (char)('0' + gen_below(&g, 10));
      if (k == n_digits / 2)
        text[length++] = '.';
    }
    snprintf(text + length, sizeof text - (size_t)length, "e%d",
             (int)gen_below(&g, 60) - 30);
    double value = 0;
    assert_true(ef_number_parse(text, strlen(text), '.', &value));
    const double expected = strtod(text, NULL);
    assert_same_bits(&value, &expected, 1);
  }
}

/* The C library's rounding, which is that of the exact value. */
static void fixed_decimals_are_those_of_printf(void **state) {
  (void)state;
  gen g = gen_new(6);
  for (int i = 0; i < 60000; ++i) {
    char text[EF_NUMBER_TEXT], expected[EF_NUMBER_TEXT];
    const int decimals = (int)gen_below(&g, 13);
    /* Also ties, such as 2.5 and 0.125. */
    const double value =
        i % 3 == 0 ? ldexp((double)gen_below(&g, 4000), -(int)gen_below(&g, 9))
                   : pow(10, gen_between(&g, -14, 9)) * gen_unit(&g);
    const size_t length = ef_number_format_fixed(value, decimals, text);
    snprintf(expected, sizeof expected, "%.*f", decimals, value);
    assert_string_equal(text, expected);
    assert_int_equal(length, strlen(expected));
  }
}

static void fixed_decimals_are_within_half_a_unit(void **state) {
  (void)state;
  gen g = gen_new(4);
  for (int i = 0; i < 20000; ++i) {
    const int decimals = (int)gen_below(&g, 10);
    const double value = gen_between(&g, -1000, 1000);
    char text[EF_NUMBER_TEXT];
    const size_t length = ef_number_format_fixed(value, decimals, text);
    double back = 0;
    assert_true(ef_number_parse(text, length, '.', &back));
    /* Half a unit, and the rounding of `back` itself. */
    assert_near(back, value, 0.5 * pow(10, -decimals) + 2e-13);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(any_double_survives_as_text),
      cmocka_unit_test(everyday_text_is_shortest_and_nearest),
      cmocka_unit_test(text_is_the_shortest),
      cmocka_unit_test(reading_is_correctly_rounded),
      cmocka_unit_test(fixed_decimals_are_those_of_printf),
      cmocka_unit_test(fixed_decimals_are_within_half_a_unit),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
