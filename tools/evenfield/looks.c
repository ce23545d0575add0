/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "looks.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "source.h"
#include "viewing.h"

/* ---- Words ------------------------------------------------------------- */

static bool starts_with(const char *text, const char *start) {
  return strncmp(text, start, strlen(start)) == 0;
}

/* How a light is called; true for one that has no name of the trade. */
static bool light_words(const char *name, char words[200]) {
  static const struct {
    const char *start, *words;
  } known[] = {
      {"D50", "in daylight"},           {"D55", "in daylight"},
      {"D65", "in daylight"},           {"D75", "in daylight"},
      {"daylight:", "in daylight"},     {"planck:", "in incandescent light"},
      {"FL", "in fluorescent light"},   {"LED-", "in LED light"},
      {"HP", "in discharge-lamp light"}};
  for (size_t i = 0; i < sizeof known / sizeof known[0]; ++i) {
    if (starts_with(name, known[i].start)) {
      snprintf(words, 200, "%s (%.100s)", known[i].words, name);
      return false;
    }
  }
  if (strcmp(name, "A") == 0) {
    snprintf(words, 200, "in incandescent light (A)");
    return false;
  }
  snprintf(words, 200, "in the light of %.150s", name != NULL ? name : "");
  return strcmp(name, "C") != 0 && strcmp(name, "E") != 0;
}

static void look_words(look *at, bool many_observers) {
  at->is_own = light_words(ef_illuminant_name(at->illuminant), at->words);
  if (!many_observers)
    return;
  const size_t length = strlen(at->words);
  snprintf(at->words + length, sizeof at->words - length, " as %.60s sees them",
           ef_observer_name(at->observer));
}

/* ---- Loading ----------------------------------------------------------- */

static ef_status load_lights(looks *l, const command_options *o,
                             size_t n_defaults, const char *const *defaults,
                             const ef_notes *notes, ef_error *error) {
  const bool asked = o->lights.n > 0;
  const size_t n = asked ? o->lights.n : n_defaults;
  l->light = calloc(n, sizeof *l->light);
  if (l->light == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for lights");
  for (size_t i = 0; i < n; ++i) {
    const char *name = asked ? o->lights.text[i] : defaults[i];
    l->light[i] = source_illuminant(o, "illuminant", name, notes, error);
    if (l->light[i] == NULL)
      return error->status;
    l->n_lights = i + 1;
  }
  return EF_OK;
}

/* Besides those asked for, another standard observer: 10 degrees beside 2, and
 * 2 beside any other. */
static ef_status load_observers(looks *l, const command_options *o,
                                const ef_notes *notes, ef_error *error) {
  const size_t n_asked = o->observers.n > 0 ? o->observers.n : 1;
  l->observer = calloc(n_asked + 1, sizeof *l->observer);
  if (l->observer == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for observers");
  for (size_t i = 0; i < n_asked; ++i) {
    const char *name = o->observers.n > 0 ? o->observers.text[i] : "cie-1931";
    l->observer[i] = source_observer_named(o, name, "--observer", notes, error);
    if (l->observer[i] == NULL)
      return error->status;
    l->n_observers = i + 1;
  }
  const bool is_1931 =
      strcmp(ef_observer_name(l->observer[0]), "cie-1931") == 0;
  l->observer[n_asked] =
      ef_observer_new(is_1931 ? "cie-1964" : "cie-1931", error);
  return l->observer[n_asked] != NULL ? EF_OK : error->status;
}

static ef_status set_look(looks *l, size_t i, size_t light, size_t observer,
                          const command_options *o, ef_error *error) {
  look *at = &l->at[i];
  *at = (look){.illuminant = l->light[light],
               .observer = l->observer[observer],
               .light = light};
  ef_status status =
      colour_basis_init(&at->basis, at->observer, at->illuminant, error);
  if (status == EF_OK)
    status = viewing_conditions(o, at->basis.white, &at->conditions, error);
  look_words(at, l->n_observers > 1);
  return status;
}

ef_status looks_init(looks *l, const command_options *options,
                     size_t n_defaults, const char *const *defaults,
                     const ef_notes *notes, ef_error *error) {
  *l = (looks){0};
  ef_status status =
      load_lights(l, options, n_defaults, defaults, notes, error);
  if (status == EF_OK)
    status = load_observers(l, options, notes, error);
  if (status != EF_OK)
    return status;
  l->n = l->n_lights * l->n_observers;
  if (l->n > LOOKS_MOST) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "%zu lights and %zu observers are %zu looks; up to %d "
                        "can be compared at once",
                        l->n_lights, l->n_observers, l->n, LOOKS_MOST);
  }
  for (size_t i = 0; i < l->n && status == EF_OK; ++i) {
    status = set_look(l, i, i % l->n_lights, i / l->n_lights, options, error);
  }
  l->has_other = l->n_observers == 1;
  if (status == EF_OK && l->has_other)
    status = set_look(l, l->n, 0, l->n_observers, options, error);
  return status;
}

