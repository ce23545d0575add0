/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The squared CIEDE2000 difference to second order around a sample, exactly,
 * by arithmetic on truncated Taylor series in a* and b* of the sample.
 * Lightness enters nowhere else and is done by itself. Equation numbers as in
 * ciede2000.c. */
#include "difference/difference_private.h"

#include <math.h>

#define RADIANS_30 0.52359877559829887
#define DEGREES_PER_RADIAN 57.295779513082321

/* Value, first and second derivatives with respect to a* and b*. */
typedef struct jet {
  double v, a, b, aa, ab, bb;
} jet;

/* A function of one jet, from its value and two derivatives. */
static inline jet chain(double value, double first, double second, jet x) {
  return (jet){value,
               first * x.a,
               first * x.b,
               first * x.aa + second * x.a * x.a,
               first * x.ab + second * x.a * x.b,
               first * x.bb + second * x.b * x.b};
}

static inline jet multiply(jet x, jet y) {
  return (jet){x.v * y.v,
               x.a * y.v + x.v * y.a,
               x.b * y.v + x.v * y.b,
               x.aa * y.v + 2 * x.a * y.a + x.v * y.aa,
               x.ab * y.v + x.a * y.b + x.b * y.a + x.v * y.ab,
               x.bb * y.v + 2 * x.b * y.b + x.v * y.bb};
}

/* p x + q y. */
static inline jet combine(double p, jet x, double q, jet y) {
  return (jet){p * x.v + q * y.v,   p * x.a + q * y.a,   p * x.b + q * y.b,
               p * x.aa + q * y.aa, p * x.ab + q * y.ab, p * x.bb + q * y.bb};
}

/* 1 / (1 + slope x). */
static inline jet weight(double slope, jet x) {
  const double w = 1 / (1 + slope * x.v);
  return chain(w, -slope * w * w, 2 * slope * slope * w * w * w, x);
}

/* sqrt(C^7 / (C^7 + 25^7)). */
static inline jet saturation(jet chroma) {
  const double c = chroma.v;
  if (c <= 0) return (jet){0, 0, 0, 0, 0, 0};
  const double r = ef__ciede2000_saturation(c);
  const double rest = 1 - r * r;
  return chain(r, 3.5 * r * rest / c,
               3.5 * r * rest * (2.5 - 10.5 * r * r) / (c * c), chroma);
}

/* sqrt(x^2 + b^2) of a jet x, b being the variable itself. */
static inline jet chroma_of(jet x, double b, double length) {
  const double c = x.a, s = x.b;
  const double p = x.v / length, q = b / length;
  /* Derivatives of the length by x and b: p, q; second: q^2, -p q, p^2 over
   * the length. */
  const double xx = q * q / length, xb = -p * q / length, bb = p * p / length;
  return (jet){length,
               p * c,
               p * s + q,
               p * x.aa + xx * c * c,
               p * x.ab + xx * c * s + xb * c,
               p * x.bb + xx * s * s + 2 * xb * s + bb};
}

/* Hue angle of (x, b) in radians, without its value. */
static inline jet hue_of(jet x, double b, double length) {
  const double c = x.a, s = x.b;
  const double p = x.v / length, q = b / length;
  const double first_x = -q / length, first_b = p / length;
  const double square = length * length;
  const double xx = 2 * p * q / square, xb = (q * q - p * p) / square;
  return (jet){0,
               first_x * c,
               first_x * s + first_b,
               first_x * x.aa + xx * c * c,
               first_x * x.ab + xx * c * s + xb * c,
               first_x * x.bb + xx * s * s + 2 * xb * s - xx};
}

/* Eq. 15 as a function of the mean hue. */
static inline jet hue_weight(const ef__ciede2000 *t, jet mean_h) {
  double d[2];
  const double value = ef__ciede2000_hue_weight(t->cos_h, t->sin_h, d);
  return chain(value, d[0], d[1], mean_h);
}

/* Eq. 16, 17 and 21. */
static inline jet rotation(const ef__ciede2000 *t, jet mean_c, jet mean_h) {
  if (t->r_t == 0) return (jet){0, 0, 0, 0, 0, 0};
  const double per_radian = DEGREES_PER_RADIAN / 25;
  const double u = (t->mean_h_deg - 275) / 25;
  const double angle = t->turn / 2;
  const double first = -2 * u * per_radian * angle;
  const double second = (4 * u * u - 2) * per_radian * per_radian * angle;
  const double s = t->sin_turn, c = sqrt(1 - s * s); /* up to 60 degrees */
  const jet turn = chain(-2 * s, -4 * c * first,
                         8 * s * first * first - 4 * c * second, mean_h);
  return multiply(turn, saturation(mean_c));
}

/* Both members of the pair as functions of the sample's a*, b*: the reference
 * moves too, by the common G. */
typedef struct polar {
  jet chroma1, chroma2; /* C' */
  jet hue1, hue2;       /* h' without value */
} polar;

