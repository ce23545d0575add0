/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "command.h"
#include "ellipse.h"
#include "ellipse_chart.h"
#include "message.h"
#include "render_ellipse.h"
#include "result.h"

/* Pages come before the text, so that nothing is said about what could not be
 * written. */
static ef_status write_pages(ellipse_text *t, const ellipse_scene *s,
                             const ellipse_count *n, const ef_notes *notes,
                             ef_error *error) {
  ef_status status = EF_OK;
  if (s->options->chart != NULL)
    status = ellipse_chart_write(t, s, n, notes, error);
  if (status == EF_OK && s->options->report != NULL)
    status = ellipse_report_write(t, s, n, notes, error);
  return status;
}

static ef_status run_text(ellipse_scene *s, const ef_notes *notes,
                          ef_output *output, ef_error *error) {
  ellipse_text *t = ellipse_text_new();
  if (t == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the result");
  const ellipse_sink sink = ellipse_text_sink(t);
  ellipse_count count;
  ef_status status = ellipse_stream(s, notes, &sink, &count, error);
  if (status == EF_OK)
    status = write_pages(t, s, &count, notes, error);
  if (status == EF_OK)
    status = ellipse_text_finish(t, s, &count, output, error);
  ellipse_text_free(t);
  return status;
}

/* Both receive each block. */
typedef struct two_sinks {
  ellipse_sink data, kept;
} two_sinks;

static ef_status pass_to_both(void *self, const ellipse_scene *s, size_t n,
                              const ellipse_row *rows, ef_error *error) {
  const two_sinks *two = self;
  const ef_status status = two->data.rows(two->data.self, s, n, rows, error);
  return status == EF_OK ? two->kept.rows(two->kept.self, s, n, rows, error)
                         : status;
}

static ef_status run_data(ellipse_scene *s, const ef_notes *notes,
                          ef_output *output, ef_error *error) {
  ellipse_data *d =
      ellipse_data_new(s, output, s->options->format == FORMAT_CSV, error);
  if (d == NULL)
    return error->status;
  ellipse_text *t = ellipse_text_new();
  ellipse_count count = {0};
  ef_status status = EF_OK;
  if (t == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the result");
  if (status == EF_OK) {
    two_sinks two = {ellipse_data_sink(d), ellipse_text_sink(t)};
    const ellipse_sink sink = {.self = &two, .rows = pass_to_both};
    status = ellipse_stream(s, notes, &sink, &count, error);
  }
  if (status == EF_OK)
    status = write_pages(t, s, &count, notes, error);
  if (status == EF_OK)
    status = ellipse_data_finish(d, &count, error);
  ellipse_text_free(t);
  ellipse_data_free(d);
  return status;
}

/* Options that only a formula has a use for; ellipsoids are known of one
 * experiment too. */
static exit_code check_formula_only(const command_options *o) {
  const bool is_plane = o->basis != BASIS_RIT_DUPONT;
  const char *wrong = o->metric != NULL                ? "--metric"
                      : o->jnd_text != NULL            ? "--jnd"
                      : o->criterion != NULL           ? "--criterion"
                      : !isnan(o->size)                ? "--size"
                      : !is_plane                      ? NULL
                      : o->figure == FIGURE_PROJECTION ? "--figure projection"
                      : o->figure == FIGURE_ELLIPSOID  ? "--figure ellipsoid"
                                                       : NULL;
  if (o->basis == BASIS_FORMULA || wrong == NULL)
    return EXIT_DONE;
  return message_usage(
      "%s is for --basis formula%s; the other ellipses are "
      "known at constant luminance and in steps (--steps)",
      wrong, strncmp(wrong, "--figure", 8) == 0 ? " or rit-dupont-1997" : "");
}

static exit_code check_usage(const command_options *o) {
  if (o->at.n == 0 && o->n_files == 0 && o->basis < BASIS_LAMPS) {
    return message_usage("ellipse needs --at COLOUR or a FILE; `evenfield "
                         "ellipse demo:signal-colours` shows what it does");
  }
  if (o->basis == BASIS_LAMPS && o->n_files > 0) {
    return message_usage("--basis lamp-colours has ellipses at the standard "
                         "colours only, not for \"%.200s\"",
                         o->files[0]);
  }
  if (!isnan(o->steps) && !isnan(o->size)) {
    return message_usage("--steps counts JND and --size is in units of the "
                         "metric: give one of them");
  }
  return check_formula_only(o);
}

exit_code command_ellipse(const command_options *options) {
  exit_code code = check_usage(options);
  if (code == EXIT_DONE)
    code = diagram_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  ellipse_scene scene;
  ef_status status = ellipse_scene_load(&scene, options, &notes, &error);
  ef_output *output = result_begin(options, &status, &error);
  if (status == EF_OK) {
    status = options->format == FORMAT_TEXT
                 ? run_text(&scene, &notes, output, &error)
                 : run_data(&scene, &notes, output, &error);
  }
  ellipse_scene_free(&scene);
  return result_close(output, status, &error);
}
