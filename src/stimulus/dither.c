/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Rounding up or down against a threshold that is spread evenly over pixels and
 * frames: over 8 x 8 pixels the 64 values of the recursive order of Bayer
 * (1973), in time steps of the golden section, which fill the interval more
 * evenly than any other (Steinhaus' three-distance theorem). */
#include <math.h>
#include <stdlib.h>

#include "stimulus/stimulus_private.h"

enum { N = EF_MAX_DRIVES, TILE = EF__DITHER_TILE, FRAMES = 16 };

static const double golden = 0.6180339887498949; /* (sqrt(5) - 1) / 2 */

/* Bits of x ^ y and y interleaved, the lowest on top: 0 to 63. */
static uint32_t order_of(size_t x, size_t y) {
  const uint32_t a = (uint32_t)(x ^ y), b = (uint32_t)y;
  uint32_t order = 0;
  for (unsigned bit = 0; bit < 3; ++bit) {
    order = order << 1 | (a >> bit & 1);
    order = order << 1 | (b >> bit & 1);
  }
  return order;
}

/* Each primary begins elsewhere, so that not all step up at one pixel. */
ef__thresholds ef__thresholds_of(size_t n, uint64_t seed) {
  ef__thresholds out;
  ef__random random = ef__random_stream(seed, 0);
  for (size_t i = 0; i < N; ++i) {
    const uint64_t bits = ef__random_bits(&random);
    out.dx[i] = i < n ? (uint32_t)(bits % TILE) : 0;
    out.dy[i] = i < n ? (uint32_t)(bits / TILE % TILE) : 0;
    out.offset[i] = i < n ? ef__random_unit(&random) : 0;
  }
  return out;
}

uint32_t ef__dither_code(const ef__thresholds *thresholds,
                         const ef__codes *codes, size_t i, double amount,
                         size_t x, size_t y, size_t frame) {
  const double *const row = codes->amount + i * codes->n_codes;
  const uint32_t below = ef__codes_below(codes, i, amount);
  if (below + 1 >= codes->n_codes || amount <= row[below])
    return below;
  const double share = (amount - row[below]) / (row[below + 1] - row[below]);
  const uint32_t order =
      order_of((x + thresholds->dx[i]) % TILE, (y + thresholds->dy[i]) % TILE);
  const double turned = ((double)order + 0.5) / (TILE * TILE) +
                        thresholds->offset[i] + golden * (double)frame;
  return share > turned - floor(turned) ? below + 1 : below;
}

/* ---- The effect ---------------------------------------------------------- */

typedef struct moments {
  double mean[EF_N_RECEPTORS], square[EF_N_RECEPTORS];
} moments;

/* Excitations over the tile and frames. */
static moments measure(const ef_stimulator *stimulator,
                       const ef__thresholds *thresholds, const ef__codes *codes,
                       const double *wanted) {
  const double n_places = (double)TILE * TILE * FRAMES;
  moments out = {{0}, {0}};
  for (size_t k = 0; k < (size_t)TILE * TILE * FRAMES; ++k) {
    double amount[N], excitation[EF_N_RECEPTORS];
    for (size_t i = 0; i < stimulator->n; ++i) {
      const uint32_t code =
          ef__dither_code(thresholds, codes, i, wanted[i], k % TILE,
                          k / TILE % TILE, k / (TILE * TILE));
      amount[i] = codes->amount[i * codes->n_codes + code];
    }
    ef_stimulator_excitations(stimulator, amount, excitation);
    for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
      out.mean[r] += excitation[r] / n_places;
      out.square[r] += excitation[r] * excitation[r] / n_places;
    }
  }
  return out;
}

static void compare(const ef_stimulator *stimulator,
                    const ef_isolation *isolation, const ef__codes *codes,
                    uint64_t seed, ef_dither_effect *out) {
  const size_t n = stimulator->n;
  const ef__thresholds thresholds = ef__thresholds_of(n, seed);
  double high[N], rounded[2][N], excitation[2][EF_N_RECEPTORS];
  for (size_t i = 0; i < n; ++i) {
    high[i] = isolation->background[i] + isolation->modulation[i];
    const uint32_t at = ef__codes_round(codes, i, isolation->background[i]);
    const uint32_t up = ef__codes_round(codes, i, high[i]);
    rounded[0][i] = codes->amount[i * codes->n_codes + at];
    rounded[1][i] = codes->amount[i * codes->n_codes + up];
  }
  const moments before =
      measure(stimulator, &thresholds, codes, isolation->background);
  const moments after = measure(stimulator, &thresholds, codes, high);
  for (size_t s = 0; s < 2; ++s)
    ef_stimulator_excitations(stimulator, rounded[s], excitation[s]);
  for (size_t r = 0; r < EF_N_RECEPTORS; ++r) {
    const double variance = after.square[r] - after.mean[r] * after.mean[r];
    out->contrast[r] = after.mean[r] / before.mean[r] - 1;
    out->noise[r] = sqrt(fmax(variance, 0)) / before.mean[r];
    if (isolation->role[r] != EF_RECEPTOR_SILENT)
      continue;
    out->residual = fmax(out->residual, fabs(out->contrast[r]));
    out->rounded_residual = fmax(out->rounded_residual,
                                 fabs(excitation[1][r] / excitation[0][r] - 1));
  }
}

ef_status ef_isolation_dither(const ef_stimulator *stimulator,
                              const ef_isolation *isolation, int bits,
                              uint64_t seed, ef_dither_effect *out,
                              ef_error *error) {
  ef__codes *codes = NULL;
  ef_status status = ef__isolation_check(stimulator, isolation, error);
  if (status == EF_OK && bits != 8 && bits != 10 && bits != 16) {
    status = ef__error_set(error, EF_INVALID,
                           "frames of %d bits; expected 8, 10 or 16", bits);
  }
  if (status == EF_OK)
    status = ef__codes_new(stimulator->device, bits, &codes, error);
  if (status != EF_OK)
    return status;
  *out = (ef_dither_effect){.residual = 0};
  compare(stimulator, isolation, codes, seed, out);
  free(codes);
  return EF_OK;
}
