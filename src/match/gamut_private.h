/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Gamut geometry: polygons in a chromaticity diagram, the surface of the box of
 * amounts as a colour solid, and the object-colour solid. */
#ifndef EVENFIELD_GAMUT_PRIVATE_H
#define EVENFIELD_GAMUT_PRIVATE_H

#include <evenfield/match.h>

/* ---- Polygons (gamut.c) ------------------------------------------------ */

/** Most corners of a convex polygon below: all corners of a box of amounts. */
enum { EF__MAX_CORNERS = 1 << EF_MAX_DRIVES };

/** Area, above zero counterclockwise. */
double ef__polygon_area(size_t n, const ef_xy *point);
/** Makes the convex hull of `point`, counterclockwise, in place; returns the
 * number of its corners. */
size_t ef__polygon_hull(size_t n, ef_xy *point);
/** Area (not negative) of the part of any polygon that lies in a convex one,
 * counterclockwise with at most EF__MAX_CORNERS corners. Exact clipping. */
double ef__polygon_overlap(size_t n, const ef_xy *point, size_t n_convex,
                           const ef_xy *convex);

/* ---- Boxes of amounts (gamut.c) ---------------------------------------- */

/** Amounts between two limits each, and the colours they give: the zonohedron
 * of the vectors for additive setups of any number of drives, else the image of
 * a box of three amounts. */
typedef struct ef__box {
  const ef_setup *setup; /**< borrowed */
  size_t n_drives;
  /** Additive setups: d XYZ / d amount, 3 x n_drives, moved apart by a
   * billionth so that no three lie in a plane. Used for signs only. */
  double vector[3 * EF_MAX_DRIVES];
  double low[EF_MAX_DRIVES], high[EF_MAX_DRIVES];
} ef__box;

/** Two amounts vary over a face, the others rest at a limit. Seen from outside
 * (of an additive setup's solid) the turn from `i` to `j` is counterclockwise
 * in right-handed X, Y, Z. */
typedef struct ef__face {
  double amount[EF_MAX_DRIVES];
  size_t i, j;
} ef__face;

enum { EF__MAX_FACES = EF_MAX_DRIVES * (EF_MAX_DRIVES - 1) };

/** All amounts from 0 to 1. False for a setup that is not additive and has
 * other than three drives: its surface is not known. */
bool ef__box_from_setup(const ef_setup *setup, ef__box *out);
/** Returns how many faces the surface has. */
size_t ef__box_faces(const ef__box *box, ef__face face[EF__MAX_FACES]);
/** CIELAB volume, from `n_steps` x `n_steps` cells a face; below zero when the
 * surface is inside out. */
ef_status ef__box_volume(const ef__box *box, ef_xyz white, size_t n_steps,
                         int jobs, double *volume, ef_error *error);
/** Triangles of the surface in XYZ, nine numbers each; free with free(). */
double *ef__box_triangles(const ef__box *box, size_t *n_triangles,
                          ef_error *error);

/* ---- The object-colour solid (solid.c) --------------------------------- */

/** 380 to 780 nm at 1 nm. */
enum { EF__BANDS = 401 };

/** All surfaces under one light: reflectance 0 to 1 in each band. Its boundary
 * are the rectangular spectra, 1 in one run of bands round the circle of
 * wavelengths and 0 elsewhere (Schroedinger 1920, MacAdam 1935), at most two
 * bands being in between. */
typedef struct ef__solid {
  /** X, Y, Z of the bands before band i, for two turns of the circle: the
   * colour of the bands from i to j is sum[j] - sum[i]. */
  double sum[2 * EF__BANDS + 1][3];
  ef_xyz white;
  /** Where Y of the sums stops rising or falling: run r goes from turn[r] to
   * turn[r + 1]. One run, unless an adaptation took some band below zero. */
  size_t n_runs;
  size_t turn[2 * EF__BANDS + 1];
} ef__solid;

/** The white has Y = 100. EF_INVALID when the observer sees nothing of the
 * light. EF_NO_ANSWER when the locus is not convex, because other than
 * rectangular spectra then bound the solid: its area is below 99 % of its
 * hull's, bands counting whose functions sum to a thousandth of the most. */
ef_status ef__solid_set(const ef_observer *observer,
                        const ef_illuminant *illuminant, ef__solid *out,
                        ef_error *error);
/** Takes all colours to corresponding ones. */
void ef__solid_transform(ef__solid *solid, const double matrix[9]);
/** CIELAB volume: mesh of the rectangular spectra with a corner at each edge of
 * a band. */
ef_status ef__solid_volume(const ef__solid *solid, ef_xyz white, int jobs,
                           double *volume, ef_error *error);

/** A convex section of the solid at one Y: its corners in the X, Z plane,
 * counterclockwise round a centre, with their direction in [0, 4). */
typedef struct ef__corner {
  double x, z, turn;
} ef__corner;
typedef struct ef__section {
  double Y;
  double x, z; /**< centre */
  size_t n;
  ef__corner *corner; /**< room for ef__solid_corners() */
} ef__section;

/** Most corners a section can have. */
size_t ef__solid_corners(const ef__solid *solid);
/** Cuts at `Y`; corners that coincide are one. n is 0 when there is nothing. */
void ef__solid_cut(const ef__solid *solid, double Y, ef__section *section);

/** CIELAB volumes of the solid and of its part inside a body with that surface
 * (triangles in XYZ, outside counterclockwise), from sections at constant L*,
 * two in each of `n_panels`. */
ef_status ef__solid_overlap(const ef__solid *solid, ef_xyz white,
                            size_t n_triangles, const double *triangle,
                            size_t n_panels, int jobs, double *whole,
                            double *part, ef_error *error);

#endif
