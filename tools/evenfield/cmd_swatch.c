/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "match.h"
#include "message.h"
#include "pictures.h"
#include "render_swatch.h"
#include "result.h"
#include "rows.h"
#include "source.h"

static const char default_folder[] = "swatches";

static void set_observer(swatch_scene *drawn, const ef_observer *observer) {
  snprintf(drawn->observer, sizeof drawn->observer, "%s",
           ef_observer_name(observer));
  drawn->cones_borrowed = ef_observer_cones_borrowed(observer);
}

/* ---- Targets and a device ---------------------------------------------- */

static ef_status draw_targets(const command_options *options,
                              const ef_notes *notes, pictures *p,
                              swatch_scene *drawn, ef_error *error) {
  match_scene scene;
  ef_status status = match_scene_load(&scene, options, notes, error);
  if (status == EF_OK) {
    const match_sink drawing = pictures_sink(p);
    const match_sink *sink = &drawing;
    match_summary sum;
    status = match_stream(&scene, 1, &sink, &sum, error);
  }
  *drawn = (swatch_scene){.pictures = p,
                          .metric = scene.metric,
                          .halves = "left the target, right the match for it",
                          .key = "in_gamut",
                          .head = {"In", "gamut"},
                          .none = "all targets lie in the gamut",
                          .some = "targets lie outside the gamut",
                          .is_demo = scene.device.is_demo && scene.demo_targets,
                          .display = scene.device.source};
  if (scene.observer != NULL)
    set_observer(drawn, scene.observer);
  scene.metric = NULL; /* goes on with the pictures */
  match_scene_free(&scene);
  return status;
}

/* ---- Two files --------------------------------------------------------- */

/* The colours of one file. */
typedef struct half {
  rows rows;
  double *xyz;
} half;

static void half_free(half *h) {
  rows_free(&h->rows);
  free(h->xyz);
}

