/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fail_alloc.h"

#include <stdatomic.h>

#include "near.h"

void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t count, size_t size);
void *__wrap_realloc(void *block, size_t size);
void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
void *__real_realloc(void *block, size_t size);

static atomic_size_t countdown; /* 0: off */
static atomic_bool has_failed;

static bool fails_now(void) {
  size_t left = atomic_load(&countdown);
  while (left != 0) {
    if (!atomic_compare_exchange_weak(&countdown, &left, left - 1))
      continue;
    if (left != 1)
      return false;
    atomic_store(&has_failed, true);
    return true;
  }
  return false;
}

void *__wrap_malloc(size_t size) {
  return fails_now() ? NULL : __real_malloc(size);
}

void *__wrap_calloc(size_t count, size_t size) {
  return fails_now() ? NULL : __real_calloc(count, size);
}

void *__wrap_realloc(void *block, size_t size) {
  return fails_now() ? NULL : __real_realloc(block, size);
}

void fail_alloc_at(size_t n) {
  atomic_store(&has_failed, false);
  atomic_store(&countdown, n);
}

bool fail_alloc_stop(void) {
  atomic_store(&countdown, 0);
  return atomic_load(&has_failed);
}

size_t fail_alloc_each(bool (*attempt)(void *context), void *context) {
  enum { FAR_TOO_MANY = 100000 };
  for (size_t n = 1; n < FAR_TOO_MANY; ++n) {
    fail_alloc_at(n);
    const bool succeeded = attempt(context);
    const bool failed = fail_alloc_stop();
    if (succeeded == failed) {
      print_error("allocation %zu %s, yet the call %s\n", n,
                  failed ? "failed" : "was not reached",
                  succeeded ? "succeeded" : "failed");
      fail();
    }
    if (!failed)
      return n - 1;
  }
  fail_msg("no end after %d allocations", FAR_TOO_MANY);
  return 0;
}
