/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Answers of a simulated observer. */
#include "panel/panel_private.h"

#include <math.h>

double ef__draw_binomial(ef__random *random, double n, double p) {
  const uint64_t n_trials = (uint64_t)n;
  /* Compared as 53-bit integers: p is met to 1e-16. */
  const uint64_t bar = (uint64_t)llround(fmin(fmax(p, 0), 1) * 0x1p53);
  uint64_t positive = 0;
  for (uint64_t i = 0; i < n_trials; ++i)
    positive += (ef__random_bits(random) >> 11) < bar;
  return (double)positive;
}

void ef__draw_answers(ef__random *random, const ef__data *data,
                      const double *share, double *positive) {
  for (size_t i = 0; i < data->n; ++i)
    positive[i] = ef__draw_binomial(random, data->shown[i], share[i]);
}
