/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "describe_chart.h"

#include <stdlib.h>
#include <string.h>

#include "diagram.h"
#include "message.h"
#include "text.h"

/* Kept in all, and of those by name. */
enum { MOST_KEPT = 1 << 20, MOST_NAMED = 60 };

/* In the order of their looks. */
static const char *const kinds[] = {"surface", "light", "colour"};
static const char *const many[] = {"surfaces", "lights", "colours"};
enum { N_KINDS = 3 };

typedef struct kept {
  int kind;
  ef_xyz xyz;
  ef_lab lab;
} kept;

struct describe_chart {
  const describe_sink *next;
  size_t n, room, n_seen;
  kept *at;
  char *name[MOST_NAMED];
};

describe_chart *describe_chart_new(const describe_sink *next) {
  describe_chart *c = calloc(1, sizeof *c);
  if (c != NULL)
    c->next = next;
  return c;
}

void describe_chart_free(describe_chart *c) {
  if (c == NULL)
    return;
  for (size_t i = 0; i < MOST_NAMED; ++i)
    free(c->name[i]);
  free(c->at);
  free(c);
}

static bool keep(describe_chart *c, const description *d) {
  if (c->n_seen++ >= MOST_KEPT)
    return true;
  if (c->n == c->room) {
    const size_t room = 2 * c->room + 64;
    kept *grown = realloc(c->at, room * sizeof *grown);
    if (grown == NULL)
      return false;
    c->at = grown;
    c->room = room;
  }
  int kind = 0;
  while (kind + 1 < N_KINDS && strcmp(kinds[kind], d->kind) != 0)
    ++kind;
  if (c->n < MOST_NAMED) {
    c->name[c->n] = strdup(d->name);
    if (c->name[c->n] == NULL)
      return false;
  }
  c->at[c->n++] = (kept){kind, d->xyz, d->lab};
  return true;
}

static ef_status collect(void *self, const describe_scene *s, size_t n,
                         const description *descriptions, ef_error *error) {
  describe_chart *c = self;
  for (size_t i = 0; i < n; ++i) {
    if (!keep(c, &descriptions[i]))
      return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  }
  return c->next->rows(c->next->self, s, n, descriptions, error);
}

describe_sink describe_chart_sink(describe_chart *c) {
  return (describe_sink){.self = c, .rows = collect};
}

/* CIELAB as described: that of lights is not known. */
static ef_xy place(diagram_plane plane, const kept *k) {
  const ef_lch lch = ef_lab_to_lch(k->lab);
  switch (plane) {
  case PLANE_AB:
    return (ef_xy){k->lab.a_star, k->lab.b_star};
  case PLANE_LC:
    return (ef_xy){lch.C_star, lch.L_star};
  default:
    return diagram_point(plane, k->xyz, (ef_xyz){100.0, 100.0, 100.0});
  }
}

static ef_status add_kind(diagram *d, const describe_chart *c, int kind,
                          double *x, double *y, const char **label,
                          ef_error *error) {
  size_t n = 0;
  for (size_t i = 0; i < c->n; ++i) {
    if (c->at[i].kind != kind)
      continue;
    const ef_xy at = place(d->plane, &c->at[i]);
    x[n] = at.x;
    y[n] = at.y;
    label[n++] = c->n_seen <= MOST_NAMED ? c->name[i] : NULL;
  }
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = kind;
  marks.name = many[kind];
  marks.n = n;
  marks.x = x;
  marks.y = y;
  marks.label = label;
  return ef_chart_add(d->chart, &marks, error);
}

static ef_status draw(diagram *d, const describe_chart *c,
                      const describe_scene *s, ef_error *error) {
  double *x = malloc(2 * (c->n + 1) * sizeof *x);
  const char **label = malloc((c->n + 1) * sizeof *label);
  ef_status status = EF_OK;
  if (x == NULL || label == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK)
    status = diagram_add_locus(d, s->observer, error);
  for (int kind = 0; kind < N_KINDS && status == EF_OK; ++kind)
    status = add_kind(d, c, kind, x, x + c->n, label, error);
  free(x);
  free(label);
  return status;
}

ef_status describe_chart_write(const describe_chart *c, const describe_scene *s,
                               const ef_notes *notes, ef_error *error) {
  const int asked = s->options->plane;
  const diagram_plane plane = asked >= 0 ? (diagram_plane)asked : PLANE_UV;
  ef_chart_settings settings = diagram_settings(plane);
  text subtitle = {0};
  text_format(&subtitle, "Observer %s; surfaces under %s",
              ef_observer_name(s->observer), ef_illuminant_name(s->illuminant));
  if (c->n < c->n_seen)
    text_format(&subtitle, "; the first %zu of %zu", c->n, c->n_seen);
  settings.title = "Where the colours lie";
  settings.subtitle = subtitle.bytes;
  settings.overwrite = s->options->force;
  diagram d = {0};
  ef_status status = diagram_init(&d, &settings, plane, s->basis.white, error);
  if (status == EF_OK)
    status = draw(&d, c, s, error);
  if (status == EF_OK)
    status = diagram_write(&d, s->options->chart, notes, error);
  diagram_free(&d);
  text_free(&subtitle);
  return status;
}
