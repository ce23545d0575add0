/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIEDE2000 (ISO/CIE 11664-6:2014). Equation numbers are those of G. Sharma,
 * W. Wu, E. N. Dalal, Color Res. Appl. 30 (2005) 21-30. */
#include "difference/difference_private.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#include "kernel/kernels.h"

/* cos and sin of the angles in eq. 15, degrees. */
#define COS_30 0.86602540378443865
#define SIN_30 0.5
#define COS_6 0.99452189536827333
#define SIN_6 0.10452846326765347
#define COS_63 0.45399049973954675
#define SIN_63 0.89100652418836786
#define DEGREES_PER_RADIAN 57.295779513082321

double ef__ciede2000_saturation(double chroma) {
  const double c2 = chroma * chroma;
  const double c7 = c2 * c2 * c2 * chroma;
  const double pow_25_7 = 6103515625.0;
  return sqrt(c7 / (c7 + pow_25_7));
}

/* Eq. 14. The direction of the mean hue as the sum of the two unit vectors,
 * or, where they point apart and that sum is small, as their difference turned
 * by a quarter: it lies on the shorter arc, as the cases of the equation have
 * it. With one colour achromatic the hue of the other. */
static void mean_hue(double a1, double b1, double a2, double b2,
                     ef__ciede2000 *t) {
  const double dot = a1 * a2 + b1 * b2;
  double x, y;
  if (t->chroma1 * t->chroma2 == 0) {
    x = a1 + a2;
    y = b1 + b2;
  } else if (dot >= 0) {
    x = a1 * t->chroma2 + a2 * t->chroma1;
    y = b1 * t->chroma2 + b2 * t->chroma1;
  } else {
    const double u = a2 * t->chroma1 - a1 * t->chroma2;
    const double v = b2 * t->chroma1 - b1 * t->chroma2;
    x = t->delta_h > 0 ? v : -v;
    y = t->delta_h > 0 ? -u : u;
  }
  const double length = sqrt(x * x + y * y);
  t->cos_h = length > 0 ? x / length : 1;
  t->sin_h = length > 0 ? y / length : 0;
}

/* The multiple angles by the addition theorems. */
double ef__ciede2000_hue_weight(double c, double s, double derivative[2]) {
  const double c2 = c * c - s * s, s2 = 2 * s * c;
  const double c3 = c2 * c - s2 * s, s3 = s2 * c + c2 * s;
  const double c4 = c2 * c2 - s2 * s2, s4 = 2 * s2 * c2;
  const double term1 = 0.17 * (c * COS_30 + s * SIN_30);
  const double term2 = 0.24 * c2;
  const double term3 = 0.32 * (c3 * COS_6 - s3 * SIN_6);
  const double term4 = 0.20 * (c4 * COS_63 + s4 * SIN_63);
  if (derivative != NULL) {
    derivative[0] = 0.17 * (s * COS_30 - c * SIN_30) - 2 * 0.24 * s2 -
                    3 * 0.32 * (s3 * COS_6 + c3 * SIN_6) +
                    4 * 0.20 * (s4 * COS_63 - c4 * SIN_63);
    derivative[1] = term1 - 4 * term2 - 9 * term3 + 16 * term4;
  }
  return 1 - term1 + term2 + term3 - term4;
}

/* Eq. 16, 17, 21. From 0 to 125 degrees the rotation is below 30 exp(-36)
 * degrees, 7e-15: nothing beside the 1 it is added to. The angle is that in
 * [0, 360) as published: the term has a step of 1e-5 at 0 degrees. */
static double rotation(ef__ciede2000 *t) {
  t->mean_h_deg = t->turn = t->sin_turn = 0;
  if (t->sin_h >= 0 && t->cos_h > -0.57)
    return 0;
  t->mean_h_deg = atan2(t->sin_h, t->cos_h) * DEGREES_PER_RADIAN;
  if (t->mean_h_deg < 0)
    t->mean_h_deg += 360;
  const double u = (t->mean_h_deg - 275) / 25;
  const double angle_deg = 30 * exp(-u * u);
  t->turn = 2 * angle_deg / DEGREES_PER_RADIAN;
  t->sin_turn = sin(t->turn);
  return -t->sin_turn * 2 * ef__ciede2000_saturation(t->mean_c);
}

