/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A list with columns, written in any of the formats. */
#ifndef COMMAND_LISTING_H
#define COMMAND_LISTING_H

#include <evenfield/exchange.h>

#include "option.h"
#include "text.h"

#define LISTING_MOST_COLUMNS 80

/** Columns are defined first, then cells are added row after row. */
typedef struct listing {
  size_t n_columns;
  struct {
    const char *key;  /**< in CSV and JSON; borrowed */
    const char *head; /**< in text; NULL: that of the column before */
    const char *unit; /**< below it; NULL: not shown in text */
    bool is_number;
    int decimals; /**< in text; -1: all digits */
  } column[LISTING_MOST_COLUMNS];
  size_t n_cells, room;
  struct {
    double number;
    size_t text; /**< where in `texts` */
  } * cell;
  text texts;
  bool failed;
} listing;

void listing_text_column(listing *l, const char *key, const char *head,
                         const char *unit);
void listing_number_column(listing *l, const char *key, const char *head,
                           const char *unit, int decimals);
void listing_text(listing *l, const char *content);
void listing_number(listing *l, double value);
/** Free with listing_free in every case. */
void listing_free(listing *l);

/** As text: the table alone. EF_NO_MEMORY when a cell was lost. */
ef_status listing_add_text(const listing *l, text *out, ef_error *error);
/** As CSV rows. */
ef_status listing_write_csv(const listing *l, ef_csv *csv, ef_error *error);
/** As a JSON array of objects under `key`. */
ef_status listing_write_json(const listing *l, ef_json *json, const char *key,
                             ef_error *error);

#endif
