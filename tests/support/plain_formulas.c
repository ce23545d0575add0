/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "plain_formulas.h"

#include <math.h>

static const double degree = 57.295779513082320877; /* 180 / pi */

static double hue_deg(double b, double a) {
  if (a == 0 && b == 0) return 0;
  const double h = degree * atan2(b, a);
  return h < 0 ? h + 360 : h;
}

static double cos_deg(double angle_deg) { return cos(angle_deg / degree); }
static double square(double x) { return x * x; }

double plain_ciede2000(const double r[3], const double s[3]) {
  const double c1 = hypot(r[1], r[2]), c2 = hypot(s[1], s[2]);
  const double c7 = pow((c1 + c2) / 2, 7), k7 = pow(25, 7);
  const double g = 0.5 * (1 - sqrt(c7 / (c7 + k7)));
  const double a1 = (1 + g) * r[1], a2 = (1 + g) * s[1];
  const double C1 = hypot(a1, r[2]), C2 = hypot(a2, s[2]);
  const double h1 = hue_deg(r[2], a1), h2 = hue_deg(s[2], a2);
  double dh = 0, mean_h = h1 + h2;
  if (C1 * C2 != 0) {
    dh = h2 - h1;
    if (dh > 180) dh -= 360;
    if (dh < -180) dh += 360;
    if (fabs(h1 - h2) <= 180) mean_h = (h1 + h2) / 2;
    else if (h1 + h2 < 360) mean_h = (h1 + h2 + 360) / 2;
    else mean_h = (h1 + h2 - 360) / 2;
  }
  const double dL = s[0] - r[0], dC = C2 - C1;
  const double dH = 2 * sqrt(C1 * C2) * sin(dh / 2 / degree);
  const double L = (r[0] + s[0]) / 2, C = (C1 + C2) / 2;
  const double T = 1 - 0.17 * cos_deg(mean_h - 30) + 0.24 * cos_deg(2 * mean_h) +
                   0.32 * cos_deg(3 * mean_h + 6) -
                   0.20 * cos_deg(4 * mean_h - 63);
  const double theta = 30 * exp(-square((mean_h - 275) / 25));
  const double R_C = 2 * sqrt(pow(C, 7) / (pow(C, 7) + k7));
  const double S_L =
      1 + 0.015 * square(L - 50) / sqrt(20 + square(L - 50));
  const double S_C = 1 + 0.045 * C, S_H = 1 + 0.015 * C * T;
  const double R_T = -sin(2 * theta / degree) * R_C;
  return sqrt(fmax(0, square(dL / S_L) + square(dC / S_C) + square(dH / S_H) +
                          R_T * (dC / S_C) * (dH / S_H)));
}

double plain_cielab(const double r[3], const double s[3]) {
  return sqrt(square(s[0] - r[0]) + square(s[1] - r[1]) + square(s[2] - r[2]));
}

/* Delta H squared, cancelling where hues are alike: good to 1e-13 absolute. */
static double polar(const double r[3], const double s[3], double w_L,
                    double w_C, double w_H) {
  const double h1 = atan2(r[2], r[1]), h2 = atan2(s[2], s[1]);
  const double C1 = hypot(r[1], r[2]), C2 = hypot(s[1], s[2]);
  const double dH = 2 * sqrt(C1 * C2) * sin((h2 - h1) / 2);
  return sqrt(square((s[0] - r[0]) / w_L) + square((C2 - C1) / w_C) +
              square(dH / w_H));
}

double plain_cie94(const double r[3], const double s[3]) {
  const double C = hypot(r[1], r[2]);
  return polar(r, s, 1, 1 + 0.045 * C, 1 + 0.015 * C);
}

double plain_cmc(const double r[3], const double s[3]) {
  const double C = hypot(r[1], r[2]), h = hue_deg(r[2], r[1]);
  const double S_L = r[0] < 16 ? 0.511 : 0.040975 * r[0] / (1 + 0.01765 * r[0]);
  const double S_C = 0.0638 * C / (1 + 0.0131 * C) + 0.638;
  const double F = sqrt(pow(C, 4) / (pow(C, 4) + 1900));
  const double T = h >= 164 && h <= 345 ? 0.56 + fabs(0.2 * cos_deg(h + 168))
                                        : 0.36 + fabs(0.4 * cos_deg(h + 35));
  return polar(r, s, 2 * S_L, S_C, S_C * (F * T + 1 - F));
}
