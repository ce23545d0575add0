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

/* ---- Parts of the text ------------------------------------------------- */

/** Groups, other criteria, sensitivity apart from the criterion, leaning. */
void panel_fit_add_people(text *out, const panel_fits *p);
/** What to look at again, and what the answer rests on. */
void panel_fit_add_basis(text *out, const panel_fits *p);
/** The figure that is told first of a condition. */
panel_figure panel_fit_main(const panel_fits *p, size_t condition);
/** Where the threshold is taken: "75 % \"right\", lapses left out". */
void panel_fit_add_criterion(text *out, const panel_fits *p);
/** True when a curve has that figure. */
bool panel_fit_has(const panel_fits *p, panel_figure figure);
/** True when the threshold is the JND, or the point of equality. */
bool panel_fit_threshold_is_told(const panel_fits *p);

#endif
