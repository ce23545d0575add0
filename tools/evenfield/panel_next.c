/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_next.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "panel_settings.h"

static const char demo_answers[] = "demo:panel-responses";
static const char demo_task[] = "2ifc";

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the levels");
}

/* ---- Levels in hand ---------------------------------------------------- */

static ef_status add_level(panel_next *p, size_t *room, double level,
                           size_t line, ef_error *error) {
  if (p->n_levels == *room) {
    *room = 2 * *room + 32;
    double *grown = realloc(p->level, *room * sizeof *grown);
    if (grown != NULL)
      p->level = grown;
    size_t *lines = realloc(p->line, *room * sizeof *lines);
    if (lines != NULL)
      p->line = lines;
    if (grown == NULL || lines == NULL)
      return out_of_memory(error);
  }
  p->line[p->n_levels] = line;
  p->level[p->n_levels++] = level;
  return EF_OK;
}

static ef_status read_row(panel_next *p, ef_fields *fields,
                          const char *const *cell, size_t line, size_t *room,
                          ef_error *error) {
  double level;
  ef_status status = ef_fields_number(fields, 0, &level, error);
  if (status != EF_OK)
    return status;
  for (size_t i = 0; i < p->n_levels; ++i) {
    if (p->level[i] == level) {
      return ef_fields_fault(fields, 0, error,
                             "level %g stands twice: the answers to two pairs "
                             "of one level cannot be told apart",
                             level);
    }
  }
  if (p->has_names) {
    const size_t at = name_list_place(&p->names, cell[1]);
    if (at == SIZE_MAX)
      return out_of_memory(error);
    if (at < p->n_levels || cell[1][0] == '\0') {
      return ef_fields_fault(fields, 1, error,
                             "found '%.60s', expected a name of its own for "
                             "each level",
                             cell[1]);
    }
  }
  return add_level(p, room, level, line, error);
}

static ef_status read_levels(panel_next *p, const char *path,
                             const ef_notes *notes, ef_error *error) {
  static const char *const columns[] = {"level", "name"};
  ef_fields *fields = ef_fields_open(path, 2, 1, columns, notes, error);
  if (fields == NULL)
    return error->status;
  p->has_names = ef_fields_has(fields, 1);
  const char *const *cell;
  size_t room = 0, line;
  ef_status status;
  do {
    status = ef_fields_next(fields, &cell, &line, error);
    if (status != EF_OK || cell == NULL)
      break;
    status = read_row(p, fields, cell, line, &room, error);
  } while (status == EF_OK);
  ef_fields_free(fields);
  if (status == EF_OK && p->n_levels == 0) {
    message_fail(error, EF_MALFORMED,
                 "there is a header and no level below it");
    status = message_place(error, path);
  }
  return status;
}

/* Without a list those that have been shown. */
static ef_status take_levels(panel_next *p, ef_error *error) {
  const answers *a = &p->answers;
  size_t *shown = malloc(2 * (a->n + 1) * sizeof *shown);
  bool *positive = calloc(a->n + 1, sizeof *positive);
  p->level = malloc((a->n + 1) * sizeof *p->level);
  ef_status status = EF_OK;
  if (shown == NULL || positive == NULL || p->level == NULL) {
    status = out_of_memory(error);
  } else {
    p->n_levels = ef_responses_collect(a->n, a->level, positive, p->level,
                                       shown, shown + a->n);
  }
  free(shown);
  free(positive);
  return status;
}

/* Answers to levels that are not in hand any more count, and are told. */
static void note_levels(const panel_next *p, const ef_notes *notes) {
  const answers *a = &p->answers;
  for (size_t i = 0; i < a->n; ++i) {
    bool is_known = false;
    for (size_t k = 0; k < p->n_levels && !is_known; ++k)
      is_known = p->level[k] == a->level[i];
    if (is_known)
      continue;
    message_note(notes,
                 "%s:%zu: level %g is not among those in hand; the answer "
                 "counts, the level is not shown again",
                 a->file, a->line[i], a->level[i]);
    return;
  }
}

/* ---- Steps ------------------------------------------------------------- */

/* What is known, where it is to be drawn. */
static ef_status know(panel_next *p, next_step *s,
                      const ef_responses *responses, ef_error *error) {
  if (p->options->chart == NULL && p->options->report == NULL)
    return EF_OK;
  const size_t n = p->settings.n_thresholds;
  s->threshold = malloc(n * sizeof *s->threshold);
  s->density = malloc(n * sizeof *s->density);
  if (s->threshold == NULL || s->density == NULL)
    return out_of_memory(error);
  return ef_next_posterior(responses, p->n_levels, p->level, &p->settings,
                           s->threshold, s->density, error);
}

