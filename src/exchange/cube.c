/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral images: the header, and the file with the values beside it. */
#include "exchange/cube_private.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/base_private.h"

/* Of a header: lists of 65536 bands fit in. */
#define MOST_HEADER ((size_t)16 << 20)

ef_cube_settings ef_cube_settings_default(void) {
  return (ef_cube_settings){0};
}

/* ---- The file beside the header ------------------------------------------ */

static const char *const endings[] = {"",     ".img", ".dat", ".raw", ".bsq",
                                      ".bil", ".bip", ".IMG", ".DAT", ".RAW",
                                      ".BSQ", ".BIL", ".BIP"};
enum { N_ENDINGS = sizeof endings / sizeof *endings, LONGEST_ENDING = 4 };

static bool is_file(const char *path) {
  struct stat about;
  return stat(path, &about) == 0 && !S_ISDIR(about.st_mode);
}

static size_t stem_length(const char *path) {
  const size_t n = strlen(path);
  const bool is_header = n > 4 && (strcmp(path + n - 4, ".hdr") == 0 ||
                                   strcmp(path + n - 4, ".HDR") == 0);
  return is_header ? n - 4 : n;
}

/* Name of the only one that is there. */
static char *find_data(const char *path, ef_error *error) {
  const size_t stem = stem_length(path);
  char *name = ef__allocate(stem + LONGEST_ENDING + 1, 1);
  char *found = NULL;
  if (name == NULL) {
    ef__error_memory(error, "a name");
    return NULL;
  }
  const bool is_bare = path[stem] == '\0'; /* itself is no data file */
  for (size_t i = is_bare ? 1 : 0; i < N_ENDINGS; ++i) {
    memcpy(name, path, stem);
    snprintf(name + stem, LONGEST_ENDING + 1, "%s", endings[i]);
    if (!is_file(name))
      continue;
    if (found != NULL) {
      ef__error_set(error, EF_MALFORMED,
                    "the file with its values may be %.200s or %.200s",
                    found, name);
      ef__error_place(error, path, 0, 0, NULL);
      free(found);
      found = NULL;
      break;
    }
    found = ef__copy_text(name, strlen(name));
    if (found == NULL) {
      ef__error_memory(error, "a name");
      break;
    }
  }
  if (found == NULL && (error == NULL || error->status == EF_OK)) {
    ef__error_set(error, EF_UNREADABLE,
                  "no file with its values stands beside it, called as it is "
                  "without .hdr, or that with .img, .dat, .raw, .bsq, .bil or "
                  ".bip");
    ef__error_place(error, path, 0, 0, NULL);
  }
  free(name);
  return found;
}

/* ---- Opening ------------------------------------------------------------- */

static ef_status check_length(const ef_cube *cube, const ef_notes *notes,
                              ef_error *error) {
  const ef_cube_head *head = &cube->header.head;
  struct stat about;
  if (fstat(cube->descriptor, &about) != 0 || !S_ISREG(about.st_mode)) {
    ef__error_set(error, EF_UNREADABLE,
                  "is no regular file; the values are read in any order");
    return ef__error_place(error, head->data_file, 0, 0, NULL);
  }
  const size_t length = (size_t)about.st_size;
  const size_t wanted = head->offset_bytes + ef__cube_header_bytes(head);
  if (length < wanted) {
    ef__error_set(error, EF_MALFORMED,
                  "has %zu bytes, but its header says %zu: %zu x %zu pixels of "
                  "%zu bands, %zu byte%s a value, from byte %zu on",
                  length, wanted, head->width, head->height, head->n_bands,
                  ef_sample_type_bytes(head->type),
                  ef_sample_type_bytes(head->type) == 1 ? "" : "s",
                  head->offset_bytes);
    return ef__error_place(error, head->data_file, 0, 0, NULL);
  }
  if (length > wanted)
    ef__note(notes, "%s: has %zu bytes more than its header says", head->data_file,
             length - wanted);
  return EF_OK;
}

static ef_status open_data(ef_cube *cube, const ef_cube_settings *settings,
                           ef_error *error) {
  cube->data_name =
      settings->data != NULL
          ? ef__copy_text(settings->data, strlen(settings->data))
          : find_data(cube->name, error);
  if (cube->data_name == NULL)
    return error->status != EF_OK ? error->status
                                  : ef__error_memory(error, "a name");
  cube->header.head.data_file = cube->data_name;
  cube->descriptor = ef__open_file(cube->data_name, error);
  return cube->descriptor >= 0 ? check_length(cube, settings->notes, error)
                               : error->status;
}

static ef_status load(ef_cube *cube, const char *path,
                      const ef_cube_settings *settings, ef_error *error) {
  size_t length;
  cube->name = ef__copy_text(path, strlen(path));
  if (cube->name == NULL)
    return ef__error_memory(error, "a name");
  char *text = ef_text_read(path, MOST_HEADER, &length, error);
  if (text == NULL)
    return error->status;
  const ef_status status = ef__cube_header_read(
      cube->name, text, length, settings->notes, &cube->header, error);
  free(text);
  return status == EF_OK ? open_data(cube, settings, error) : status;
}

ef_cube *ef_cube_open(const char *path, const ef_cube_settings *settings,
                      ef_error *error) {
  const ef_cube_settings plain = ef_cube_settings_default();
  ef_error own = {0}; /* the status stands in the error */
  if (error == NULL)
    error = &own;
  *error = (ef_error){0};
  ef_cube *cube = ef__allocate_zeroed(1, sizeof *cube);
  if (cube == NULL) {
    ef__error_memory(error, "a spectral image");
    return NULL;
  }
  cube->descriptor = -1;
  if (load(cube, path, settings != NULL ? settings : &plain, error) == EF_OK)
    return cube;
  ef_cube_free(cube);
  return NULL;
}

void ef_cube_free(ef_cube *cube) {
  if (cube == NULL)
    return;
  if (cube->descriptor >= 0)
    close(cube->descriptor);
  ef__cube_header_clear(&cube->header);
  free(cube->data_name);
  free(cube->name);
  free(cube);
}

const ef_cube_head *ef_cube_get_head(const ef_cube *cube) {
  return &cube->header.head;
}
