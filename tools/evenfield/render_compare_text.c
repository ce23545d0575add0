/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare_kept.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

/* A person reads so many rows; of a longer list the worst are shown. */
enum { MOST_ROWS = 200, WORST_ROWS = 50, MOST_REASONS = 100 };

/* ---- Which pairs are kept ---------------------------------------------- */

static int by_difference(const void *a, const void *b) {
  const kept_pair *p = a, *q = b;
  if (p->difference != q->difference)
    return p->difference < q->difference ? 1 : -1;
  return (p->order > q->order) - (p->order < q->order);
}

static int by_order(const void *a, const void *b) {
  const kept_pair *p = a, *q = b;
  return (p->order > q->order) - (p->order < q->order);
}

/* Keeps the worst once there are more than a person reads. */
static void thin(compare_text *t) {
  t->worst_only = true;
  qsort(t->row, t->n_rows, sizeof *t->row, by_difference);
  while (t->n_rows > WORST_ROWS)
    free(t->row[--t->n_rows].block);
}

static void *take(char **at, const void *from, size_t size) {
  void *to = *at;
  if (size > 0)
    memcpy(to, from, size);
  *at += (size + 15) / 16 * 16;
  return to;
}

/* A copy that owns everything. */
static bool copy_pair(kept_pair *k, const compare_scene *s, const compared *c) {
  const size_t n_outcomes = c->n_angles * s->looks.n;
  const size_t n_finish = c->n_angles > 1 ? s->looks.n : 0;
  const size_t size[] = {n_outcomes * sizeof *c->outcome,
                         c->n_angles * sizeof *c->angle_deg,
                         n_finish * sizeof *c->finish,
                         c->n_angles * sizeof *c->other_observer,
                         c->n_angles * sizeof *c->spectral,
                         strlen(c->standard) + 1,
                         strlen(c->sample) + 1};
  size_t whole = 0;
  for (size_t i = 0; i < sizeof size / sizeof size[0]; ++i)
    whole += (size[i] + 15) / 16 * 16;
  char *at = malloc(whole);
  if (at == NULL)
    return false;
  k->block = at;
  k->pair = *c;
  k->pair.outcome = take(&at, c->outcome, size[0]);
  k->pair.angle_deg = take(&at, c->angle_deg, size[1]);
  k->pair.finish = take(&at, c->finish, size[2]);
  k->pair.other_observer = take(&at, c->other_observer, size[3]);
  k->pair.spectral = take(&at, c->spectral, size[4]);
  k->pair.standard = take(&at, c->standard, size[5]);
  k->pair.sample = take(&at, c->sample, size[6]);
  return true;
}

/* What could not be computed is told of whatever its place. */
static void keep_reason(compare_text *t, const compare_scene *s,
                        const compared *c) {
  if (c->reason[0] == '\0' || t->n_reasons++ >= MOST_REASONS)
    return;
  text line = {0};
  compare_add_names(&line, s, c);
  text_format(&line, ": %s", c->reason);
  text_add(&t->reasons, "  ");
  text_paragraph(&t->reasons, &line, 4);
}

static ef_status keep(void *self, const compare_scene *s, size_t n,
                      const compared *pairs, ef_error *error) {
  compare_text *t = self;
  for (size_t i = 0; i < n; ++i) {
    const compared *c = &pairs[i];
    kept_pair k = {.order = t->n_seen++};
    keep_reason(t, s, c);
    if (c->n_angles == 0)
      continue;
    k.difference = c->outcome[c->worst].difference;
    if (t->worst_only && t->n_rows >= WORST_ROWS &&
        k.difference <= t->row[WORST_ROWS - 1].difference) {
      continue;
    }
    if (!copy_pair(&k, s, c))
      return message_fail(error, EF_NO_MEMORY, "out of memory for pairs");
    t->row[t->n_rows++] = k;
    if (t->n_rows > MOST_ROWS)
      thin(t);
  }
  return EF_OK;
}

/* The kept pair with the largest difference. */
static const compared *worst_pair(const compare_text *t) {
  const kept_pair *worst = &t->row[0];
  for (size_t i = 1; i < t->n_rows; ++i) {
    if (by_difference(&t->row[i], worst) < 0)
      worst = &t->row[i];
  }
  return &worst->pair;
}

static void add_reasons(text *out, const compare_text *t) {
  if (t->n_reasons == 0)
    return;
  text_add(out, "\nNot computed, or not all of it:\n");
  text_add(out, t->reasons.bytes != NULL ? t->reasons.bytes : "");
  out->failed = out->failed || t->reasons.failed;
  if (t->n_reasons > MOST_REASONS) {
    text_format(out, "  %zu more (--format csv or json gives all)\n",
                t->n_reasons - MOST_REASONS);
  }
}

static const char people_words[] =
    "Read these figures as a guide: what people notice changes with the size "
    "of "
    "the samples and the gap between them, with brightness, glare and "
    "attention. Where money or safety hangs on it, let a panel judge, and use "
    "its JND with --jnd.";

compare_text *compare_text_new(void) {
  compare_text *t = calloc(1, sizeof *t);
  if (t == NULL)
    return NULL;
  t->row = malloc((MOST_ROWS + 1) * sizeof *t->row);
  if (t->row == NULL) {
    free(t);
    return NULL;
  }
  return t;
}

void compare_text_free(compare_text *t) {
  if (t == NULL)
    return;
  for (size_t i = 0; i < t->n_rows; ++i)
    free(t->row[i].block);
  text_free(&t->reasons);
  free(t->row);
  free(t);
}

compare_sink compare_text_sink(compare_text *t) {
  return (compare_sink){.self = t, .rows = keep};
}

void compare_text_add(compare_text *t, text *out, const compare_scene *s,
                      const compare_count *count) {
  if (t->worst_only)
    thin(t);
  compare_add_answer(out, worst_pair(t), s, count);
  if (!t->worst_only)
    qsort(t->row, t->n_rows, sizeof *t->row, by_order);
  compare_add_tables(out, t, s, count);
  qsort(t->row, t->n_rows, sizeof *t->row, by_difference);
  compare_add_readings(out, t, s, count);
  compare_add_worst_cases(out, s);
  add_reasons(out, t);
  compare_basis(out, s, count);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out, people_words, 0);
}

ef_status compare_text_finish(compare_text *t, const compare_scene *s,
                              const compare_count *count, ef_output *output,
                              ef_error *error) {
  text out = {0};
  compare_text_add(t, &out, s, count);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}
