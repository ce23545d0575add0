/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The generator of the built-in tables as a program: every broken table in
 * broken/table-DEFECT/ is refused with exactly the line in `expected`, and no
 * file is left. A case has its table in input.csv, or lists its files in
 * `args`. The program's path is the first argument. */
#include "near.h"

#include <dirent.h>
#include <fcntl.h>
#include <stdlib.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

enum { MAX_ARGUMENTS = 8, MAX_TEXT = 8192 };

static char program[1024]; /* absolute path of embed_tables */
static char folder[] = "/tmp/evenfield-test-XXXXXX";
static char output[64];

/* What the file has, at most MAX_TEXT - 1 bytes, with a terminator; false when
 * there is no such file. */
static bool read_file(const char *path, char text[MAX_TEXT]) {
  FILE *file = fopen(path, "rb");
  if (file == NULL)
    return false;
  text[fread(text, 1, MAX_TEXT - 1, file)] = '\0';
  fclose(file);
  return true;
}

/* Runs embed_tables; its standard error goes to `text`. Returns its status. */
static int run(char *const *arguments, char text[MAX_TEXT]) {
  char error_path[80];
  snprintf(error_path, sizeof error_path, "%s/stderr", folder);
  fflush(NULL);
  const pid_t child = fork();
  assert_true(child >= 0);
  if (child == 0) {
    const int fd = open(error_path, O_WRONLY | O_CREAT | O_TRUNC, 0600);
    if (fd < 0 || dup2(fd, STDERR_FILENO) < 0)
      _exit(126);
    execv(program, arguments);
    _exit(127);
  }
  int status;
  assert_int_equal(waitpid(child, &status, 0), child);
  assert_true(WIFEXITED(status));
  assert_true(read_file(error_path, text));
  return WEXITSTATUS(status);
}

/* The files of a case, cut out of `text`. */
static size_t case_files(const char *name, char text[MAX_TEXT], char **file) {
  char path[256];
  snprintf(path, sizeof path, "%s/args", name);
  if (!read_file(path, text))
    snprintf(text, MAX_TEXT, "%s/input.csv", name);
  size_t n = 0;
  for (char *line = strtok(text, "\n"); line; line = strtok(NULL, "\n")) {
    assert_true(n < MAX_ARGUMENTS);
    file[n++] = line;
  }
  return n;
}

/* True when the case came out as it should. */
static bool case_passes(const char *name) {
  char path[256], expected[MAX_TEXT], files[MAX_TEXT], text[MAX_TEXT];
  snprintf(path, sizeof path, "%s/expected", name);
  if (!read_file(path, expected))
    fail_msg("%s is missing", path);
  char *arguments[MAX_ARGUMENTS + 3] = {program, output};
  case_files(name, files, arguments + 2);
  const int status = run(arguments, text);
  const bool left = access(output, F_OK) == 0;
  if (status == 1 && strcmp(text, expected) == 0 && !left)
    return true;
  printf("# %s: status %d%s, said: %s", name, status,
         left ? ", left a file" : "", text);
  return false;
}

static void test_broken_tables(void **state) {
  (void)state;
  DIR *broken = opendir(".");
  assert_non_null(broken);
  size_t n_cases = 0, n_bad = 0;
  for (struct dirent *entry; (entry = readdir(broken)) != NULL;) {
    if (strncmp(entry->d_name, "table-", 6) != 0)
      continue;
    ++n_cases;
    n_bad += !case_passes(entry->d_name);
  }
  closedir(broken);
  printf("# %zu broken tables\n", n_cases);
  assert_true(n_cases > 0);
  assert_int_equal(n_bad, 0);
}

static void write_file(const char *path, const char *text) {
  FILE *file = fopen(path, "wb");
  assert_non_null(file);
  assert_true(fputs(text, file) >= 0);
  assert_int_equal(fclose(file), 0);
}

static void make_path(char path[80], const char *name) {
  snprintf(path, 80, "%s/%s", folder, name);
}

/* Texts with quotes, a trigraph, bytes beyond ASCII; integers, signs and blanks
 * among the numbers; two tables out of order. */
