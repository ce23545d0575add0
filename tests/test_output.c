/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Outputs appear whole or not at all. */
#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

#include <evenfield/exchange.h>

#include "fail_alloc.h"
#include "near.h"
#include "scratch.h"

static ef_output *begin(const char *name, bool overwrite) {
  char path[SCRATCH_PATH];
  ef_error error = {0};
  scratch_path(name, path);
  ef_output *const output = ef_output_open(path, overwrite, &error);
  if (output == NULL) fail_msg("%s", error.message);
  return output;
}

static void put(ef_output *output, const char *text) {
  assert_int_equal(ef_output_text(output, text, NULL), EF_OK);
}

static void write_whole(const char *name, bool overwrite, const char *text) {
  ef_output *const output = begin(name, overwrite);
  put(output, text);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
}

static void clear(const char *name) {
  char path[SCRATCH_PATH];
  scratch_path(name, path);
  assert_int_equal(unlink(path), 0);
}

static bool is_there(const char *name) {
  char path[SCRATCH_PATH];
  scratch_path(name, path);
  return access(path, F_OK) == 0;
}

static mode_t mode_of(const char *name) {
  char path[SCRATCH_PATH];
  struct stat about;
  scratch_path(name, path);
  assert_int_equal(stat(path, &about), 0);
  return about.st_mode & 07777;
}

/* ---- Files ------------------------------------------------------------- */

static void a_file_appears_at_the_end(void **state) {
  (void)state;
  const mode_t before = umask(027);
  ef_output *const output = begin("a.csv", false);
  put(output, "37.23\n");
  assert_false(is_there("a.csv"));
  put(output, "0.5\n");
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  umask(before);
  scratch_expect("a.csv", "37.23\n0.5\n");
  assert_int_equal(mode_of("a.csv"), 0640);
  assert_int_equal(scratch_count(), 1);
  clear("a.csv");
}

static void much_is_written_in_order(void **state) {
  (void)state;
  enum { N = 30000 };
  ef_output *const output = begin("big", false);
  char *const large = malloc(200000);
  assert_non_null(large);
  memset(large, 'x', 200000);
  for (int i = 0; i < N; ++i) {
    char text[16];
    snprintf(text, sizeof text, "%d,", i);
    put(output, text);
    if (i == N / 2) {
      assert_int_equal(ef_output_write(output, large, 200000, NULL), EF_OK);
    }
  }
  assert_int_equal(ef_output_write(output, "", 0, NULL), EF_OK);
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  size_t length;
  char *const bytes = scratch_read("big", &length);
  const char *at = bytes;
  for (int i = 0; i < N; ++i) {
    char *end;
    assert_int_equal(strtol(at, &end, 10), i);
    at = end + 1;
    if (i != N / 2) continue;
    assert_memory_equal(at, large, 200000);
    at += 200000;
  }
  assert_int_equal(at - bytes, length);
  free(bytes);
  free(large);
  clear("big");
}

static void what_is_dropped_leaves_nothing(void **state) {
  (void)state;
  ef_output *const output = begin("a.csv", false);
  put(output, "37.23\n");
  ef_output_discard(output);
  ef_output_discard(NULL);
  assert_int_equal(scratch_count(), 0);
}

static void an_existing_file_is_kept(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  ef_error error = {0};
  scratch_path("a.csv", path);
  scratch_write("a.csv", "old", 3);
  assert_null(ef_output_open(path, false, &error));
  assert_error(&error, EF_EXISTS, "is there already");
  assert_string_equal(error.file, path);
  ef_output_discard(begin("a.csv", true));
  scratch_expect("a.csv", "old");
  assert_int_equal(scratch_count(), 1);
  clear("a.csv");
}

static void an_existing_file_is_replaced_at_the_end(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  scratch_path("a.csv", path);
  scratch_write("a.csv", "old", 3);
  assert_int_equal(chmod(path, 0604), 0);
  ef_output *const output = begin("a.csv", true);
  put(output, "new");
  scratch_expect("a.csv", "old");
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  scratch_expect("a.csv", "new");
  assert_int_equal(mode_of("a.csv"), 0604);
  assert_int_equal(scratch_count(), 1);
  clear("a.csv");
}

