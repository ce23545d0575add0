/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/chart_private.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Ticks are written out between these powers of ten of their step. */
enum { FINEST_PLAIN = -6, COARSEST_PLAIN = 5 };

/* n steps as a decimal number that was never rounded on its way. */
static double value_of(const ef__axis *axis, int64_t n) {
  char text[48];
  const int length = snprintf(text, sizeof text, "%llde%d",
                              (long long)n * axis->mantissa, axis->exponent);
  double value = 0.0;
  ef_number_parse(text, (size_t)length, '.', &value);
  return value;
}

ef__axis ef__axis_of(double from, double to, double length_px,
                     double least_px) {
  static const int mantissas[] = {1, 2, 5};
  const double least = (to - from) * least_px / length_px;
  ef__axis axis = {.from = from, .to = to, .mantissa = 1};
  axis.exponent = (int)floor(log10(least)) - 1;
  for (size_t i = 0; value_of(&axis, 1) < least;) {
    i = (i + 1) % 3;
    if (i == 0)
      ++axis.exponent;
    axis.mantissa = mantissas[i];
  }
  const double step = value_of(&axis, 1);
  /* Ends that are ticks but for rounding count as such. */
  const double slack = 1e-9;
  axis.first = (int64_t)ceil(from / step - slack);
  const int64_t last = (int64_t)floor(to / step + slack);
  axis.n = last < axis.first ? 0 : (size_t)(last - axis.first) + 1;
  return axis;
}

double ef__axis_tick(const ef__axis *axis, size_t i, char text[EF__TICK_TEXT]) {
  const double value = value_of(axis, axis->first + (int64_t)i);
  char number[EF_NUMBER_TEXT];
  if (axis->exponent >= FINEST_PLAIN && axis->exponent <= COARSEST_PLAIN) {
    const int decimals = axis->exponent < 0 ? -axis->exponent : 0;
    ef_number_format_fixed(value, decimals, number);
  } else {
    ef_number_format(value, number);
  }
  const bool is_negative = number[0] == '-';
  snprintf(text, EF__TICK_TEXT, "%s%s", is_negative ? "\xE2\x88\x92" : "",
           number + (is_negative ? 1 : 0));
  return value;
}
