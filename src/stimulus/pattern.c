/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Patterns on a flat screen, in exact angles from the eye. */
#include <math.h>

#include "stimulus/stimulus_private.h"

#define PI 3.14159265358979323846
#define DEGREE (PI / 180)

double ef_degrees_to_pixels(double angle_deg, double distance_mm,
                            double pixels_per_mm) {
  return tan(angle_deg * DEGREE) * distance_mm * pixels_per_mm;
}

double ef_pixels_to_degrees(double pixels, double distance_mm,
                            double pixels_per_mm) {
  return atan(pixels / (distance_mm * pixels_per_mm)) / DEGREE;
}

static const char *const names[] = {"uniform", "disc", "annulus", "grating",
                                    "gabor"};
enum { N_PATTERNS = sizeof names / sizeof names[0] };

const char *ef_pattern_name(ef_pattern pattern) {
  return names[pattern];
}

ef_status ef_pattern_find(const char *name, ef_pattern *out, ef_error *error) {
  for (size_t k = 0; k < N_PATTERNS; ++k) {
    if (!ef__name_equal(name, names[k]))
      continue;
    *out = (ef_pattern)k;
    return EF_OK;
  }
  return ef__error_unknown(error, "pattern", name, names, N_PATTERNS);
}

/* ---- Geometry ------------------------------------------------------------ */

/* Degrees of a place u mm along the screen. */
static double angle_of(double u, double distance_mm) {
  return atan(u / distance_mm) / DEGREE;
}

/* No place farther than this from the centre, on the screen, lies in the disc:
 * its rim is an ellipse, whose end away from the middle of the screen is the
 * farthest. */
static double reach_of(const ef_frame_settings *s, const double centre[3]) {
  const double rounding = 1e-9, most_deg = 89;
  const double off_deg = angle_of(hypot(centre[0], centre[1]), centre[2]);
  const double end_deg = off_deg + (s->size_deg + s->edge_deg) / 2;
  if (!(s->size_deg > 0) || end_deg > most_deg)
    return HUGE_VAL;
  return s->distance_mm *
         (tan(end_deg * DEGREE) - tan(off_deg * DEGREE)) * (1 + rounding);
}

ef__view ef__view_of(const ef_frame_settings *s) {
  const double turn = s->orientation_deg * DEGREE;
  ef__view view = {.pixel_mm = 1 / s->pixels_per_mm,
                   .distance_mm = s->distance_mm,
                   .middle_x = (double)s->width_px / 2 - 0.5,
                   .middle_y = (double)s->height_px / 2 - 0.5,
                   .direction = {cos(turn), sin(turn)}};
  view.centre[0] = s->distance_mm * tan(s->centre_x_deg * DEGREE);
  view.centre[1] = s->distance_mm * tan(s->centre_y_deg * DEGREE);
  view.centre[2] = s->distance_mm;
  view.centre_angle_deg = angle_of(view.direction[0] * view.centre[0] +
                                       view.direction[1] * view.centre[1],
                                   s->distance_mm);
  view.reach_mm = reach_of(s, view.centre);
  return view;
}

static void place_of(const ef__view *view, size_t x, size_t y,
                     double place[3]) {
  place[0] = ((double)x - view->middle_x) * view->pixel_mm;
  place[1] = (view->middle_y - (double)y) * view->pixel_mm; /* up */
  place[2] = view->distance_mm;
}

/* Angle at the eye between a place and the centre of the pattern: by the
 * tangent, which keeps its digits at small angles. */
static double distance_deg(const ef__view *view, const double place[3]) {
  const double *const a = place, *const b = view->centre;
  const double cross[3] = {a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2],
                           a[0] * b[1] - a[1] * b[0]};
  const double length =
      sqrt(cross[0] * cross[0] + cross[1] * cross[1] + cross[2] * cross[2]);
  return atan2(length, a[0] * b[0] + a[1] * b[1] + a[2] * b[2]) / DEGREE;
}

double ef__pixel_sr(const ef__view *view, size_t x, size_t y) {
  double place[3];
  place_of(view, x, y, place);
  const double square =
      place[0] * place[0] + place[1] * place[1] + place[2] * place[2];
  return view->pixel_mm * view->pixel_mm * view->distance_mm /
         (square * sqrt(square));
}

/* ---- Patterns ------------------------------------------------------------ */

/* 1 inside, 0 outside, a raised cosine of the width `edge` around the radius.
 */
static double inside(double distance, double radius, double edge) {
  const double beyond = distance - radius;
  if (edge <= 0)
    return beyond <= 0 ? 1 : 0;
  if (beyond <= -edge / 2)
    return 1;
  if (beyond >= edge / 2)
    return 0;
  return (1 - sin(PI * beyond / edge)) / 2;
}

double ef__pattern_window(const ef_frame_settings *s, const ef__view *view,
                          size_t x, size_t y) {
  double place[3];
  if (s->pattern == EF_PATTERN_UNIFORM)
    return 1;
  place_of(view, x, y, place);
  const double right = place[0] - view->centre[0];
  const double up = place[1] - view->centre[1];
  if (right * right + up * up > view->reach_mm * view->reach_mm)
    return 0;
  const double distance = distance_deg(view, place);
  double window = 1;
  if (s->size_deg > 0)
    window = inside(distance, s->size_deg / 2, s->edge_deg);
  if (s->pattern == EF_PATTERN_ANNULUS)
    window *= 1 - inside(distance, s->hole_deg / 2, s->edge_deg);
  if (s->pattern == EF_PATTERN_GABOR) {
    const double z = distance / s->sigma_deg;
    window *= exp(-0.5 * z * z);
  }
  return window;
}

double ef__pattern_carrier(const ef_frame_settings *s, const ef__view *view,
                           size_t x, size_t y, double time_s) {
  double place[3];
  if (s->pattern != EF_PATTERN_GRATING && s->pattern != EF_PATTERN_GABOR)
    return 1;
  place_of(view, x, y, place);
  const double along =
      view->direction[0] * place[0] + view->direction[1] * place[1];
  const double angle_deg =
      angle_of(along, view->distance_mm) - view->centre_angle_deg;
  const double cycles = s->cycles_per_deg * angle_deg - s->drift_hz * time_s;
  return cos(2 * PI * (cycles - floor(cycles)) + s->phase_deg * DEGREE);
}
