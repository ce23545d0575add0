/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "message.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

/* What was typed may hold line ends; a message is one line. */
static void write_line(const char *before, char *line) {
  for (char *c = line; *c != '\0'; ++c) {
    if ((unsigned char)*c < 0x20u || (unsigned char)*c == 0x7Fu)
      *c = '?';
  }
  fprintf(stderr, "%s%s\n", before, line);
}

exit_code message_usage(const char *format, ...) {
  char line[1024];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(line, sizeof line, format, arguments);
  va_end(arguments);
  write_line("evenfield: ", line);
  return EXIT_USAGE;
}

static exit_code code_of(ef_status status) {
  switch (status) {
  case EF_OK:
    return EXIT_DONE;
  case EF_UNKNOWN_NAME:
    return EXIT_USAGE;
  case EF_INVALID:
  case EF_UNREADABLE:
  case EF_MALFORMED:
    return EXIT_INPUT;
  case EF_NO_MEMORY:
  case EF_NO_ANSWER:
    return EXIT_NO_ANSWER;
  case EF_UNWRITABLE:
  case EF_EXISTS:
    return EXIT_OUTPUT;
  }
  return EXIT_INPUT;
}

exit_code message_error(const ef_error *error) {
  char line[1024];
  ef_error_describe(error, line, sizeof line);
  write_line("evenfield: ", line);
  return code_of(error->status);
}

static void write_note(void *cookie, const char *line) {
  message_sink *sink = cookie;
  if (sink->quiet || strcmp(line, sink->last) == 0)
    return;
  snprintf(sink->last, sizeof sink->last, "%s", line);
  fprintf(stderr, "note: %s\n", line);
}

ef_notes message_notes(message_sink *sink) {
  return (ef_notes){.write = write_note, .cookie = sink};
}

void message_note(const ef_notes *notes, const char *format, ...) {
  char line[1024];
  va_list arguments;
  if (notes == NULL)
    return;
  va_start(arguments, format);
  vsnprintf(line, sizeof line, format, arguments);
  va_end(arguments);
  notes->write(notes->cookie, line);
}

ef_status message_fail(ef_error *error, ef_status status, const char *format,
                       ...) {
  *error = (ef_error){.status = status};
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(error->message, sizeof error->message, format, arguments);
  va_end(arguments);
  return status;
}

ef_status message_argument(ef_error *error, const char *what,
                           const char *after) {
  ef_error whole;
  if (error->status == EF_INVALID)
    error->status = EF_UNKNOWN_NAME;
  message_fail(&whole, error->status, "%s: %.400s%s", what, error->message,
               after);
  *error = whole;
  return error->status;
}

ef_status message_option(ef_error *error, const char *option,
                         const char *after) {
  char what[100];
  snprintf(what, sizeof what, "--%s", option);
  return message_argument(error, what, after);
}

ef_status message_place(ef_error *error, const char *file) {
  if (error->file[0] == '\0') {
    snprintf(error->file, sizeof error->file, "%s", file);
  }
  return error->status;
}

static double now_s(void) {
  struct timespec t;
  if (clock_gettime(CLOCK_MONOTONIC, &t) != 0)
    return 0.0;
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

message_progress message_progress_start(bool quiet) {
  return (message_progress){.on_terminal = !quiet && isatty(STDERR_FILENO),
                            .start_s = now_s()};
}

void message_progress_show(message_progress *progress, size_t n) {
  if (!progress->on_terminal)
    return;
  const double t = now_s();
  if (t - progress->start_s < 1.0 || t - progress->last_s < 0.2)
    return;
  progress->last_s = t;
  progress->shown = true;
  fprintf(stderr, "\r%zu %s", n,
          progress->unit != NULL ? progress->unit : "rows");
}

void message_progress_end(message_progress *progress) {
  if (progress->shown)
    fputs("\r\033[K", stderr);
}
