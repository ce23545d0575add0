/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Outputs that appear whole or not at all: written to a file without a
 * meaning beside the place, synced, then given the name. What is no regular
 * file (a device, a pipe, standard output) is written through. Outputs in
 * memory are parts of others. */
#include "exchange/exchange_private.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/base_private.h"

enum {
  BUFFER_BYTES = 64 << 10,
  MOST_TRIES = 1000, /* names tried for the file beside */
  MOST_LINKS = 40    /* symbolic links followed */
};

struct ef_output {
  int descriptor;
  bool owns_descriptor;
  bool overwrites;
  char *place;     /* where the user wants it, for messages */
  char *target;    /* the same with symbolic links followed; NULL: through */
  char *temporary; /* NULL: nothing to undo */
  mode_t mode;     /* of the file that is replaced, 0 if none */
  int reason;      /* errno of the first failure */
  bool in_memory;
  char *kept; /* in memory */
  size_t kept_used, kept_room;
  size_t used;
  char buffer[BUFFER_BYTES];
};

/* ---- Errors ------------------------------------------------------------ */

static ef_status refuse(const char *place, int reason, ef_error *error) {
  switch (reason) {
  case ENOENT:
    ef__error_set(error, EF_UNWRITABLE,
                  "its folder does not exist; create it or name another");
    break;
  case EACCES:
  case EPERM:
    ef__error_set(error, EF_UNWRITABLE,
                  "may not be written by this user; check the permissions of "
                  "the folder");
    break;
  case EISDIR:
    ef__error_set(error, EF_UNWRITABLE, "is a directory; name a file in it");
    break;
  case ENOSPC:
    ef__error_set(error, EF_UNWRITABLE,
                  "no space is left to write it; free some or name another "
                  "place");
    break;
  default:
    ef__error_set(error, EF_UNWRITABLE, "cannot be written: %s",
                  strerror(reason));
  }
  ef__error_place(error, place, 0, 0, NULL);
  return EF_UNWRITABLE;
}

static ef_status refuse_existing(const char *place, ef_error *error) {
  ef__error_set(error, EF_EXISTS,
                "is there already; name another file or allow overwriting it");
  ef__error_place(error, place, 0, 0, NULL);
  return EF_EXISTS;
}

/* ---- Names ------------------------------------------------------------- */

/* Length of the folder part, with its slash; 0 if none. */
static size_t folder_length(const char *path) {
  const char *const slash = strrchr(path, '/');
  return slash == NULL ? 0 : (size_t)(slash - path) + 1;
}

/* `folder` of a path, then `name`; NULL without memory. */
static char *beside(const char *path, const char *name) {
  const size_t length = folder_length(path);
  const size_t size = length + strlen(name) + 1;
  char *const joined = ef__allocate(size, 1);
  if (joined == NULL) return NULL;
  memcpy(joined, path, length);
  memcpy(joined + length, name, size - length);
  return joined;
}

/* Follows symbolic links, so that a link stays one when the file it leads to
 * is replaced. NULL with errno set. */
static char *follow_links(const char *path) {
  char *at = ef__copy_text(path, strlen(path));
  for (int i = 0; at != NULL && i < MOST_LINKS; ++i) {
    char link_text[4096];
    const ssize_t length = readlink(at, link_text, sizeof link_text - 1);
    if (length < 0) return at; /* no link, or not there */
    link_text[length] = '\0';
    char *const next = link_text[0] == '/'
                           ? ef__copy_text(link_text, (size_t)length)
                           : beside(at, link_text);
    free(at);
    at = next;
  }
  free(at);
  errno = at == NULL ? ENOMEM : ELOOP;
  return NULL;
}

/* ---- Opening ----------------------------------------------------------- */

static ef_output *output_new(const char *place, ef_error *error) {
  ef_output *const output = ef__allocate(1, sizeof *output);
  char *const copy = ef__copy_text(place, strlen(place));
  if (output == NULL || copy == NULL) {
    free(output);
    free(copy);
    ef__error_memory(error, "an output");
    return NULL;
  }
  output->descriptor = -1;
  output->owns_descriptor = false;
  output->overwrites = false;
  output->place = copy;
  output->target = NULL;
  output->temporary = NULL;
  output->mode = 0;
  output->reason = 0;
  output->in_memory = false;
  output->kept = NULL;
  output->kept_used = 0;
  output->kept_room = 0;
  output->used = 0;
  return output;
}

