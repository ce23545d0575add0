/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_adjust.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "message.h"

enum { SETTING, N_NEEDED, STANDARD = N_NEEDED, OBSERVER, N_FIELDS };
static const char *const columns[N_FIELDS] = {"setting", "standard",
                                              "observer"};

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the settings");
}

/* ---- Reading ----------------------------------------------------------- */

static ef_status make_room(panel_adjust *p, ef_error *error) {
  if (p->n < p->room)
    return EF_OK;
  const size_t room = 2 * p->room + 32;
  double *setting = realloc(p->setting, room * sizeof *setting);
  if (setting != NULL)
    p->setting = setting;
  size_t *group_of = realloc(p->group_of, room * sizeof *group_of);
  if (group_of != NULL)
    p->group_of = group_of;
  adjust_group *group = realloc(p->group, room * sizeof *group);
  if (group != NULL)
    p->group = group;
  if (setting == NULL || group_of == NULL || group == NULL)
    return out_of_memory(error);
  p->room = room;
  return EF_OK;
}

/* Settings against another standard are another matter. */
static size_t group_at(panel_adjust *p, size_t person, double standard) {
  for (size_t i = 0; i < p->n_groups; ++i) {
    const adjust_group *g = &p->group[i];
    const bool is_same =
        g->standard == standard || (isnan(g->standard) && isnan(standard));
    if (g->person == person && is_same)
      return i;
  }
  p->group[p->n_groups] =
      (adjust_group){.person = person, .standard = standard};
  return p->n_groups++;
}

static ef_status read_row(panel_adjust *p, ef_fields *fields,
                          const char *const *cell, ef_error *error) {
  double standard = (double)NAN;
  ef_status status = make_room(p, error);
  if (status == EF_OK)
    status = ef_fields_number(fields, SETTING, &p->setting[p->n], error);
  if (status == EF_OK && p->has_standard)
    status = ef_fields_number(fields, STANDARD, &standard, error);
  if (status != EF_OK)
    return status;
  const size_t person = name_list_place(&p->people, cell[OBSERVER]);
  if (person == SIZE_MAX)
    return out_of_memory(error);
  p->group_of[p->n++] = group_at(p, person, standard);
  return EF_OK;
}

static ef_status read_settings(panel_adjust *p, const ef_notes *notes,
                               ef_error *error) {
  ef_fields *fields =
      ef_fields_open(p->path, N_FIELDS, N_NEEDED, columns, notes, error);
  if (fields == NULL)
    return error->status;
  p->has_names = ef_fields_has(fields, OBSERVER);
  p->has_standard = ef_fields_has(fields, STANDARD);
  snprintf(p->unit, sizeof p->unit, "%s", ef_fields_unit(fields));
  const char *const *cell;
  ef_status status;
  do {
    status = ef_fields_next(fields, &cell, NULL, error);
    if (status != EF_OK || cell == NULL)
      break;
    status = read_row(p, fields, cell, error);
  } while (status == EF_OK);
  ef_fields_free(fields);
  if (status == EF_OK && p->n == 0) {
    message_fail(error, EF_MALFORMED,
                 "there is a header and no setting below it");
    status = message_place(error, p->path);
  }
  return status;
}

/* ---- Summaries --------------------------------------------------------- */

static ef_status summarise(panel_adjust *p, ef_error *error) {
  double *own = malloc(p->n * sizeof *own);
  if (own == NULL)
    return out_of_memory(error);
  for (size_t k = 0; k < p->n_groups; ++k) {
    adjust_group *g = &p->group[k];
    size_t n = 0;
    for (size_t i = 0; i < p->n; ++i) {
      if (p->group_of[i] == k)
        own[n++] = p->setting[i];
    }
    ef_error reason;
    g->status =
        ef_adjustment_summary(n, own, g->standard, &g->summary, &reason);
    if (g->status == EF_OK)
      ++p->n_found;
    else
      snprintf(g->reason, sizeof g->reason, "%.250s", reason.message);
  }
  free(own);
  if (p->n_found > 0)
    return EF_OK;
  message_fail(error, EF_NO_ANSWER, "no JND: %.250s", p->group[0].reason);
  return message_place(error, p->path);
}

ef_status panel_adjust_load(panel_adjust *p, const command_options *options,
                            const ef_notes *notes, ef_error *error) {
  *p = (panel_adjust){.options = options, .path = options->files[1]};
  const ef_status status = read_settings(p, notes, error);
  return status == EF_OK ? summarise(p, error) : status;
}

void panel_adjust_free(panel_adjust *p) {
  name_list_free(&p->people);
  free(p->group_of);
  free(p->setting);
  free(p->group);
}
