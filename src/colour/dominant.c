/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Dominant wavelength and excitation purity, CIE 015:2018: the ray
 * from the white through the colour is followed to the boundary of the real
 * colours. */
#include <evenfield/colour.h>

#include "base/base_private.h"

#include <float.h>
#include <math.h>

enum { FIRST_NM = 380, LAST_NM = 780, N_LOCUS = LAST_NM - FIRST_NM + 1 };

/* Points of the locus that a ray is held against together. */
enum { SPAN = 16, N_SPANS = (N_LOCUS + SPAN - 1) / SPAN };

/* A box around the points of a span and the first one behind it. */
typedef struct span_box {
  ef_xy centre, half; /* NaN where a point has no chromaticity */
} span_box;

/* The boundary: the locus from its violet to its red end and the purple line
 * between the two. */
typedef struct boundary {
  ef_xy point[N_LOCUS]; /* at FIRST_NM, FIRST_NM + 1, ... */
  size_t violet, red;   /* indices of the ends */
  span_box box[N_SPANS];
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

static span_box box_of(const ef_xy *point, size_t n) {
  ef_xy low = point[0], high = point[0];
  for (size_t i = 0; i < n; ++i) {
    const ef_xy p = point[i];
    if (isnan(p.x)) low.x = high.x = low.y = high.y = (double)NAN;
    if (p.x < low.x) low.x = p.x;
    if (p.x > high.x) high.x = p.x;
    if (p.y < low.y) low.y = p.y;
    if (p.y > high.y) high.y = p.y;
  }
  return (span_box){{0.5 * (low.x + high.x), 0.5 * (low.y + high.y)},
                    {0.5 * (high.x - low.x), 0.5 * (high.y - low.y)}};
}

static void build_boundary(const ef_channels *channels, boundary *b) {
  const size_t first =
      (size_t)((FIRST_NM - channels->grid.start_nm) / channels->grid.step_nm);
  for (size_t i = 0; i < N_LOCUS; ++i) {
    b->point[i] = chromaticity(channels, first + i);
  }
  find_ends(b);
  for (size_t k = 0; k < N_SPANS; ++k) {
    const size_t left = N_LOCUS - k * SPAN;
    b->box[k] = box_of(b->point + k * SPAN, left > SPAN ? SPAN + 1 : left);
  }
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

/* True when all of a span lies on one side of the line, by more than what
 * rounding does to off_ray; false as well for a span that holds NaN. */
static bool is_aside(const span_box *box, ef_xy white, ef_xy direction) {
  const double dx = fabs(direction.x), dy = fabs(direction.y);
  const double x = box->centre.x - white.x, y = box->centre.y - white.y;
  const double off = fabs(direction.x * y - direction.y * x);
  const double reach = dx * box->half.y + dy * box->half.x;
  const double rounding =
      16 * DBL_EPSILON *
      (dx * (fabs(y) + box->half.y) + dy * (fabs(x) + box->half.x));
  return off > reach + rounding;
}

/* What a ray meets on its way. */
typedef struct walk {
  crossing out;
  size_t n;
} walk;

static void meet_locus(walk *w, ef_xy white, ef_xy direction, const ef_xy *p,
                       size_t i, double off, double next) {
  double share = 0;
  const double distance =
      meet(white, direction, p[i], p[i + 1], off, next, &share);
  if (isnan(distance)) return;
  ++w->n;
  const double wavelength_nm = FIRST_NM + (double)i + share;
  const double off_middle = fabs(wavelength_nm - 560);
  if (w->out.found && off_middle >= fabs(w->out.wavelength_nm - 560)) return;
  w->out = (crossing){true, distance, wavelength_nm};
}

/* Follows a ray and the opposite one to the boundary. Near the ends, where
 * neighbouring points differ in their last digits only, a ray may cross the
 * locus several times: the wavelength nearest 560 nm, where the eye sees most,
 * is taken. False when the rays do not start inside. */
static bool cross_boundary(const boundary *b, ef_xy white, ef_xy direction,
                           crossing out[2]) {
  const ef_xy *const p = b->point;
  const ef_xy towards[2] = {direction, {-direction.x, -direction.y}};
  walk w[2] = {{{false, (double)NAN, (double)NAN}, 0},
               {{false, (double)NAN, (double)NAN}, 0}};
  for (size_t i = b->violet; i < b->red;) {
    const size_t k = i / SPAN;
    const size_t end = (k + 1) * SPAN < b->red ? (k + 1) * SPAN : b->red;
    if (is_aside(&b->box[k], white, direction)) {
      i = end;
      continue;
    }
    double off = off_ray(white, direction, p[i]);
    for (; i < end; ++i) {
      const double next = off_ray(white, direction, p[i + 1]);
      meet_locus(&w[0], white, towards[0], p, i, off, next);
      meet_locus(&w[1], white, towards[1], p, i, -off, -next);
      off = next;
    }
  }
  for (int way = 0; way < 2; ++way) {
    double share = 0;
    const double purple =
        meet(white, towards[way], p[b->red], p[b->violet],
             off_ray(white, towards[way], p[b->red]),
             off_ray(white, towards[way], p[b->violet]), &share);
    out[way] = w[way].out;
    if (isnan(purple)) continue;
    ++w[way].n;
    if (!out[way].found) out[way] = (crossing){true, purple, (double)NAN};
  }
  return w[0].n % 2 == 1 && w[1].n % 2 == 1;
}

/* Less than the rounding of a chromaticity has no direction. */
static bool is_at(ef_xy xy, ef_xy white) {
  const double rounding = 4 * DBL_EPSILON;
  return hypot(xy.x - white.x, xy.y - white.y) <= rounding;
}

static ef_status find_dominant(const boundary *b, ef_xy xy, ef_xy white,
                               ef_dominant *out, ef_error *error) {
  const ef_xy direction = {xy.x - white.x, xy.y - white.y};
  crossing met[2];
  if (!cross_boundary(b, white, direction, met)) {
    return ef__error_set(error, EF_INVALID,
                         "the white x %g, y %g lies outside the colours that "
                         "lights can have",
                         white.x, white.y);
  }
  out->complementary = isnan(met[0].wavelength_nm);
  out->dominant_nm = met[out->complementary ? 1 : 0].wavelength_nm;
  out->purity = 1 / met[0].distance;
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
  if (is_at(xy, white)) {
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

/* ---- Many colours ------------------------------------------------------ */

enum { CHUNK = 256 };

typedef struct batch {
  boundary boundary;
  const ef_xy *xy;
  ef_xy white;
  ef_dominant *out;
} batch;

static void find_some(void *context, size_t begin, size_t end) {
  const batch *const w = context;
  for (size_t i = begin; i < end; ++i) {
    const ef_xy xy = w->xy[i];
    w->out[i] = (ef_dominant){(double)NAN, false, (double)NAN};
    if (!isfinite(xy.x) || !isfinite(xy.y)) continue;
    if (is_at(xy, w->white)) {
      w->out[i].purity = 0;
    } else {
      /* Without an answer the fields stay as they are. */
      find_dominant(&w->boundary, xy, w->white, &w->out[i], NULL);
    }
  }
}

ef_status ef_xy_to_dominant_batch(size_t n, const ef_xy *xy, ef_xy white,
                                  const ef_observer *observer, int jobs,
                                  ef_dominant *out, ef_error *error) {
  if (!isfinite(white.x) || !isfinite(white.y)) {
    return ef__error_set(error, EF_INVALID,
                         "the white x %g, y %g has to be finite", white.x,
                         white.y);
  }
  ef_channels channels;
  const ef_status status = get_channels(observer, &channels, error);
  if (status != EF_OK) return status;
  batch w = {.xy = xy, .white = white, .out = out};
  build_boundary(&channels, &w.boundary);
  ef__parallel_for(n, CHUNK, jobs, find_some, &w);
  return EF_OK;
}
