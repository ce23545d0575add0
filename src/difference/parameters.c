/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Formulas with parameters of their own: "ciede2000:kl=2,kc=1.5". */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

size_t ef_metric_parameter_count(const ef_metric *metric) {
  size_t n = 0;
  while (n < EF__MAX_PARAMETERS && metric->parameter[n].name != NULL)
    ++n;
  return n;
}

ef_parameter ef_metric_parameter_at(const ef_metric *metric, size_t i) {
  if (i < ef_metric_parameter_count(metric))
    return metric->parameter[i];
  return (ef_parameter){NULL, (double)NAN, NULL};
}

/* A stretch of the text. */
typedef struct token {
  const char *text;
  size_t length;
} token;

/* Cuts off what stands before the first `mark`, or all. */
static token cut(token *rest, char mark) {
  const char *const end = memchr(rest->text, mark, rest->length);
  token first = *rest;
  if (end == NULL) {
    rest->text += rest->length;
    rest->length = 0;
  } else {
    first.length = (size_t)(end - rest->text);
    rest->text = end + 1;
    rest->length -= first.length + 1;
  }
  return first;
}

static bool is_name(token t, const char *name) {
  enum { LONGEST = 31 };
  char text[LONGEST + 1];
  if (t.length > LONGEST)
    return false;
  memcpy(text, t.text, t.length);
  text[t.length] = '\0';
  return ef__name_equal(text, name);
}

/* What an error quotes of a token. */
static int shown(token t) {
  return t.length < 40 ? (int)t.length : 40;
}

static ef_status set_value(ef_parameter *parameter, token value,
                           const ef_metric *metric, ef_error *error) {
  double number;
  if (!ef_number_parse(value.text, value.length, '.', &number)) {
    return ef__error_set(
        error, EF_INVALID, "%s of %s is '%.*s', which is no number",
        parameter->name, metric->name, shown(value), value.text);
  }
  if (!(number > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "%s of %s is %g; it must be above zero",
                         parameter->name, metric->name, number);
  }
  parameter->value = number;
  return EF_OK;
}

static ef_status set_by_name(ef_metric *metric, token name, token value,
                             ef_error *error) {
  const size_t n = ef_metric_parameter_count(metric);
  const char *known[EF__MAX_PARAMETERS];
  for (size_t i = 0; i < n; ++i) {
    known[i] = metric->parameter[i].name;
    if (is_name(name, known[i]))
      return set_value(&metric->parameter[i], value, metric, error);
  }
  char what[96], quoted[41];
  snprintf(what, sizeof what, "parameter of %s", metric->name);
  snprintf(quoted, sizeof quoted, "%.*s", shown(name), name.text);
  return ef__error_unknown(error, what, quoted, known, n);
}

/* "2:1" */
static ef_status set_in_order(ef_metric *metric, token values,
                              ef_error *error) {
  const size_t n = ef_metric_parameter_count(metric);
  ef_status status = EF_OK;
  for (size_t i = 0; values.length > 0 && status == EF_OK; ++i) {
    if (i == n) {
      return ef__error_set(error, EF_INVALID,
                           "more values than %s has parameters (%zu)",
                           metric->name, n);
    }
    status = set_value(&metric->parameter[i], cut(&values, ':'), metric, error);
  }
  return status;
}

static ef_status set_named_set(ef_metric *metric, token name, ef_error *error) {
  enum { MAX_KNOWN = EF__MAX_PARAMETERS + 8 };
  const char *known[MAX_KNOWN];
  size_t n = 0;
  for (const ef__parameter_set *set = metric->parameter_set;
       set != NULL && set->name != NULL && n < MAX_KNOWN; ++set) {
    known[n++] = set->name;
    if (!is_name(name, set->name))
      continue;
    for (size_t i = 0; i < ef_metric_parameter_count(metric); ++i) {
      if (!isnan(set->value[i]))
        metric->parameter[i].value = set->value[i];
    }
    return EF_OK;
  }
  for (size_t i = 0; i < ef_metric_parameter_count(metric) && n < MAX_KNOWN;
       ++i) {
    known[n++] = metric->parameter[i].name;
  }
  char what[96], quoted[41];
  snprintf(what, sizeof what, "parameter or set of %s", metric->name);
  snprintf(quoted, sizeof quoted, "%.*s", shown(name), name.text);
  return ef__error_unknown(error, what, quoted, known, n);
}

