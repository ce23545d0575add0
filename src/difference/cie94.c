/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CIE94 (CIE 116-1995). The weights are those of the reference, the standard
 * of the pair. */
#include <math.h>

#include "difference/difference_private.h"
#include "kernel/kernels.h"

enum { K_L, K_C, K_H, K_1, K_2 };

static ef__polar_weights weights(const ef_metric *self,
                                 const double standard[3]) {
  const ef_parameter *const p = self->parameter;
  const double chroma =
      sqrt(standard[1] * standard[1] + standard[2] * standard[2]);
  return (ef__polar_weights){p[K_L].value,
                             p[K_C].value * (1 + p[K_1].value * chroma),
                             p[K_H].value * (1 + p[K_2].value * chroma)};
}

static void differences(const ef_metric *self, size_t n,
                        const double *reference, const double *sample,
                        double *difference) {
  double factor[5];
  for (size_t i = 0; i < 5; ++i) factor[i] = self->parameter[i].value;
  ef__kernels()->cie94(n, reference, sample, factor, difference);
}

static const ef__parameter_set sets[] = {
    {"graphic-arts", {1, (double)NAN, (double)NAN, 0.045, 0.015}},
    {"textiles", {2, (double)NAN, (double)NAN, 0.048, 0.014}},
    {NULL, {0}}};

const ef_metric ef__metric_cie94 = {
    .name = "cie94",
    .title = "CIE94",
    .symbol = "Delta E*94",
    .source = "CIE 116-1995",
    .jnd = {(double)NAN, "", ""},
    .asymmetric = true,
    .parameter = {{"kl", 1, "divides the lightness difference"},
                  {"kc", 1, "divides the chroma difference"},
                  {"kh", 1, "divides the hue difference"},
                  {"k1", 0.045, "growth of the chroma weight with chroma"},
                  {"k2", 0.015, "growth of the hue weight with chroma"}},
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
