/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The answers of `ellipse`: as text for people, or as CSV or JSON. */
#ifndef COMMAND_RENDER_ELLIPSE_H
#define COMMAND_RENDER_ELLIPSE_H

#include <evenfield/exchange.h>

#include "ellipse.h"
#include "text.h"

#define ELLIPSE_SIZE_ROOM 100

/** "one JND", "3 JND", "1.5 Delta E*00", "one standard deviation", "5 steps".
 */
void ellipse_size_words(const ellipse_scene *s, char words[ELLIPSE_SIZE_ROOM]);
/** What the plane figure is: "section: the colours of the same luminance ..."
 */
const char *ellipse_figure_words(const ellipse_scene *s);
/** Where the ellipses come from, with the published source. */
const char *ellipse_source_words(const ellipse_scene *s);

/** Keeps what a person can read; written by ellipse_text_finish. */
typedef struct ellipse_text ellipse_text;
/** NULL without memory. */
ellipse_text *ellipse_text_new(void);
void ellipse_text_free(ellipse_text *t);
ellipse_sink ellipse_text_sink(ellipse_text *t);
/** All of the text. */
void ellipse_text_add(const ellipse_text *t, text *out, const ellipse_scene *s,
                      const ellipse_count *n);
/** The rows that are kept, borrowed. */
size_t ellipse_text_rows(const ellipse_text *t, const ellipse_row **row);
ef_status ellipse_text_finish(ellipse_text *t, const ellipse_scene *s,
                              const ellipse_count *count, ef_output *output,
                              ef_error *error);

/** Writes every row as it comes. */
typedef struct ellipse_data ellipse_data;
/** NULL and the error when it cannot start. */
ellipse_data *ellipse_data_new(const ellipse_scene *s, ef_output *output,
                               bool is_csv, ef_error *error);
void ellipse_data_free(ellipse_data *d);
ellipse_sink ellipse_data_sink(ellipse_data *d);
ef_status ellipse_data_finish(ellipse_data *d, const ellipse_count *count,
                              ef_error *error);

#endif
