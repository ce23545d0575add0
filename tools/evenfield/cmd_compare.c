/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "boundary.h"
#include "command.h"
#include "compare.h"
#include "compare_chart.h"
#include "message.h"
#include "part.h"
#include "people.h"
#include "render_compare.h"
#include "result.h"

/* Pages come before the text, so that nothing is said about what could not be
 * written. */
static ef_status write_pages(compare_text *t, const compare_scene *s,
                             const compare_count *count, ef_error *error) {
  ef_status status = EF_OK;
  if (s->options->chart != NULL)
    status = compare_chart_write(t, s, error);
  if (status == EF_OK && s->options->report != NULL)
    status = compare_report_write(t, s, count, error);
  return status;
}

static ef_status run_text(compare_scene *s, ef_output *output,
                          compare_count *count, ef_error *error) {
  compare_text *t = compare_text_new();
  if (t == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the result");
  const compare_sink sink = compare_text_sink(t);
  ef_status status = compare_stream(s, &sink, count, error);
  if (status == EF_OK)
    status = write_pages(t, s, count, error);
  if (status == EF_OK)
    status = compare_text_finish(t, s, count, output, error);
  compare_text_free(t);
  return status;
}

/* Both receive each block. */
typedef struct two_sinks {
  compare_sink data, kept;
} two_sinks;

static ef_status pass_to_both(void *self, const compare_scene *s, size_t n,
                              const compared *pairs, ef_error *error) {
  const two_sinks *two = self;
  const ef_status status = two->data.rows(two->data.self, s, n, pairs, error);
  return status == EF_OK ? two->kept.rows(two->kept.self, s, n, pairs, error)
                         : status;
}

static ef_status run_data(compare_scene *s, ef_output *output,
                          compare_count *count, ef_error *error) {
  compare_data *d =
      compare_data_new(s, output, s->options->format == FORMAT_CSV, error);
  if (d == NULL)
    return error->status;
  compare_text *t = compare_text_new();
  ef_status status = EF_OK;
  if (t == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the result");
  if (status == EF_OK) {
    two_sinks two = {compare_data_sink(d), compare_text_sink(t)};
    const compare_sink sink = {.self = &two, .rows = pass_to_both};
    const bool has_pages =
        s->options->chart != NULL || s->options->report != NULL;
    status = compare_stream(s, has_pages ? &sink : &two.data, count, error);
    if (status == EF_OK && has_pages)
      status = write_pages(t, s, count, error);
  }
  if (status == EF_OK)
    status = compare_data_finish(d, s, count, error);
  compare_text_free(t);
  compare_data_free(d);
  return status;
}

static exit_code check_usage(const command_options *o) {
  if (o->n_files > 2) {
    return message_usage("too many files: \"%.200s\" is not expected",
                         o->files[2]);
  }
  if (o->n_files == 1 && o->pairs == NULL) {
    return message_usage("compare needs STANDARD and BATCH, or one file with "
                         "--pairs; without any file it shows the demo");
  }
  if (o->n_files == 0 && o->pairs != NULL)
    return message_usage("--pairs needs the file that holds the samples");
  if (o->worst_case && o->format == FORMAT_CSV) {
    return message_usage("--worst-case goes with text and json: csv has rows "
                         "of pairs only");
  }
  if (isnan(o->population) && o->ages != NULL)
    return message_usage("--ages is for the people of --population");
  if (isnan(o->population) && !isnan(o->field_deg))
    return message_usage("--field is for the people of --population");
  return EXIT_DONE;
}

exit_code command_compare(const command_options *options) {
  exit_code code = check_usage(options);
  if (code == EXIT_DONE)
    code = part_check_usage(options);
  if (code == EXIT_DONE)
    code = diagram_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  compare_scene scene;
  compare_count count = {0};
  ef_status status = compare_scene_load(&scene, options, &notes, &error);
  ef_output *output = result_begin(options, &status, &error);
  if (status == EF_OK) {
    status = options->format == FORMAT_TEXT
                 ? run_text(&scene, output, &count, &error)
                 : run_data(&scene, output, &count, &error);
  }
  if (status == EF_OK)
    status = boundary_write(&scene, &error);
  code = result_close(output, status, &error);
  compare_scene_free(&scene);
  if (code == EXIT_DONE && options->check && count.n_within < count.n)
    return EXIT_CHECK_FAILED;
  return code;
}
