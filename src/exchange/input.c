/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bytes from a file, standard input or memory, through one window. */
#include "exchange/exchange_private.h"

#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/base_private.h"

/* Bytes asked for at once: large enough that the calls do not show. */
#define CHUNK ((size_t)256 << 10)

static ef__input *input_new(const char *name, ef_error *error) {
  ef__input *input = ef__allocate_zeroed(1, sizeof *input);
  if (input != NULL) {
    input->descriptor = -1;
    input->name = ef__copy_text(name, strlen(name));
    input->room = CHUNK;
    input->buffer = ef__allocate(CHUNK + 1, 1);
  }
  if (input == NULL || input->name == NULL || input->buffer == NULL) {
    ef__input_free(input);
    ef__error_memory(error, "reading a table");
    return NULL;
  }
  input->buffer[0] = '\n';
  return input;
}

void ef__input_free(ef__input *input) {
  if (input == NULL) return;
  if (input->owns_descriptor) close(input->descriptor);
  free(input->name);
  free(input->buffer);
  free(input);
}

/* ---- Opening ----------------------------------------------------------- */

static void refuse_open(const char *path, int reason, ef_error *error) {
  if (reason == ENOENT) {
    ef__error_set(error, EF_UNREADABLE,
                  "there is no such file; check the path");
  } else if (reason == EACCES) {
    ef__error_set(error, EF_UNREADABLE,
                  "may not be read by this user; check its permissions");
  } else {
    ef__error_set(error, EF_UNREADABLE, "cannot be opened: %s",
                  strerror(reason));
  }
  ef__error_place(error, path, 0, 0, NULL);
}

int ef__open_file(const char *path, ef_error *error) {
  int descriptor;
  do {
    descriptor = open(path, O_RDONLY | O_CLOEXEC | O_NOCTTY);
  } while (descriptor < 0 && errno == EINTR);
  if (descriptor < 0) {
    refuse_open(path, errno, error);
    return -1;
  }
  struct stat about;
  if (fstat(descriptor, &about) == 0 && S_ISDIR(about.st_mode)) {
    ef__error_set(error, EF_UNREADABLE,
                  "is a directory; name a file in it");
    ef__error_place(error, path, 0, 0, NULL);
    close(descriptor);
    return -1;
  }
  return descriptor;
}

/* Without overflow. */
size_t ef__byte_share(size_t n_bytes, size_t i, size_t n) {
  return n_bytes / n * i + n_bytes % n * i / n;
}

static ef_status bytes_on_disk(const char *path, size_t *n_bytes,
                               ef_error *error) {
  const int descriptor = ef__open_file(path, error);
  if (descriptor < 0) return error->status;
  struct stat about;
  const bool is_file =
      fstat(descriptor, &about) == 0 && S_ISREG(about.st_mode);
  close(descriptor);
  *n_bytes = is_file ? (size_t)about.st_size : 0;
  if (is_file) return EF_OK;
  ef__error_set(error, EF_UNREADABLE,
                "has no size of its own and can be read once only; save it in "
                "a file");
  return ef__error_place(error, path, 0, 0, NULL);
}

ef_status ef_file_bytes(const char *path, size_t *n_bytes, ef_error *error) {
  ef_error ignored;
  ef__span demo;
  if (error == NULL) error = &ignored;
  *n_bytes = 0;
  switch (ef__demo_find(path, &demo, error)) {
  case EF__DEMO_NONE: break;
  case EF__DEMO_UNKNOWN: return error->status;
  case EF__DEMO_FOUND: *n_bytes = demo.length; return EF_OK;
  }
  if (strcmp(path, "-") != 0) return bytes_on_disk(path, n_bytes, error);
  ef__error_set(error, EF_UNREADABLE,
                "can be read once only; save it in a file");
  return ef__error_place(error, "standard input", 0, 0, NULL);
}

ef__input *ef__input_open(const char *path, ef_error *error) {
  const bool is_standard = strcmp(path, "-") == 0;
  const int descriptor = is_standard ? STDIN_FILENO : ef__open_file(path, error);
  if (descriptor < 0) return NULL;
  ef__input *input =
      input_new(is_standard ? "standard input" : path, error);
  if (input == NULL) {
    if (!is_standard) close(descriptor);
    return NULL;
  }
  struct stat about;
  input->descriptor = descriptor;
  input->owns_descriptor = !is_standard;
  input->is_file = fstat(descriptor, &about) == 0 && S_ISREG(about.st_mode);
  return input;
}

ef__input *ef__input_from_text(const char *name, const char *text,
                               size_t length, ef_error *error) {
  ef__input *input = input_new(name, error);
  if (input == NULL) return NULL;
  input->memory = text;
  input->memory_left = length;
  return input;
}

/* ---- Reading ----------------------------------------------------------- */

