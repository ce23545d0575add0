/* SPDX-License-Identifier: GPL-3.0-or-later */
/* --colourants: what is mixed, from absorption and scattering as they are given
 * or as they are fitted to drawdowns. */
#include "device.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "match.h"
#include "message.h"
#include "residuals.h"
#include "rows.h"
#include "source.h"
#include "weighed.h"
#include "words.h"

static const char demo[] = "demo:livery-colourants";

typedef struct paints {
  ef_colourants *set; /* those that are mixed; owned */
  size_t base;        /* of them; SIZE_MAX: none */
  size_t n_drawdowns; /* 0: K and S were given */
  bool single_constant;
  double relative_rms; /* of the reflectances of all drawdowns */
  residuals fit;       /* of the drawdowns */
  ef_mixture_settings settings;
  char *substrate_name;
  double *substrate; /* owned, on the grid of the set */
} paints;

static void free_own(chosen_device *d) {
  paints *own = d->own;
  if (own == NULL)
    return;
  ef_colourants_free(own->set);
  free(own->substrate_name);
  free(own->substrate);
  free(own);
}

/* ---- The base ---------------------------------------------------------- */

/* Index of the base in a set of colourants: --base, else the first. */
static ef_status find_base(const device_basis *b, const ef_colourants *set,
                           const char *file, size_t *base, ef_error *error) {
  const char *name = b->options->base;
  *base = SIZE_MAX;
  if (name != NULL && strcmp(name, "none") == 0)
    return EF_OK;
  if (name != NULL) {
    return ef_colourants_find(set, name, base, error) == EF_OK
               ? EF_OK
               : message_option(error, "base", "");
  }
  *base = 0;
  message_note(b->notes,
               "%s: '%s' is taken as the base, the rest of every mixture; "
               "--base names another, or none",
               file, ef_colourants_name(set, 0));
  return EF_OK;
}

/* ---- Absorption and scattering as given -------------------------------- */

static ef_status from_spectra(const rows *r, const ef_reader_head *head,
                              paints *own, ef_error *error) {
  ef_spectra *spectra = rows_spectra(r, head, error);
  if (spectra == NULL)
    return error->status;
  own->set = ef_colourants_from_spectra(spectra, error);
  ef_spectra_free(spectra);
  return own->set != NULL ? EF_OK : error->status;
}

/* ---- Drawdowns --------------------------------------------------------- */

