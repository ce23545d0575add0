/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts and JSON documents held whole. JSON is read by jansson. */
#include "exchange/exchange_private.h"

#include <stdlib.h>
#include <string.h>

#include <jansson.h>

#include "base/base_private.h"

/* ---- Texts ------------------------------------------------------------- */

static ef_status too_long(const ef__input *input, size_t most_bytes,
                          ef_error *error) {
  ef__error_set(error, EF_MALFORMED,
                "holds more than %zu bytes, which is the most here; is it the "
                "right file?",
                most_bytes);
  return ef__error_place(error, input->name, 0, 0, NULL);
}

static char *read_whole(ef__input *input, size_t most_bytes, size_t *length,
                        ef_error *error) {
  while (!input->at_end) {
    if (ef__input_more(input, error) != EF_OK) return NULL;
    if (input->end - input->begin > most_bytes) {
      too_long(input, most_bytes, error);
      return NULL;
    }
  }
  *length = input->end - input->begin;
  char *const text = ef__copy_text(input->buffer + input->begin, *length);
  if (text == NULL) ef__error_memory(error, "a text");
  return text;
}

char *ef_text_read(const char *path, size_t most_bytes, size_t *length,
                   ef_error *error) {
  ef__span demo;
  switch (ef__demo_find(path, &demo, error)) {
  case EF__DEMO_UNKNOWN:
    return NULL;
  case EF__DEMO_FOUND: {
    char *const text = ef__copy_text(demo.text, demo.length);
    *length = demo.length;
    if (text == NULL) ef__error_memory(error, "a text");
    return text;
  }
  case EF__DEMO_NONE:
    break;
  }
  ef__input *const input = ef__input_open(path, error);
  if (input == NULL) return NULL;
  char *const text = read_whole(input, most_bytes, length, error);
  ef__input_free(input);
  return text;
}

/* ---- JSON -------------------------------------------------------------- */

struct ef_document {
  json_t *top;
};

ef_document *ef_document_from_text(const char *name, const char *text,
                                   size_t length, ef_error *error) {
  json_error_t fault;
  ef_document *const document = ef__allocate_zeroed(1, sizeof *document);
  if (document == NULL) {
    ef__error_memory(error, "a document");
    return NULL;
  }
  document->top = json_loadb(text, length, JSON_REJECT_DUPLICATES, &fault);
  if (document->top != NULL) return document;
  free(document);
  if (json_error_code(&fault) == json_error_out_of_memory) {
    ef__error_memory(error, "a document");
    return NULL;
  }
  ef__error_set(error, EF_MALFORMED, "is no JSON (RFC 8259): %s", fault.text);
  ef__error_place(error, name, fault.line > 0 ? (size_t)fault.line : 0, 0,
                  NULL);
  return NULL;
}

ef_document *ef_document_read(const char *path, size_t most_bytes,
                              ef_error *error) {
  size_t length;
  char *const text = ef_text_read(path, most_bytes, &length, error);
  if (text == NULL) return NULL;
  ef_document *const document = ef_document_from_text(
      strcmp(path, "-") == 0 ? "standard input" : path, text, length, error);
  free(text);
  return document;
}

void ef_document_free(ef_document *document) {
  if (document == NULL) return;
  json_decref(document->top);
  free(document);
}

/* An index of an array: digits without a leading zero. */
static const json_t *element(const json_t *array, const char *token,
                             size_t length) {
  size_t index = 0;
  if (length == 0 || length > 9 || (token[0] == '0' && length > 1)) return NULL;
  for (size_t i = 0; i < length; ++i) {
    if (token[i] < '0' || token[i] > '9') return NULL;
    index = 10 * index + (size_t)(token[i] - '0');
  }
  return json_array_get(array, index);
}

static const json_t *member(const json_t *object, const char *token,
                            size_t length) {
  char key[256];
  size_t n = 0;
  for (size_t i = 0; i < length; ++i) {
    char c = token[i];
    if (c == '~' && i + 1 < length) c = token[++i] == '1' ? '/' : '~';
    if (n + 1 == sizeof key) return NULL;
    key[n++] = c;
  }
  key[n] = '\0';
  return json_object_get(object, key);
}

/* RFC 6901; NULL when nothing is there. */
static const json_t *find(const ef_document *document, const char *pointer) {
  const json_t *at = document->top;
  while (at != NULL && *pointer == '/') {
    const char *const token = pointer + 1;
    const size_t length = strcspn(token, "/");
    if (json_is_array(at)) {
      at = element(at, token, length);
    } else {
      at = json_is_object(at) ? member(at, token, length) : NULL;
    }
    pointer = token + length;
  }
  return *pointer == '\0' ? at : NULL;
}

const char *ef_document_text(const ef_document *document, const char *pointer,
                             size_t *length) {
  const json_t *const value = find(document, pointer);
  if (value == NULL || !json_is_string(value)) return NULL;
  if (length != NULL) *length = json_string_length(value);
  return json_string_value(value);
}

size_t ef_document_count(const ef_document *document, const char *pointer) {
  const json_t *const value = find(document, pointer);
  if (value == NULL) return 0;
  return json_is_array(value) ? json_array_size(value)
                              : json_object_size(value);
}
