/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One JSON document (RFC 8259), written as it comes: members of an object on
 * lines of their own, plain values of an array in one line. */
#include "exchange/exchange_private.h"

#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

enum { DEEPEST = 64 };

typedef struct level {
  bool is_object;
  bool is_empty;
  bool is_broken; /* over several lines */
} level;

struct ef_json {
  ef_output *output;
  size_t depth;
  size_t outer;   /* of a part: the levels of the document around it */
  bool has_top; /* the one value of the document was begun */
  level levels[DEEPEST];
  ef_status status; /* of the first failure */
  ef_error error;
};

ef_json *ef_json_new(ef_output *output, ef_error *error) {
  ef_json *const json = ef__allocate_zeroed(1, sizeof *json);
  if (json == NULL) {
    ef__error_memory(error, "JSON");
    return NULL;
  }
  json->output = output;
  return json;
}

ef_json *ef_json_new_elements(ef_output *output, size_t depth,
                              ef_error *error) {
  if (depth == 0 || depth >= DEEPEST) {
    ef__error_set(error, EF_INVALID, "JSON: no array lies %zu deep", depth);
    return NULL;
  }
  ef_json *const json = ef_json_new(output, error);
  if (json == NULL) return NULL;
  json->has_top = true;
  json->depth = json->outer = depth;
  json->levels[depth - 1] = (level){false, true, false};
  return json;
}

static void put(ef_json *json, const char *bytes, size_t length) {
  if (json->status != EF_OK) return;
  json->status = ef_output_write(json->output, bytes, length, &json->error);
}

static void put_text(ef_json *json, const char *text) {
  put(json, text, strlen(text));
}

/* The caller broke the nesting: kept like a failure of the output. */
static void refuse(ef_json *json, const char *what) {
  if (json->status != EF_OK) return;
  json->status = ef__error_set(&json->error, EF_INVALID, "JSON: %s", what);
}

static void break_line(ef_json *json) {
  put(json, "\n", 1);
  for (size_t i = 0; i < json->depth; ++i) put(json, "  ", 2);
}

/* ---- Text -------------------------------------------------------------- */

/* Bytes of the UTF-8 character at `text`; 0 when it is none (also overlong
 * forms, surrogates, beyond U+10FFFF; Unicode, table 3-7). */
static size_t character_length(const unsigned char *text) {
  const unsigned char lead = text[0];
  if (lead < 0x80u) return 1;
  const size_t n = lead >= 0xF0u ? 4 : lead >= 0xE0u ? 3 : 2;
  if (lead < 0xC2u || lead > 0xF4u) return 0;
  for (size_t i = 1; i < n; ++i) {
    if ((text[i] & 0xC0u) != 0x80u) return 0; /* the terminator as well */
  }
  const unsigned char second = text[1];
  if ((lead == 0xE0u && second < 0xA0u) || (lead == 0xEDu && second > 0x9Fu) ||
      (lead == 0xF0u && second < 0x90u) || (lead == 0xF4u && second > 0x8Fu)) {
    return 0;
  }
  return n;
}

static void put_escaped(ef_json *json, unsigned char c) {
  char text[8];
  switch (c) {
  case '"': put_text(json, "\\\""); return;
  case '\\': put_text(json, "\\\\"); return;
  case '\n': put_text(json, "\\n"); return;
  case '\r': put_text(json, "\\r"); return;
  case '\t': put_text(json, "\\t"); return;
  default: break;
  }
  snprintf(text, sizeof text, "\\u%04x", (unsigned)c);
  put_text(json, text);
}

static void put_string(ef_json *json, const char *string) {
  const unsigned char *at = (const unsigned char *)string;
  put(json, "\"", 1);
  while (*at != '\0') {
    const unsigned char *const plain = at;
    size_t length = 1;
    while (*at >= 0x20u && *at != '"' && *at != '\\') {
      length = character_length(at);
      if (length == 0) break;
      at += length;
    }
    put(json, (const char *)plain, (size_t)(at - plain));
    if (*at == '\0') break;
    if (length == 0) {
      put_text(json, "\xEF\xBF\xBD"); /* U+FFFD */
    } else {
      put_escaped(json, *at);
    }
    ++at;
  }
  put(json, "\"", 1);
}

