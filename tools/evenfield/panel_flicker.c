/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_flicker.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "rows.h"
#include "source.h"

static const char demo_settings[] = "demo:flicker-settings";
static const char demo_lights[] = "demo:lab-display";

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the settings");
}

/* ---- Lights ------------------------------------------------------------ */

static ef_status name_lights(panel_flicker *p, const rows *all,
                             ef_error *error) {
  for (size_t i = 0; i < all->n; ++i) {
    const size_t at = name_list_place(&p->lights, all->name[i]);
    if (at == SIZE_MAX)
      return out_of_memory(error);
    if (at < i) {
      message_fail(error, EF_MALFORMED, "two lights are called %.100s",
                   all->name[i]);
      return message_place(error, p->lights_path);
    }
    p->has_stray = p->has_stray || strcmp(all->name[i], "black") == 0;
  }
  return EF_OK;
}

static ef_status excite(panel_flicker *p, const ef_reader_head *head,
                        const rows *all, const ef_notes *notes,
                        ef_error *error) {
  const ef_viewing viewing = ef_viewing_default(NULL);
  double *lms = malloc(3 * all->n * sizeof *lms);
  p->excitation = malloc(2 * all->n * sizeof *p->excitation);
  if (lms == NULL || p->excitation == NULL) {
    free(lms);
    return out_of_memory(error);
  }
  ef_weights *weights = ef_observer_weights(p->observer, EF_CONES, &head->grid,
                                            &viewing, notes, error);
  ef_status status = weights == NULL
                         ? message_place(error, p->lights_path)
                         : ef_weights_apply(weights, all->n, all->value,
                                            p->options->jobs, lms, error);
  for (size_t i = 0; i < all->n && status == EF_OK; ++i) {
    p->excitation[2 * i] = lms[3 * i];
    p->excitation[2 * i + 1] = lms[3 * i + 1];
  }
  ef_weights_free(weights);
  free(lms);
  return status;
}

