/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "answers.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

/* ---- Names ------------------------------------------------------------- */

size_t name_list_place(name_list *list, const char *name) {
  /* Rows of one observer mostly follow each other. */
  for (size_t i = list->n; i-- > 0;) {
    if (strcmp(list->name[i], name) == 0)
      return i;
  }
  char *copy = strdup(name);
  char **grown = realloc(list->name, (list->n + 1) * sizeof *grown);
  if (grown != NULL)
    list->name = grown;
  if (copy == NULL || grown == NULL) {
    free(copy);
    return SIZE_MAX;
  }
  list->name[list->n] = copy;
  return list->n++;
}

void name_list_free(name_list *list) {
  for (size_t i = 0; i < list->n; ++i)
    free(list->name[i]);
  free(list->name);
  *list = (name_list){0};
}

/* ---- Columns ----------------------------------------------------------- */

enum {
  STIMULUS, /* level or pair */
  ANSWER,
  SHOWN,
  POSITIVE,
  OBSERVER,
  CONDITION,
  PLACE,
  TASK,
  N_FIELDS
};
static const char *const columns[N_FIELDS] = {
    "level", "answer", "n", "k", "observer", "condition", "place", "task"};

typedef struct row_reader {
  answers *answers;
  const answers_need *need;
  ef_fields *fields;
  const char *const *text;
  bool task_is_known;
  size_t room;
} row_reader;

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the answers");
}

static ef_status check_columns(row_reader *r, ef_error *error) {
  answers *a = r->answers;
  const bool has_answer = ef_fields_has(r->fields, ANSWER);
  const bool has_n = ef_fields_has(r->fields, SHOWN);
  const bool has_k = ef_fields_has(r->fields, POSITIVE);
  a->has_observer = ef_fields_has(r->fields, OBSERVER);
  a->has_condition = ef_fields_has(r->fields, CONDITION);
  a->has_place = ef_fields_has(r->fields, PLACE);
  a->is_counted = !has_answer;
  if (has_answer && (has_n || has_k)) {
    message_fail(error, EF_MALFORMED,
                 "there are columns answer and %s: a row is one trial (answer) "
                 "or a count (n shown, k of them positive); keep one kind",
                 has_n ? "n" : "k");
    return message_place(error, a->file);
  }
  if (!has_answer && !(has_n && has_k)) {
    message_fail(error, EF_MALFORMED,
                 "there is no column %s; a row is one trial (column answer) or "
                 "a count (columns n, trials shown, and k, positive answers)",
                 has_n   ? "k beside n"
                 : has_k ? "n beside k"
                         : "answer");
    return message_place(error, a->file);
  }
  return EF_OK;
}

/* ---- Task -------------------------------------------------------------- */

static ef_status ask_for_task(const answers *a, ef_error *error) {
  return message_fail(error, EF_UNKNOWN_NAME,
                      "--task says what was asked in %.200s: yes-no, 2ifc, "
                      "same-different, triangle or greater-less",
                      a->file);
}

/* One file, one task: thresholds of different tasks are different things. */
static ef_status read_task(row_reader *r, ef_error *error) {
  answers *a = r->answers;
  if (!ef_fields_has(r->fields, TASK))
    return r->task_is_known ? EF_OK : ask_for_task(a, error);
  ef_task task;
  const char *typed = r->text[TASK];
  ef_error reason;
  if (ef_task_find(typed, &task, &reason) != EF_OK)
    return ef_fields_fault(r->fields, TASK, error, "%s", reason.message);
  if (!r->task_is_known) {
    a->task = task;
    r->task_is_known = true;
    return EF_OK;
  }
  if (task == a->task)
    return EF_OK;
  return ef_fields_fault(
      r->fields, TASK, error,
      "found '%s', expected '%s' as %s: thresholds of different tasks do not "
      "go together; split the file",
      ef_task_name(task), ef_task_name(a->task),
      r->need->task != NULL ? "--task says" : "in the rows above");
}

/* ---- Answers ----------------------------------------------------------- */

static const char *const positive_words[][4] = {
    [EF_TASK_YES_NO] = {"yes", NULL, NULL, NULL},
    [EF_TASK_2IFC] = {"right", "correct", NULL, NULL},
    [EF_TASK_SAME_DIFFERENT] = {"different", NULL, NULL, NULL},
    [EF_TASK_TRIANGLE] = {"right", "correct", NULL, NULL},
    [EF_TASK_GREATER_LESS] = {"greater", "more", NULL, NULL}};
static const char *const negative_words[][4] = {
    [EF_TASK_YES_NO] = {"no", NULL, NULL, NULL},
    [EF_TASK_2IFC] = {"wrong", "incorrect", NULL, NULL},
    [EF_TASK_SAME_DIFFERENT] = {"same", NULL, NULL, NULL},
    [EF_TASK_TRIANGLE] = {"wrong", "incorrect", NULL, NULL},
    [EF_TASK_GREATER_LESS] = {"less", NULL, NULL, NULL}};

