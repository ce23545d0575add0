/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/chart_private.h"

#include <math.h>

/* Directions tried, and distances beyond the mark in px. */
enum { DIRECTIONS = 12, DISTANCES = 4 };
static const double distance_px[DISTANCES] = {3.0, 11.0, 22.0, 36.0};
/* From which of these on a line leads from the mark to its label. */
enum { FIRST_LEADER = 1 };
/* What a place costs: for each line it hides, and by its distance. */
#define CROSSING 4.0
static const double distance_cost[DISTANCES] = {0.0, 2.0, 4.0, 7.0};

static bool overlap(ef__area a, ef__area b) {
  return a.left < b.right && b.left < a.right && a.top < b.bottom &&
         b.top < a.bottom;
}

/* The nearest box of the label's size that lies in direction (c, s) and whose
 * edge is `reach` away from the point. */
static ef__area box_at(const ef__chart_label *label, double height, double c,
                       double s, double reach) {
  const double half_w = label->width_px / 2.0, half_h = height / 2.0;
  /* Of a box that is seen from the point in this direction. */
  const double x = label->at.x + c * reach +
                   (fabs(c) > 0.3 ? copysign(half_w, c) : c * half_w);
  const double y = label->at.y + s * reach + s * half_h;
  return (ef__area){x - half_w, y - half_h, x + half_w, y + half_h};
}

/* Whether the segment has a point in the box: clipped by Liang & Barsky, ACM
 * Trans. Graphics 3 (1984) 1-22. */
static bool hides(ef__area box, const ef__segment *segment) {
  const double dx = segment->to.x - segment->from.x;
  const double dy = segment->to.y - segment->from.y;
  const double p[4] = {-dx, dx, -dy, dy};
  const double q[4] = {segment->from.x - box.left, box.right - segment->from.x,
                       segment->from.y - box.top, box.bottom - segment->from.y};
  double enters = 0.0, leaves = 1.0;
  for (size_t i = 0; i < 4; ++i) {
    if (p[i] == 0.0) {
      if (q[i] < 0.0)
        return false;
    } else if (p[i] < 0.0) {
      enters = fmax(enters, q[i] / p[i]);
    } else {
      leaves = fmin(leaves, q[i] / p[i]);
    }
  }
  return enters <= leaves;
}

/* Everything a label must keep clear of. */
typedef struct surroundings {
  ef__area field;
  size_t n_blocks;
  const ef__area *block;
  size_t n_segments;
  const ef__segment *segment;
  size_t n_labels; /* placed before */
  const ef__chart_label *label;
} surroundings;

static bool is_free(const surroundings *s, ef__area box) {
  if (box.left < s->field.left || box.right > s->field.right ||
      box.top < s->field.top || box.bottom > s->field.bottom)
    return false;
  for (size_t i = 0; i < s->n_blocks; ++i) {
    if (overlap(box, s->block[i]))
      return false;
  }
  for (size_t i = 0; i < s->n_labels; ++i) {
    if (s->label[i].placed && overlap(box, s->label[i].box))
      return false;
  }
  return true;
}

static double crossing_cost(const surroundings *s, ef__area box) {
  double cost = 0.0;
  for (size_t i = 0; i < s->n_segments; ++i) {
    if (hides(box, &s->segment[i]))
      cost += CROSSING;
  }
  return fmin(cost, 4.0 * CROSSING);
}

static void place_one(ef__chart_label *label, double height,
                      const surroundings *around) {
  double least = (double)INFINITY;
  const double length = hypot(label->outward.x, label->outward.y);
  for (size_t k = 0; k < DISTANCES; ++k) {
    for (size_t i = 0; i < DIRECTIONS; ++i) {
      const double turn = 2.0 * acos(-1.0) * (double)i / DIRECTIONS;
      const double c = cos(turn), s = -sin(turn);
      const double along =
          length > 0.0 ? (c * label->outward.x + s * label->outward.y) / length
                       : c;
      double cost = distance_cost[k] + 1.0 - along;
      const ef__area box =
          box_at(label, height, c, s, label->gap_px + distance_px[k]);
      if (cost >= least || !is_free(around, box))
        continue;
      cost += crossing_cost(around, box);
      if (cost >= least)
        continue;
      least = cost;
      label->placed = true;
      label->box = box;
      label->needs_leader = k >= FIRST_LEADER;
    }
  }
}

void ef__place(size_t n, ef__chart_label *label, double height_px, ef__area field,
               size_t n_blocks, const ef__area *block, size_t n_segments,
               const ef__segment *segment) {
  surroundings around = {field, n_blocks, block, n_segments, segment, 0, label};
  for (size_t i = 0; i < n; ++i) {
    around.n_labels = i;
    place_one(&label[i], height_px, &around);
  }
}
