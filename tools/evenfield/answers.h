/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A panel's answers from a table: single trials, or counts at each level. */
#ifndef COMMAND_ANSWERS_H
#define COMMAND_ANSWERS_H

#include <evenfield/exchange.h>
#include <evenfield/panel.h>

#define ANSWERS_UNIT_ROOM 64

/** Names in the order in which they first stand in the file. */
typedef struct name_list {
  size_t n;
  char **name;
} name_list;

/** Place of `name`, which is added when it is new; SIZE_MAX without memory. */
size_t name_list_place(name_list *list, const char *name);
void name_list_free(name_list *list);

/** Where the difference was shown, of two places. */
typedef enum answer_place {
  PLACE_UNKNOWN,
  PLACE_FIRST,
  PLACE_SECOND
} answer_place;

/** Rows as they stand in the file: a trial (shown 1) or a count each. */
typedef struct answers {
  const char *file;
  ef_task task;
  char unit[ANSWERS_UNIT_ROOM]; /**< of the levels, "" if not said */
  bool has_observer, has_condition, has_place, is_counted;
  bool by_pair; /**< pairs are named, levels follow from their colours */
  name_list observers, conditions, pairs;
  size_t n;
  size_t *line, *observer, *condition, *pair, *shown, *positive;
  double *level;
  answer_place *place;
} answers;

/** What a table must and may hold. */
typedef struct answers_need {
  const char *task;  /**< --task or NULL: what the column `task` says */
  bool by_pair;      /**< a column `pair` in the place of `level` */
} answers_need;

/** Columns `level` (or `pair`), then `answer` or `n` and `k`; `observer`,
 * `condition`, `place` and `task` where they are known. Answers in the words of
 * the task or as 1 and 0; with `place`, 2IFC answers may name the place that
 * was chosen. A table without rows is EF_MALFORMED unless `may_be_empty`. Free
 * with answers_free in every case. */
ef_status answers_read(answers *a, const char *path, const answers_need *need,
                       bool may_be_empty, const ef_notes *notes,
                       ef_error *error);
void answers_free(answers *a);

/** Name of an observer or condition, "" where the file has none. */
const char *answers_observer(const answers *a, size_t observer);
const char *answers_condition(const answers *a, size_t condition);

#endif
