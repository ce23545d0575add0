/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Formulas that divide the parts of a CIELAB difference by weights of the
 * reference alone (CIE94, CMC): with those fixed the squared difference is
 * (dL/W_L)^2 + (dC/W_C)^2 + (dH/W_H)^2, dH^2 = da^2 + db^2 - dC^2. */
#include <math.h>

#include "difference/difference_private.h"
#include "difference/range.h"

static double chroma_of(const double coordinate[3]) {
  return sqrt(coordinate[1] * coordinate[1] + coordinate[2] * coordinate[2]);
}

double ef__polar_components(const ef_metric *self, const double reference[3],
                            const double sample[3], ef_components *part) {
  const ef__polar_weights w = self->weights(self, reference);
  const double c1 = chroma_of(reference), c2 = chroma_of(sample);
  part->lightness = (sample[0] - reference[0]) / w.lightness;
  part->chroma = (c2 - c1) / w.chroma;
  part->hue =
      ef__delta_hue(reference[1], reference[2], sample[1], sample[2], c1 * c2) /
      w.hue;
  return sqrt(part->lightness * part->lightness + part->chroma * part->chroma +
              part->hue * part->hue);
}

double ef__polar_difference(const ef_metric *self, const double reference[3],
                            const double sample[3]) {
  ef_components part;
  return ef__polar_components(self, reference, sample, &part);
}

void ef__polar_tensor(const ef_metric *self, const double coordinate[3],
                      double g[9]) {
  const ef__polar_weights w = self->weights(self, coordinate);
  const double length = chroma_of(coordinate);
  /* A step away from a neutral colour is all chroma. */
  const double c = length > 0 ? coordinate[1] / length : 1;
  const double s = length > 0 ? coordinate[2] / length : 0;
  const double cc = 1 / (w.chroma * w.chroma);
  const double hh = length > 0 ? 1 / (w.hue * w.hue) : cc;
  g[0] = 1 / (w.lightness * w.lightness);
  g[1] = g[2] = g[3] = g[6] = 0;
  g[4] = c * c * cc + s * s * hh;
  g[5] = g[7] = c * s * (cc - hh);
  g[8] = s * s * cc + c * c * hh;
}

/* On the neutral axis the chroma has a kink; the expansion is then that of a
 * point this far beside it, towards the reference. */
static const double kink = 1e-7;

void ef__polar_expand(const ef_metric *self, const double reference[3],
                      const double sample[3], ef__expansion *out) {
  const ef__polar_weights w = self->weights(self, reference);
  const double c1 = chroma_of(reference);
  double a = sample[1], b = sample[2], c2 = chroma_of(sample);
  if (!(c2 > kink)) {
    a = c1 > 0 ? 2 * kink * reference[1] / c1 : 2 * kink;
    b = c1 > 0 ? 2 * kink * reference[2] / c1 : 0;
    c2 = 2 * kink;
  }
  const double ll = 1 / (w.lightness * w.lightness);
  const double cc = 1 / (w.chroma * w.chroma);
  const double hh = 1 / (w.hue * w.hue);
  const double p = a / c2, q = b / c2; /* along the chroma */
  const double d_l = sample[0] - reference[0], d_c = c2 - c1;
  const double d_a = a - reference[1], d_b = b - reference[2];
  const double rest = d_a * d_a + d_b * d_b;
  const double over = cc - hh; /* what chroma weighs over hue */
  const double bend = over * d_c / c2;
  out->square = ll * d_l * d_l + over * d_c * d_c + hh * rest;
  out->gradient[0] = 2 * ll * d_l;
  out->gradient[1] = 2 * (over * d_c * p + hh * d_a);
  out->gradient[2] = 2 * (over * d_c * q + hh * d_b);
  double *const h = out->hessian;
  h[0] = 2 * ll;
  h[1] = h[2] = h[3] = h[6] = 0;
  h[4] = 2 * (over * p * p + bend * q * q + hh);
  h[5] = h[7] = 2 * (over - bend) * p * q;
  h[8] = 2 * (over * q * q + bend * p * p + hh);
}

double ef__polar_least(const ef_metric *self, const double reference[3],
                       const double low[3], const double high[3]) {
  const ef__polar_weights w = self->weights(self, reference);
  const ef__range light = {low[0], high[0]}, a = {low[1], high[1]};
  const ef__range b = {low[2], high[2]}, c2 = ef__range_chroma(a, b);
  const double c1 = chroma_of(reference);
  const double d_l = ef__range_nearest(light, reference[0]) - reference[0];
  const double d_c = ef__range_nearest(c2, c1) - c1;
  double d_h = 0;
  if (c1 > 0) {
    const ef__range h = ef__range_hue(a, b, reference[1], reference[2]);
    d_h = 2 * sqrt(c1 * c2.low) * ef__range_least_half_sine(h);
  }
  const double l = d_l / w.lightness, c = d_c / w.chroma, h = d_h / w.hue;
  return sqrt(l * l + c * c + h * h);
}
