/* SPDX-License-Identifier: GPL-3.0-or-later */
/* "model:age=45,field=4" to a model and back. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/model_private.h"

/* ---- Kinds ------------------------------------------------------------- */

typedef struct kind {
  const char *name;
  ef_deficiency deficiency;
  bool is_anomalous;
  ef_anomaly anomaly;
} kind;

static const kind kinds[] = {
    {.name = "model"},
    {.name = "protanope", .deficiency = EF_PROTANOPE},
    {.name = "deuteranope", .deficiency = EF_DEUTERANOPE},
    {.name = "tritanope", .deficiency = EF_TRITANOPE},
    {.name = "protanomalous", .is_anomalous = true,
     .anomaly = EF_PROTANOMALOUS},
    {.name = "deuteranomalous", .is_anomalous = true,
     .anomaly = EF_DEUTERANOMALOUS},
};
enum { N_KINDS = sizeof kinds / sizeof *kinds };

static const char *const kind_names[N_KINDS] = {
    "model",     "protanope",     "deuteranope",
    "tritanope", "protanomalous", "deuteranomalous"};

size_t ef_observer_model_names(const char *const **names) {
  if (names != NULL) *names = kind_names;
  return N_KINDS;
}

/* ---- Settings ---------------------------------------------------------- */

enum { N_SETTINGS = 11, SHIFT = 10, LONGEST_KEY = 16 };

static const char *const setting_names[N_SETTINGS] = {
    "age",       "field",   "lens",    "macular", "density-l", "density-m",
    "density-s", "shift-l", "shift-m", "shift-s", "shift"};

/* Where setting `i` is kept. */
static double *setting_place(ef_cone_model *model, size_t i) {
  switch (i) {
  case 0: return &model->age_years;
  case 1: return &model->field_deg;
  case 2: return &model->lens_percent;
  case 3: return &model->macular_percent;
  default: break;
  }
  return i < 7 ? &model->density_percent[i - 4] : &model->shift_nm[i - 7];
}

/* One "key=value" of `length` letters. */
typedef struct setting {
  size_t index;
  double value;
} setting;

static ef_status find_key(const char *key, bool is_anomalous, size_t *index,
                          ef_error *error) {
  const size_t n = is_anomalous ? N_SETTINGS : N_SETTINGS - 1;
  for (size_t i = 0; i < n; ++i) {
    if (!ef__name_equal(key, setting_names[i])) continue;
    *index = i;
    return EF_OK;
  }
  return ef__error_unknown(error, "setting of an observer", key, setting_names,
                           n);
}

static ef_status parse_setting(const char *text, size_t length,
                               bool is_anomalous, setting *out,
                               ef_error *error) {
  const char *const equals = memchr(text, '=', length);
  const size_t key_length =
      equals != NULL ? (size_t)(equals - text) : length;
  char key[LONGEST_KEY + 1];
  snprintf(key, sizeof key, "%.*s",
           (int)(key_length < LONGEST_KEY ? key_length : LONGEST_KEY), text);
  const ef_status status = find_key(key, is_anomalous, &out->index, error);
  if (status != EF_OK) return status;
  if (equals == NULL) {
    return ef__error_set(error, EF_INVALID,
                         "observer setting '%s' has no value; write %s=NUMBER",
                         key, key);
  }
  const char *const value = equals + 1;
  const size_t value_length = length - key_length - 1;
  if (ef_number_parse(value, value_length, '.', &out->value)) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "observer setting '%s' is '%.*s', which is no number",
                       key, (int)(value_length < 40 ? value_length : 40),
                       value);
}

/* All settings of `text`, into `value` and `is_set`. */
static ef_status parse_settings(const char *text, bool is_anomalous,
                                double value[N_SETTINGS],
                                bool is_set[N_SETTINGS], ef_error *error) {
  for (;;) {
    const char *const comma = strchr(text, ',');
    const size_t length =
        comma != NULL ? (size_t)(comma - text) : strlen(text);
    setting s;
    const ef_status status =
        parse_setting(text, length, is_anomalous, &s, error);
    if (status != EF_OK) return status;
    if (is_set[s.index]) {
      return ef__error_set(error, EF_INVALID,
                           "observer setting '%s' is given twice",
                           setting_names[s.index]);
    }
    is_set[s.index] = true;
    value[s.index] = s.value;
    if (comma == NULL) return EF_OK;
    text = comma + 1;
  }
}

/* ---- Names ------------------------------------------------------------- */

static const kind *find_kind(const char *name, size_t length) {
  for (size_t i = 0; i < N_KINDS; ++i) {
    char text[LONGEST_KEY + 1];
    if (length != strlen(kinds[i].name)) continue;
    snprintf(text, sizeof text, "%.*s", (int)length, name);
    if (ef__name_equal(text, kinds[i].name)) return &kinds[i];
  }
  return NULL;
}

ef_status ef__model_parse(const char *name, bool *is_model,
                          ef_cone_model *model, ef_error *error) {
  const char *const colon = strchr(name, ':');
  const size_t length = colon != NULL ? (size_t)(colon - name) : strlen(name);
  const kind *const what = find_kind(name, length);
  double value[N_SETTINGS] = {0};
  bool is_set[N_SETTINGS] = {false};
  *is_model = what != NULL;
  if (what == NULL) return EF_OK;
  if (colon != NULL) {
    const ef_status status = parse_settings(colon + 1, what->is_anomalous,
                                            value, is_set, error);
    if (status != EF_OK) return status;
  }
  *model = ef_cone_model_default();
  model->deficiency = what->deficiency;
  for (size_t i = 0; i < SHIFT; ++i) {
    if (is_set[i]) *setting_place(model, i) = value[i];
  }
  if (what->is_anomalous) {
    if (!is_set[SHIFT]) {
      return ef__error_set(error, EF_INVALID,
                           "observer '%s' needs the shift of its pigment in "
                           "nm, as in %s:shift=12",
                           what->name, what->name);
    }
    const ef_status status = ef_cone_model_make_anomalous(
        model, what->anomaly, value[SHIFT], error);
    if (status != EF_OK) return status;
  }
  return ef_cone_model_check(model, error);
}

void ef__model_name(const ef_cone_model *model, char name[EF__MODEL_NAME]) {
  ef_cone_model copy = *model;
  const bool is_whole = model->deficiency == EF_TRICHROMAT;
  size_t used = (size_t)snprintf(
      name, EF__MODEL_NAME, "%s",
      is_whole ? "model" : ef_deficiency_name(model->deficiency));
  for (size_t i = 0; i < SHIFT; ++i) {
    const double value = *setting_place(&copy, i);
    const bool is_always_told = i < 2;
    if (value == 0 && !is_always_told) continue;
    char number[EF_NUMBER_TEXT];
    ef_number_format(value, number);
    used += (size_t)snprintf(name + used, EF__MODEL_NAME - used, "%c%s=%s",
                             i == 0 ? ':' : ',', setting_names[i], number);
  }
}
