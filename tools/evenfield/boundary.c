/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "boundary.h"

#include <math.h>
#include <string.h>

#include "document.h"
#include "result.h"

static size_t looks_with_other(const compare_scene *s) {
  return s->looks.n + (s->looks.has_other ? 1 : 0);
}

static double difference_from(const compare_scene *s, const look *l,
                              const worst_case *w, ef_xyz xyz) {
  double from[3], to[3];
  ef_metric_coordinates(s->metric, w->standard, &l->conditions, from);
  ef_metric_coordinates(s->metric, xyz, &l->conditions, to);
  return ef_metric_difference(s->metric, from, to);
}

/* ---- CSV: a row a point ------------------------------------------------ */

static void record_point(record *r, const compare_scene *s, const look *l,
                         const worst_case *w, size_t number, ef_xyz xyz) {
  record_begin(r, NULL);
  record_text(r, "illuminant", ef_illuminant_name(l->illuminant));
  record_text(r, "observer", ef_observer_name(l->observer));
  record_number(r, "angle_deg", w->angle_deg);
  record_number(r, "number", (double)number);
  record_xyz(r, xyz);
  record_lab(r, ef_xyz_to_lab(xyz, l->basis.white));
  record_number(r, "difference", difference_from(s, l, w, xyz));
  record_end(r);
}

static void write_points(const document *d, const compare_scene *s,
                         const look *l, const worst_case *w) {
  for (size_t i = 0; i < ef_metamer_set_count(w->set); ++i) {
    record r = document_row(d);
    record_point(&r, s, l, w, i, ef_metamer_set_point(w->set, i));
  }
}

/* ---- JSON: an object a body -------------------------------------------- */

static void write_triple(ef_json *j, double a, double b, double c) {
  ef_json_begin_array(j, NULL);
  ef_json_number(j, NULL, a);
  ef_json_number(j, NULL, b);
  ef_json_number(j, NULL, c);
  ef_json_end_array(j);
}

static void write_mesh(ef_json *j, const look *l, const worst_case *w) {
  const size_t n = ef_metamer_set_count(w->set);
  ef_json_begin_array(j, "points");
  for (size_t i = 0; i < n; ++i) {
    const ef_xyz c = ef_metamer_set_point(w->set, i);
    write_triple(j, c.X, c.Y, c.Z);
  }
  ef_json_end_array(j);
  ef_json_begin_array(j, "points_lab");
  for (size_t i = 0; i < n; ++i) {
    const ef_lab c =
        ef_xyz_to_lab(ef_metamer_set_point(w->set, i), l->basis.white);
    write_triple(j, c.L_star, c.a_star, c.b_star);
  }
  ef_json_end_array(j);
  const size_t *corner;
  const size_t n_triangles = ef_metamer_set_triangles(w->set, &corner);
  ef_json_begin_array(j, "triangles");
  for (size_t i = 0; i < n_triangles; ++i) {
    ef_json_begin_array(j, NULL);
    for (size_t k = 0; k < 3; ++k)
      ef_json_integer(j, NULL, (int64_t)corner[3 * i + k]);
    ef_json_end_array(j);
  }
  ef_json_end_array(j);
}

static void write_body(ef_json *j, const look *l, const worst_case *w) {
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "illuminant", ef_illuminant_name(l->illuminant));
  ef_json_text(j, "observer", ef_observer_name(l->observer));
  ef_json_number(j, "angle_deg", w->angle_deg);
  ef_json_text(j, "reason", w->reason);
  if (w->set != NULL) {
    const ef_metamer_body body = ef_metamer_set_body(w->set);
    ef_json_boolean(j, "is_flat", body.is_flat);
    ef_json_number(j, "volume_low", body.volume_low);
    ef_json_number(j, "volume_high", body.volume_high);
    ef_json_number(j, "volume_lab", body.volume_lab);
    write_mesh(j, l, w);
  }
  ef_json_end_object(j);
}

/* ---- The file ---------------------------------------------------------- */

static void write_start(document *d, const compare_scene *s) {
  const look *reference = &s->looks.at[0];
  if (d->csv != NULL) {
    const worst_case none = {0};
    record r = document_header(d);
    record_point(&r, s, reference, &none, 0, (ef_xyz){0.0, 0.0, 0.0});
    return;
  }
  ef_json_text(d->json, "reference", s->worst_case_of);
  ef_json_text(d->json, "reference_illuminant",
               ef_illuminant_name(reference->illuminant));
  ef_json_text(d->json, "reference_observer",
               ef_observer_name(reference->observer));
  ef_json_text(d->json, "metric", ef_metric_name(s->metric));
  document_begin_rows(d, "bodies");
}

static ef_status write_all(document *d, const compare_scene *s,
                           ef_error *error) {
  const size_t n = looks_with_other(s);
  write_start(d, s);
  for (size_t i = 0; i < s->n_worst_cases; ++i) {
    const look *l = &s->looks.at[i % n];
    const worst_case *w = &s->worst_case[i];
    if (i % n == 0)
      continue; /* under the first look it is a point */
    if (d->json != NULL)
      write_body(d->json, l, w);
    else if (w->set != NULL)
      write_points(d, s, l, w);
  }
  document_end_rows(d);
  return document_close(d, error);
}

static bool ends_with(const char *path, const char *end) {
  const size_t n = strlen(path), m = strlen(end);
  return n >= m && strcmp(path + n - m, end) == 0;
}

ef_status boundary_write(const compare_scene *s, ef_error *error) {
  const char *path = s->options->boundary;
  if (path == NULL)
    return EF_OK;
  ef_output *output = result_open_at(path, s->options->force, error);
  if (output == NULL)
    return error->status;
  document d;
  ef_status status =
      document_open(&d, output, !ends_with(path, ".json"), error);
  if (status == EF_OK)
    status = write_all(&d, s, error);
  document_free(&d);
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}
