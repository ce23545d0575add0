/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Figures as plain English. */
#ifndef COMMAND_WORDS_H
#define COMMAND_WORDS_H

#include <evenfield/difference.h>

#define WORDS_ROOM 200

/** What to know of an observer whose colours have two dimensions. */
extern const char words_two_dimensions[];

/** How a sample with these components (sample minus reference) differs from a
 * reference of hue `h_deg`: "duller by 4.8, lighter by 1.2"; the largest
 * part first, parts below a tenth of the whole left out, "alike" when all are
 * zero. `h_deg` is the hue angle in CIELAB. */
void words_direction(ef_components components, double h_deg,
                     char text[WORDS_ROOM]);
/** A number with two decimals, or more where the first two are zero. */
void words_amount(double value, char text[EF_NUMBER_TEXT]);
/** How many decimals show `digits` significant digits of `value`: 0 to 9. */
int words_decimals(double value, int digits);
/** "p = 0.04", "p < 0.0001". */
void words_chance(double p, char text[WORDS_ROOM]);
/** "1 target", "3 targets". */
void words_count(size_t n, const char *one, const char *many,
                 char text[WORDS_ROOM]);

#endif
