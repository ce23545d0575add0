/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/chart_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* From one size of cells to the next, and the smallest. */
#define LARGER 1.25
#define SMALLEST_PX 1.0

static bool is_inside(ef__point p, ef__area area) {
  return p.x >= area.left && p.x <= area.right && p.y >= area.top &&
         p.y <= area.bottom;
}

/* One round; `taken` is zeroed here. */
static size_t keep_first(size_t n, const ef__point *point, ef__area area,
                         double cell_px, size_t columns, size_t n_cells,
                         bool *taken, bool *stays) {
  memset(taken, 0, n_cells);
  size_t kept = 0;
  for (size_t i = 0; i < n; ++i) {
    stays[i] = false;
    if (!is_inside(point[i], area))
      continue;
    const size_t column = (size_t)((point[i].x - area.left) / cell_px);
    const size_t row = (size_t)((point[i].y - area.top) / cell_px);
    const size_t cell = row * columns + column;
    if (taken[cell])
      continue;
    taken[cell] = stays[i] = true;
    ++kept;
  }
  return kept;
}

size_t ef__thin(size_t n, const ef__point *point, ef__area area, double cell_px,
                size_t most, bool *stays) {
  size_t n_inside = 0;
  for (size_t i = 0; i < n; ++i) {
    stays[i] = is_inside(point[i], area);
    n_inside += stays[i];
  }
  if (cell_px == 0.0 && n_inside <= most)
    return n_inside;
  double cell = fmax(cell_px, SMALLEST_PX);
  const size_t widest = (size_t)((area.right - area.left) / cell) + 1;
  const size_t highest = (size_t)((area.bottom - area.top) / cell) + 1;
  bool *taken = ef__allocate(widest * highest, sizeof *taken);
  if (taken == NULL)
    return SIZE_MAX;
  size_t kept;
  for (;; cell *= LARGER) {
    const size_t columns = (size_t)((area.right - area.left) / cell) + 1;
    const size_t rows = (size_t)((area.bottom - area.top) / cell) + 1;
    kept =
        keep_first(n, point, area, cell, columns, columns * rows, taken, stays);
    if (kept <= most)
      break;
  }
  free(taken);
  return kept;
}
