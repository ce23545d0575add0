/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "isolate_replay.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "result.h"

exit_code replay_check_usage(const command_options *o) {
  static const char *const allowed[] = {"replay", "frames", "format", "output",
                                        "force",  "quiet",  "jobs",   "chart",
                                        "plane",  "report"};
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

/* ---- The record -------------------------------------------------------- */

/* With its files; more than any display's measurements take. */
#define MOST_RECORD_BYTES ((size_t)256 << 20)

static ef_status check_kind(const ef_document *document, ef_error *error) {
  const char *kind = ef_document_text(document, "/record", NULL);
  if (kind != NULL && strcmp(kind, "evenfield stimulus") == 0)
    return EF_OK;
  return message_fail(error, EF_MALFORMED,
                      "is no record of a stimulus (stimulus.json)");
}

static ef_status take_arguments(replay *r, ef_error *error) {
  const size_t n = ef_document_count(r->document, "/arguments");
  r->argument = calloc(n + 1, sizeof *r->argument);
  if (r->argument == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the record");
  for (size_t i = 0; i < n; ++i) {
    char pointer[80];
    snprintf(pointer, sizeof pointer, "/arguments/%zu", i);
    const char *words = ef_document_text(r->document, pointer, NULL);
    if (words == NULL || strncmp(words, "--", 2) != 0) {
      return message_fail(error, EF_MALFORMED,
                          "argument %zu of the record is no option", i + 1);
    }
    r->argument[i] = strdup(words);
    if (r->argument[i] == NULL)
      return message_fail(error, EF_NO_MEMORY, "out of memory for the record");
    ++r->n_arguments;
  }
  return EF_OK;
}

static ef_status take_files(replay *r, ef_error *error) {
  const size_t n = ef_document_count(r->document, "/files");
  ef_status status = EF_OK;
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    char pointer[80];
    size_t length = 0;
    snprintf(pointer, sizeof pointer, "/files/%zu/name", i);
    const char *name = ef_document_text(r->document, pointer, NULL);
    snprintf(pointer, sizeof pointer, "/files/%zu/text", i);
    const char *words = ef_document_text(r->document, pointer, &length);
    status = name == NULL || words == NULL
                 ? message_fail(error, EF_MALFORMED,
                                "file %zu of the record has no name or no text",
                                i + 1)
                 : kept_add(&r->kept, name, words, length, error);
  }
  r->kept.is_closed = true;
  return status;
}

ef_status replay_open(replay *r, const char *path, ef_error *error) {
  *r = (replay){.name = path};
  r->document = ef_document_read(path, MOST_RECORD_BYTES, error);
  if (r->document == NULL)
    return message_place(error, path);
  ef_status status = check_kind(r->document, error);
  if (status == EF_OK)
    status = take_arguments(r, error);
  if (status == EF_OK)
    status = take_files(r, error);
  return status == EF_OK ? EF_OK : message_place(error, path);
}

void replay_free(replay *r) {
  for (size_t i = 0; i < r->n_arguments; ++i)
    free(r->argument[i]);
  free(r->argument);
  kept_free(&r->kept);
  ef_document_free(r->document);
  *r = (replay){.name = NULL};
}

/* ---- Whether it came out as recorded ----------------------------------- */

static bool is_as_recorded(const replay *r, const isolate_show *show,
                           size_t k) {
  char pointer[80], crc[16];
  snprintf(pointer, sizeof pointer, "/pictures/%zu/crc32_of_samples", k);
  snprintf(crc, sizeof crc, "%08lx", (unsigned long)show->picture[k].crc);
  const char *recorded = ef_document_text(r->document, pointer, NULL);
  return recorded != NULL && strcmp(recorded, crc) == 0;
}

exit_code replay_check_pictures(const replay *r, const isolate_show *show,
                                const ef_notes *notes) {
  for (size_t k = 0; k < show->n_pictures; ++k) {
    if (is_as_recorded(r, show, k))
      continue;
    const char *version = ef_document_text(r->document, "/version", NULL);
    message_usage("%s is not as recorded in %s, which version %.40s made; "
                  "this is version %s",
                  show->picture[k].file, r->name,
                  version != NULL ? version : "(none)", ef_version());
    return EXIT_CHECK_FAILED;
  }
  message_note(notes, "every picture (%zu) is as recorded in %s",
               show->n_pictures, r->name);
  return EXIT_DONE;
}
