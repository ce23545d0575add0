/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Seeded random inputs for tests; the same on every machine. */
#ifndef EVENFIELD_TESTS_GEN_H
#define EVENFIELD_TESTS_GEN_H

#include <stddef.h>
#include <stdint.h>

/** State of one stream (SplitMix64: Steele, Lea & Flood 2014). */
typedef struct gen {
  uint64_t state;
} gen;

gen gen_new(uint64_t seed);
uint64_t gen_bits(gen *g);
/** Uniform in [0, 1). */
double gen_unit(gen *g);
/** Uniform in [low, high). */
double gen_between(gen *g, double low, double high);
/** Uniform in 0 .. n - 1. */
size_t gen_below(gen *g, size_t n);
/** Standard normal. */
double gen_normal(gen *g);
/** A finite double from random bits: all signs, exponents and subnormals. */
double gen_any_double(gen *g);
/** n uniform values in [low, high). */
void gen_fill(gen *g, size_t n, double low, double high, double *value);
/** A smooth spectrum with values in (0, 1): a level and three broad bumps over
 * n samples, like a painted surface. */
void gen_smooth(gen *g, size_t n, double *value);

#endif
