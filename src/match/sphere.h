/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Directions spread evenly over the unit sphere, with the triangles between
 * them: an icosahedron whose triangles are divided into four, again and
 * again. */
#ifndef EVENFIELD_SPHERE_H
#define EVENFIELD_SPHERE_H

#include <stddef.h>

enum { EF__SPHERE_LEVELS = 5 };

/** 10 4^level + 2, and 20 4^level. */
size_t ef__sphere_points(int level);
size_t ef__sphere_triangles(int level);
/** Fills `point` (unit vectors) and `corner` (three points a triangle,
 * counterclockwise from outside). Neighbours in the list are mostly neighbours
 * on the sphere. `scratch` has room for 12 values a point of the level. */
void ef__sphere_set(int level, double (*point)[3], size_t *corner,
                    size_t *scratch);

#endif
