/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "command.h"
#include "isolate.h"
#include "message.h"
#include "render_isolate.h"
#include "result.h"

static exit_code check_usage(const command_options *o) {
  const exit_code code = result_check_usage(o, 0);
  if (code != EXIT_DONE)
    return code;
  return people_check_usage(o, "population or --robust",
                            !isnan(o->population) || o->robust);
}

static ef_status write_result(const isolate_scene *s, const isolate_result *r,
                              ef_output *output, ef_error *error) {
  if (s->options->format == FORMAT_TEXT)
    return isolate_text_write(s, r, output, error);
  return isolate_data_write(s, r, output, s->options->format == FORMAT_CSV,
                            error);
}

exit_code command_isolate(const command_options *options) {
  const exit_code code = check_usage(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  isolate_scene scene;
  isolate_result result;
  ef_output *output = NULL;
  ef_status status = isolate_scene_load(&scene, options, &notes, &error);
  if (status == EF_OK)
    status = isolate_compute(&scene, &notes, &result, &error);
  if (status == EF_OK) {
    output = result_open(options, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK)
    status = write_result(&scene, &result, output, &error);
  isolate_scene_free(&scene);
  return result_close(output, status, &error);
}
