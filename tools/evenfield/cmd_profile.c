/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "convert_picture.h"
#include "message.h"
#include "profile_fit.h"
#include "render_convert.h"
#include "render_profile.h"
#include "result.h"

/* ---- make ---------------------------------------------------------------- */

/* The profile first, so that nothing is said of one that could not be
 * written. */
static ef_status write_profile(const profile_fit *f, const unsigned char *bytes,
                               ef_output *report, ef_error *error) {
  ef_output *output = result_open_at(f->path, f->options->force, error);
  if (output == NULL)
    return error->status;
  ef_status status = ef_output_write(output, bytes, f->n_bytes, error);
  if (status == EF_OK)
    status = render_profile_fit(f, report, error);
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}

static exit_code check_make(const command_options *o) {
  if (o->n_files < 2) {
    return message_usage("profile make needs the file to write, as in "
                         "`evenfield profile make kiosk.icc --display "
                         "demo:kiosk-measurements`");
  }
  if (o->display == NULL) {
    return message_usage("profile make needs --display, the measurements of "
                         "the display; --display demo:kiosk-measurements "
                         "shows what it does");
  }
  return result_check_usage(o, 2);
}

static exit_code make(const command_options *o, const ef_notes *notes) {
  exit_code code = check_make(o);
  if (code != EXIT_DONE)
    return code;
  ef_error error = {0};
  profile_fit f;
  unsigned char *bytes = NULL;
  ef_output *report = NULL;
  ef_status status = profile_make_load(&f, o, notes, &bytes, &error);
  if (status == EF_OK) {
    report = result_open(o, &error);
    status = report != NULL ? write_profile(&f, bytes, report, &error)
                            : error.status;
  }
  code = result_close(report, status, &error);
  if (code == EXIT_DONE && profile_fit_fails(&f))
    code = EXIT_CHECK_FAILED;
  free(bytes);
  profile_fit_free(&f);
  return code;
}

/* ---- check --------------------------------------------------------------- */

static exit_code check(const command_options *o, const ef_notes *notes) {
  if (o->n_files < 2) {
    return message_usage("profile check needs a PROFILE and, to know how well "
                         "it describes its device, a file of MEASUREMENTS");
  }
  exit_code code = result_check_usage(o, 3);
  if (code != EXIT_DONE)
    return code;
  ef_error error = {0};
  profile_fit f;
  ef_output *output = NULL;
  ef_status status = profile_check_load(&f, o, notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    status =
        output != NULL ? render_profile_fit(&f, output, &error) : error.status;
  }
  code = result_close(output, status, &error);
  if (code == EXIT_DONE && profile_fit_fails(&f))
    code = EXIT_CHECK_FAILED;
  profile_fit_free(&f);
  return code;
}

/* ---- convert ------------------------------------------------------------- */

static exit_code check_convert(const command_options *o) {
  if (o->n_files < 2) {
    return message_usage("profile convert needs a file of colours, as in "
                         "`evenfield profile convert --to srgb demo:livery`");
  }
  if (o->to == NULL) {
    return message_usage("profile convert needs --to: a profile, a published "
                         "encoding such as srgb, xyz or lab");
  }
  if (o->from != NULL && o->illuminant != NULL) {
    return message_usage("--illuminant is the white of colours; the device "
                         "values of --from have that of their profile");
  }
  return result_check_usage(o, 2);
}

static exit_code check_picture(const command_options *o) {
  if (o->n_files < 3) {
    return message_usage("profile convert of a picture needs the picture to "
                         "write, as in `evenfield profile convert --to p3-d65 "
                         "in.png out.png`");
  }
  if (o->format == FORMAT_CGATS) {
    return message_usage("--format cgats is for lists of colours, not for "
                         "pictures");
  }
  if (strcmp(o->to, "xyz") == 0 || strcmp(o->to, "lab") == 0)
    return message_usage("--to of a picture is an RGB profile, not %s", o->to);
  if (o->illuminant != NULL || o->adaptation != NULL) {
    return message_usage("--illuminant and --adaptation are for lists of "
                         "colours; a picture has the white of its profile");
  }
  return result_check_usage(o, 3);
}