static bool begins_a_number(token t) {
  return t.length > 0 && (strchr("+-.", t.text[0]) != NULL ||
                          (t.text[0] >= '0' && t.text[0] <= '9'));
}

static ef_status set_one(ef_metric *metric, token setting, ef_error *error) {
  if (ef_metric_parameter_count(metric) == 0) {
    return ef__error_set(error, EF_INVALID,
                         "%s has no parameters, but '%.*s' was given",
                         metric->name, shown(setting), setting.text);
  }
  if (setting.length == 0) {
    return ef__error_set(error, EF_INVALID,
                         "a parameter of %s is empty; write NAME=VALUE",
                         metric->name);
  }
  if (memchr(setting.text, '=', setting.length) != NULL) {
    const token name = cut(&setting, '=');
    return set_by_name(metric, name, setting, error);
  }
  return begins_a_number(setting) ? set_in_order(metric, setting, error)
                                  : set_named_set(metric, setting, error);
}

/* ---- Name and title ---------------------------------------------------- */

/* Room for name or title: a name of 16, a title of 40, and parameters of some
 * 6 characters with their numbers. */
enum { TEXT = 64 + EF__MAX_PARAMETERS * (EF_NUMBER_TEXT + 8) };

typedef struct owned_metric {
  ef_metric metric; /* first: what the caller holds */
  char name[TEXT];
  char title[TEXT];
} owned_metric;

/* Writes the parameters that differ from `plain` (all of them if that is NULL);
 * false when none does. */
static bool write_settings(const ef_metric *metric, const ef_metric *plain,
                           const char *start, const char *between, char *text) {
  size_t used = strlen(text);
  bool any = false;
  for (size_t i = 0; i < ef_metric_parameter_count(metric); ++i) {
    char number[EF_NUMBER_TEXT];
    const double value = metric->parameter[i].value;
    if (plain != NULL && value == plain->parameter[i].value)
      continue;
    ef_number_format(value, number);
    const int more =
        snprintf(text + used, TEXT - used, "%s%s=%s", any ? between : start,
                 metric->parameter[i].name, number);
    used += (size_t)more;
    any = true;
  }
  return any;
}

static void set_texts(owned_metric *own, const ef_metric *plain) {
  ef_metric *const m = &own->metric;
  snprintf(own->name, TEXT, "%s", plain->name);
  snprintf(own->title, TEXT, "%s",
           plain->family != NULL ? plain->family : plain->title);
  if (!write_settings(m, plain, ":", ",", own->name))
    return; /* all as registered */
  write_settings(m, plain->family != NULL ? NULL : plain, " with ", ", ",
                 own->title);
  m->name = own->name;
  m->title = own->title;
  m->jnd = (ef_jnd){(double)NAN, "", ""};
}

ef_metric *ef_metric_new(const char *text, ef_error *error) {
  token rest = {text != NULL ? text : "", text != NULL ? strlen(text) : 0};
  const bool has_settings = memchr(rest.text, ':', rest.length) != NULL;
  const token name = cut(&rest, ':');
  const ef_metric *const plain = ef__metric_find(name.text, name.length, error);
  if (plain == NULL)
    return NULL;
  owned_metric *const own = ef__allocate(1, sizeof *own);
  if (own == NULL) {
    ef__error_memory(error, "a difference formula");
    return NULL;
  }
  own->metric = *plain;
  bool more = has_settings;
  while (more) {
    more = memchr(rest.text, ',', rest.length) != NULL;
    if (set_one(&own->metric, cut(&rest, ','), error) != EF_OK) {
      free(own);
      return NULL;
    }
  }
  set_texts(own, plain);
  return &own->metric;
}

void ef_metric_free(ef_metric *metric) {
  /* The first member: the same address as the block. */
  free(metric);
}
