/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_ellipse.h"

#include <math.h>
#include <stdlib.h>

#include "document.h"
#include "message.h"

struct ellipse_data {
  document out;
};

static const char *const figure_names[] = {"section", "projection", "section"};

/* The solid that the section is cut from. */
static void record_solid(record *r, const ellipse_row *row) {
  static const char *const one_two_three[] = {"1", "2", "3"};
  static const char *const entries[] = {"g11", "g12", "g13",
                                        "g22", "g23", "g33"};
  const double none = (double)NAN;
  ef_ellipsoid e = row->solid;
  for (int i = 0; i < 9 && !row->found; ++i) {
    e.tensor[i] = e.direction[i] = none;
    e.semi_axis[i / 3] = none;
  }
  const double upper[6] = {e.tensor[0], e.tensor[1], e.tensor[2],
                           e.tensor[4], e.tensor[5], e.tensor[8]};
  record_begin(r, "ellipsoid");
  record_numbers(r, "semi_axes", 3, one_two_three, e.semi_axis);
  record_numbers(r, "direction_1", 3, one_two_three, e.direction);
  record_numbers(r, "direction_2", 3, one_two_three, e.direction + 3);
  record_numbers(r, "direction_3", 3, one_two_three, e.direction + 6);
  for (int i = 0; i < 6; ++i)
    record_number(r, entries[i], upper[i]);
  record_end(r);
}

static void record_row(record *r, const ellipse_scene *s,
                       const ellipse_row *row) {
  static const char *const one_two[] = {"1", "2"};
  const ef_space space = s->frame.space;
  const ef_ellipse *e = &row->ellipse;
  record_begin(r, NULL);
  record_text(r, "name", row->name);
  record_text(r, "space", ef_space_name(space));
  record_text(r, "figure", figure_names[s->figure]);
  record_numbers(r, "center", 2, one_two, e->center);
  record_number(r, "third", row->third);
  record_number(r, "semi_major", e->semi_major);
  record_number(r, "semi_minor", e->semi_minor);
  record_number(r, "angle_deg", e->angle_deg);
  record_number(r, "g11", e->g11);
  record_number(r, "g12", e->g12);
  record_number(r, "g22", e->g22);
  if (s->figure == FIGURE_ELLIPSOID)
    record_solid(r, row);
  record_xyz(r, row->at.xyz);
  record_number(r, "x", row->at.xy.x);
  record_number(r, "y", row->at.xy.y);
  if (s->from == BASIS_MACADAM)
    record_boolean(r, "between_centres", row->between);
  if (s->experiment != NULL) {
    record_text(r, "nearest_centre", row->nearest.name);
    record_number(r, "nearest_centre_cielab",
                  row->nearest.name != NULL ? row->nearest.difference
                                            : (double)NAN);
  }
  record_text(r, "reason", row->reason);
  record_end(r);
}

/* ---- The document around the ellipses ---------------------------------- */

static void write_basis(ef_json *j, const ellipse_scene *s) {
  char size[ELLIPSE_SIZE_ROOM];
  ellipse_size_words(s, size);
  ef_json_text(j, "source", ellipse_source_words(s));
  if (s->experiment != NULL)
    ef_json_text(j, "remark", ef_experiment_remark(s->experiment));
  ef_json_text(j, "size", size);
  if (s->metric != NULL) {
    ef_json_text(j, "metric", ef_metric_name(s->metric));
    ef_json_number(j, "size_in_metric", s->size);
    jnd_write(j, &s->jnd);
  } else {
    ef_json_number(j, "steps", s->steps);
  }
  ef_json_text(j, "figure_is", ellipse_figure_words(s));
  ef_json_begin_array(j, "axes");
  for (int i = 0; i < 3; ++i)
    ef_json_text(j, NULL, ef_space_axis(s->frame.space, i));
  ef_json_end_array(j);
  ef_json_text(j, "observer", ef_observer_name(s->observer));
  ef_json_text(j, "illuminant", ef_illuminant_name(s->illuminant));
}

ellipse_data *ellipse_data_new(const ellipse_scene *s, ef_output *output,
                               bool is_csv, ef_error *error) {
  ellipse_data *d = calloc(1, sizeof *d);
  if (d == NULL) {
    message_fail(error, EF_NO_MEMORY, "out of memory for the result");
    return NULL;
  }
  if (document_open(&d->out, output, is_csv, error) != EF_OK) {
    ellipse_data_free(d);
    return NULL;
  }
  if (is_csv) {
    const ellipse_row none = {.name = ""};
    record r = document_header(&d->out);
    record_row(&r, s, &none);
    return d;
  }
  write_basis(d->out.json, s);
  document_begin_rows(&d->out, "ellipses");
  return d;
}

static ef_status rows(void *self, const ellipse_scene *s, size_t n,
                      const ellipse_row *all, ef_error *error) {
  (void)error; /* the writers keep their errors until they are finished */
  ellipse_data *d = self;
  for (size_t i = 0; i < n; ++i) {
    record r = document_row(&d->out);
    record_row(&r, s, &all[i]);
  }
  return EF_OK;
}

ellipse_sink ellipse_data_sink(ellipse_data *d) {
  return (ellipse_sink){.self = d, .rows = rows};
}

ef_status ellipse_data_finish(ellipse_data *d, const ellipse_count *count,
                              ef_error *error) {
  document_end_rows(&d->out);
  if (d->out.json != NULL) {
    ef_json_integer(d->out.json, "without_ellipse",
                    (int64_t)(count->n - count->n_found));
    ef_json_integer(d->out.json, "skipped_rows", (int64_t)count->n_skipped);
  }
  return document_close(&d->out, error);
}

void ellipse_data_free(ellipse_data *d) {
  if (d != NULL)
    document_free(&d->out);
  free(d);
}
