/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "match/sphere.h"

#include <math.h>
#include <string.h>

/* Edges of a point that have been divided: at most six meet, half of which are
 * kept with either end. */
enum { EDGES = 6 };

size_t ef__sphere_points(int level) {
  return 10 * ((size_t)1 << 2 * level) + 2;
}

size_t ef__sphere_triangles(int level) {
  return 20 * ((size_t)1 << 2 * level);
}

static void set_icosahedron(double (*point)[3], size_t *corner) {
  static const signed char axis[12][3] = {
      {0, 1, 2},  {0, -1, 2}, {2, 0, 1},   {1, 2, 0},
      {-1, 2, 0}, {-2, 0, 1}, {0, 1, -2},  {2, 0, -1},
      {1, -2, 0}, {-1, -2, 0}, {-2, 0, -1}, {0, -1, -2}};
  static const unsigned char face[20][3] = {
      {0, 1, 2},  {0, 2, 3},  {0, 3, 4},  {0, 4, 5},   {0, 5, 1},
      {1, 8, 2},  {2, 8, 7},  {2, 7, 3},  {3, 7, 6},   {3, 6, 4},
      {4, 6, 10}, {4, 10, 5}, {5, 10, 9}, {5, 9, 1},   {1, 9, 8},
      {11, 6, 7}, {11, 7, 8}, {11, 8, 9}, {11, 9, 10}, {11, 10, 6}};
  const double golden = 0.5 * (1 + sqrt(5));
  const double length = sqrt(1 + golden * golden);
  for (size_t i = 0; i < 12; ++i) {
    for (size_t k = 0; k < 3; ++k) {
      const double a = axis[i][k];
      point[i][k] = (fabs(a) > 1 ? copysign(golden, a) : a) / length;
    }
  }
  for (size_t i = 0; i < 60; ++i)
    corner[i] = face[i / 3][i % 3];
}

/* The point halfway between two others, made when it is asked for first. */
static size_t middle_of(size_t a, size_t b, double (*point)[3],
                        size_t *n_points, size_t *edge) {
  const size_t low = a < b ? a : b, high = a < b ? b : a;
  size_t *const own = edge + 2 * EDGES * low;
  size_t k = 0;
  for (; k < EDGES && own[2 * k] != 0; ++k) {
    if (own[2 * k] == high)
      return own[2 * k + 1];
  }
  double sum[3], square = 0;
  for (size_t i = 0; i < 3; ++i) {
    sum[i] = point[a][i] + point[b][i];
    square += sum[i] * sum[i];
  }
  for (size_t i = 0; i < 3; ++i)
    point[*n_points][i] = sum[i] / sqrt(square);
  own[2 * k] = high; /* never 0: it is the larger of two */
  own[2 * k + 1] = *n_points;
  return (*n_points)++;
}

void ef__sphere_set(int level, double (*point)[3], size_t *corner,
                    size_t *scratch) {
  size_t n_points = 12, n_triangles = 20;
  set_icosahedron(point, corner);
  for (int l = 0; l < level; ++l) {
    memset(scratch, 0, 2 * EDGES * n_points * sizeof *scratch);
    const size_t before = n_triangles;
    for (size_t t = 0; t < before; ++t) {
      const size_t c[3] = {corner[3 * t], corner[3 * t + 1],
                           corner[3 * t + 2]};
      size_t middle[3]; /* of the edge from corner i */
      for (size_t i = 0; i < 3; ++i)
        middle[i] = middle_of(c[i], c[(i + 1) % 3], point, &n_points, scratch);
      for (size_t i = 0; i < 3; ++i) {
        size_t *const out = corner + 3 * (n_triangles + i);
        out[0] = c[i];
        out[1] = middle[i];
        out[2] = middle[(i + 2) % 3];
      }
      memcpy(corner + 3 * t, middle, sizeof middle);
      n_triangles += 3;
    }
  }
}
