/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_match.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "document.h"
#include "message.h"
#include "part.h"

struct match_data {
  ef_output *output;
  bool is_csv;
  document out;
};

/* ---- One target -------------------------------------------------------- */

static void names_of_drives(const ef_device *device,
                            const char *names[EF_MAX_DRIVES]) {
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    names[i] = ef_device_drive_name(device, i);
  }
}

static void record_colour(record *r, const char *key, ef_xyz xyz,
                          ef_xyz white) {
  record_begin(r, key);
  record_xyz(r, xyz);
  record_lab(r, ef_xyz_to_lab(xyz, white));
  record_end(r);
}

/* The limits that hold the nearest colour, by name. */
static size_t limits_of(const ef_device *device, const ef_match *m,
                        const char *names[2 * EF_MAX_DRIVES]) {
  size_t n = 0;
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    const uint32_t bit = (uint32_t)1 << i;
    if (m->held_low & bit)
      names[n++] = ef_device_limit_name(device, i, false);
    if (m->held_high & bit)
      names[n++] = ef_device_limit_name(device, i, true);
  }
  return n;
}

/* Amounts of a display or press; of what mixes the concentrations, which say
 * more than the drives that they come from. */
static void record_amounts(record *r, const match_scene *s,
                           const double *amount) {
  const ef_device *device = s->device.device;
  const size_t n = ef_device_n_drives(device);
  const size_t n_mixed = ef_mixture_count(device);
  const char *names[EF_MAX_RECIPE];
  double drive[EF_MAX_DRIVES], share[EF_MAX_RECIPE];
  if (n_mixed == 0) {
    names_of_drives(device, names);
    record_numbers(r, "amounts", n, names, amount);
    return;
  }
  for (size_t i = 0; i < n; ++i)
    drive[i] = ef_device_drive(device, i, amount[i]);
  for (size_t i = 0; i < n_mixed; ++i) {
    names[i] = ef_mixture_name(device, i);
    share[i] = (double)NAN;
  }
  ef_error ignored;
  if (!isnan(amount[0]))
    ef_mixture_concentrations(device, drive, share, &ignored);
  record_numbers(r, "concentrations", n_mixed, names, share);
}

static void record_shown(record *r, const char *key, const match_scene *s,
                         const ef_shown *shown) {
  const double none = (double)NAN;
  const ef_device *device = s->device.device;
  const size_t n = ef_device_n_drives(device);
  const char *names[EF_MAX_DRIVES];
  names_of_drives(device, names);
  ef_shown x = *shown;
  if (!x.found) {
    for (size_t i = 0; i < n; ++i)
      x.amount[i] = none;
    x.xyz = (ef_xyz){none, none, none};
    x.difference = x.jnds = none;
    x.components = (ef_components){none, none, none};
  }
  record_begin(r, key);
  record_boolean(r, "found", x.found);
  record_amounts(r, s, x.amount);
  record_xyz(r, x.xyz);
  record_number(r, "difference", x.difference);
  record_number(r, "jnds", x.jnds);
  record_number(r, "lightness_part", x.components.lightness);
  record_number(r, "chroma_part", x.components.chroma);
  record_number(r, "hue_part", x.components.hue);
  record_end(r);
}

static void record_spread(record *r, const ef_spread *spread) {
  record_number(r, "mean", spread->mean);
  record_number(r, "p95", spread->p95);
  record_number(r, "share_of_observers", spread->share_of_observers);
}

/* What some scenes tell beside the match; NULL where they do not. */
typedef struct match_more {
  const ef_spread *spread;
  const ef_recipe_view *view; /* in each light */
  const ef_recipes *recipe;
} match_more;

