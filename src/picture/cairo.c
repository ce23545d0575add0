/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/cairo_private.h"

#include <dlfcn.h>
#include <string.h>

bool ef__cairo_load(ef__cairo *cairo) {
  void *library = dlopen("libcairo.so.2", RTLD_LAZY | RTLD_LOCAL);
  if (library == NULL)
    return false;
  bool complete = true;
  /* ISO C has no cast from an object to a function pointer; POSIX promises that
   * they have one representation. */
#define LOAD(name)                                                             \
  {                                                                            \
    void *found = dlsym(library, #name);                                       \
    complete = complete && found != NULL;                                      \
    memcpy(&cairo->name, &found, sizeof found);                                \
  }
  EF__CAIRO_CALLS(LOAD)
#undef LOAD
  return complete;
}
