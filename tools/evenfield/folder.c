/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "folder.h"

#include <dirent.h>
#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/statvfs.h>
#include <unistd.h>

#include "message.h"

static ef_status fail(const folder *f, int reason, ef_error *error) {
  message_fail(error, EF_UNWRITABLE,
               reason == ENOENT
                   ? "the folder it is to be in does not exist; create it or "
                     "name another"
                   : "cannot be written: %s",
               strerror(reason));
  return message_place(error, f->place);
}

static bool is_dots(const char *name) {
  return strcmp(name, ".") == 0 || strcmp(name, "..") == 0;
}

/* Whether the folder holds anything; true too when it cannot be told. */
static bool has_files(const char *path) {
  DIR *directory = opendir(path);
  if (directory == NULL)
    return true;
  bool found = false;
  for (const struct dirent *entry = readdir(directory); entry != NULL && !found;
       entry = readdir(directory)) {
    found = !is_dots(entry->d_name);
  }
  closedir(directory);
  return found;
}

static ef_status check_place(const folder *f, bool force, ef_error *error) {
  struct stat about;
  if (lstat(f->place, &about) != 0)
    return errno == ENOENT ? EF_OK : fail(f, errno, error);
  if (!S_ISDIR(about.st_mode)) {
    message_fail(error, EF_UNWRITABLE,
                 "is no folder; name another for the frames");
    return message_place(error, f->place);
  }
  if (force || !has_files(f->place))
    return EF_OK;
  message_fail(error, EF_EXISTS,
               "holds files already; --force overwrites them, or name another "
               "folder with --frames");
  return message_place(error, f->place);
}

static ef_status check_space(const folder *f, double bytes, ef_error *error) {
  struct statvfs disk;
  if (statvfs(f->part, &disk) != 0)
    return EF_OK; /* the writing will tell */
  const double free_bytes = (double)disk.f_bavail * (double)disk.f_frsize;
  if (bytes <= free_bytes)
    return EF_OK;
  message_fail(error, EF_UNWRITABLE,
               "the frames take up to %.3g GB, and the disk has %.3g GB left",
               bytes / 1e9, free_bytes / 1e9);
  return message_place(error, f->place);
}

ef_status folder_begin(folder *f, const char *place, bool force, double bytes,
                       ef_error *error) {
  enum { ROOM_OF_SUFFIX = 40 };
  size_t length = strlen(place);
  while (length > 1 && place[length - 1] == '/')
    --length;
  *f = (folder){.part = ""};
  if (length + ROOM_OF_SUFFIX > sizeof f->place) {
    return message_fail(error, EF_UNWRITABLE,
                        "the name of the folder is too long");
  }
  snprintf(f->place, sizeof f->place, "%.*s", (int)length, place);
  ef_status status = check_place(f, force, error);
  if (status != EF_OK)
    return status;
  char part[FOLDER_PATH_ROOM + ROOM_OF_SUFFIX];
  snprintf(part, sizeof part, "%s.%ld.part", f->place, (long)getpid());
  if (mkdir(part, 0777) != 0)
    return fail(f, errno, error);
  memcpy(f->part, part, strlen(part) + 1);
  status = check_space(f, bytes, error);
  if (status != EF_OK)
    folder_discard(f);
  return status;
}

/* "FOLDER/NAME". */
static bool join(const char *parent, const char *name,
                 char path[FOLDER_PATH_ROOM]) {
  const int length = snprintf(path, FOLDER_PATH_ROOM, "%s/%s", parent, name);
  return length > 0 && length < FOLDER_PATH_ROOM;
}

ef_status folder_file(const folder *f, const char *name,
                      char path[FOLDER_PATH_ROOM], ef_error *error) {
  if (join(f->part, name, path))
    return EF_OK;
  return message_fail(error, EF_UNWRITABLE,
                      "the name of the folder is too long");
}

/* Calls `act` for every file of a folder; 0 or the reason of a failure. */
static int each_file(const char *path,
                     int (*act)(const folder *f, const char *name),
                     const folder *f) {
  DIR *directory = opendir(path);
  if (directory == NULL)
    return errno;
  int reason = 0;
  for (const struct dirent *entry = readdir(directory);
       entry != NULL && reason == 0; entry = readdir(directory)) {
    if (!is_dots(entry->d_name))
      reason = act(f, entry->d_name);
  }
  closedir(directory);
  return reason;
}

static int remove_file(const folder *f, const char *name) {
  char path[FOLDER_PATH_ROOM];
  return join(f->part, name, path) && unlink(path) == 0 ? 0 : errno;
}

void folder_discard(folder *f) {
  if (f->part[0] == '\0')
    return;
  each_file(f->part, remove_file, f);
  rmdir(f->part);
  f->part[0] = '\0';
}

static int move_file(const folder *f, const char *name) {
  char from[FOLDER_PATH_ROOM], to[FOLDER_PATH_ROOM];
  if (!join(f->part, name, from) || !join(f->place, name, to))
    return ENAMETOOLONG;
  return rename(from, to) == 0 ? 0 : errno;
}

/* Removes files of an earlier run that this one does not replace. */
static int remove_stale(const folder *f, bool (*is_ours)(const char *name)) {
  DIR *directory = opendir(f->place);
  if (directory == NULL)
    return errno;
  int reason = 0;
  for (const struct dirent *entry = readdir(directory);
       entry != NULL && reason == 0; entry = readdir(directory)) {
    char old[FOLDER_PATH_ROOM], made[FOLDER_PATH_ROOM];
    if (!is_ours(entry->d_name) || !join(f->place, entry->d_name, old) ||
        !join(f->part, entry->d_name, made) || access(made, F_OK) == 0)
      continue;
    reason = unlink(old) == 0 ? 0 : errno;
  }
  closedir(directory);
  return reason;
}

ef_status folder_commit(folder *f, bool (*is_ours)(const char *name),
                        ef_error *error) {
  /* Also onto an empty folder. */
  int reason = rename(f->part, f->place) == 0 ? 0 : errno;
  if (reason == ENOTEMPTY || reason == EEXIST) {
    reason = remove_stale(f, is_ours);
    if (reason == 0)
      reason = each_file(f->part, move_file, f);
    if (reason == 0)
      rmdir(f->part);
  }
  if (reason != 0) {
    folder_discard(f);
    return fail(f, reason, error);
  }
  f->part[0] = '\0';
  return EF_OK;
}
