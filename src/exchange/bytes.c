/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Whole files of bytes, with a limit. */
#include "exchange/exchange_private.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/base_private.h"

/* What is asked for first; the room then doubles up to the limit. */
#define FIRST_ROOM ((size_t)64 << 10)

typedef struct held {
  const char *name;
  int descriptor;
  unsigned char *bytes;
  size_t length, room, most;
} held;

static ef_status refuse(const held *h, ef_error *error, ef_status status,
                        const char *what) {
  ef__error_set(error, status, "%s", what);
  ef__error_place(error, h->name, 0, 0, NULL);
  return status;
}

static ef_status grow(held *h, ef_error *error) {
  if (h->length < h->room)
    return EF_OK;
  size_t room = h->room == 0 ? FIRST_ROOM : 2 * h->room;
  if (room > h->most + 1)
    room = h->most + 1; /* one byte more tells that there are too many */
  unsigned char *grown = ef__reallocate(h->bytes, room, 1);
  if (grown == NULL)
    return ef__error_memory(error, "a file");
  h->bytes = grown;
  h->room = room;
  return EF_OK;
}

static ef_status take_all(held *h, ef_error *error) {
  for (;;) {
    const ef_status status = grow(h, error);
    if (status != EF_OK)
      return status;
    const ssize_t got =
        read(h->descriptor, h->bytes + h->length, h->room - h->length);
    if (got < 0 && errno == EINTR)
      continue;
    if (got < 0) {
      ef__error_set(error, EF_UNREADABLE, "reading failed: %s",
                    strerror(errno));
      ef__error_place(error, h->name, 0, 0, NULL);
      return EF_UNREADABLE;
    }
    if (got == 0)
      break;
    h->length += (size_t)got;
    if (h->length > h->most) {
      ef__error_set(error, EF_MALFORMED, "has more than %zu bytes", h->most);
      ef__error_place(error, h->name, 0, 0, NULL);
      return EF_MALFORMED;
    }
  }
  return h->length > 0 ? EF_OK
                       : refuse(h, error, EF_MALFORMED, "is an empty file");
}

ef_status ef_bytes_read(const char *path, size_t max_bytes,
                        unsigned char **bytes, size_t *length,
                        ef_error *error) {
  if (path == NULL || bytes == NULL || length == NULL || max_bytes == SIZE_MAX)
    return ef__error_set(error, EF_INVALID,
                         "a file needs a path and a place for its bytes");
  const bool is_standard = strcmp(path, "-") == 0;
  held h = {.name = is_standard ? "standard input" : path, .most = max_bytes};
  ef_error own = {0}; /* the status stands in the error */
  if (error == NULL)
    error = &own;
  h.descriptor = is_standard ? STDIN_FILENO : ef__open_file(path, error);
  if (h.descriptor < 0)
    return error->status;
  const ef_status status = take_all(&h, error);
  if (!is_standard)
    close(h.descriptor);
  if (status != EF_OK) {
    free(h.bytes);
    return status;
  }
  *bytes = h.bytes;
  *length = h.length;
  return EF_OK;
}
