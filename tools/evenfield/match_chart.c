/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "match_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "text.h"

/* Targets that are kept; of more, every second one, fourth one ... */
enum { MOST_KEPT = 1 << 20, MOST_NAMED = 60 };

typedef struct kept_colour {
  ef_xyz target, shown;
  bool in_gamut;
} kept_colour;

struct match_chart {
  const char *path;
  const ef_notes *notes;
  size_t n, room, n_seen, stride;
  kept_colour *colour;
  char *name[MOST_NAMED]; /* of the first ones */
};

match_chart *match_chart_new(const char *path, const ef_notes *notes) {
  match_chart *c = calloc(1, sizeof *c);
  if (c == NULL)
    return NULL;
  c->path = path;
  c->notes = notes;
  c->stride = 1;
  return c;
}

void match_chart_free(match_chart *c) {
  if (c == NULL)
    return;
  for (size_t i = 0; i < MOST_NAMED; ++i)
    free(c->name[i]);
  free(c->colour);
  free(c);
}

/* ---- Collecting -------------------------------------------------------- */

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  (void)self;
  if (ef_observer_dimensions(s->observer) == 3)
    return EF_OK;
  return message_fail(error, EF_NO_ANSWER,
                      "--chart needs colours of three dimensions, and those of "
                      "observer %.100s have two",
                      ef_observer_name(s->observer));
}

static void halve(match_chart *c) {
  c->stride *= 2;
  c->n /= 2;
  for (size_t i = 0; i < c->n; ++i)
    c->colour[i] = c->colour[2 * i];
}

static bool keep_one(match_chart *c, const match_scene *s, const ef_match *m) {
  if (c->n == c->room) {
    const size_t room = 2 * c->room + 256;
    kept_colour *grown = realloc(c->colour, room * sizeof *grown);
    if (grown == NULL)
      return false;
    c->colour = grown;
    c->room = room;
  }
  c->colour[c->n++] =
      (kept_colour){m->target, match_achieved(s, m)->xyz, m->in_gamut};
  return true;
}

static ef_status collect(void *self, const match_scene *s,
                         const match_rows *rows, ef_error *error) {
  match_chart *c = self;
  bool complete = true;
  for (size_t i = 0; i < rows->n && complete; ++i) {
    const size_t order = c->n_seen++;
    if (order < MOST_NAMED) {
      c->name[order] = strdup(rows->name[i]);
      complete = c->name[order] != NULL;
    }
    if (order % c->stride != 0)
      continue;
    if (c->n == MOST_KEPT)
      halve(c);
    if (order % c->stride == 0)
      complete = complete && keep_one(c, s, &rows->match[i]);
  }
  if (complete)
    return EF_OK;
  return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
}

/* ---- Drawing ----------------------------------------------------------- */

/* The pairs in gamut, or those out of it. */
static ef_status add_pairs(diagram *d, const match_chart *c, bool in_gamut,
                           double *coordinate, const char **label,
                           ef_error *error) {
  double *const at[4] = {coordinate, coordinate + c->n, coordinate + 2 * c->n,
                         coordinate + 3 * c->n};
  size_t n = 0;
  for (size_t i = 0; i < c->n; ++i) {
    const kept_colour *k = &c->colour[i];
    if (k->in_gamut != in_gamut)
      continue;
    const ef_xy target = diagram_point(d->plane, k->target, d->white);
    const ef_xy shown = diagram_point(d->plane, k->shown, d->white);
    at[0][n] = target.x;
    at[1][n] = target.y;
    at[2][n] = shown.x;
    at[3][n] = shown.y;
    label[n] = c->n_seen <= MOST_NAMED ? c->name[i] : NULL;
    ++n;
  }
  ef_series pairs = ef_series_default(EF_SERIES_PAIRS);
  pairs.look = in_gamut ? 0 : 1;
  pairs.name = in_gamut ? "in gamut: target, joined to what is shown"
                        : "out of gamut: target, joined to what is shown";
  pairs.n = n;
  pairs.x = at[0];
  pairs.y = at[1];
  pairs.to_x = at[2];
  pairs.to_y = at[3];
  pairs.label = label;
  return n > 0 ? ef_chart_add(d->chart, &pairs, error) : EF_OK;
}

static ef_status add_all(diagram *d, const match_chart *c, const match_scene *s,
                         ef_error *error) {
  double *coordinate = malloc(4 * (c->n + 1) * sizeof *coordinate);
  const char **label = malloc((c->n + 1) * sizeof *label);
  ef_status status = EF_OK;
  if (coordinate == NULL || label == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK)
    status = diagram_add_locus(d, s->observer, error);
  if (status == EF_OK)
    status = diagram_add_gamut(d, s->setup, error);
  if (status == EF_OK)
    status = diagram_add_white(d, "white", error);
  if (status == EF_OK)
    status = add_pairs(d, c, true, coordinate, label, error);
  if (status == EF_OK)
    status = add_pairs(d, c, false, coordinate, label, error);
  free(coordinate);
  free(label);
  return status;
}

ef_status match_chart_draw(const match_chart *c, const match_scene *s,
                           const ef_chart_settings *settings,
                           diagram_plane plane, diagram *out, ef_error *error) {
  ef_status status =
      diagram_init(out, settings, plane, ef_setup_white(s->setup), error);
  if (status == EF_OK)
    status = add_all(out, c, s, error);
  return status;
}

/* "Off by 2.38 ..." is in the text; a chart says what it shows. */
static void describe(text *subtitle, const match_chart *c, const match_scene *s,
                     const match_summary *sum) {
  text_format(subtitle, "%s; targets: %s (%s)",
              ef_device_name(s->device.device), s->targets.about,
              s->target_source);
  text_format(subtitle, "; observer %s", ef_observer_name(s->observer));
  if (c->stride > 1)
    text_format(subtitle, "; of %zu targets each %zuth is taken", sum->n,
                c->stride);
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  const match_chart *c = self;
  const int asked = s->options->plane;
  const diagram_plane plane = asked >= 0 ? (diagram_plane)asked : PLANE_UV;
  ef_chart_settings settings = diagram_settings(plane);
  text title = {0}, subtitle = {0}, about = {0};
  text_format(&title, "%zu of %zu targets are in gamut", sum->n_in_gamut,
              sum->n);
  describe(&subtitle, c, s, sum);
  text_format(&about,
              "Colours in the plane of %s: each target, joined to the colour "
              "that is shown for it, and the gamut. %s",
              diagram_plane_name(plane),
              subtitle.bytes != NULL ? subtitle.bytes : "");
  settings.title = title.bytes;
  settings.subtitle = subtitle.bytes;
  settings.description = about.bytes;
  settings.overwrite = s->options->force;
  diagram d = {0};
  ef_status status = EF_OK;
  if (title.failed || subtitle.failed || about.failed)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK)
    status = match_chart_draw(c, s, &settings, plane, &d, error);
  if (status == EF_OK)
    status = diagram_write(&d, c->path, c->notes, error);
  diagram_free(&d);
  text_free(&title);
  text_free(&subtitle);
  text_free(&about);
  return status;
}

match_sink match_chart_sink(match_chart *c) {
  return (match_sink){.self = c, .begin = begin, .rows = collect, .end = end};
}
