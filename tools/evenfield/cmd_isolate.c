/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "command.h"
#include "diagram.h"
#include "isolate.h"
#include "isolate_chart.h"
#include "isolate_replay.h"
#include "message.h"
#include "render_isolate.h"
#include "result.h"

static exit_code check_usage(const command_options *o) {
  const exit_code code = result_check_usage(o, 0);
  if (code != EXIT_DONE)
    return code;
  /* The seed is also that of dithering. */
  command_options apart = *o;
  if (isolate_shows(o))
    apart.seed = (double)NAN;
  return people_check_usage(&apart, "population or --robust",
                            !isnan(o->population) || o->robust);
}

static ef_status write_result(const isolate_scene *s, const isolate_result *r,
                              ef_output *output, ef_error *error) {
  if (s->options->format == FORMAT_TEXT)
    return isolate_text_write(s, r, output, error);
  return isolate_data_write(s, r, output, s->options->format == FORMAT_CSV,
                            error);
}

/* ---- One run ----------------------------------------------------------- */

/* `again` NULL: no replay. */
static exit_code run(const command_options *options, const replay *again) {
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  isolate_scene scene;
  isolate_result result = {0};
  ef_output *output = NULL;
  exit_code check = EXIT_DONE;
  ef_status status = isolate_scene_load(&scene, options, &notes, &error);
  if (status == EF_OK)
    status = isolate_compute(&scene, &notes, &result, &error);
  if (status == EF_OK) {
    output = result_open(options, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK && options->chart != NULL)
    status = isolate_chart_write(&scene, &result, &notes, &error);
  if (status == EF_OK && options->report != NULL)
    status = isolate_report_write(&scene, &result, &notes, &error);
  if (status == EF_OK && options->frames != NULL) {
    status = isolate_show_write(&result.show, &scene, &result, options->frames,
                                &error);
    if (status == EF_OK && again != NULL)
      check = replay_check_pictures(again, &result.show, &notes);
  }
  if (status == EF_OK)
    status = write_result(&scene, &result, output, &error);
  isolate_result_free(&result);
  isolate_scene_free(&scene);
  const exit_code code = result_close(output, status, &error);
  return code == EXIT_DONE ? check : code;
}

/* ---- Replay ------------------------------------------------------------ */

/* What was recorded, but for where it goes. */
static exit_code run_again(const command_options *asked, replay *r) {
  command_options o;
  exit_code code = options_parse(&o, "isolate", COMMAND_ISOLATE,
                                 (int)r->n_arguments, r->argument);
  if (code == EXIT_DONE && (o.replay != NULL || o.help || o.version)) {
    code =
        message_usage("%s: its arguments are not those of a stimulus", r->name);
  }
  if (code == EXIT_DONE)
    code = check_usage(&o);
  if (code == EXIT_DONE) {
    o.frames = asked->frames != NULL ? asked->frames : "frames";
    o.format = asked->format;
    o.output = asked->output;
    o.force = asked->force;
    o.quiet = asked->quiet;
    o.jobs = asked->jobs;
    o.chart = asked->chart;
    o.plane = asked->plane;
    o.report = asked->report;
    o.kept = &r->kept;
    code = run(&o, r);
  }
  options_free(&o);
  /* The record's fault, not the command line's. */
  return code == EXIT_USAGE ? EXIT_INPUT : code;
}

static exit_code run_replay(const command_options *options) {
  ef_error error = {0};
  replay r;
  exit_code code = replay_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  if (replay_open(&r, options->replay, &error) == EF_OK)
    code = run_again(options, &r);
  else
    code = message_error(&error);
  replay_free(&r);
  return code;
}

exit_code command_isolate(const command_options *options) {
  exit_code code = diagram_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  if (options->replay != NULL)
    return run_replay(options);
  code = check_usage(options);
  if (code != EXIT_DONE)
    return code;
  kept_files kept = {0};
  command_options o = *options;
  if (o.frames != NULL)
    o.kept = &kept;
  code = run(&o, NULL);
  kept_free(&kept);
  return code;
}
