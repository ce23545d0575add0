/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A lower bound of CIEDE2000 over all samples with L*, a*, b* in given ranges.
 * Lightness stands apart from the rest; of chroma and hue every term of the
 * formula is bounded by what it can be over the ranges of the sample's chroma
 * and hue. Symbols and equation numbers as in ciede2000.c. */
#include "difference/difference_private.h"

#include <math.h>

#include "difference/range.h"

static const double pi = 3.14159265358979324;
static const double degree = 0.0174532925199432958; /* pi / 180 */

/* S_L of eq. 18, from the mean L* less 50. */
static double lightness_weight(double from_50) {
  const double square = from_50 * from_50;
  return 1 + 0.015 * square / sqrt(20 + square);
}

/* |dL'| / S_L. */
static double least_lightness(const double reference[3], ef__range light) {
  const double nearest = ef__range_nearest(light, reference[0]);
  const double off = fabs(nearest - reference[0]);
  /* It rises with |dL'| as long as S_L > |dL'| S_L' / 2, and S_L' is below
   * 0.0165. Farther apart S_L is the largest of the range. */
  if (off < 120) {
    return off / lightness_weight((reference[0] + nearest) / 2 - 50);
  }
  return off / fmax(lightness_weight((reference[0] + light.low) / 2 - 50),
                    lightness_weight((reference[0] + light.high) / 2 - 50));
}

/* T of eq. 15, whose slope is at most 0.17 + 0.48 + 0.96 + 0.80 a radian. */
static ef__range t_range(ef__range h) {
  const double middle = (h.low + h.high) / 2;
  const double off = 2.41 * (h.high - h.low) / 2;
  const double t = ef__ciede2000_hue_weight(cos(middle), sin(middle), NULL);
  return (ef__range){fmax(t - off, 0.07), fmin(t + off, 1.93)};
}

/* -R_T of eq. 21. */
static ef__range rotation_range(ef__range h, ef__range mean_c) {
  const double middle = remainder((h.low + h.high) / 2 - 275 * degree, 2 * pi);
  const double half = (h.high - h.low) / 2;
  const double near = fmax(fabs(middle) - half, 0) / (25 * degree);
  const double far = (fabs(middle) + half) / (25 * degree);
  ef__range r = {0, 0};
  if (near < 4) { /* 30 exp(-16) degrees: nothing beside 1 */
    r.high = 2 * ef__ciede2000_saturation(mean_c.high) *
             sin(60 * degree * exp(-near * near));
  }
  if (far < 3) { /* and so not beyond 0 degrees, where it has a step */
    r.low = 2 * ef__ciede2000_saturation(mean_c.low) *
            sin(60 * degree * exp(-far * far));
  }
  return r;
}

/* Least of x^2 + y^2 - r x y over a rectangle, r the worst of its range for the
 * sign of x y: positive and homogeneous, so at a side or at zero. */
static double least_at_side(double x, ef__range y, ef__range r) {
  const double best = ef__range_nearest(y, r.high * x / 2);
  const double weight = x * best > 0 ? r.high : r.low;
  return x * x + best * best - weight * x * best;
}

static double least_form(ef__range x, ef__range y, ef__range r) {
  if (x.low <= 0 && x.high >= 0 && y.low <= 0 && y.high >= 0)
    return 0;
  return fmin(fmin(least_at_side(x.low, y, r), least_at_side(x.high, y, r)),
              fmin(least_at_side(y.low, x, r), least_at_side(y.high, x, r)));
}

/* dC' / S_C rises with the sample's chroma and falls with the reference's: its
 * derivatives have the signs of 1 + 0.045 C'. */
static double chroma_part(double c1, double c2) {
  return (c2 - c1) / (1 + 0.0225 * (c1 + c2));
}

typedef struct pair {
  ef__range chroma1, chroma2; /* C' */
  ef__range h1;               /* hue of the reference, radians */
  double k_c, k_h;
} pair;

/* |dH'| / S_H at given |sin|. In each chroma it rises and then may fall, so
 * that its least value is at an end. */
