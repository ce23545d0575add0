/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The answers of `match`: as text for people, or as CSV or JSON. */
#ifndef COMMAND_RENDER_MATCH_H
#define COMMAND_RENDER_MATCH_H

#include "match.h"
#include "record.h"
#include "text.h"

/** Keeps what a person can read and writes it at the end. */
typedef struct match_text match_text;
/** NULL without memory; `output` must outlive it. */
match_text *match_text_new(ef_output *output);
void match_text_free(match_text *t);
match_sink match_text_sink(match_text *t);

/** A target that a person reads about. */
typedef struct kept_row {
  char *name;
  size_t order; /**< in the file */
  ef_match match;
  ef_spread spread;     /**< with a population */
  double difference;    /**< rows of a long list are kept by this */
  ef_recipe_view *view; /**< owned; as of match_rows */
  ef_recipes *recipe;   /**< owned; as of match_rows */
} kept_row;

/** The first lines, and all that follows; the first is to be asked for
 * first. */
void match_text_answer(match_text *t, text *out, const match_scene *s,
                       const match_summary *sum);
void match_text_rest(match_text *t, text *out, const match_scene *s,
                     const match_summary *sum);
/** The rows that are kept, borrowed. */
size_t match_text_rows(const match_text *t, const kept_row **row);

/** With a population the sentence that says what it sees, and a table of the
 * rows, the worst first; nothing without. */
void render_match_people_answer(text *out, const match_scene *s,
                                const match_summary *sum);
void render_match_people(text *out, const match_scene *s,
                         const match_summary *sum, size_t n_rows,
                         const kept_row *row);

/** True where the answers are recipes. */
bool render_match_mixes(const match_scene *s);
/** Columns of a recipe, and the cells of the one asked for. */
void render_match_recipe_columns(text_table *t, const match_scene *s);
void render_match_recipe_cells(text_table *t, const match_scene *s,
                               const kept_row *row);
/** Tables of other lights, of the other recipe, and of how exact weighing must
 * be; nothing for displays. */
void render_match_lights(text *out, const match_scene *s, size_t n_rows,
                         const kept_row *row);
/** The same of one target as data; either may be NULL. */
void render_match_record_recipes(record *r, const match_scene *s,
                                 const ef_recipe_view *view,
                                 const ef_recipes *recipe);

/** What the answers rest on, and the gamut: the lower part of the text. */
void render_match_basis(text *out, const match_scene *s,
                        const match_summary *sum);

/** Writes a list in the text form of CGATS.17. */
typedef struct match_list match_list;
match_list *match_list_new(ef_output *output);
void match_list_free(match_list *l);
match_sink match_list_sink(match_list *l);

/** Writes every row as it comes. */
typedef struct match_data match_data;
match_data *match_data_new(ef_output *output, bool is_csv);
void match_data_free(match_data *d);
match_sink match_data_sink(match_data *d);

#endif
