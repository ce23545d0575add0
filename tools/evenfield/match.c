/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "match.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"

/* Rows matched at a time: enough to keep all cores busy, some 7 MB. */
enum { BLOCK_ROWS = 8192, BLOCK_RECIPES = 256 };

static const char default_targets[] = "demo:livery";

/* ---- Loading ----------------------------------------------------------- */

static ef_status set_metric(match_scene *s, ef_error *error) {
  const command_options *o = s->options;
  const char *name = o->metric != NULL ? o->metric : "ciede2000";
  s->metric = ef_metric_new(name, error);
  if (s->metric == NULL)
    return message_option(error, "metric", "");
  s->jnd = ef_metric_jnd(s->metric);
  s->own_jnd = !isnan(o->jnd);
  if (s->own_jnd)
    s->jnd.value = o->jnd;
  s->tolerance = isnan(o->tolerance) ? s->jnd.value : o->tolerance;
  if (o->check && isnan(s->tolerance)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--check needs --tolerance: no "
                        "JND is published for %s",
                        ef_metric_name(s->metric));
  }
  s->settings = ef_match_settings_default();
  s->settings.metric = s->metric;
  s->settings.jnd = s->jnd.value;
  return EF_OK;
}

static ef_status set_light(match_scene *s, const ef_notes *notes,
                           ef_error *error) {
  const command_options *o = s->options;
  s->observer = source_observer(o, notes, error);
  if (s->observer == NULL)
    return error->status;
  const char *name = source_first_light(o, device_kind_of(o)->illuminant);
  s->illuminant = source_illuminant(o, "illuminant", name, notes, error);
  if (s->illuminant == NULL)
    return error->status;
  return colour_basis_init(&s->basis, s->observer, s->illuminant, error);
}

static ef_status set_device(match_scene *s, const ef_notes *notes,
                            ef_error *error) {
  const command_options *o = s->options;
  const device_basis basis = {.options = o,
                              .metric = s->metric,
                              .observer = s->observer,
                              .illuminant = s->illuminant,
                              .needs_spectra = seen_is_asked(o),
                              .notes = notes};
  const ef_status status = device_load(&basis, &s->device, error);
  if (status != EF_OK)
    return status;
  const ef_device *device = s->device.device;
  const device_words *words = &s->device.kind->words;
  const size_t n_drives = ef_device_n_drives(device);
  if (n_drives != 3) {
    message_fail(error, EF_NO_ANSWER,
                 "this %s has %zu %s; a match is found for three", words->noun,
                 n_drives, words->channels);
    return message_place(error, s->device.source);
  }
  s->setup = ef_setup_new(device, s->observer,
                          ef_device_reflects(device) ? s->illuminant : NULL,
                          notes, error);
  if (s->setup == NULL)
    return message_place(error, s->device.source);
  if (ef_device_reflects(device)) {
    const ef_status lit =
        lights_init(&s->lights, o, s->illuminant, notes, error);
    if (lit != EF_OK)
      return lit;
  }
  s->settings.bits = s->device.bits;
  s->settings.n_steps = s->device.n_steps;
  s->luminance_cd_m2 = isnan(o->luminance_cd_m2)
                           ? ef_setup_luminance_cd_m2(s->setup)
                           : o->luminance_cd_m2;
  return EF_OK;
}

static ef_status set_targets(match_scene *s, const ef_notes *notes,
                             ef_error *error) {
  const command_options *o = s->options;
  s->demo_targets = o->n_files == 0;
  s->target_source = s->demo_targets ? default_targets : o->files[0];
  part_range range;
  const ef_status status = part_of_file(o, s->target_source, &range, error);
  if (status != EF_OK)
    return status;
  s->reader = source_rows(o, s->target_source, &range, notes, error);
  if (s->reader == NULL)
    return error->status;
  return targets_init(&s->targets, o, s->setup, &s->basis,
                      ef_reader_get_head(s->reader), notes, error);
}

