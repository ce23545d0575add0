/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CSV and JSON as they are written; that they read back is a law. */
#include <stdlib.h>
#include <unistd.h>

#include <jansson.h>

#include <evenfield/exchange.h>

#include "fail_alloc.h"
#include "near.h"
#include "scratch.h"

static ef_output *begin(void) {
  char path[SCRATCH_PATH];
  scratch_path("out", path);
  ef_output *const output = ef_output_open(path, true, NULL);
  assert_non_null(output);
  return output;
}

static void expect(ef_output *output, const char *text) {
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  scratch_expect("out", text);
}

/* ---- CSV --------------------------------------------------------------- */

static void csv_rows(void **state) {
  (void)state;
  ef_output *const output = begin();
  ef_csv *const csv = ef_csv_new(output, NULL);
  ef_csv_comment(csv, "title: deck\r\nsecond line\n");
  ef_csv_comment(csv, "");
  ef_csv_text(csv, "name");
  ef_csv_text(csv, "L");
  ef_csv_text(csv, "with, comma");
  ef_csv_end_row(csv);
  ef_csv_text(csv, "an \"old\" lamp");
  ef_csv_number(csv, 37.23);
  ef_csv_number(csv, 0.1 + 0.2);
  ef_csv_end_row(csv);
  ef_csv_text(csv, "two\nlines");
  ef_csv_number(csv, NOT_A_NUMBER);
  ef_csv_number(csv, -INFINITE);
  ef_csv_comment(csv, "ends the row");
  ef_csv_text(csv, "#7");
  ef_csv_text(csv, "#7");
  ef_csv_text(csv, " blank");
  ef_csv_text(csv, "semi;colon");
  ef_csv_text(csv, "tab\t");
  ef_csv_text(csv, NULL);
  ef_csv_end_row(csv);
  ef_csv_text(csv, "");
  ef_csv_end_row(csv);
  ef_csv_number(csv, NOT_A_NUMBER);
  ef_csv_end_row(csv);
  ef_csv_text(csv, "");
  ef_csv_text(csv, "");
  assert_int_equal(ef_csv_finish(csv, NULL), EF_OK);
  expect(output, "# title: deck\n# second line\n# \n"
                 "name,L,\"with, comma\"\n"
                 "\"an \"\"old\"\" lamp\",37.23,0.30000000000000004\n"
                 "\"two\nlines\",,-inf\n"
                 "# ends the row\n"
                 "\"#7\",#7,\" blank\",\"semi;colon\",\"tab\t\",\n"
                 "\"\"\n\"\"\n,\n");
  assert_int_equal(ef_csv_finish(NULL, NULL), EF_OK);
}

/* A row of its own, and in parts. */
static void csv_rows_from_another_writer(void **state) {
  (void)state;
  ef_output *const output = begin();
  ef_output *const part = ef_output_memory(NULL);
  ef_csv *const csv = ef_csv_new(output, NULL);
  size_t length;
  ef_csv_text(csv, "name");
  for (int i = 0; i < 2; ++i) {
    ef_csv *const rows = ef_csv_new(part, NULL);
    ef_output_clear(part);
    ef_csv_text(rows, "a,b");
    ef_csv_number(rows, 37.23 + i);
    assert_int_equal(ef_csv_finish(rows, NULL), EF_OK);
    const char *const bytes = ef_output_bytes(part, &length);
    ef_csv_rows(csv, bytes, length); /* the first one ends the header */
  }
  ef_csv_rows(csv, NULL, 0);
  assert_int_equal(ef_csv_finish(csv, NULL), EF_OK);
  ef_output_discard(part);
  expect(output, "name\n\"a,b\",37.23\n\"a,b\",38.23\n");
}

static void csv_keeps_the_failure(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const output = ef_output_open("/dev/full", true, NULL);
  assert_non_null(output);
  ef_csv *const csv = ef_csv_new(output, NULL);
  for (int i = 0; i < 50000; ++i) ef_csv_number(csv, 37.23);
  assert_int_equal(ef_csv_finish(csv, &error), EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "no space is left");
  ef_output_discard(output);
}

