/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * One figure of each person with its interval, beside the panel's: how people
 * differ at a glance. */
#ifndef COMMAND_PANEL_ROWS_H
#define COMMAND_PANEL_ROWS_H

#include <evenfield/panel.h>
#include <evenfield/picture.h>

#include "report.h"

enum { PANEL_MOST_ROWS = 60 };

typedef struct panel_rows {
  const char *title, *x_title;
  const char *about; /**< what the rows are; their figures are added */
  size_t n;
  const char **name;
  ef_estimate *value; /**< NaN: a name without a mark */
  ef_estimate whole;  /**< the panel's; NaN: none */
  const char *whole_name;
} panel_rows;

/** Room for n rows; false without memory. Free with panel_rows_free in every
 * case. */
bool panel_rows_new(panel_rows *r, size_t n);
void panel_rows_free(panel_rows *r);
/** Adds the chart to a page, the first PANEL_MOST_ROWS of its rows. */
ef_status panel_rows_report(const panel_rows *r, const report *page,
                            ef_error *error);

#endif