/* Moves the window to the start of the buffer and leaves room behind it. */
static ef_status make_room(ef__input *input, ef_error *error) {
  const size_t held = input->end - input->begin;
  if (input->begin > 0) {
    memmove(input->buffer, input->buffer + input->begin, held);
    input->begin = 0;
    input->end = held;
  }
  if (input->room - held >= CHUNK / 2) return EF_OK;
  char *grown = ef__reallocate(input->buffer, 2 * input->room + 1, 1);
  if (grown == NULL) return ef__error_memory(error, "a long line");
  input->buffer = grown;
  input->room *= 2;
  return EF_OK;
}

/* Appends to the window what is there, 0 bytes at the end. */
static ef_status take(ef__input *input, size_t *taken, ef_error *error) {
  char *const to = input->buffer + input->end;
  const size_t free_bytes = input->room - input->end;
  if (input->descriptor < 0) {
    *taken = input->memory_left < free_bytes ? input->memory_left : free_bytes;
    if (*taken == 0) return EF_OK;
    memcpy(to, input->memory, *taken);
    input->memory += *taken;
    input->memory_left -= *taken;
    return EF_OK;
  }
  ssize_t got;
  do {
    got = read(input->descriptor, to, free_bytes);
  } while (got < 0 && errno == EINTR);
  if (got < 0) {
    ef__error_set(error, EF_UNREADABLE, "reading failed: %s", strerror(errno));
    return ef__error_place(error, input->name, 0, 0, NULL);
  }
  *taken = (size_t)got;
  return EF_OK;
}

/* ---- Plainly no text --------------------------------------------------- */

typedef struct file_mark {
  const char *bytes;
  size_t length;
  const char *what;
} file_mark;

#define LONGEST_MARK 4

static const file_mark file_marks[] = {
    {"\x89PNG", 4, "a PNG picture; expected a text table"},
    {"\xFF\xD8\xFF", 3, "a JPEG picture; expected a text table"},
    {"%PDF", 4, "a PDF document; expected a text table"},
    {"PK\x03\x04", 4,
     "a workbook or ZIP archive; expected a text table: save the sheet as CSV"},
    {"\xD0\xCF\x11\xE0", 4,
     "an office document; expected a text table: save the sheet as CSV"},
    {"\x1F\x8B", 2, "compressed by gzip; decompress it first"},
    {"\xFF\xFE", 2, "UTF-16 text; save it as UTF-8"},
    {"\xFE\xFF", 2, "UTF-16 text; save it as UTF-8"},
};

static const char *recognise(const char *bytes, size_t length) {
  for (size_t i = 0; i < sizeof file_marks / sizeof *file_marks; ++i) {
    const file_mark *const mark = &file_marks[i];
    if (length >= mark->length &&
        memcmp(bytes, mark->bytes, mark->length) == 0) {
      return mark->what;
    }
  }
  return NULL;
}

/* `taken` bytes behind the window. */
static ef_status check_text(const ef__input *input, size_t taken,
                            ef_error *error) {
  const char *const bytes = input->buffer + input->end;
  const char *const nul = taken > 0 ? memchr(bytes, 0, taken) : NULL;
  if (nul == NULL) return EF_OK;
  const char *const what = recognise(input->buffer, input->end + taken);
  if (input->n_read < LONGEST_MARK && what != NULL) {
    ef__error_set(error, EF_MALFORMED, "is %s", what);
  } else {
    ef__error_set(error, EF_MALFORMED,
                  "is binary: byte %zu is zero; expected a text table",
                  input->n_read + (size_t)(nul - bytes) + 1);
  }
  return ef__error_place(error, input->name, 0, 0, NULL);
}

static ef_status check_mark(const ef__input *input, ef_error *error) {
  const char *const what = recognise(input->buffer, input->end);
  if (what == NULL) return EF_OK;
  ef__error_set(error, EF_MALFORMED, "is %s", what);
  return ef__error_place(error, input->name, 0, 0, NULL);
}

/* The byte-order mark of UTF-8 at the very start is no text. */
static void skip_order_mark(ef__input *input) {
  if (input->end >= 3 && memcmp(input->buffer, "\xEF\xBB\xBF", 3) == 0) {
    input->begin = 3;
  }
}

ef_status ef__input_more(ef__input *input, ef_error *error) {
  const bool is_first = input->n_read == 0;
  size_t taken = 0;
  if (input->at_end) return EF_OK;
  ef_status status = make_room(input, error);
  do {
    /* A pipe may give few bytes: the first ones are judged together. */
    if (status == EF_OK) status = take(input, &taken, error);
    if (status != EF_OK) return status;
    status = check_text(input, taken, error);
    if (status != EF_OK) return status;
    input->at_end = taken == 0;
    input->n_read += taken;
    input->end += taken;
  } while (is_first && !input->at_end && input->end < LONGEST_MARK);
  if (is_first) {
    status = check_mark(input, error);
    if (status != EF_OK) return status;
    skip_order_mark(input);
  }
  input->buffer[input->end] = '\n';
  return EF_OK;
}
