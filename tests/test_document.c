/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts and JSON documents held whole: the pointers of RFC 6901, and what is
 * said about broken ones. */
#include <stdlib.h>

#include <evenfield/exchange.h>

#include "near.h"

static ef_document *read_text(const char *text, ef_error *error) {
  return ef_document_from_text("d.json", text, strlen(text), error);
}

/* The document of RFC 6901, section 5, but for the keys that hold texts. */
static void pointers_of_the_rfc(void **state) {
  (void)state;
  ef_error error;
  ef_document *d = read_text(
      "{\"foo\": [\"bar\", \"baz\"], \"\": \"0\", \"a/b\": \"1\", \"c%d\": "
      "\"2\", \"e^f\": \"3\", \"g|h\": \"4\", \"i\\\\j\": \"5\", \"k\\\"l\": "
      "\"6\", \" \": \"7\", \"m~n\": \"8\"}",
      &error);
  assert_non_null(d);
  static const char *const pairs[][2] = {
      {"/foo/0", "bar"}, {"/foo/1", "baz"}, {"/", "0"},      {"/a~1b", "1"},
      {"/c%d", "2"},     {"/e^f", "3"},     {"/g|h", "4"},   {"/i\\j", "5"},
      {"/k\"l", "6"},    {"/ ", "7"},       {"/m~0n", "8"},
  };
  for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; ++i) {
    size_t length = 0;
    const char *text = ef_document_text(d, pairs[i][0], &length);
    assert_non_null(text);
    assert_string_equal(text, pairs[i][1]);
    assert_int_equal(length, strlen(pairs[i][1]));
  }
  assert_int_equal(ef_document_count(d, "/foo"), 2);
  assert_int_equal(ef_document_count(d, ""), 10);
  ef_document_free(d);
}

static void nothing_is_found_where_nothing_is(void **state) {
  (void)state;
  ef_error error;
  ef_document *d = read_text("{\"a\": [\"x\", 1, {\"b\": null}]}", &error);
  assert_non_null(d);
  static const char *const pointers[] = {
      "",       "/a",    "/a/1",   "/a/3",  "/a/00",         "/a/-",
      "/a/0/0", "/b",    "a",      "/a/2",  "/a/2/b",        "/a/",
      "/a/0 ",  "/a/+0", "/a//0",  "/a/99", "/a/4294967296", "/a/2/b/c",
  };
  for (size_t i = 0; i < sizeof pointers / sizeof pointers[0]; ++i) {
    if (ef_document_text(d, pointers[i], NULL) != NULL)
      fail_msg("%s has a text", pointers[i]);
  }
  assert_int_equal(ef_document_count(d, "/a/0"), 0);
  assert_int_equal(ef_document_count(d, "/nothing"), 0);
  assert_int_equal(ef_document_count(d, "/a/2"), 1);
  ef_document_free(d);
}

static void broken_documents_are_refused(void **state) {
  (void)state;
  static const char *const pairs[][2] = {
      {"", "d.json:1: is no JSON (RFC 8259): '[' or '{' expected near end of "
           "file"},
      {"{\n\"a\": \"x\n\"}", "d.json:2: is no JSON (RFC 8259): unexpected "
                             "newline near '\"x'"},
      {"{\n\"a\": 1,\n\"a\": 2}", "d.json:3: is no JSON (RFC 8259): duplicate "
                                  "object key near '\"a\"'"},
      {"{\"a\": nan}", "d.json:1: is no JSON (RFC 8259): invalid token near "
                       "'nan'"},
      {"[\"\xff\"]", "d.json:1: is no JSON (RFC 8259): unable to decode byte "
                     "0xff near '\"'"},
      {"[\"\\u0000\"]", "d.json:1: is no JSON (RFC 8259): \\u0000 is not "
                        "allowed without JSON_ALLOW_NUL near '\"\\u0000\"'"},
      {"[1] [2]", "d.json:1: is no JSON (RFC 8259): end of file expected near "
                  "'['"},
  };
  for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; ++i) {
    ef_error error = {0};
    char said[1024];
    assert_null(read_text(pairs[i][0], &error));
    assert_int_equal(error.status, EF_MALFORMED);
    ef_error_describe(&error, said, sizeof said);
    assert_string_equal(said, pairs[i][1]);
  }
}

static void texts_are_whole(void **state) {
  (void)state;
  ef_error error = {0};
  size_t length = 0, built_in = 0;
  char *text = ef_text_read("demo:livery", 1 << 20, &length, &error);
  assert_non_null(text);
  for (size_t i = 0; i < ef_demo_count(); ++i) {
    if (strcmp(ef_demo_name(i), "livery") == 0)
      assert_string_equal(text, ef_demo_text(i, &built_in));
  }
  assert_int_equal(length, built_in);
  free(text);
  assert_null(ef_text_read("demo:livrey", 1 << 20, &length, &error));
  assert_int_equal(error.status, EF_UNKNOWN_NAME);
  assert_null(ef_text_read("/no/such", 1 << 20, &length, &error));
  assert_int_equal(error.status, EF_UNREADABLE);
}

/* A file of 10000 bytes with a byte-order mark. */
static void long_texts_are_refused(void **state) {
  (void)state;
  char path[] = "/tmp/evenfield-text-XXXXXX";
  const int descriptor = mkstemp(path);
  FILE *file = fdopen(descriptor, "w");
  assert_non_null(file);
  fputs("\xEF\xBB\xBF", file);
  for (int i = 0; i < 1000; ++i)
    fputs("123456789\n", file);
  fclose(file);
  ef_error error = {0};
  size_t length = 0;
  char *text = ef_text_read(path, 10000, &length, &error);
  assert_non_null(text);
  assert_int_equal(length, 10000);
  assert_int_equal(strlen(text), 10000);
  assert_memory_equal(text, "123456789\n1", 11);
  free(text);
  assert_null(ef_text_read(path, 9999, &length, &error));
  assert_int_equal(error.status, EF_MALFORMED);
  assert_string_equal(error.message, "holds more than 9999 bytes, which is the "
                                     "most here; is it the right file?");
  remove(path);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(pointers_of_the_rfc),
      cmocka_unit_test(nothing_is_found_where_nothing_is),
      cmocka_unit_test(broken_documents_are_refused),
      cmocka_unit_test(texts_are_whole),
      cmocka_unit_test(long_texts_are_refused),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