static double least_hue_part(const pair *p, double sine, double t) {
  double least = (double)INFINITY;
  for (int end = 0; end < 4; ++end) {
    const double c1 = end & 1 ? p->chroma1.high : p->chroma1.low;
    const double c2 = end & 2 ? p->chroma2.high : p->chroma2.low;
    least = fmin(least, sqrt(c1 * c2) / (1 + 0.0075 * (c1 + c2) * t));
  }
  return 2 * least * sine / p->k_h;
}

static double most_hue_part(const pair *p, double sine, double t) {
  return 2 * sqrt(p->chroma1.high * p->chroma2.high) * sine /
         (1 + 0.0075 * (p->chroma1.low + p->chroma2.low) * t) / p->k_h;
}

/* Chroma, hue and rotation for hue differences h, within half a turn of 0. */
static double least_chromatic(const pair *p, ef__range h) {
  const ef__range mean_h = {p->h1.low + h.low / 2, p->h1.high + h.high / 2};
  const ef__range mean_c = {(p->chroma1.low + p->chroma2.low) / 2,
                            (p->chroma1.high + p->chroma2.high) / 2};
  const ef__range x = {chroma_part(p->chroma1.high, p->chroma2.low) / p->k_c,
                       chroma_part(p->chroma1.low, p->chroma2.high) / p->k_c};
  const ef__range t = t_range(mean_h);
  ef__range y;
  y.low = h.low > 0 ? least_hue_part(p, sin(h.low / 2), t.high)
                    : -most_hue_part(p, sin(-h.low / 2), t.low);
  y.high = h.high < 0 ? -least_hue_part(p, sin(-h.high / 2), t.high)
                      : most_hue_part(p, sin(h.high / 2), t.low);
  return least_form(x, y, rotation_range(mean_h, mean_c));
}

double ef__ciede2000_least(const ef_metric *self, const double reference[3],
                           const double low[3], const double high[3]) {
  const double lightness =
      least_lightness(reference, (ef__range){low[0], high[0]}) /
      self->parameter[0].value;
  const ef__range a = {low[1], high[1]}, b = {low[2], high[2]};
  const double a1 = reference[1], b1 = reference[2];
  const double c1 = sqrt(a1 * a1 + b1 * b1);
  const ef__range c2 = ef__range_chroma(a, b);
  /* 1 + G, and so a' of both and the hue of the reference. */
  const ef__range g = {1.5 - 0.5 * ef__ciede2000_saturation((c1 + c2.high) / 2),
                       1.5 - 0.5 * ef__ciede2000_saturation((c1 + c2.low) / 2)};
  const ef__range a2 = {fmin(g.low * a.low, g.high * a.low),
                        fmax(g.low * a.high, g.high * a.high)};
  const double a_low = g.low * a1, a_high = g.high * a1;
  pair p = {.chroma1 = {sqrt(a_low * a_low + b1 * b1),
                        sqrt(a_high * a_high + b1 * b1)},
            .chroma2 = ef__range_chroma(a2, b),
            .k_c = self->parameter[1].value,
            .k_h = self->parameter[2].value};
  if (c1 == 0) { /* no hue difference */
    const double chroma = chroma_part(0, p.chroma2.low) / p.k_c;
    return sqrt(lightness * lightness + chroma * chroma);
  }
  const double from = atan2(b1, a_low);
  const double moved =
      atan2(a_low * b1 - b1 * a_high, a_low * a_high + b1 * b1);
  const ef__range off = ef__range_hue(a2, b, a_low, b1);
  p.h1 = (ef__range){from + fmin(moved, 0), from + fmax(moved, 0)};
  const ef__range h = {off.low - fmax(moved, 0), off.high - fmin(moved, 0)};
  /* On each side of the jump at opposite hues by itself. */
  double square = (double)INFINITY;
  for (int turns = -1; turns <= 1; ++turns) {
    const ef__range part = {fmax(h.low - 2 * turns * pi, -pi),
                            fmin(h.high - 2 * turns * pi, pi)};
    if (part.low <= part.high) {
      square = fmin(square, least_chromatic(&p, part));
    }
  }
  return sqrt(lightness * lightness + square);
}
