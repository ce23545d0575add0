/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Correlated colour temperature: the foot of the perpendicular from a
 * chromaticity to the Planckian locus in CIE 1960 u, v. The locus is summed
 * from the CIE 1931 functions at every step, with its derivatives; a closed
 * form only says where to begin. The parameter is the reciprocal temperature
 * in mired (1e6 / T), in which the locus is smooth up to infinite T. */
#include <evenfield/colour.h>

#include <math.h>

static const double c2_nm_k = 1.4388e7;  /* CIE 015:2018: 1.4388e-2 m K */
static const double first_mired = 1;     /* 1e6 K */
static const double last_mired = 2000;   /* 500 K */
static const double lowest_k = 1000;     /* CIE 015:2018 */
static const double highest_k = 100000;
static const double largest_duv = 0.05;  /* CIE 015:2018 */
/* Rounding of x, y moves a temperature by less than 1e-12 of itself; with this
 * a radiator exactly at a limit stays inside. */
static const double limit_slack = 1e-9;

/* A point of the locus in CIE 1960 u, v and its derivatives by mired. */
typedef struct locus_point {
  double u, v;
  double du, dv;
  double ddu, ddv;
} locus_point;

/* Sums that give u = 4 X / D and v = 6 Y / D: X, Y, D = X + 15 Y + 3 Z. */
typedef struct sums {
  double X, Y, D;
} sums;

static void add(sums *s, double weight, double x, double y, double d) {
  s->X += weight * x;
  s->Y += weight * y;
  s->D += weight * d;
}

/* Planck's law without its constant: lambda^-5 n with n = 1 / (e^q - 1),
 * q = c2 / (lambda T), and n' = -q' n (1 + n), n'' = q'^2 n (1 + n)(1 + 2n)
 * because q is proportional to the mired. q is 0.017 at least, so e^q - 1
 * loses two digits at 1e6 K and none below 1e5 K. */
static void sum_planck(double mired, sums by_order[3]) {
  const ef_table *const table = ef_table_find("cie-1931", NULL);
  const size_t n_rows = table->n_rows;
  const double *const wavelength_nm = table->value;
  const double *const x_bar = wavelength_nm + n_rows;
  const double *const y_bar = x_bar + n_rows;
  const double *const z_bar = y_bar + n_rows;
  for (int k = 0; k < 3; ++k) by_order[k] = (sums){0, 0, 0};
  for (size_t i = 0; i < n_rows; ++i) {
    const double reciprocal = 1 / wavelength_nm[i];
    const double slope = 1e-6 * c2_nm_k * reciprocal; /* dq / dmired */
    const double n = 1 / (exp(slope * mired) - 1);
    const double r = 560 * reciprocal; /* 560 nm: keeps sums near 1 */
    const double power = r * r * r * r * r * n;
    const double first = -slope * power * (1 + n);
    const double second = -slope * first * (1 + 2 * n);
    const double d = x_bar[i] + 15 * y_bar[i] + 3 * z_bar[i];
    add(&by_order[0], power, x_bar[i], y_bar[i], d);
    add(&by_order[1], first, x_bar[i], y_bar[i], d);
    add(&by_order[2], second, x_bar[i], y_bar[i], d);
  }
}

static locus_point locus_at(double mired) {
  sums s[3];
  sum_planck(mired, s);
  locus_point p;
  p.u = 4 * s[0].X / s[0].D;
  p.v = 6 * s[0].Y / s[0].D;
  p.du = (4 * s[1].X - p.u * s[1].D) / s[0].D;
  p.dv = (6 * s[1].Y - p.v * s[1].D) / s[0].D;
  p.ddu = (4 * s[2].X - 2 * p.du * s[1].D - p.u * s[2].D) / s[0].D;
  p.ddv = (6 * s[2].Y - 2 * p.dv * s[1].D - p.v * s[2].D) / s[0].D;
  return p;
}

/* Squared distance to the rational approximation of Krystek (1985), written
 * from memory: within 9e-5 of the locus from 1000 to 15000 K and farther off
 * beyond, enough to begin with. */
