/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Dominant wavelength and excitation purity, CIE 015:2018: the ray
 * from the white through the colour is followed to the boundary of the real
 * colours. */
#include <evenfield/colour.h>

#include "base/base_private.h"

#include <float.h>
#include <math.h>

enum { FIRST_NM = 380, LAST_NM = 780, N_LOCUS = LAST_NM - FIRST_NM + 1 };

/* The boundary: the locus from its violet to its red end and the purple line
 * between the two. */
typedef struct boundary {
  ef_xy point[N_LOCUS]; /* at FIRST_NM, FIRST_NM + 1, ... */
  size_t violet, red;   /* indices of the ends */
} boundary;

/* Where a ray leaves the boundary. */
typedef struct crossing {
  bool found;
  double distance;
  double wavelength_nm; /* NaN on the purple line */
} crossing;

/* NaN where the observer has no sensitivity (and so no chromaticity). */
static ef_xy chromaticity(const ef_channels *channels, size_t i) {
  const size_t n = channels->grid.count;
  const double *const value = channels->value;
  const ef_xyy xyy = ef_xyz_to_xyy(
      (ef_xyz){value[i], value[n + i], value[2 * n + i]});
  return (ef_xy){xyy.x, xyy.y};
}

static ef_status get_channels(const ef_observer *observer, ef_channels *out,
                              ef_error *error) {
  *out = ef_observer_channels(observer, EF_TRISTIMULUS);
  if (out->count == 3) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "observer %s has %zu channels; a chromaticity needs 3",
                       ef_observer_name(observer), out->count);
}

ef_status ef_locus_xy(const ef_observer *observer, size_t n,
                      const double *wavelength_nm, ef_xy *out,
                      ef_error *error) {
  ef_channels channels;
  const ef_status status = get_channels(observer, &channels, error);
  if (status != EF_OK) return status;
  const ef_grid *const grid = &channels.grid;
  const double last_nm = ef_grid_wavelength(grid, grid->count - 1);
  for (size_t i = 0; i < n; ++i) {
    const double w = wavelength_nm[i];
    if (!(w >= grid->start_nm && w <= last_nm)) {
      return ef__error_set(error, EF_INVALID,
                           "wavelength %zu is %g nm; the locus is known from "
                           "%g to %g nm",
                           i + 1, w, grid->start_nm, last_nm);
    }
    const double place = (w - grid->start_nm) / grid->step_nm;
    const size_t row = (size_t)place;
    const double share = place - (double)row;
    const ef_xy a = chromaticity(&channels, row);
    out[i] = a;
    if (share == 0) continue;
    const ef_xy b = chromaticity(&channels, row + 1);
    out[i] = (ef_xy){a.x + share * (b.x - a.x), a.y + share * (b.y - a.y)};
  }
  return EF_OK;
}

/* Twice the area of the triangle a, b, c; above zero counterclockwise. */
static double turn(ef_xy a, ef_xy b, ef_xy c) {
  return (b.x - a.x) * (c.y - a.y) - (b.y - a.y) * (c.x - a.x);
}

/* The violet and red ends: those points of the two halves of the locus that
 * have all the others above the line between them. The tabulated ends are not
 * always these: the loci of the CIE 2015 observers turn back in the far red,
 * and the last digits of every table jitter. Points without a chromaticity
 * (NaN) compare as above. */
static void find_ends(boundary *b) {
  const size_t middle = 560 - FIRST_NM;
  const ef_xy *const p = b->point;
  b->violet = 0;
  while (b->violet < middle && isnan(p[b->violet].x)) ++b->violet;
  b->red = N_LOCUS - 1;
  while (b->red > middle && isnan(p[b->red].x)) --b->red;
  for (size_t pass = 0; pass < N_LOCUS; ++pass) {
    const size_t violet = b->violet, red = b->red;
    for (size_t i = middle; i < N_LOCUS; ++i) {
      if (turn(p[b->violet], p[b->red], p[i]) < 0) b->red = i;
    }
    for (size_t i = 0; i <= middle; ++i) {
      if (turn(p[b->violet], p[b->red], p[i]) < 0) b->violet = i;
    }
    if (b->violet == violet && b->red == red) return;
  }
}

static void build_boundary(const ef_channels *channels, boundary *b) {
  const size_t first =
      (size_t)((FIRST_NM - channels->grid.start_nm) / channels->grid.step_nm);
  for (size_t i = 0; i < N_LOCUS; ++i) {
    b->point[i] = chromaticity(channels, first + i);
  }
  find_ends(b);
}

