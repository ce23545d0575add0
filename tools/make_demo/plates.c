/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pairs of painted plates, and the observers who told them apart. */
#include "demo.h"

#include <math.h>

enum { N_CENTRES = 6, N_SIZES = 6, N_OBSERVERS = 10, N_TRIALS = 12 };

static const struct centre {
  const char *name;
  double L, a, b;
} centres[N_CENTRES] = {
  {"hull blue", 34.0, 4.0, -38.0},    {"cabin yellow", 79.0, 12.0, 66.0},
  {"funnel red", 44.0, 58.0, 34.0},   {"deck green", 51.0, -34.0, 14.0},
  {"rail grey", 62.0, -0.5, 1.5},     {"saloon beige", 72.0, 6.0, 22.0}};

/* What the observers see of a pair, in their own unit. */
static const double sizes[N_SIZES] = {0.3, 0.6, 0.9, 1.3, 1.8, 2.6};

static double rounded(double value) {
  return floor(100.0 * value + 0.5) / 100.0;
}

/* The sample lies `size` away in any direction of L*, chroma and hue. To these
 * observers chroma counts for less the more of it there is, and hue somewhat
 * less: divisors of 1 + 0.045 C* and 1 + 0.015 C*, with nothing else. */
static void sample_of(const struct centre *c, double size, uint64_t *state,
                      double lab[3]) {
  double d[3], length = 0.0;
  for (int i = 0; i < 3; i++) {
    d[i] = normal(state);
    length += d[i] * d[i];
  }
  length = sqrt(length);
  const double chroma = hypot(c->a, c->b);
  const double along = size * d[1] / length * (1.0 + 0.045 * chroma);
  const double across = size * d[2] / length * (1.0 + 0.015 * chroma);
  lab[0] = rounded(c->L + size * d[0] / length);
  lab[1] = rounded(c->a + (along * c->a - across * c->b) / chroma);
  lab[2] = rounded(c->b + (along * c->b + across * c->a) / chroma);
}

void write_colour_pairs(FILE *out) {
  uint64_t noise = SEED + 8;
  write_header(out, "pairs of painted plates for the vision laboratory",
               "CIELAB of both plates of a pair, D65, CIE 1931 observer", NULL,
               "six livery colours and six neighbours of each, at "
               "differences about the threshold; demo:pair-answers has what "
               "was seen");
  fprintf(out, "pair,reference_L,reference_a,reference_b,sample_L,sample_a,"
               "sample_b\n");
  for (int c = 0; c < N_CENTRES; c++) {
    for (int s = 0; s < N_SIZES; s++) {
      double lab[3];
      sample_of(&centres[c], sizes[s], &noise, lab);
      fprintf(out, "%s %d,%g,%g,%g,%g,%g,%g\n", centres[c].name, s + 1,
              centres[c].L, centres[c].a, centres[c].b, lab[0], lab[1],
              lab[2]);
    }
  }
}

void write_pair_answers(FILE *out) {
  uint64_t noise = SEED + 9;
  write_header(out, "answers of the vision laboratory, two-interval forced "
                    "choice",
               "per observer and pair: trials n and correct answers k; the "
               "pairs are those of demo:colour-pairs",
               NULL,
               "ten observers said which of two intervals held the unlike "
               "plates; simulated with 75 % correct at a difference that "
               "varies between people around 0.85 of the unit in which they "
               "see");
  fprintf(out, "observer,pair,n,k\n");
  for (int o = 1; o <= N_OBSERVERS; o++) {
    const double jnd = 0.85 * exp(0.25 * normal(&noise));
    for (int p = 0; p < N_CENTRES * N_SIZES; p++) {
      const double d_prime = 0.9539 * sizes[p % N_SIZES] / jnd;
      const double seen = 0.5 * erfc(-d_prime / 2.0);
      const double correct = 0.98 * seen + 0.02 * 0.5;
      int k = 0;
      for (int t = 0; t < N_TRIALS; t++) {
        k += uniform(&noise) < correct;
      }
      fprintf(out, "o%02d,%s %d,%d,%d\n", o, centres[p / N_SIZES].name,
              p % N_SIZES + 1, N_TRIALS, k);
    }
  }
}