static ef_status read_lights(panel_flicker *p, const ef_notes *notes,
                             ef_error *error) {
  ef_reader *reader =
      source_reader(p->options, p->lights_path, EF_KIND_LIGHT, notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  rows all = {0};
  ef_status status = EF_OK;
  if (head->content != EF_CONTENT_SPECTRA) {
    message_fail(error, EF_MALFORMED,
                 "spectra of lights are needed here, not "
                 "%s",
                 ef_content_text(head->content));
    status = message_place(error, p->lights_path);
  }
  if (status == EF_OK)
    status = rows_read(reader, &all, error);
  if (status == EF_OK)
    status = name_lights(p, &all, error);
  if (status == EF_OK)
    status = excite(p, head, &all, notes, error);
  rows_free(&all);
  ef_reader_free(reader);
  return status;
}

/* ---- Settings ---------------------------------------------------------- */

enum {
  FIRST,
  FIRST_AMOUNT,
  SECOND,
  SECOND_AMOUNT,
  N_NEEDED,
  OBSERVER = N_NEEDED,
  N_FIELDS
};
static const char *const columns[N_FIELDS] = {"first", "first_amount", "second",
                                              "second_amount", "observer"};

static size_t find_light(const panel_flicker *p, const char *name) {
  for (size_t i = 0; i < p->lights.n; ++i) {
    if (strcmp(p->lights.name[i], name) == 0)
      return i;
  }
  return SIZE_MAX;
}

/* Stray light is there whatever is shown, and stands in every spectrum. */
static void set_cones(panel_flicker *p, size_t light, double amount,
                      double cone[2]) {
  const double *full = p->excitation + 2 * light;
  const size_t stray = p->has_stray ? find_light(p, "black") : SIZE_MAX;
  for (size_t k = 0; k < 2; ++k) {
    const double black = stray == SIZE_MAX ? 0.0 : p->excitation[2 * stray + k];
    cone[k] = light == stray ? black : black + amount * (full[k] - black);
  }
}

static ef_status read_side(panel_flicker *p, ef_fields *fields,
                           const char *const *cell, size_t side,
                           ef_error *error) {
  const size_t field = side == 0 ? FIRST : SECOND;
  const size_t light = find_light(p, cell[field]);
  if (light == SIZE_MAX) {
    return ef_fields_fault(fields, field, error,
                           "%.100s has no light called '%.60s'", p->lights_path,
                           cell[field]);
  }
  double amount, cone[2];
  const ef_status status = ef_fields_number(fields, field + 1, &amount, error);
  if (status != EF_OK)
    return status;
  if (!(amount > 0.0)) {
    return ef_fields_fault(fields, field + 1, error,
                           "amount is %g, expected above 0: the share of the "
                           "light at full drive",
                           amount);
  }
  set_cones(p, light, amount, cone);
  p->cone[2 * side][p->n] = cone[0];
  p->cone[2 * side + 1][p->n] = cone[1];
  return EF_OK;
}

static ef_status make_room(panel_flicker *p, size_t *room, ef_error *error) {
  if (p->n < *room)
    return EF_OK;
  *room = 2 * *room + 32;
  for (size_t k = 0; k < 4; ++k) {
    double *grown = realloc(p->cone[k], *room * sizeof *grown);
    if (grown == NULL)
      return out_of_memory(error);
    p->cone[k] = grown;
  }
  size_t *people = realloc(p->person, *room * sizeof *people);
  if (people == NULL)
    return out_of_memory(error);
  p->person = people;
  return EF_OK;
}

static ef_status read_setting(panel_flicker *p, ef_fields *fields,
                              const char *const *cell, size_t *room,
                              ef_error *error) {
  ef_status status = make_room(p, room, error);
  if (status == EF_OK)
    status = read_side(p, fields, cell, 0, error);
  if (status == EF_OK)
    status = read_side(p, fields, cell, 1, error);
  if (status != EF_OK)
    return status;
  p->person[p->n] = name_list_place(&p->people, cell[OBSERVER]);
  return p->person[p->n++] != SIZE_MAX ? EF_OK : out_of_memory(error);
}

static ef_status read_settings(panel_flicker *p, const char *path,
                               const ef_notes *notes, ef_error *error) {
  ef_fields *fields =
      ef_fields_open(path, N_FIELDS, N_NEEDED, columns, notes, error);
  if (fields == NULL)
    return error->status;
  p->has_names = ef_fields_has(fields, OBSERVER);
  const char *const *cell;
  size_t room = 0;
  ef_status status;
  do {
    status = ef_fields_next(fields, &cell, NULL, error);
    if (status != EF_OK || cell == NULL)
      break;
    status = read_setting(p, fields, cell, &room, error);
  } while (status == EF_OK);
  ef_fields_free(fields);
  if (status == EF_OK && p->n == 0) {
    message_fail(error, EF_MALFORMED,
                 "there is a header and no setting below it");
    status = message_place(error, path);
  }
  return status;
}

/* ---- Weights ----------------------------------------------------------- */

static ef_status weigh(panel_flicker *p, ef_error *error) {
  double *own = malloc(4 * p->n * sizeof *own);
  p->each = calloc(p->people.n, sizeof *p->each);
  if (own == NULL || p->each == NULL) {
    free(own);
    return out_of_memory(error);
  }
  size_t n_found = 0;
  for (size_t who = 0; who < p->people.n; ++who) {
    size_t n = 0;
    for (size_t i = 0; i < p->n; ++i) {
      if (p->person[i] != who)
        continue;
      for (size_t k = 0; k < 4; ++k)
        own[k * p->n + n] = p->cone[k][i];
      ++n;
    }
    flicker_person *f = &p->each[who];
    ef_error reason;
    f->status = ef_flicker_weights(n, own, own + p->n, own + 2 * p->n,
                                   own + 3 * p->n, &f->weights, &reason);
    if (f->status == EF_OK)
      ++n_found;
    else
      snprintf(f->reason, sizeof f->reason, "%.250s", reason.message);
  }
  free(own);
  if (n_found > 0)
    return EF_OK;
  message_fail(error, EF_NO_ANSWER, "no luminance weights: %.200s",
               p->each[0].reason);
  return message_place(error, p->settings_path);
}

ef_status panel_flicker_load(panel_flicker *p, const command_options *options,
                             const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  const bool is_demo = o->n_files < 2;
  *p = (panel_flicker){.options = options,
                       .is_demo = is_demo,
                       .settings_path = is_demo ? demo_settings : o->files[1],
                       .lights_path =
                           o->n_files > 2 ? o->files[2] : demo_lights};
  const char *name = o->observer != NULL ? o->observer : "cie-2015-2";
  p->observer = source_observer_named(o, name, "--observer", notes, error);
  if (p->observer == NULL)
    return error->status;
  ef_status status = read_lights(p, notes, error);
  if (status == EF_OK)
    status = read_settings(p, p->settings_path, notes, error);
  return status == EF_OK ? weigh(p, error) : status;
}

void panel_flicker_free(panel_flicker *p) {
  ef_observer_free(p->observer);
  name_list_free(&p->lights);
  name_list_free(&p->people);
  free(p->excitation);
  free(p->person);
  for (size_t k = 0; k < 4; ++k)
    free(p->cone[k]);
  free(p->each);
}
