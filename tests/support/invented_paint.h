/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Invented colourants for tests: white, red, yellow and blue, 400 to 700 nm at
 * 20 nm, absorption and scattering per unit of concentration. */
#ifndef EVENFIELD_TESTS_INVENTED_PAINT_H
#define EVENFIELD_TESTS_INVENTED_PAINT_H

#include <evenfield/device.h>

enum { PAINTS = 4, PAINT_SAMPLES = 16, PAINT_WHITE = 0 };

/** 400 to 700 nm, 20 nm. */
ef_grid paint_grid(void);
extern const char *const paint_names[PAINTS];
/** PAINTS x PAINT_SAMPLES each. */
void paint_constants(double *absorption, double *scattering);
/** The set. `two_constant` false: the ratio to the white's scattering. */
ef_colourants *paint_colourants(bool two_constant);
/** A substrate for films, PAINT_SAMPLES values: a light or a dark one. */
void paint_substrate(bool is_light, double *out);

#endif
