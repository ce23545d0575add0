/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Single colours from one space to another: XYZ to CIELAB, the codes of RGB
 * encodings to CIELAB and XYZ. */
#include "kernel/lab.h"
#include "kernel/target.h"

static void lab_block(size_t n, const double *xyz, const double *white,
                      double *lab) {
  v_colours block;
  v_int far = v_all_int(0);
  v_take_colours(n, xyz, &block);
  for (size_t i = 0; i < n; i += EF__LANES) {
    v_point p = v_colours_at(&block, i);
    p = (v_point){p.x / white[0], p.y / white[1], p.z / white[2]};
    far |= (p.x > V_FAR_RATIO) | (p.y > V_FAR_RATIO) | (p.z > V_FAR_RATIO);
    v_colours_set(&block, i, p);
  }
  v_lab_block(n, v_any(far), &block, lab);
}

void EF__KERNEL(xyz_to_lab)(size_t n, const double *xyz, const double white[3],
                            double *lab) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    lab_block(v_block_size(n, i), xyz + 3 * i, white, lab + 3 * i);
}

static void codes_block(size_t n, const uint8_t *rgb, const double *level,
                        const double *matrix, double *lab) {
  v_colours block;
  for (size_t c = 0; c < 3; ++c) {
    for (size_t i = 0; i < n; ++i)
      block.part[c][i] = level[rgb[3 * i + c]];
    for (size_t i = n; i < v_padded(n); ++i)
      block.part[c][i] = 0;
  }
  for (size_t i = 0; i < n; i += EF__LANES)
    v_colours_set(&block, i, v_transform(matrix, v_colours_at(&block, i)));
  v_lab_block(n, false, &block, lab);
}

void EF__KERNEL(codes_to_lab)(size_t n, const uint8_t *rgb,
                              const double level[256], const double matrix[9],
                              double *lab) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    codes_block(v_block_size(n, i), rgb + 3 * i, level, matrix, lab + 3 * i);
}

/* Drives become amounts: slope * drive up to the joint (if there is one), above
 * it the power gamma of (drive + offset) / (1 + offset). */
EF__INLINE void amounts(size_t n, const double *tone, double *drive) {
  const double gamma = tone[0], offset = tone[1];
  const double slope = tone[2], joint = tone[3];
  double power[V_COLOURS];
  for (size_t i = 0; i < n; i += EF__LANES) {
    const v_double x = v_load(drive + i);
    v_double clamped = v_select(x < 0, v_all(0), x);
    clamped = v_select(clamped > 1, v_all(1), clamped);
    v_store(drive + i, clamped);
    if (gamma == 1)
      continue;
    const v_double base = (clamped + offset) * (1 / (1 + offset));
    v_store(power + i, v_share_log(base, v_all(gamma)));
  }
  if (gamma == 1)
    return; /* linear: there is nothing below a joint either */
  for (size_t i = 0; i < n; i += EF__LANES) {
    const v_double x = v_load(drive + i);
    const v_double curved = v_share_power(v_load(power + i));
    const v_int straight = (x <= joint) & v_truth(joint > 0);
    v_store(drive + i, v_select(straight, slope * x, curved));
  }
}

static void rgb_block(size_t n, const float *rgb, const double *tone,
                      const double *matrix, double *xyz) {
  v_colours block;
  for (size_t i = 0; i < n; i += EF__LANES) {
    float last[3 * EF__LANES] = {0};
    const float *from = rgb + 3 * i;
    if (i + EF__LANES > n)
      from = memcpy(last, from, 3 * (n - i) * sizeof *from);
    v_point p;
    v_part_triplets(v_load_float(from), v_load_float(from + EF__LANES),
                    v_load_float(from + 2 * EF__LANES), &p.x, &p.y, &p.z);
    v_colours_set(&block, i, p);
  }
  for (size_t c = 0; c < 3; ++c)
    amounts(n, tone, block.part[c]);
  for (size_t i = 0; i < n; i += EF__LANES)
    v_give(n, i, v_transform(matrix, v_colours_at(&block, i)), xyz);
}

void EF__KERNEL(rgb_to_xyz)(size_t n, const float *rgb, const double tone[4],
                            const double matrix[9], double *xyz) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    rgb_block(v_block_size(n, i), rgb + 3 * i, tone, matrix, xyz + 3 * i);
}