void ef__ciede2000_terms(const double reference[3], const double sample[3],
                         ef__ciede2000 *t) {
  const double b1 = reference[2], b2 = sample[2];
  const double c1 = sqrt(reference[1] * reference[1] + b1 * b1);
  const double c2 = sqrt(sample[1] * sample[1] + b2 * b2);
  t->one_plus_g = 1.5 - 0.5 * ef__ciede2000_saturation((c1 + c2) / 2);
  const double a1 = t->one_plus_g * reference[1];
  const double a2 = t->one_plus_g * sample[1];
  t->chroma1 = sqrt(a1 * a1 + b1 * b1);
  t->chroma2 = sqrt(a2 * a2 + b2 * b2);
  t->delta_l = sample[0] - reference[0];
  t->delta_c = t->chroma2 - t->chroma1;
  t->delta_h = ef__delta_hue(a1, b1, a2, b2, t->chroma1 * t->chroma2);
  t->mean_l = (reference[0] + sample[0]) / 2;
  t->mean_c = (t->chroma1 + t->chroma2) / 2;
  mean_hue(a1, b1, a2, b2, t);
  t->hue_weight = ef__ciede2000_hue_weight(t->cos_h, t->sin_h, NULL);
  const double from_50 = (t->mean_l - 50) * (t->mean_l - 50);
  t->s_l = 1 + 0.015 * from_50 / sqrt(20 + from_50);
  t->s_c = 1 + 0.045 * t->mean_c;
  t->s_h = 1 + 0.015 * t->mean_c * t->hue_weight;
  t->r_t = rotation(t);
}

/* `factor`: k_L, k_C, k_H. */
static double weighted(const ef__ciede2000 *t, const ef_parameter factor[3],
                       ef_components *part) {
  part->lightness = t->delta_l / (factor[0].value * t->s_l);
  part->chroma = t->delta_c / (factor[1].value * t->s_c);
  part->hue = t->delta_h / (factor[2].value * t->s_h);
  const double square = part->lightness * part->lightness +
                        part->chroma * part->chroma + part->hue * part->hue +
                        t->r_t * part->chroma * part->hue;
  /* |R_T| < 2, so the form is not negative but for rounding. */
  return square > 0 ? sqrt(square) : square < 0 ? 0 : square;
}

static double components(const ef_metric *self, const double reference[3],
                         const double sample[3], ef_components *part) {
  ef__ciede2000 t;
  ef__ciede2000_terms(reference, sample, &t);
  return weighted(&t, self->parameter, part);
}

static double difference(const ef_metric *self, const double reference[3],
                         const double sample[3]) {
  ef_components part;
  return components(self, reference, sample, &part);
}

static void differences(const ef_metric *self, size_t n,
                        const double *reference, const double *sample,
                        double *difference) {
  double factor[3];
  for (size_t i = 0; i < 3; ++i)
    factor[i] = self->parameter[i].value;
  ef__kernels()->ciede2000(n, reference, sample, factor, difference);
}

static_assert((int)EF__METRIC_BLOCK == (int)EF__ROUGH_BLOCK, "one layout");

static void rough(const ef_metric *self, size_t n, const float reference[3],
                  const float *sample, float *square) {
  float factor[3];
  for (size_t i = 0; i < 3; ++i)
    factor[i] = (float)self->parameter[i].value;
  ef__kernels()->ciede2000_rough(n, reference, factor, sample, square);
}

double ef_delta_e_ciede2000(ef_lab reference, ef_lab sample, double k_l,
                            double k_c, double k_h) {
  const double r[3] = {reference.L_star, reference.a_star, reference.b_star};
  const double s[3] = {sample.L_star, sample.a_star, sample.b_star};
  ef__ciede2000 t;
  const ef_parameter factor[3] = {
      {.value = k_l}, {.value = k_c}, {.value = k_h}};
  ef_components part;
  ef__ciede2000_terms(r, s, &t);
  return weighted(&t, factor, &part);
}

