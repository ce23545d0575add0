/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <string.h>

#include "image_compare.h"
#include "image_gamut.h"
#include "image_render.h"
#include "message.h"
#include "result.h"

static exit_code check_gamut(const command_options *o) {
  if (o->n_files < 2)
    return message_usage("image gamut needs a PNG picture, and takes a second "
                         "name for the map of where");
  if (o->display == NULL) {
    return message_usage("image gamut needs --display, as in `evenfield image "
                         "gamut --display demo:kiosk-measurements "
                         "PICTURE.png`");
  }
  return result_check_usage(o, 3);
}

static ef_status render(const command_options *options, ef_output *output,
                        const ef_notes *notes, bool *fails, ef_error *error) {
  *fails = false;
  return image_render(options, output, notes, error);
}

static const struct {
  const char *name;
  exit_code (*check)(const command_options *o);
  ef_status (*run)(const command_options *options, ef_output *output,
                   const ef_notes *notes, bool *fails, ef_error *error);
} verbs[] = {{"gamut", check_gamut, image_gamut},
             {"render", image_render_check, render},
             {"compare", image_compare_check, image_compare}};
enum { N_VERBS = sizeof verbs / sizeof *verbs };

exit_code command_image(const command_options *options) {
  size_t verb = 0;
  while (verb < N_VERBS && (options->n_files == 0 ||
                            strcmp(options->files[0], verbs[verb].name) != 0))
    ++verb;
  if (verb == N_VERBS)
    return message_usage("image needs to know what to do: `evenfield image "
                         "gamut PICTURE.png`, `evenfield image compare A.png "
                         "B.png` or `evenfield image render CUBE.hdr OUT`");
  exit_code code = verbs[verb].check(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  bool fails = false;
  ef_output *output = result_open(options, &error);
  const ef_status status =
      output != NULL
          ? verbs[verb].run(options, output, &notes, &fails, &error)
          : error.status;
  code = result_close(output, status, &error);
  return code == EXIT_DONE && fails ? EXIT_CHECK_FAILED : code;
}