/* Targets and matches in other lights, where both have spectra. */
static ef_status set_views(match_scene *s, const ef_notes *notes,
                           ef_error *error) {
  const ef_reader_head *head = ef_reader_get_head(s->reader);
  const ef_device *device = s->device.device;
  ef_status status =
      recipes_init(&s->recipes, s->options, device, s->observer, s->metric,
                   s->jnd.value, &s->lights, head, error);
  if (status != EF_OK || s->lights.n == 0)
    return status;
  const bool has_device = ef_device_has_spectra(device);
  const bool has_spectra = has_device && head->content == EF_CONTENT_SPECTRA &&
                           head->kind == EF_SURFACE;
  s->has_views = has_spectra && s->lights.n > 1;
  if (!has_spectra && lights_are_asked(s->options)) {
    message_fail(error, EF_NO_ANSWER,
                 "what other lights do follows from spectra only, and %s known "
                 "without: give one --illuminant",
                 has_device ? "the targets are" : "this press is");
    return message_place(error,
                         has_device ? s->target_source : s->device.source);
  }
  if (!s->has_views || s->recipes.device != NULL)
    return EF_OK;
  return lights_view_init(&s->print, &s->lights, device, s->observer, s->metric,
                          head, notes, error);
}

static ef_status set_companion(match_scene *s, ef_error *error) {
  return companion_init(&s->companion, s->options, s->setup, &s->basis,
                        ef_reader_get_head(s->reader), &s->settings, BLOCK_ROWS,
                        error);
}

static ef_status set_people(match_scene *s, const ef_notes *notes,
                            ef_error *error) {
  const seen_basis basis = {.options = s->options,
                            .setup = s->setup,
                            .chosen = &s->device,
                            .targets = &s->targets,
                            .head = ef_reader_get_head(s->reader),
                            .illuminant = s->illuminant,
                            .metric = s->metric,
                            .jnd = s->jnd.value};
  return seen_init(&s->seen, &basis, BLOCK_ROWS, notes, error);
}

ef_status match_scene_load(match_scene *s, const command_options *options,
                           const ef_notes *notes, ef_error *error) {
  *s = (match_scene){.options = options};
  ef_status status = set_metric(s, error);
  if (status == EF_OK)
    status = set_light(s, notes, error);
  if (status == EF_OK)
    status = set_device(s, notes, error);
  if (status == EF_OK)
    status = set_targets(s, notes, error);
  if (status == EF_OK)
    status = set_views(s, notes, error);
  if (status == EF_OK)
    status = set_companion(s, error);
  if (status == EF_OK)
    status = set_people(s, notes, error);
  return status;
}

void match_scene_free(match_scene *s) {
  seen_free(&s->seen);
  companion_free(&s->companion);
  targets_free(&s->targets);
  lights_view_free(&s->print);
  lights_free(&s->lights);
  ef_reader_free(s->reader);
  ef_setup_free(s->setup);
  device_free(&s->device);
  ef_illuminant_free(s->illuminant);
  ef_observer_free(s->observer);
  ef_metric_free(s->metric);
}

ef_status match_measure_gamut(match_scene *s, ef_error *error) {
  const ef_status status =
      ef_gamut_measure(s->setup, s->illuminant, s->targets.adaptation,
                       s->options->jobs, &s->gamut, error);
  s->has_gamut = status == EF_OK;
  return status;
}

/* ---- Answers ----------------------------------------------------------- */

const ef_shown *match_achieved(const match_scene *s, const ef_match *m) {
  const bool is_coded =
      device_is_quantised(&s->device) || s->recipes.device != NULL;
  return is_coded ? &m->coded : &m->nearest;
}

/* Adds one more to the mean of n - 1. */
static void add_to_mean(ef_spread *mean, const ef_spread *one, size_t n) {
  mean->mean += (one->mean - mean->mean) / (double)n;
  mean->p95 += (one->p95 - mean->p95) / (double)n;
  mean->share_of_observers +=
      (one->share_of_observers - mean->share_of_observers) / (double)n;
}

/* After the counts of the target. */
static void add_seen(match_summary *sum, const char *name, const ef_match *m,
                     const ef_spread *spread) {
  add_to_mean(&sum->all, spread, sum->n);
  if (m->in_gamut)
    add_to_mean(&sum->in_gamut, spread, sum->n_in_gamut);
  if (sum->n > 1 && !(spread->p95 > sum->worst_seen.p95))
    return;
  sum->worst_seen = *spread;
  snprintf(sum->worst_seen_name, sizeof sum->worst_seen_name, "%s", name);
}