static void record_match(record *r, const match_scene *s, const char *name,
                         const ef_match *m, const match_more *more) {
  const ef_spread *spread = more->spread;
  const ef_device *device = s->device.device;
  const size_t n = ef_device_n_drives(device);
  const char *names[EF_MAX_DRIVES], *limits[2 * EF_MAX_DRIVES];
  names_of_drives(device, names);
  const ef_shown *achieved = match_achieved(s, m);
  const ef_xyz white = ef_setup_white(s->setup);
  double codes[EF_MAX_DRIVES];
  for (size_t i = 0; i < n; ++i)
    codes[i] = (double)m->code[i];
  record_begin(r, NULL);
  record_text(r, "name", name);
  record_boolean(r, "in_gamut", m->in_gamut);
  record_colour(r, "target", m->target, white);
  record_amounts(r, s, m->amount);
  record_texts(r, "limits", limits_of(device, m, limits), limits);
  if (more->recipe == NULL) {
    record_numbers(r, "drive", n, names, achieved->drive);
    record_numbers(r, "codes", n, names, codes);
  }
  record_colour(r, "achieved", achieved->xyz, white);
  record_begin(r, "difference");
  record_text(r, "metric", ef_metric_name(s->metric));
  record_number(r, "value", achieved->difference);
  record_number(r, "jnds", achieved->jnds);
  record_number(r, "rounded_codes", m->rounded_difference);
  record_end(r);
  record_shown(r, "nearest", s, &m->nearest);
  record_shown(r, "hue_kept", s, &m->hue_kept);
  if (spread != NULL) {
    record_begin(r, "population");
    record_spread(r, spread);
    record_end(r);
  }
  render_match_record_recipes(r, s, more->view, more->recipe);
  record_end(r);
}

/* ---- The document around the targets ----------------------------------- */

static void write_device(ef_json *j, const match_scene *s) {
  const chosen_device *d = &s->device;
  ef_json_begin_object(j, d->kind->key);
  ef_json_text(j, "name", ef_device_name(d->device));
  ef_json_text(j, "source", d->source);
  d->kind->write(j, s);
  ef_json_end_object(j);
}

static void write_gamut(ef_json *j, const ef_gamut *g) {
  ef_json_begin_object(j, "gamut");
  ef_json_number(j, "area_xy", g->area_xy);
  ef_json_number(j, "area_uv", g->area_uv);
  ef_json_number(j, "locus_share_xy", g->locus_share_xy);
  ef_json_number(j, "locus_share_uv", g->locus_share_uv);
  ef_json_number(j, "volume_lab", g->volume_lab);
  ef_json_number(j, "object_colours_share", g->solid_share);
  ef_json_number(j, "contrast", g->contrast);
  ef_json_end_object(j);
}

static void write_basis(ef_json *j, const match_scene *s) {
  ef_json_text(j, "observer", ef_observer_name(s->observer));
  ef_json_integer(j, "observer_dimensions",
                  (int64_t)ef_observer_dimensions(s->observer));
  ef_json_text(j, "illuminant", ef_illuminant_name(s->illuminant));
  ef_json_text(j, "targets_are", s->targets.about);
  ef_json_text(j, "targets_source", s->target_source);
  const bool is_von_kries =
      s->companion.observer != NULL && s->targets.adaptation != EF_ADAPT_NONE;
  ef_json_text(j, "adaptation",
               is_von_kries ? "von-kries"
                            : ef_adaptation_name(s->targets.adaptation));
  ef_json_text(j, "metric", ef_metric_name(s->metric));
  ef_json_begin_object(j, "jnd");
  ef_json_number(j, "value", s->jnd.value);
  ef_json_text(j, "criterion", s->own_jnd ? "" : s->jnd.criterion);
  ef_json_text(j, "source", s->own_jnd ? "--jnd" : s->jnd.source);
  ef_json_end_object(j);
  ef_json_integer(j, "bits", s->settings.bits);
  if (s->settings.n_steps > 0)
    ef_json_number(j, "step", 1.0 / s->settings.n_steps);
  if (s->seen.people.population == NULL)
    return;
  ef_json_begin_object(j, "population");
  people_write(j, &s->seen.people);
  ef_json_end_object(j);
}

static void write_spread(ef_json *j, const char *key, const ef_spread *spread) {
  record r = record_of_json(j);
  record_begin(&r, key);
  record_spread(&r, spread);
  record_end(&r);
}

