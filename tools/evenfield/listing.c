/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "listing.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

void listing_text_column(listing *l, const char *key, const char *head,
                         const char *unit) {
  if (l->n_columns == LISTING_MOST_COLUMNS)
    return;
  const size_t c = l->n_columns++;
  l->column[c].key = key;
  l->column[c].head = head;
  l->column[c].unit = unit;
}

void listing_number_column(listing *l, const char *key, const char *head,
                           const char *unit, int decimals) {
  const size_t c = l->n_columns;
  if (c == LISTING_MOST_COLUMNS)
    return;
  listing_text_column(l, key, head, unit);
  l->column[c].is_number = true;
  l->column[c].decimals = decimals;
}

static void add_cell(listing *l, double number, size_t at) {
  if (l->n_cells == l->room) {
    const size_t room = 2 * l->room + 256;
    void *grown = realloc(l->cell, room * sizeof *l->cell);
    if (grown == NULL) {
      l->failed = true;
      return;
    }
    l->cell = grown;
    l->room = room;
  }
  l->cell[l->n_cells].number = number;
  l->cell[l->n_cells++].text = at;
}

void listing_text(listing *l, const char *content) {
  const size_t at = l->texts.length;
  text_add(&l->texts, content);
  text_add_end(&l->texts);
  add_cell(l, (double)NAN, at);
}

void listing_number(listing *l, double value) {
  add_cell(l, value, 0);
}

void listing_free(listing *l) {
  free(l->cell);
  text_free(&l->texts);
}

static ef_status check(const listing *l, ef_error *error) {
  if (!l->failed && !l->texts.failed)
    return EF_OK;
  return message_fail(error, EF_NO_MEMORY, "out of memory for a list");
}

static void add_text_cell(const listing *l, text_table *t, size_t i) {
  const size_t c = i % l->n_columns;
  char number[EF_NUMBER_TEXT];
  if (!l->column[c].is_number) {
    table_cell(t, l->texts.bytes + l->cell[i].text);
  } else if (l->column[c].decimals >= 0 || isnan(l->cell[i].number)) {
    table_number(t, l->cell[i].number, l->column[c].decimals);
  } else {
    ef_number_format(l->cell[i].number, number);
    table_cell(t, number);
  }
}

ef_status listing_add_text(const listing *l, text *out, ef_error *error) {
  const ef_status status = check(l, error);
  if (status != EF_OK)
    return status;
  text_table t = table_new();
  for (size_t c = 0; c < l->n_columns; ++c) {
    if (l->column[c].unit == NULL)
      continue;
    table_column(&t, l->column[c].head, l->column[c].unit,
                 !l->column[c].is_number);
  }
  for (size_t i = 0; i < l->n_cells; ++i) {
    if (l->column[i % l->n_columns].unit != NULL)
      add_text_cell(l, &t, i);
  }
  table_finish(&t, out);
  return EF_OK;
}

ef_status listing_write_csv(const listing *l, ef_csv *csv, ef_error *error) {
  const ef_status status = check(l, error);
  if (status != EF_OK)
    return status;
  for (size_t c = 0; c < l->n_columns; ++c)
    ef_csv_text(csv, l->column[c].key);
  ef_csv_end_row(csv);
  for (size_t i = 0; i < l->n_cells; ++i) {
    const size_t c = i % l->n_columns;
    if (l->column[c].is_number) {
      ef_csv_number(csv, l->cell[i].number);
    } else {
      ef_csv_text(csv, l->texts.bytes + l->cell[i].text);
    }
    if (c + 1 == l->n_columns)
      ef_csv_end_row(csv);
  }
  return EF_OK;
}

ef_status listing_write_json(const listing *l, ef_json *json, const char *key,
                             ef_error *error) {
  const ef_status status = check(l, error);
  if (status != EF_OK)
    return status;
  ef_json_begin_array(json, key);
  for (size_t i = 0; i < l->n_cells; ++i) {
    const size_t c = i % l->n_columns;
    if (c == 0)
      ef_json_begin_object(json, NULL);
    if (l->column[c].is_number) {
      ef_json_number(json, l->column[c].key, l->cell[i].number);
    } else {
      ef_json_text(json, l->column[c].key, l->texts.bytes + l->cell[i].text);
    }
    if (c + 1 == l->n_columns)
      ef_json_end_object(json);
  }
  ef_json_end_array(json);
  return EF_OK;
}
