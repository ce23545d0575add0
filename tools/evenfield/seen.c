/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "seen.h"

#include <math.h>
#include <stdlib.h>

#include "message.h"

/* ---- Whether there is an answer ---------------------------------------- */

static bool has_spectra(const seen_basis *b) {
  return ef_device_has_spectra(ef_setup_device(b->setup)) &&
         b->head->content == EF_CONTENT_SPECTRA;
}

static ef_status check_spectra(const seen_basis *b, ef_error *error) {
  static const char why[] = "what other people see follows from spectra only";
  const device_words *words = &b->chosen->kind->words;
  if (!ef_device_has_spectra(ef_setup_device(b->setup))) {
    message_fail(error, EF_NO_ANSWER,
                 "%s, and this %s is known without: --population needs a file "
                 "for --%s with %s",
                 why, words->noun, b->chosen->kind->option, words->spectra);
    return message_place(error, b->chosen->source);
  }
  if (b->head->content == EF_CONTENT_SPECTRA)
    return EF_OK;
  message_fail(error, EF_NO_ANSWER,
               "%s, and the targets are %s: --population needs their spectra",
               why, ef_content_text(b->head->content));
  return message_place(error, b->head->file);
}

/* ---- Both sides -------------------------------------------------------- */

static double *room(size_t n_rows, size_t n_samples) {
  return malloc(n_rows * n_samples * sizeof(double));
}

static ef_status set_match(seen *s, const seen_basis *b, size_t most_rows,
                           ef_error *error) {
  const ef_grid *grid = ef_device_grid(s->device);
  s->white = room(1, grid->count);
  s->shown = room(most_rows, grid->count);
  if (s->white == NULL || s->shown == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for spectra");
  s->match = (ef_side){.grid = *grid,
                       .sample = s->shown,
                       .viewing = ef_viewing_default(NULL),
                       .white = s->white};
  if (ef_device_reflects(s->device)) {
    s->match.viewing = ef_viewing_default(b->illuminant);
    s->match.white = NULL;
    return EF_OK;
  }
  double full[EF_MAX_DRIVES];
  for (size_t i = 0; i < EF_MAX_DRIVES; ++i)
    full[i] = 1.0;
  return ef_device_spectrum(s->device, full, s->white, NULL, error);
}

/* Lights are seen beside the display, against its white. Both go to the grid on
 * which all is summed, so that the white keeps its narrow lines however coarse
 * the targets are. */
static ef_status set_lights(seen *s, size_t most_rows, ef_error *error) {
  const ef_grid standard = ef_grid_standard();
  s->light_white = room(1, standard.count);
  s->light = room(most_rows, standard.count);
  if (s->light_white == NULL || s->light == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for spectra");
  s->target = (ef_side){.grid = standard,
                        .sample = s->light,
                        .viewing = ef_viewing_default(NULL),
                        .white = s->light_white};
  return ef_resample(&s->match.grid, 1, s->white, &standard,
                     EF_INTERPOLATE_AUTO, EF_EXTEND_ZERO, s->light_white,
                     error);
}

bool seen_is_asked(const command_options *options) {
  return !isnan(options->population) || options->categories > 0;
}

ef_status seen_init(seen *s, const seen_basis *basis, size_t most_rows,
                    const ef_notes *notes, ef_error *error) {
  const seen_basis *b = basis;
  const ef_observer *observer = ef_setup_observer(b->setup);
  *s = (seen){.device = ef_setup_device(b->setup),
              .grid = b->head->grid,
              .notes = notes,
              .settings = {.metric = b->metric,
                           .adaptation = b->targets->adaptation,
                           .threshold = b->jnd}};
  const command_options *o = b->options;
  const bool is_asked = seen_is_asked(o);
  if (!is_asked && (o->report == NULL || !has_spectra(b)))
    return EF_OK;
  ef_status status = is_asked ? check_spectra(b, error) : EF_OK;
  s->has_sides = true;
  if (status == EF_OK && is_asked) {
    status =
        people_load(&s->people, o, PEOPLE_CHOSEN_FROM, observer, notes, error);
  }
  if (status == EF_OK && o->categories > 0) {
    status = people_choose(&s->people, (size_t)o->categories, o->jobs, error);
    s->settings.weight = s->people.share;
  }
  if (status == EF_OK)
    status = set_match(s, b, most_rows, error);
  s->is_light = b->head->kind == EF_LIGHT;
  if (status == EF_OK && s->is_light)
    return set_lights(s, most_rows, error);
  s->target =
      (ef_side){.grid = s->grid, .viewing = ef_viewing_default(b->illuminant)};
  return status;
}

void seen_free(seen *s) {
  people_free(&s->people);
  free(s->white);
  free(s->shown);
  free(s->light_white);
  free(s->light);
}

/* ---- Looking ----------------------------------------------------------- */

ef_status seen_show(seen *s, size_t row, const double *drive, ef_error *error) {
  return ef_device_spectrum(s->device, drive,
                            s->shown + row * s->match.grid.count, NULL, error);
}

ef_status seen_take(seen *s, size_t n, const double *value, ef_error *error) {
  if (s->is_light) {
    return ef_resample(&s->grid, n, value, &s->target.grid,
                       EF_INTERPOLATE_AUTO, EF_EXTEND_ZERO, s->light, error);
  }
  s->target.sample = value;
  return EF_OK;
}

ef_status seen_rows(seen *s, size_t n, int jobs, ef_spread *out,
                    ef_error *error) {
  const ef_status status =
      ef_population_spread(s->people.population, n, &s->target, &s->match,
                           &s->settings, jobs, out, NULL, s->notes, error);
  s->notes = NULL; /* what lies outside the samples is said once */
  return status;
}