/* ---- Nesting ----------------------------------------------------------- */

/* What stands before a value: comma, line break, key. */
static void begin_value(ef_json *json, const char *key, bool is_container) {
  if (json->depth == 0) {
    if (json->has_top) refuse(json, "a second value outside all others");
    if (key != NULL) refuse(json, "a key outside all objects");
    json->has_top = true;
    return;
  }
  level *const at = &json->levels[json->depth - 1];
  if (at->is_object && key == NULL) refuse(json, "a value without key");
  if (!at->is_object && key != NULL) refuse(json, "a key in an array");
  if (json->status != EF_OK) return;
  if (!at->is_empty) put(json, ",", 1);
  if (at->is_object || is_container || at->is_broken) {
    at->is_broken = true;
    break_line(json);
  } else if (!at->is_empty) {
    put(json, " ", 1);
  }
  at->is_empty = false;
  if (!at->is_object) return;
  put_string(json, key);
  put(json, ": ", 2);
}

static void begin(ef_json *json, const char *key, bool is_object) {
  if (json->depth == DEEPEST) refuse(json, "nested too deep");
  begin_value(json, key, true);
  if (json->status != EF_OK) return;
  json->levels[json->depth++] = (level){is_object, true, false};
  put(json, is_object ? "{" : "[", 1);
}

static void end(ef_json *json, bool is_object) {
  if (json->status != EF_OK) return;
  if (json->depth == json->outer ||
      json->levels[json->depth - 1].is_object != is_object) {
    refuse(json, "an end without its beginning");
    return;
  }
  const bool is_broken = json->levels[--json->depth].is_broken;
  if (is_broken) break_line(json);
  put(json, is_object ? "}" : "]", 1);
}

void ef_json_begin_object(ef_json *json, const char *key) {
  begin(json, key, true);
}

void ef_json_end_object(ef_json *json) {
  end(json, true);
}

void ef_json_begin_array(ef_json *json, const char *key) {
  begin(json, key, false);
}

void ef_json_end_array(ef_json *json) {
  end(json, false);
}

void ef_json_elements(ef_json *json, const char *bytes, size_t length) {
  if (json->depth == 0 || json->levels[json->depth - 1].is_object) {
    refuse(json, "elements outside all arrays");
  }
  if (json->status != EF_OK || length == 0) return;
  level *const at = &json->levels[json->depth - 1];
  if (!at->is_empty) put(json, ",", 1);
  if (bytes[0] == '\n') {
    at->is_broken = true; /* containers bring their line break */
  } else if (at->is_broken) {
    break_line(json);
  } else if (!at->is_empty) {
    put(json, " ", 1);
  }
  at->is_empty = false;
  put(json, bytes, length);
}

/* ---- Plain values ------------------------------------------------------ */

void ef_json_text(ef_json *json, const char *key, const char *text) {
  begin_value(json, key, false);
  if (text != NULL) {
    put_string(json, text);
  } else {
    put_text(json, "null");
  }
}

void ef_json_number(ef_json *json, const char *key, double value) {
  char text[EF_NUMBER_TEXT];
  begin_value(json, key, false);
  if (!isfinite(value)) {
    put_text(json, "null");
  } else if (value == 0 && signbit(value)) {
    put_text(json, "-0.0"); /* -0 would be read as a whole number */
  } else {
    put(json, text, ef_number_format(value, text));
  }
}

void ef_json_integer(ef_json *json, const char *key, int64_t value) {
  char text[24];
  begin_value(json, key, false);
  snprintf(text, sizeof text, "%" PRId64, value);
  put_text(json, text);
}

void ef_json_boolean(ef_json *json, const char *key, bool value) {
  begin_value(json, key, false);
  put_text(json, value ? "true" : "false");
}

void ef_json_null(ef_json *json, const char *key) {
  begin_value(json, key, false);
  put_text(json, "null");
}

ef_status ef_json_finish(ef_json *json, ef_error *error) {
  if (json == NULL) return EF_OK;
  if (json->depth > json->outer)
    refuse(json, "an object or array does not end");
  if (!json->has_top) refuse(json, "there is no value");
  if (json->outer == 0) put(json, "\n", 1);
  const ef_status status = json->status;
  if (status != EF_OK && error != NULL) *error = json->error;
  free(json);
  return status;
}