static inline polar polar_of(const ef__ciede2000 *t, const double reference[3],
                      const double sample[3]) {
  const double a1 = reference[1], b1 = reference[2];
  const double a2 = sample[1], b2 = sample[2];
  const jet a = {a2, 1, 0, 0, 0, 0};
  const double c2 = sqrt(a2 * a2 + b2 * b2);
  const double c1 = sqrt(a1 * a1 + b1 * b1);
  jet mean = chroma_of(a, b2, c2);
  mean = combine(0.5, mean, 0, mean);
  mean.v += c1 / 2;
  const jet g = saturation(mean);
  jet scale = combine(-0.5, g, 0, g);
  scale.v = t->one_plus_g;
  const jet a2_prime = multiply(scale, a);
  polar p;
  p.chroma2 = chroma_of(a2_prime, b2, t->chroma2);
  p.hue2 = hue_of(a2_prime, b2, t->chroma2);
  if (t->chroma1 == 0) {
    p.chroma1 = (jet){0, 0, 0, 0, 0, 0};
    p.hue1 = p.hue2; /* an achromatic colour takes the other's hue */
    return p;
  }
  const double c = t->chroma1, s = t->one_plus_g;
  p.chroma1 = chain(c, s * a1 * a1 / c, a1 * a1 * b1 * b1 / (c * c * c), scale);
  p.hue1 = chain(0, -a1 * b1 / (c * c),
                 2 * s * a1 * a1 * a1 * b1 / (c * c * c * c), scale);
  return p;
}

/* Eq. 11. */
static inline jet delta_hue(const ef__ciede2000 *t, const polar *p) {
  const jet product = multiply(p->chroma1, p->chroma2);
  if (product.v == 0) return (jet){0, 0, 0, 0, 0, 0};
  const double root = sqrt(product.v);
  const jet twice = chain(2 * root, 1 / root, -0.5 / (root * product.v),
                          product);
  const double s = t->delta_h / (2 * root);
  const double c = s * s < 1 ? sqrt(1 - s * s) : 0;
  const jet half = combine(0.5, p->hue2, -0.5, p->hue1);
  jet out = multiply(twice, chain(s, c, -s, half));
  out.v = t->delta_h;
  return out;
}

static void expand_lightness(const ef__ciede2000 *t, double k_l,
                             ef__expansion *out) {
  const double x = t->mean_l - 50;
  const double q = 20 + x * x, root = sqrt(q);
  /* Derivatives of S_L (eq. 18) by the sample's L*, which moves the mean by
   * half. */
  const double first = 0.5 * 0.015 * x * (q + 20) / (q * root);
  const double second = 0.25 * 0.015 * (800 - 20 * x * x) / (q * q * root);
  const double w = 1 / t->s_l, d = t->delta_l;
  const double slope = w - d * first * w * w;
  const double bend =
      w * w * (2 * d * first * first * w - 2 * first - d * second);
  const double part = d * w, scale = 1 / (k_l * k_l);
  out->square = part * part * scale;
  out->gradient[0] = 2 * part * slope * scale;
  out->hessian[0] = 2 * (slope * slope + part * bend) * scale;
}

/* On the neutral axis the formula has a kink; the expansion is then that of a
 * point this far beside it, towards the reference. */
#define KINK 1e-7

static void beside_kink(const double reference[3], const double sample[3],
                        double moved[3]) {
  moved[0] = sample[0];
  moved[1] = sample[1];
  moved[2] = sample[2];
  if (sample[1] * sample[1] + sample[2] * sample[2] > KINK * KINK) return;
  const double chroma = sqrt(reference[1] * reference[1] +
                             reference[2] * reference[2]);
  moved[1] = chroma > 0 ? 2 * KINK * reference[1] / chroma : 2 * KINK;
  moved[2] = chroma > 0 ? 2 * KINK * reference[2] / chroma : 0;
}

void ef__ciede2000_expand(const ef_metric *self, const double reference[3],
                          const double sample[3], ef__expansion *out) {
  double moved[3];
  beside_kink(reference, sample, moved);
  ef__ciede2000 t;
  const double chroma_scale = 1 / self->parameter[1].value;
  const double hue_scale = 1 / self->parameter[2].value;
  ef__ciede2000_terms(reference, moved, &t);
  expand_lightness(&t, self->parameter[0].value, out);

  const polar p = polar_of(&t, reference, moved);
  const jet mean_c = combine(0.5, p.chroma1, 0.5, p.chroma2);
  const jet mean_h = combine(0.5, p.hue1, 0.5, p.hue2);
  const jet delta_c =
      combine(chroma_scale, p.chroma2, -chroma_scale, p.chroma1);
  const jet chroma = multiply(delta_c, weight(0.045, mean_c));
  const jet delta_h = delta_hue(&t, &p);
  const jet hue =
      multiply(combine(hue_scale, delta_h, 0, delta_h),
               weight(0.015, multiply(mean_c, hue_weight(&t, mean_h))));
  const jet mixed = multiply(rotation(&t, mean_c, mean_h),
                             multiply(chroma, hue));
  const jet sum = combine(1, multiply(chroma, chroma), 1, multiply(hue, hue));
  const jet f = combine(1, sum, 1, mixed);
  out->square += f.v;
  out->gradient[1] = f.a;
  out->gradient[2] = f.b;
  double *const h = out->hessian;
  h[1] = h[2] = h[3] = h[6] = 0;
  h[4] = f.aa;
  h[5] = h[7] = f.ab;
  h[8] = f.bb;
}
