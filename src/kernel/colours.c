/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Single colours from one space to another: XYZ to CIELAB, the codes of RGB
 * encodings to CIELAB and XYZ. */
#include "kernel/lab.h"
#include "kernel/target.h"

static void lab_block(size_t n, const double *xyz, const double *white,
                      double *lab) {
  double spare[V_NUMBERS];
  double *const block = n == V_COLOURS ? lab : spare;
  const double *from = xyz;
  const size_t vectors = (n + EF__LANES - 1) / EF__LANES;
  if (block == spare) {
    v_take_colours(n, xyz, spare);
    from = spare;
  }
  for (size_t i = 0; i < vectors; ++i) {
    double *const at = block + 3 * EF__LANES * i;
    const v_point p = v_load_point(from + 3 * EF__LANES * i);
    v_store_triplets(at, p.x / white[0], p.y / white[1], p.z / white[2]);
  }
  v_lab_block(vectors, block);
  if (block == spare) memcpy(lab, spare, 3 * n * sizeof *lab);
}

void EF__KERNEL(xyz_to_lab)(size_t n, const double *xyz, const double white[3],
                            double *lab) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    lab_block(v_block_size(n, i), xyz + 3 * i, white, lab + 3 * i);
}

EF__INLINE void transform(size_t vectors, const double *m, double *block) {
  for (size_t i = 0; i < vectors; ++i) {
    double *const at = block + 3 * EF__LANES * i;
    const v_point p = v_load_point(at);
    v_store_triplets(at, m[0] * p.x + m[1] * p.y + m[2] * p.z,
                     m[3] * p.x + m[4] * p.y + m[5] * p.z,
                     m[6] * p.x + m[7] * p.y + m[8] * p.z);
  }
}

static void codes_block(size_t n, const uint8_t *rgb, const double *level,
                        const double *matrix, double *lab) {
  double spare[V_NUMBERS];
  double *const block = n == V_COLOURS ? lab : spare;
  const size_t vectors = (n + EF__LANES - 1) / EF__LANES;
  for (size_t i = 0; i < 3 * n; ++i) block[i] = level[rgb[i]];
  for (size_t i = 3 * n; i < 3 * EF__LANES * vectors; ++i) block[i] = 0;
  transform(vectors, matrix, block);
  v_lab_block(vectors, block);
  if (block == spare) memcpy(lab, spare, 3 * n * sizeof *lab);
}

void EF__KERNEL(codes_to_lab)(size_t n, const uint8_t *rgb,
                              const double level[256], const double matrix[9],
                              double *lab) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    codes_block(v_block_size(n, i), rgb + 3 * i, level, matrix, lab + 3 * i);
}

/* Drives become amounts: slope * drive up to the joint (if there is one), above
 * it the power gamma of (drive + offset) / (1 + offset). */
EF__INLINE void amounts(size_t vectors, const double *tone, double *block) {
  const double gamma = tone[0], offset = tone[1];
  const double slope = tone[2], joint = tone[3];
  double power[V_NUMBERS];
  for (size_t i = 0; i < EF__LANES * vectors; i += EF__LANES) {
    const v_double drive = v_load(block + i);
    v_double clamped = v_select(drive < 0, v_all(0), drive);
    clamped = v_select(clamped > 1, v_all(1), clamped);
    v_store(block + i, clamped);
    if (gamma == 1) continue;
    const v_double base = (clamped + offset) * (1 / (1 + offset));
    v_store(power + i, v_power_log(base, v_all(gamma)));
  }
  if (gamma == 1) return; /* linear: there is nothing below a joint either */
  for (size_t i = 0; i < EF__LANES * vectors; i += EF__LANES) {
    const v_double drive = v_load(block + i);
    const v_double curved = v_exp(v_load(power + i));
    const v_int straight = (drive <= joint) & v_truth(joint > 0);
    v_store(block + i, v_select(straight, slope * drive, curved));
  }
}

static void rgb_block(size_t n, const float *rgb, const double *tone,
                      const double *matrix, double *xyz) {
  double spare[V_NUMBERS];
  double *const block = n == V_COLOURS ? xyz : spare;
  const size_t vectors = (n + EF__LANES - 1) / EF__LANES;
  for (size_t i = 0; i < 3 * n; ++i) block[i] = (double)rgb[i];
  for (size_t i = 3 * n; i < 3 * EF__LANES * vectors; ++i) block[i] = 0;
  amounts(3 * vectors, tone, block);
  transform(vectors, matrix, block);
  if (block == spare) memcpy(xyz, spare, 3 * n * sizeof *xyz);
}

void EF__KERNEL(rgb_to_xyz)(size_t n, const float *rgb, const double tone[4],
                            const double matrix[9], double *xyz) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    rgb_block(v_block_size(n, i), rgb + 3 * i, tone, matrix, xyz + 3 * i);
}