/* How far along the ray (in units of its direction) it meets the side from
 * `a` to `b`, whose ends lie `off_a` and `off_b` to the left of it; NaN when
 * it does not. A corner belongs to one of its two sides only, so that a closed
 * line is crossed an odd number of times from inside. */
static double meet(ef_xy white, ef_xy direction, ef_xy a, ef_xy b,
                   double off_a, double off_b, double *share) {
  if ((off_a > 0) == (off_b > 0)) return (double)NAN;
  *share = off_a / (off_a - off_b);
  const double x = a.x + *share * (b.x - a.x) - white.x;
  const double y = a.y + *share * (b.y - a.y) - white.y;
  const double squared =
      direction.x * direction.x + direction.y * direction.y;
  const double distance = (x * direction.x + y * direction.y) / squared;
  return distance > 0 ? distance : (double)NAN;
}

static double off_ray(ef_xy white, ef_xy direction, ef_xy p) {
  return direction.x * (p.y - white.y) - direction.y * (p.x - white.x);
}

/* Follows a ray to the boundary. Near the ends, where neighbouring points
 * differ in their last digits only, a ray may cross the locus several times:
 * the wavelength nearest 560 nm, where the eye sees most, is taken. False when
 * the ray does not start inside. */
static bool cross_boundary(const boundary *b, ef_xy white, ef_xy direction,
                           crossing *out) {
  const ef_xy *const p = b->point;
  *out = (crossing){false, (double)NAN, (double)NAN};
  size_t n = 0;
  double share = 0;
  double off = off_ray(white, direction, p[b->violet]);
  const double off_violet = off;
  for (size_t i = b->violet; i < b->red; ++i) {
    const double next = off_ray(white, direction, p[i + 1]);
    const double distance =
        meet(white, direction, p[i], p[i + 1], off, next, &share);
    off = next;
    if (isnan(distance)) continue;
    ++n;
    const double wavelength_nm = FIRST_NM + (double)i + share;
    const double off_middle = fabs(wavelength_nm - 560);
    if (out->found && off_middle >= fabs(out->wavelength_nm - 560)) continue;
    *out = (crossing){true, distance, wavelength_nm};
  }
  const double purple = meet(white, direction, p[b->red], p[b->violet], off,
                             off_violet, &share);
  if (!isnan(purple)) {
    ++n;
    if (!out->found) *out = (crossing){true, purple, (double)NAN};
  }
  return n % 2 == 1;
}

static ef_status find_dominant(const boundary *b, ef_xy xy, ef_xy white,
                               ef_dominant *out, ef_error *error) {
  const ef_xy direction = {xy.x - white.x, xy.y - white.y};
  const ef_xy opposite = {-direction.x, -direction.y};
  crossing ahead, behind;
  if (!cross_boundary(b, white, direction, &ahead) ||
      !cross_boundary(b, white, opposite, &behind)) {
    return ef__error_set(error, EF_INVALID,
                         "the white x %g, y %g lies outside the colours that "
                         "lights can have",
                         white.x, white.y);
  }
  out->complementary = isnan(ahead.wavelength_nm);
  out->dominant_nm =
      out->complementary ? behind.wavelength_nm : ahead.wavelength_nm;
  out->purity = 1 / ahead.distance;
  return EF_OK;
}

ef_status ef_xy_to_dominant(ef_xy xy, ef_xy white, const ef_observer *observer,
                            ef_dominant *out, ef_error *error) {
  if (!isfinite(xy.x) || !isfinite(xy.y) || !isfinite(white.x) ||
      !isfinite(white.y)) {
    return ef__error_set(error, EF_INVALID,
                         "x %g, y %g against the white x %g, y %g: all four "
                         "must be finite (black has no chromaticity)",
                         xy.x, xy.y, white.x, white.y);
  }
  /* Less than the rounding of a chromaticity has no direction. */
  const double rounding = 4 * DBL_EPSILON;
  if (hypot(xy.x - white.x, xy.y - white.y) <= rounding) {
    *out = (ef_dominant){(double)NAN, false, 0};
    return EF_OK;
  }
  ef_channels channels;
  const ef_status status = get_channels(observer, &channels, error);
  if (status != EF_OK) return status;
  boundary b;
  build_boundary(&channels, &b);
  return find_dominant(&b, xy, white, out, error);
}
