/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The formulas that laws are tried on: all registered ones, and some with
 * parameters of their own. */
#ifndef EVENFIELD_TESTS_METRICS_H
#define EVENFIELD_TESTS_METRICS_H

#include <evenfield/difference.h>

size_t every_metric_count(void);
/** Lives until the test program ends. */
const ef_metric *every_metric(size_t i);

#endif
