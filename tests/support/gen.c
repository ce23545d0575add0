/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "gen.h"

#include <math.h>
#include <string.h>

gen gen_new(uint64_t seed) {
  return (gen){seed};
}

uint64_t gen_bits(gen *g) {
  uint64_t z = g->state += UINT64_C(0x9E3779B97F4A7C15);
  z = (z ^ (z >> 30)) * UINT64_C(0xBF58476D1CE4E5B9);
  z = (z ^ (z >> 27)) * UINT64_C(0x94D049BB133111EB);
  return z ^ (z >> 31);
}

double gen_unit(gen *g) {
  return (double)(gen_bits(g) >> 11) * 0x1p-53;
}

double gen_between(gen *g, double low, double high) {
  return low + (high - low) * gen_unit(g);
}

size_t gen_below(gen *g, size_t n) {
  return (size_t)(gen_bits(g) % n); /* bias below n / 2^64 */
}

double gen_normal(gen *g) {
  const double two_pi = 6.283185307179586;
  const double radius = sqrt(-2 * log(1 - gen_unit(g)));
  return radius * cos(two_pi * gen_unit(g));
}

double gen_any_double(gen *g) {
  for (;;) {
    const uint64_t bits = gen_bits(g);
    double value;
    memcpy(&value, &bits, sizeof value);
    if (isfinite(value))
      return value;
  }
}

void gen_fill(gen *g, size_t n, double low, double high, double *value) {
  for (size_t i = 0; i < n; ++i)
    value[i] = gen_between(g, low, high);
}

void gen_smooth(gen *g, size_t n, double *value) {
  const double level = gen_between(g, 0.02, 0.3);
  for (size_t i = 0; i < n; ++i)
    value[i] = level;
  for (int bump = 0; bump < 3; ++bump) {
    const double height = gen_between(g, 0, 0.22);
    const double centre = gen_between(g, -0.1, 1.1);
    const double width = gen_between(g, 0.08, 0.4);
    for (size_t i = 0; i < n; ++i) {
      const double at = n > 1 ? (double)i / (double)(n - 1) : 0.5;
      const double z = (at - centre) / width;
      value[i] += height * exp(-0.5 * z * z);
    }
  }
}
