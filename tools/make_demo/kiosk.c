/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The ticket kiosk: a display with LED backlight. */
#include "demo.h"

#include <math.h>
#include "observer.h"

enum { N_PRIMARIES = 3, KIOSK_START_NM = 380, KIOSK_COUNT = 401 };

/* A blue LED with a green and a red phosphor, behind three filters. */
static const struct curve kiosk_backlight = {
  0.0, {{BELL, 1.79, 451.0, 9.0},
        {BELL, 0.945, 540.0, 30.0},
        {BELL, 0.32, 622.0, 24.0},
        {BELL, 0.86, 631.0, 4.5},
        {BELL, 0.40, 613.0, 4.2}}};
static const struct curve kiosk_filter[N_PRIMARIES] = {
  {0.0045, {{RISE, 0.88, 590.0, 6.0}, {BELL, 0.014, 445.0, 25.0}}},
  {0.0050, {{BELL, 0.84, 541.0, 34.0}, {BELL, 0.030, 602.0, 12.0}}},
  {0.0045, {{BELL, 0.74, 453.0, 27.0}, {FALL, 0.030, 528.0, 9.0}}},
};
/* What closed pixels let through, of the sum of the open ones; bluish. */
static const struct curve kiosk_leak = {0.00085, {{FALL, 0.0006, 500.0, 20.0}}};

static const double kiosk_white_cd_m2 = 350.0;
/* At full white the supply gives way a little, and in the blue a little more:
 * the shares of light lost there. */
static const double kiosk_sag[N_PRIMARIES] = {0.0040, 0.0045, 0.0075};
/* Tone curves: power functions that start at an offset. */
static const double kiosk_gamma[N_PRIMARIES] = {2.23, 2.20, 2.16};
static const double kiosk_offset[N_PRIMARIES] = {0.020, 0.018, 0.024};

/* Radiance at 1 nm, W sr^-1 m^-2 nm^-1: three channels without the leakage,
 * and the leakage. */
struct kiosk {
  double channel[N_PRIMARIES][KIOSK_COUNT];
  double black[KIOSK_COUNT];
};

/* Observer channel `c` at `nm`: four-point Lagrange interpolation of the 5 nm
 * table, linear in its first and last step. X, Y, Z of these primaries differ
 * by less than 4e-5 from those with the 1 nm table. */
static double observer_at(int c, int nm) {
  const int offset = nm - OBSERVER_START_NM;
  const int i = offset / OBSERVER_STEP_NM;
  const double t = (double)(offset % OBSERVER_STEP_NM) / OBSERVER_STEP_NM;
  const double(*const f)[3] = observer_cie_1931;
  if (i < 1 || i + 2 >= OBSERVER_COUNT) {
    return t > 0.0 ? (1.0 - t) * f[i][c] + t * f[i + 1][c] : f[i][c];
  }
  return -t * (t - 1.0) * (t - 2.0) / 6.0 * f[i - 1][c] +
         (t + 1.0) * (t - 1.0) * (t - 2.0) / 2.0 * f[i][c] -
         (t + 1.0) * t * (t - 2.0) / 2.0 * f[i + 1][c] +
         (t + 1.0) * t * (t - 1.0) / 6.0 * f[i + 2][c];
}

static void tristimulus(const double radiance[KIOSK_COUNT], double xyz[3]) {
  for (int c = 0; c < 3; c++) {
    xyz[c] = 0.0;
    for (int i = 0; i < KIOSK_COUNT; i++) {
      /* 683 lm/W (SI definition of the candela), 1 nm */
      xyz[c] += 683.0 * radiance[i] * observer_at(c, KIOSK_START_NM + i);
    }
  }
}

/* Light at the given share of each channel; the sag grows from none with one
 * channel open to its full size with all three. */
static void kiosk_light(const struct kiosk *kiosk,
                        const double share[N_PRIMARIES],
                        double radiance[KIOSK_COUNT]) {
  const double open = (share[0] + share[1] + share[2] - 1.0) / 2.0;
  const double load = open > 0.0 ? open : 0.0;
  for (int i = 0; i < KIOSK_COUNT; i++) {
    radiance[i] = kiosk->black[i];
    for (int p = 0; p < N_PRIMARIES; p++) {
      radiance[i] +=
        share[p] * (1.0 - load * kiosk_sag[p]) * kiosk->channel[p][i];
    }
  }
}

