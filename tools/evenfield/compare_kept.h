/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The pairs that the text of `compare` tells of, and pieces of its sentences.
 */
#ifndef COMMAND_COMPARE_KEPT_H
#define COMMAND_COMPARE_KEPT_H

#include "render_compare.h"
#include "text.h"

/** A pair with what it points to. */
typedef struct kept_pair {
  compared pair;
  void *block; /**< owned: all it points to */
  size_t order;
  double difference; /**< the worst */
} kept_pair;

struct compare_text {
  kept_pair *row;
  size_t n_rows, n_seen;
  bool worst_only;
  text reasons; /**< of what could not be computed, wrapped */
  size_t n_reasons;
};

/* ---- Parts of the text (compare_answer.c, compare_tables.c,
 * compare_words.c) ------------------------------------------------------- */

/** First lines: who tells the most different pair apart, how many pairs stay
 * within the tolerance. */
void compare_add_answer(text *out, const compared *worst,
                        const compare_scene *s, const compare_count *n);
/** Differences, who tells them apart, metamerism: a row a pair and angle. */
void compare_add_tables(text *out, const compare_text *t,
                        const compare_scene *s, const compare_count *n);
/** The rows, most different first, in words. */
void compare_add_readings(text *out, const compare_text *t,
                          const compare_scene *s, const compare_count *n);
/** What --worst-case found. */
void compare_add_worst_cases(text *out, const compare_scene *s);

/* ---- Pieces of sentences ----------------------------------------------- */

/** The sample, and its standard where a list pairs them. */
void compare_add_names(text *out, const compare_scene *s, const compared *c);
/** "about 38 % of customers", "hardly any", "nearly all": no false precision.
 */
void compare_add_share(text *out, double share, const char *about,
                       const char *of);
/** "1.52 Delta E*00 (1.9 JND)" */
void compare_add_difference(text *out, const compare_scene *s, double value);

#endif
