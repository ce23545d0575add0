/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include <evenfield/exchange.h>

#include "fail_alloc.h"
#include "heard.h"
#include "near.h"
#include "scratch.h"

static const char *const names[] = {"age", "share"};

static ef_columns *read_text(const char *text, const ef_notes *notes,
                             ef_error *error) {
  char path[SCRATCH_PATH];
  /* The same from memory. */
  ef_error again = {0};
  ef_columns *const columns = ef_columns_from_text(
      "t.csv", text, strlen(text), 2, names, NULL, &again);
  if (columns == NULL) assert_int_equal(again.status, EF_MALFORMED);
  ef_columns_free(columns);
  scratch_write("t.csv", text, strlen(text));
  scratch_path("t.csv", path);
  return ef_columns_read(path, 2, names, notes, error);
}

static void expect(const ef_columns *columns, size_t row, size_t line,
                   double age, double share) {
  assert_int_equal(ef_columns_line(columns, row), line);
  assert_true(ef_columns_at(columns, row, 0) == age);
  assert_true(ef_columns_at(columns, row, 1) == share);
}

static void columns_are_found_by_name(void **state) {
  (void)state;
  static const char *const texts[] = {
      "# passengers\nage,share\n23,0.25\n\n47.5,0.75\n",
      "# passengers\nSHARE;place;Age\n0,25;deck;23\n;;\n0,75;saloon;47,5\n",
      "\xEF\xBB\xBF# passengers\r\nshare\tage\r\n0.25\t23\r\n\r\n0.75\t47.5",
  };
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i) {
    heard h = {0};
    ef_error error;
    const ef_notes notes = heard_notes(&h);
    ef_columns *const columns = read_text(texts[i], &notes, &error);
    if (columns == NULL) fail_msg("text %zu: %s", i, error.message);
    assert_int_equal(ef_columns_rows(columns), 2);
    expect(columns, 0, 3, 23, 0.25);
    expect(columns, 1, 5, 47.5, 0.75);
    assert_int_equal(h.n, i == 1 ? 2 : 0);
    if (i == 1) {
      assert_non_null(strstr(h.text, "t.csv:2: column 'place' is not used"));
    }
    ef_columns_free(columns);
  }
}

static void expect_refused(const char *text, const char *message) {
  ef_error error = {0};
  char said[1024];
  assert_null(read_text(text, NULL, &error));
  assert_int_equal(error.status, EF_MALFORMED);
  ef_error_describe(&error, said, sizeof said);
  const char *const place = strstr(said, "t.csv");
  assert_non_null(place);
  assert_string_equal(place, message);
}

static void what_is_wrong_is_named(void **state) {
  (void)state;
  expect_refused("age,part\n23,1\n",
                 "t.csv:1: there is no column called share; expected "
                 "age,share");
  expect_refused("age,share\n",
                 "t.csv:1: there is a header and no row to read");
  expect_refused("age,share\n23,0.5\n29,half\n",
                 "t.csv:3: field share: found 'half', expected a number; "
                 "correct it or leave the row out");
  expect_refused("age,share\n23,nan\n",
                 "t.csv:2: field share: found 'nan', expected a finite "
                 "number; leave the row out or measure it again");
  expect_refused("age,share\n23\n",
                 "t.csv:2: the row has 1 field between commas, expected 2 as in "
                 "the header row; complete the row or leave it out");
  expect_refused("age,share,age\n23,1,1\n",
                 "t.csv:1: field age: columns 1 and 3 have one name; rename or "
                 "remove one of them");
  expect_refused("", "t.csv: the file is empty; expected a header row and rows "
                     "below it");
}

static void places_are_paths(void **state) {
  (void)state;
  ef_error error;
  static const char *const level[] = {"level", "n"};
  ef_columns *const demo =
      ef_columns_read("demo:panel-responses", 2, level, NULL, &error);
  if (demo == NULL) fail_msg("%s", error.message);
  assert_true(ef_columns_rows(demo) > 10);
  ef_columns_free(demo);
  assert_null(ef_columns_read("demo:nothing", 2, level, NULL, &error));
  assert_int_equal(error.status, EF_UNKNOWN_NAME);
  assert_null(ef_columns_read("/no/such/file", 2, level, NULL, &error));
  assert_int_equal(error.status, EF_UNREADABLE);
  assert_null(ef_columns_read("/no/such/file", 0, level, NULL, &error));
  assert_int_equal(error.status, EF_INVALID);
  ef_columns_free(NULL);
}

static bool read_all(void *context) {
  ef_error error;
  ef_columns *const columns = ef_columns_read(context, 2, names, NULL, &error);
  if (columns == NULL) assert_int_equal(error.status, EF_NO_MEMORY);
  ef_columns_free(columns);
  return columns != NULL;
}

static void a_lack_of_memory_is_survived(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  char text[2048] = "age,share\n";
  for (int i = 0; i < 100; ++i) strcat(text, "40,0.01\n");
  scratch_write("t.csv", text, strlen(text));
  scratch_path("t.csv", path);
  assert_true(fail_alloc_each(read_all, path) >= 5);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(columns_are_found_by_name),
      cmocka_unit_test(what_is_wrong_is_named),
      cmocka_unit_test(places_are_paths),
      cmocka_unit_test(a_lack_of_memory_is_survived),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
