/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The answers of `compare`: as text for people, or as CSV or JSON. */
#ifndef COMMAND_RENDER_COMPARE_H
#define COMMAND_RENDER_COMPARE_H

#include <evenfield/exchange.h>

#include "compare.h"
#include "text.h"

/** Expected share of right answers in the task that --task names. */
const ef_estimate *compare_correct(const compare_scene *s,
                                   const ef_told_apart *told);

/** Keeps what a person can read; written by compare_text_finish. */
typedef struct compare_text compare_text;
/** NULL without memory. */
compare_text *compare_text_new(void);
void compare_text_free(compare_text *t);
compare_sink compare_text_sink(compare_text *t);
/** All of the text; the kept pairs are then sorted, the worst first. */
void compare_text_add(compare_text *t, text *out, const compare_scene *s,
                      const compare_count *count);
ef_status compare_text_finish(compare_text *t, const compare_scene *s,
                              const compare_count *count, ef_output *output,
                              ef_error *error);
/** As given, or with two decimals where a JND was converted. */
void compare_tolerance_words(const compare_scene *s,
                             char words[EF_NUMBER_TEXT]);
/** "What this rests on", the last part of the text. */
void compare_basis(text *out, const compare_scene *s,
                   const compare_count *count);

/** Writes every pair as it comes: an object in JSON, and in CSV a row for each
 * look and angle. */
typedef struct compare_data compare_data;
/** NULL and the error when it cannot start. */
compare_data *compare_data_new(const compare_scene *s, ef_output *output,
                               bool is_csv, ef_error *error);
void compare_data_free(compare_data *d);
compare_sink compare_data_sink(compare_data *d);
ef_status compare_data_finish(compare_data *d, const compare_scene *s,
                              const compare_count *count, ef_error *error);

#endif
