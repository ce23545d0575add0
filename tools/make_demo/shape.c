/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Noise, shapes and header lines of the demo files. */
#include "demo.h"

#include <math.h>

/* splitmix64 (Steele, Lea & Flood, OOPSLA 2014), its upper 53 bits. */
double uniform(uint64_t *state) {
  uint64_t z = (*state += 0x9E3779B97F4A7C15u);
  z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9u;
  z = (z ^ (z >> 27)) * 0x94D049BB133111EBu;
  z ^= z >> 31;
  return (double)(z >> 11) * 0x1p-53;
}

/* Twelve uniforms less six: plain sums give the same bits on every machine,
 * which log and cos need not. */
double normal(uint64_t *state) {
  double sum = -6.0;
  for (int i = 0; i < 12; i++) {
    sum += uniform(state);
  }
  return sum;
}

int pick(uint64_t *state, int low, int high, int step) {
  const int n = (high - low) / step + 1;
  return low + step * (int)(uniform(state) * n);
}

double reading(double value, double relative, double absolute,
               uint64_t *state) {
  /* One after the other: within one expression the order would be free. */
  const double gain = 1.0 + relative * normal(state);
  const double shown = gain * value + absolute * normal(state);
  return shown > 0.0 ? shown : 0.0;
}

double curve_at(const struct curve *curve, double nm) {
  double sum = curve->base;
  for (int i = 0; i < MAX_TERMS && curve->term[i].shape != NONE; i++) {
    const struct term *const t = &curve->term[i];
    const double u = (nm - t->centre_nm) / t->width_nm;
    if (t->shape == BELL) {
      sum += t->height * exp(-0.5 * u * u);
    } else {
      sum += t->height / (1.0 + exp(t->shape == RISE ? -u : u));
    }
  }
  return sum;
}

/* Kubelka & Munk 1931, infinite thickness. */
double opaque(double ratio) {
  return 1.0 + ratio - sqrt(ratio * ratio + 2.0 * ratio);
}

void write_header(FILE *out, const char *title, const char *quantity,
                  const char *unit, const char *story) {
  fprintf(out, "# title: %s\n# quantity: %s\n", title, quantity);
  if (unit != NULL) {
    fprintf(out, "# unit: %s\n", unit);
  }
  fprintf(out, "# made by: tools/make_demo; invented, no real company, product "
               "or person\n");
  fprintf(out, "# story: %s\n", story);
}

void write_band_names(FILE *out, int first_nm, int last_nm) {
  for (int nm = first_nm; nm <= last_nm; nm += 10) {
    fprintf(out, ",%d", nm);
  }
  fputc('\n', out);
}
