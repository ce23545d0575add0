/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The answers of `describe`: as text for people, or as CSV or JSON. */
#ifndef COMMAND_RENDER_DESCRIBE_H
#define COMMAND_RENDER_DESCRIBE_H

#include <evenfield/exchange.h>

#include "describe.h"

/** Keeps what a person can read; written by describe_text_finish. */
typedef struct describe_text describe_text;
/** NULL without memory. */
describe_text *describe_text_new(void);
void describe_text_free(describe_text *t);
describe_sink describe_text_sink(describe_text *t);
ef_status describe_text_finish(describe_text *t, const describe_scene *s,
                               size_t n_skipped, ef_output *output,
                               ef_error *error);

/** Writes every row as it comes. */
typedef struct describe_data describe_data;
/** NULL and the error when it cannot start. */
describe_data *describe_data_new(const describe_scene *s, ef_output *output,
                                 bool is_csv, ef_error *error);
void describe_data_free(describe_data *d);
describe_sink describe_data_sink(describe_data *d);
ef_status describe_data_finish(describe_data *d, size_t n_skipped,
                               ef_error *error);

#endif
