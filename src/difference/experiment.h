/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Figures of published experiments (experiment_data.c). */
#ifndef EVENFIELD_EXPERIMENT_H
#define EVENFIELD_EXPERIMENT_H

#include <stddef.h>

typedef struct ef__luo_rigg {
  const char *name;
  double xy[2], Y;
  double semi_major_1e4, axis_ratio, angle_deg;
} ef__luo_rigg;
extern const ef__luo_rigg ef__luo_rigg_rows[];
extern const size_t ef__n_luo_rigg;

typedef struct ef__melgosa {
  const char *name;
  double lab[3];
  double g[6]; /* LL, aa, bb, La, Lb, ab */
} ef__melgosa;
extern const ef__melgosa ef__melgosa_rows[];
extern const size_t ef__n_melgosa;

typedef struct ef__huang {
  const char *name;
  double lab[3];
  double semi_major, axis_ratio, angle_deg;
} ef__huang;
extern const ef__huang ef__huang_rows[];
extern const size_t ef__n_huang;

#endif
