/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The deck seats, and the panel that looked at them. */
#include "demo.h"

#include <math.h>

enum { N_PIGMENTS = 3, MAX_NAME = 64 };

/* K/S of a plastic: pigments times amounts on a common base. */
struct plastic {
  struct curve pigment[N_PIGMENTS];
  double amount[N_PIGMENTS];
};

/* blue, black, violet */
static const struct plastic seat_standard = {
  {{0.0, {{BELL, 1.0, 622.0, 46.0}, {BELL, 0.5, 695.0, 32.0},
          {FALL, 0.4, 405.0, 15.0}}},
   {1.0, {{NONE, 0.0, 0.0, 0.0}}},
   {0.0, {{BELL, 1.0, 540.0, 36.0}}}},
  {1.60, 0.22, 0.30}};

/* Another blue, another black, another violet. Amounts of 1.097, 0.2298 and
 * 0.8034 give the tristimulus values of the standard under D65 (CIE 1931,
 * solved by Newton's method); the supplier came near them. */
static const struct plastic seat_other = {
  {{0.0, {{BELL, 1.0, 640.0, 40.0}, {BELL, 0.5, 600.0, 25.0},
          {FALL, 0.3, 400.0, 10.0}}},
   {1.0, {{RISE, -0.3, 670.0, 20.0}}},
   {0.0, {{BELL, 1.0, 560.0, 28.0}, {FALL, 0.2, 440.0, 20.0}}}},
  {1.110, 0.2310, 0.7950}};

/* Several readings of one seat, put anew under the instrument each time. */
static void write_seat(FILE *out, const char *name, int n_readings,
                       const struct plastic *plastic, double strength,
                       uint64_t *noise) {
  double amount[N_PIGMENTS];
  for (int p = 0; p < N_PIGMENTS; p++) {
    amount[p] = plastic->amount[p] * strength * (1.0 + 0.010 * normal(noise));
  }
  for (int i = 0; i < n_readings; i++) {
    const double gain = 1.0 + 0.0015 * normal(noise);
    fprintf(out, "%s", name);
    for (int nm = 400; nm <= 700; nm += 10) {
      double q = 0.0;
      for (int p = 0; p < N_PIGMENTS; p++) {
        q += amount[p] * curve_at(&plastic->pigment[p], nm);
      }
      fprintf(out, ",%.4g", reading(gain * opaque(q), 0.0005, 0.0002, noise));
    }
    fputc('\n', out);
  }
}

void write_seats_standard(FILE *out) {
  uint64_t noise = SEED + 5;
  write_header(out, "deck seats: the agreed standard",
               "reflectance (radiance factor, 1 = perfect reflecting diffuser)",
               NULL,
               "the seat plate that both suppliers were given to match; rows "
               "of one name are repeated readings");
  fprintf(out, "name");
  write_band_names(out, 400, 700);
  write_seat(out, "standard", 5, &seat_standard, 1.0, &noise);
}

void write_seats_deliveries(FILE *out) {
  /* Batch 3 of the first supplier has too much colour. */
  static const double strength[2][4] = {{0.974, 1.018, 1.120, 1.008},
                                        {1.002, 0.994, 1.006, 0.998}};
  uint64_t noise = SEED + 6;
  write_header(out, "deck seats: four deliveries of each supplier",
               "reflectance (radiance factor, 1 = perfect reflecting diffuser)",
               NULL,
               "supplier-1 uses the pigments of the standard, supplier-2 "
               "others; will passengers tell the seats apart on deck, in the "
               "saloon, in the ticket hall? rows of one name are repeated "
               "readings");
  fprintf(out, "name");
  write_band_names(out, 400, 700);
  for (int s = 0; s < 2; s++) {
    for (int b = 0; b < 4; b++) {
      char name[MAX_NAME];
      snprintf(name, sizeof name, "supplier-%d batch %d", s + 1, b + 1);
      write_seat(out, name, 3, s == 0 ? &seat_standard : &seat_other,
                 strength[s][b], &noise);
    }
  }
}

void write_panel_responses(FILE *out) {
  static const double level[] = {0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0};
  enum { N_OBSERVERS = 12, N_TRIALS = 40 };
  uint64_t noise = SEED + 7;
  write_header(out, "answers of the seat panel, two-interval forced choice",
               "per observer and level: trials n and correct answers k; level "
               "is the CIEDE2000 difference from the standard under D65",
               "Delta E*00",
               "twelve passengers said which of two intervals held a pair of "
               "unlike seats; simulated with 75 % correct at a difference "
               "that varies between people around 0.9");
  fprintf(out, "observer,level,n,k\n");
  for (int o = 1; o <= N_OBSERVERS; o++) {
    const double jnd = 0.9 * exp(0.25 * normal(&noise));
    for (size_t i = 0; i < sizeof level / sizeof level[0]; i++) {
      /* Proportion correct is Phi(d' / sqrt 2); d' = 0.9539 gives 75 %; one
       * answer in fifty is given without looking. */
      const double d_prime = 0.9539 * level[i] / jnd;
      const double seen = 0.5 * erfc(-d_prime / 2.0);
      const double correct = 0.98 * seen + 0.02 * 0.5;
      int k = 0;
      for (int t = 0; t < N_TRIALS; t++) {
        k += uniform(&noise) < correct;
      }
      fprintf(out, "p%02d,%g,%d,%d\n", o, level[i], N_TRIALS, k);
    }
  }
}
