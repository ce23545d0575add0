/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Difference formulas written down as published, with the functions of libm and
 * hue angles in degrees: what the kernels are checked and timed beside. */
#ifndef EVENFIELD_TESTS_PLAIN_FORMULAS_H
#define EVENFIELD_TESTS_PLAIN_FORMULAS_H

/** Sharma, Wu & Dalal (2005), eq. 2 to 22, k_L = k_C = k_H = 1. */
double plain_ciede2000(const double reference[3], const double sample[3]);
double plain_cielab(const double reference[3], const double sample[3]);
/** CIE 116-1995, graphic arts. */
double plain_cie94(const double reference[3], const double sample[3]);
/** ISO 105-J03, l = 2, c = 1. */
double plain_cmc(const double reference[3], const double sample[3]);

#endif