static void output_free(ef_output *output) {
  if (output->owns_descriptor) close(output->descriptor);
  free(output->place);
  free(output->target);
  free(output->temporary);
  free(output->kept);
  free(output);
}

/* Opens a new file beside the target under a name that nobody has. Returns 0
 * or the reason why not. */
static int open_beside(ef_output *output) {
  for (unsigned i = 0; i < MOST_TRIES; ++i) {
    char name[64];
    snprintf(name, sizeof name, ".evenfield-%ld-%u.part", (long)getpid(), i);
    char *const path = beside(output->target, name);
    if (path == NULL) return ENOMEM;
    const int descriptor =
        open(path, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (descriptor >= 0) {
      output->descriptor = descriptor;
      output->owns_descriptor = true;
      output->temporary = path;
      return 0;
    }
    const int reason = errno;
    free(path);
    if (reason != EEXIST && reason != EINTR) return reason;
  }
  return EEXIST;
}

static int open_through(ef_output *output) {
  do {
    output->descriptor =
        open(output->place, O_WRONLY | O_CLOEXEC | O_NOCTTY);
  } while (output->descriptor < 0 && errno == EINTR);
  if (output->descriptor < 0) return errno;
  output->owns_descriptor = true;
  return 0;
}

static ef_status open_place(ef_output *output, ef_error *error) {
  struct stat about;
  const bool is_there = stat(output->place, &about) == 0;
  if (!is_there && errno != ENOENT) return refuse(output->place, errno, error);
  if (is_there && S_ISDIR(about.st_mode)) {
    return refuse(output->place, EISDIR, error);
  }
  if (is_there && !S_ISREG(about.st_mode)) {
    const int reason = open_through(output);
    return reason == 0 ? EF_OK : refuse(output->place, reason, error);
  }
  if (is_there && !output->overwrites) {
    return refuse_existing(output->place, error);
  }
  if (is_there) output->mode = about.st_mode & 07777;
  output->target = follow_links(output->place);
  const int reason = output->target == NULL ? errno : open_beside(output);
  return reason == 0 ? EF_OK : refuse(output->place, reason, error);
}

ef_output *ef_output_open(const char *path, bool overwrite, ef_error *error) {
  const bool is_standard = path == NULL || strcmp(path, "-") == 0;
  ef_output *const output =
      output_new(is_standard ? "standard output" : path, error);
  if (output == NULL) return NULL;
  output->overwrites = overwrite;
  if (is_standard) {
    fflush(stdout); /* what the caller printed so far comes first */
    output->descriptor = STDOUT_FILENO;
    return output;
  }
  if (path[0] == '\0') {
    ef__error_set(error, EF_UNWRITABLE, "the name of the output is empty");
    output_free(output);
    return NULL;
  }
  if (open_place(output, error) != EF_OK) {
    output_free(output);
    return NULL;
  }
  return output;
}

ef_output *ef_output_memory(ef_error *error) {
  ef_output *const output = output_new("memory", error);
  if (output != NULL) output->in_memory = true;
  return output;
}

const char *ef_output_bytes(const ef_output *output, size_t *length) {
  *length = output->kept_used;
  return output->kept;
}

void ef_output_clear(ef_output *output) {
  output->kept_used = 0;
}

/* ---- Writing ----------------------------------------------------------- */

/* All bytes to the descriptor; keeps the reason of the first failure. */
static void write_through(ef_output *output, const char *bytes,
                          size_t length) {
  while (length > 0 && output->reason == 0) {
    const ssize_t written = write(output->descriptor, bytes, length);
    if (written >= 0) {
      bytes += written;
      length -= (size_t)written;
    } else if (errno != EINTR) {
      output->reason = errno;
    }
  }
}

static void flush(ef_output *output) {
  write_through(output, output->buffer, output->used);
  output->used = 0;
}

static ef_status keep(ef_output *output, const void *bytes, size_t length,
                      ef_error *error) {
  if (length > output->kept_room - output->kept_used) {
    const size_t needed = output->kept_used + length;
    const size_t room = needed < BUFFER_BYTES ? BUFFER_BYTES : 2 * needed;
    char *const grown = realloc(output->kept, room);
    if (grown == NULL) return ef__error_memory(error, "an output");
    output->kept = grown;
    output->kept_room = room;
  }
  if (length > 0) memcpy(output->kept + output->kept_used, bytes, length);
  output->kept_used += length;
  return EF_OK;
}

ef_status ef_output_write(ef_output *output, const void *bytes, size_t length,
                          ef_error *error) {
  if (output->in_memory) return keep(output, bytes, length, error);
  if (length > BUFFER_BYTES - output->used) flush(output);
  if (length > BUFFER_BYTES) {
    write_through(output, bytes, length);
  } else if (length > 0) {
    memcpy(output->buffer + output->used, bytes, length);
    output->used += length;
  }
  if (output->reason == 0) return EF_OK;
  return refuse(output->place, output->reason, error);
}

ef_status ef_output_text(ef_output *output, const char *text,
                         ef_error *error) {
  return ef_output_write(output, text, strlen(text), error);
}

/* ---- The end ----------------------------------------------------------- */

/* A rename is on the disk when its folder is. A folder that cannot be synced
 * (some network file systems) is no failure of the output. */
static void sync_folder(const char *path) {
  char *const folder = beside(path, ".");
  if (folder == NULL) return;
  const int descriptor = open(folder, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (descriptor >= 0) {
    fsync(descriptor);
    close(descriptor);
  }
  free(folder);
}

/* Gives the finished file its name. Without overwriting, link() refuses a name
 * that somebody took in the meantime, which rename() would replace. */
static int give_name(ef_output *output) {
  if (!output->overwrites) {
    if (link(output->temporary, output->target) == 0) {
      unlink(output->temporary);
      return 0;
    }
    if (errno == EEXIST) return EEXIST;
    /* File systems without hard links: the check is the best there is. */
    if (access(output->target, F_OK) == 0) return EEXIST;
  }
  return rename(output->temporary, output->target) == 0 ? 0 : errno;
}

static int finish_beside(ef_output *output) {
  const int descriptor = output->descriptor;
  /* Modes are a courtesy: not all file systems have them. */
  if (output->mode != 0) (void)fchmod(descriptor, output->mode);
  if (fsync(descriptor) != 0 && errno != EINVAL && errno != EROFS) return errno;
  output->owns_descriptor = false;
  if (close(descriptor) != 0) return errno;
  const int reason = give_name(output);
  if (reason != 0) return reason;
  free(output->temporary);
  output->temporary = NULL;
  sync_folder(output->target);
  return 0;
}

static int finish_through(ef_output *output) {
  if (!output->owns_descriptor) return 0;
  output->owns_descriptor = false;
  return close(output->descriptor) == 0 ? 0 : errno;
}

ef_status ef_output_commit(ef_output *output, ef_error *error) {
  flush(output);
  int reason = output->reason;
  if (reason == 0) {
    reason = output->temporary != NULL ? finish_beside(output)
                                       : finish_through(output);
  }
  ef_status status = EF_OK;
  if (reason == EEXIST) {
    status = refuse_existing(output->place, error);
  } else if (reason != 0) {
    status = refuse(output->place, reason, error);
  }
  ef_output_discard(output);
  return status;
}

void ef_output_discard(ef_output *output) {
  if (output == NULL) return;
  if (output->temporary != NULL) unlink(output->temporary);
  output_free(output);
}

/* ---- Directories ------------------------------------------------------- */

ef_status ef_directory_make(const char *path, ef_error *error) {
  struct stat about;
  if (mkdir(path, 0777) == 0) return EF_OK;
  const int reason = errno;
  const bool is_there = stat(path, &about) == 0;
  if (is_there && S_ISDIR(about.st_mode)) return EF_OK;
  if (is_there) {
    ef__error_set(error, EF_UNWRITABLE,
                  "is a file, expected a directory; name another");
    ef__error_place(error, path, 0, 0, NULL);
    return EF_UNWRITABLE;
  }
  return refuse(path, reason, error);
}
