/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Two pictures of one size, pixel by pixel, a band of rows at a time. All
 * differences are kept as counts in cells of their logarithm. */
#include "image/image_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Pixels of a band: enough for all threads, little memory. */
#define BAND_PIXELS ((size_t)1 << 15)

/* A cell holds the floats whose first 11 binary places are the same: 0.05 % of
 * the value from end to end. Cell 0 holds those that are nothing, the last one
 * those that are infinite. */
enum { CELL_SHIFT = 12, N_CELLS = 0x7F800 + 1 };

typedef struct side {
  ef_picture *picture;
  ef_transform *transform;
  size_t n_in;
  uint16_t *row;
  double *in, *at; /* of a band: samples, coordinates */
} side;

struct ef_comparison {
  side side[2];
  const ef_metric *metric;
  ef_conditions conditions;
  ef_xyz white;
  int jobs;
  size_t width, height, band;
  size_t n_rows, next_row; /* of the band now; rows handed out of it */
  size_t y;                /* rows handed out */
  double *difference;      /* of a band */
  uint64_t *cell;
  ef_comparison_totals totals;
  double sum;
};

ef_comparison_settings ef_comparison_settings_default(const ef_metric *metric,
                                                      double jnd) {
  return (ef_comparison_settings){
      .metric = metric, .jnd = jnd, .tolerance = jnd};
}

/* ---- Opening ------------------------------------------------------------- */

static ef_status side_init(ef_comparison *c, side *s, ef_picture *picture,
                           ef_error *error) {
  const ef_transform_settings how = {.intent = EF_INTENT_RELATIVE};
  const size_t n = c->band * c->width;
  s->picture = picture;
  s->transform =
      ef_transform_new(ef_picture_get_profile(picture), NULL, &how, error);
  if (s->transform == NULL)
    return error->status;
  s->n_in = ef_transform_inputs(s->transform);
  s->row = ef__allocate(3 * c->width, sizeof *s->row);
  s->in = ef__allocate(n * 3, sizeof *s->in);
  s->at = ef__allocate(n * 3, sizeof *s->at);
  return s->row != NULL && s->in != NULL && s->at != NULL
             ? EF_OK
             : ef__error_memory(error, "pictures");
}

static ef_status check_sizes(const ef_picture *a, const ef_picture *b,
                             ef_error *error) {
  const ef_png_head *p = ef_picture_get_head(a), *q = ef_picture_get_head(b);
  if (p->width == q->width && p->height == q->height)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED,
                "is %zu x %zu pixels, and %.200s is %zu x %zu; pictures are "
                "compared pixel by pixel, so both must be of one size",
                q->width, q->height, p->file, p->width, p->height);
  return ef__error_place(error, q->file, 0, 0, NULL);
}

static ef_status build(ef_comparison *c, ef_picture *a, ef_picture *b,
                       ef_error *error) {
  const ef_png_head *head = ef_picture_get_head(a);
  ef_status status = check_sizes(a, b, error);
  if (status != EF_OK)
    return status;
  c->width = head->width;
  c->height = head->height;
  c->band = BAND_PIXELS / c->width;
  c->band = c->band == 0 ? 1 : c->band > c->height ? c->height : c->band;
  status = side_init(c, &c->side[0], a, error);
  if (status == EF_OK)
    status = side_init(c, &c->side[1], b, error);
  if (status != EF_OK)
    return status;
  c->difference = ef__allocate(c->band * c->width, sizeof *c->difference);
  c->cell = ef__allocate_zeroed(N_CELLS, sizeof *c->cell);
  return c->difference != NULL && c->cell != NULL
             ? EF_OK
             : ef__error_memory(error, "differences");
}

ef_comparison *ef_comparison_new(ef_picture *reference, ef_picture *sample,
                                 const ef_comparison_settings *settings,
                                 ef_error *error) {
  ef_error own = {0}; /* the status stands in the error */
  if (error == NULL)
    error = &own;
  ef_comparison *c = ef__allocate_zeroed(1, sizeof *c);
  if (c == NULL) {
    ef__error_memory(error, "pictures");
    return NULL;
  }
  c->metric = settings->metric;
  c->jobs = settings->jobs;
  c->totals.jnd = settings->jnd;
  c->totals.tolerance = settings->tolerance;
  /* Of the connection space, as profiles have it (ICC.1, 7.2.16). */
  c->white = (ef_xyz){96.42, 100.0, 82.49};
  c->conditions = ef_conditions_default(c->white);
  if (build(c, reference, sample, error) == EF_OK)
    return c;
  ef_comparison_free(c);
  return NULL;
}

void ef_comparison_free(ef_comparison *comparison) {
  if (comparison == NULL)
    return;
  for (int i = 0; i < 2; ++i) {
    side *s = &comparison->side[i];
    ef_transform_free(s->transform);
    free(s->row);
    free(s->in);
    free(s->at);
  }
  free(comparison->difference);
  free(comparison->cell);
  free(comparison);
}

/* ---- Bands --------------------------------------------------------------- */