static bool is_one_of(const char *typed, const char *const *words) {
  for (size_t i = 0; words[i] != NULL; ++i) {
    if (strcmp(typed, words[i]) == 0)
      return true;
  }
  return false;
}

static bool find_place(const char *typed, answer_place *place) {
  const bool is_first =
      strcmp(typed, "first") == 0 || strcmp(typed, "left") == 0;
  const bool is_second =
      strcmp(typed, "second") == 0 || strcmp(typed, "right") == 0;
  *place = is_first ? PLACE_FIRST : is_second ? PLACE_SECOND : PLACE_UNKNOWN;
  return is_first || is_second;
}

static ef_status read_place(row_reader *r, size_t i, ef_error *error) {
  answers *a = r->answers;
  a->place[i] = PLACE_UNKNOWN;
  if (!a->has_place || find_place(r->text[PLACE], &a->place[i]))
    return EF_OK;
  return ef_fields_fault(r->fields, PLACE, error,
                         "found '%.60s', expected first or second (or left or "
                         "right): where the difference was shown",
                         r->text[PLACE]);
}

/* The answer names a place. "right" is a right answer: where the places are
 * sides, read_answer has refused it. */
static bool names_place(const row_reader *r, const char *typed,
                        answer_place *chosen) {
  const answers *a = r->answers;
  return a->has_place && a->task == EF_TASK_2IFC &&
         strcmp(typed, "right") != 0 && find_place(typed, chosen);
}

static bool is_side(const char *typed) {
  return strcmp(typed, "left") == 0 || strcmp(typed, "right") == 0;
}

static ef_status read_answer(row_reader *r, size_t i, ef_error *error) {
  answers *a = r->answers;
  const char *typed = r->text[ANSWER];
  const char *const *yes = positive_words[a->task];
  const char *const *no = negative_words[a->task];
  answer_place chosen;
  a->shown[i] = 1;
  if (a->has_place && is_side(r->text[PLACE]) && is_side(typed)) {
    return ef_fields_fault(r->fields, ANSWER, error,
                           "'%s' may be a side or a right answer: name the "
                           "places first and second, or answer right and wrong "
                           "as 1 and 0",
                           typed);
  }
  if (names_place(r, typed, &chosen)) {
    a->positive[i] = chosen == a->place[i];
    return EF_OK;
  }
  a->positive[i] = strcmp(typed, "1") == 0 || is_one_of(typed, yes);
  if (a->positive[i] == 1 || strcmp(typed, "0") == 0 || is_one_of(typed, no))
    return EF_OK;
  return ef_fields_fault(r->fields, ANSWER, error,
                         "found '%.60s', expected %s or %s (or 1 or 0)%s",
                         typed, yes[0], no[0],
                         typed[0] == '\0' ? "; leave out trials without an "
                                            "answer"
                                          : "");
}

/* ---- Counts ------------------------------------------------------------ */

static ef_status read_whole(row_reader *r, size_t field, size_t *count,
                            ef_error *error) {
  double value;
  const ef_status status = ef_fields_number(r->fields, field, &value, error);
  if (status != EF_OK)
    return status;
  if (!(value >= 0 && value <= 1e9) || value != floor(value)) {
    return ef_fields_fault(r->fields, field, error,
                           "found '%.60s', expected a whole number of trials",
                           r->text[field]);
  }
  *count = (size_t)value;
  return EF_OK;
}

static ef_status read_counts(row_reader *r, size_t i, ef_error *error) {
  answers *a = r->answers;
  ef_status status = read_whole(r, SHOWN, &a->shown[i], error);
  if (status == EF_OK)
    status = read_whole(r, POSITIVE, &a->positive[i], error);
  if (status != EF_OK)
    return status;
  if (a->shown[i] == 0) {
    return ef_fields_fault(r->fields, SHOWN, error,
                           "n is 0: a level without answers says nothing; "
                           "leave the row out");
  }
  if (a->positive[i] <= a->shown[i])
    return EF_OK;
  return ef_fields_fault(r->fields, POSITIVE, error,
                         "k is %zu and n is %zu: more answers are positive "
                         "than were given",
                         a->positive[i], a->shown[i]);
}

/* ---- Rows -------------------------------------------------------------- */

static bool resize(void *array, size_t count, size_t size) {
  void *block;
  memcpy(&block, array, sizeof block);
  void *grown = realloc(block, count * size);
  if (grown == NULL)
    return false;
  memcpy(array, &grown, sizeof grown);
  return true;
}

