/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tables of texts by the names of their columns. */
#include <evenfield/exchange.h>

#include "fail_alloc.h"
#include "heard.h"
#include "near.h"
#include "scratch.h"

static const char *const names[] = {"reference", "sample", "weight"};

static ef_fields *open_text(const char *text, size_t n_needed,
                            const ef_notes *notes, ef_error *error) {
  char path[SCRATCH_PATH];
  scratch_write("pairs.csv", text, strlen(text));
  scratch_path("pairs.csv", path);
  return ef_fields_open(path, 3, n_needed, names, notes, error);
}

static void columns_in_any_order(void **state) {
  (void)state;
  heard h = {0};
  const ef_notes notes = heard_notes(&h);
  ef_error error = {0};
  ef_fields *const fields =
      open_text("# a list\nSample;remark;weight;REFERENCE\n"
                "\"deck; grey\";x;1,5; sea \n;;;\n\nb;y;\"2\";\"\"\"q\"\"\"\n",
                3, &notes, &error);
  assert_non_null(fields);
  const char *const *text;
  size_t line;
  double weight;
  assert_int_equal(ef_fields_next(fields, &text, &line, &error), EF_OK);
  assert_string_equal(text[0], "sea");
  assert_string_equal(text[1], "deck; grey");
  assert_string_equal(text[2], "1,5");
  assert_int_equal(line, 3);
  assert_int_equal(ef_fields_number(fields, 2, &weight, &error), EF_OK);
  assert_near(weight, 1.5, 0);
  assert_int_equal(ef_fields_next(fields, &text, &line, &error), EF_OK);
  assert_string_equal(text[0], "\"q\"");
  assert_int_equal(line, 6);
  assert_int_equal(ef_fields_next(fields, &text, &line, &error), EF_OK);
  assert_null(text);
  assert_int_equal(h.n, 2);
  assert_non_null(strstr(h.text, "numbers are read with a decimal comma"));
  assert_non_null(strstr(h.text, ":2: column 'remark' is not used"));
  ef_fields_free(fields);
}

static void columns_that_are_missing(void **state) {
  (void)state;
  ef_error error = {0};
  const char *const *text;
  double weight;
  ef_fields *const fields =
      open_text("reference,sample\na,b\n", 2, NULL, &error);
  assert_non_null(fields);
  assert_int_equal(ef_fields_next(fields, &text, NULL, &error), EF_OK);
  assert_string_equal(text[2], "");
  assert_int_equal(ef_fields_number(fields, 2, &weight, &error), EF_INVALID);
  ef_fields_free(fields);
  assert_null(open_text("reference,specimen\na,b\n", 2, NULL, &error));
  assert_error(&error, EF_MALFORMED, "there is no column called sample");
  assert_int_equal(error.line, 1);
  assert_null(ef_fields_open("demo:livry", 3, 2, names, NULL, &error));
  assert_int_equal(error.status, EF_UNKNOWN_NAME);
  assert_null(ef_fields_open("demo:livery", 2, 3, names, NULL, &error));
  assert_int_equal(error.status, EF_INVALID);
  assert_null(ef_fields_open("/nowhere/p.csv", 3, 2, names, NULL, &error));
  assert_int_equal(error.status, EF_UNREADABLE);
}

static void fields_that_are_wrong(void **state) {
  (void)state;
  ef_error error = {0};
  const char *const *text;
  double weight;
  ef_fields *fields =
      open_text("reference,sample,weight\na,b,much\n", 3, NULL, &error);
  assert_int_equal(ef_fields_next(fields, &text, NULL, &error), EF_OK);
  assert_int_equal(ef_fields_number(fields, 2, &weight, &error), EF_MALFORMED);
  assert_error(&error, EF_MALFORMED, "found 'much', expected a number");
  assert_int_equal(error.line, 2);
  assert_string_equal(error.field, "weight");
  ef_fields_free(fields);
  fields = open_text("reference,sample,weight\na,b\n", 3, NULL, &error);
  assert_int_equal(ef_fields_next(fields, &text, NULL, &error), EF_MALFORMED);
  assert_null(text);
  ef_fields_free(fields);
}

/* The caller's own checks are placed like the reader's. */
static void faults_of_the_caller(void **state) {
  (void)state;
  ef_error error = {0};
  const char *const *text;
  ef_fields *fields = open_text("# unit: Delta E*00\nSample,Reference\na,b\n", 2,
                                NULL, &error);
  assert_string_equal(ef_fields_unit(fields), "Delta E*00");
  assert_true(ef_fields_has(fields, 0) && ef_fields_has(fields, 1));
  assert_false(ef_fields_has(fields, 2));
  assert_false(ef_fields_has(fields, 3));
  assert_int_equal(ef_fields_next(fields, &text, NULL, &error), EF_OK);
  assert_int_equal(ef_fields_fault(fields, 0, &error, "found '%s'", text[0]),
                   EF_MALFORMED);
  assert_error(&error, EF_MALFORMED, "found 'b'");
  assert_int_equal(error.line, 3);
  assert_int_equal(error.column, 2);
  assert_string_equal(error.field, "Reference");
  ef_fields_free(fields);
  fields = open_text("reference,sample\n", 2, NULL, &error);
  assert_string_equal(ef_fields_unit(fields), "");
  ef_fields_free(fields);
}

static bool read_in_short_memory(void *context) {
  const char *const path = context;
  ef_error error = {0};
  const char *const *text = NULL;
  ef_fields *const fields = ef_fields_open(path, 3, 2, names, NULL, &error);
  ef_status status = fields == NULL ? error.status : EF_OK;
  if (fields != NULL)
    status = ef_fields_next(fields, &text, NULL, &error);
  if (status != EF_OK)
    assert_int_equal(status, EF_NO_MEMORY);
  ef_fields_free(fields);
  return status == EF_OK;
}

static void memory_may_run_out(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  scratch_write("short.csv", "reference,sample\na,b\n", 21);
  scratch_path("short.csv", path);
  fail_alloc_each(read_in_short_memory, path);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(columns_in_any_order),
      cmocka_unit_test(columns_that_are_missing),
      cmocka_unit_test(fields_that_are_wrong),
      cmocka_unit_test(faults_of_the_caller),
      cmocka_unit_test(memory_may_run_out),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
