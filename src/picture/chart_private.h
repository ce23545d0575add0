/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the files of charts share: axes, marks, labels, thinning. */
#ifndef EVENFIELD_PICTURE_CHART_PRIVATE_H
#define EVENFIELD_PICTURE_CHART_PRIVATE_H

#include <evenfield/picture.h>

#include "picture/drawing.h"

/* ---- Axes (axis.c) ----------------------------------------------------- */

/** Room for the text of a tick, a minus sign taking three bytes. */
#define EF__TICK_TEXT (EF_NUMBER_TEXT + 4)

/** Ticks at the multiples of 1, 2 or 5 times a power of ten that lie in the
 * range. */
typedef struct ef__axis {
  double from, to;
  int mantissa, exponent; /**< of the step */
  int64_t first;          /**< the first tick in steps */
  size_t n;
} ef__axis;

/** The finest such ticks that are `least_px` apart on `length_px`. from < to,
 * both finite. */
ef__axis ef__axis_of(double from, double to, double length_px,
                     double least_px);
/** Value of a tick and its text, which reads as that value. */
double ef__axis_tick(const ef__axis *axis, size_t i, char text[EF__TICK_TEXT]);

/* ---- Marks (mark.c) ---------------------------------------------------- */

/** A mark of a look about (x, y); open ones have paper inside. */
void ef__mark(ef__page *page, int look, double x, double y, double radius_px,
              bool open);

/* ---- Thinning (thin.c) ------------------------------------------------- */

/** Of points that fall into one cell of a grid over `area` keeps the first; the
 * cells are `cell_px` large, or larger until no more than `most` points stay
 * (0 cells: all points stay as long as they are no more). Points outside `area`
 * or not finite do not stay. Returns how many stay; SIZE_MAX without memory. */
size_t ef__thin(size_t n, const ef__point *point, ef__area area,
                double cell_px, size_t most, bool *stays);

/* ---- Labels (place.c) -------------------------------------------------- */

typedef struct ef__chart_label {
  const char *text;
  ef__point at;      /**< what it is a label of */
  ef__point outward; /**< the direction it should rather stand in */
  double gap_px;     /**< room that the mark takes */
  double width_px;
  int ink;
  /* Found by ef__place: */
  bool placed;
  ef__area box;
  bool needs_leader; /**< stands too far off to be seen as the mark's */
} ef__chart_label;

typedef struct ef__segment {
  ef__point from, to;
} ef__segment;

/** Finds places inside `field`, in the order given, that touch none of the
 * blocks and no other label and cross as few segments as may be. */
void ef__place(size_t n, ef__chart_label *label, double height_px, ef__area field,
               size_t n_blocks, const ef__area *block, size_t n_segments,
               const ef__segment *segment);

/* ---- Charts (chart.c, chart_draw.c) ------------------------------------ */

struct ef_chart {
  ef_chart_settings settings; /* its texts are owned */
  size_t n, room;
  ef_series *series; /* what they point to is owned */
};

/** A chart while it is drawn. */
typedef struct ef__sheet {
  const ef_chart *chart;
  ef__page *page;
  ef_chart_report *report;
  ef__area field; /**< between the axes */
  ef__axis x, y;
  /* Labels to be placed, and what they must keep clear of. */
  size_t n_labels, label_room;
  ef__chart_label *label;
  size_t n_blocks, block_room;
  ef__area *block;
  size_t n_segments, segment_room;
  ef__segment *segment;
} ef__sheet;

/** px of a point in the units of the axes. */
ef__point ef__sheet_at(const ef__sheet *sheet, double x, double y);
/** Px of a unit of the axes. */
ef__point ef__sheet_scale(const ef__sheet *sheet);

/** Draws one series, and remembers its labels (chart_series.c). False without
 * memory. */
bool ef__series_draw(ef__sheet *sheet, const ef_series *series);
/** Its sample in the legend, in a box 30 px wide about (x, y). */
void ef__series_sample(ef__page *page, const ef_series *series, double x,
                       double y);
/** Width of the line of a series, px, and its ink. */
ef__style ef__series_style(const ef_series *series);

/** Ends of the axes (chart_range.c). EF_INVALID when no point is finite. */
ef_status ef__chart_range(const ef_chart *chart, double from[2], double to[2],
                          ef_error *error);

/** Puts the chart on a page; free with ef__page_free in every case. */
ef_status ef__chart_draw(const ef_chart *chart, ef__page *page,
                         ef_chart_report *report, ef_error *error);

#endif