static void add_match(match_summary *sum, const match_scene *s,
                      const char *name, const ef_match *m) {
  const double shown = match_achieved(s, m)->difference;
  const double jnd = s->jnd.value;
  ++sum->n;
  sum->sum += shown;
  sum->mean = sum->sum / (double)sum->n;
  if (sum->n == 1 || shown > sum->worst) {
    sum->worst = shown;
    snprintf(sum->worst_name, sizeof sum->worst_name, "%s", name);
  }
  if (shown > jnd)
    ++sum->n_visible;
  if (shown > s->tolerance)
    ++sum->n_beyond;
  if (m->in_gamut) {
    ++sum->n_in_gamut;
    if (shown > sum->worst_in_gamut)
      sum->worst_in_gamut = shown;
    return;
  }
  const double miss = m->nearest.difference;
  if (miss <= jnd)
    ++sum->n_near;
  if (sum->worst_miss_name[0] == '\0' || miss > sum->worst_miss) {
    sum->worst_miss = miss;
    sum->worst_miss_parts = m->nearest.components;
    sum->worst_miss_target = m->target;
    snprintf(sum->worst_miss_name, sizeof sum->worst_miss_name, "%s", name);
  }
}

void match_summary_add(match_summary *sum, const match_scene *s,
                       const match_rows *rows, size_t i) {
  add_match(sum, s, rows->name[i], &rows->match[i]);
  if (rows->spread != NULL)
    add_seen(sum, rows->name[i], &rows->match[i], &rows->spread[i]);
}

/* ---- Streaming --------------------------------------------------------- */

typedef struct workspace {
  size_t n_rows;
  double *xyz;
  ef_match *match;
  ef_spread *spread;    /* NULL without a population */
  ef_recipe_view *view; /* NULL where nothing is told of other lights */
  ef_recipes *recipe;   /* NULL for what does not mix */
} workspace;

static void workspace_free(workspace *w) {
  free(w->xyz);
  free(w->match);
  free(w->spread);
  free(w->view);
  free(w->recipe);
}

static ef_status workspace_init(workspace *w, const match_scene *s,
                                ef_error *error) {
  const bool has_people = s->seen.people.population != NULL;
  const bool mixes = s->recipes.device != NULL;
  const size_t n_rows = mixes ? BLOCK_RECIPES : BLOCK_ROWS;
  *w = (workspace){.n_rows = n_rows};
  w->xyz = malloc(3 * n_rows * sizeof *w->xyz);
  w->match = malloc(n_rows * sizeof *w->match);
  w->spread = has_people ? malloc(n_rows * sizeof *w->spread) : NULL;
  w->view =
      s->has_views ? malloc(n_rows * s->lights.n * sizeof *w->view) : NULL;
  w->recipe = mixes ? malloc(n_rows * sizeof *w->recipe) : NULL;
  if (w->xyz != NULL && w->match != NULL &&
      (w->spread != NULL || !has_people) &&
      (w->view != NULL || !s->has_views) && (w->recipe != NULL || !mixes))
    return EF_OK;
  return message_fail(error, EF_NO_MEMORY, "out of memory for the matches");
}

/* Values of one target. */
static size_t block_width(const match_scene *s) {
  return ef_reader_get_head(s->reader)->width;
}

static ef_status match_block(match_scene *s, const ef_block *block,
                             const workspace *w, ef_error *error) {
  const int jobs = s->options->jobs;
  ef_status status =
      targets_xyz(&s->targets, block->n, block->value, jobs, w->xyz, error);
  if (status != EF_OK)
    return status;
  if (s->companion.observer == NULL) {
    return ef_match_batch(s->setup, block->n, w->xyz, &s->settings, jobs,
                          w->match, error);
  }
  const double *near;
  status = companion_match(&s->companion, block->n, block->value, jobs, &near,
                           error);
  if (status != EF_OK)
    return status;
  return ef_match_flat_batch(s->setup, block->n, w->xyz, near, &s->settings,
                             jobs, w->match, error);
}

static ef_status look(match_scene *s, const ef_block *block, const workspace *w,
                      ef_error *error) {
  if (!s->seen.has_sides)
    return EF_OK;
  ef_status status = EF_OK;
  for (size_t i = 0; i < block->n && status == EF_OK; ++i) {
    const ef_shown *shown = match_achieved(s, &w->match[i]);
    status = seen_show(&s->seen, i, shown->drive, error);
  }
  if (status == EF_OK)
    status = seen_take(&s->seen, block->n, block->value, error);
  if (status == EF_OK && w->spread != NULL) {
    status =
        seen_rows(&s->seen, block->n, s->options->jobs, w->spread, error);
  }
  return status;
}

