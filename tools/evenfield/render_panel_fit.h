/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Fitted curves as text, CSV or JSON. */
#ifndef COMMAND_RENDER_PANEL_FIT_H
#define COMMAND_RENDER_PANEL_FIT_H

#include "panel_fit.h"
#include "text.h"

/** All of the text. */
void panel_fit_add(text *out, const panel_fits *p);
ef_status render_panel_fit_text(const panel_fits *p, ef_output *output,
                                ef_error *error);
/** CSV: a row for each curve and group. JSON: with points and groups. */
ef_status render_panel_fit_data(const panel_fits *p, ef_output *output,
                                ef_error *error);

/** What is unusual about a curve, as a list of clauses; returns how many were
 * added. */
size_t panel_fit_remarks(const panel_fits *p, const panel_fit *f, text *out);

/** "p01", "p01, deck" or "all, deck". */
void panel_fit_name(const panel_fits *p, const panel_fit *f, char *name,
                    size_t room);

/** "0.83 Delta E*00 (95 % interval 0.71 to 0.97)"; `unit` may be "". */
void panel_add_estimate(text *out, ef_estimate e, const char *unit);
/** Shares of answers at the criterion of JND in words: "75 % right in 2IFC". */
void panel_add_jnd_words(text *out, ef_task task);
/** Beneath every answer: what a threshold depends on. */
extern const char panel_caution[];

#endif
