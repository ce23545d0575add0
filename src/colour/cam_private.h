/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Constants that the appearance models and the spaces on them share. */
#ifndef EVENFIELD_COLOUR_CAM_PRIVATE_H
#define EVENFIELD_COLOUR_CAM_PRIVATE_H

/* Compressed responses r, g, b are meant without the 0.1 that CIE 159 adds to
 * each: it cancels everywhere but in the denominator of t, where it leaves
 * 0.1 + 0.1 + 1.05 * 0.1. */
#define EF__CAM_NOISE 0.305

/** Rows: redness-greenness a, yellowness-blueness b, and the sums of the
 * achromatic response A and of the denominator of t (CIE 159, 5.4). */
extern const double ef__cam_opponent[4][3];

/** Eccentricity of the hue, e_t = (cos(h + 2) + 3.8) / 4, its derivative by h
 * in radians, and its mean. */
double ef__cam_eccentricity(double h_rad, double *slope);
#define EF__CAM_MEAN_ECCENTRICITY 0.95

/** Compression of CIE 159, 5.3, odd about zero: 400 p^0.42 / (p^0.42 + 27.13).
 */
double ef__cam_compress(double p);
/** Its slope, that of 1e-9 below that. */
double ef__cam_compress_slope(double p);

#endif
