/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "match_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "text.h"

/* Targets that are kept in gamut, and out of it, so that few among many are not
 * lost; of more, every second one, fourth one ... */
enum { MOST_KEPT = 1 << 15, MOST_NAMED = 60 };

typedef struct kept_colour {
  ef_xyz target, shown;
  size_t order; /* among all targets */
} kept_colour;

typedef struct kept_colours {
  size_t n, room, n_seen, stride;
  kept_colour *at;
} kept_colours;

struct match_chart {
  const char *path;
  const ef_notes *notes;
  size_t n_seen;
  kept_colours kept[2];   /* out of gamut, in gamut */
  char *name[MOST_NAMED]; /* of the first ones */
  ef_crowd *crowd;        /* of the people asked; made with the first block */
  clouds clouds;
};

match_chart *match_chart_new(const char *path, const ef_notes *notes) {
  match_chart *c = calloc(1, sizeof *c);
  if (c == NULL)
    return NULL;
  c->path = path;
  c->notes = notes;
  c->kept[0].stride = c->kept[1].stride = 1;
  return c;
}

void match_chart_free(match_chart *c) {
  if (c == NULL)
    return;
  for (size_t i = 0; i < MOST_NAMED; ++i)
    free(c->name[i]);
  free(c->kept[0].at);
  free(c->kept[1].at);
  clouds_free(&c->clouds);
  ef_crowd_free(c->crowd);
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

static void halve(kept_colours *k) {
  k->stride *= 2;
  k->n /= 2;
  for (size_t i = 0; i < k->n; ++i)
    k->at[i] = k->at[2 * i];
}

static bool keep_one(match_chart *c, const match_scene *s, const ef_match *m,
                     size_t order) {
  kept_colours *k = &c->kept[m->in_gamut];
  const size_t number = k->n_seen++;
  if (number % k->stride != 0)
    return true;
  if (k->n == MOST_KEPT)
    halve(k);
  if (number % k->stride != 0)
    return true;
  if (k->n == k->room) {
    const size_t room = 2 * k->room + 256;
    kept_colour *grown = realloc(k->at, room * sizeof *grown);
    if (grown == NULL)
      return false;
    k->at = grown;
    k->room = room;
  }
  k->at[k->n++] =
      (kept_colour){m->target, match_achieved(s, m)->xyz, order};
  return true;
}

/* Differences of what is shown, in a* and b*, for the observer named. */
static ef_xy gap_of(const match_scene *s, const ef_match *m) {
  const ef_xyz white = ef_setup_white(s->setup);
  const ef_lab a = ef_xyz_to_lab(m->target, white);
  const ef_lab b = ef_xyz_to_lab(match_achieved(s, m)->xyz, white);
  return (ef_xy){b.a_star - a.a_star, b.b_star - a.b_star};
}

/* `first` is the number of the block's first target. */
static ef_status ask_people(match_chart *c, const match_scene *s,
                            const match_rows *rows, size_t first,
                            ef_error *error) {
  const seen *asked = &s->seen;
  if (rows->spread == NULL)
    return EF_OK;
  const ef_population *population = asked->people.population;
  if (c->crowd == NULL) {
    c->crowd = ef_crowd_new(population, &asked->target, &asked->match,
                            &asked->settings, NULL, error);
    if (c->crowd == NULL)
      return error->status;
  }
  ef_status status = EF_OK;
  for (size_t i = 0; i < rows->n && status == EF_OK; ++i) {
    cloud_pair pair = {.id = first + i,
                       .p95 = rows->spread[i].p95,
                       .named = gap_of(s, &rows->match[i])};
    snprintf(pair.name, sizeof pair.name, "%s", rows->name[i]);
    status = clouds_offer(
        &c->clouds, c->crowd, ef_population_count(population), &pair,
        asked->target.sample + i * asked->target.grid.count,
        asked->match.sample + i * asked->match.grid.count, s->options->jobs,
        error);
  }
  return status;
}

static ef_status collect(void *self, const match_scene *s,
                         const match_rows *rows, ef_error *error) {
  match_chart *c = self;
  bool complete = true;
  const ef_status status = ask_people(c, s, rows, c->n_seen, error);
  if (status != EF_OK)
    return status;
  for (size_t i = 0; i < rows->n && complete; ++i) {
    const size_t order = c->n_seen++;
    if (order < MOST_NAMED) {
      c->name[order] = strdup(rows->name[i]);
      complete = c->name[order] != NULL;
    }
    complete = complete && keep_one(c, s, &rows->match[i], order);
  }
  if (complete)
    return EF_OK;
  return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
}

/* ---- Drawing ----------------------------------------------------------- */

static bool is_near(const diagram *d, const kept_colour *k, double L_star) {
  return isnan(L_star) ||
         fabs(ef_xyz_to_lab(k->target, d->white).L_star - L_star) <=
             MATCH_SECTION_REACH;
}

/* The pairs in gamut, or those out of it, at a lightness or at all. */
static ef_status add_pairs(diagram *d, const match_chart *c, bool in_gamut,
                           double L_star, double *coordinate, const char **label,
                           ef_error *error) {
  const kept_colours *kept = &c->kept[in_gamut];
  double *const at[4] = {coordinate, coordinate + kept->n,
                         coordinate + 2 * kept->n, coordinate + 3 * kept->n};
  size_t n = 0;
  for (size_t i = 0; i < kept->n; ++i) {
    const kept_colour *k = &kept->at[i];
    if (!is_near(d, k, L_star))
      continue;
    const ef_xy target = diagram_point(d->plane, k->target, d->white);
    const ef_xy shown = diagram_point(d->plane, k->shown, d->white);
    at[0][n] = target.x;
    at[1][n] = target.y;
    at[2][n] = shown.x;
    at[3][n] = shown.y;
    label[n] = c->n_seen <= MOST_NAMED ? c->name[k->order] : NULL;
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

static ef_status add_frame(diagram *d, const match_chart *c,
                           const match_scene *s, match_view view,
                           ef_error *error) {
  ef_status status = diagram_add_locus(d, s->observer, error);
  if (status == EF_OK) {
    status = isnan(view.L_star)
                 ? diagram_add_gamut(d, s->setup, error)
                 : diagram_add_section(d, s->setup, view.L_star, error);
  }
  if (status == EF_OK && view.has_people)
    status = clouds_add_seen(d, &c->clouds, error);
  if (status == EF_OK)
    status = diagram_add_white(
        d, isnan(view.L_star) ? "white" : "neutral", error);
  return status;
}

static ef_status add_all(diagram *d, const match_chart *c, const match_scene *s,
                         match_view view, ef_error *error) {
  const size_t most =
      (c->kept[0].n > c->kept[1].n ? c->kept[0].n : c->kept[1].n) + 1;
  double *coordinate = malloc(4 * most * sizeof *coordinate);
  const char **label = malloc(most * sizeof *label);
  ef_status status = EF_OK;
  if (coordinate == NULL || label == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK)
    status = add_frame(d, c, s, view, error);
  for (int in_gamut = 1; in_gamut >= 0 && status == EF_OK; --in_gamut)
    status = add_pairs(d, c, in_gamut == 1, view.L_star, coordinate, label,
                       error);
  free(coordinate);
  free(label);
  return status;
}

ef_status match_chart_draw(const match_chart *c, const match_scene *s,
                           const ef_chart_settings *settings, match_view view,
                           diagram *out, ef_error *error) {
  ef_status status =
      diagram_init(out, settings, view.plane, ef_setup_white(s->setup), error);
  if (status == EF_OK)
    status = add_all(out, c, s, view, error);
  return status;
}

/* More clouds than these hide each other. */
enum { MOST_CLOUDS = 4 };

ef_status match_chart_draw_people(match_chart *c, const match_scene *s,
                                  const ef_chart_settings *settings,
                                  diagram *out, ef_error *error) {
  ef_chart_settings own = *settings;
  diagram_set_differences(&own, PLANE_AB);
  ef_status status =
      diagram_init(out, &own, PLANE_AB, ef_setup_white(s->setup), error);
  clouds_sort(&c->clouds);
  for (size_t i = 0; i < c->clouds.n_pairs; ++i)
    c->clouds.pair[i].look = (int)(i % EF_LOOKS);
  if (status == EF_OK)
    status = diagram_add_origin(out, "no difference", error);
  if (status == EF_OK)
    status = clouds_add_gaps(out, &c->clouds, MOST_CLOUDS, true, error);
  return status;
}

static void add_people(text *subtitle, const match_chart *c,
                       const match_scene *s, match_view view) {
  const size_t most = view.plane == PLANE_PEOPLE ? MOST_CLOUDS
                                                 : CLOUD_MOST_PAIRS;
  text_add(subtitle, "; ");
  people_add_who(subtitle, &s->seen.people);
  if (c->clouds.n_people < c->clouds.n_all)
    text_format(subtitle, ", the first %zu of them", c->clouds.n_people);
  if (most < c->clouds.n_offered)
    text_format(subtitle, "; the %zu targets with the largest differences", most);
}

void match_chart_thinned_words(text *about, const match_chart *c) {
  const char *before = "";
  for (int in_gamut = 1; in_gamut >= 0; --in_gamut) {
    const kept_colours *k = &c->kept[in_gamut];
    if (k->stride > 1) {
      text_format(about, "%sof %zu targets %s one in %zu is taken", before,
                  k->n_seen, in_gamut == 1 ? "in gamut" : "out of gamut",
                  k->stride);
      before = ", ";
    }
  }
}

static bool is_thinned(const match_chart *c) {
  return c->kept[0].stride > 1 || c->kept[1].stride > 1;
}

/* "Off by 2.38 ..." is in the text; a chart says what it shows. */
static void describe(text *subtitle, const match_chart *c, const match_scene *s,
                     match_view view) {
  text_format(subtitle, "%s; targets: %s (%s)",
              ef_device_name(s->device.device), s->targets.about,
              s->target_source);
  text_format(subtitle, "; observer %s", ef_observer_name(s->observer));
  if (!isnan(view.L_star)) {
    char lightness[EF_NUMBER_TEXT];
    ef_number_format(view.L_star, lightness);
    text_format(subtitle, "; at L*\xC2\xA0%s, with targets within 5 of it", lightness);
  }
  if (view.has_people && s->seen.people.population != NULL)
    add_people(subtitle, c, s, view);
  if (is_thinned(c)) {
    text_add(subtitle, "; ");
    match_chart_thinned_words(subtitle, c);
  }
}

void match_chart_people_words(text *about) {
  text_add(about,
           "Each dot or dash is one person: how the colour shown differs for "
           "them from the target, redder to the right, yellower upwards. Large "
           "marks are the observer the match was made for. A cloud off the "
           "middle is a match that fails most people the same way; a wide one "
           "is a match on which they disagree.");
}

/* Title and description of what is asked for. */
static void name_chart(text *title, text *about, const match_summary *sum,
                       diagram_plane plane, const char *subtitle) {
  if (plane == PLANE_PEOPLE) {
    text_format(title, "What is shown minus the target, person by person");
    match_chart_people_words(about);
    text_format(about, " %s", subtitle);
    return;
  }
  text_format(title, "%zu of %zu targets are in gamut", sum->n_in_gamut,
              sum->n);
  text_format(about,
              "Colours in the plane of %s: each target, joined to the colour "
              "that is shown for it, and the gamut. %s",
              diagram_plane_name(plane), subtitle);
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  match_chart *c = self;
  const double L_star = s->options->lightness;
  const int asked = s->options->plane;
  const diagram_plane plane = asked >= 0       ? (diagram_plane)asked
                              : !isnan(L_star) ? PLANE_AB
                                               : PLANE_UV;
  const match_view view = {plane, L_star, true};
  ef_chart_settings settings = diagram_settings(plane);
  text title = {0}, subtitle = {0}, about = {0};
  describe(&subtitle, c, s, view);
  name_chart(&title, &about, sum, plane,
             subtitle.bytes != NULL ? subtitle.bytes : "");
  settings.title = title.bytes;
  settings.subtitle = subtitle.bytes;
  settings.description = about.bytes;
  settings.overwrite = s->options->force;
  diagram d = {0};
  ef_status status = EF_OK;
  if (title.failed || subtitle.failed || about.failed)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK) {
    status = plane == PLANE_PEOPLE
                 ? match_chart_draw_people(c, s, &settings, &d, error)
                 : match_chart_draw(c, s, &settings, view, &d, error);
  }
  if (status == EF_OK)
    status = diagram_write(&d, c->path, c->notes, error);
  if (status == EF_OK && d.has_empty_section)
    message_note(c->notes, "%s: this %s has nothing at that lightness", c->path,
                 s->device.kind->words.noun);
  diagram_free(&d);
  text_free(&title);
  text_free(&subtitle);
  text_free(&about);
  return status;
}

match_sink match_chart_sink(match_chart *c) {
  return (match_sink){.self = c, .begin = begin, .rows = collect, .end = end};
}
