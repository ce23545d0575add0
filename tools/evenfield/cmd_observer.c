/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <math.h>
#include <string.h>

#include "build.h"
#include "message.h"
#include "render_build.h"
#include "render_tables.h"
#include "result.h"

/* ---- observer list ----------------------------------------------------- */

static exit_code list(const command_options *options) {
  ef_error error = {0};
  ef_output *output = result_open(options, &error);
  const int format = options->format < 0 ? FORMAT_TEXT : options->format;
  const ef_status status = output == NULL
                               ? error.status
                               : render_catalogue(catalogue_find("observers"),
                                                  format, output, &error);
  return result_close(output, status, &error);
}

/* ---- observer build ---------------------------------------------------- */

static exit_code check_build(const command_options *options) {
  const command_options *o = options;
  if (o->n_files < 2 && o->categories == 0) {
    return message_usage("observer build needs an OBSERVER, as in "
                         "`evenfield observer build model:age=45,field=4`");
  }
  if (!isnan(o->population) && o->categories == 0) {
    return message_usage("--population is what --categories chooses from, and "
                         "that is not given");
  }
  return people_check_usage(o, "categories", o->categories > 0);
}

static exit_code build_observers(const command_options *options) {
  const exit_code code = check_build(options);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = options->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  build b;
  ef_output *output = NULL;
  ef_status status = build_load(&b, options, &notes, &error);
  if (status == EF_OK) {
    output = result_open(options, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK) {
    const int format = options->format < 0 ? FORMAT_CSV : options->format;
    status = render_build(&b, format, output, &error);
  }
  build_free(&b);
  return result_close(output, status, &error);
}

exit_code command_observer(const command_options *options) {
  const command_options *o = options;
  if (o->n_files == 0) {
    return message_usage("observer needs to know what to do: `evenfield "
                         "observer list` or `evenfield observer build "
                         "OBSERVER`");
  }
  const bool is_build = strcmp(o->files[0], "build") == 0;
  if (!is_build && strcmp(o->files[0], "list") != 0) {
    return message_usage("observer does not know \"%.100s\": it is list or "
                         "build",
                         o->files[0]);
  }
  const exit_code code = result_check_usage(o, is_build ? 2 : 1);
  if (code != EXIT_DONE)
    return code;
  return is_build ? build_observers(o) : list(o);
}
