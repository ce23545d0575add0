/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Directions as text. */
#include <math.h>
#include <string.h>

#include "base/base_private.h"
#include "stimulus/stimulus_private.h"

enum { WORD = 32 };

static const char *const names[] = {"luminance",
                                    "isoluminant red-green",
                                    "isoluminant tritan",
                                    "isoluminant:0",
                                    "dkl:0,0,0",
                                    "macleod-boynton:0,0",
                                    "L",
                                    "M",
                                    "S",
                                    "rod",
                                    "mel"};
enum { N_NAMES = sizeof names / sizeof names[0] };

/* Cones silent, rods and melanopsin ignored. */
static ef_direction blank(ef_direction_kind kind) {
  ef_direction out = {.kind = kind};
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r)
    out.role[r] = r < 3 ? EF_RECEPTOR_SILENT : EF_RECEPTOR_IGNORED;
  return out;
}

/* ---- Words -------------------------------------------------------------- */

/* The next part of a list, between commas and without blanks around it; false
 * at the end. A part that is too long is cut, which no name survives. */
static bool next_part(const char **list, char part[WORD]) {
  const char *from = *list;
  if (from == NULL)
    return false;
  const char *const comma = strchr(from, ',');
  const char *to = comma != NULL ? comma : from + strlen(from);
  *list = comma != NULL ? comma + 1 : NULL;
  while (from < to && *from == ' ')
    ++from;
  while (to > from && to[-1] == ' ')
    --to;
  const size_t length =
      (size_t)(to - from) < WORD ? (size_t)(to - from) : (size_t)WORD - 1;
  memcpy(part, from, length);
  part[length] = '\0';
  return true;
}

/* Behind `prefix`, case ignored, or NULL. */
static const char *behind(const char *text, const char *prefix) {
  char head[WORD];
  const size_t length = strlen(prefix);
  if (strlen(text) < length)
    return NULL;
  memcpy(head, text, length);
  head[length] = '\0';
  return ef__name_equal(head, prefix) ? text + length : NULL;
}

static bool read_number(const char *text, double *value) {
  if (*text == '+' && text[1] != '-' && text[1] != '+')
    ++text;
  return ef_number_parse(text, strlen(text), '.', value);
}

/* Exactly n numbers between commas. */
static ef_status read_numbers(const char *text, const char *list, size_t n,
                              double *value, ef_error *error) {
  char part[WORD];
  size_t k = 0;
  const char *rest = list;
  while (next_part(&rest, part)) {
    if (k < n && !read_number(part, &value[k])) {
      return ef__error_set(error, EF_INVALID,
                           "'%s' in direction '%s' is no number", part, text);
    }
    ++k;
  }
  if (k == n)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "direction '%s' has %zu numbers; expected %zu", text, k,
                       n);
}

/* ---- Receptors ---------------------------------------------------------- */

/* "S", "-M", "mel=0.2" */
static ef_status read_receptor(const char *text, char part[WORD],
                               ef_direction *out, ef_error *error) {
  double contrast = 1;
  char *const equals = strchr(part, '=');
  const bool has_sign = part[0] == '-' || part[0] == '+';
  if (equals != NULL) {
    if (has_sign || !read_number(equals + 1, &contrast)) {
      return ef__error_set(error, EF_INVALID,
                           "'%s' in direction '%s': expected a receptor, '=' "
                           "and a number, such as M=-0.05",
                           part, text);
    }
    *equals = '\0';
  } else if (part[0] == '-') {
    contrast = -1;
  }
  ef_receptor receptor;
  const ef_status status =
      ef_receptor_find(part + (has_sign ? 1 : 0), &receptor, NULL);
  if (status != EF_OK)
    return ef__error_unknown(error, "direction", text, names, N_NAMES);
  if (out->role[receptor] == EF_RECEPTOR_CHANGED) {
    return ef__error_set(error, EF_INVALID, "direction '%s' names %s twice",
                         text, ef_receptor_symbol(receptor));
  }
  out->role[receptor] = EF_RECEPTOR_CHANGED;
  out->contrast[receptor] = contrast;
  return EF_OK;
}

static ef_status read_receptors(const char *text, ef_direction *out,
                                ef_error *error) {
  char part[WORD];
  ef_status status = EF_OK;
  const char *rest = text;
  while (status == EF_OK && next_part(&rest, part))
    status = read_receptor(text, part, out, error);
  return status;
}

/* ---- Public ------------------------------------------------------------- */

ef_status ef_direction_parse(const char *text, ef_direction *out,
                             ef_error *error) {
  const char *list;
  ef_direction d = blank(EF_DIRECTION_CONTRAST);
  ef_status status = EF_OK;
  if (ef__name_equal(text, "luminance")) {
    for (size_t c = 0; c < 3; ++c) {
      d.role[c] = EF_RECEPTOR_CHANGED;
      d.contrast[c] = 1;
    }
  } else if (ef__name_equal(text, "isoluminant red-green")) {
    d = blank(EF_DIRECTION_ISOLUMINANT);
  } else if (ef__name_equal(text, "isoluminant tritan")) {
    d = blank(EF_DIRECTION_ISOLUMINANT);
    d.angle_deg = 90;
  } else if ((list = behind(text, "isoluminant:")) != NULL) {
    d = blank(EF_DIRECTION_ISOLUMINANT);
    status = read_numbers(text, list, 1, &d.angle_deg, error);
  } else if ((list = behind(text, "dkl:")) != NULL) {
    d = blank(EF_DIRECTION_DKL);
    status = read_numbers(text, list, 3, d.dkl, error);
  } else if ((list = behind(text, "macleod-boynton:")) != NULL) {
    d = blank(EF_DIRECTION_MB);
    status = read_numbers(text, list, 2, d.mb, error);
  } else {
    status = read_receptors(text, &d, error);
  }
  if (status == EF_OK)
    *out = d;
  return status;
}

static ef_status set_role(ef_direction *direction, ef_receptor receptor,
                          ef_receptor_role role, ef_error *error) {
  const char *const symbol = ef_receptor_symbol(receptor);
  const char *const verb = role == EF_RECEPTOR_SILENT ? "silenced" : "ignored";
  if (receptor <= EF_S_CONE && direction->kind != EF_DIRECTION_CONTRAST) {
    return ef__error_set(error, EF_INVALID,
                         "%s cannot be %s: this direction itself says what the "
                         "cones do",
                         symbol, verb);
  }
  if (direction->role[receptor] == EF_RECEPTOR_CHANGED) {
    return ef__error_set(error, EF_INVALID, "%s cannot be both changed and %s",
                         symbol, verb);
  }
  direction->role[receptor] = role;
  return EF_OK;
}

ef_status ef_direction_set_role(ef_direction *direction, const char *list,
                                ef_receptor_role role, ef_error *error) {
  if (role != EF_RECEPTOR_SILENT && role != EF_RECEPTOR_IGNORED) {
    return ef__error_set(error, EF_INVALID,
                         "a list of receptors is silenced or ignored");
  }
  char part[WORD];
  ef_direction changed = *direction;
  while (next_part(&list, part)) {
    ef_receptor receptor;
    ef_status status = ef_receptor_find(part, &receptor, error);
    if (status == EF_OK)
      status = set_role(&changed, receptor, role, error);
    if (status != EF_OK)
      return status;
  }
  *direction = changed;
  return EF_OK;
}
