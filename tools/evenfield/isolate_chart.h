/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart and --report of `isolate`: the spectra of the background and of the
 * extremes, and contrasts. */
#ifndef COMMAND_ISOLATE_CHART_H
#define COMMAND_ISOLATE_CHART_H

#include <evenfield/picture.h>

#include "isolate.h"

/** The spectra as the codes show them. *out is freed with ef_chart_free in every
 * case. */
ef_status isolate_spectra_draw(const isolate_scene *s, const isolate_result *r,
                               ef_chart_settings settings, ef_chart **out,
                               ef_error *error);
/** To the file of --report (isolate_report.c). */
ef_status isolate_report_write(const isolate_scene *s, const isolate_result *r,
                               const ef_notes *notes, ef_error *error);
/** To the file of --chart: the spectra, or with --plane the contrasts. */
ef_status isolate_chart_write(const isolate_scene *s, const isolate_result *r,
                              const ef_notes *notes, ef_error *error);

#endif