static void write_summary(ef_json *j, const match_scene *s,
                          const match_summary *sum) {
  ef_json_begin_object(j, "summary");
  ef_json_integer(j, "targets", (int64_t)sum->n);
  ef_json_integer(j, "skipped_rows", (int64_t)sum->n_skipped);
  ef_json_integer(j, "in_gamut", (int64_t)sum->n_in_gamut);
  ef_json_integer(j, "missed_within_one_jnd", (int64_t)sum->n_near);
  ef_json_integer(j, "above_one_jnd", (int64_t)sum->n_visible);
  ef_json_number(j, "mean_difference", sum->mean);
  ef_json_number(j, "worst_difference", sum->worst);
  ef_json_text(j, "worst_name", sum->worst_name);
  if (s->options->check) {
    ef_json_number(j, "tolerance", s->tolerance);
    ef_json_integer(j, "beyond_tolerance", (int64_t)sum->n_beyond);
  }
  if (s->seen.people.population != NULL) {
    ef_json_number(j, "observer_metamerism_index", sum->in_gamut.mean);
    write_spread(j, "population_in_gamut", &sum->in_gamut);
    write_spread(j, "population_all", &sum->all);
    ef_json_text(j, "population_worst_name", sum->worst_seen_name);
  }
  ef_json_end_object(j);
}

/* ---- The sink ---------------------------------------------------------- */

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  match_data *d = self;
  const ef_status status = document_open(&d->out, d->output, d->is_csv, error);
  if (status != EF_OK)
    return status;
  if (d->is_csv && !part_has_header(s->options))
    return EF_OK;
  if (d->is_csv) {
    record r = document_header(&d->out);
    const ef_match none = {0};
    const ef_spread no_spread = {0};
    const ef_recipe_view no_view[EF_MAX_LIGHTS] = {0};
    const ef_recipes no_recipe = {0};
    const match_more more = {
        .spread = s->seen.people.population != NULL ? &no_spread : NULL,
        .view = s->has_views ? no_view : NULL,
        .recipe = s->recipes.device != NULL ? &no_recipe : NULL};
    record_match(&r, s, "", &none, &more);
    return EF_OK;
  }
  ef_json_boolean(d->out.json, "demo", s->device.is_demo && s->demo_targets);
  write_basis(d->out.json, s);
  write_device(d->out.json, s);
  write_gamut(d->out.json, &s->gamut);
  document_begin_rows(&d->out, "targets");
  return EF_OK;
}

typedef struct block {
  const match_scene *scene;
  const match_rows *rows;
} block;

static void write_one(const document *to, const void *self, size_t i) {
  const block *b = self;
  const match_scene *s = b->scene;
  const match_rows *rows = b->rows;
  record r = document_row(to);
  const match_more more = {
      .spread = rows->spread != NULL ? &rows->spread[i] : NULL,
      .view = rows->view != NULL ? rows->view + i * s->lights.n : NULL,
      .recipe = rows->recipe != NULL ? &rows->recipe[i] : NULL};
  record_match(&r, s, rows->name[i], &rows->match[i], &more);
}

static ef_status rows(void *self, const match_scene *s, const match_rows *rows,
                      ef_error *error) {
  match_data *d = self;
  const block b = {s, rows};
  return document_write(&d->out, rows->n, s->options->jobs, write_one, &b,
                        error);
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  match_data *d = self;
  document_end_rows(&d->out);
  if (d->out.json != NULL)
    write_summary(d->out.json, s, sum);
  return document_close(&d->out, error);
}

match_data *match_data_new(ef_output *output, bool is_csv) {
  match_data *d = calloc(1, sizeof *d);
  if (d == NULL)
    return NULL;
  d->output = output;
  d->is_csv = is_csv;
  return d;
}

void match_data_free(match_data *d) {
  if (d != NULL)
    document_free(&d->out);
  free(d);
}

match_sink match_data_sink(match_data *d) {
  return (match_sink){.self = d, .begin = begin, .rows = rows, .end = end};
}
