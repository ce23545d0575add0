/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the two files of reports share. */
#ifndef EVENFIELD_PICTURE_REPORT_PRIVATE_H
#define EVENFIELD_PICTURE_REPORT_PRIVATE_H

#include <evenfield/exchange.h>

#include "picture/drawing.h"

/** Where a report goes; the first error is kept, and nothing is written after
 * it. */
typedef struct ef__report_writer {
  ef_output *output;
  ef_status status;
  ef_error error;
} ef__report_writer;

/** Markup, as it is. */
void ef__report_put(ef__report_writer *w, const char *markup);
/** The rules of the page (report_style.c). */
void ef__report_style(ef__report_writer *w);

#endif
