/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include "match.h"
#include "match_chart.h"
#include "match_report.h"
#include "message.h"
#include "part.h"
#include "pictures.h"
#include "render_match.h"
#include "result.h"

/* Who receives the matches. Pictures, chart and report come first, so that
 * nothing is said about what could not be written. */
typedef struct receivers {
  pictures pictures;
  match_chart *chart;   /* NULL: none */
  match_report *report; /* NULL: none */
  match_text *text;
  match_data *data;
  match_list *list;
} receivers;

static ef_status open_receivers(receivers *r, const command_options *options,
                                const ef_notes *notes, ef_output *output,
                                ef_error *error) {
  *r = (receivers){.pictures = pictures_new(options->pictures, notes)};
  if (options->format == FORMAT_TEXT) {
    r->text = match_text_new(output);
  } else if (options->format == FORMAT_CGATS) {
    r->list = match_list_new(output);
  } else {
    r->data = match_data_new(output, options->format == FORMAT_CSV);
  }
  if (options->chart != NULL)
    r->chart = match_chart_new(options->chart, notes);
  if (options->report != NULL)
    r->report = match_report_new(notes);
  if ((r->text != NULL || r->data != NULL || r->list != NULL) &&
      (r->chart != NULL || options->chart == NULL) &&
      (r->report != NULL || options->report == NULL))
    return EF_OK;
  return message_fail(error, EF_NO_MEMORY, "out of memory for the result");
}

static void close_receivers(receivers *r) {
  match_text_free(r->text);
  match_data_free(r->data);
  match_list_free(r->list);
  match_chart_free(r->chart);
  match_report_free(r->report);
  pictures_free(&r->pictures);
}

static ef_status run(match_scene *s, receivers *r, match_summary *sum,
                     ef_error *error) {
  const int format = s->options->format;
  if (format == FORMAT_TEXT || format == FORMAT_JSON ||
      s->options->report != NULL) {
    const ef_status status = match_measure_gamut(s, error);
    if (status != EF_OK)
      return status;
  }
  const match_sink drawing = pictures_sink(&r->pictures);
  const match_sink chart = match_chart_sink(r->chart);
  const match_sink result = r->text != NULL   ? match_text_sink(r->text)
                            : r->list != NULL ? match_list_sink(r->list)
                                              : match_data_sink(r->data);
  const match_sink report = match_report_sink(r->report);
  const match_sink *sinks[4];
  size_t n = 0;
  if (s->options->pictures != NULL)
    sinks[n++] = &drawing;
  if (r->chart != NULL)
    sinks[n++] = &chart;
  if (r->report != NULL)
    sinks[n++] = &report;
  sinks[n++] = &result;
  return match_stream(s, n, sinks, sum, error);
}

exit_code command_match(const command_options *options) {
  exit_code code = result_check_usage(options, 1);
  if (code == EXIT_DONE)
    code = part_check_usage(options);
  if (code == EXIT_DONE)
    code = device_check_usage(options);
  if (code == EXIT_DONE)
    code = recipes_check_usage(options);
  if (code == EXIT_DONE)
    code = people_check_usage(options, "population", seen_is_asked(options));
  if (code == EXIT_DONE)
    code = diagram_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  if (options->seen_by >= 0 && options->pictures == NULL) {
    return message_usage("--seen-by is for pictures: --pictures names their "
                         "folder");
  }
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  match_scene scene;
  match_summary sum = {0};
  receivers to = {0};
  ef_status status = match_scene_load(&scene, options, &notes, &error);
  ef_output *output = result_begin(options, &status, &error);
  if (status == EF_OK) {
    status = open_receivers(&to, options, &notes, output, &error);
  }
  if (status == EF_OK)
    status = run(&scene, &to, &sum, &error);
  code = result_close(output, status, &error);
  close_receivers(&to);
  match_scene_free(&scene);
  if (code == EXIT_DONE && options->check && sum.n_beyond > 0) {
    return EXIT_CHECK_FAILED;
  }
  return code;
}