static ef_status read_half(half *h, const command_options *options,
                           const char *path, const colour_basis *basis,
                           const ef_notes *notes, ef_error *error) {
  *h = (half){0};
  ef_reader *reader =
      source_reader(options, path, source_kind(options), notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  colours c = {0};
  ef_status status = colours_init(&c, basis, head, notes, error);
  if (status == EF_OK && c.weights != NULL && head->kind == EF_LIGHT) {
    message_fail(error, EF_MALFORMED,
                 "spectra of lights have no white to be "
                 "seen against; pairs are of surfaces or colours");
    status = message_place(error, path);
  }
  if (status == EF_OK)
    status = rows_read(reader, &h->rows, error);
  if (status == EF_OK) {
    h->xyz = malloc(3 * h->rows.n * sizeof *h->xyz);
    status = h->xyz == NULL
                 ? message_fail(error, EF_NO_MEMORY, "out of memory for pairs")
                 : colours_xyz(&c, h->rows.n, h->rows.value, 1, h->xyz, error);
  }
  colours_free(&c);
  ef_reader_free(reader);
  return status;
}

static ef_xyz xyz_at(const half *h, size_t i) {
  return (ef_xyz){h->xyz[3 * i], h->xyz[3 * i + 1], h->xyz[3 * i + 2]};
}

static ef_status add_pair(pictures *p, const half *left, const half *right,
                          size_t i, const colour_basis *basis,
                          const ef_metric *metric, double jnd,
                          ef_error *error) {
  const ef_xyz a = xyz_at(left, i), b = xyz_at(right, i);
  const ef_conditions conditions = ef_conditions_default(basis->white);
  double at_a[3], at_b[3];
  ef_metric_coordinates(metric, a, &conditions, at_a);
  ef_metric_coordinates(metric, b, &conditions, at_b);
  const double difference = ef_metric_difference(metric, at_a, at_b);
  char name[300];
  const char *first = left->rows.name[i], *second = right->rows.name[i];
  if (strcmp(first, second) == 0) {
    snprintf(name, sizeof name, "%s", first);
  } else {
    snprintf(name, sizeof name, "%.140s / %.140s", first, second);
  }
  /* Without a JND nothing can be called a match or not: no mark. */
  return pictures_add(p, name, a, b, !(difference > jnd), difference, error);
}

static ef_status add_pairs(pictures *p, const command_options *options,
                           const colour_basis *basis, const ef_metric *metric,
                           double jnd, const ef_notes *notes, ef_error *error) {
  half left = {0}, right = {0};
  const char *const *files = options->files;
  ef_status status = read_half(&left, options, files[0], basis, notes, error);
  if (status == EF_OK) {
    status = read_half(&right, options, files[1], basis, notes, error);
  }
  if (status == EF_OK && left.rows.n != right.rows.n) {
    message_fail(error, EF_MALFORMED,
                 "has %zu colours and %.200s has %zu: "
                 "pairs need as many in both",
                 left.rows.n, files[1], right.rows.n);
    status = message_place(error, files[0]);
  }
  for (size_t i = 0; i < left.rows.n && status == EF_OK; ++i) {
    status = add_pair(p, &left, &right, i, basis, metric, jnd, error);
  }
  half_free(&left);
  half_free(&right);
  return status;
}

static ef_status draw_pairs(const command_options *options,
                            const ef_notes *notes, pictures *p,
                            swatch_scene *drawn, ef_error *error) {
  const command_options *o = options;
  ef_metric *metric =
      ef_metric_new(o->metric != NULL ? o->metric : "ciede2000", error);
  *drawn = (swatch_scene){
      .pictures = p,
      .metric = metric,
      .halves = "left the colour of the first file, right of the second",
      .key = "within_jnd",
      .head = {"Within", "one JND"},
      .none = "no pair differs by more than one JND",
      .some = "pairs differ by more than one JND"};
  if (metric == NULL)
    return message_option(error, "metric", "");
  const double jnd = isnan(o->jnd) ? ef_metric_jnd(metric).value : o->jnd;
  ef_observer *observer = source_observer(o, notes, error);
  ef_illuminant *illuminant =
      observer == NULL
          ? NULL
          : source_illuminant(o, "illuminant", source_first_light(o, "D65"),
                              notes, error);
  colour_basis basis;
  ef_status status = illuminant == NULL ? error->status
                                        : colour_basis_init(&basis, observer,
                                                            illuminant, error);
  if (status == EF_OK)
    status = pictures_check(observer, error);
  if (status == EF_OK) {
    status = add_pairs(p, o, &basis, metric, jnd, notes, error);
  }
  if (status == EF_OK) {
    const picture_eyes eyes = {observer, basis.white, metric, jnd};
    set_observer(drawn, observer);
    status = pictures_write(p, &eyes, o, error);
  }
  ef_illuminant_free(illuminant);
  ef_observer_free(observer);
  return status;
}

/* ---- The command ------------------------------------------------------- */

exit_code command_swatch(const command_options *options) {
  exit_code code = result_check_usage(options, 2);
  if (code != EXIT_DONE)
    return code;
  const char *device = device_kind_of(options)->option;
  if (options->n_files == 2 && device_is_named(options)) {
    return message_usage("two files are drawn as they stand: --%s goes with "
                         "one file of targets",
                         device);
  }
  code = device_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  pictures p = pictures_new(
      options->pictures != NULL ? options->pictures : default_folder, &notes);
  swatch_scene drawn = {0};
  ef_output *output = result_open(options, &error);
  ef_status status = output == NULL ? error.status : EF_OK;
  if (status == EF_OK) {
    status = options->n_files == 2
                 ? draw_pairs(options, &notes, &p, &drawn, &error)
                 : draw_targets(options, &notes, &p, &drawn, &error);
  }
  if (status == EF_OK) {
    status = render_swatch(&drawn, options, output, &error);
  }
  code = result_close(output, status, &error);
  pictures_free(&p);
  ef_metric_free(drawn.metric);
  return code;
}
