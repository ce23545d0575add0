/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * An invented display for tests: bell-shaped primaries on a 5 nm grid, a faint
 * bluish black, about 170 cd/m2 at full drive. */
#ifndef EVENFIELD_TESTS_INVENTED_DISPLAY_H
#define EVENFIELD_TESTS_INVENTED_DISPLAY_H

#include <evenfield/device.h>

enum { INVENTED_SAMPLES = 81 };

/** 380 to 780 nm, 5 nm. */
ef_grid invented_grid(void);

/** One bell: `peak` at `centre_nm`, standard deviation `width_nm`. */
void invented_bell(double peak, double centre_nm, double width_nm,
                   double out[INVENTED_SAMPLES]);

/** Rows black, red, green, blue, the primaries with the black in them. */
void invented_lights(double out[4 * INVENTED_SAMPLES]);

/** The same as a set of spectra; `absolute` as given. */
ef_spectra *invented_spectra(bool absolute);

/** The display with power 2.2, 2.1 and 2.3; fails the test on any error. */
ef_device *invented_display(bool absolute);

#endif
