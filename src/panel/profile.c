/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Profile likelihood: the largest likelihood that is left when one quantity is
 * held, and how far that can be moved. */
#include "panel/panel_private.h"

#include <math.h>
#include <string.h>

#define LN_10 2.30258509299404568402

enum { M = EF__PARAMETERS };

/* Held quantity, and the intercept that keeps it as the slope changes. */
typedef struct held {
  const ef__likelihood *likelihood;
  const ef__profile *profile;
  ef_axis axis;
  double target;
} held;

/* Intercept as a function of the slope, with two derivatives. */
typedef struct path {
  double value, d, dd;
} path;

/* t where F^-1 is eta stays: intercept = eta - slope t. */
static path path_of_eta(const held *h, double slope) {
  return (path){h->profile->eta - slope * h->target, -h->target, 0};
}

/* Half the range of levels stays. On a logarithmic axis it is, with a = ln 10
 * scale and E(u) = exp(a eta_high / u) - exp(a eta_low / u),
 * 10^centre exp(-a intercept / u) E(u) / 2. */
static path path_of_range(const held *h, double slope) {
  const ef__data *const data = h->likelihood->data;
  const double a = LN_10 * data->scale, u = slope;
  const double q_low = h->profile->eta_low, q_high = h->profile->eta_high;
  const double low = exp(a * q_low / u), high = exp(a * q_high / u);
  const double e = high - low;
  const double d_e = -a / (u * u) * (q_high * high - q_low * low);
  const double dd_e =
      -2 / u * d_e +
      a * a / (u * u * u * u) * (q_high * q_high * high - q_low * q_low * low);
  const double g = log(e), d_g = d_e / e, dd_g = dd_e / e - d_g * d_g;
  const double k = h->target + log(2.0) - LN_10 * data->centre;
  return (path){-u / a * (k - g), -(k - g) / a + u / a * d_g,
                (2 * d_g + u * dd_g) / a};
}

/* Value and derivatives by (slope, guess, lapse), the intercept following. */
static double evaluate_path(const void *ctx, const double *x, double *gradient,
                            double *curvature, double *expected) {
  const held *const h = ctx;
  const path p = h->profile->what == EF__PROFILE_ETA ? path_of_eta(h, x[0])
                                                     : path_of_range(h, x[0]);
  const double theta[M] = {p.value, x[0], x[1], x[2]};
  if (gradient == NULL)
    return ef__likelihood_evaluate(h->likelihood, theta, NULL, NULL, NULL);
  double g[M], c[M * M], e[M * M];
  const double value = ef__likelihood_evaluate(h->likelihood, theta, g, c, e);
  gradient[0] = g[EF__SLOPE] + g[EF__INTERCEPT] * p.d;
  gradient[1] = g[EF__GUESS];
  gradient[2] = g[EF__LAPSE];
  for (int which = 0; which < 2; ++which) {
    const double *const from = which == 0 ? c : e;
    double *const to = which == 0 ? curvature : expected;
    to[0] = from[M + 1] + 2 * p.d * from[1] + p.d * p.d * from[0];
    for (size_t j = 1; j < 3; ++j) {
      to[j] = to[3 * j] = from[M + j + 1] + p.d * from[j + 1];
      for (size_t k = 1; k < 3; ++k)
        to[3 * j + k] = from[M * (j + 1) + k + 1];
    }
  }
  curvature[0] += g[EF__INTERCEPT] * p.dd;
  return value;
}

/* The largest likelihood with the slope's path: nuisance starts at `theta` and
 * is left there. */
static double along_path(const held *h, double *theta) {
  ef__objective objective = {.m = 3, .evaluate = evaluate_path, .ctx = h};
  for (size_t i = 0; i < 3; ++i) {
    objective.low[i] = h->likelihood->low[i + 1];
    objective.high[i] = h->likelihood->high[i + 1];
  }
  ef__minimum found;
  ef__minimise(&objective, theta + 1, EF__TOLERANCE, &found);
  memcpy(theta + 1, found.x, 3 * sizeof *theta);
  return found.value;
}

static size_t held_parameter(const ef__profile *profile) {
  switch (profile->what) {
  case EF__PROFILE_SLOPE:
    return EF__SLOPE;
  case EF__PROFILE_GUESS:
    return EF__GUESS;
  default:
    return EF__LAPSE;
  }
}