/* Recipes of the block's targets; what they show goes to `coded`. */
static ef_status mix_block(match_scene *s, const ef_block *block,
                           const workspace *w, ef_error *error) {
  const size_t n_lights = s->lights.n;
  ef_status status = EF_OK;
  for (size_t i = 0; i < block->n && w->recipe != NULL && status == EF_OK;
       ++i) {
    const double *xyz = w->xyz + 3 * i;
    status = recipes_find(&s->recipes, block->value + i * block_width(s),
                          (ef_xyz){xyz[0], xyz[1], xyz[2]}, &w->recipe[i],
                          &w->match[i].coded, error);
    w->match[i].rounded_difference = (double)NAN;
    if (status == EF_OK && w->view != NULL) {
      memcpy(w->view + i * n_lights,
             recipes_asked(&s->recipes, &w->recipe[i])->view,
             n_lights * sizeof *w->view);
    }
  }
  return status;
}

/* The same of prints, which have no recipe. */
static ef_status light_block(match_scene *s, const ef_block *block,
                             const workspace *w, ef_error *error) {
  ef_status status = EF_OK;
  if (w->view == NULL || w->recipe != NULL)
    return EF_OK;
  for (size_t i = 0; i < block->n && status == EF_OK; ++i) {
    const ef_shown *shown = match_achieved(s, &w->match[i]);
    status = lights_view_of(&s->print, block->value + i * block_width(s),
                            shown->drive, w->view + i * s->lights.n, error);
  }
  return status;
}

static ef_status one_block(match_scene *s, const ef_block *block,
                           const workspace *w, size_t n_sinks,
                           const match_sink *const *sinks, match_summary *sum,
                           ef_error *error) {
  ef_status status = match_block(s, block, w, error);
  if (status == EF_OK)
    status = mix_block(s, block, w, error);
  if (status == EF_OK)
    status = light_block(s, block, w, error);
  if (status == EF_OK)
    status = look(s, block, w, error);
  const match_rows rows = {block->n,  block->name, w->match,
                           w->spread, w->view,     w->recipe};
  for (size_t i = 0; i < block->n && status == EF_OK; ++i) {
    match_summary_add(sum, s, &rows, i);
  }
  for (size_t k = 0; k < n_sinks && status == EF_OK; ++k) {
    status = sinks[k]->rows(sinks[k]->self, s, &rows, error);
  }
  return status;
}

static ef_status all_blocks(match_scene *s, const workspace *w, size_t n_sinks,
                            const match_sink *const *sinks, match_summary *sum,
                            ef_error *error) {
  message_progress progress = message_progress_start(s->options->quiet);
  ef_status status = EF_OK;
  while (status == EF_OK) {
    ef_block block;
    status = ef_reader_next(s->reader, w->n_rows, &block, error);
    if (status != EF_OK || block.n == 0)
      break;
    status = one_block(s, &block, w, n_sinks, sinks, sum, error);
    message_progress_show(&progress, sum->n);
  }
  message_progress_end(&progress);
  sum->n_skipped = ef_reader_skipped(s->reader);
  return status;
}

ef_status match_stream(match_scene *s, size_t n_sinks,
                       const match_sink *const *sinks, match_summary *sum,
                       ef_error *error) {
  *sum = (match_summary){0};
  workspace w;
  ef_status status = workspace_init(&w, s, error);
  for (size_t k = 0; k < n_sinks && status == EF_OK; ++k) {
    status = sinks[k]->begin(sinks[k]->self, s, error);
  }
  if (status == EF_OK) {
    status = all_blocks(s, &w, n_sinks, sinks, sum, error);
  }
  if (sum->n_in_gamut == 0) {
    const double none = (double)NAN;
    sum->in_gamut = (ef_spread){none, none, none};
  }
  if (status == EF_OK && sum->n == 0 && s->options->part == NULL) {
    message_fail(error, EF_MALFORMED,
                 sum->n_skipped > 0 ? "no row is left: every one was at fault"
                                    : "there is a header and no row to read");
    status = message_place(error, s->target_source);
  }
  for (size_t k = 0; k < n_sinks && status == EF_OK; ++k) {
    status = sinks[k]->end(sinks[k]->self, s, sum, error);
  }
  workspace_free(&w);
  return status;
}