static void a_name_taken_meanwhile_is_kept(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const output = begin("a.csv", false);
  put(output, "new");
  scratch_write("a.csv", "theirs", 6);
  assert_int_equal(ef_output_commit(output, &error), EF_EXISTS);
  assert_error(&error, EF_EXISTS, "is there already");
  scratch_expect("a.csv", "theirs");
  assert_int_equal(scratch_count(), 1);
  clear("a.csv");
}

static void outputs_do_not_meet(void **state) {
  (void)state;
  ef_output *const a = begin("a", false);
  ef_output *const b = begin("b", false);
  ef_output *const again = begin("a", true);
  put(a, "one");
  put(b, "two");
  put(again, "three");
  assert_int_equal(ef_output_commit(b, NULL), EF_OK);
  assert_int_equal(ef_output_commit(a, NULL), EF_OK);
  assert_int_equal(ef_output_commit(again, NULL), EF_OK);
  scratch_expect("a", "three");
  scratch_expect("b", "two");
  assert_int_equal(scratch_count(), 2);
  clear("a");
  clear("b");
}

static void links_stay_links(void **state) {
  (void)state;
  char link_path[SCRATCH_PATH];
  char loop[SCRATCH_PATH];
  struct stat about;
  ef_error error = {0};
  scratch_path("link", link_path);
  scratch_path("loop", loop);
  scratch_write("a.csv", "old", 3);
  assert_int_equal(symlink("a.csv", link_path), 0);
  write_whole("link", true, "new");
  scratch_expect("a.csv", "new");
  assert_int_equal(lstat(link_path, &about), 0);
  assert_true(S_ISLNK(about.st_mode));
  /* A link that leads nowhere yet. */
  clear("a.csv");
  write_whole("link", false, "first");
  scratch_expect("a.csv", "first");
  /* A link by the whole path. */
  char whole[SCRATCH_PATH];
  char other[SCRATCH_PATH];
  scratch_path("a.csv", whole);
  scratch_path("other", other);
  assert_int_equal(symlink(whole, other), 0);
  write_whole("other", true, "second");
  scratch_expect("a.csv", "second");
  clear("other");
  assert_int_equal(symlink("loop", loop), 0);
  assert_null(ef_output_open(loop, true, &error));
  assert_error(&error, EF_UNWRITABLE, "cannot be written");
  clear("loop");
  clear("link");
  clear("a.csv");
}

/* ---- Failures ---------------------------------------------------------- */

/* The system refuses to let the file grow: the write fails half way. */
static void fail_half_way(ef_output *output, ef_error *error) {
  struct rlimit before;
  assert_int_equal(getrlimit(RLIMIT_FSIZE, &before), 0);
  void (*const handler)(int) = signal(SIGXFSZ, SIG_IGN);
  const struct rlimit small = {100000, before.rlim_max};
  assert_int_equal(setrlimit(RLIMIT_FSIZE, &small), 0);
  ef_status status = EF_OK;
  for (int i = 0; i < 20000 && status == EF_OK; ++i) {
    status = ef_output_text(output, "a row of text\n", error);
  }
  assert_int_equal(status, EF_UNWRITABLE);
  assert_int_equal(ef_output_text(output, "more", error), EF_UNWRITABLE);
  assert_int_equal(setrlimit(RLIMIT_FSIZE, &before), 0);
  signal(SIGXFSZ, handler);
}

static void a_failure_half_way_leaves_nothing(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const output = begin("a.csv", false);
  fail_half_way(output, &error);
  assert_error(&error, EF_UNWRITABLE, "cannot be written: File too large");
  assert_int_equal(ef_output_commit(output, &error), EF_UNWRITABLE);
  assert_int_equal(scratch_count(), 0);
}

static void a_failure_half_way_keeps_the_old(void **state) {
  (void)state;
  ef_error error = {0};
  scratch_write("a.csv", "old", 3);
  ef_output *const output = begin("a.csv", true);
  fail_half_way(output, &error);
  ef_output_discard(output);
  scratch_expect("a.csv", "old");
  assert_int_equal(scratch_count(), 1);
  clear("a.csv");
}