static double with_held(const held *h, double *theta) {
  ef__objective objective = ef__likelihood_objective(h->likelihood);
  const size_t i = held_parameter(h->profile);
  theta[i] = i == EF__SLOPE ? exp(h->target) : h->target;
  objective.low[i] = objective.high[i] = theta[i];
  ef__minimum found;
  ef__minimise(&objective, theta, EF__TOLERANCE, &found);
  memcpy(theta, found.x, M * sizeof *theta);
  return found.value;
}

/* Signed root of twice the loss, less what is allowed: below 0 inside. */
typedef struct search {
  held h;
  double least, allowed;
  double fit[M];   /* where the fit stands */
  double theta[M]; /* nuisance of the last place */
} search;

static double excess(search *s, double at) {
  s->h.target = at;
  const bool is_path = s->h.profile->what == EF__PROFILE_ETA ||
                       s->h.profile->what == EF__PROFILE_RANGE;
  double theta[M];
  memcpy(theta, s->theta, sizeof theta);
  double value = is_path ? along_path(&s->h, theta) : with_held(&s->h, theta);
  /* A walk from place to place may end in a lesser maximum: try from the fit.
   */
  double again[M];
  memcpy(again, s->fit, sizeof again);
  const double other =
      is_path ? along_path(&s->h, again) : with_held(&s->h, again);
  if (other < value) {
    value = other;
    memcpy(theta, again, sizeof theta);
  }
  if (isfinite(value))
    memcpy(s->theta, theta, sizeof theta);
  return sqrt(2 * fmax(value - s->least, 0)) - s->allowed;
}

/* Root between `inside` (excess below 0) and `outside`: regula falsi with the
 * Illinois rule; the root of the loss is nearly straight. */
static double close_in(search *s, double inside, double e_inside,
                       double outside, double e_outside) {
  const double enough = 1e-9 * (fabs(outside - inside) + 1e-3);
  for (int i = 0; i < 100 && fabs(outside - inside) > enough; ++i) {
    double at = isfinite(e_outside) ? inside - e_inside * (outside - inside) /
                                                   (e_outside - e_inside)
                                    : 0.5 * (inside + outside);
    const double e = excess(s, at);
    if (fabs(e) < 1e-8)
      return at;
    if (e < 0) {
      inside = at;
      e_inside = e;
      e_outside *= 0.5;
    } else {
      outside = at;
      e_outside = e;
      e_inside *= 0.5;
    }
  }
  return 0.5 * (inside + outside);
}

/* Walks from the estimate with growing steps until the loss is too large. The
 * axis ends at `bound`; where the loss stays small, the interval is open. */
static double walk(search *s, double estimate, double step, double bound) {
  memcpy(s->theta, s->fit, sizeof s->theta);
  double inside = estimate, e_inside = -s->allowed;
  for (int i = 0; i < 40; ++i) {
    double at = inside + step;
    const bool is_bound = step < 0 ? at <= bound : at >= bound;
    if (is_bound)
      at = bound;
    const double e = excess(s, at);
    if (e >= 0)
      return close_in(s, inside, e_inside, at, e);
    if (is_bound)
      return bound;
    inside = at;
    e_inside = e;
    step *= 1.6; /* 1.6^40 is 1e8 */
  }
  return step < 0 ? -(double)INFINITY : (double)INFINITY;
}

void ef__profile_limits(const ef__likelihood *likelihood,
                        const ef__minimum *fit, const ef__profile *profile,
                        ef_axis axis, double estimate, double step, double drop,
                        double *low, double *high) {
  search s = {.h = {.likelihood = likelihood, .profile = profile, .axis = axis},
              .least = fit->value,
              .allowed = sqrt(2 * drop)};
  memcpy(s.fit, fit->x, sizeof s.fit);
  double least = -(double)INFINITY, most = (double)INFINITY;
  switch (profile->what) {
  case EF__PROFILE_ETA:
  case EF__PROFILE_RANGE:
    break;
  case EF__PROFILE_SLOPE:
    most = log(likelihood->high[EF__SLOPE]);
    break;
  case EF__PROFILE_GUESS:
  case EF__PROFILE_LAPSE:
    least = likelihood->low[held_parameter(profile)];
    most = likelihood->high[held_parameter(profile)];
    break;
  }
  if (!(step > 0) || !isfinite(step))
    step = 0.1;
  *low = walk(&s, estimate, -step, least);
  *high = walk(&s, estimate, step, most);
}