static ef_status choose(panel_next *p, next_step *s, const double *level,
                        const size_t *shown, const size_t *positive, size_t n,
                        ef_error *error) {
  s->gain = malloc(p->n_levels * sizeof *s->gain);
  if (s->gain == NULL)
    return out_of_memory(error);
  const ef_responses responses = {n, level, shown, positive};
  const ef_status status =
      ef_next_choose(&responses, p->n_levels, p->level, &p->settings, &s->next,
                     s->gain, error);
  if (status == EF_INVALID)
    error->status = EF_UNKNOWN_NAME; /* options that do not go together */
  if (status == EF_OK)
    return know(p, s, &responses, error);
  return error->status;
}

static ef_status add_steps(panel_next *p, ef_error *error) {
  const answers *a = &p->answers;
  const size_t n_observers = a->observers.n > 0 ? a->observers.n : 1;
  const size_t n_conditions = a->conditions.n > 0 ? a->conditions.n : 1;
  double *level = malloc((a->n + 1) * sizeof *level);
  size_t *shown = malloc(2 * (a->n + 1) * sizeof *shown);
  p->step = calloc(n_observers * n_conditions + 1, sizeof *p->step);
  ef_status status = level == NULL || shown == NULL || p->step == NULL
                         ? out_of_memory(error)
                         : EF_OK;
  size_t *positive = shown + a->n + 1;
  for (size_t k = 0; k < n_observers * n_conditions && status == EF_OK; ++k) {
    next_step s = {.observer = k % n_observers, .condition = k / n_observers};
    size_t n = 0;
    for (size_t i = 0; i < a->n; ++i) {
      if (a->observer[i] != s.observer || a->condition[i] != s.condition)
        continue;
      level[n] = a->level[i];
      shown[n] = a->shown[i];
      positive[n++] = a->positive[i];
    }
    if (n == 0)
      continue;
    p->step[p->n] = s;
    status = choose(p, &p->step[p->n++], level, shown, positive, n, error);
  }
  if (status == EF_OK) {
    p->step[p->n] = (next_step){.is_new = true};
    status = choose(p, &p->step[p->n++], level, shown, positive, 0, error);
  }
  free(level);
  free(shown);
  return status;
}

/* ---- Loading ----------------------------------------------------------- */

static ef_status set_settings(panel_next *p, const ef_notes *notes,
                              ef_error *error) {
  const command_options *o = p->options;
  const ef_task task = p->answers.task;
  bool has_blanks = false;
  for (size_t i = 0; i < p->n_levels; ++i)
    has_blanks = has_blanks || p->level[i] == 0.0;
  p->settings = ef_next_settings_default(task);
  ef_next_settings *s = &p->settings;
  s->shape = panel_shape_for(o, task, has_blanks);
  s->axis = panel_axis(o, s->shape);
  if (!isnan(o->precision))
    s->precision = o->precision;
  if (!isnan(o->most))
    s->most_trials = (size_t)o->most;
  if (!isnan(o->false_alarms) && isnan(ef_task_chance(task)))
    s->guess = o->false_alarms;
  if (!isnan(o->lapse))
    s->lapse_max = 2.0 * o->lapse;
  s->notes = notes;
  ef_status status = panel_check_levels(&p->answers, s->axis, error);
  if (status == EF_OK)
    status = panel_criterion(o, task, &s->criterion, error);
  return status;
}

ef_status panel_next_load(panel_next *p, const command_options *options,
                          const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *p = (panel_next){.options = options, .is_demo = o->n_files < 2};
  ef_status status = EF_OK;
  if (o->levels != NULL)
    status = read_levels(p, o->levels, notes, error);
  const answers_need need = {.task = o->task == NULL && p->is_demo ? demo_task
                                                                   : o->task};
  if (status == EF_OK)
    status = answers_read(&p->answers, p->is_demo ? demo_answers : o->files[1],
                          &need, o->levels != NULL, notes, error);
  if (status == EF_OK && o->levels == NULL)
    status = take_levels(p, error);
  else if (status == EF_OK)
    note_levels(p, notes);
  if (status == EF_OK)
    status = set_settings(p, notes, error);
  if (status == EF_OK)
    status = add_steps(p, error);
  /* The library counts the levels from 1. */
  if (status == EF_MALFORMED && error->file[0] == '\0' && p->line != NULL) {
    if (error->line > 0 && error->line <= p->n_levels)
      error->line = p->line[error->line - 1];
    message_place(error, o->levels);
  }
  return status;
}

void panel_next_free(panel_next *p) {
  for (size_t i = 0; i < p->n; ++i) {
    free(p->step[i].gain);
    free(p->step[i].threshold);
    free(p->step[i].density);
  }
  free(p->step);
  free(p->level);
  free(p->line);
  name_list_free(&p->names);
  answers_free(&p->answers);
}