/* ---- JSON -------------------------------------------------------------- */

static void json_document(void **state) {
  (void)state;
  ef_output *const output = begin();
  ef_json *const json = ef_json_new(output, NULL);
  ef_json_begin_object(json, NULL);
  ef_json_text(json, "name", "hull \"navy\"\n");
  ef_json_number(json, "X", 37.23);
  ef_json_number(json, "gap", NOT_A_NUMBER);
  ef_json_number(json, "far", INFINITE);
  ef_json_number(json, "zero", -0.0);
  ef_json_integer(json, "seed", INT64_MIN);
  ef_json_boolean(json, "in_gamut", true);
  ef_json_boolean(json, "dark", false);
  ef_json_null(json, "nearest");
  ef_json_text(json, "limit", NULL);
  ef_json_begin_array(json, "amounts");
  ef_json_number(json, NULL, 0.25);
  ef_json_integer(json, NULL, -7);
  ef_json_text(json, NULL, "x");
  ef_json_end_array(json);
  ef_json_begin_array(json, "none");
  ef_json_end_array(json);
  ef_json_begin_object(json, "empty");
  ef_json_end_object(json);
  ef_json_begin_array(json, "targets");
  ef_json_begin_object(json, NULL);
  ef_json_integer(json, "a", 1);
  ef_json_end_object(json);
  ef_json_integer(json, NULL, 2);
  ef_json_end_array(json);
  ef_json_end_object(json);
  assert_int_equal(ef_json_finish(json, NULL), EF_OK);
  expect(output, "{\n"
                 "  \"name\": \"hull \\\"navy\\\"\\n\",\n"
                 "  \"X\": 37.23,\n"
                 "  \"gap\": null,\n"
                 "  \"far\": null,\n"
                 "  \"zero\": -0.0,\n"
                 "  \"seed\": -9223372036854775808,\n"
                 "  \"in_gamut\": true,\n"
                 "  \"dark\": false,\n"
                 "  \"nearest\": null,\n"
                 "  \"limit\": null,\n"
                 "  \"amounts\": [0.25, -7, \"x\"],\n"
                 "  \"none\": [],\n"
                 "  \"empty\": {},\n"
                 "  \"targets\": [\n"
                 "    {\n"
                 "      \"a\": 1\n"
                 "    },\n"
                 "    2\n"
                 "  ]\n"
                 "}\n");
  assert_int_equal(ef_json_finish(NULL, NULL), EF_OK);
}

/* One text as a document. */
static void check_text(const char *text, const char *expected) {
  ef_output *const output = begin();
  ef_json *const json = ef_json_new(output, NULL);
  ef_json_text(json, NULL, text);
  assert_int_equal(ef_json_finish(json, NULL), EF_OK);
  expect(output, expected);
}

/* Objects with all their indentation. */
static void write_target(ef_json *json, int64_t a) {
  ef_json_begin_object(json, NULL);
  ef_json_integer(json, "a", a);
  ef_json_end_object(json);
}

static void append_targets(ef_json *json, ef_output *part, int64_t n) {
  size_t length;
  ef_output_clear(part);
  ef_json *const elements = ef_json_new_elements(part, 2, NULL);
  for (int64_t i = 0; i < n; ++i) write_target(elements, i);
  assert_int_equal(ef_json_finish(elements, NULL), EF_OK);
  const char *const bytes = ef_output_bytes(part, &length);
  ef_json_elements(json, bytes, length);
}

static void append_plain(ef_json *json, ef_output *part, double value) {
  size_t length;
  ef_output_clear(part);
  ef_json *const elements = ef_json_new_elements(part, 2, NULL);
  ef_json_number(elements, NULL, value);
  ef_json_number(elements, NULL, -value);
  assert_int_equal(ef_json_finish(elements, NULL), EF_OK);
  const char *const bytes = ef_output_bytes(part, &length);
  ef_json_elements(json, bytes, length);
}

