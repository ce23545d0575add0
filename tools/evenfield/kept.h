/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Input files held in memory, so that a record can hold them and a replay can
 * do without them. */
#ifndef COMMAND_KEPT_H
#define COMMAND_KEPT_H

#include <evenfield/exchange.h>

typedef struct kept_file {
  char *name, *text; /**< owned */
  size_t length;
} kept_file;

typedef struct kept_files {
  size_t n;
  kept_file *file;
  bool is_closed; /**< a replay: nothing else is read */
} kept_files;

/** The text of a file, read at the first call and borrowed until freed. Only
 * UTF-8 can be kept. */
ef_status kept_get(kept_files *kept, const char *path, const char **text,
                   size_t *length, ef_error *error);
bool kept_has(const kept_files *kept, const char *name);
/** Copies both. */
ef_status kept_add(kept_files *kept, const char *name, const char *text,
                   size_t length, ef_error *error);
void kept_free(kept_files *kept);

#endif