static void a_full_device(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *output = ef_output_open("/dev/full", false, &error);
  assert_non_null(output);
  put(output, "37.23"); /* still in the buffer */
  assert_int_equal(ef_output_commit(output, &error), EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "no space is left to write it");
  assert_string_equal(error.file, "/dev/full");
  output = ef_output_open("/dev/full", true, &error);
  char *const large = calloc(1, 100000);
  assert_non_null(large);
  assert_int_equal(ef_output_write(output, large, 100000, &error),
                   EF_UNWRITABLE);
  ef_output_discard(output);
  free(large);
  assert_int_equal(access("/dev/full", F_OK), 0);
}

static void devices_are_written_through(void **state) {
  (void)state;
  ef_output *const output = ef_output_open("/dev/null", false, NULL);
  assert_non_null(output);
  put(output, "37.23");
  assert_int_equal(ef_output_commit(output, NULL), EF_OK);
  assert_int_equal(access("/dev/null", W_OK), 0);
}

static void places_that_take_no_file(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  ef_error error = {0};
  scratch_path("no-such-folder/a.csv", path);
  assert_null(ef_output_open(path, true, &error));
  assert_error(&error, EF_UNWRITABLE, "its folder does not exist");
  scratch_path("", path);
  assert_null(ef_output_open(path, true, &error));
  assert_error(&error, EF_UNWRITABLE, "is a directory; name a file in it");
  assert_null(ef_output_open("", true, &error));
  assert_error(&error, EF_UNWRITABLE, "the name of the output is empty");
  assert_null(ef_output_open("/dev/null/a", true, &error));
  assert_error(&error, EF_UNWRITABLE, "cannot be written: Not a directory");
  assert_null(ef_output_open("", true, NULL));
}

/* Root may write everywhere, so it becomes nobody for the moment. */
static void a_folder_without_permission(void **state) {
  (void)state;
  char folder[SCRATCH_PATH];
  char path[SCRATCH_PATH];
  ef_error error = {0};
  const bool is_root = geteuid() == 0;
  scratch_path("", folder);
  scratch_path("a.csv", path);
  assert_int_equal(chmod(folder, 0500), 0);
  if (is_root) assert_int_equal(seteuid(65534), 0);
  assert_null(ef_output_open(path, true, &error));
  if (is_root) assert_int_equal(seteuid(0), 0);
  assert_int_equal(chmod(folder, 0700), 0);
  assert_error(&error, EF_UNWRITABLE, "may not be written by this user");
}

/* ---- Standard output --------------------------------------------------- */

/* Standard output is `descriptor` while `text` is written to it. */
static ef_status write_standard(int descriptor, const char *path,
                                const char *text, ef_error *error) {
  fflush(stdout);
  const int saved = dup(STDOUT_FILENO);
  assert_true(saved >= 0);
  assert_true(dup2(descriptor, STDOUT_FILENO) >= 0);
  printf("before ");
  ef_output *const output = ef_output_open(path, false, error);
  ef_status status = EF_NO_MEMORY;
  if (output != NULL) {
    ef_output_text(output, text, NULL);
    status = ef_output_commit(output, error);
  }
  fflush(stdout);
  clearerr(stdout);
  dup2(saved, STDOUT_FILENO);
  close(saved);
  return status;
}

static void standard_output(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  scratch_path("out", path);
  const int descriptor = open(path, O_WRONLY | O_CREAT | O_APPEND, 0600);
  assert_true(descriptor >= 0);
  assert_int_equal(write_standard(descriptor, NULL, "one ", NULL), EF_OK);
  assert_int_equal(write_standard(descriptor, "-", "two", NULL), EF_OK);
  close(descriptor);
  scratch_expect("out", "before one before two");
  clear("out");
}

static void standard_output_may_be_full(void **state) {
  (void)state;
  ef_error error = {0};
  const int descriptor = open("/dev/full", O_WRONLY);
  assert_true(descriptor >= 0);
  assert_int_equal(write_standard(descriptor, "-", "x", &error), EF_UNWRITABLE);
  close(descriptor);
  assert_error(&error, EF_UNWRITABLE, "no space is left");
  assert_string_equal(error.file, "standard output");
}