static void json_elements_from_another_writer(void **state) {
  (void)state;
  ef_output *const output = begin();
  ef_output *const part = ef_output_memory(NULL);
  ef_json *const json = ef_json_new(output, NULL);
  ef_json_begin_object(json, NULL);
  ef_json_begin_array(json, "none");
  append_targets(json, part, 0);
  ef_json_end_array(json);
  ef_json_begin_array(json, "plain");
  append_plain(json, part, 0.5);
  append_plain(json, part, 2);
  ef_json_end_array(json);
  ef_json_begin_array(json, "targets");
  append_targets(json, part, 2);
  write_target(json, 7);
  append_targets(json, part, 1);
  append_plain(json, part, 3);
  ef_json_end_array(json);
  ef_json_end_object(json);
  assert_int_equal(ef_json_finish(json, NULL), EF_OK);
  ef_output_discard(part);
  expect(output, "{\n"
                 "  \"none\": [],\n"
                 "  \"plain\": [0.5, -0.5, 2, -2],\n"
                 "  \"targets\": [\n"
                 "    {\n      \"a\": 0\n    },\n"
                 "    {\n      \"a\": 1\n    },\n"
                 "    {\n      \"a\": 7\n    },\n"
                 "    {\n      \"a\": 0\n    },\n"
                 "    3, -3\n"
                 "  ]\n"
                 "}\n");
}

