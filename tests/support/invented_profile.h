/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Invented ICC profiles for tests, made with lcms2: tables as real ones have
 * them, from formulas that a test can work out again. */
#ifndef EVENFIELD_TESTS_INVENTED_PROFILE_H
#define EVENFIELD_TESTS_INVENTED_PROFILE_H

#include <stddef.h>

#include <evenfield/colour.h>
#include <lcms2.h>

/** Bytes of a profile; free with free(). */
typedef struct made_profile {
  unsigned char *bytes;
  size_t length;
} made_profile;

/** CIELAB under D50 that the printing profile gives to inks in [0, 1]. */
ef_lab invented_ink_lab(double c, double m, double y, double k);

/** An output profile of `space` CMY or CMYK with tables of 16 bits to CIELAB
 * for all intents, and none back; its paper is off-white. `version` 2.1 or 4.3.
 */
made_profile make_ink_profile(cmsColorSpaceSignature space, double version);

/** A display profile of `space` with a table of 16 bits: colours of linear
 * light where it is RGB; of another class where `device_class` says so. */
made_profile make_table_profile(cmsColorSpaceSignature space,
                                cmsProfileClassSignature device_class);

/** A grey display profile. */
made_profile make_grey_profile(void);

#endif
