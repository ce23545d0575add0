/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "tone.h"

#include <stdlib.h>

#include <evenfield/observer.h>

#include "message.h"
#include "rows.h"
#include "source.h"

typedef struct point {
  double drive, level;
} point;

static int by_drive(const void *a, const void *b) {
  const point *p = a, *q = b;
  return (p->drive > q->drive) - (p->drive < q->drive);
}

/* Luminances of spectra, for the CIE 1931 observer: any observer's would do, as
 * only the shape of the ramp counts. */
static ef_status spectral_levels(const rows *r, const ef_grid *grid,
                                 double *level, ef_error *error) {
  ef_observer *observer = ef_observer_new("cie-1931", error);
  if (observer == NULL)
    return error->status;
  const ef_viewing viewing = ef_viewing_default(NULL);
  ef_weights *weights = ef_observer_weights(observer, EF_TRISTIMULUS, grid,
                                            &viewing, NULL, error);
  double *xyz = malloc(r->n * 3 * sizeof *xyz);
  ef_status status = weights == NULL ? error->status : EF_OK;
  if (status == EF_OK && xyz == NULL) {
    status = message_fail(error, EF_NO_MEMORY, "out of memory for a ramp");
  }
  if (status == EF_OK) {
    status = ef_weights_apply(weights, r->n, r->value, 1, xyz, error);
  }
  for (size_t i = 0; i < r->n && status == EF_OK; ++i) {
    level[i] = xyz[3 * i + 1];
  }
  free(xyz);
  ef_weights_free(weights);
  ef_observer_free(observer);
  return status;
}

static ef_status levels(const rows *r, const ef_reader_head *head,
                        double *level, ef_error *error) {
  if (r->n_device == 0) {
    return message_fail(error, EF_MALFORMED,
                        "a ramp needs device values R,G,B "
                        "in each row beside X,Y,Z, x,y,Y or a spectrum");
  }
  switch (head->content) {
  case EF_CONTENT_SPECTRA:
    return spectral_levels(r, &head->grid, level, error);
  case EF_CONTENT_XYZ:
  case EF_CONTENT_XYY: {
    const size_t at = head->content == EF_CONTENT_XYZ ? 1 : 2;
    for (size_t i = 0; i < r->n; ++i)
      level[i] = r->value[i * r->width + at];
    return EF_OK;
  }
  case EF_CONTENT_LAB:
  case EF_CONTENT_DEVICE:
    break;
  }
  return message_fail(error, EF_MALFORMED,
                      "a ramp needs measured light beside "
                      "the device values (X,Y,Z, x,y,Y or a spectrum), not %s",
                      ef_content_text(head->content));
}

/* True when the row belongs to the ramp of `channel`: the others are off; or
 * to the grey ramp, all alike, when `channel` is the number of channels. */
static bool on_ramp(const double *device, size_t n_device, size_t channel) {
  for (size_t c = 0; c < n_device; ++c) {
    if (channel == n_device ? device[c] != device[0]
                            : c != channel && device[c] != 0.0) {
      return false;
    }
  }
  return true;
}

/* The points of one ramp in order of drive, repeated drives averaged. */
static size_t collect(const rows *r, const double *level, size_t channel,
                      point *points) {
  const size_t first = channel == r->n_device ? 0 : channel;
  size_t n = 0;
  for (size_t i = 0; i < r->n; ++i) {
    const double *device = r->device + i * r->n_device;
    if (!on_ramp(device, r->n_device, channel))
      continue;
    points[n++] = (point){device[first], level[i]};
  }
  qsort(points, n, sizeof *points, by_drive);
  size_t n_kept = 0;
  for (size_t i = 0; i < n;) {
    const double drive = points[i].drive;
    double sum = 0.0;
    size_t count = 0;
    for (; i < n && points[i].drive == drive; ++i, ++count) {
      sum += points[i].level;
    }
    points[n_kept++] = (point){drive, sum / (double)count};
  }
  return n_kept;
}

static ef_status fit_curve(const rows *r, const double *level, size_t channel,
                           point *points, ef_tone_curve **out,
                           ef_error *error) {
  const size_t n = collect(r, level, channel, points);
  double *pair = malloc((2 * n + 1) * sizeof *pair);
  if (pair == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for a ramp");
  }
  for (size_t i = 0; i < n; ++i) {
    pair[i] = points[i].drive;
    pair[n + i] = points[i].level;
  }
  *out = ef_tone_curve_from_ramp(n, pair, pair + n, error);
  free(pair);
  return *out != NULL ? EF_OK : error->status;
}

/* One curve a channel when every channel has a ramp of its own, else one curve
 * for all from the grey ramp. */
static ef_status fit_all(const rows *r, const double *level, tone_curves *out,
                         ef_error *error) {
  point *points = malloc(r->n * sizeof *points);
  if (points == NULL) {
    return message_fail(error, EF_NO_MEMORY, "out of memory for a ramp");
  }
  bool have_each = true;
  for (size_t c = 0; c < r->n_device; ++c) {
    have_each = have_each && collect(r, level, c, points) > 2;
  }
  const size_t n_curves = have_each ? r->n_device : 1;
  ef_status status = EF_OK;
  for (size_t c = 0; c < n_curves && status == EF_OK; ++c) {
    const size_t channel = have_each ? c : r->n_device;
    status = fit_curve(r, level, channel, points, &out->curve[c], error);
    if (status == EF_OK)
      out->n = c + 1;
  }
  free(points);
  return status;
}

static ef_status curves_from_file(const command_options *options,
                                  const ef_notes *notes, tone_curves *out,
                                  ef_error *error) {
  ef_reader *reader =
      source_reader(options, options->tone, EF_KIND_LIGHT, notes, error);
  if (reader == NULL)
    return error->status;
  rows r = {0};
  ef_status status = rows_read(reader, &r, error);
  if (status == EF_OK) {
    double *level = malloc(r.n * sizeof *level);
    status = level == NULL
                 ? message_fail(error, EF_NO_MEMORY, "out of memory for a ramp")
                 : levels(&r, ef_reader_get_head(reader), level, error);
    if (status == EF_OK)
      status = fit_all(&r, level, out, error);
    if (status != EF_OK)
      message_place(error, options->tone);
    free(level);
  }
  rows_free(&r);
  ef_reader_free(reader);
  return status;
}

ef_status tone_load(const command_options *options, const ef_notes *notes,
                    tone_curves *out, ef_error *error) {
  *out = (tone_curves){0};
  if (options->tone == NULL)
    return EF_OK;
  if (source_is_file(options, options->tone)) {
    return curves_from_file(options, notes, out, error);
  }
  out->curve[0] = ef_tone_curve_new(options->tone, error);
  if (out->curve[0] == NULL)
    return message_option(error, "tone", "");
  out->n = 1;
  return EF_OK;
}

void tone_free(tone_curves *curves) {
  for (size_t i = 0; i < curves->n; ++i)
    ef_tone_curve_free(curves->curve[i]);
  *curves = (tone_curves){0};
}
