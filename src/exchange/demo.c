/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files of the built-in scenario, by name. */
#include "exchange/exchange_private.h"

#include <string.h>

#include "base/base_private.h"
#include "exchange/embedded.h"

size_t ef_demo_count(void) {
  return ef__demo_file_count;
}

const char *ef_demo_name(size_t i) {
  return i < ef__demo_file_count ? ef__demo_names[i] : NULL;
}

const char *ef_demo_text(size_t i, size_t *length) {
  const bool is_there = i < ef__demo_file_count;
  if (length != NULL) *length = is_there ? ef__demo_files[i].length : 0;
  return is_there ? ef__demo_files[i].text : NULL;
}

ef__demo_search ef__demo_find(const char *path, ef__span *text,
                              ef_error *error) {
  static const char prefix[] = "demo:";
  if (strncmp(path, prefix, sizeof prefix - 1) != 0) return EF__DEMO_NONE;
  const char *const name = path + sizeof prefix - 1;
  for (size_t i = 0; i < ef__demo_file_count; ++i) {
    if (strcmp(name, ef__demo_names[i]) != 0 &&
        strcmp(name, ef__demo_files[i].name) != 0) {
      continue;
    }
    *text = (ef__span){ef__demo_files[i].text, ef__demo_files[i].length};
    return EF__DEMO_FOUND;
  }
  ef__error_unknown(error, "file of the built-in scenario", name,
                    ef__demo_names, ef__demo_file_count);
  return EF__DEMO_UNKNOWN;
}
