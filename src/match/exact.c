/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Amounts that match a colour exactly. Affine mixing: one product with the
 * inverse. Else Newton's method in the unit box. */
#include "match/match_private.h"

#include <math.h>
#include <string.h>

#include "base/base_private.h"

/* Residual in shares of the white, which makes the three alike. */
static double residual(const ef__mixing *mixing, ef_xyz target,
                       const double amount[3], double r[3],
                       double jacobian[9]) {
  const ef_xyz white = mixing->conditions.white;
  const double scale[3] = {1 / white.X, 1 / white.Y, 1 / white.Z};
  const ef_xyz xyz = ef__mixing_xyz(mixing, amount, jacobian);
  r[0] = (target.X - xyz.X) * scale[0];
  r[1] = (target.Y - xyz.Y) * scale[1];
  r[2] = (target.Z - xyz.Z) * scale[2];
  for (int i = 0; i < 9 && jacobian != NULL; ++i) jacobian[i] *= scale[i / 3];
  return r[0] * r[0] + r[1] * r[1] + r[2] * r[2];
}

/* (J'J + damping) step = J'r: Newton's step where that is well behaved, a short
 * way downhill where it is not. */
static bool damped_step(const double j[9], const double r[3], double damping,
                        double step[3]) {
  double normal[9];
  double size = 0;
  for (int i = 0; i < 3; ++i) {
    step[i] = j[i] * r[0] + j[3 + i] * r[1] + j[6 + i] * r[2];
    for (int k = 0; k < 3; ++k) {
      normal[3 * i + k] =
          j[i] * j[k] + j[3 + i] * j[3 + k] + j[6 + i] * j[6 + k];
    }
    size += normal[4 * i];
  }
  for (int i = 0; i < 3; ++i) normal[4 * i] += damping * size;
  return ef__solve(3, normal, 1, step);
}

/* From one start; returns the squared residual that was reached. */
static double newton(const ef__mixing *mixing, ef_xyz target,
                     double amount[3]) {
  enum { MOST_STEPS = 60 };
  const double shortest = 1e-12;
  double r[3], j[9], damping = 1e-3;
  double square = residual(mixing, target, amount, r, j);
  for (int i = 0; i < MOST_STEPS && damping < 1e6; ++i) {
    double step[3], next[3], next_r[3];
    if (!damped_step(j, r, damping, step)) {
      damping *= 10;
      continue;
    }
    double moved = 0;
    for (int k = 0; k < 3; ++k) {
      next[k] = ef__clamp(amount[k] + step[k], 0, 1);
      moved = fmax(moved, fabs(next[k] - amount[k]));
    }
    /* Held by the box, or there: what other directions would still give is of
     * no account beside what is missing. */
    if (moved < shortest) break;
    if (!(residual(mixing, target, next, next_r, NULL) < square)) {
      damping = damping > 0 ? 10 * damping : 1e-6;
      continue;
    }
    memcpy(amount, next, sizeof next);
    square = residual(mixing, target, amount, r, j);
    damping = damping > 1e-12 ? damping / 10 : 0;
  }
  return square;
}

static bool exact_by_newton(const ef__mixing *mixing, ef_xyz target,
                            double amount[3]) {
  static const double starts[][3] = {{0.5, 0.5, 0.5},    {0.1, 0.1, 0.1},
                                     {0.9, 0.9, 0.9},    {0.75, 0.25, 0.25},
                                     {0.25, 0.75, 0.25}, {0.25, 0.25, 0.75}};
  const double enough = mixing->resolution * mixing->resolution;
  double least = (double)INFINITY;
  for (size_t s = 0; s < sizeof starts / sizeof starts[0]; ++s) {
    double a[3];
    memcpy(a, starts[s], sizeof a);
    const double square = newton(mixing, target, a);
    if (!(square < least)) continue;
    least = square;
    memcpy(amount, a, sizeof a);
    if (least < enough) return true;
  }
  return false;
}

bool ef__exact_from(const ef__mixing *mixing, ef_xyz xyz, double amount[3]) {
  return newton(mixing, xyz, amount) < mixing->resolution * mixing->resolution;
}

bool ef__exact(const ef__mixing *mixing, ef_xyz xyz, double amount[3]) {
  if (!mixing->affine) return exact_by_newton(mixing, xyz, amount);
  const double light[3] = {xyz.X - mixing->black[0], xyz.Y - mixing->black[1],
                           xyz.Z - mixing->black[2]};
  ef__mat3_apply(mixing->inverse, light, amount);
  return true;
}
