/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Figures of a panel as they are told, whatever the verb. */
#ifndef COMMAND_PANEL_WORDS_H
#define COMMAND_PANEL_WORDS_H

#include <evenfield/panel.h>

#include "text.h"

void panel_add_number(text *out, double value, int decimals);
/** "0.71 to 0.97", "at least 0.71" ... */
void panel_add_limits(text *out, ef_estimate e, int decimals);
/** "0.83 Delta E*00 (95 % interval 0.71 to 0.97)"; `unit` may be "". */
void panel_add_estimate(text *out, ef_estimate e, const char *unit);
/** A limit in a table: one that is infinite is "open" above, "-" below. */
void panel_limit_cell(text_table *t, double value, int decimals);
/** A p-value in a table. */
void panel_chance_cell(text_table *t, double p);
/** "two of three people have one within a factor of 1.17 of it". */
void panel_add_factor(text *out, double log_sd);
/** Shares of answers at the criterion of JND in words: "75 % right in 2IFC". */
void panel_add_jnd_words(text *out, ef_task task);
/** True where an observer's criterion moves the answers. */
bool panel_is_open(ef_task task);
/** Beneath every answer: what a threshold depends on. */
extern const char panel_caution[];

#endif