/* The formula for two colours that meet. G belongs to the pair, not to each
 * colour (eq. 4 takes the mean chroma), so that a' differs by (1 + G) da to
 * first order: the change of G moves both colours alike and drops out. With
 * dC' and dH' along and across the hue the form is
 * (dL/S_L)^2 + (dC'/S_C)^2 + (dH'/S_H)^2 + R_T dC' dH' / (S_C S_H).
 * On the neutral axis S_C = S_H = 1 and R_T = 0, and a step away from it is all
 * chroma, so that k_C holds for every direction. */
static void tensor(const ef_metric *self, const double coordinate[3],
                   double g[9]) {
  ef__ciede2000 t;
  ef__ciede2000_terms(coordinate, coordinate, &t);
  t.s_l *= self->parameter[0].value;
  t.s_c *= self->parameter[1].value;
  t.s_h *= self->parameter[2].value;
  if (t.chroma1 == 0)
    t.s_h = t.s_c;
  const double cc = 1 / (t.s_c * t.s_c), hh = 1 / (t.s_h * t.s_h);
  const double ch = t.r_t / (2 * t.s_c * t.s_h);
  const double c = t.cos_h, s = t.sin_h, scale = t.one_plus_g;
  const double off = scale * (c * s * (cc - hh) + (c * c - s * s) * ch);
  g[0] = 1 / (t.s_l * t.s_l);
  g[1] = g[2] = g[3] = g[6] = 0;
  g[4] = scale * scale * (c * c * cc + s * s * hh - 2 * c * s * ch);
  g[5] = g[7] = off;
  g[8] = s * s * cc + c * c * hh + 2 * c * s * ch;
}

/* ---- Decoys ------------------------------------------------------------- */

/* Rings around the axis, in two groups, each of two blocks: every 18 degrees
 * from 66 to 336 on from the hue of the reference, the side that is not its own.
 */
enum { GROUPS = 2, RINGS = 3, HUES = 2 * EF__METRIC_BLOCK };
enum { N_AROUND = GROUPS * RINGS * HUES, BLOCKS = 2 * GROUPS * RINGS };
static const float ring[GROUPS * RINGS] = {0.6f, 2.5f, 5, 9, 15, 24};
static const float cos_from[HUES] = {
    0.40673664f, 0.10452846f, -0.20791169f, -0.5f,
    -0.74314483f, -0.91354546f, -0.9945219f, -0.9781476f,
    -0.8660254f, -0.66913061f, -0.40673664f, -0.10452846f,
    0.20791169f, 0.5f, 0.74314483f, 0.91354546f};
static const float sin_from[HUES] = {
    0.91354546f, 0.9945219f, 0.9781476f, 0.8660254f,
    0.66913061f, 0.40673664f, 0.10452846f, -0.20791169f,
    -0.5f, -0.74314483f, -0.91354546f, -0.9945219f,
    -0.9781476f, -0.8660254f, -0.66913061f, -0.40673664f};

/* L* 0, as of the reference they are taken for. */
static void place_around(const double reference[3], float *sample) {
  const double c = sqrt(reference[1] * reference[1] +
                        reference[2] * reference[2]);
  const float x = c > 0 ? (float)(reference[1] / c) : 1;
  const float y = c > 0 ? (float)(reference[2] / c) : 0;
  for (int block = 0; block < BLOCKS; ++block) {
    float *const L_star = sample + 3 * EF__METRIC_BLOCK * block;
    float *const a_star = L_star + EF__METRIC_BLOCK;
    float *const b_star = a_star + EF__METRIC_BLOCK;
    const float *const cosine = cos_from + block % 2 * EF__METRIC_BLOCK;
    const float *const sine = sin_from + block % 2 * EF__METRIC_BLOCK;
    const float p = ring[block / 2] * x, q = ring[block / 2] * y;
    for (int k = 0; k < EF__METRIC_BLOCK; ++k) {
      L_star[k] = 0;
      a_star[k] = p * cosine[k] - q * sine[k];
      b_star[k] = p * sine[k] + q * cosine[k];
    }
  }
}

/* The lowest point of a group of rings among those that are low along their
 * own; -1 when all rings fall towards the reference. */
static int lowest_of(int group, const float *square) {
  int best = -1;
  for (int r = group * RINGS; r < (group + 1) * RINGS; ++r) {
    for (int i = r * HUES + 1; i < (r + 1) * HUES - 1; ++i) {
      if (best >= 0 && !(square[i] < square[best]))
        continue;
      if (square[i] <= square[i - 1] && square[i] <= square[i + 1])
        best = i;
    }
  }
  return best;
}

