/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>

#include "near.h"

/* ---- Numbers ----------------------------------------------------------- */

static void check_parse(const char *text, double expected) {
  double value = 37.23;
  assert_true(ef_number_parse(text, strlen(text), '.', &value));
  assert_same_bits(&value, &expected, 1);
}

static void check_refused(const char *text, char mark) {
  double value = 37.23;
  if (ef_number_parse(text, strlen(text), mark, &value)) {
    fail_msg("'%s' was taken for a number", text);
  }
  assert_near(value, 37.23, 0);
}

static void numbers_are_read(void **state) {
  (void)state;
  check_parse("0", 0.0);
  check_parse("-0", -0.0);
  check_parse("+7", 7.0);
  check_parse(".5", 0.5);
  check_parse("5.", 5.0);
  check_parse("0.1", 0.1);
  check_parse("-12.625e2", -1262.5);
  check_parse("1E-3", 1e-3);
  check_parse("000001.2500000", 1.25);
  check_parse("9007199254740993", 9007199254740992.0); /* tie to even */
  check_parse("9007199254740993.00000000000000000001", 9007199254740994.0);
  check_parse("123456789012345678901234567890",
              123456789012345678901234567890.0);
  check_parse("1.7976931348623157e308", DBL_MAX);
  check_parse("4.9406564584124654e-324", 4.9406564584124654e-324);
  check_parse("2.2250738585072011e-308", 2.2250738585072011e-308);
  check_parse("1e-400", 0.0);
  check_parse("0e999999999999999999999999", 0.0);
  check_parse("1e-999999999999999999999999", 0.0);
  check_parse("0.000000000000000000000000000001e30", 1.0);
}

static void decimal_comma_is_read_where_it_is_the_mark(void **state) {
  (void)state;
  double value;
  assert_true(ef_number_parse("1,5", 3, ',', &value));
  assert_near(value, 1.5, 0);
  assert_true(ef_number_parse("1.5xyz", 3, '.', &value)); /* length rules */
  assert_near(value, 1.5, 0);
  check_refused("1.5", ',');
  check_refused("1,5", '.');
}

static void what_is_no_number_is_refused(void **state) {
  (void)state;
  const char *const text[] = {"",       " ",
                              "1 ",     " 1",
                              "-",      "+",
                              ".",      "e5",
                              "1e",     "1e+",
                              "1e5.",   "1.2.3",
                              "--1",    "+-1",
                              "0x10",   "1p3",
                              "nan",    "inf",
                              "-inf",   "NaN",
                              "1f",     "1,5",
                              "1_000",  "1e999",
                              "-1e309", "1.7976931348623159e308",
                              ".e1",    "1e5e5",
                              "4o0"};
  for (size_t i = 0; i < sizeof text / sizeof *text; ++i) {
    check_refused(text[i], '.');
  }
  double value;
  assert_false(ef_number_parse("1\0002", 3, '.', &value));
}

/* Halfway cases are decided by digits far behind: 2^-1074 / 2 has 751. */
static void far_digits_decide(void **state) {
  (void)state;
  char text[1200];
  const int length = snprintf(text, sizeof text, "%.1074f", 0x1p-1074);
  assert_int_equal(length, 1076);
  check_parse(text, 0x1p-1074);
  /* 1 + 2^-53 exactly, a tie, then with a 1 in the 1000th place. */
  snprintf(text, sizeof text, "%.999f", 1.0);
  const char tie[] = "1.00000000000000011102230246251565404236316680908203125";
  memcpy(text, tie, sizeof tie - 1);
  check_parse(text, 1.0);
  text[strlen(text) - 1] = '1';
  check_parse(text, 1.0 + DBL_EPSILON);
}

static void check_format(double value, const char *expected) {
  char text[EF_NUMBER_TEXT];
  memset(text, '#', sizeof text);
  assert_int_equal(ef_number_format(value, text), strlen(expected));
  assert_string_equal(text, expected);
}

static void numbers_are_written_shortest(void **state) {
  (void)state;
  check_format(0.0, "0");
  check_format(-0.0, "-0");
  check_format(1.0, "1");
  check_format(-37.23, "-37.23");
  check_format(0.1, "0.1");
  check_format(0.1 + 0.2, "0.30000000000000004");
  check_format(1e5, "100000");
  check_format(1e16, "10000000000000000");
  check_format(12345678901234567.0, "12345678901234568");
  check_format(1e17, "1e17");
  check_format(1.5e300, "1.5e300");
  check_format(0.00001, "0.00001");
  check_format(1.25e-6, "1.25e-6");
  check_format(5e-324, "5e-324");
  check_format(-2.2250738585072014e-308, "-2.2250738585072014e-308");
  check_format(DBL_MAX, "1.7976931348623157e308");
  check_format(NOT_A_NUMBER, "nan");
  check_format(INFINITE, "inf");
  check_format(-INFINITE, "-inf");
}

static void check_fixed(double value, int decimals, const char *expected) {
  char text[EF_NUMBER_TEXT];
  assert_int_equal(ef_number_format_fixed(value, decimals, text),
                   strlen(expected));
  assert_string_equal(text, expected);
}

static void numbers_are_written_with_fixed_decimals(void **state) {
  (void)state;
  check_fixed(3.14159, 2, "3.14");
  check_fixed(-3.14159, 0, "-3");
  check_fixed(-0.004, 2, "0.00");
  check_fixed(-0.4, 0, "0");
  check_fixed(-0.0, 1, "0.0");
  check_fixed(2, 12, "2.000000000000");
  check_fixed(2, 99, "2.000000000000");
  check_fixed(2.6, -1, "3");
  check_fixed(1e17, 12, "100000000000000000.000000000000");
  check_fixed(-1e17, 12, "-1e17"); /* one character too many */
  check_fixed(1e300, 3, "1e300");
  check_fixed(NOT_A_NUMBER, 3, "nan");
  check_fixed(-INFINITE, 3, "-inf");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(numbers_are_read),
      cmocka_unit_test(decimal_comma_is_read_where_it_is_the_mark),
      cmocka_unit_test(what_is_no_number_is_refused),
      cmocka_unit_test(far_digits_decide),
      cmocka_unit_test(numbers_are_written_shortest),
      cmocka_unit_test(numbers_are_written_with_fixed_decimals),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
