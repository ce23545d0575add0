/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "weighed.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/exchange.h>

#include "message.h"

enum { SAMPLE, COLOURANT, PARTS, THICKNESS, OVER, N_COLUMNS };
static const char *const columns[N_COLUMNS] = {"sample", "colourant", "parts",
                                               "thickness", "over"};
enum { N_NEEDED = THICKNESS };

/* Everything while the lines are read: one slot for each sample. */
typedef struct reading {
  const char *path, *samples_name;
  const rows *samples;
  ef_fields *fields;
  const char *const *text; /* of the current line */
  size_t line;
  weighed *out;
  size_t *first_line; /* 0: nothing was weighed for it */
  double *parts;      /* x EF_MAX_COLOURANTS */
  double *thickness;
  size_t *over;
} reading;

/* Puts an error at a field of the current line. */
static ef_status at_field(const reading *r, size_t field, ef_error *error) {
  snprintf(error->file, sizeof error->file, "%s", r->path);
  snprintf(error->field, sizeof error->field, "%s", columns[field]);
  error->line = r->line;
  return error->status;
}

static size_t find_sample(const rows *samples, const char *name) {
  for (size_t i = 0; i < samples->n; ++i) {
    if (strcmp(samples->name[i], name) == 0)
      return i;
  }
  return SIZE_MAX;
}

static ef_status take_sample(const reading *r, size_t field, size_t *row,
                             ef_error *error) {
  *row = find_sample(r->samples, r->text[field]);
  if (*row != SIZE_MAX)
    return EF_OK;
  message_fail(error, EF_MALFORMED,
               "found '%.60s', expected the name of a sample in %.120s",
               r->text[field], r->samples_name);
  return at_field(r, field, error);
}

