/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "part.h"

#include <stdlib.h>
#include <string.h>

#include "message.h"

/* More parts than anybody has machines; products with it stay in range. */
enum { MOST_PARTS = 1000000 };

/* ---- K/N --------------------------------------------------------------- */

typedef struct fraction {
  size_t k, n;
} fraction;

/* A whole number from 1 on; 0 when there is none, and for too large ones. */
static size_t read_count(const char *text, size_t length) {
  size_t value = 0;
  for (size_t i = 0; i < length; ++i) {
    if (text[i] < '0' || text[i] > '9' || value > MOST_PARTS)
      return 0;
    value = 10 * value + (size_t)(text[i] - '0');
  }
  return value <= MOST_PARTS ? value : 0;
}

static fraction read_fraction(const char *text) {
  const char *slash = strchr(text, '/');
  if (slash == NULL)
    return (fraction){0, 0};
  return (fraction){read_count(text, (size_t)(slash - text)),
                    read_count(slash + 1, strlen(slash + 1))};
}

/* ---- Usage ------------------------------------------------------------- */

static exit_code refuse_standard_input(const command_options *o) {
  for (size_t i = 0; i < o->n_files; ++i) {
    if (strcmp(o->files[i], "-") == 0)
      return message_usage("--part needs files that every part can read: save "
                           "standard input in one");
  }
  return EXIT_DONE;
}

/* What tells of all rows, and would tell of those of a part. */
static const char *whole_answer(const command_options *o) {
  return o->chart != NULL      ? "chart"
         : o->report != NULL   ? "report"
         : o->pictures != NULL ? "pictures"
         : o->boundary != NULL ? "boundary"
                               : NULL;
}

exit_code part_check_usage(const command_options *options) {
  const command_options *o = options;
  if (o->part == NULL)
    return EXIT_DONE;
  const fraction f = read_fraction(o->part);
  if (f.k < 1 || f.n < 1 || f.k > f.n) {
    return message_usage("--part is K/N, such as 2/8 for the second of eight "
                         "parts (K from 1 to N, N up to %d), not \"%.100s\"",
                         (int)MOST_PARTS, o->part);
  }
  if (o->format != FORMAT_CSV) {
    return message_usage("--part goes with --format csv: parts of other "
                         "formats cannot be joined");
  }
  const char *whole = whole_answer(o);
  if (whole != NULL) {
    return message_usage("--%s shows all rows, and --part reads some; ask for "
                         "it without --part",
                         whole);
  }
  return refuse_standard_input(o);
}

bool part_has_header(const command_options *options) {
  return options->part == NULL || read_fraction(options->part).k == 1;
}

/* ---- Ranges ------------------------------------------------------------ */

/* Share i of n, without overflow. */
static size_t share(size_t bytes, size_t i, size_t n) {
  return bytes / n * i + bytes % n * i / n;
}

ef_status part_begin(part_walk *walk, const command_options *options, size_t n,
                     const char *const *files, ef_error *error) {
  *walk = (part_walk){.is_asked = options->part != NULL};
  if (!walk->is_asked)
    return EF_OK;
  const fraction f = read_fraction(options->part);
  size_t all = 0;
  for (size_t i = 0; i < n; ++i) {
    size_t bytes;
    const ef_status status = ef_file_bytes(files[i], &bytes, error);
    if (status != EF_OK)
      return status;
    all += bytes;
  }
  walk->is_first = f.k == 1;
  walk->first = share(all, f.k - 1, f.n);
  walk->end = share(all, f.k, f.n);
  return EF_OK;
}

ef_status part_next(part_walk *walk, const char *file, part_range *range,
                    ef_error *error) {
  *range = (part_range){0};
  if (!walk->is_asked)
    return EF_OK;
  size_t bytes;
  const ef_status status = ef_file_bytes(file, &bytes, error);
  if (status != EF_OK)
    return status;
  const size_t begin = walk->at, end = walk->at + bytes;
  walk->at = end;
  range->first_byte = walk->first > begin ? walk->first - begin : 0;
  range->end_byte = walk->end > begin ? walk->end - begin : 0;
  /* What is wrong with a file without a row is the first part's to tell. */
  range->is_empty = bytes == 0 ? !walk->is_first
                               : walk->first >= end || walk->end <= begin ||
                                     walk->first == walk->end;
  if (range->end_byte == 0)
    range->end_byte = 1; /* not: all */
  return EF_OK;
}

ef_status part_of_file(const command_options *options, const char *file,
                       part_range *range, ef_error *error) {
  part_walk walk;
  const ef_status status = part_begin(&walk, options, 1, &file, error);
  return status == EF_OK ? part_next(&walk, file, range, error) : status;
}

bool part_holds(const part_range *range, size_t offset) {
  return range->end_byte == 0 ||
         (offset >= range->first_byte && offset < range->end_byte);
}
