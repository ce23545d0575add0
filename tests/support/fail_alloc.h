/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Makes the n-th allocation of the library fail. Works without a hook in the
 * library: the test programs are linked with --wrap for malloc, calloc and
 * realloc, which reaches our own objects and no shared library. */
#ifndef EVENFIELD_TESTS_FAIL_ALLOC_H
#define EVENFIELD_TESTS_FAIL_ALLOC_H

#include <stdbool.h>
#include <stddef.h>

/** The n-th allocation from now on (1 is the next) returns NULL, once. */
void fail_alloc_at(size_t n);
/** No failure any more; true when the one asked for took place. */
bool fail_alloc_stop(void);

/** Runs `attempt` with its 1st, 2nd ... allocation failing until none is left
 * to fail, and fails the test unless it returned false (cleanly) each time and
 * true at the end. Leaks show under the sanitizer. Returns the number of
 * allocations of a run. */
size_t fail_alloc_each(bool (*attempt)(void *context), void *context);

#endif