void looks_free(looks *l) {
  for (size_t i = 0; l->light != NULL && i < l->n_lights; ++i)
    ef_illuminant_free(l->light[i]);
  for (size_t i = 0; l->observer != NULL && i <= l->n_observers; ++i)
    ef_observer_free(l->observer[i]); /* with the other one */
  free(l->light);
  free(l->observer);
  *l = (looks){0};
}

void looks_keep_first(looks *l) {
  ef_observer_free(l->observer[l->n_observers]);
  l->observer[l->n_observers] = NULL;
  l->n = 1;
  l->has_other = false;
}

/* ---- The rows of a file ------------------------------------------------ */

/* Whose weight lies outside the measured range most. */
static void note_outside(const looks_colours *c, const looks *l,
                         const ef_reader_head *head, const ef_notes *notes) {
  double worst = 0.0;
  size_t at = 0;
  for (size_t i = 0; i < c->n; ++i) {
    for (size_t k = 0; k < ef_weights_channels(c->at[i].weights); ++k) {
      const double share = ef_weights_outside(c->at[i].weights, k);
      if (share <= worst)
        continue;
      worst = share;
      at = i;
    }
  }
  if (worst <= 0.001)
    return;
  char percent[EF_NUMBER_TEXT], first[EF_NUMBER_TEXT], last[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * worst, 2, percent);
  ef_number_format(ef_grid_wavelength(&head->grid, 0), first);
  ef_number_format(ef_grid_wavelength(&head->grid, head->grid.count - 1), last);
  message_note(notes,
               "%s: up to %s %% of a weight (under %s) lies outside the "
               "measured %s to %s nm, where the end values were held",
               head->file, percent, ef_illuminant_name(l->at[at].illuminant),
               first, last);
}

static ef_status refuse_lights(const ef_reader_head *head, ef_error *error) {
  message_fail(error, EF_MALFORMED,
               "spectra of lights have no white to be seen against; pairs are "
               "of surfaces or colours (--kind surface if these are "
               "reflectances)");
  return message_place(error, head->file);
}

static ef_status set_scale(looks_colours *c, const command_options *options,
                           const ef_reader_head *head, ef_error *error) {
  c->scale = 1.0;
  if (head->content == EF_CONTENT_SPECTRA || !head->absolute)
    return EF_OK;
  if (isnan(options->white_cd_m2)) {
    message_fail(error, EF_NO_ANSWER,
                 "the colours are in cd/m2, and a difference needs to know the "
                 "white's: give --white-luminance");
    return message_place(error, head->file);
  }
  c->scale = 100.0 / options->white_cd_m2;
  return EF_OK;
}

ef_status looks_colours_init(looks_colours *c, const looks *l,
                             const command_options *options,
                             const ef_reader_head *head, const ef_notes *notes,
                             ef_error *error) {
  *c = (looks_colours){0};
  const bool spectra = head->content == EF_CONTENT_SPECTRA;
  if (spectra && head->kind == EF_LIGHT)
    return refuse_lights(head, error);
  ef_status status = set_scale(c, options, head, error);
  const size_t n = l->n + (l->has_other ? 1 : 0);
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    c->n = i + 1;
    status = colours_init(&c->at[i], &l->at[i].basis, head,
                          i == 0 && !spectra ? notes : NULL, error);
  }
  if (status == EF_OK && spectra)
    note_outside(c, l, head, notes);
  return status;
}

void looks_colours_free(looks_colours *c) {
  for (size_t i = 0; i < c->n; ++i)
    colours_free(&c->at[i]);
  c->n = 0;
}

ef_status looks_colours_xyz(const looks_colours *c, size_t i, size_t n,
                            const double *value, int jobs, double *xyz,
                            ef_error *error) {
  const ef_status status = colours_xyz(&c->at[i], n, value, jobs, xyz, error);
  for (size_t k = 0; k < 3 * n && c->scale != 1.0; ++k)
    xyz[k] *= c->scale;
  return status;
}
