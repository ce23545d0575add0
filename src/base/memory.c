/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <stdalign.h>
#include <stdlib.h>
#include <string.h>

bool ef__size_multiply(size_t a, size_t b, size_t *product) {
  if (b != 0 && a > SIZE_MAX / b)
    return false;
  *product = a * b;
  return true;
}

bool ef__size_add(size_t a, size_t b, size_t *sum) {
  if (a > SIZE_MAX - b)
    return false;
  *sum = a + b;
  return true;
}

void *ef__allocate(size_t count, size_t size) {
  size_t bytes;
  if (!ef__size_multiply(count, size, &bytes))
    return NULL;
  return malloc(bytes > 0 ? bytes : 1);
}

void *ef__allocate_zeroed(size_t count, size_t size) {
  size_t bytes;
  if (!ef__size_multiply(count, size, &bytes))
    return NULL;
  return calloc(bytes > 0 ? bytes : 1, 1);
}

void *ef__reallocate(void *block, size_t count, size_t size) {
  size_t bytes;
  if (!ef__size_multiply(count, size, &bytes))
    return NULL;
  return realloc(block, bytes > 0 ? bytes : 1);
}

char *ef__copy_text(const char *text, size_t length) {
  size_t bytes;
  if (!ef__size_add(length, 1, &bytes))
    return NULL;
  char *copy = malloc(bytes);
  if (copy == NULL)
    return NULL;
  memcpy(copy, text, length);
  copy[length] = '\0';
  return copy;
}

/* Bytes of a part, rounded up so that the next one is aligned. */
static bool part_bytes(const ef__part *part, size_t *bytes) {
  const size_t alignment = alignof(max_align_t);
  if (!ef__size_multiply(part->count, part->size, bytes))
    return false;
  if (!ef__size_add(*bytes, alignment - 1, bytes))
    return false;
  *bytes -= *bytes % alignment;
  return true;
}

void *ef__allocate_block(size_t n, const ef__part *part) {
  size_t total = 0;
  for (size_t i = 0; i < n; ++i) {
    size_t bytes;
    if (!part_bytes(&part[i], &bytes))
      return NULL;
    if (!ef__size_add(total, bytes, &total))
      return NULL;
  }
  char *block = ef__allocate_zeroed(total, 1);
  if (block == NULL)
    return NULL;
  size_t offset = 0;
  for (size_t i = 0; i < n; ++i) {
    size_t bytes = 0;
    part_bytes(&part[i], &bytes);
    void *array = block + offset;
    /* The caller's pointer may point to any type: copied as bytes, since all
     * object pointers have one representation on POSIX systems. */
    memcpy(part[i].pointer, &array, sizeof array);
    offset += bytes;
  }
  return block;
}