static exit_code convert_one_picture(const command_options *o,
                                     const ef_notes *notes) {
  exit_code code = check_picture(o);
  if (code != EXIT_DONE)
    return code;
  ef_error error = {0};
  size_t n_beyond = 0;
  ef_output *output = result_open(o, &error);
  const ef_status status =
      output != NULL ? convert_picture(o, output, notes, &n_beyond, &error)
                     : error.status;
  code = result_close(output, status, &error);
  return code == EXIT_DONE && o->check && n_beyond > 0 ? EXIT_CHECK_FAILED
                                                       : code;
}

static exit_code convert(const command_options *o, const ef_notes *notes) {
  if (o->n_files > 1 && o->to != NULL && convert_is_picture(o->files[1]))
    return convert_one_picture(o, notes);
  exit_code code = check_convert(o);
  if (code != EXIT_DONE)
    return code;
  ef_error error = {0};
  conversion c;
  convert_summary sum = {0};
  ef_output *output = NULL;
  ef_status status = conversion_load(&c, o, notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    status = output != NULL ? render_conversion(&c, output, &sum, &error)
                            : error.status;
  }
  code = result_close(output, status, &error);
  if (code == EXIT_DONE && o->check && sum.n_beyond > 0)
    code = EXIT_CHECK_FAILED;
  conversion_free(&c);
  return code;
}

/* ---- Which --------------------------------------------------------------- */

typedef enum verb { VERB_MAKE = 1, VERB_CHECK = 2, VERB_CONVERT = 4 } verb;

static const struct {
  const char *name;
  verb bit;
  exit_code (*run)(const command_options *, const ef_notes *);
} verbs[] = {{"make", VERB_MAKE, make},
             {"check", VERB_CHECK, check},
             {"convert", VERB_CONVERT, convert}};
enum { N_VERBS = sizeof verbs / sizeof verbs[0] };

/* Options that only some of the three have a use for. */
static exit_code check_options(const command_options *o, size_t v) {
  const struct {
    const char *name;
    bool is_given;
    unsigned verbs;
  } some[] = {
      {"from", o->from != NULL, VERB_CONVERT},
      {"to", o->to != NULL, VERB_CONVERT},
      {"illuminant", o->illuminant != NULL, VERB_CONVERT},
      {"adaptation", o->adaptation != NULL, VERB_CONVERT},
      {"intent", o->intent != NULL, VERB_CHECK | VERB_CONVERT},
      {"scale-black", o->scale_black, VERB_CHECK | VERB_CONVERT},
      {"kind", o->kind >= 0, VERB_CHECK | VERB_CONVERT},
      {"display", o->display != NULL, VERB_MAKE},
      {"tone", o->tone != NULL, VERB_MAKE},
      {"ambient", !isnan(o->ambient_lux), VERB_MAKE},
      {"description", o->description != NULL, VERB_MAKE},
  };
  for (size_t i = 0; i < sizeof some / sizeof some[0]; ++i) {
    if (some[i].is_given && !(some[i].verbs & verbs[v].bit))
      return message_usage("--%s is not for profile %s", some[i].name,
                           verbs[v].name);
  }
  if (o->format == FORMAT_CGATS && verbs[v].bit != VERB_CONVERT) {
    return message_usage("--format cgats is for profile convert: a list of "
                         "colours");
  }
  return EXIT_DONE;
}

exit_code command_profile(const command_options *options) {
  const command_options *o = options;
  if (o->n_files == 0) {
    return message_usage("profile needs to know what to do: `evenfield profile "
                         "make`, `check` or `convert`");
  }
  for (size_t v = 0; v < N_VERBS; ++v) {
    if (strcmp(o->files[0], verbs[v].name) != 0)
      continue;
    const exit_code code = check_options(o, v);
    if (code != EXIT_DONE)
      return code;
    message_sink sink = {.quiet = o->quiet};
    const ef_notes notes = message_notes(&sink);
    return verbs[v].run(o, &notes);
  }
  return message_usage("profile does not know \"%.100s\": it is make, check or "
                       "convert",
                       o->files[0]);
}