static ef_status take_colourant(const reading *r, size_t *colourant,
                                ef_error *error) {
  weighed *w = r->out;
  const char *name = r->text[COLOURANT];
  for (*colourant = 0; *colourant < w->n_colourants; ++*colourant) {
    if (strcmp(w->colourant[*colourant], name) == 0)
      return EF_OK;
  }
  if (name[0] == '\0') {
    message_fail(error, EF_MALFORMED,
                 "the field is empty, expected the name of a colourant");
    return at_field(r, COLOURANT, error);
  }
  if (w->n_colourants == EF_MAX_COLOURANTS) {
    message_fail(error, EF_MALFORMED,
                 "'%.60s' is one colourant more than the %d that are fitted at "
                 "once",
                 name, EF_MAX_COLOURANTS);
    return at_field(r, COLOURANT, error);
  }
  w->colourant[w->n_colourants] = strdup(name);
  if (w->colourant[w->n_colourants] == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for names");
  ++w->n_colourants;
  return EF_OK;
}

static ef_status take_parts(const reading *r, size_t row, size_t colourant,
                            ef_error *error) {
  double *parts = r->parts + row * EF_MAX_COLOURANTS + colourant;
  double value;
  ef_status status = ef_fields_number(r->fields, PARTS, &value, error);
  if (status != EF_OK)
    return status;
  if (!(value >= 0.0)) {
    message_fail(error, EF_MALFORMED, "found '%.60s', expected 0 or more",
                 r->text[PARTS]);
    return at_field(r, PARTS, error);
  }
  if (!isnan(*parts)) {
    message_fail(error, EF_MALFORMED,
                 "'%.60s' stands in sample '%.60s' twice; add the two up",
                 r->text[COLOURANT], r->text[SAMPLE]);
    return at_field(r, COLOURANT, error);
  }
  *parts = value;
  return EF_OK;
}

/* The thickness of a sample and what it lies over, on any of its lines. */
static ef_status take_film(const reading *r, size_t row, ef_error *error) {
  size_t over = SIZE_MAX;
  double thickness = (double)INFINITY;
  ef_status status = EF_OK;
  if (r->text[THICKNESS][0] != '\0') {
    status = ef_fields_number(r->fields, THICKNESS, &thickness, error);
    if (status == EF_OK && !(thickness > 0.0)) {
      message_fail(error, EF_MALFORMED,
                   "found '%.60s', expected a thickness above 0, or nothing "
                   "for an opaque sample",
                   r->text[THICKNESS]);
      status = at_field(r, THICKNESS, error);
    }
  }
  if (status == EF_OK && r->text[OVER][0] != '\0')
    status = take_sample(r, OVER, &over, error);
  if (status != EF_OK)
    return status;
  if (isfinite(thickness) != (over != SIZE_MAX)) {
    message_fail(error, EF_MALFORMED,
                 "a film has a thickness and lies over a sample; %s is missing",
                 over == SIZE_MAX ? "what it lies over" : "the thickness");
    return at_field(r, over == SIZE_MAX ? OVER : THICKNESS, error);
  }
  if (r->first_line[row] > 0 &&
      (r->over[row] != over || r->thickness[row] < thickness ||
       r->thickness[row] > thickness)) {
    message_fail(error, EF_MALFORMED,
                 "sample '%.60s' has another thickness or substrate in line "
                 "%zu; give all its lines the same",
                 r->text[SAMPLE], r->first_line[row]);
    return at_field(r, THICKNESS, error);
  }
  r->thickness[row] = thickness;
  r->over[row] = over;
  return EF_OK;
}

static ef_status take_line(reading *r, ef_error *error) {
  size_t row = 0, colourant = 0;
  ef_status status = take_sample(r, SAMPLE, &row, error);
  if (status == EF_OK)
    status = take_colourant(r, &colourant, error);
  if (status == EF_OK)
    status = take_parts(r, row, colourant, error);
  if (status == EF_OK)
    status = take_film(r, row, error);
  if (status == EF_OK && r->first_line[row] == 0)
    r->first_line[row] = r->line;
  return status;
}

static ef_status take_lines(reading *r, ef_error *error) {
  for (;;) {
    ef_status status = ef_fields_next(r->fields, &r->text, &r->line, error);
    if (status != EF_OK || r->text == NULL)
      return status;
    status = take_line(r, error);
    if (status != EF_OK)
      return status;
  }
}

/* Shares of one sample: parts over their sum. */
static ef_status set_shares(const reading *r, size_t row, double *share,
                            ef_error *error) {
  const size_t n = r->out->n_colourants;
  const double *parts = r->parts + row * EF_MAX_COLOURANTS;
  double sum = 0.0;
  for (size_t i = 0; i < n; ++i)
    sum += isnan(parts[i]) ? 0.0 : parts[i];
  if (!(sum > 0.0 && isfinite(sum))) {
    message_fail(error, EF_MALFORMED,
                 "the parts of sample '%.60s' sum to nothing",
                 r->samples->name[row]);
    snprintf(error->file, sizeof error->file, "%s", r->path);
    error->line = r->first_line[row];
    return error->status;
  }
  for (size_t i = 0; i < n; ++i)
    share[i] = isnan(parts[i]) ? 0.0 : parts[i] / sum;
  return EF_OK;
}

static ef_status collect(const reading *r, const ef_notes *notes,
                         ef_error *error) {
  weighed *w = r->out;
  const size_t n = r->samples->n;
  size_t n_unused = 0;
  w->row = calloc(n, sizeof *w->row);
  w->line = calloc(n, sizeof *w->line);
  w->thickness = calloc(n, sizeof *w->thickness);
  w->over = calloc(n, sizeof *w->over);
  w->concentration = calloc(n, EF_MAX_COLOURANTS * sizeof *w->concentration);
  if (w->row == NULL || w->line == NULL || w->thickness == NULL ||
      w->over == NULL || w->concentration == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for drawdowns");
  for (size_t i = 0; i < n; ++i) {
    if (r->first_line[i] == 0) {
      ++n_unused;
      continue;
    }
    const ef_status status =
        set_shares(r, i, w->concentration + w->n * w->n_colourants, error);
    if (status != EF_OK)
      return status;
    w->row[w->n] = i;
    w->line[w->n] = r->first_line[i];
    w->thickness[w->n] = r->thickness[i];
    w->over[w->n] = r->over[i];
    w->has_films = w->has_films || isfinite(r->thickness[i]);
    ++w->n;
  }
  if (w->n == 0) {
    message_fail(error, EF_MALFORMED, "there is a header and no row to read");
    return message_place(error, r->path);
  }
  if (n_unused > 0) {
    message_note(notes,
                 "%s: nothing was weighed for %zu of its %zu samples; they "
                 "serve as substrates only",
                 r->samples_name, n_unused, n);
  }
  return EF_OK;
}

ef_status weighed_read(const char *path, const rows *samples,
                       const char *samples_name, const ef_notes *notes,
                       weighed *out, ef_error *error) {
  *out = (weighed){0};
  const size_t n = samples->n;
  reading r = {.path = path,
               .samples_name = samples_name,
               .samples = samples,
               .out = out,
               .first_line = calloc(n, sizeof *r.first_line),
               .parts = calloc(n, EF_MAX_COLOURANTS * sizeof *r.parts),
               .thickness = calloc(n, sizeof *r.thickness),
               .over = calloc(n, sizeof *r.over)};
  ef_status status = EF_OK;
  if (r.first_line == NULL || r.parts == NULL || r.thickness == NULL ||
      r.over == NULL) {
    status = message_fail(error, EF_NO_MEMORY, "out of memory for drawdowns");
  } else {
    for (size_t i = 0; i < n * EF_MAX_COLOURANTS; ++i)
      r.parts[i] = (double)NAN;
    r.fields = ef_fields_open(path, N_COLUMNS, N_NEEDED, columns, notes, error);
    status = r.fields == NULL ? error->status : take_lines(&r, error);
  }
  if (status == EF_OK)
    status = collect(&r, notes, error);
  ef_fields_free(r.fields);
  free(r.first_line);
  free(r.parts);
  free(r.thickness);
  free(r.over);
  return status;
}

void weighed_free(weighed *w) {
  for (size_t i = 0; i < w->n_colourants; ++i)
    free(w->colourant[i]);
  free(w->row);
  free(w->line);
  free(w->thickness);
  free(w->over);
  free(w->concentration);
  *w = (weighed){0};
}
