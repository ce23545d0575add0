/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What is built in, as lists; and one table with its figures. */
#ifndef COMMAND_RENDER_TABLES_H
#define COMMAND_RENDER_TABLES_H

#include <evenfield/exchange.h>

#include "listing.h"

/** A list that `tables NAME` prints. */
typedef struct catalogue {
  const char *name;
  const char *what; /**< the first line of its text, a phrase */
  const char *use;  /**< the last line of its text */
  ef_status (*fill)(listing *l, ef_error *error);
} catalogue;

/** tables, observers, illuminants, metrics, encodings, demo; the first is what
 * `tables` alone prints. */
size_t catalogue_all(const catalogue **catalogues);

/** NULL when there is none of that name. */
const catalogue *catalogue_find(const char *name);

ef_status render_catalogue(const catalogue *c, int format, ef_output *output,
                           ef_error *error);
ef_status render_table(const ef_table *table, int format, ef_output *output,
                       ef_error *error);
/** File `i` of the demo scenario: as it stands, or as JSON. */
ef_status render_demo(size_t i, int format, ef_output *output, ef_error *error);

#endif
