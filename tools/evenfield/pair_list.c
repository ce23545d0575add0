/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "pair_list.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "rows.h"
#include "source.h"
#include "viewing.h"

enum { PAIR, REFERENCE, SAMPLE, LAB, XYZ = LAB + 6, N_FIELDS = XYZ + 6 };
static const char *const columns[N_FIELDS] = {
    "pair",        "reference",   "sample",      "reference_L", "reference_a",
    "reference_b", "sample_L",    "sample_a",    "sample_b",    "reference_X",
    "reference_Y", "reference_Z", "sample_X",    "sample_Y",    "sample_Z"};

static ef_status out_of_memory(ef_error *error) {
  return message_fail(error, EF_NO_MEMORY, "out of memory for the pairs");
}

/* ---- Samples ----------------------------------------------------------- */

/* Colours by name; readings of one name are averaged. */
typedef struct named_colours {
  name_list names;
  double *xyz; /* 3 each */
} named_colours;

static void named_colours_free(named_colours *c) {
  name_list_free(&c->names);
  free(c->xyz);
}

static ef_status average(named_colours *c, const rows *all, const double *xyz,
                         ef_error *error) {
  size_t *count = calloc(all->n, sizeof *count);
  c->xyz = calloc(3 * all->n, sizeof *c->xyz);
  ef_status status =
      count == NULL || c->xyz == NULL ? out_of_memory(error) : EF_OK;
  for (size_t i = 0; i < all->n && status == EF_OK; ++i) {
    const size_t at = name_list_place(&c->names, all->name[i]);
    if (at == SIZE_MAX) {
      status = out_of_memory(error);
      break;
    }
    count[at]++;
    for (size_t k = 0; k < 3; ++k)
      c->xyz[3 * at + k] += xyz[3 * i + k];
  }
  for (size_t i = 0; i < 3 * c->names.n && status == EF_OK; ++i)
    c->xyz[i] /= (double)count[i / 3];
  free(count);
  return status;
}

static ef_status samples_read(named_colours *c, const command_options *options,
                              const char *path, const colour_basis *basis,
                              const ef_notes *notes, ef_error *error) {
  ef_reader *reader =
      source_reader(options, path, EF_KIND_SURFACE, notes, error);
  if (reader == NULL)
    return error->status;
  rows all = {0};
  colours turn = {0};
  const ef_reader_head *head = ef_reader_get_head(reader);
  ef_status status = colours_init(&turn, basis, head, notes, error);
  if (status == EF_OK)
    status = rows_read(reader, &all, error);
  double *xyz = malloc(3 * (all.n + 1) * sizeof *xyz);
  if (status == EF_OK && xyz == NULL)
    status = out_of_memory(error);
  if (status == EF_OK)
    status = colours_xyz(&turn, all.n, all.value, options->jobs, xyz, error);
  if (status == EF_OK)
    status = average(c, &all, xyz, error);
  free(xyz);
  rows_free(&all);
  colours_free(&turn);
  ef_reader_free(reader);
  return status;
}

/* ---- Pairs ------------------------------------------------------------- */

typedef struct pair_reader {
  pair_list *list;
  ef_fields *fields;
  const char *const *text;
  const named_colours *samples; /* NULL: the colours stand in the row */
  const char *samples_path;
  bool is_lab;
  ef_xyz white;
} pair_reader;

static bool has_all(const pair_reader *r, size_t first) {
  for (size_t i = first; i < first + 6; ++i) {
    if (!ef_fields_has(r->fields, i))
      return false;
  }
  return true;
}

static ef_status check_columns(pair_reader *r, const char *path,
                               ef_error *error) {
  const bool has_names = ef_fields_has(r->fields, REFERENCE) &&
                         ef_fields_has(r->fields, SAMPLE);
  r->is_lab = has_all(r, LAB);
  if (r->samples != NULL ? has_names : r->is_lab || has_all(r, XYZ))
    return EF_OK;
  if (r->samples != NULL) {
    message_fail(error, EF_MALFORMED,
                 "there are no columns reference and sample, which name rows "
                 "of %.100s",
                 r->samples_path);
  } else {
    message_fail(error, EF_MALFORMED,
                 "the two colours of a pair are not there: columns "
                 "reference_L, reference_a, reference_b, sample_L, sample_a, "
                 "sample_b (or X, Y, Z likewise)%s",
                 has_names ? "; or name the file that has the samples behind "
                             "the answers"
                           : "");
  }
  return message_place(error, path);
}

static ef_status find_sample(pair_reader *r, size_t field, double *xyz,
                             ef_error *error) {
  const named_colours *c = r->samples;
  for (size_t i = 0; i < c->names.n; ++i) {
    if (strcmp(c->names.name[i], r->text[field]) != 0)
      continue;
    memcpy(xyz, c->xyz + 3 * i, 3 * sizeof *xyz);
    return EF_OK;
  }
  return ef_fields_fault(r->fields, field, error,
                         "%.100s has no sample called '%.60s'",
                         r->samples_path, r->text[field]);
}