static void kiosk_make(struct kiosk *kiosk) {
  for (int i = 0; i < KIOSK_COUNT; i++) {
    const double nm = KIOSK_START_NM + i;
    const double lamp = curve_at(&kiosk_backlight, nm);
    double sum = 0.0;
    for (int p = 0; p < N_PRIMARIES; p++) {
      kiosk->channel[p][i] = lamp * curve_at(&kiosk_filter[p], nm);
      sum += kiosk->channel[p][i];
    }
    kiosk->black[i] = sum * curve_at(&kiosk_leak, nm);
  }
  double white[KIOSK_COUNT];
  double xyz[3];
  kiosk_light(kiosk, (const double[N_PRIMARIES]){1.0, 1.0, 1.0}, white);
  tristimulus(white, xyz);
  for (int i = 0; i < KIOSK_COUNT; i++) {
    for (int p = 0; p < N_PRIMARIES; p++) {
      kiosk->channel[p][i] *= kiosk_white_cd_m2 / xyz[1];
    }
    kiosk->black[i] *= kiosk_white_cd_m2 / xyz[1];
  }
}

void write_kiosk_primaries(FILE *out) {
  static const double state[5][N_PRIMARIES] = {
    {1, 0, 0}, {0, 1, 0}, {0, 0, 1}, {0, 0, 0}, {1, 1, 1}};
  uint64_t noise = SEED + 2;
  struct kiosk kiosk;
  double light[5][KIOSK_COUNT];
  double gain[5];
  kiosk_make(&kiosk);
  for (int s = 0; s < 5; s++) {
    kiosk_light(&kiosk, state[s], light[s]);
    gain[s] = 1.0 + 0.0005 * normal(&noise);
  }
  write_header(out, "primaries of the ticket kiosk's display, full drive",
               "spectral radiance of light, as measured: every column includes "
               "the leakage in column black",
               "W sr-1 m-2 nm-1",
               "the kiosk in the ticket hall, a display with LED backlight, "
               "measured once in a dark room; white was measured as well");
  fprintf(out, "wavelength_nm,red,green,blue,black,white\n");
  for (int i = 0; i < KIOSK_COUNT; i += 2) {
    fprintf(out, "%d", KIOSK_START_NM + i);
    for (int s = 0; s < 5; s++) {
      const double value = gain[s] * light[s][i];
      fprintf(out, ",%.4g", reading(value, 0.001, 2e-8, &noise));
    }
    fputc('\n', out);
  }
}

/* Share of channel `p` at code value `code` of 255, 0 to 1. */
static double kiosk_tone(int p, int code) {
  const double o = kiosk_offset[p];
  const double low = pow(o / (1.0 + o), kiosk_gamma[p]);
  const double high = pow((code / 255.0 + o) / (1.0 + o), kiosk_gamma[p]);
  return (high - low) / (1.0 - low);
}

/* One row: a colorimeter errs by 0.1 % in all channels together, by 0.03 % in
 * each alone, and by 0.0005 cd/m2. */
static void write_kiosk_row(FILE *out, const struct kiosk *kiosk,
                            const int code[N_PRIMARIES], uint64_t *noise) {
  double share[N_PRIMARIES];
  double radiance[KIOSK_COUNT];
  double xyz[3];
  for (int p = 0; p < N_PRIMARIES; p++) {
    share[p] = kiosk_tone(p, code[p]);
  }
  kiosk_light(kiosk, share, radiance);
  tristimulus(radiance, xyz);
  const double gain = 1.0 + 0.001 * normal(noise);
  fprintf(out, "%d,%d,%d", code[0], code[1], code[2]);
  for (int c = 0; c < 3; c++) {
    fprintf(out, ",%.5g", reading(gain * xyz[c], 0.0003, 0.0005, noise));
  }
  fputc('\n', out);
}

void write_kiosk_measurements(FILE *out) {
  uint64_t noise = SEED + 3;
  struct kiosk kiosk;
  kiosk_make(&kiosk);
  write_header(out, "measurement table of the ticket kiosk's display",
               "code values R, G, B and tristimulus values X, Y, Z of light, "
               "CIE 1931 observer",
               "cd/m2",
               "the same kiosk as its software sees it: ramps of each channel "
               "and of grey in 17 steps, black, white, and 20 mixtures");
  fprintf(out, "# device_max: 255\nR,G,B,X,Y,Z\n");
  for (int ramp = 0; ramp < 4; ramp++) {
    for (int step = 0; step <= 16; step++) {
      const int code = (255 * step + 8) / 16;
      const int rgb[N_PRIMARIES] = {ramp == 0 || ramp == 3 ? code : 0,
                                    ramp == 1 || ramp == 3 ? code : 0,
                                    ramp == 2 || ramp == 3 ? code : 0};
      write_kiosk_row(out, &kiosk, rgb, &noise);
    }
  }
  write_kiosk_row(out, &kiosk, (const int[N_PRIMARIES]){0, 0, 0}, &noise);
  write_kiosk_row(out, &kiosk, (const int[N_PRIMARIES]){255, 255, 255}, &noise);
  uint64_t choice = SEED + 103;
  for (int i = 0; i < 20; i++) {
    int rgb[N_PRIMARIES];
    for (int p = 0; p < N_PRIMARIES; p++) {
      rgb[p] = pick(&choice, 5, 255, 10);
    }
    write_kiosk_row(out, &kiosk, rgb, &noise);
  }
}
