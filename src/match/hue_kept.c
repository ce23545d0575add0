/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The colour of the target's hue and lightness with the least loss of chroma:
 * along the ray from the neutral axis to the target in the metric's
 * coordinates, the point nearest to the target that the box of amounts holds.
 * Where the ray misses the box, the lightness is first brought to what the
 * neutral axis can show. */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

/* How far inside the box the colour at share `s` of the target's chroma lies:
 * the least distance of an amount to its bounds, negative outside. */
static double margin(const ef__search *search, double lightness, double s,
                     double amount[3]) {
  const double c[3] = {lightness, s * search->target[1],
                       s * search->target[2]};
  const ef_xyz xyz =
      ef_metric_xyz(search->metric, c, &search->mixing->conditions);
  double least = (double)INFINITY;
  if (!ef__exact(search->mixing, xyz, amount)) return -1;
  for (int i = 0; i < 3; ++i) {
    const double room = fmin(amount[i], 1 - amount[i]);
    /* A colour without coordinates back (NaN) is not shown. */
    if (!(room >= least)) least = isnan(room) ? -(double)INFINITY : room;
  }
  return least;
}

/* Between `out`, where the margin is negative, and `in`, where it is not: the
 * crossing, on the side of the box. */
static double crossing(const ef__search *search, double lightness, double out,
                       double in) {
  /* Colours that are searched for are told to the resolution of the setup. */
  const double enough =
      search->mixing->affine ? 1e-14 : 1e-2 * search->mixing->resolution;
  double amount[3];
  for (int i = 0; i < 60 && fabs(out - in) > enough; ++i) {
    const double middle = 0.5 * (out + in);
    if (margin(search, lightness, middle, amount) < 0) {
      out = middle;
    } else {
      in = middle;
    }
  }
  return in;
}

/* The largest share of the target's chroma in the box at this lightness; -1
 * when there is none. The box may be left and entered again along the ray, so
 * the way is sampled; a stretch inside that is shorter than a sample is looked
 * for where the margin has a peak. */
static double largest_share(const ef__search *search, double lightness) {
  enum { SAMPLES = 32 };
  double amount[3];
  double before = -(double)INFINITY, before_that = before;
  for (int i = SAMPLES; i >= 0; --i) {
    const double s = (double)i / SAMPLES;
    const double here = margin(search, lightness, s, amount);
    if (here >= 0) {
      return i == SAMPLES ? s
                          : crossing(search, lightness, s + 1.0 / SAMPLES, s);
    }
    if (before >= here && before > before_that && i < SAMPLES - 1) {
      /* A peak around the sample before. */
      double low = s, high = s + 2.0 / SAMPLES;
      for (int k = 0; k < 40; ++k) {
        const double a = low + (high - low) / 3, b = high - (high - low) / 3;
        const double at_a = margin(search, lightness, a, amount);
        const double at_b = margin(search, lightness, b, amount);
        if (at_b >= 0) return crossing(search, lightness, s + 2.0 / SAMPLES, b);
        if (at_a >= 0) return crossing(search, lightness, b, a);
        if (at_a > at_b) {
          high = b;
        } else {
          low = a;
        }
      }
    }
    before_that = before;
    before = here;
  }
  return -1;
}

/* The lightness nearest to the target's at which the neutral axis lies in the
 * box, looked for on a grid and then by bisection; NaN when there is none. */
static double neutral_lightness(const ef__search *search) {
  enum { SAMPLES = 100 };
  double amount[3], best = (double)NAN, top[3];
  ef_metric_coordinates(search->metric, search->mixing->conditions.white,
                        &search->mixing->conditions, top);
  for (int i = 0; i <= SAMPLES; ++i) {
    const double at = top[0] * i / SAMPLES;
    if (margin(search, at, 0, amount) < 0) continue;
    if (!(fabs(at - search->target[0]) >= fabs(best - search->target[0]))) {
      best = at;
    }
  }
  if (isnan(best)) return best;
  double in = best, out = search->target[0];
  for (int i = 0; i < 60; ++i) {
    const double middle = 0.5 * (in + out);
    if (margin(search, middle, 0, amount) < 0) {
      out = middle;
    } else {
      in = middle;
    }
  }
  return in;
}

bool ef__hue_kept(const ef__search *search, double amount[3]) {
  double lightness = search->target[0];
  double share = largest_share(search, lightness);
  if (share < 0) {
    lightness = neutral_lightness(search);
    if (isnan(lightness)) return false;
    share = largest_share(search, lightness);
    if (share < 0) return false;
  }
  margin(search, lightness, share, amount);
  /* The crossing is found from inside, to 1e-14 of the chroma: what is that
   * close to a bound sits at it. */
  const double close = 1e-12;
  for (int i = 0; i < 3; ++i) {
    if (amount[i] < close) amount[i] = 0;
    if (amount[i] > 1 - close) amount[i] = 1;
  }
  return true;
}
