/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The answer of `isolate`: as text for people, or as CSV or JSON. */
#ifndef COMMAND_RENDER_ISOLATE_H
#define COMMAND_RENDER_ISOLATE_H

#include <evenfield/exchange.h>

#include "isolate.h"
#include "record.h"
#include "text.h"

/** All of the text. */
void isolate_text_add(text *out, const isolate_scene *s,
                      const isolate_result *r);
ef_status isolate_text_write(const isolate_scene *s, const isolate_result *r,
                             ef_output *output, ef_error *error);
ef_status isolate_data_write(const isolate_scene *s, const isolate_result *r,
                             ef_output *output, bool is_csv, ef_error *error);
/** The members of the answer, into a record that is open. */
void isolate_record(record *out, const isolate_scene *s,
                    const isolate_result *r);

/** "L", "M", "S", "rods", "melanopsin". */
const char *isolate_receptor_words(size_t receptor);
/** "12.3 %", of a contrast or its size. */
void isolate_add_size(text *t, double size);
/** What is shown. */
void render_isolate_frames(text *out, const isolate_scene *s,
                           const isolate_result *r);
/** What all figures rest on. */
void render_isolate_basis(text *out, const isolate_scene *s,
                          const isolate_result *r);

#endif