static void json_elements_have_a_place(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const part = ef_output_memory(NULL);
  assert_null(ef_json_new_elements(part, 0, &error));
  assert_error(&error, EF_INVALID, "no array lies 0 deep");
  assert_null(ef_json_new_elements(part, 64, NULL));
  ef_json *json = ef_json_new_elements(part, 1, NULL);
  ef_json_end_array(json); /* the array is not this writer's */
  assert_int_equal(ef_json_finish(json, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "an end without its beginning");
  json = ef_json_new_elements(part, 1, NULL);
  ef_json_begin_object(json, NULL);
  assert_int_equal(ef_json_finish(json, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "does not end");
  json = ef_json_new(part, NULL);
  ef_json_begin_object(json, NULL);
  ef_json_elements(json, "1", 1);
  assert_int_equal(ef_json_finish(json, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "elements outside all arrays");
  ef_output_discard(part);
}

static void json_texts(void **state) {
  (void)state;
#define GONE "\xEF\xBF\xBD"
  check_text("", "\"\"\n");
  check_text("\\ / \b\f\r\t\x01\x1f\x7f", "\"\\\\ / \\u0008\\u000c\\r\\t\\u0001"
                                         "\\u001f\x7f\"\n");
  check_text("\xC3\xA9\xE2\x82\xAC\xF0\x9F\x9A\xA2",
             "\"\xC3\xA9\xE2\x82\xAC\xF0\x9F\x9A\xA2\"\n");
  /* Latin-1, a lone tail, cut characters, overlong forms, surrogates, beyond
   * U+10FFFF. */
  check_text("caf\xE9.", "\"caf" GONE ".\"\n");
  check_text("\x80", "\"" GONE "\"\n");
  check_text("\xE2\x82", "\"" GONE GONE "\"\n");
  check_text("\xF0\x9F\x9A\"", "\"" GONE GONE GONE "\\\"\"\n");
  check_text("\xC0\xAF", "\"" GONE GONE "\"\n");
  check_text("\xE0\x9F\xBF", "\"" GONE GONE GONE "\"\n");
  check_text("\xED\xA0\x80", "\"" GONE GONE GONE "\"\n");
  check_text("\xF4\x90\x80\x80", "\"" GONE GONE GONE GONE "\"\n");
  check_text("\xF5", "\"" GONE "\"\n");
#undef GONE
}

typedef void misuse(ef_json *json);

static void no_value(ef_json *json) {
  (void)json;
}
static void two_values(ef_json *json) {
  ef_json_null(json, NULL);
  ef_json_null(json, NULL);
}
static void open_array(ef_json *json) {
  ef_json_begin_array(json, NULL);
}
static void wrong_end(ef_json *json) {
  ef_json_begin_array(json, NULL);
  ef_json_end_object(json);
}
static void end_alone(ef_json *json) {
  ef_json_end_array(json);
}
static void no_key(ef_json *json) {
  ef_json_begin_object(json, NULL);
  ef_json_null(json, NULL);
  ef_json_end_object(json);
}
static void key_in_array(ef_json *json) {
  ef_json_begin_array(json, NULL);
  ef_json_null(json, "key");
  ef_json_end_array(json);
}
static void key_at_top(ef_json *json) {
  ef_json_null(json, "key");
}
static void too_deep(ef_json *json) {
  for (int i = 0; i < 65; ++i) ef_json_begin_array(json, NULL);
  for (int i = 0; i < 65; ++i) ef_json_end_array(json);
}

static void json_nesting_is_checked(void **state) {
  (void)state;
  static const struct {
    misuse *run;
    const char *message;
  } cases[] = {
      {no_value, "there is no value"},
      {two_values, "a second value outside all others"},
      {open_array, "an object or array does not end"},
      {wrong_end, "an end without its beginning"},
      {end_alone, "an end without its beginning"},
      {no_key, "a value without key"},
      {key_in_array, "a key in an array"},
      {key_at_top, "a key outside all objects"},
      {too_deep, "nested too deep"},
  };
  for (size_t i = 0; i < sizeof cases / sizeof *cases; ++i) {
    ef_error error = {0};
    ef_output *const output = begin();
    ef_json *const json = ef_json_new(output, NULL);
    cases[i].run(json);
    assert_int_equal(ef_json_finish(json, &error), EF_INVALID);
    assert_error(&error, EF_INVALID, cases[i].message);
    ef_output_discard(output);
  }
}

static void json_may_be_deep(void **state) {
  (void)state;
  ef_output *const output = begin();
  ef_json *const json = ef_json_new(output, NULL);
  for (int i = 0; i < 64; ++i) ef_json_begin_array(json, NULL);
  for (int i = 0; i < 64; ++i) ef_json_end_array(json);
  assert_int_equal(ef_json_finish(json, NULL), EF_OK);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  size_t length;
  char *const text = scratch_read("out", &length);
  json_t *const parsed = json_loads(text, 0, NULL);
  assert_non_null(parsed);
  json_decref(parsed);
  free(text);
}

static void json_keeps_the_failure(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const output = ef_output_open("/dev/full", true, NULL);
  assert_non_null(output);
  ef_json *const json = ef_json_new(output, NULL);
  ef_json_begin_array(json, NULL);
  for (int i = 0; i < 50000; ++i) ef_json_number(json, NULL, 37.23);
  ef_json_end_array(json);
  assert_int_equal(ef_json_finish(json, &error), EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "no space is left");
  ef_output_discard(output);
}

static void writers_without_memory(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const output = begin();
  fail_alloc_at(1);
  assert_null(ef_csv_new(output, &error));
  assert_true(fail_alloc_stop());
  assert_error(&error, EF_NO_MEMORY, "out of memory for CSV");
  fail_alloc_at(1);
  assert_null(ef_json_new(output, &error));
  assert_true(fail_alloc_stop());
  assert_error(&error, EF_NO_MEMORY, "out of memory for JSON");
  ef_output_discard(output);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(csv_rows),
      cmocka_unit_test(csv_rows_from_another_writer),
      cmocka_unit_test(csv_keeps_the_failure),
      cmocka_unit_test(json_document),
      cmocka_unit_test(json_elements_from_another_writer),
      cmocka_unit_test(json_elements_have_a_place),
      cmocka_unit_test(json_texts),
      cmocka_unit_test(json_nesting_is_checked),
      cmocka_unit_test(json_may_be_deep),
      cmocka_unit_test(json_keeps_the_failure),
      cmocka_unit_test(writers_without_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
