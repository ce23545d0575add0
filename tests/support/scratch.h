/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A folder of its own for a test that writes files. */
#ifndef EVENFIELD_TESTS_SCRATCH_H
#define EVENFIELD_TESTS_SCRATCH_H

#include <stddef.h>

enum { SCRATCH_PATH = 256 };

/** Makes the folder; -1 on failure. For the set-up of a cmocka group. */
int scratch_make(void **state);
/** Removes it with the files in it; -1 when something is left. */
int scratch_remove(void **state);
/** Path of `name` in the folder. */
void scratch_path(const char *name, char path[SCRATCH_PATH]);
/** Number of names in the folder, hidden ones too. */
size_t scratch_count(void);
/** Writes a file of `length` bytes; fails the test if it cannot. */
void scratch_write(const char *name, const void *bytes, size_t length);
/** The whole file with a terminator behind it; free with free(). Fails the
 * test if it cannot be read. */
char *scratch_read(const char *name, size_t *length);
/** The file holds just this text. */
void scratch_expect(const char *name, const char *text);

#endif
