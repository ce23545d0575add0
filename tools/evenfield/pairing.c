/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "pairing.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

enum { BLOCK_PAIRS = 4096 };

/* The standards, of which two parts of the file are held: samples come in the
 * order of their standards where the file is long. */
typedef struct window {
  finish_file *file;
  finish_list now, ahead;
  bool ended;
} window;

typedef struct maker {
  compare_scene *scene;
  const pairing_sink *sink;
  window standards;
  finish_list batch;
  pair *pending;
  size_t n_pending;
  size_t offset; /* of the latest sample in the batch, or pair in the list */
} maker;

/* ---- Blocks ------------------------------------------------------------ */

static ef_status flush(maker *m, ef_error *error) {
  const size_t n = m->n_pending;
  m->n_pending = 0;
  return n == 0 ? EF_OK : m->sink->block(m->sink->self, n, m->pending, error);
}

/* Pairs of other parts are left out here, so that whatever part is asked for
 * all are made in one way. */
static ef_status push(maker *m, const pair *p, ef_error *error) {
  if (!part_holds(&m->scene->part, m->offset))
    return EF_OK;
  m->pending[m->n_pending++] = *p;
  return m->n_pending < BLOCK_PAIRS ? EF_OK : flush(m, error);
}

/* ---- Standards --------------------------------------------------------- */

/* Standards that no sample asked for are told as well. */
static ef_status tell_unused(maker *m, const finish_list *list,
                             ef_error *error) {
  ef_status status = EF_OK;
  for (size_t i = 0; i < list->n && status == EF_OK; ++i) {
    const finish *f = &list->item[i];
    if (f->used)
      continue;
    pair p = {.standard_name = f->name, .sample_name = "", .line = f->line};
    snprintf(p.reason, sizeof p.reason, "%.200s has no sample of this name",
             m->scene->batch_source);
    status = push(m, &p, error);
  }
  return status;
}

/* The part ahead takes the place of the present one. */
static ef_status move_on(maker *m, ef_error *error) {
  window *w = &m->standards;
  ef_status status = tell_unused(m, &w->now, error);
  if (status == EF_OK)
    status = flush(m, error); /* pending pairs point into the present part */
  finish_list_free(&w->now);
  w->now = w->ahead;
  w->ahead = (finish_list){0};
  return status;
}

static ef_status look_ahead(window *w, ef_error *error) {
  if (w->ended || w->ahead.n > 0)
    return EF_OK;
  const ef_status status = finish_file_next(w->file, &w->ahead, error);
  w->ended = status == EF_OK && w->ahead.n == 0;
  return status;
}

static ef_status find_standard(maker *m, const char *name, finish **found,
                               ef_error *error) {
  window *w = &m->standards;
  *found = finish_list_find(&w->now, name);
  if (*found != NULL || w->ended)
    return EF_OK;
  ef_status status = look_ahead(w, error);
  if (status != EF_OK || finish_list_find(&w->ahead, name) == NULL)
    return status;
  status = move_on(m, error);
  *found = finish_list_find(&w->now, name);
  return status;
}

/* ---- Against one standard, or by name ---------------------------------- */

/* Readings that are not all together have no mean. */
static bool is_torn(const finish *f, const char *source, pair *p) {
  if (f->also_in_part == 0)
    return false;
  snprintf(p->reason, sizeof p->reason,
           "other readings of %.60s stand far from these in %.100s, from line "
           "%zu on; sort the rows by name",
           f->name, source, f->also_in_part);
  return true;
}

static ef_status pair_sample(maker *m, finish *sample, ef_error *error) {
  compare_scene *s = m->scene;
  m->offset = sample->offset;
  pair p = {.sample = sample,
            .sample_name = sample->name,
            .standard_name = "",
            .line = sample->line};
  ef_status status = EF_OK;
  if (s->pairing == PAIR_ONE) {
    p.standard = &m->standards.now.item[0];
  } else {
    status = find_standard(m, sample->name, &p.standard, error);
  }
  if (status != EF_OK)
    return status;
  if (p.standard == NULL) {
    snprintf(p.reason, sizeof p.reason, "%.200s has no standard of this name%s",
             s->standard_source,
             finish_file_is_whole(s->standard)
                 ? ""
                 : " near this place; long files are read in step");
    return push(m, &p, error);
  }
  p.standard->used = true;
  p.standard_name = p.standard->name;
  if (!is_torn(sample, s->batch_source, &p))
    is_torn(p.standard, s->standard_source, &p);
  return push(m, &p, error);
}

static ef_status pair_batch(maker *m, ef_error *error) {
  ef_status status = EF_OK;
  do {
    status = finish_file_next(m->scene->batch, &m->batch, error);
    for (size_t i = 0; i < m->batch.n && status == EF_OK; ++i)
      status = pair_sample(m, &m->batch.item[i], error);
    if (status == EF_OK)
      status = flush(m, error);
  } while (status == EF_OK && m->batch.n > 0);
  return status;
}

