/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Writes one table in the text form of CGATS.17 and ISO 28178. Rows are held
 * until the end, as their number stands before them. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

typedef struct buffer {
  char *bytes;
  size_t length, room;
} buffer;

struct ef_cgats {
  ef_output *output;
  buffer preamble, fields, rows;
  size_t n_fields, n_rows, n_items;
  ef_status status; /* of the first failure */
  ef_error error;
};

/* ---- Bytes ------------------------------------------------------------- */

static void put(ef_cgats *c, buffer *b, const char *bytes, size_t length) {
  if (c->status != EF_OK) return;
  if (b->room - b->length < length) {
    const size_t room = 2 * b->room + length + 256;
    char *const grown = ef__reallocate(b->bytes, room, 1);
    if (grown == NULL) {
      c->status = ef__error_memory(&c->error, "a table");
      return;
    }
    b->bytes = grown;
    b->room = room;
  }
  memcpy(b->bytes + b->length, bytes, length);
  b->length += length;
}

static void put_text(ef_cgats *c, buffer *b, const char *text) {
  put(c, b, text, strlen(text));
}

/* A string in quotes; what cannot stand between them goes. */
static void put_string(ef_cgats *c, buffer *b, const char *text) {
  put(c, b, "\"", 1);
  for (; *text != '\0'; ++text) {
    const bool is_control = (unsigned char)*text < 0x20u || *text == 0x7f;
    const char plain = *text == '"' ? '\'' : is_control ? ' ' : *text;
    put(c, b, &plain, 1);
  }
  put(c, b, "\"", 1);
}

static void put_count(ef_cgats *c, buffer *b, const char *keyword, size_t n) {
  char number[EF_NUMBER_TEXT];
  put_text(c, b, keyword);
  put(c, b, " ", 1);
  put(c, b, number, ef_number_format((double)n, number));
  put(c, b, "\n", 1);
}

/* ---- The writer -------------------------------------------------------- */

ef_cgats *ef_cgats_new(ef_output *output, ef_error *error) {
  ef_cgats *const c = ef__allocate_zeroed(1, sizeof *c);
  if (c == NULL) {
    ef__error_memory(error, "a table");
    return NULL;
  }
  c->output = output;
  return c;
}

void ef_cgats_keyword(ef_cgats *c, const char *keyword, const char *value) {
  put_text(c, &c->preamble, keyword);
  put(c, &c->preamble, " ", 1);
  put_string(c, &c->preamble, value);
  put(c, &c->preamble, "\n", 1);
}

/* Names with a wavelength in them are none of the standard's own: they are
 * announced. */
void ef_cgats_field(ef_cgats *c, const char *name) {
  static const char spectral[] = "SPECTRAL_NM";
  const size_t length = sizeof spectral - 1;
  if (strncmp(name, spectral, length) == 0 && name[length] != '\0') {
    put_text(c, &c->preamble, "KEYWORD ");
    put_string(c, &c->preamble, name);
    put(c, &c->preamble, "\n", 1);
  }
  if (c->n_fields > 0) put(c, &c->fields, c->n_fields % 8 == 0 ? "\n" : " ", 1);
  put_text(c, &c->fields, name);
  ++c->n_fields;
}

/* Ten items of all digits keep to the 240 characters of a line. */
static void begin_item(ef_cgats *c) {
  if (c->n_items > 0) put(c, &c->rows, c->n_items % 10 == 0 ? "\n" : " ", 1);
  ++c->n_items;
}

void ef_cgats_text(ef_cgats *c, const char *text) {
  begin_item(c);
  put_string(c, &c->rows, text);
}

void ef_cgats_number(ef_cgats *c, double value) {
  char text[EF_NUMBER_TEXT];
  begin_item(c);
  if (!isfinite(value) && c->status == EF_OK) {
    c->status = ef__error_set(&c->error, EF_INVALID,
                              "item %zu of row %zu is no finite number, and "
                              "this form has no empty items",
                              c->n_items, c->n_rows + 1);
  }
  put(c, &c->rows, text, ef_number_format(value, text));
}

void ef_cgats_end_row(ef_cgats *c) {
  if (c->n_items != c->n_fields && c->status == EF_OK) {
    c->status = ef__error_set(&c->error, EF_INVALID,
                              "row %zu has %zu items for %zu fields",
                              c->n_rows + 1, c->n_items, c->n_fields);
  }
  put(c, &c->rows, "\n", 1);
  c->n_items = 0;
  ++c->n_rows;
}

static void put_all(ef_cgats *c, buffer *whole) {
  put_text(c, whole, "CGATS.17\n");
  put(c, whole, c->preamble.bytes, c->preamble.length);
  put_count(c, whole, "NUMBER_OF_FIELDS", c->n_fields);
  put_text(c, whole, "BEGIN_DATA_FORMAT\n");
  put(c, whole, c->fields.bytes, c->fields.length);
  put_text(c, whole, "\nEND_DATA_FORMAT\n");
  put_count(c, whole, "NUMBER_OF_SETS", c->n_rows);
  put_text(c, whole, "BEGIN_DATA\n");
}

ef_status ef_cgats_finish(ef_cgats *c, ef_error *error) {
  if (c == NULL) return EF_OK;
  buffer whole = {0};
  if (c->n_items > 0) ef_cgats_end_row(c);
  put_all(c, &whole);
  if (c->status == EF_OK) {
    c->status =
        ef_output_write(c->output, whole.bytes, whole.length, &c->error);
  }
  if (c->status == EF_OK && c->rows.length > 0) {
    c->status = ef_output_write(c->output, c->rows.bytes, c->rows.length,
                                &c->error);
  }
  if (c->status == EF_OK) {
    c->status = ef_output_text(c->output, "END_DATA\n", &c->error);
  }
  const ef_status status = c->status;
  if (status != EF_OK && error != NULL) *error = c->error;
  free(whole.bytes);
  ef_cgats_discard(c);
  return status;
}

void ef_cgats_discard(ef_cgats *c) {
  if (c == NULL) return;
  free(c->preamble.bytes);
  free(c->fields.bytes);
  free(c->rows.bytes);
  free(c);
}