static double rough_distance(double u, double v, double mired) {
  const double t = 1e6 / mired;
  const double locus_u =
      (0.860117757 + t * (1.54118254e-4 + t * 1.28641212e-7)) /
      (1 + t * (8.42420235e-4 + t * 7.08145163e-7));
  const double locus_v =
      (0.317398726 + t * (4.22806245e-5 + t * 4.20481691e-8)) /
      (1 + t * (-2.89741816e-5 + t * 1.61456053e-7));
  const double off_u = u - locus_u, off_v = v - locus_v;
  return off_u * off_u + off_v * off_v;
}

/* Where to begin: the least of some distances along the whole approximation,
 * then the bottom of the parabola through it and its neighbours. */
static double begin(double u, double v) {
  enum { N = 48 };
  double mired[N], distance[N];
  size_t best = 0;
  for (size_t i = 0; i < N; ++i) {
    const double share = (double)i / (N - 1);
    mired[i] = first_mired + (last_mired - first_mired) * share * share;
    distance[i] = rough_distance(u, v, mired[i]);
    if (distance[i] < distance[best]) best = i;
  }
  if (best == 0 || best == N - 1) return mired[best];
  const double left = mired[best] - mired[best - 1];
  const double right = mired[best + 1] - mired[best];
  const double up_left = (distance[best - 1] - distance[best]) / left;
  const double up_right = (distance[best + 1] - distance[best]) / right;
  const double curvature = up_left + up_right;
  if (!(curvature > 0)) return mired[best];
  return mired[best] + 0.5 * (up_left * right - up_right * left) / curvature;
}

/* The foot of the perpendicular, or false when the nearest point is an end. */
static bool find_foot(double u, double v, double *mired, locus_point *point) {
  enum { ENOUGH = 100 };
  double low = first_mired, high = last_mired;
  double at = begin(u, v);
  for (int i = 0; i < ENOUGH; ++i) {
    const locus_point p = locus_at(at);
    /* Half the slope of the squared distance, and of that the slope. */
    const double g = (p.u - u) * p.du + (p.v - v) * p.dv;
    const double speed = p.du * p.du + p.dv * p.dv;
    const double bend = speed + (p.u - u) * p.ddu + (p.v - v) * p.ddv;
    if (at == first_mired && g > 0) return false;
    if (at == last_mired && g < 0) return false;
    if (g < 0) low = at;
    else high = at;
    double next = at - g / (bend > 0.1 * speed ? bend : speed);
    if (next < low) next = low == first_mired ? low : 0.5 * (low + high);
    if (next > high) next = high == last_mired ? high : 0.5 * (low + high);
    /* Newton's steps shrink as their squares: what is left after this one is
     * below rounding. */
    if (fabs(next - at) <= 1e-8 * at) {
      *mired = next;
      *point = p;
      return true;
    }
    at = next;
  }
  return false;
}

ef_cct ef_xy_to_cct(ef_xy xy) {
  ef_cct cct = {(double)NAN, (double)NAN, false};
  const ef_uv uv = ef_xy_to_uv(xy);
  if (!isfinite(uv.u_prime) || !isfinite(uv.v_prime)) return cct;
  const double u = uv.u_prime, v = 2 * uv.v_prime / 3; /* CIE 1960 */
  double mired;
  locus_point p;
  if (!find_foot(u, v, &mired, &p)) return cct;
  const double temperature_k = 1e6 / mired;
  if (temperature_k < lowest_k * (1 - limit_slack)) return cct;
  if (temperature_k > highest_k * (1 + limit_slack)) return cct;
  /* The offset across the locus, whose direction (du, dv) has du above zero
   * everywhere, so that its left side is the upper one. */
  cct.duv = ((v - p.v) * p.du - (u - p.u) * p.dv) / hypot(p.du, p.dv);
  cct.defined = fabs(cct.duv) <= largest_duv;
  if (cct.defined) cct.cct_k = temperature_k;
  return cct;
}

ef_xy ef_planck_xy(double temperature_k) {
  const double mired = 1e6 / temperature_k;
  if (!(mired >= first_mired && mired <= last_mired)) {
    return (ef_xy){(double)NAN, (double)NAN};
  }
  const locus_point p = locus_at(mired);
  return ef_uv_to_xy((ef_uv){p.u, 1.5 * p.v});
}
