/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"
#include "describe.h"
#include "describe_chart.h"
#include "diagram.h"
#include "message.h"
#include "part.h"
#include "render_describe.h"
#include "result.h"

/* All files, to the sink; and the chart, before anything is told. */
static ef_status stream(describe_scene *s, const ef_notes *notes,
                        const describe_sink *sink, size_t *n_skipped,
                        ef_error *error) {
  size_t n;
  if (s->options->chart == NULL)
    return describe_stream(s, notes, sink, &n, n_skipped, error);
  describe_chart *chart = describe_chart_new(sink);
  if (chart == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  const describe_sink both = describe_chart_sink(chart);
  ef_status status = describe_stream(s, notes, &both, &n, n_skipped, error);
  if (status == EF_OK)
    status = describe_chart_write(chart, s, notes, error);
  describe_chart_free(chart);
  return status;
}

static ef_status run_text(describe_scene *s, const ef_notes *notes,
                          ef_output *output, ef_error *error) {
  describe_text *t = describe_text_new();
  if (t == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for the result");
  }
  const describe_sink sink = describe_text_sink(t);
  size_t n_skipped;
  ef_status status = stream(s, notes, &sink, &n_skipped, error);
  if (status == EF_OK) {
    status = describe_text_finish(t, s, n_skipped, output, error);
  }
  describe_text_free(t);
  return status;
}

static ef_status run_data(describe_scene *s, const ef_notes *notes,
                          ef_output *output, ef_error *error) {
  describe_data *d =
      describe_data_new(s, output, s->options->format == FORMAT_CSV, error);
  if (d == NULL)
    return error->status;
  const describe_sink sink = describe_data_sink(d);
  size_t n_skipped;
  ef_status status = stream(s, notes, &sink, &n_skipped, error);
  if (status == EF_OK)
    status = describe_data_finish(d, n_skipped, error);
  describe_data_free(d);
  return status;
}

exit_code command_describe(const command_options *options) {
  if (options->n_files == 0) {
    return message_usage("describe needs at least one FILE; "
                         "`evenfield describe demo:livery` shows what it does");
  }
  exit_code code = part_check_usage(options);
  if (code == EXIT_DONE)
    code = diagram_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  describe_scene scene;
  ef_status status = describe_scene_load(&scene, options, &notes, &error);
  ef_output *output = result_begin(options, &status, &error);
  if (status == EF_OK) {
    status = options->format == FORMAT_TEXT
                 ? run_text(&scene, &notes, output, &error)
                 : run_data(&scene, &notes, output, &error);
  }
  describe_scene_free(&scene);
  return result_close(output, status, &error);
}
