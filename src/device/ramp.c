/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A monotone ramp from readings: isotonic regression by pooling adjacent
 * violators (Barlow, Bartholomew, Bremner & Brunk 1972). */
#include "device/device_private.h"

#include <stdlib.h>

static int by_drive(const void *a, const void *b) {
  const ef__ramp_point *p = a, *q = b;
  if (p->drive != q->drive)
    return p->drive < q->drive ? -1 : 1;
  /* Equal drives are averaged: a fixed order gives the same last digit. */
  return (p->level > q->level) - (p->level < q->level);
}

/* Mean of two points, each counted by its weight. */
static ef__ramp_point merge(ef__ramp_point a, ef__ramp_point b) {
  const double weight = a.weight + b.weight;
  const double share = b.weight / weight;
  return (ef__ramp_point){a.drive + share * (b.drive - a.drive),
                          a.level + share * (b.level - a.level), weight};
}

static size_t average_repeated(size_t n, ef__ramp_point *point) {
  size_t n_left = 0;
  for (size_t i = 0; i < n; i++) {
    if (n_left > 0 && point[n_left - 1].drive == point[i].drive)
      point[n_left - 1] = merge(point[n_left - 1], point[i]);
    else
      point[n_left++] = point[i];
  }
  return n_left;
}

/* Pools points[0 .. n) until their levels strictly increase. */
static size_t pool(size_t n, ef__ramp_point *point) {
  size_t n_left = 0;
  for (size_t i = 0; i < n; i++) {
    ef__ramp_point last = point[i];
    while (n_left > 0 && !(last.level > point[n_left - 1].level))
      last = merge(point[--n_left], last);
    point[n_left++] = last;
  }
  return n_left;
}

size_t ef__ramp_make_monotone(size_t n, ef__ramp_point *point,
                              size_t *n_pooled) {
  *n_pooled = 0;
  if (n < 2)
    return n;
  qsort(point, n, sizeof *point, by_drive);
  const size_t n_drives = average_repeated(n, point);
  if (n_drives < 3)
    return n_drives;
  const ef__ramp_point first = point[0], last = point[n_drives - 1];
  const size_t n_inner = pool(n_drives - 2, point + 1);
  size_t n_left = 1;
  for (size_t i = 1; i <= n_inner; i++)
    if (point[i].level > first.level && point[i].level < last.level)
      point[n_left++] = point[i];
  point[n_left++] = last;
  *n_pooled = n_drives - n_left;
  return n_left;
}
