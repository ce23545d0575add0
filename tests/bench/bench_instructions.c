/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Instructions an item, counted by valgrind's callgrind around this program:
 * tools/bench runs it so. It starts itself under callgrind with two numbers of
 * rounds, whose difference is what the rounds cost. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/spectrum.h>

#include "bench.h"
#include "gen.h"
#include "kernel/kernels.h"

enum { PAIRS = 1024, SPECTRA = 256, SAMPLES = 401, FEW = 5, MANY = 25 };

static double first[3 * PAIRS], second[3 * PAIRS], out[3 * PAIRS];
static double matrix[3 * SAMPLES], spectrum[SPECTRA * SAMPLES];

static void run_pairs(const ef__kernel_table *k, int rounds) {
  static const double ones[3] = {1, 1, 1};
  gen g = gen_new(1);
  for (size_t i = 0; i < 3 * PAIRS; ++i) {
    const double low = i % 3 == 0 ? 0 : -100;
    first[i] = gen_between(&g, low, 100);
    second[i] = gen_between(&g, low, 100);
  }
  for (int i = 0; i < rounds; ++i)
    k->ciede2000(PAIRS, first, second, ones, out);
}

static void run_spectra(const ef__kernel_table *k, int rounds) {
  gen g = gen_new(1);
  gen_fill(&g, 3 * SAMPLES, 0, 2, matrix);
  gen_fill(&g, SPECTRA * SAMPLES, 0, 1, spectrum);
  for (int i = 0; i < rounds; ++i)
    k->apply(SAMPLES, 3, matrix, SPECTRA, spectrum, out);
}

/* All that this program executes with `rounds` of `what`; 0: not known. */
static double count(const char *program, const char *what, int rounds) {
  char command[512], line[256];
  double collected = 0;
  snprintf(command, sizeof command,
           "valgrind --tool=callgrind --callgrind-out-file=/dev/null '%s' %s "
           "%d 2>&1",
           program, what, rounds);
  FILE *const pipe = popen(command, "r");
  if (pipe == NULL) return 0;
  while (fgets(line, sizeof line, pipe) != NULL) {
    const char *const at = strstr(line, "Collected : ");
    if (at != NULL) collected = strtod(at + strlen("Collected : "), NULL);
  }
  return pclose(pipe) == 0 ? collected : 0;
}

static void report(const char *program, const char *what, const char *title,
                   double n_items, double most) {
  char name[64];
  const double few = count(program, what, FEW);
  const double many = count(program, what, MANY);
  if (!(few > 0 && many > few)) {
    fprintf(stderr, "valgrind does not count %s\n", what);
    exit(1);
  }
  const double each = (many - few) / ((MANY - FEW) * n_items);
  snprintf(name, sizeof name, "instructions_%s", what);
  bench_value(name, each, "instructions an item");
  printf("| instructions of %s, %s | - | %.0f | %.0f at most |\n", title,
         ef__kernels()->target, each, most);
}

int main(int argc, char **argv) {
  if (argc == 3 && strcmp(argv[1], "pairs") == 0) {
    run_pairs(ef__kernels(), atoi(argv[2]));
  } else if (argc == 3 && strcmp(argv[1], "spectra") == 0) {
    run_spectra(ef__kernels(), atoi(argv[2]));
  } else {
    report(argv[0], "pairs", "a CIEDE2000 pair", PAIRS, 150);
    report(argv[0], "spectra", "a spectrum of 401 samples to 3 channels",
           SPECTRA, 900);
  }
  return 0;
}
