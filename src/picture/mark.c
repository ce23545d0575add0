/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Shapes of marks, one for each look, of about one area. */
#include "picture/chart_private.h"

#include <math.h>

enum { MOST_CORNERS = 12 };

typedef struct shape {
  size_t n_corners; /* 0: a disc */
  double corner[MOST_CORNERS][2];
} shape;

/* In radii of the disc, y downwards. */
static const shape shapes[EF_LOOKS] = {
    {0, {{0}}},
    {4, {{-0.9, -0.9}, {0.9, -0.9}, {0.9, 0.9}, {-0.9, 0.9}}},
    {3, {{0, -1.35}, {1.2, 0.8}, {-1.2, 0.8}}},
    {4, {{0, -1.3}, {1.3, 0}, {0, 1.3}, {-1.3, 0}}},
    {3, {{0, 1.35}, {-1.2, -0.8}, {1.2, -0.8}}},
    {12,
     {{-0.4, -1.2},
      {0.4, -1.2},
      {0.4, -0.4},
      {1.2, -0.4},
      {1.2, 0.4},
      {0.4, 0.4},
      {0.4, 1.2},
      {-0.4, 1.2},
      {-0.4, 0.4},
      {-1.2, 0.4},
      {-1.2, -0.4},
      {-0.4, -0.4}}},
    {4, {{-1.6, -0.5}, {1.6, -0.5}, {1.6, 0.5}, {-1.6, 0.5}}},
    {12,
     {{-1.2, -0.6},
      {-0.6, -1.2},
      {0, -0.6},
      {0.6, -1.2},
      {1.2, -0.6},
      {0.6, 0},
      {1.2, 0.6},
      {0.6, 1.2},
      {0, 0.6},
      {-0.6, 1.2},
      {-1.2, 0.6},
      {-0.6, 0}}},
};

void ef__mark(ef__page *page, int look, double x, double y, double radius_px,
              bool open) {
  const bool is_frame = look == EF_LOOK_FRAME;
  const shape *s = &shapes[is_frame ? 0 : look];
  const double radius = is_frame ? radius_px * 0.55 : radius_px;
  if (s->n_corners == 0) {
    ef__page_ellipse(page, (ef__point){x, y}, (ef__point){radius, 0.0},
                     (ef__point){0.0, radius});
  } else {
    for (size_t i = 0; i < s->n_corners; ++i) {
      const double cx = x + radius * s->corner[i][0];
      const double cy = y + radius * s->corner[i][1];
      if (i == 0)
        ef__page_move(page, cx, cy);
      else
        ef__page_line(page, cx, cy);
    }
    ef__page_close(page);
  }
  const int ink = is_frame ? EF__INK_SOFT : EF__INK_LOOK + look;
  ef__page_paint(page, (ef__style){.stroke = open ? ink : EF__INK_PAPER,
                                   .width_px = open ? 1.6 : 0.8,
                                   .fill = open ? EF__INK_PAPER : ink,
                                   .opacity = 1.0});
}