static void test_output(void **state) {
  (void)state;
  char b[80], a[80], text[MAX_TEXT], error[MAX_TEXT];
  make_path(b, "b.csv");
  make_path(a, "a.csv");
  write_file(b, "# title: \"37\" \?\?/ \xc2\xb5\n# source: s\n# quantity: q\n"
                "# range: 400 to 402.5 nm, 2 rows\n# note: one\n# note: two\n"
                "wavelength_nm,B-1\n400,-37\n402.5,\n");
  write_file(a, "# title: t\r\n# source: s\r\n# quantity: q\r\n"
                "# range: 400 to 405 nm, step 5 nm, 2 rows\r\n"
                "wavelength_nm,x\r\n400,+.5\r\n405,1E-3\r\n");
  char *arguments[] = {program, output, b, a, NULL};
  assert_int_equal(run(arguments, error), 0);
  assert_string_equal(error, "");
  assert_true(read_file(output, text));
  assert_int_equal(unlink(output), 0);
  assert_non_null(strstr(text, "{\n  400.0, 405.0,\n  +.5, 1E-3,\n}"));
  assert_non_null(strstr(text, "{\n  400.0, 402.5,\n  -37.0, 0.0,\n}"));
  assert_non_null(strstr(text, ".title = \"\\04237\\042 \\077\\077/ "
                               "\\302\\265\""));
  assert_non_null(strstr(text, ".note = \"one\\012two\""));
  assert_true(strstr(text, ".name = \"a\"") < strstr(text, ".name = \"b\""));
  assert_non_null(strstr(text, "ef__table_count = 2;"));
}

static void test_same_text_twice(void **state) {
  (void)state;
  char *arguments[] = {program,
                       (char[]){"--text"},
                       output,
                       (char[]){"table-same-name/b/input.csv"},
                       (char[]){"table-same-name/a/input.csv"},
                       NULL};
  char text[MAX_TEXT];
  assert_int_equal(run(arguments, text), 1);
  assert_non_null(strstr(text, ": the name 'input.csv' is taken by "));
  assert_int_not_equal(access(output, F_OK), 0);
}

static void test_unwritable(void **state) {
  (void)state;
  char path[80], text[MAX_TEXT];
  make_path(path, "no-such-folder/out.c");
  char *arguments[] = {program, path, (char[]){"table-same-name/a/input.csv"},
                       NULL};
  assert_int_equal(run(arguments, text), 1);
  assert_non_null(strstr(text, "out.c: cannot be written: No such file"));
}

static void test_usage(void **state) {
  (void)state;
  char *none[] = {program, output, NULL};
  char *text_none[] = {program, (char[]){"--text"}, output, NULL};
  char text[MAX_TEXT];
  assert_int_equal(run(none, text), 2);
  assert_string_equal(text, "usage: embed_tables [--text] OUT.c FILES...\n");
  assert_int_equal(run(text_none, text), 2);
}

static int set_up(void **state) {
  (void)state;
  if (mkdtemp(folder) == NULL)
    return -1;
  snprintf(output, sizeof output, "%s/out.c", folder);
  return 0;
}

static int tear_down(void **state) {
  (void)state;
  static const char *const name[] = {"stderr", "a.csv", "b.csv"};
  for (size_t i = 0; i < sizeof name / sizeof *name; ++i) {
    char path[80];
    make_path(path, name[i]);
    unlink(path);
  }
  return rmdir(folder);
}

/* The tests run in another folder than they were called from. */
static bool set_program(const char *path) {
  char here[900] = "";
  if (path[0] != '/' && getcwd(here, sizeof here) == NULL)
    return false;
  const int length = snprintf(program, sizeof program, "%s%s%s", here,
                              here[0] != '\0' ? "/" : "", path);
  return length > 0 && (size_t)length < sizeof program;
}

int main(int argc, char **argv) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_broken_tables),   cmocka_unit_test(test_output),
      cmocka_unit_test(test_same_text_twice), cmocka_unit_test(test_unwritable),
      cmocka_unit_test(test_usage),
  };
  const char *tests_folder = getenv("EVENFIELD_TESTS");
  if (argc != 2 || !set_program(argv[1]) || tests_folder == NULL ||
      chdir(tests_folder) != 0 || chdir("broken") != 0) {
    fputs("usage: EVENFIELD_TESTS=FOLDER test_embed_tables PROGRAM\n", stderr);
    return 2;
  }
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests_name("embed_tables", tests, set_up, tear_down);
}
