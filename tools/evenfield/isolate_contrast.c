/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "isolate_contrast.h"

#include <math.h>

#include <evenfield/picture.h>

/* ---- Contrasts in a plane ---------------------------------------------- */

/* In percent. */
static ef_xy place(const isolate_scene *s, const ef_isolation *way,
                   contrast_plane plane,
                   const double contrast[EF_N_RECEPTORS]) {
  const double l = 100.0 * contrast[EF_L_CONE];
  const double m = 100.0 * contrast[EF_M_CONE];
  if (plane == CONTRAST_LM)
    return (ef_xy){l, m};
  /* Luminance contrast, by the weights times what each cone gets: the
   * excitation of the background counts. */
  const double *weight = ef_stimulator_luminance_weights(s->stimulator);
  double sum = 0.0, whole = 0.0;
  for (size_t i = 0; i < 3; ++i) {
    sum += weight[i] * way->excitation[i] * 100.0 * contrast[i];
    whole += weight[i] * way->excitation[i];
  }
  return (ef_xy){l - m, 100.0 * contrast[EF_S_CONE] - sum / whole};
}

static void set_titles(contrast_plane plane, ef_chart_settings *settings) {
  const bool is_lm = plane == CONTRAST_LM;
  settings->x_title = is_lm ? "contrast of L, %"
                            : "red-green: contrast of L minus that of M, %";
  settings->y_title =
      is_lm ? "contrast of M, %" : "tritan: contrast of S minus luminance, %";
  settings->equal_scales = is_lm;
}

/* ---- The display's reach ----------------------------------------------- */

enum { DIRECTIONS = 720 };

/* Where each primary moves the point by a full step of its amount. */
static void steps_of(const isolate_scene *s, const ef_isolation *way,
                     contrast_plane plane, ef_xy step[EF_MAX_DRIVES]) {
  const double *matrix = ef_stimulator_matrix(s->stimulator);
  for (size_t p = 0; p < way->n_primaries; ++p) {
    double contrast[EF_N_RECEPTORS];
    for (size_t r = 0; r < EF_N_RECEPTORS; ++r)
      contrast[r] = matrix[r * way->n_primaries + p] / way->excitation[r];
    step[p] = place(s, way, plane, contrast);
  }
}

/* The farthest point in each direction: all modulations that the gamut holds,
 * as a convex polygon. Both signs of a symmetric one must fit. */
static ef_status add_reach(ef_chart *chart, const isolate_scene *s,
                           const ef_isolation *way, contrast_plane plane,
                           ef_error *error) {
  ef_xy step[EF_MAX_DRIVES];
  double x[DIRECTIONS], y[DIRECTIONS];
  steps_of(s, way, plane, step);
  for (size_t k = 0; k < DIRECTIONS; ++k) {
    const double turn = 2.0 * acos(-1.0) * ((double)k + 0.5) / DIRECTIONS;
    const double c = cos(turn), d = sin(turn);
    x[k] = y[k] = 0.0;
    for (size_t p = 0; p < way->n_primaries; ++p) {
      double up = 1.0 - way->background[p], down = way->background[p];
      if (way->modulation_kind == EF_SYMMETRIC)
        up = down = fmin(up, down);
      const double change = step[p].x * c + step[p].y * d > 0.0 ? up : -down;
      x[k] += change * step[p].x;
      y[k] += change * step[p].y;
    }
  }
  ef_series region = ef_series_default(EF_SERIES_REGION);
  region.look = 3;
  region.name = "within reach of the display, whatever other receptors get";
  region.n = DIRECTIONS;
  region.x = x;
  region.y = y;
  return ef_chart_add(chart, &region, error);
}

static ef_status add_modulation(ef_chart *chart, const isolate_scene *s,
                                const isolate_result *r, contrast_plane plane,
                                ef_error *error) {
  const bool is_pulse = r->way.modulation_kind == EF_PULSE;
  const ef_xy high = place(s, &r->way, plane, r->way.contrast);
  const double x[2] = {is_pulse ? 0.0 : -high.x, high.x};
  const double y[2] = {is_pulse ? 0.0 : -high.y, high.y};
  const char *const end[2] = {is_pulse ? "" : "low", "high"};
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = 0;
  line.name = "the modulation, exact";
  line.n = 2;
  line.x = x;
  line.y = y;
  ef_status status = ef_chart_add(chart, &line, error);
  const ef_xy coded[2] = {place(s, &r->way, plane, r->coded.contrast_low),
                          place(s, &r->way, plane, r->coded.contrast_high)};
  const size_t first = is_pulse ? 1 : 0;
  const double cx[2] = {coded[0].x, coded[1].x};
  const double cy[2] = {coded[0].y, coded[1].y};
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = 1;
  marks.name = "as shown by the codes";
  marks.n = 2 - first;
  marks.x = cx + first;
  marks.y = cy + first;
  marks.label = end + first;
  if (status == EF_OK)
    status = ef_chart_add(chart, &marks, error);
  const double middle = 0.0;
  const char *const background = "background";
  ef_series mark = ef_series_default(EF_SERIES_MARKS);
  mark.look = EF_LOOK_FRAME;
  mark.n = 1;
  mark.x = mark.y = &middle;
  mark.label = &background;
  return status == EF_OK ? ef_chart_add(chart, &mark, error) : status;
}

ef_status isolate_contrast_draw(const isolate_scene *s, const isolate_result *r,
                                contrast_plane plane,
                                ef_chart_settings settings, ef_chart **out,
                                ef_error *error) {
  set_titles(plane, &settings);
  *out = ef_chart_new(&settings, error);
  if (*out == NULL)
    return error->status;
  ef_status status = add_reach(*out, s, &r->way, plane, error);
  if (status == EF_OK)
    status = add_modulation(*out, s, r, plane, error);
  return status;
}
