/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "kept.h"

#include <stdlib.h>
#include <string.h>

#include "message.h"

/* More than any display's measurements take. */
enum { MOST_BYTES = 64 << 20 };

/* RFC 3629: bytes of the character at `text`, 0 when it is none. */
static size_t character_length(const unsigned char *text, size_t left) {
  const unsigned char first = text[0];
  if (first < 0x80u)
    return first == 0 ? 0 : 1;
  const size_t n = first >= 0xC2u && first < 0xE0u   ? 2
                   : first >= 0xE0u && first < 0xF0u ? 3
                   : first >= 0xF0u && first < 0xF5u ? 4
                                                     : 0;
  if (n == 0 || n > left)
    return 0;
  for (size_t i = 1; i < n; ++i) {
    if ((text[i] & 0xC0u) != 0x80u)
      return 0;
  }
  /* Overlong forms, surrogates, beyond U+10FFFF. */
  const unsigned char second = text[1];
  if ((first == 0xE0u && second < 0xA0u) ||
      (first == 0xEDu && second > 0x9Fu) ||
      (first == 0xF0u && second < 0x90u) || (first == 0xF4u && second > 0x8Fu))
    return 0;
  return n;
}

static ef_status check_utf8(const char *name, const char *text, size_t length,
                            ef_error *error) {
  size_t line = 1;
  for (size_t i = 0; i < length;) {
    const size_t n =
        character_length((const unsigned char *)text + i, length - i);
    if (n == 0) {
      message_fail(error, EF_MALFORMED,
                   "holds bytes that are not UTF-8, which the record of a "
                   "stimulus cannot keep: save the file as UTF-8");
      message_place(error, name);
      error->line = line;
      return EF_MALFORMED;
    }
    if (text[i] == '\n')
      ++line;
    i += n;
  }
  return EF_OK;
}

static const kept_file *find(const kept_files *kept, const char *name) {
  for (size_t i = 0; i < kept->n; ++i) {
    if (strcmp(kept->file[i].name, name) == 0)
      return &kept->file[i];
  }
  return NULL;
}

bool kept_has(const kept_files *kept, const char *name) {
  return find(kept, name) != NULL;
}

/* Takes `text` over. */
static ef_status keep(kept_files *kept, const char *name, char *text,
                      size_t length, ef_error *error) {
  kept_file *grown = realloc(kept->file, (kept->n + 1) * sizeof *grown);
  if (grown != NULL)
    kept->file = grown;
  char *copy = strdup(name);
  if (grown == NULL || copy == NULL || text == NULL) {
    free(copy);
    free(text);
    return message_fail(error, EF_NO_MEMORY, "out of memory for a file");
  }
  kept->file[kept->n++] = (kept_file){copy, text, length};
  return EF_OK;
}

ef_status kept_add(kept_files *kept, const char *name, const char *text,
                   size_t length, ef_error *error) {
  char *copy = malloc(length + 1);
  if (copy != NULL) {
    memcpy(copy, text, length);
    copy[length] = '\0';
  }
  return keep(kept, name, copy, length, error);
}

ef_status kept_get(kept_files *kept, const char *path, const char **text,
                   size_t *length, ef_error *error) {
  const kept_file *found = find(kept, path);
  if (found == NULL && kept->is_closed) {
    return message_fail(error, EF_MALFORMED,
                        "the record holds no file \"%.200s\", which its "
                        "options name",
                        path);
  }
  if (found == NULL) {
    char *bytes = ef_text_read(path, MOST_BYTES, length, error);
    ef_status status =
        bytes != NULL ? check_utf8(path, bytes, *length, error) : error->status;
    if (status != EF_OK) {
      free(bytes);
      return status;
    }
    status = keep(kept, path, bytes, *length, error);
    if (status != EF_OK)
      return status;
    found = &kept->file[kept->n - 1];
  }
  *text = found->text;
  *length = found->length;
  return EF_OK;
}

void kept_free(kept_files *kept) {
  for (size_t i = 0; i < kept->n; ++i) {
    free(kept->file[i].name);
    free(kept->file[i].text);
  }
  free(kept->file);
  *kept = (kept_files){0};
}
