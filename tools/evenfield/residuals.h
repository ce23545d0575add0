/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * How well the model of a device describes what was measured of it. */
#ifndef COMMAND_RESIDUALS_H
#define COMMAND_RESIDUALS_H

#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/exchange.h>

#include "text.h"

struct rows;

/** How a model describes rows that were measured, in the metric asked for. */
typedef struct residuals {
  size_t n; /**< 0: nothing to compare with */
  double mean, p95, worst;
  size_t worst_line;
  char worst_name[64]; /**< of rows without drives; "" else */
  size_t n_drives;
  double worst_drive[EF_MAX_DRIVES];
} residuals;
/** Of n residuals, whose rows are those of `r`. */
ef_status residuals_of(residuals *out, const ef_metric *metric, size_t n,
                       const ef_residual *residual, const struct rows *r,
                       ef_error *error);
/** "by 0.20 Delta E*00 on average, 95 % of them by less than 0.5, at worst by
 * 0.7 (line 12, drive 0 %, 40 %, 40 %)" */
void residuals_add(text *t, const residuals *r, const ef_metric *metric);
/** An object of that key: count, mean, p95, worst, worst_line; nothing for
 * none. */
void residuals_write(ef_json *json, const char *key, const residuals *r);
/** Difference of two colours under a white. */
double residuals_difference(const ef_metric *metric, ef_xyz white, ef_xyz a,
                            ef_xyz b);

#endif
