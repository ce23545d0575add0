/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "command.h"
#include "diagram.h"
#include "isolate.h"
#include "isolate_chart.h"
#include "message.h"
#include "render_isolate.h"
#include "result.h"

/* A record with its files; more than any display's measurements take. */
enum { MOST_RECORD_BYTES = 256 << 20 };

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

/* ---- Whether a replay came out as recorded ----------------------------- */

static bool is_as_recorded(const ef_document *document,
                           const isolate_show *show, size_t k) {
  char pointer[80], crc[16];
  snprintf(pointer, sizeof pointer, "/pictures/%zu/crc32_of_samples", k);
  snprintf(crc, sizeof crc, "%08lx", (unsigned long)show->picture[k].crc);
  const char *recorded = ef_document_text(document, pointer, NULL);
  return recorded != NULL && strcmp(recorded, crc) == 0;
}

static exit_code check_pictures(const ef_document *document, const char *name,
                                const isolate_show *show) {
  for (size_t k = 0; k < show->n_pictures; ++k) {
    if (is_as_recorded(document, show, k))
      continue;
    const char *version = ef_document_text(document, "/version", NULL);
    message_usage("%s is not as recorded in %s, which version %.40s made; "
                  "this is version %s",
                  show->picture[k].file, name,
                  version != NULL ? version : "(none)", ef_version());
    return EXIT_CHECK_FAILED;
  }
  return EXIT_DONE;
}

/* ---- One run ----------------------------------------------------------- */

/* `document` is the record; NULL: no replay. */
static exit_code run(const command_options *options,
                     const ef_document *document, const char *record_name) {
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
  if (status == EF_OK && options->frames != NULL) {
    status = isolate_show_write(&result.show, &scene, &result, options->frames,
                                &error);
    if (status == EF_OK && document != NULL)
      check = check_pictures(document, record_name, &result.show);
  }
  if (status == EF_OK)
    status = write_result(&scene, &result, output, &error);
  isolate_result_free(&result);
  isolate_scene_free(&scene);
  const exit_code code = result_close(output, status, &error);
  return code == EXIT_DONE ? check : code;
}

/* ---- Replay ------------------------------------------------------------ */

static exit_code check_replay_usage(const command_options *o) {
  static const char *const allowed[] = {"replay", "frames", "format", "output",
                                        "force",  "quiet",  "jobs",   "chart"};
  if (o->n_files > 0)
    return result_check_usage(o, 0);
  for (size_t i = 0; i < o->given.n; ++i) {
    bool is_allowed = false;
    for (size_t k = 0; k < sizeof allowed / sizeof allowed[0]; ++k)
      is_allowed = is_allowed || strcmp(o->given.name[i], allowed[k]) == 0;
    if (!is_allowed) {
      return message_usage("--replay takes everything from the record: --%s "
                           "cannot be changed",
                           o->given.name[i]);
    }
  }
  return EXIT_DONE;
}

static ef_status take_files(const ef_document *document, kept_files *kept,
                            ef_error *error) {
  const size_t n = ef_document_count(document, "/files");
  ef_status status = EF_OK;
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    char pointer[80];
    size_t length = 0;
    snprintf(pointer, sizeof pointer, "/files/%zu/name", i);
    const char *name = ef_document_text(document, pointer, NULL);
    snprintf(pointer, sizeof pointer, "/files/%zu/text", i);
    const char *words = ef_document_text(document, pointer, &length);
    status = name == NULL || words == NULL
                 ? message_fail(error, EF_MALFORMED,
                                "file %zu of the record has no name or no text",
                                i + 1)
                 : kept_add(kept, name, words, length, error);
  }
  kept->is_closed = true;
  return status;
}

/* The recorded arguments, borrowed from the record; NULL and the error. */
static char **take_arguments(const ef_document *document, size_t *n,
                             ef_error *error) {
  const char *kind = ef_document_text(document, "/record", NULL);
  if (kind == NULL || strcmp(kind, "evenfield stimulus") != 0) {
    message_fail(error, EF_MALFORMED,
                 "is no record of a stimulus (stimulus.json)");
    return NULL;
  }
  *n = ef_document_count(document, "/arguments");
  char **argument = calloc(*n + 1, sizeof *argument);
  if (argument == NULL)
    message_fail(error, EF_NO_MEMORY, "out of memory for the record");
  for (size_t i = 0; i < *n && argument != NULL; ++i) {
    char pointer[80];
    snprintf(pointer, sizeof pointer, "/arguments/%zu", i);
    const char *words = ef_document_text(document, pointer, NULL);
    if (words == NULL || strncmp(words, "--", 2) != 0) {
      message_fail(error, EF_MALFORMED,
                   "argument %zu of the record is no "
                   "option",
                   i + 1);
      free(argument);
      return NULL;
    }
    argument[i] = strdup(words);
    if (argument[i] == NULL) {
      message_fail(error, EF_NO_MEMORY, "out of memory for the record");
      while (i > 0)
        free(argument[--i]);
      free(argument);
      return NULL;
    }
  }
  return argument;
}

static exit_code replay_with(const command_options *asked,
                             const ef_document *document, size_t n,
                             char *const *argument, kept_files *kept) {
  command_options o;
  exit_code code =
      options_parse(&o, "isolate", COMMAND_ISOLATE, (int)n, argument);
  if (code == EXIT_DONE && (o.replay != NULL || o.help || o.version))
    code = message_usage("%s: its arguments are not those of a stimulus",
                         asked->replay);
  if (code == EXIT_DONE)
    code = check_usage(&o);
  if (code == EXIT_USAGE)
    code = EXIT_INPUT; /* the record's fault, not the command line's */
  if (code == EXIT_DONE) {
    o.frames = asked->frames != NULL ? asked->frames : "frames";
    o.format = asked->format;
    o.output = asked->output;
    o.force = asked->force;
    o.quiet = asked->quiet;
    o.jobs = asked->jobs;
    o.chart = asked->chart;
    o.kept = kept;
    code = run(&o, document, asked->replay);
    if (code == EXIT_USAGE)
      code = EXIT_INPUT;
  }
  options_free(&o);
  return code;
}

static exit_code replay(const command_options *options) {
  ef_error error = {0};
  exit_code code = check_replay_usage(options);
  if (code != EXIT_DONE)
    return code;
  kept_files kept = {0};
  size_t n = 0;
  char **argument = NULL;
  ef_document *document =
      ef_document_read(options->replay, MOST_RECORD_BYTES, &error);
  if (document != NULL)
    argument = take_arguments(document, &n, &error);
  if (argument == NULL || take_files(document, &kept, &error) != EF_OK) {
    message_place(&error, options->replay);
    code = message_error(&error);
  } else {
    code = replay_with(options, document, n, argument, &kept);
  }
  for (size_t i = 0; i < n && argument != NULL; ++i)
    free(argument[i]);
  free(argument);
  kept_free(&kept);
  ef_document_free(document);
  return code;
}

exit_code command_isolate(const command_options *options) {
  exit_code code = diagram_check_usage(options);
  if (code != EXIT_DONE)
    return code;
  if (options->replay != NULL)
    return replay(options);
  code = check_usage(options);
  if (code != EXIT_DONE)
    return code;
  kept_files kept = {0};
  command_options o = *options;
  if (o.frames != NULL)
    o.kept = &kept;
  code = run(&o, NULL, NULL);
  kept_free(&kept);
  return code;
}
