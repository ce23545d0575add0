/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/chart_private.h"

#include <float.h>
#include <math.h>

#include "base/base_private.h"

/* Room beyond the outermost points, as a share of what they span. */
#define MARGIN 0.05

typedef struct reach {
  double from[2], to[2];
} reach;

static void add(reach *r, double x, double y) {
  if (!isfinite(x) || !isfinite(y))
    return;
  const double at[2] = {x, y};
  for (size_t i = 0; i < 2; ++i) {
    r->from[i] = fmin(r->from[i], at[i]);
    r->to[i] = fmax(r->to[i], at[i]);
  }
}

static void add_point(reach *r, const ef_series *s, size_t i) {
  const double x = s->x[i], y = s->y[i];
  add(r, x, y);
  if (s->kind == EF_SERIES_PAIRS) {
    add(r, s->to_x[i], s->to_y[i]);
  } else if (s->kind == EF_SERIES_INTERVALS) {
    add(r, x, s->low[i]);
    add(r, x, s->high[i]);
  } else if (s->kind == EF_SERIES_SPANS) {
    add(r, s->low[i], y);
    add(r, s->high[i], y);
  } else if (s->kind == EF_SERIES_ELLIPSES) {
    const double turn = s->angle_deg[i] * acos(-1.0) / 180.0;
    const double a = s->magnification * s->semi_major[i];
    const double b = s->magnification * s->semi_minor[i];
    const double half_x = hypot(a * cos(turn), b * sin(turn));
    const double half_y = hypot(a * sin(turn), b * cos(turn));
    add(r, x - half_x, y - half_y);
    add(r, x + half_x, y + half_y);
  }
}

/* Ends that were asked for stay; others get room. */
static void widen(double *from, double *to, double asked_from,
                  double asked_to) {
  const double least = 1e-9 * fmax(fabs(*from), fabs(*to));
  double span = *to - *from;
  if (!(span > least))
    span = fmax(0.1 * fabs(*from), 1e-3);
  const double middle = 0.5 * (*from + *to);
  const double half = (0.5 + MARGIN) * span;
  *from = isnan(asked_from) ? middle - half : asked_from;
  *to = isnan(asked_to) ? middle + half : asked_to;
}

ef_status ef__chart_range(const ef_chart *chart, double from[2], double to[2],
                          ef_error *error) {
  reach r = {{DBL_MAX, DBL_MAX}, {-DBL_MAX, -DBL_MAX}};
  for (size_t k = 0; k < chart->n; ++k) {
    for (size_t i = 0; i < chart->series[k].n; ++i)
      add_point(&r, &chart->series[k], i);
  }
  if (r.from[0] > r.to[0]) {
    return ef__error_set(error, EF_INVALID,
                         "there is nothing to draw: no point of the chart is "
                         "finite");
  }
  const ef_chart_settings *s = &chart->settings;
  widen(&r.from[0], &r.to[0], s->x_from, s->x_to);
  widen(&r.from[1], &r.to[1], s->y_from, s->y_to);
  /* Rows count from the top, and each has half a row above and below. */
  from[1] = (double)s->n_rows - 0.5;
  to[1] = -0.5;
  for (size_t i = 0; i < (s->n_rows > 0 ? 1 : 2); ++i) {
    if (!(r.to[i] > r.from[i]) || !isfinite(r.to[i] - r.from[i])) {
      return ef__error_set(error, EF_INVALID,
                           "an axis of the chart cannot reach from %g to %g",
                           r.from[i], r.to[i]);
    }
    from[i] = r.from[i];
    to[i] = r.to[i];
  }
  return EF_OK;
}
