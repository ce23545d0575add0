/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <string.h>

#include "image_gamut.h"
#include "message.h"
#include "result.h"

static exit_code check_usage(const command_options *o) {
  if (o->n_files == 0 || strcmp(o->files[0], "gamut") != 0) {
    return message_usage("image needs to know what to do: `evenfield image "
                         "gamut PICTURE.png`");
  }
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

exit_code command_image(const command_options *options) {
  exit_code code = check_usage(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  bool fails = false;
  ef_output *output = result_open(options, &error);
  const ef_status status =
      output != NULL ? image_gamut(options, output, &notes, &fails, &error)
                     : error.status;
  code = result_close(output, status, &error);
  return code == EXIT_DONE && fails ? EXIT_CHECK_FAILED : code;
}
