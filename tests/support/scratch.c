/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "scratch.h"

#include <dirent.h>
#include <stdlib.h>
#include <unistd.h>

#include "near.h"

static char folder[SCRATCH_PATH / 2];

int scratch_make(void **state) {
  (void)state;
  const char *const base = getenv("TMPDIR");
  snprintf(folder, sizeof folder, "%.80s/evenfield-test-XXXXXX",
           base != NULL ? base : "/tmp");
  return mkdtemp(folder) == NULL ? -1 : 0;
}

static bool is_name(const struct dirent *entry) {
  return strcmp(entry->d_name, ".") != 0 && strcmp(entry->d_name, "..") != 0;
}

int scratch_remove(void **state) {
  (void)state;
  DIR *const directory = opendir(folder);
  if (directory == NULL) return -1;
  for (struct dirent *entry; (entry = readdir(directory)) != NULL;) {
    char path[SCRATCH_PATH + 256];
    snprintf(path, sizeof path, "%s/%s", folder, entry->d_name);
    if (is_name(entry) && unlink(path) != 0) rmdir(path);
  }
  closedir(directory);
  return rmdir(folder);
}

void scratch_path(const char *name, char path[SCRATCH_PATH]) {
  snprintf(path, SCRATCH_PATH, "%s/%.100s", folder, name);
}

size_t scratch_count(void) {
  size_t n = 0;
  DIR *const directory = opendir(folder);
  assert_non_null(directory);
  for (struct dirent *entry; (entry = readdir(directory)) != NULL;) {
    if (is_name(entry)) ++n;
  }
  closedir(directory);
  return n;
}

void scratch_write(const char *name, const void *bytes, size_t length) {
  char path[SCRATCH_PATH];
  scratch_path(name, path);
  FILE *const file = fopen(path, "wb");
  assert_non_null(file);
  assert_int_equal(fwrite(bytes, 1, length, file), length);
  assert_int_equal(fclose(file), 0);
}

char *scratch_read(const char *name, size_t *length) {
  char path[SCRATCH_PATH];
  scratch_path(name, path);
  FILE *const file = fopen(path, "rb");
  if (file == NULL) fail_msg("%s is not there", name);
  assert_int_equal(fseek(file, 0, SEEK_END), 0);
  const long size = ftell(file);
  assert_true(size >= 0);
  rewind(file);
  char *const bytes = malloc((size_t)size + 1);
  assert_non_null(bytes);
  *length = fread(bytes, 1, (size_t)size, file);
  assert_int_equal(*length, size);
  bytes[*length] = '\0';
  fclose(file);
  return bytes;
}

void scratch_expect(const char *name, const char *text) {
  size_t length;
  char *const bytes = scratch_read(name, &length);
  assert_string_equal(bytes, text);
  assert_int_equal(length, strlen(text));
  free(bytes);
}
