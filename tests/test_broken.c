/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Broken files and what is said about them: broken/csv-DEFECT/ holds input.csv
 * (left out: there is no such file), broken/cgats-DEFECT/ input.txt; the
 * expected message in `error`, and sometimes words in `settings`: surface,
 * light, skip-bad. png-DEFECT/ holds input.png, read as a picture whose colours
 * are to be known; cube-DEFECT/ input.hdr, the header of a spectral image. */
#include <dirent.h>
#include <stdlib.h>
#include <unistd.h>

#include <evenfield/image.h>

#include "near.h"

enum { MOST_CASES = 200, MOST_TEXT = 1024 };

/* The start of a file, without a line feed at its end; "" if it is missing. */
static void read_text(const char *path, char text[MOST_TEXT]) {
  text[0] = '\0';
  FILE *const file = fopen(path, "rb");
  if (file == NULL) return;
  const size_t length = fread(text, 1, MOST_TEXT - 1, file);
  fclose(file);
  text[length] = '\0';
  if (length > 0 && text[length - 1] == '\n') text[length - 1] = '\0';
}

static ef_reader_settings read_settings(void) {
  ef_reader_settings settings = ef_reader_settings_default();
  char words[MOST_TEXT];
  read_text("settings", words);
  settings.skip_bad = strstr(words, "skip-bad") != NULL;
  if (strstr(words, "surface") != NULL) settings.kind = EF_KIND_SURFACE;
  if (strstr(words, "light") != NULL) settings.kind = EF_KIND_LIGHT;
  return settings;
}

/* The first error on the way through the file; EF_OK at its end. */
static ef_status read_all(const ef_reader_settings *settings,
                          ef_error *error) {
  const char *const file =
      access("input.txt", F_OK) == 0 ? "input.txt" : "input.csv";
  ef_reader *const reader = ef_reader_open(file, settings, error);
  if (reader == NULL) return error->status;
  ef_status status;
  ef_block block;
  do {
    status = ef_reader_next(reader, 7, &block, error);
  } while (status == EF_OK && block.n > 0);
  ef_reader_free(reader);
  return status;
}

static ef_status read_picture(ef_error *error) {
  ef_picture *picture = ef_picture_open("input.png", NULL, error);
  if (picture == NULL) return error->status;
  const size_t width = ef_picture_get_head(picture)->width;
  uint16_t *row = malloc(3 * width * sizeof *row);
  bool has_row = true;
  ef_status status = EF_OK;
  while (status == EF_OK && has_row)
    status = ef_picture_next_row(picture, row, &has_row, error);
  free(row);
  ef_picture_free(picture);
  return status;
}

static ef_status read_cube(ef_error *error) {
  ef_cube *cube = ef_cube_open("input.hdr", NULL, error);
  if (cube == NULL) return error->status;
  ef_cube_free(cube);
  return EF_OK;
}

static bool starts_with(const char *name, const char *start) {
  return strncmp(name, start, strlen(start)) == 0;
}

static void broken_file_is_refused(void **state) {
  char home[MOST_TEXT];
  char expected[MOST_TEXT];
  char said[MOST_TEXT];
  ef_error error = {0};
  assert_non_null(getcwd(home, sizeof home));
  assert_int_equal(chdir(*state), 0);
  read_text("error", expected);
  const ef_reader_settings settings = read_settings();
  const ef_status status = starts_with(*state, "png-") ? read_picture(&error)
                           : starts_with(*state, "cube-")
                               ? read_cube(&error)
                               : read_all(&settings, &error);
  assert_int_equal(chdir(home), 0);
  ef_error_describe(&error, said, sizeof said);
  if (getenv("EVENFIELD_SHOW_ERRORS") != NULL) print_message("# %s\n", said);
  assert_true(status == EF_MALFORMED || status == EF_UNREADABLE ||
              status == EF_NO_ANSWER);
  assert_string_equal(said, expected);
}

static int is_case(const struct dirent *entry) {
  return starts_with(entry->d_name, "csv-") ||
         starts_with(entry->d_name, "cgats-") ||
         starts_with(entry->d_name, "png-") ||
         starts_with(entry->d_name, "cube-");
}

int main(void) {
  static struct CMUnitTest tests[MOST_CASES];
  struct dirent **found;
  const char *const home = getenv("EVENFIELD_TESTS");
  cmocka_set_message_output(CM_OUTPUT_TAP);
  if (home == NULL || chdir(home) != 0 || chdir("broken") != 0) {
    fputs("EVENFIELD_TESTS does not name the folder of the tests\n", stderr);
    return 1;
  }
  const int n = scandir(".", &found, is_case, alphasort);
  if (n <= 0 || n > MOST_CASES) {
    fprintf(stderr, "%d cases found, expected 1 to %d\n", n, MOST_CASES);
    return 1;
  }
  for (int i = 0; i < n; ++i) {
    tests[i].name = found[i]->d_name;
    tests[i].test_func = broken_file_is_refused;
    tests[i].initial_state = found[i]->d_name;
  }
  const int failed = _cmocka_run_group_tests("broken", tests, (size_t)n, NULL,
                                             NULL);
  for (int i = 0; i < n; ++i) free(found[i]);
  free(found);
  return failed;
}