static void best_around(const ef_metric *self, const double reference[3],
                        double lightness, double chroma, double best[3]) {
  enum { POINTS = 12 };
  /* Every 30 degrees. */
  static const double circle[POINTS][2] = {
      {1, 0},          {COS_30, 0.5},  {0.5, COS_30},  {0, 1},
      {-0.5, COS_30},  {-COS_30, 0.5}, {-1, 0},        {-COS_30, -0.5},
      {-0.5, -COS_30}, {0, -1},        {0.5, -COS_30}, {COS_30, -0.5}};
  double pair[POINTS][3], sample[POINTS][3], difference[POINTS];
  for (int i = 0; i < POINTS; ++i) {
    memcpy(pair[i], reference, sizeof pair[i]);
    sample[i][0] = lightness;
    sample[i][1] = chroma * circle[i][0];
    sample[i][2] = chroma * circle[i][1];
  }
  differences(self, POINTS, pair[0], sample[0], difference);
  int least = 0;
  for (int i = 1; i < POINTS; ++i) {
    if (difference[i] < difference[least])
      least = i;
  }
  memcpy(best, sample[least], sizeof sample[least]);
}

/* Colours of some chroma have a second minimum near the axis, about opposite to
 * them, narrow for the rotation term and the root in dH' (eq. 11), and blue
 * ones another one farther out: the best of some points there leads into it.
 * Lightness stands apart in the formula, so that this is the same for all. Near
 * black and white there is no room for chroma; for references darker than black
 * the minimum lies close to the axis, where L* stops being straight or close to
 * black. */
static size_t decoys(const ef_metric *self, const double reference[3],
                     double limit, double place[EF__MAX_DECOYS][3]) {
  static const double dark_ring = 0.4, darkest_ring = 0.8;
  const double L_star = reference[0];
  const double lightness = L_star < 5 ? 5 : L_star > 96 ? 96 : L_star;
  float sample[3 * N_AROUND], square[N_AROUND];
  const float flat[3] = {0, (float)reference[1], (float)reference[2]};
  size_t n = 0;
  place_around(reference, sample);
  rough(self, BLOCKS, flat, sample, square);
  for (int group = 0; group < GROUPS; ++group) {
    const int i = lowest_of(group, square);
    if (i < 0 || !((double)square[i] < limit * limit))
      continue;
    place[n][0] = lightness;
    const float *const at = sample +
                            3 * EF__METRIC_BLOCK * (i / EF__METRIC_BLOCK) +
                            i % EF__METRIC_BLOCK;
    place[n][1] = (double)at[EF__METRIC_BLOCK];
    place[n][2] = (double)at[2 * EF__METRIC_BLOCK];
    ++n;
  }
  if (L_star < 5) {
    best_around(self, reference, 4, dark_ring, place[n++]);
    best_around(self, reference, 0.7, darkest_ring, place[n++]);
  }
  return n;
}

const ef_metric ef__metric_ciede2000 = {
    .name = "ciede2000",
    .title = "CIEDE2000",
    .parameter = {{"kl", 1, "divides the lightness difference"},
                  {"kc", 1, "divides the chroma difference"},
                  {"kh", 1, "divides the hue difference"}},
    .symbol = "Delta E*00",
    .source = "ISO/CIE 11664-6:2014",
    .jnd = {0.8, "50 % of observers see it (50:50 perceptibility)",
            "ISO/TR 28642:2016; Paravina et al., J. Esthet. Restor. Dent. 27 "
            "Suppl. 1 (2015) S1-S9"},
    .coordinates = ef__lab_coordinates,
    .coordinates_of_many = ef__lab_coordinates_of_many,
    .inverse = ef__lab_inverse,
    .jacobian = ef__lab_jacobian,
    .difference = difference,
    .differences = differences,
    .rough = rough,
    .components = components,
    .tensor = tensor,
    .expand = ef__ciede2000_expand,
    .carry = ef__lab_carry,
    .least = ef__ciede2000_least,
    .decoys = decoys,
    .kinked_axis = true,
    .jumps_at_opposite_hue = true,
};
