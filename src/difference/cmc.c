/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CMC(l:c) (ISO 105-J03:2009; F. J. J. Clarke, R. McDonald, B. Rigg, J. Soc.
 * Dyers Colour. 100 (1984) 128-132). The weights are those of the reference,
 * the standard of the pair. */
#include <math.h>

#include "difference/difference_private.h"
#include "kernel/kernels.h"

static const double radian = 0.017453292519943295; /* pi / 180 */

enum { FACTOR_L, FACTOR_C };

static double hue_term(double a, double b) {
  double h_deg = atan2(b, a) / radian;
  if (h_deg < 0)
    h_deg += 360;
  if (h_deg >= 164 && h_deg <= 345)
    return 0.56 + fabs(0.2 * cos((168 + h_deg) * radian));
  return 0.36 + fabs(0.4 * cos((35 + h_deg) * radian));
}

static ef__polar_weights weights(const ef_metric *self,
                                 const double standard[3]) {
  const double L_star = standard[0], a = standard[1], b = standard[2];
  const double chroma2 = a * a + b * b, chroma = sqrt(chroma2);
  const double s_l =
      L_star < 16 ? 0.511 : 0.040975 * L_star / (1 + 0.01765 * L_star);
  const double s_c = 0.0638 * chroma / (1 + 0.0131 * chroma) + 0.638;
  const double f = chroma2 / sqrt(chroma2 * chroma2 + 1900);
  const double s_h = s_c * (f * hue_term(a, b) + 1 - f);
  return (ef__polar_weights){self->parameter[FACTOR_L].value * s_l,
                             self->parameter[FACTOR_C].value * s_c, s_h};
}

static void differences(const ef_metric *self, size_t n,
                        const double *reference, const double *sample,
                        double *difference) {
  double factor[2];
  for (size_t i = 0; i < 2; ++i) factor[i] = self->parameter[i].value;
  ef__kernels()->cmc(n, reference, sample, factor, difference);
}

/* 2:1 is what ISO 105-J03 gives for the acceptability of textiles. */
static const ef__parameter_set sets[] = {
    {"acceptability", {2, 1}}, {"perceptibility", {1, 1}}, {NULL, {0}}};

const ef_metric ef__metric_cmc = {
    .name = "cmc",
    .title = "CMC(2:1)",
    .family = "CMC(l:c)",
    .symbol = "Delta E cmc",
    .source = "ISO 105-J03:2009",
    .jnd = {(double)NAN, "", ""},
    .asymmetric = true,
    .parameter = {{"l", 2, "divides the lightness difference"},
                  {"c", 1, "divides the chroma difference"}},
    .parameter_set = sets,
    .coordinates = ef__lab_coordinates,
    .coordinates_of_many = ef__lab_coordinates_of_many,
    .inverse = ef__lab_inverse,
    .jacobian = ef__lab_jacobian,
    .weights = weights,
    .difference = ef__polar_difference,
    .differences = differences,
    .components = ef__polar_components,
    .tensor = ef__polar_tensor,
    .expand = ef__polar_expand,
    .carry = ef__lab_carry,
    .least = ef__polar_least,
    .kinked_axis = true,
};