static bool make_room(row_reader *r) {
  answers *a = r->answers;
  if (a->n < r->room)
    return true;
  const size_t room = 2 * r->room + 256;
  if (!resize(&a->line, room, sizeof *a->line) ||
      !resize(&a->observer, room, sizeof *a->observer) ||
      !resize(&a->condition, room, sizeof *a->condition) ||
      !resize(&a->pair, room, sizeof *a->pair) ||
      !resize(&a->shown, room, sizeof *a->shown) ||
      !resize(&a->positive, room, sizeof *a->positive) ||
      !resize(&a->level, room, sizeof *a->level) ||
      !resize(&a->place, room, sizeof *a->place)) {
    return false;
  }
  r->room = room;
  return true;
}

static ef_status read_name(row_reader *r, size_t field, name_list *names,
                           size_t *place, ef_error *error) {
  if (!ef_fields_has(r->fields, field)) {
    *place = 0;
    return EF_OK;
  }
  if (r->text[field][0] == '\0') {
    return ef_fields_fault(r->fields, field, error,
                           "the field is empty, expected a name; leave the "
                           "column out where there is only one");
  }
  *place = name_list_place(names, r->text[field]);
  return *place != SIZE_MAX ? EF_OK : out_of_memory(error);
}

static ef_status read_level(row_reader *r, size_t i, ef_error *error) {
  answers *a = r->answers;
  a->level[i] = (double)NAN;
  if (a->by_pair)
    return read_name(r, STIMULUS, &a->pairs, &a->pair[i], error);
  a->pair[i] = 0;
  return ef_fields_number(r->fields, STIMULUS, &a->level[i], error);
}

static ef_status read_row(row_reader *r, size_t line, ef_error *error) {
  answers *a = r->answers;
  if (!make_room(r))
    return out_of_memory(error);
  const size_t i = a->n;
  a->line[i] = line;
  ef_status status = read_task(r, error);
  if (status == EF_OK)
    status = read_level(r, i, error);
  if (status == EF_OK)
    status = read_name(r, OBSERVER, &a->observers, &a->observer[i], error);
  if (status == EF_OK)
    status = read_name(r, CONDITION, &a->conditions, &a->condition[i], error);
  if (status == EF_OK)
    status = read_place(r, i, error);
  if (status == EF_OK) {
    status = a->is_counted ? read_counts(r, i, error) : read_answer(r, i, error);
  }
  if (status == EF_OK)
    a->n++;
  return status;
}

static ef_status read_rows(row_reader *r, ef_error *error) {
  size_t line;
  for (;;) {
    ef_status status = ef_fields_next(r->fields, &r->text, &line, error);
    if (status != EF_OK || r->text == NULL)
      return status;
    status = read_row(r, line, error);
    if (status != EF_OK)
      return status;
  }
}

/* ---- The file ---------------------------------------------------------- */

static void note_observer(const answers *a, const ef_notes *notes) {
  if (a->has_observer || a->n == 0)
    return;
  message_note(notes,
               "%s: there is no column observer: all answers are taken as one "
               "observer's",
               a->file);
}

ef_status answers_read(answers *a, const char *path, const answers_need *need,
                       bool may_be_empty, const ef_notes *notes,
                       ef_error *error) {
  *a = (answers){.file = path, .by_pair = need->by_pair};
  row_reader r = {.answers = a, .need = need};
  if (need->task != NULL) {
    if (ef_task_find(need->task, &a->task, error) != EF_OK)
      return message_option(error, "task", "");
    r.task_is_known = true;
  }
  const char *names[N_FIELDS];
  memcpy(names, columns, sizeof names);
  if (need->by_pair)
    names[STIMULUS] = "pair";
  r.fields = ef_fields_open(path, N_FIELDS, 1, names, notes, error);
  if (r.fields == NULL)
    return error->status;
  snprintf(a->unit, sizeof a->unit, "%s", ef_fields_unit(r.fields));
  ef_status status = check_columns(&r, error);
  if (status == EF_OK)
    status = read_rows(&r, error);
  ef_fields_free(r.fields);
  if (status == EF_OK && !r.task_is_known)
    status = ask_for_task(a, error);
  if (status == EF_OK && a->n == 0 && !may_be_empty) {
    message_fail(error, EF_MALFORMED,
                 "there is a header and no answer below it");
    status = message_place(error, path);
  }
  if (status == EF_OK)
    note_observer(a, notes);
  return status;
}

void answers_free(answers *a) {
  name_list_free(&a->observers);
  name_list_free(&a->conditions);
  name_list_free(&a->pairs);
  free(a->line);
  free(a->observer);
  free(a->condition);
  free(a->pair);
  free(a->shown);
  free(a->positive);
  free(a->level);
  free(a->place);
  *a = (answers){0};
}

const char *answers_observer(const answers *a, size_t observer) {
  return observer < a->observers.n ? a->observers.name[observer] : "";
}

const char *answers_condition(const answers *a, size_t condition) {
  return condition < a->conditions.n ? a->conditions.name[condition] : "";
}
