/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Numbers as text while the process writes a decimal comma. The locale is
 * compiled by the build into the folder that LOCPATH names. */
#include <locale.h>
#include <stdlib.h>

#include "gen.h"
#include "near.h"

static int set_comma(void **state) {
  (void)state;
  if (setlocale(LC_NUMERIC, "comma") == NULL)
    return 0; /* tests skip */
  char text[8];
  snprintf(text, sizeof text, "%.1f", 1.5);
  return strcmp(text, "1,5") == 0 ? 0 : -1;
}

static void need_comma(void) {
  if (strcmp(localeconv()->decimal_point, ",") != 0) {
    print_message("# no locale with a decimal comma here (no localedef)\n");
    skip();
  }
}

static void numbers_survive_a_decimal_comma(void **state) {
  (void)state;
  need_comma();
  gen g = gen_new(41);
  for (int i = 0; i < 20000; ++i) {
    const double value =
        i % 2 == 0 ? gen_any_double(&g) : gen_between(&g, -100, 100);
    char text[EF_NUMBER_TEXT];
    const size_t length = ef_number_format(value, text);
    assert_null(strchr(text, ','));
    double back = 0;
    assert_true(ef_number_parse(text, length, '.', &back));
    assert_same_bits(&back, &value, 1);
  }
}

static void marks_are_those_asked_for(void **state) {
  (void)state;
  need_comma();
  char text[EF_NUMBER_TEXT];
  double value = 0;
  assert_int_equal(ef_number_format(-1234.5, text), 7);
  assert_string_equal(text, "-1234.5");
  assert_int_equal(ef_number_format_fixed(1234567.891, 2, text), 10);
  assert_string_equal(text, "1234567.89");
  assert_false(ef_number_parse("1,5", 3, '.', &value));
  assert_true(ef_number_parse("1,5", 3, ',', &value));
  assert_near(value, 1.5, 0);
  /* More digits than fit in 64 bits: the way through strtod. */
  const char long_text[] = "0.1000000000000000055511151231257827";
  assert_true(ef_number_parse(long_text, sizeof long_text - 1, '.', &value));
  assert_near(value, 0.1, 0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(numbers_survive_a_decimal_comma),
      cmocka_unit_test(marks_are_those_asked_for),
  };
  /* cmocka's skip() counts as a failure in a TAP stream. */
  if (setlocale(LC_NUMERIC, "comma") == NULL) {
    puts("1..0 # SKIP no locale with a decimal comma could be compiled here");
    return 0;
  }
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, set_comma, NULL);
}