static ef_status pair_by_rule(maker *m, ef_error *error) {
  compare_scene *s = m->scene;
  window *w = &m->standards;
  ef_status status = finish_file_next(w->file, &w->now, error);
  if (status != EF_OK)
    return status;
  w->ended = finish_file_is_whole(w->file);
  s->pairing = w->ended && w->now.n == 1 ? PAIR_ONE : PAIR_NAMES;
  if (s->pairing == PAIR_NAMES) {
    message_note(s->notes,
                 "%s: more than one standard; each sample is compared with the "
                 "standard of its own name",
                 s->standard_source);
  }
  status = pair_batch(m, error);
  if (s->pairing == PAIR_ONE)
    return status;
  while (status == EF_OK && w->now.n > 0) {
    status = look_ahead(w, error);
    if (status == EF_OK)
      status = move_on(m, error);
  }
  return status == EF_OK ? flush(m, error) : status;
}

/* ---- By a list --------------------------------------------------------- */

static void find_listed(finish_list *list, const char *name, const char *source,
                        finish **found, pair *p) {
  *found = finish_list_find(list, name);
  if (*found == NULL && p->reason[0] == '\0') {
    snprintf(p->reason, sizeof p->reason, "%.200s has no sample called %.80s",
             source, name);
  }
}

/* The texts of a row of the list are gone with the next one: pairs keep copies
 * until they are handed on. */
typedef struct kept_names {
  char *bytes;
  size_t used, room;
} kept_names;

static const char *keep_name(kept_names *k, const char *name) {
  const size_t length = strlen(name) + 1;
  char *to = k->bytes + k->used;
  memcpy(to, name, length);
  k->used += length;
  return to;
}

static bool has_room(kept_names *k, const char *const *texts) {
  return k->room - k->used >= strlen(texts[0]) + strlen(texts[1]) + 2;
}

static ef_status make_room(maker *m, kept_names *k, const char *const *texts,
                           ef_error *error) {
  if (has_room(k, texts))
    return EF_OK;
  const ef_status status = flush(m, error);
  k->used = 0;
  if (status != EF_OK || has_room(k, texts))
    return status;
  const size_t room = strlen(texts[0]) + strlen(texts[1]) + (1 << 16);
  char *grown = realloc(k->bytes, room);
  if (grown == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for names");
  k->bytes = grown;
  k->room = room;
  return EF_OK;
}

static ef_status push_listed(maker *m, kept_names *k, const char *const *texts,
                             size_t line, ef_error *error) {
  compare_scene *s = m->scene;
  const ef_status status = make_room(m, k, texts, error);
  if (status != EF_OK)
    return status;
  pair p = {.line = line};
  finish_list *samples = s->batch != NULL ? &m->batch : &m->standards.now;
  p.standard_name = keep_name(k, texts[0]);
  p.sample_name = keep_name(k, texts[1]);
  find_listed(&m->standards.now, p.standard_name, s->standard_source,
              &p.standard, &p);
  find_listed(samples, p.sample_name, s->batch_source, &p.sample, &p);
  return push(m, &p, error);
}

static ef_status read_list(maker *m, ef_error *error) {
  static const char *const columns[] = {"reference", "sample"};
  compare_scene *s = m->scene;
  ef_fields *fields =
      ef_fields_open(s->options->pairs, 2, 2, columns, s->notes, error);
  if (fields == NULL)
    return error->status;
  kept_names names = {0};
  const char *const *texts;
  size_t line, n = 0;
  ef_status status;
  do {
    status = ef_fields_next(fields, &texts, &line, error);
    if (status != EF_OK || texts == NULL)
      break;
    ++n;
    m->offset = ef_fields_offset(fields);
    if (part_holds(&s->part, m->offset))
      status = push_listed(m, &names, texts, line, error);
  } while (status == EF_OK);
  if (status == EF_OK)
    status = flush(m, error);
  if (status == EF_OK && n == 0) {
    message_fail(error, EF_MALFORMED, "there is a header and no pair below it");
    status = message_place(error, s->options->pairs);
  }
  free(names.bytes);
  ef_fields_free(fields);
  return status;
}

static ef_status pair_by_list(maker *m, ef_error *error) {
  compare_scene *s = m->scene;
  ef_status status = finish_file_next(s->standard, &m->standards.now, error);
  if (status == EF_OK && s->batch != NULL)
    status = finish_file_next(s->batch, &m->batch, error);
  return status == EF_OK ? read_list(m, error) : status;
}

/* ---- All --------------------------------------------------------------- */

ef_status pairing_stream(compare_scene *s, const pairing_sink *sink,
                         ef_error *error) {
  maker m = {.scene = s, .sink = sink, .standards = {.file = s->standard}};
  m.pending = malloc(BLOCK_PAIRS * sizeof *m.pending);
  if (m.pending == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for pairs");
  const ef_status status = s->pairing == PAIR_LIST ? pair_by_list(&m, error)
                                                   : pair_by_rule(&m, error);
  finish_list_free(&m.standards.now);
  finish_list_free(&m.standards.ahead);
  finish_list_free(&m.batch);
  free(m.pending);
  return status;
}
