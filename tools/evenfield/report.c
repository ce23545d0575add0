/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include <evenfield/exchange.h>

#include "message.h"

/* ---- Inputs ------------------------------------------------------------ */

static bool is_file(const char *path) {
  struct stat about;
  return strncmp(path, "demo:", 5) == 0 ||
         (stat(path, &about) == 0 && S_ISREG(about.st_mode));
}

static void add_input(report *r, const char *path, size_t length) {
  for (size_t i = 0; i < r->n_inputs; ++i) {
    if (strlen(r->input[i]) == length &&
        strncmp(r->input[i], path, length) == 0)
      return;
  }
  if (r->n_inputs == REPORT_MOST_INPUTS)
    return;
  char *copy = malloc(length + 1);
  if (copy == NULL)
    return;
  memcpy(copy, path, length);
  copy[length] = '\0';
  r->input[r->n_inputs++] = copy;
}

void report_input(report *r, const char *path) {
  if (path != NULL && (strcmp(path, "-") == 0 || is_file(path)))
    add_input(r, path, strlen(path));
}

/* FILE:COLUMN names a file too. */
static void take(void *cookie, const char *value) {
  report *r = cookie;
  const char *colon = strrchr(value, ':');
  report_input(r, value);
  if (colon == NULL || strncmp(value, "demo:", 5) == 0)
    return;
  const size_t length = (size_t)(colon - value);
  char path[1024];
  if (length < sizeof path) {
    memcpy(path, value, length);
    path[length] = '\0';
    report_input(r, path);
  }
}

/* ---- Pages ------------------------------------------------------------- */

ef_status report_begin(report *r, const command_options *options,
                       const ef_notes *notes, const char *title,
                       ef_error *error) {
  *r = (report){.options = options, .notes = notes};
  r->page = ef_report_open(options->report, title, options->force, error);
  if (r->page == NULL && error->status == EF_EXISTS) {
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file with --report");
    message_place(error, options->report);
  }
  if (r->page == NULL)
    return error->status;
  options_each_input(options, take, r);
  return EF_OK;
}

void report_free(report *r) {
  ef_report_discard(r->page);
  for (size_t i = 0; i < r->n_inputs; ++i)
    free(r->input[i]);
  *r = (report){0};
}

text report_text(const report *r) {
  return (text){.report = r->page};
}

void report_swatches(const report *r, size_t n, size_t n_all,
                     const ef_swatch *swatch,
                     const ef_swatch_settings *settings,
                     const ef_report_halves *halves) {
  size_t n_clipped;
  ef_report_swatches(r->page, n, swatch, settings, halves, &n_clipped);
  char words[200];
  if (n < n_all) {
    snprintf(words, sizeof words, "Pictures are shown of %zu of %zu pairs.", n,
             n_all);
    ef_report_paragraph(r->page, words);
  }
  if (n_clipped > 0) {
    snprintf(words, sizeof words,
             "%zu of the %zu halves lie outside the pictures' own BT.2020 "
             "encoding and are clipped to it.",
             n_clipped, 2 * n);
    ef_report_paragraph(r->page, words);
  }
}

/* ---- How it was made --------------------------------------------------- */

/* As a shell takes it: what is not plainly a word stands between quotes. */
static void add_argument(text *t, const char *argument) {
  static const char plain[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUV"
                              "WXYZ0123456789-_=+,./:@%";
  const size_t length = strlen(argument);
  text_add(t, " ");
  if (length > 0 && strspn(argument, plain) == length) {
    text_add(t, argument);
    return;
  }
  text_add(t, "'");
  for (; *argument != '\0'; ++argument) {
    const char one[2] = {*argument, '\0'};
    text_add(t, *argument == '\'' ? "'\\''" : one);
  }
  text_add(t, "'");
}

static void add_command(const report *r, bool *complete) {
  const command_options *o = r->options;
  text t = {0};
  text_format(&t, "evenfield %s", o->command);
  for (size_t i = 0; i < o->n_arguments; ++i)
    add_argument(&t, o->arguments[i]);
  *complete = *complete && !t.failed;
  ef_report_term_code(r->page, "Command", t.bytes != NULL ? t.bytes : "");
  text_free(&t);
}

static void add_inputs(const report *r, bool *complete) {
  for (size_t i = 0; i < r->n_inputs; ++i) {
    const char *path = r->input[i];
    char digest[EF_DIGEST_TEXT];
    text t = {0};
    ef_error error = {0};
    if (strcmp(path, "-") == 0)
      text_add(&t, "standard input, of which no digest can be given");
    else if (ef_digest_file(path, digest, &error) == EF_OK)
      text_format(&t, "%.900s, SHA-256 %s", path, digest);
    else
      text_format(&t, "%.500s, which %.400s now", path, error.message);
    *complete = *complete && !t.failed;
    ef_report_term_code(r->page,
                        i > 0              ? ""
                        : r->n_inputs == 1 ? "Input file"
                                           : "Input files",
                        t.bytes != NULL ? t.bytes : "");
    text_free(&t);
  }
}

ef_status report_end(report *r, ef_error *error) {
  bool complete = true;
  char number[EF_NUMBER_TEXT];
  ef_report_section(r->page, "How this was made");
  add_command(r, &complete);
  add_inputs(r, &complete);
  if (r->has_seed) {
    ef_number_format(r->seed, number);
    ef_report_term(r->page, "Seed", number);
  }
  ef_report_term(r->page, "Version", ef_version());
  if (!complete)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the report");
  const ef_status status = ef_report_close(r->page, error);
  r->page = NULL;
  return status;
}