/* ---- Directories and memory -------------------------------------------- */

static void directories(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  ef_error error = {0};
  scratch_path("swatches", path);
  assert_int_equal(ef_directory_make(path, &error), EF_OK);
  assert_int_equal(ef_directory_make(path, &error), EF_OK);
  assert_int_equal(rmdir(path), 0);
  scratch_write("swatches", "file", 4);
  assert_int_equal(ef_directory_make(path, &error), EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "is a file, expected a directory");
  clear("swatches");
  scratch_path("no-such-folder/swatches", path);
  assert_int_equal(ef_directory_make(path, &error), EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "its folder does not exist");
}

static bool write_in_short_memory(void *context) {
  ef_error error = {0};
  ef_output *const output = ef_output_open(context, true, &error);
  if (output == NULL) {
    assert_true(error.status == EF_NO_MEMORY || error.status == EF_UNWRITABLE);
    return false;
  }
  put(output, "37.23");
  return ef_output_commit(output, &error) == EF_OK;
}

static void memory_may_run_out(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  scratch_path("a.csv", path);
  /* The last one is for syncing the folder, which is done without. */
  for (size_t n = 1; n <= 4; ++n) {
    fail_alloc_at(n);
    assert_false(write_in_short_memory(path));
    assert_true(fail_alloc_stop());
    assert_int_equal(scratch_count(), 0);
  }
  fail_alloc_at(5);
  assert_true(write_in_short_memory(path));
  assert_true(fail_alloc_stop());
  scratch_expect("a.csv", "37.23");
  clear("a.csv");
}

static void parts_in_memory(void **state) {
  (void)state;
  enum { N = 30000 };
  size_t length;
  ef_output *const part = ef_output_memory(NULL);
  assert_null(ef_output_bytes(part, &length));
  assert_int_equal(length, 0);
  for (int i = 0; i < N; ++i) put(part, "37.23\n");
  const char *bytes = ef_output_bytes(part, &length);
  assert_int_equal(length, 6 * N);
  for (size_t i = 0; i < length; ++i)
    assert_int_equal(bytes[i], "37.23\n"[i % 6]);
  ef_output_clear(part);
  put(part, "4");
  bytes = ef_output_bytes(part, &length);
  assert_int_equal(length, 1);
  assert_int_equal(bytes[0], '4');
  ef_output_discard(part);
  assert_int_equal(scratch_count(), 0);
}

static void parts_in_short_memory(void **state) {
  (void)state;
  ef_error error = {0};
  ef_output *const part = ef_output_memory(NULL);
  fail_alloc_at(1);
  assert_int_equal(ef_output_text(part, "37.23", &error), EF_NO_MEMORY);
  assert_true(fail_alloc_stop());
  assert_error(&error, EF_NO_MEMORY, "output");
  put(part, "4");
  ef_output_discard(part);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_file_appears_at_the_end),
      cmocka_unit_test(much_is_written_in_order),
      cmocka_unit_test(what_is_dropped_leaves_nothing),
      cmocka_unit_test(an_existing_file_is_kept),
      cmocka_unit_test(an_existing_file_is_replaced_at_the_end),
      cmocka_unit_test(a_name_taken_meanwhile_is_kept),
      cmocka_unit_test(outputs_do_not_meet),
      cmocka_unit_test(links_stay_links),
      cmocka_unit_test(a_failure_half_way_leaves_nothing),
      cmocka_unit_test(a_failure_half_way_keeps_the_old),
      cmocka_unit_test(a_full_device),
      cmocka_unit_test(devices_are_written_through),
      cmocka_unit_test(places_that_take_no_file),
      cmocka_unit_test(a_folder_without_permission),
      cmocka_unit_test(standard_output),
      cmocka_unit_test(standard_output_may_be_full),
      cmocka_unit_test(directories),
      cmocka_unit_test(memory_may_run_out),
      cmocka_unit_test(parts_in_memory),
      cmocka_unit_test(parts_in_short_memory),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}
