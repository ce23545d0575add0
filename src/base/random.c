/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <gsl/gsl_cdf.h>

/* SplitMix64 (Steele, Lea & Flood 2014): turns neighbouring numbers into
 * unrelated ones; its authors' way to fill the state of the generator. */
static uint64_t split_mix(uint64_t *state) {
  uint64_t z = *state += UINT64_C(0x9E3779B97F4A7C15);
  z = (z ^ (z >> 30)) * UINT64_C(0xBF58476D1CE4E5B9);
  z = (z ^ (z >> 27)) * UINT64_C(0x94D049BB133111EB);
  return z ^ (z >> 31);
}

ef__random ef__random_stream(uint64_t seed, uint64_t index) {
  /* The seed is mixed first: seed 1, index 2 is not seed 2, index 1. */
  uint64_t mixed = seed;
  uint64_t state = split_mix(&mixed) ^ index;
  ef__random random;
  for (int i = 0; i < 4; ++i) random.state[i] = split_mix(&state);
  return random;
}

static uint64_t rotate_left(uint64_t value, int bits) {
  return (value << bits) | (value >> (64 - bits));
}

uint64_t ef__random_bits(ef__random *random) {
  uint64_t *const s = random->state;
  const uint64_t result = rotate_left(s[1] * 5, 7) * 9;
  const uint64_t shifted = s[1] << 17;
  s[2] ^= s[0];
  s[3] ^= s[1];
  s[1] ^= s[2];
  s[0] ^= s[3];
  s[2] ^= shifted;
  s[3] = rotate_left(s[3], 45);
  return result;
}

double ef__random_unit(ef__random *random) {
  return ((double)(ef__random_bits(random) >> 12) + 0.5) * 0x1p-52;
}

double ef__random_normal(ef__random *random) {
  return gsl_cdf_ugaussian_Pinv(ef__random_unit(random));
}
