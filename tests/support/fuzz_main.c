/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Runs a fuzz target without a fuzzing engine: all files of a corpus, then
 * seeded mutations of them, the same on every machine.
 *
 *   fuzz_FORMAT COUNT PATH...    files, or folders with files at any depth
 *
 * A target finds a fault by ending the process; the input is then in the file
 * `fuzz-input` of the working folder when it could be written. */
#include <dirent.h>
#include <signal.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "gen.h"

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t length);

enum { LONGEST = 8192, MOST_FILES = 1000 };

typedef struct input {
  uint8_t *bytes;
  size_t length;
} input;

static input corpus[MOST_FILES];
static size_t n_corpus;

/* What a handler of SIGABRT and SIGSEGV writes out. */
static const uint8_t *volatile current;
static volatile size_t current_length;

static void keep_input(int signal_number) {
  FILE *const file = fopen("fuzz-input", "wb");
  if (file != NULL) {
    fwrite(current, 1, current_length, file);
    fclose(file);
  }
  signal(signal_number, SIG_DFL);
  raise(signal_number);
}

static void run(const uint8_t *bytes, size_t length) {
  current = bytes;
  current_length = length;
  LLVMFuzzerTestOneInput(bytes, length);
}

/* ---- Corpus ------------------------------------------------------------ */

static void add_file(const char *path) {
  FILE *const file = fopen(path, "rb");
  uint8_t *const bytes = malloc(LONGEST);
  if (file == NULL || bytes == NULL || n_corpus == MOST_FILES) {
    fprintf(stderr, "%s: cannot be read into the corpus\n", path);
    exit(2);
  }
  corpus[n_corpus].bytes = bytes;
  corpus[n_corpus].length = fread(bytes, 1, LONGEST, file);
  ++n_corpus;
  fclose(file);
}

static int is_shown(const struct dirent *entry) {
  return entry->d_name[0] != '.';
}

/* In the order of the names, which the mutations depend on. */
static void add_path(const char *path) {
  struct stat about;
  struct dirent **found;
  if (stat(path, &about) == 0 && S_ISREG(about.st_mode)) {
    add_file(path);
    return;
  }
  const int n = scandir(path, &found, is_shown, alphasort);
  if (n < 0) {
    fprintf(stderr, "%s: no file and no folder\n", path);
    exit(2);
  }
  for (int i = 0; i < n; ++i) {
    char inner[1024];
    snprintf(inner, sizeof inner, "%s/%s", path, found[i]->d_name);
    add_path(inner);
    free(found[i]);
  }
  free(found);
}

/* ---- Mutations --------------------------------------------------------- */

static void erase(uint8_t *bytes, size_t *length, size_t at, size_t n) {
  memmove(bytes + at, bytes + at + n, *length - at - n);
  *length -= n;
}

static void insert(uint8_t *bytes, size_t *length, size_t at,
                   const void *inserted, size_t n) {
  if (*length + n > LONGEST) return;
  memmove(bytes + at + n, bytes + at, *length - at);
  memcpy(bytes + at, inserted, n);
  *length += n;
}

static void insert_token(gen *g, uint8_t *bytes, size_t *length, size_t at) {
  static const char *const tokens[] = {
      ",",     ";",      "\t",   "\"",   "\n",     "\r\n",  "\r",
      "#",     ".",      "-",    "e",    "nan",    "1e999", "1e-999",
      "\"\"",  " ",      "0",    "400",  "name",   "L,a,b", "wavelength_nm",
      "R,G,B", "x,y,Y",  "nm",   "-1",   "\n\n",   "# unit: cd/m2\n",
      "\xEF\xBB\xBF",    "99999999999999999999", "# quantity: light\n",
      "# device_max: 255\n"};
  const char *const token =
      tokens[gen_below(g, sizeof tokens / sizeof *tokens)];
  insert(bytes, length, at, token, strlen(token));
}

static void copy_range(gen *g, uint8_t *bytes, size_t *length, size_t at) {
  uint8_t range[256];
  const size_t left = *length - at;
  const size_t n = gen_below(g, left < sizeof range ? left + 1 : sizeof range);
  memcpy(range, bytes + at, n);
  insert(bytes, length, gen_below(g, *length + 1), range, n);
}

static void splice(gen *g, uint8_t *bytes, size_t *length, size_t at) {
  const input *const other = &corpus[gen_below(g, n_corpus)];
  const size_t from = gen_below(g, other->length + 1);
  const size_t n = gen_below(g, other->length - from + 1);
  insert(bytes, length, at, other->bytes + from, n < 512 ? n : 512);
}

static void mutate(gen *g, uint8_t *bytes, size_t *length) {
  const size_t at = gen_below(g, *length + 1);
  const size_t left = *length - at;
  switch (gen_below(g, 8)) {
  case 0:
    if (left > 0) bytes[at] = (uint8_t)gen_bits(g);
    break;
  case 1:
    if (left > 0) bytes[at] ^= (uint8_t)(1u << gen_below(g, 8));
    break;
  case 2: erase(bytes, length, at, left < 1 ? left : 1); break;
  case 3:
    erase(bytes, length, at, gen_below(g, left < 64 ? left + 1 : 64));
    break;
  case 4: copy_range(g, bytes, length, at); break;
  case 5: splice(g, bytes, length, at); break;
  case 6: *length = gen_below(g, 8) == 0 ? at : *length; break;
  default: insert_token(g, bytes, length, at); break;
  }
}

static void run_mutation(gen *g) {
  const input *const seed = &corpus[gen_below(g, n_corpus)];
  uint8_t *const bytes = malloc(LONGEST);
  if (bytes == NULL) exit(2);
  size_t length = seed->length;
  memcpy(bytes, seed->bytes, length);
  for (size_t n = 1 + gen_below(g, 6); n > 0; --n) mutate(g, bytes, &length);
  /* Just as long as it is, so that reading beyond is found. */
  uint8_t *const exact = malloc(length > 0 ? length : 1);
  if (exact == NULL) exit(2);
  memcpy(exact, bytes, length);
  run(exact, length);
  free(exact);
  free(bytes);
}

int main(int argc, char **argv) {
  if (argc < 3) {
    fputs("usage: fuzz_FORMAT COUNT PATH...\n", stderr);
    return 2;
  }
  for (int i = 2; i < argc; ++i) add_path(argv[i]);
  if (n_corpus == 0) {
    fputs("the corpus is empty\n", stderr);
    return 2;
  }
  signal(SIGABRT, keep_input);
  signal(SIGSEGV, keep_input);
  for (size_t i = 0; i < n_corpus; ++i) run(corpus[i].bytes, corpus[i].length);
  const long count = strtol(argv[1], NULL, 10);
  gen g = gen_new(1);
  for (long i = 0; i < count; ++i) run_mutation(&g);
  printf("%zu inputs and %ld mutations of them\n", n_corpus, count);
  for (size_t i = 0; i < n_corpus; ++i) free(corpus[i].bytes);
  return 0;
}
