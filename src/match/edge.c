/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Descent along the edge of a jump. CIEDE2000 jumps where the sample's hue is
 * opposite to the target's, and may be least just beside the jump. The edge is
 * the surface where the cross product of the two chromatic vectors has a small
 * constant value on the side that is lower; Newton steps of the Lagrangian lead
 * along it, within the face of the box. */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

/* The edge as a function of the amounts: value, slope, bend. */
typedef struct edge {
  double value;
  double gradient[3];
  double hessian[9];
} edge;

/* Angle beside the jump, and how exactly it is kept, in radians. */
#define BESIDE 1e-8
#define KEPT 1e-9

static void edge_at(const ef__search *search, const double amount[3],
                    edge *out) {
  const ef__mixing *const mixing = search->mixing;
  double j[9], c[3], hj[9];
  const ef_xyz xyz = ef__mixing_xyz(mixing, amount, j);
  ef_metric_coordinates(search->metric, xyz, &mixing->conditions, c);
  const double a = search->target[1], b = search->target[2];
  /* Divided by both chromas it is the sine of the angle between the hues; the
   * second one only as a factor. */
  const double scale = 1 / (sqrt(a * a + b * b) *
                            (sqrt(c[1] * c[1] + c[2] * c[2]) + 1e-12));
  const ef__expansion in = {.square = scale * (a * c[2] - b * c[1]),
                            .gradient = {0, -b * scale, a * scale},
                            .hessian = {0}};
  ef__expansion x;
  ef__metric_carry(search->metric, xyz, c, &mixing->conditions, &in, &x);
  out->value = in.square;
  for (int i = 0; i < 3; ++i) {
    for (int k = 0; k < 3; ++k) {
      hj[3 * i + k] = x.hessian[3 * i] * j[k] + x.hessian[3 * i + 1] * j[3 + k] +
                      x.hessian[3 * i + 2] * j[6 + k];
    }
  }
  for (int i = 0; i < 3; ++i) {
    out->gradient[i] = j[i] * x.gradient[0] + j[3 + i] * x.gradient[1] +
                       j[6 + i] * x.gradient[2];
    for (int k = 0; k < 3; ++k) {
      out->hessian[3 * i + k] =
          j[i] * hj[k] + j[3 + i] * hj[3 + k] + j[6 + i] * hj[6 + k];
    }
  }
}

/* Moves the free amounts square to the edge until it has the value `wanted`. */
static bool restore(const ef__search *search, const bool fixed[3],
                    double wanted, double amount[3], edge *at) {
  for (int tries = 0; tries < 8; ++tries) {
    edge_at(search, amount, at);
    const double off = at->value - wanted;
    if (fabs(off) < KEPT) return true;
    double size = 0;
    for (int i = 0; i < 3; ++i) {
      if (!fixed[i]) size += at->gradient[i] * at->gradient[i];
    }
    if (!(size > 0)) return false;
    for (int i = 0; i < 3; ++i) {
      if (fixed[i]) continue;
      amount[i] = ef__clamp(amount[i] - off * at->gradient[i] / size, 0, 1);
    }
  }
  return false;
}

/* Multiplier of the edge that fits the slopes of the free amounts best. */
static double multiplier(const ef__place *place, const edge *at,
                         const bool fixed[3]) {
  double up = 0, down = 0;
  for (int i = 0; i < 3; ++i) {
    if (fixed[i]) continue;
    up += place->gradient[i] * at->gradient[i];
    down += at->gradient[i] * at->gradient[i];
  }
  return down > 0 ? up / down : 0;
}

/* Newton's step of the Lagrangian along the edge in the free amounts; zero when
 * the edge leaves no freedom in the face. */
static void edge_step(const ef__place *place, const edge *at,
                      const bool fixed[3], double step[3]) {
  const double lambda = multiplier(place, at, fixed);
  double basis[2][3], n[3] = {0, 0, 0};
  int count = 0, index[3];
  memset(step, 0, 3 * sizeof *step);
  for (int i = 0; i < 3; ++i) {
    if (fixed[i]) continue;
    index[count++] = i;
    n[i] = at->gradient[i];
  }
  if (count < 2) return;
  memset(basis, 0, sizeof basis);
  if (count == 2) {
    basis[0][index[0]] = n[index[1]];
    basis[0][index[1]] = -n[index[0]];
  } else {
    const int big = fabs(n[0]) > fabs(n[1])
                        ? (fabs(n[0]) > fabs(n[2]) ? 0 : 2)
                        : (fabs(n[1]) > fabs(n[2]) ? 1 : 2);
    const int p = (big + 1) % 3, q = (big + 2) % 3;
    if (n[big] == 0) return;
    basis[0][p] = basis[1][q] = 1;
    basis[0][big] = -n[p] / n[big];
    basis[1][big] = -n[q] / n[big];
  }
  double g[2], h[3] = {0, 0, 0}; /* h: 00, 01, 11 */
  for (int r = 0; r < count - 1; ++r) {
    g[r] = 0;
    for (int i = 0; i < 3; ++i) g[r] += basis[r][i] * place->gradient[i];
  }
  for (int r = 0, e = 0; r < count - 1; ++r) {
    for (int s = r; s < count - 1; ++s, ++e) {
      const int slot = r + s;
      for (int i = 0; i < 3; ++i) {
        for (int k = 0; k < 3; ++k) {
          h[slot] += basis[r][i] * basis[s][k] *
                     (place->hessian[3 * i + k] -
                      lambda * at->hessian[3 * i + k]);
        }
      }
    }
  }
  double t[2] = {0, 0};
  if (count == 2) {
    t[0] = h[0] != 0 ? -g[0] / fabs(h[0]) : 0;
  } else {
    double shift = 0;
    const double least = 0.5 * (h[0] + h[2]) -
                         sqrt(0.25 * (h[0] - h[2]) * (h[0] - h[2]) +
                              h[1] * h[1]);
    const double size = fabs(h[0]) + fabs(h[2]);
    if (least < 1e-6 * size) shift = 1e-3 * size - least;
    const double p = h[0] + shift, q = h[2] + shift;
    const double determinant = p * q - h[1] * h[1];
    if (determinant > 0) {
      t[0] = (-g[0] * q + g[1] * h[1]) / determinant;
      t[1] = (-g[1] * p + g[0] * h[1]) / determinant;
    }
  }
  for (int i = 0; i < 3; ++i) step[i] = t[0] * basis[0][i] + t[1] * basis[1][i];
}

