/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Names to observers. */
#include <string.h>

#include "base/base_private.h"
#include "observer/model_private.h"
#include "observer/observer_private.h"

/* All that is taken, for the answer to what is not. */
static const char *const known[] = {
    "cie-1931",    "cie-1964",  "cie-2015-2",    "cie-2015-10",    "model",
    "protanope",   "deuteranope", "tritanope",   "protanomalous",
    "deuteranomalous"};
enum { N_KNOWN = sizeof known / sizeof *known };

size_t ef_observer_names(const char *const **names) {
  return ef__tabulated_names(names);
}

static ef_status unknown(const char *name, ef_error *error) {
  const char *const colon = strchr(name, ':');
  char before[64] = "";
  if (colon == NULL) {
    return ef__error_unknown(error, "observer", name, known, N_KNOWN);
  }
  const size_t length = (size_t)(colon - name);
  if (length < sizeof before) memcpy(before, name, length);
  const char *const *tabulated;
  const size_t n = ef__tabulated_names(&tabulated);
  for (size_t i = 0; i < n; ++i) {
    if (!ef__name_equal(before, tabulated[i])) continue;
    return ef__error_set(error, EF_INVALID,
                         "observer '%s' is a table and takes no settings; "
                         "'model' does, as in model:age=45,field=4",
                         tabulated[i]);
  }
  return ef__error_unknown(error, "observer", before, known, N_KNOWN);
}

ef_observer *ef_observer_new(const char *name, ef_error *error) {
  const char *const *tabulated;
  const size_t n = ef__tabulated_names(&tabulated);
  for (size_t i = 0; i < n; ++i) {
    if (ef__name_equal(name, tabulated[i])) return ef__tabulated_new(i, error);
  }
  bool is_model;
  ef_cone_model model;
  if (ef__model_parse(name, &is_model, &model, error) != EF_OK) return NULL;
  if (is_model) return ef__observer_from_model(name, &model, error);
  unknown(name, error);
  return NULL;
}