static ef_status read_colour(pair_reader *r, size_t side, double *xyz,
                             ef_error *error) {
  if (r->samples != NULL)
    return find_sample(r, side == 0 ? REFERENCE : SAMPLE, xyz, error);
  const size_t first = (r->is_lab ? LAB : XYZ) + 3 * side;
  double v[3];
  for (size_t k = 0; k < 3; ++k) {
    const ef_status status =
        ef_fields_number(r->fields, first + k, &v[k], error);
    if (status != EF_OK)
      return status;
  }
  const size_t bright = r->is_lab ? first : first + 1;
  if (v[bright - first] < 0.0) {
    return ef_fields_fault(r->fields, bright, error,
                           "%s is %g, and no surface is darker than black",
                           columns[bright], v[bright - first]);
  }
  const ef_xyz colour = r->is_lab
                            ? ef_lab_to_xyz((ef_lab){v[0], v[1], v[2]}, r->white)
                            : (ef_xyz){v[0], v[1], v[2]};
  xyz[0] = colour.X;
  xyz[1] = colour.Y;
  xyz[2] = colour.Z;
  return EF_OK;
}

static ef_status make_room(pair_list *list, size_t *room, ef_error *error) {
  if (list->n < *room)
    return EF_OK;
  *room = 2 * *room + 64;
  for (size_t side = 0; side < 2; ++side) {
    double *grown = realloc(list->xyz[side], 3 * *room * sizeof *grown);
    if (grown == NULL)
      return out_of_memory(error);
    list->xyz[side] = grown;
  }
  return EF_OK;
}

static ef_status read_pair(pair_reader *r, ef_error *error) {
  pair_list *list = r->list;
  const char *name = r->text[PAIR];
  if (name[0] == '\0') {
    return ef_fields_fault(r->fields, PAIR, error,
                           "the pair has no name; the answers need one");
  }
  const size_t at = name_list_place(&list->names, name);
  if (at == SIZE_MAX)
    return out_of_memory(error);
  if (at < list->n) {
    return ef_fields_fault(r->fields, PAIR, error,
                           "pair '%.60s' stands twice in the list", name);
  }
  ef_status status = read_colour(r, 0, list->xyz[0] + 3 * at, error);
  if (status == EF_OK)
    status = read_colour(r, 1, list->xyz[1] + 3 * at, error);
  list->n++;
  return status;
}

static ef_status read_pairs(pair_reader *r, const char *path, ef_error *error) {
  size_t room = 0;
  for (;;) {
    ef_status status = ef_fields_next(r->fields, &r->text, NULL, error);
    if (status != EF_OK)
      return status;
    if (r->text == NULL)
      break;
    status = make_room(r->list, &room, error);
    if (status == EF_OK)
      status = read_pair(r, error);
    if (status != EF_OK)
      return status;
  }
  if (r->list->n > 0)
    return EF_OK;
  message_fail(error, EF_MALFORMED, "there is a header and no pair below it");
  return message_place(error, path);
}

/* ---- Who looks, in which light ----------------------------------------- */

static ef_status with_basis(pair_list *list, const command_options *options,
                            const char *path, const char *samples,
                            const colour_basis *basis, const ef_notes *notes,
                            ef_error *error) {
  named_colours named = {0};
  pair_reader r = {
      .list = list, .white = basis->white, .samples_path = samples};
  ef_status status = EF_OK;
  if (samples != NULL) {
    status = samples_read(&named, options, samples, basis, notes, error);
    r.samples = &named;
  }
  if (status == EF_OK) {
    r.fields = ef_fields_open(path, N_FIELDS, 1, columns, notes, error);
    status = r.fields != NULL ? check_columns(&r, path, error) : error->status;
  }
  if (status == EF_OK)
    status = read_pairs(&r, path, error);
  ef_fields_free(r.fields);
  named_colours_free(&named);
  return status;
}

ef_status pair_list_read(pair_list *list, const command_options *options,
                         const char *path, const char *samples,
                         const ef_notes *notes, ef_error *error) {
  const command_options *o = options;
  *list = (pair_list){0};
  ef_observer *observer = source_observer(o, notes, error);
  if (observer == NULL)
    return error->status;
  ef_illuminant *illuminant =
      source_illuminant(o, "illuminant",
                        o->illuminant != NULL ? o->illuminant : "D65", notes,
                        error);
  colour_basis basis;
  ef_status status = illuminant == NULL
                         ? error->status
                         : colour_basis_init(&basis, observer, illuminant,
                                             error);
  if (status == EF_OK)
    status = viewing_conditions(o, basis.white, &list->conditions, error);
  if (status == EF_OK) {
    snprintf(list->illuminant, sizeof list->illuminant, "%s",
             ef_illuminant_name(illuminant));
    snprintf(list->observer, sizeof list->observer, "%s",
             ef_observer_name(observer));
    status = with_basis(list, o, path, samples, &basis, notes, error);
  }
  ef_illuminant_free(illuminant);
  ef_observer_free(observer);
  return status;
}

void pair_list_free(pair_list *list) {
  name_list_free(&list->names);
  free(list->xyz[0]);
  free(list->xyz[1]);
  *list = (pair_list){0};
}

ef_status pair_list_differences(const pair_list *list, const ef_metric *metric,
                                double *difference, ef_error *error) {
  double *at = malloc(6 * list->n * sizeof *at);
  if (at == NULL)
    return out_of_memory(error);
  for (size_t side = 0; side < 2; ++side) {
    ef_metric_coordinates_batch(metric, list->n, list->xyz[side],
                                &list->conditions, 1, at + 3 * list->n * side);
  }
  ef_metric_difference_batch(metric, list->n, at, at + 3 * list->n, 1,
                             difference);
  free(at);
  return EF_OK;
}
