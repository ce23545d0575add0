/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Mean, 95th percentile and largest of some differences. */
#ifndef COMMAND_TALLY_H
#define COMMAND_TALLY_H

#include <stddef.h>

typedef struct tally {
  size_t n; /**< 0: the rest is NaN */
  double mean, p95, worst;
  size_t worst_at; /**< the first of the largest */
} tally;

/** `scratch` has room for n values. The percentile lies between neighbours. */
tally tally_of(size_t n, const double *value, double *scratch);

#endif
