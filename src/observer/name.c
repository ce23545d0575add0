/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Names to observers. A form with settings after a colon is one more branch of
 * ef_observer_new before the list is searched. */
#include "base/base_private.h"
#include "observer/observer_private.h"

size_t ef_observer_names(const char *const **names) {
  return ef__tabulated_names(names);
}

ef_observer *ef_observer_new(const char *name, ef_error *error) {
  const char *const *known;
  const size_t n = ef__tabulated_names(&known);
  for (size_t i = 0; i < n; ++i) {
    if (ef__name_equal(name, known[i])) return ef__tabulated_new(i, error);
  }
  ef__error_unknown(error, "observer", name, known, n);
  return NULL;
}