/* What each drawdown reflects, and what lies under it. */
static ef_status gather(const weighed *w, const rows *r, size_t count,
                        double **reflectance, double **backing,
                        ef_error *error) {
  *reflectance = calloc(w->n, count * sizeof **reflectance);
  *backing = calloc(w->n, count * sizeof **backing);
  if (*reflectance == NULL || *backing == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for drawdowns");
  for (size_t i = 0; i < w->n; ++i) {
    memcpy(*reflectance + i * count, r->value + w->row[i] * count,
           count * sizeof **reflectance);
    if (w->over[i] != SIZE_MAX)
      memcpy(*backing + i * count, r->value + w->over[i] * count,
             count * sizeof **backing);
  }
  return EF_OK;
}

static ef_status xyz_of(const ef_weights *weights, const double *spectrum,
                        ef_xyz *out, ef_error *error) {
  double xyz[3];
  const ef_status status =
      ef_weights_apply(weights, 1, spectrum, 1, xyz, error);
  *out = (ef_xyz){xyz[0], xyz[1], xyz[2]};
  return status;
}

/* The fitted colourants mixed again as drawdown `i`. */
static ef_status mix_again(const paints *own, const weighed *w, size_t i,
                           const double *backing, double *spectrum,
                           ef_error *error) {
  ef_mixture_settings settings = own->settings;
  settings.base = own->base;
  settings.total_loading = 1.0;
  settings.thickness = w->thickness[i];
  settings.substrate = isfinite(w->thickness[i]) ? backing : NULL;
  ef_device *mixture = ef_mixture_new("drawdown", own->set, &settings, error);
  if (mixture == NULL)
    return error->status;
  double share[EF_MAX_COLOURANTS];
  memcpy(share, w->concentration + i * w->n_colourants,
         w->n_colourants * sizeof *share);
  if (own->single_constant)
    share[own->base] = 1.0;
  const ef_status status =
      ef_mixture_spectrum(mixture, share, spectrum, NULL, error);
  ef_device_free(mixture);
  return status;
}

/* How far the drawdowns lie from what the fit says of them. */
static ef_status judge(const device_basis *b, paints *own, const weighed *w,
                       const rows *r, const ef_grid *grid,
                       const double *reflectance, const double *backing,
                       ef_error *error) {
  const size_t count = grid->count;
  const ef_viewing viewing = ef_viewing_default(b->illuminant);
  colour_basis light;
  ef_residual *residual = calloc(w->n, sizeof *residual);
  double *spectrum = malloc(count * sizeof *spectrum);
  ef_weights *weights = ef_observer_weights(b->observer, EF_TRISTIMULUS, grid,
                                            &viewing, NULL, error);
  ef_status status = weights == NULL ? error->status
                                     : colour_basis_init(&light, b->observer,
                                                         b->illuminant, error);
  if (residual == NULL || spectrum == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for residuals");
  for (size_t i = 0; i < w->n && status == EF_OK; ++i) {
    residual[i].row = w->row[i];
    residual[i].white = light.white;
    status = mix_again(own, w, i, backing + i * count, spectrum, error);
    if (status == EF_OK)
      status = xyz_of(weights, spectrum, &residual[i].predicted, error);
    if (status == EF_OK)
      status = xyz_of(weights, reflectance + i * count, &residual[i].measured,
                      error);
  }
  if (status == EF_OK)
    status = residuals_of(&own->fit, b->metric, w->n, residual, r, error);
  ef_weights_free(weights);
  free(residual);
  free(spectrum);
  return status;
}

static size_t base_among(const weighed *w, const char *name) {
  for (size_t i = 0; name != NULL && i < w->n_colourants; ++i) {
    if (strcmp(w->colourant[i], name) == 0)
      return i;
  }
  return name == NULL ? 0 : SIZE_MAX;
}

static ef_status fit(const device_basis *b, const weighed *w, const rows *r,
                     const ef_reader_head *head, paints *own, ef_error *error) {
  double *reflectance = NULL, *backing = NULL;
  double *rms = calloc(w->n, sizeof *rms);
  ef_status status =
      gather(w, r, head->grid.count, &reflectance, &backing, error);
  if (rms == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for drawdowns");
  ef_colourant_fit_settings settings = ef_colourant_fit_settings_default();
  settings.single_constant = own->single_constant;
  settings.base = base_among(w, b->options->base);
  settings.surface = own->settings.surface;
  const ef_drawdowns drawdowns = {.n_drawdowns = w->n,
                                  .n_colourants = w->n_colourants,
                                  .name = (const char *const *)w->colourant,
                                  .concentration = w->concentration,
                                  .thickness =
                                      w->has_films ? w->thickness : NULL,
                                  .backing = w->has_films ? backing : NULL,
                                  .reflectance = reflectance,
                                  .grid = head->grid,
                                  .line = w->line};
  if (status == EF_OK) {
    own->set = ef_colourants_fit(&drawdowns, &settings, rms, error);
    status =
        own->set == NULL ? message_place(error, b->options->weighed) : EF_OK;
  }
  if (status == EF_OK)
    status = find_base(b, own->set, b->options->weighed, &own->base, error);
  if (status == EF_OK)
    status = judge(b, own, w, r, &head->grid, reflectance, backing, error);
  for (size_t i = 0; i < w->n && status == EF_OK; ++i)
    own->relative_rms += rms[i] * rms[i] / (double)w->n;
  own->relative_rms = sqrt(own->relative_rms);
  own->n_drawdowns = w->n;
  free(reflectance);
  free(backing);
  free(rms);
  return status;
}

static ef_status from_drawdowns(const device_basis *b, const rows *r,
                                const ef_reader_head *head, paints *own,
                                ef_error *error) {
  if (head->content != EF_CONTENT_SPECTRA || head->kind != EF_SURFACE) {
    message_fail(error, EF_MALFORMED,
                 "drawdowns are reflectance spectra of surfaces, and these are "
                 "%s",
                 head->content == EF_CONTENT_SPECTRA
                     ? "of lights"
                     : ef_content_text(head->content));
    return message_place(error, head->file);
  }
  weighed w;
  ef_status status =
      weighed_read(b->options->weighed, r, head->file, b->notes, &w, error);
  if (status == EF_OK)
    status = fit(b, &w, r, head, own, error);
  weighed_free(&w);
  return status;
}

/* ---- Which of them, over what ------------------------------------------ */

/* Of the whole set those of --use, behind the base. */
static ef_status pick(const device_basis *b, paints *own, ef_error *error) {
  const char *at = b->options->use;
  if (at == NULL)
    return EF_OK;
  size_t index[EF_MAX_COLOURANTS], n = 0;
  if (own->base != SIZE_MAX)
    index[n++] = own->base;
  while (*at != '\0') {
    char name[64];
    const size_t length = strcspn(at, ",");
    snprintf(name, sizeof name, "%.*s", (int)(length < 63 ? length : 63), at);
    at += length + (at[length] == ',' ? 1 : 0);
    size_t i;
    if (ef_colourants_find(own->set, name, &i, error) != EF_OK)
      return message_option(error, "use", "");
    for (size_t k = 0; k < n; ++k) {
      if (index[k] == i) {
        message_fail(error, EF_UNKNOWN_NAME, "'%s' is named twice%s", name,
                     i == own->base ? ": it is the base" : "");
        return message_option(error, "use", "");
      }
    }
    if (n == EF_MAX_COLOURANTS)
      break;
    index[n++] = i;
  }
  ef_colourants *picked = ef_colourants_pick(own->set, n, index, error);
  if (picked == NULL)
    return error->status;
  ef_colourants_free(own->set);
  own->set = picked;
  if (own->base != SIZE_MAX)
    own->base = 0;
  return EF_OK;
}

/* A recipe has three: who has more must choose. */
static ef_status check_count(const paints *own, bool is_film, const char *file,
                             ef_error *error) {
  const char *name[3] = {NULL};
  size_t n = 0;
  if (own->base == SIZE_MAX && !is_film)
    return EF_OK; /* no mixture at all, as will be said */
  for (size_t i = 0; i < ef_colourants_count(own->set); ++i) {
    if (i == own->base)
      continue;
    if (n < 3)
      name[n] = ef_colourants_name(own->set, i);
    ++n;
  }
  if (n <= 3)
    return EF_OK;
  message_fail(error, EF_NO_ANSWER,
               "there are %zu colourants%s, and a recipe is found for three: "
               "choose them, for instance --use %.60s,%.60s,%.60s",
               n, own->base != SIZE_MAX ? " beside the base" : "", name[0],
               name[1], name[2]);
  return message_place(error, file);
}

static ef_status set_substrate(const device_basis *b, paints *own,
                               ef_error *error) {
  const command_options *o = b->options;
  if (isnan(o->film))
    return EF_OK;
  const ef_grid *grid = ef_colourants_grid(own->set);
  ef_spectra *spectra = NULL;
  size_t at = 0;
  ef_status status = source_surface(o, "substrate", o->substrate, b->notes,
                                    &spectra, &at, error);
  if (status != EF_OK)
    return status;
  own->substrate = malloc(grid->count * sizeof *own->substrate);
  own->substrate_name = strdup(ef_spectra_name(spectra, at));
  if (own->substrate == NULL || own->substrate_name == NULL) {
    status = message_fail(error, EF_NO_MEMORY, "out of memory for a substrate");
  } else {
    const ef_grid *from = ef_spectra_grid(spectra);
    status = ef_resample(from, 1, ef_spectra_values(spectra) + at * from->count,
                         grid, EF_INTERPOLATE_AUTO, EF_EXTEND_HOLD,
                         own->substrate, error);
  }
  ef_spectra_free(spectra);
  own->settings.thickness = o->film;
  own->settings.substrate = own->substrate;
  return status;
}

static ef_status set_surface(const command_options *o, paints *own,
                             ef_error *error) {
  own->settings = ef_mixture_settings_default();
  if (isnan(o->refractive_index))
    return EF_OK;
  return ef_surface_from_index(o->refractive_index, o->specular == 0,
                               &own->settings.surface, NULL, error);
}

/* ---- Loading ----------------------------------------------------------- */

static ef_status read_set(const device_basis *b, chosen_device *out,
                          char name[300], ef_error *error) {
  paints *own = out->own;
  const bool drawn = b->options->weighed != NULL;
  ef_reader *reader =
      source_reader(b->options, out->source,
                    drawn ? EF_KIND_AUTO : EF_KIND_FUNCTION, b->notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  snprintf(name, 300, "%.299s",
           head->title[0] != '\0' ? head->title : head->file);
  rows r = {0};
  ef_status status = EF_OK;
  if (!drawn && head->content != EF_CONTENT_SPECTRA) {
    status = message_fail(error, EF_MALFORMED,
                          "colourants are spectra of absorption and "
                          "scattering, NAME_k and NAME_s, not %s; drawdowns "
                          "need --weighed",
                          ef_content_text(head->content));
  }
  if (status == EF_OK)
    status = rows_read(reader, &r, error);
  if (status == EF_OK) {
    status = drawn ? from_drawdowns(b, &r, head, own, error)
                   : from_spectra(&r, head, own, error);
  }
  if (status == EF_OK && !drawn)
    status = find_base(b, own->set, head->file, &own->base, error);
  rows_free(&r);
  ef_reader_free(reader);
  return status;
}

static ef_status load(const device_basis *b, chosen_device *out,
                      ef_error *error) {
  const command_options *o = b->options;
  if (out->is_demo)
    out->source = demo;
  out->is_subtractive = true;
  paints *own = calloc(1, sizeof *own);
  out->own = own;
  if (own == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for colourants");
  own->single_constant = o->single_constant;
  if (!isnan(o->step_g)) {
    char number[EF_NUMBER_TEXT];
    ef_number_format(o->step_g, number);
    snprintf(out->step, sizeof out->step, "%.16s g", number);
  }
  char name[300];
  ef_status status = set_surface(o, own, error);
  if (status == EF_OK)
    status = read_set(b, out, name, error);
  if (status == EF_OK)
    status = pick(b, own, error);
  if (status == EF_OK)
    status = check_count(own, !isnan(o->film), out->source, error);
  if (status == EF_OK)
    status = set_substrate(b, own, error);
  if (status != EF_OK)
    return status;
  if (ef_colourants_scattering(own->set, 0) == NULL && !isnan(o->step_g)) {
    return message_fail(error, EF_MALFORMED,
                        "--step-g needs absorption and scattering: in "
                        "single-constant theory colourants are told in shares "
                        "of the base, which no step of the scales divides");
  }
  own->settings.base = own->base;
  own->settings.total_loading =
      isnan(o->total_loading) ? 1.0 : o->total_loading / 100.0;
  own->single_constant = ef_colourants_scattering(own->set, 0) == NULL;
  out->device = ef_mixture_new(name, own->set, &own->settings, error);
  return out->device != NULL ? EF_OK : error->status;
}

/* ---- What it rests on -------------------------------------------------- */

static void add_number(text *t, const char *before, double value, int decimals,
                       const char *behind) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(value, decimals, number);
  text_format(t, "%s%s%s", before, number, behind);
}

static void add_theory(text *out, const match_scene *s) {
  const paints *own = s->device.own;
  const command_options *o = s->options;
  text t = {0};
  text_format(&t, "Kubelka-Munk, %s",
              own->single_constant ? "the ratio K/S of each colourant in units "
                                     "of the base's scattering"
                                   : "absorption and scattering of each");
  if (isnan(o->film))
    text_add(&t, "; opaque");
  else {
    add_number(&t, "; a film of thickness ", o->film, 3, " over ");
    text_format(&t, "%s (%s)", own->substrate_name, o->substrate);
  }
  if (isnan(o->refractive_index)) {
    text_add(&t, "; no reflection at the surface is taken out");
  } else {
    add_number(&t, "; a surface of refractive index ", o->refractive_index, 2,
               o->specular == 0 ? ", specular reflection included"
                                : ", specular reflection excluded");
    text_add(&t, " (Saunderson 1942)");
  }
  text_label(out, "Theory", &t);
}

static void describe(text *out, const match_scene *s) {
  const paints *own = s->device.own;
  text t = {0};
  text_format(&t, "%s (%s), known from ", ef_device_name(s->device.device),
              s->device.source);
  if (own->n_drawdowns > 0) {
    text_format(&t, "%zu drawdowns (weighed: %s)", own->n_drawdowns,
                s->options->weighed);
  } else {
    text_add(&t, own->single_constant ? "K/S of each"
                                      : "absorption and scattering of each");
  }
  if (own->base != SIZE_MAX) {
    text_format(&t, "; base %s", ef_colourants_name(own->set, own->base));
  }
  add_number(&t, "; total loading at most ",
             100.0 * own->settings.total_loading, 1, " %");
  text_label(out, "Colourants", &t);
  add_theory(out, s);
  if (s->recipes.grid.count > 0) {
    text_add(&t, "what is to be expected (root of the mean square) in a light "
                 "that is not known: one of those above, its power at every "
                 "wavelength off by chance by as much as it is itself, in peaks "
                 "of 10 nm");
    text_label(out, "Any light", &t);
  }
  if (own->n_drawdowns == 0)
    return;
  add_number(&t, "the drawdowns differ from what was fitted to them by ",
             100.0 * own->relative_rms, 2,
             " % of their reflectance (root mean "
             "square), in colour ");
  residuals_add(&t, &own->fit, s->metric);
  text_label(out, "Fit", &t);
}

/* ---- As data ----------------------------------------------------------- */

static void write(ef_json *j, const match_scene *s) {
  const paints *own = s->device.own;
  const command_options *o = s->options;
  ef_json_text(j, "known_from",
               own->n_drawdowns > 0 ? "drawdowns"
                                    : "absorption and scattering");
  ef_json_text(j, "theory",
               own->single_constant ? "single-constant" : "two-constant");
  ef_json_begin_array(j, "colourants");
  for (size_t i = 0; i < ef_colourants_count(own->set); ++i)
    ef_json_text(j, NULL, ef_colourants_name(own->set, i));
  ef_json_end_array(j);
  ef_json_text(j, "base",
               own->base != SIZE_MAX ? ef_colourants_name(own->set, own->base)
                                     : NULL);
  ef_json_number(j, "total_loading", own->settings.total_loading);
  ef_json_number(j, "film_thickness", o->film);
  ef_json_text(j, "substrate", own->substrate_name);
  ef_json_number(j, "refractive_index", o->refractive_index);
  ef_json_number(j, "batch_g", o->batch_g);
  ef_json_number(j, "step_g", o->step_g);
  if (own->n_drawdowns == 0)
    return;
  ef_json_integer(j, "drawdowns", (int64_t)own->n_drawdowns);
  ef_json_number(j, "relative_rms", own->relative_rms);
  residuals_write(j, "fit", &own->fit);
}

const device_kind device_colourants = {
    .key = "mixture",
    .option = "colourants",
    .illuminant = "D65",
    .demo_story = "mixed from the paint shop's pastes",
    .demo_device = "the demo's paint shop",
    .words = {.noun = "colourant set",
              .title = "Colourants",
              .shows = "mix",
              .shown = "mixed",
              .amounts = "Recipe, %",
              .channel = "colourant",
              .channels = "colourants beside the base",
              .spectra = "absorption and scattering",
              .none = "base alone",
              .all = NULL},
    .load = load,
    .free = free_own,
    .describe = describe,
    .write = write};
