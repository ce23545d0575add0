/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <stdio.h>
#include <string.h>

enum { LONGEST_NAME = 95, MAX_LISTED = 8 };

static char lower(char c) {
  return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

bool ef__name_equal(const char *a, const char *b) {
  while (*a != '\0' && lower(*a) == lower(*b)) {
    ++a;
    ++b;
  }
  return lower(*a) == lower(*b);
}

static bool is_prefix(const char *prefix, const char *name) {
  while (*prefix != '\0' && lower(*prefix) == lower(*name)) {
    ++prefix;
    ++name;
  }
  return *prefix == '\0';
}

static size_t least(size_t a, size_t b, size_t c) {
  const size_t ab = a < b ? a : b;
  return ab < c ? ab : c;
}

/* Insertions, deletions, replacements and swaps of neighbours from `a` to `b`
 * (optimal string alignment: Damerau 1964, Levenshtein 1966), case ignored.
 * Both at most LONGEST_NAME long. Rows of the table are kept for three
 * letters of `a`. */
static size_t edit_distance(const char *a, const char *b) {
  const size_t length = strlen(b);
  size_t row[3][LONGEST_NAME + 1];
  size_t i = 0;
  for (size_t j = 0; j <= length; ++j)
    row[0][j] = j;
  for (; a[i] != '\0'; ++i) {
    const size_t *const above = row[i % 3];
    size_t *const here = row[(i + 1) % 3];
    here[0] = i + 1;
    for (size_t j = 0; j < length; ++j) {
      const bool differ = lower(a[i]) != lower(b[j]);
      here[j + 1] = least(above[j] + differ, above[j + 1] + 1, here[j] + 1);
      const bool swapped = i > 0 && j > 0 && lower(a[i]) == lower(b[j - 1]) &&
                           lower(a[i - 1]) == lower(b[j]);
      if (!swapped)
        continue;
      const size_t before = row[(i + 2) % 3][j - 1] + 1;
      if (before < here[j + 1])
        here[j + 1] = before;
    }
  }
  return row[i % 3][length];
}

/* Distance for ranking, SIZE_MAX when not close. A name that goes on after
 * what was typed ranks like one typing mistake. */
static size_t rank(const char *name, const char *known) {
  const size_t length = strlen(name);
  if (length == 0 || length > LONGEST_NAME || strlen(known) > LONGEST_NAME) {
    return SIZE_MAX;
  }
  const size_t distance = edit_distance(name, known);
  if (distance > 1 && is_prefix(name, known))
    return 1;
  return distance <= length / 3 ? distance : SIZE_MAX;
}

size_t ef_nearest_names(const char *name, const char *const *known, size_t n,
                        size_t max, size_t *index) {
  size_t n_found = 0;
  for (size_t i = 0; i < n; ++i) {
    const size_t distance = rank(name, known[i]);
    if (distance == SIZE_MAX)
      continue;
    size_t place = n_found;
    while (place > 0 && rank(name, known[index[place - 1]]) > distance)
      --place;
    if (place >= max)
      continue;
    if (n_found < max)
      ++n_found;
    for (size_t j = n_found - 1; j > place; --j)
      index[j] = index[j - 1];
    index[place] = i;
  }
  return n_found;
}

/* ", " joined names after what `text` holds already, as far as they fit. */
static void append_name(char *text, size_t size, const char *name, bool first) {
  const size_t used = strlen(text);
  if (used + strlen(name) + 3 > size)
    return;
  snprintf(text + used, size - used, "%s%s", first ? "" : ", ", name);
}

ef_status ef__error_unknown(ef_error *error, const char *what, const char *name,
                            const char *const *known, size_t n) {
  if (error == NULL)
    return EF_UNKNOWN_NAME;
  size_t index[MAX_LISTED];
  const size_t n_near = ef_nearest_names(name, known, n, MAX_LISTED, index);
  char list[300] = "";
  for (size_t i = 0; i < n_near; ++i) {
    append_name(list, sizeof list, known[index[i]], i == 0);
  }
  for (size_t i = 0; n_near == 0 && i < n && i < MAX_LISTED; ++i) {
    append_name(list, sizeof list, known[i], i == 0);
  }
  const bool has_more = n_near == 0 && n > MAX_LISTED;
  return ef__error_set(
      error, EF_UNKNOWN_NAME, "no %s is called '%.64s'; %s: %s%s", what, name,
      n_near > 0 ? "near names" : "known", list, has_more ? ", ..." : "");
}