/* Longest share of the step that stays in the box, at most 1, and which amount
 * meets its bound there, or -1. */
static double share_in_box(const double amount[3], const double step[3],
                           int *meets) {
  double share = 1;
  *meets = -1;
  for (int i = 0; i < 3; ++i) {
    const double room = step[i] > 0 ? 1 - amount[i] : amount[i];
    const double way = fabs(step[i]);
    if (!(way * share > room)) continue;
    share = room / way;
    *meets = i;
  }
  return share;
}

static bool edge_advance(ef__search *search, ef__place *place, edge *at,
                         double wanted, const bool fixed[3],
                         const double step[3]) {
  int meets;
  double share = share_in_box(place->amount, step, &meets);
  for (; share > 1e-6; share *= 0.3, meets = -1) {
    ef__place next;
    edge next_edge;
    bool held[3];
    for (int i = 0; i < 3; ++i) {
      next.amount[i] = ef__clamp(place->amount[i] + share * step[i], 0, 1);
      held[i] = fixed[i];
    }
    if (meets >= 0) {
      next.amount[meets] = step[meets] > 0 ? 1 : 0;
      held[meets] = true;
    }
    if (!restore(search, held, wanted, next.amount, &next_edge)) continue;
    ef__search_expand(search, &next);
    if (!(next.square < place->square)) continue;
    *place = next;
    *at = next_edge;
    return true;
  }
  return false;
}

static double slope_along(const ef__place *place, const double step[3]) {
  return place->gradient[0] * step[0] + place->gradient[1] * step[1] +
         place->gradient[2] * step[2];
}

/* The step within the face, or where that gains nothing the best one that lets
 * go of one bound. Returns its slope, 0 when there is none. */
static double best_step(const ef__place *place, const edge *at, bool fixed[3],
                        double step[3]) {
  const double enough = -1e-10 * place->square;
  for (int i = 0; i < 3; ++i) {
    fixed[i] = place->amount[i] <= 0 || place->amount[i] >= 1;
  }
  edge_step(place, at, fixed, step);
  double slope = slope_along(place, step);
  if (slope < enough) return slope;
  int freed = -1;
  slope = 0;
  for (int i = 0; i < 3; ++i) {
    if (!fixed[i]) continue;
    double trial[3];
    fixed[i] = false;
    edge_step(place, at, fixed, trial);
    fixed[i] = true;
    const bool inward = place->amount[i] <= 0 ? trial[i] > 0 : trial[i] < 0;
    const double trial_slope = slope_along(place, trial);
    if (!inward || !(trial_slope < enough) || trial_slope >= slope) continue;
    slope = trial_slope;
    freed = i;
    memcpy(step, trial, sizeof trial);
  }
  if (freed >= 0) fixed[freed] = false;
  return slope;
}

bool ef__descend_edge(ef__search *search, ef__place *place) {
  enum { MOST_STEPS = 40 };
  const double near = 0.1; /* radians: descents stop closer than that */
  edge at;
  double c[3];
  ef_metric_coordinates(
      search->metric, ef__mixing_xyz(search->mixing, place->amount, NULL),
      &search->mixing->conditions, c);
  if (c[1] * search->target[1] + c[2] * search->target[2] >= 0) return false;
  edge_at(search, place->amount, &at);
  if (!(fabs(at.value) < near)) return false;
  const double wanted = at.value > 0 ? BESIDE : -BESIDE;
  ef__place here = *place;
  bool fixed[3];
  for (int i = 0; i < 3; ++i) {
    fixed[i] = here.amount[i] <= 0 || here.amount[i] >= 1;
  }
  if (!restore(search, fixed, wanted, here.amount, &at)) return false;
  ef__search_expand(search, &here);
  for (int i = 0; i < MOST_STEPS; ++i) {
    double step[3];
    if (!(best_step(&here, &at, fixed, step) < 0)) break;
    if (!edge_advance(search, &here, &at, wanted, fixed, step)) break;
  }
  if (!(here.square < place->square)) return false;
  *place = here;
  return true;
}
