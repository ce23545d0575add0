/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Settings of least flicker in the vision laboratory. */
#include "demo.h"

#include <math.h>
#include <stddef.h>

/* Excitation of L and M cones by the laboratory's lights at full drive, from
 * their spectra in demo:lab-display without stray light and the CIE 2006
 * fundamentals for 2 degrees (CIE 170-1:2006), each normalised to peak 1. */
static const double red_lm[2] = {0.0992005, 0.0192311};
static const double green_lm[2] = {0.1378043, 0.1685475};

enum { N_CREW = 6, N_AMOUNTS = 5, N_TIMES = 2 };

void write_flicker_settings(FILE *out) {
  static const double amount[N_AMOUNTS] = {0.3, 0.7, 0.5, 0.4, 0.6};
  uint64_t noise = SEED + 14;
  write_header(out, "settings of least flicker in the vision laboratory",
               "per setting: amounts of two lights that alternate and flicker "
               "least, as shares of their full drive; the lights are those of "
               "demo:lab-display",
               NULL,
               "six of the crew turned the green lamp until it flickered least "
               "against the red one; simulated with L to M about 2 to 1, which "
               "varies between people, and settings that scatter by 3 %");
  fprintf(out, "observer,first,first_amount,second,second_amount\n");
  for (int o = 1; o <= N_CREW; o++) {
    const double ratio = 2.0 * exp(0.5 * normal(&noise));
    const double red = ratio * red_lm[0] + red_lm[1];
    const double green = ratio * green_lm[0] + green_lm[1];
    for (int i = 0; i < N_AMOUNTS * N_TIMES; i++) {
      const double a = amount[i % N_AMOUNTS];
      const double set = a * red / green * exp(0.03 * normal(&noise));
      fprintf(out, "c%02d,red,%g,green,%.4f\n", o, a, set);
    }
  }
}
