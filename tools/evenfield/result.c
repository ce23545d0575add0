/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "result.h"

#include <math.h>

exit_code result_check_usage(const command_options *options,
                             size_t most_files) {
  const command_options *o = options;
  if (o->n_files > most_files) {
    return message_usage("too many files: \"%s\" is not expected",
                         o->files[most_files]);
  }
  if (isnan(o->ambient_lux) != isnan(o->reflectance)) {
    return message_usage("--ambient and --reflectance go together: the light "
                         "on the screen and how much of it comes back");
  }
  if (o->ambient_illuminant != NULL && isnan(o->ambient_lux)) {
    return message_usage("--ambient-illuminant needs --ambient and "
                         "--reflectance");
  }
  if (!isnan(o->tolerance) && !o->check) {
    return message_usage("--tolerance is for --check");
  }
  if (o->swatch_bits != 8 && o->swatch_bits != 16) {
    return message_usage("--%s is 8 or 16, not %d",
                         o->bit == COMMAND_IMAGE ? "bits" : "swatch-bits",
                         o->swatch_bits);
  }
  return EXIT_DONE;
}

static ef_output *open_output(const char *path, bool overwrite,
                              const char *advice, ef_error *error) {
  ef_output *output = ef_output_open(path, overwrite, error);
  if (output == NULL && error->status == EF_EXISTS) {
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file%s",
                 advice);
    message_place(error, path);
  }
  return output;
}

ef_output *result_open(const command_options *options, ef_error *error) {
  return open_output(options->output, options->force, " with --output", error);
}

ef_output *result_begin(const command_options *options, ef_status *status,
                        ef_error *error) {
  if (*status != EF_OK)
    return NULL;
  ef_output *output = result_open(options, error);
  if (output == NULL)
    *status = error->status;
  return output;
}

ef_output *result_open_at(const char *path, bool overwrite, ef_error *error) {
  return open_output(path, overwrite, "", error);
}

exit_code result_close(ef_output *output, ef_status status, ef_error *error) {
  if (status == EF_OK) {
    status = ef_output_commit(output, error);
  } else {
    ef_output_discard(output);
  }
  return status == EF_OK ? EXIT_DONE : message_error(error);
}