static ef_status side_fill(ef_comparison *c, side *s, size_t n_rows,
                           ef_error *error) {
  const size_t n = n_rows * c->width;
  for (size_t y = 0; y < n_rows; ++y) {
    bool has_row;
    const ef_status status =
        ef_picture_next_row(s->picture, s->row, &has_row, error);
    if (status != EF_OK)
      return status;
    double *to = s->in + y * c->width * s->n_in;
    for (size_t x = 0; x < c->width; ++x) {
      for (size_t k = 0; k < s->n_in; ++k)
        to[x * s->n_in + k] = s->row[3 * x + k] / 65535.0;
    }
  }
  const ef_status status =
      ef_transform_apply(s->transform, n, s->in, c->jobs, s->at, error);
  if (status == EF_OK)
    ef_metric_coordinates_batch(c->metric, n, s->at, &c->conditions, c->jobs,
                                s->at);
  return status;
}

/* What follows the last row: a file that is cut off there is told of. */
static ef_status see_end(ef_comparison *c, ef_error *error) {
  ef_status status = EF_OK;
  bool has_row;
  for (int i = 0; i < 2 && status == EF_OK; ++i)
    status = ef_picture_next_row(c->side[i].picture, c->side[i].row, &has_row,
                                 error);
  return status;
}

static size_t cell_of(double value) {
  const float as_float = (float)value;
  uint32_t bits;
  memcpy(&bits, &as_float, sizeof bits);
  return bits >> CELL_SHIFT;
}

/* The middle of a cell. */
static double cell_value(size_t cell) {
  if (cell == 0)
    return 0.0;
  const uint32_t bits =
      (uint32_t)(cell << CELL_SHIFT) + ((uint32_t)1 << (CELL_SHIFT - 1));
  float value;
  memcpy(&value, &bits, sizeof value);
  return (double)value;
}

static void count(ef_comparison *c) {
  ef_comparison_totals *t = &c->totals;
  const size_t first = c->y * c->width;
  for (size_t i = 0; i < c->n_rows * c->width; ++i) {
    const double d = c->difference[i];
    if (!isfinite(d)) {
      ++t->n_undefined;
      continue;
    }
    ++t->n_pixels;
    c->sum += d;
    ++c->cell[cell_of(d)];
    t->n_above_jnd += d > t->jnd;
    t->n_above_tolerance += d > t->tolerance;
    if (!(d > t->largest))
      continue;
    t->largest = d;
    t->largest_x = (first + i) % c->width;
    t->largest_y = (first + i) / c->width;
  }
}

static ef_status fill_band(ef_comparison *c, ef_error *error) {
  const size_t left = c->height - c->y;
  c->next_row = 0;
  c->n_rows = left < c->band ? left : c->band;
  if (c->n_rows == 0)
    return EF_OK;
  ef_status status = side_fill(c, &c->side[0], c->n_rows, error);
  if (status == EF_OK)
    status = side_fill(c, &c->side[1], c->n_rows, error);
  if (status != EF_OK)
    return status;
  ef_metric_difference_batch(c->metric, c->n_rows * c->width, c->side[0].at,
                             c->side[1].at, c->jobs, c->difference);
  count(c);
  return c->y + c->n_rows == c->height ? see_end(c, error) : EF_OK;
}

ef_status ef_comparison_next_row(ef_comparison *comparison,
                                 const double **difference, ef_error *error) {
  ef_comparison *const c = comparison;
  *difference = NULL;
  if (c->next_row == c->n_rows) {
    const ef_status status = fill_band(c, error);
    if (status != EF_OK || c->n_rows == 0)
      return status;
  }
  *difference = c->difference + c->next_row * c->width;
  ++c->next_row;
  ++c->y;
  return EF_OK;
}

/* ---- What it comes to ---------------------------------------------------- */

ef_comparison_totals
ef_comparison_get_totals(const ef_comparison *comparison) {
  ef_comparison_totals t = comparison->totals;
  const double none = (double)NAN;
  t.mean = t.n_pixels > 0 ? comparison->sum / (double)t.n_pixels : none;
  return t;
}

double ef_comparison_quantile(const ef_comparison *comparison, double p) {
  const ef_comparison_totals *t = &comparison->totals;
  if (t->n_pixels == 0)
    return (double)NAN;
  /* The smallest value that a share p of the pixels does not exceed. */
  const double wanted = ceil(p * (double)t->n_pixels);
  uint64_t n = 0;
  for (size_t i = 0; i < N_CELLS; ++i) {
    n += comparison->cell[i];
    if (n > 0 && (double)n >= wanted)
      return fmin(cell_value(i), t->largest);
  }
  return t->largest;
}

bool ef_comparison_next_cell(const ef_comparison *comparison, size_t *cursor,
                             double *value, size_t *n_pixels) {
  while (*cursor < N_CELLS) {
    const size_t i = (*cursor)++;
    if (comparison->cell[i] == 0)
      continue;
    *value = fmin(cell_value(i), comparison->totals.largest);
    *n_pixels = (size_t)comparison->cell[i];
    return true;
  }
  return false;
}
