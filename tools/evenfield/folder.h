/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A folder of files that appears whole or not at all: filled beside its place,
 * then given the name. */
#ifndef COMMAND_FOLDER_H
#define COMMAND_FOLDER_H

#include <evenfield/base.h>

enum { FOLDER_PATH_ROOM = 4096 };

typedef struct folder {
  char place[FOLDER_PATH_ROOM]; /**< as asked for, without slashes behind it */
  char part[FOLDER_PATH_ROOM];  /**< where it is filled; "": not begun */
} folder;

/** EF_EXISTS when `place` is there and holds something, unless `force`;
 * EF_UNWRITABLE when the disk has less than `bytes` left. */
ef_status folder_begin(folder *f, const char *place, bool force, double bytes,
                       ef_error *error);
/** Path of a file to write. */
ef_status folder_file(const folder *f, const char *name,
                      char path[FOLDER_PATH_ROOM], ef_error *error);
/** Gives it its name. Into a folder that is there (force) the files move one
 * by one, and those of an earlier run that are not made again go: the ones for
 * which `is_ours` is true. */
ef_status folder_commit(folder *f, bool (*is_ours)(const char *name),
                        ef_error *error);
/** Removes what was written; after folder_commit nothing is left to do. */
void folder_discard(folder *f);

#endif
