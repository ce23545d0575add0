/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Series on their field. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "picture/chart_private.h"

enum {
  MOST_MARKS = 1500, /* on 720 px */
  MOST_PAIRS = 600,
  MOST_DOTS = 6000,
  MOST_LABELS = 200,
  MOST_SEGMENTS = 4000,     /* that labels are kept clear of */
  MOST_DOTS_AVOIDED = 2000 /* of them */
};
#define MARK_PX 4.2
#define DOT_PX 1.7
#define DASH_PX 2.2
#define LABEL_PX 12.0
/* Points of a line nearer than this to the one before are left out. */
#define NEAREST_PX 0.05
#define REGION_OPACITY 0.07

static int ink_of(const ef_series *s) {
  return s->look == EF_LOOK_FRAME ? EF__INK_SOFT : EF__INK_LOOK + s->look;
}

ef__style ef__series_style(const ef_series *s) {
  const bool is_frame = s->look == EF_LOOK_FRAME;
  const bool is_area =
      s->kind == EF_SERIES_REGION || s->kind == EF_SERIES_ELLIPSES;
  return (ef__style){.stroke = ink_of(s),
                     .width_px = is_frame                     ? 1.2
                                 : s->kind == EF_SERIES_PAIRS ? 1.1
                                                              : 1.7,
                     .dash = is_frame ? 0 : s->look % EF__DASHES,
                     .fill = is_area ? ink_of(s) : EF__INK_NONE,
                     .opacity = is_area ? REGION_OPACITY : 1.0};
}

/* ---- What labels keep clear of ----------------------------------------- */

static bool add_block(ef__sheet *sheet, ef__point at, double radius) {
  if (sheet->n_blocks == sheet->block_room) {
    const size_t room = 2 * sheet->block_room + 64;
    ef__area *grown = ef__reallocate(sheet->block, room, sizeof *grown);
    if (grown == NULL)
      return false;
    sheet->block = grown;
    sheet->block_room = room;
  }
  sheet->block[sheet->n_blocks++] =
      (ef__area){at.x - radius, at.y - radius, at.x + radius, at.y + radius};
  return true;
}

static bool add_segment(ef__sheet *sheet, ef__point from, ef__point to) {
  if (sheet->n_segments >= MOST_SEGMENTS)
    return true;
  if (sheet->n_segments == sheet->segment_room) {
    const size_t room = 2 * sheet->segment_room + 64;
    ef__segment *grown = ef__reallocate(sheet->segment, room, sizeof *grown);
    if (grown == NULL)
      return false;
    sheet->segment = grown;
    sheet->segment_room = room;
  }
  sheet->segment[sheet->n_segments++] = (ef__segment){from, to};
  return true;
}

/* Labels stand rather on the outer side of their series. */
static ef__point middle_of(const ef__sheet *sheet, const ef_series *s) {
  ef__point sum = {0.0, 0.0};
  double n = 0.0;
  for (size_t i = 0; i < s->n; ++i) {
    const ef__point at = ef__sheet_at(sheet, s->x[i], s->y[i]);
    if (!isfinite(at.x) || !isfinite(at.y))
      continue;
    sum.x += at.x;
    sum.y += at.y;
    n += 1.0;
  }
  return (ef__point){sum.x / n, sum.y / n};
}

static bool is_in(ef__area area, ef__point at) {
  return at.x >= area.left && at.x <= area.right && at.y >= area.top &&
         at.y <= area.bottom;
}

static bool add_labels(ef__sheet *sheet, const ef_series *s,
                       const bool *stays) {
  if (s->label == NULL)
    return true;
  const ef__point middle = middle_of(sheet, s);
  for (size_t i = 0; i < s->n; ++i) {
    const ef__point at = ef__sheet_at(sheet, s->x[i], s->y[i]);
    if (s->label[i] == NULL || s->label[i][0] == '\0' ||
        !is_in(sheet->field, at))
      continue;
    ++sheet->report->n_labels;
    if (sheet->n_labels >= MOST_LABELS || (stays != NULL && !stays[i]))
      continue;
    if (sheet->n_labels == sheet->label_room) {
      const size_t room = 2 * sheet->label_room + 32;
      ef__chart_label *grown =
          ef__reallocate(sheet->label, room, sizeof *grown);
      if (grown == NULL)
        return false;
      sheet->label = grown;
      sheet->label_room = room;
    }
    const bool is_frame = s->look == EF_LOOK_FRAME;
    sheet->label[sheet->n_labels++] = (ef__chart_label){
        .text = s->label[i],
        .at = at,
        .outward = {at.x - middle.x, at.y - middle.y},
        .gap_px = is_frame ? 2.5 : MARK_PX + 1.5,
        .width_px = ef__text_width(s->label[i], LABEL_PX, false) + 5.0,
        .ink = is_frame ? EF__INK_SOFT : EF__INK_TEXT};
  }
  return true;
}

/* ---- Lines and areas --------------------------------------------------- */

static bool draw_line(ef__sheet *sheet, const ef_series *s) {
  const bool closes = s->kind == EF_SERIES_REGION;
  ef__point last = {0.0, 0.0}, first = {0.0, 0.0};
  bool is_open = false, complete = true;
  for (size_t i = 0; i < s->n; ++i) {
    const ef__point at = ef__sheet_at(sheet, s->x[i], s->y[i]);
    if (!isfinite(at.x) || !isfinite(at.y)) {
      is_open = is_open && closes; /* an area has no gap */
      continue;
    }
    if (!is_open) {
      ef__page_move(sheet->page, at.x, at.y);
      first = at;
    } else if (hypot(at.x - last.x, at.y - last.y) >= NEAREST_PX ||
               i + 1 == s->n) {
      ef__page_line(sheet->page, at.x, at.y);
      complete = complete && add_segment(sheet, last, at);
    } else {
      continue;
    }
    is_open = true;
    last = at;
  }
  if (closes && is_open) {
    ef__page_close(sheet->page);
    complete = complete && add_segment(sheet, last, first);
  }
  ef__page_paint(sheet->page, ef__series_style(s));
  return complete;
}

static bool draw_ellipses(ef__sheet *sheet, const ef_series *s) {
  const ef__point scale = ef__sheet_scale(sheet);
  bool complete = true;
  for (size_t i = 0; i < s->n && complete; ++i) {
    const ef__point at = ef__sheet_at(sheet, s->x[i], s->y[i]);
    const double turn = s->angle_deg[i] * acos(-1.0) / 180.0;
    const double a = s->magnification * s->semi_major[i];
    const double b = s->magnification * s->semi_minor[i];
    const ef__point major = {a * cos(turn) * scale.x, a * sin(turn) * scale.y};
    const ef__point minor = {-b * sin(turn) * scale.x, b * cos(turn) * scale.y};
    if (!isfinite(at.x + major.x + minor.x) ||
        !isfinite(at.y + major.y + minor.y))
      continue;
    ef__page_ellipse(sheet->page, at, major, minor);
    ef__page_paint(sheet->page, ef__series_style(s));
    ef__mark(sheet->page, EF_LOOK_FRAME, at.x, at.y, 2.4, false);
    complete = add_block(sheet, at, 2.0);
  }
  return complete;
}

/* ---- Marks ------------------------------------------------------------- */

/* Clouds differ by shape too: dots, dashes lying and standing, crosses. A dot is
 * a line that ends where it begins, drawn with a round end. */
static void put_dot(ef__page *page, int look, ef__point at) {
  const int shape = look == EF_LOOK_FRAME ? 0 : look % 4;
  const double across = shape == 1 || shape == 3 ? DASH_PX : 0.0;
  const double down = shape == 2 || shape == 3 ? DASH_PX : 0.0;
  if (across > 0.0 || shape == 0) {
    ef__page_move(page, at.x - across, at.y);
    ef__page_line(page, at.x + across, at.y);
  }
  if (down > 0.0) {
    ef__page_move(page, at.x, at.y - down);
    ef__page_line(page, at.x, at.y + down);
  }
}

static ef__style dot_style(const ef_series *s) {
  const bool is_round = s->look == EF_LOOK_FRAME || s->look % 4 == 0;
  return (ef__style){.stroke = ink_of(s),
                     .width_px = is_round ? 2.0 * DOT_PX : 1.2,
                     .fill = EF__INK_NONE};
}

static bool draw_dots(ef__sheet *sheet, const ef_series *s, const ef__point *at,
                      const bool *stays) {
  bool complete = true;
  for (size_t i = 0; i < s->n && complete; ++i) {
    if (!stays[i])
      continue;
    put_dot(sheet->page, s->look, at[i]);
    if (sheet->n_segments < MOST_DOTS_AVOIDED)
      complete = add_segment(sheet, at[i], at[i]);
  }
  ef__page_paint(sheet->page, dot_style(s));
  return complete;
}

static bool draw_pair(ef__sheet *sheet, const ef_series *s, size_t i,
                      ef__point from) {
  const ef__point to = ef__sheet_at(sheet, s->to_x[i], s->to_y[i]);
  const bool has_end = isfinite(to.x) && isfinite(to.y);
  bool complete = true;
  if (has_end) {
    ef__page_move(sheet->page, from.x, from.y);
    ef__page_line(sheet->page, to.x, to.y);
    ef__page_paint(sheet->page, ef__series_style(s));
    complete = add_segment(sheet, from, to) && add_block(sheet, to, MARK_PX);
  }
  ef__mark(sheet->page, s->look, from.x, from.y, MARK_PX, true);
  if (has_end)
    ef__mark(sheet->page, s->look, to.x, to.y, 0.6 * MARK_PX, false);
  return complete;
}

/* A bar along x whose ends at the field have no caps: it goes on there. */
static bool draw_span(ef__sheet *sheet, const ef_series *s, size_t i,
                      ef__point at) {
  const ef__area *field = &sheet->field;
  const double x[2] = {ef__sheet_at(sheet, s->low[i], 0.0).x,
                       ef__sheet_at(sheet, s->high[i], 0.0).x};
  const bool is_bar = !isnan(x[0]) && !isnan(x[1]);
  const ef__point from = {fmax(x[0], field->left), at.y};
  const ef__point to = {fmin(x[1], field->right), at.y};
  if (is_bar) {
    ef__page_move(sheet->page, from.x, at.y);
    ef__page_line(sheet->page, to.x, at.y);
    for (size_t k = 0; k < 2; ++k) {
      if (x[k] < field->left || x[k] > field->right)
        continue;
      ef__page_move(sheet->page, x[k], at.y - 4.0);
      ef__page_line(sheet->page, x[k], at.y + 4.0);
    }
    ef__page_paint(sheet->page, (ef__style){.stroke = ink_of(s),
                                            .width_px = 1.4,
                                            .fill = EF__INK_NONE});
  }
  ef__mark(sheet->page, s->look, at.x, at.y, MARK_PX, false);
  return !is_bar || add_segment(sheet, from, to);
}

static bool draw_interval(ef__sheet *sheet, const ef_series *s, size_t i,
                          ef__point at) {
  const ef__point low = ef__sheet_at(sheet, s->x[i], s->low[i]);
  const ef__point high = ef__sheet_at(sheet, s->x[i], s->high[i]);
  if (isfinite(low.y) && isfinite(high.y)) {
    ef__page_move(sheet->page, at.x, low.y);
    ef__page_line(sheet->page, at.x, high.y);
    for (int k = -1; k <= 1; k += 2) {
      const double y = k < 0 ? low.y : high.y;
      ef__page_move(sheet->page, at.x - 4.0, y);
      ef__page_line(sheet->page, at.x + 4.0, y);
    }
    ef__page_paint(sheet->page, (ef__style){.stroke = ink_of(s),
                                            .width_px = 1.4,
                                            .fill = EF__INK_NONE});
  }
  ef__mark(sheet->page, s->look, at.x, at.y, MARK_PX, false);
  return add_segment(sheet, low, high);
}

static bool draw_one(ef__sheet *sheet, const ef_series *s, size_t i,
                     ef__point at) {
  if (!add_block(sheet, at, MARK_PX))
    return false;
  if (s->kind == EF_SERIES_PAIRS)
    return draw_pair(sheet, s, i, at);
  if (s->kind == EF_SERIES_INTERVALS)
    return draw_interval(sheet, s, i, at);
  if (s->kind == EF_SERIES_SPANS)
    return draw_span(sheet, s, i, at);
  ef__mark(sheet->page, s->look, at.x, at.y, MARK_PX, false);
  return true;
}

/* Points for the room there is: as many as stated on 720 px. */
static size_t most_points(const ef__sheet *sheet, size_t most) {
  const double share = fmin(sheet->page->width_px / 720.0, 1.0);
  return (size_t)((double)most * share * share);
}

static bool draw_points(ef__sheet *sheet, const ef_series *s) {
  const bool is_cloud = s->kind == EF_SERIES_CLOUD;
  const size_t most = is_cloud                     ? MOST_DOTS
                      : s->kind == EF_SERIES_PAIRS ? MOST_PAIRS
                                                   : MOST_MARKS;
  ef__point *at = ef__allocate(s->n, sizeof *at);
  bool *stays = ef__allocate(s->n, sizeof *stays);
  bool complete = at != NULL && stays != NULL;
  for (size_t i = 0; i < s->n && complete; ++i)
    at[i] = ef__sheet_at(sheet, s->x[i], s->y[i]);
  if (complete) {
    const size_t kept =
        ef__thin(s->n, at, sheet->field, is_cloud ? DOT_PX : 0.0,
                 most_points(sheet, most), stays);
    complete = kept != SIZE_MAX;
    if (s->look != EF_LOOK_FRAME) {
      sheet->report->n_points += s->n;
      sheet->report->n_drawn += complete ? kept : 0;
    }
  }
  if (complete && is_cloud) {
    complete = draw_dots(sheet, s, at, stays);
  } else if (complete) {
    for (size_t i = 0; i < s->n && complete; ++i) {
      if (stays[i])
        complete = draw_one(sheet, s, i, at[i]);
    }
    complete = complete && add_labels(sheet, s, stays);
  }
  free(at);
  free(stays);
  return complete;
}

bool ef__series_draw(ef__sheet *sheet, const ef_series *s) {
  bool complete;
  ef__page_group(sheet->page, s->name != NULL ? s->name : "");
  switch (s->kind) {
  case EF_SERIES_LINE:
  case EF_SERIES_REGION:
    complete = draw_line(sheet, s) && add_labels(sheet, s, NULL);
    break;
  case EF_SERIES_ELLIPSES:
    complete = draw_ellipses(sheet, s) && add_labels(sheet, s, NULL);
    break;
  default:
    complete = draw_points(sheet, s);
  }
  ef__page_ungroup(sheet->page);
  return complete;
}

/* ---- Legend ------------------------------------------------------------ */

void ef__series_sample(ef__page *page, const ef_series *s, double x, double y) {
  const ef__style style = ef__series_style(s);
  const double half = 13.0;
  switch (s->kind) {
  case EF_SERIES_LINE:
    ef__page_move(page, x - half, y);
    ef__page_line(page, x + half, y);
    ef__page_paint(page, style);
    return;
  case EF_SERIES_REGION:
    ef__page_rectangle(page, (ef__area){x - half, y - 6.0, x + half, y + 6.0});
    ef__page_paint(page, style);
    return;
  case EF_SERIES_ELLIPSES:
    ef__page_ellipse(page, (ef__point){x, y}, (ef__point){half, 0.0},
                     (ef__point){0.0, 5.5});
    ef__page_paint(page, style);
    return;
  case EF_SERIES_CLOUD:
    for (int i = -1; i <= 1; ++i) {
      const double dx = 7.0 * i, dy = i == 0 ? -2.0 : 2.0;
      put_dot(page, s->look, (ef__point){x + dx, y + dy});
    }
    ef__page_paint(page, dot_style(s));
    return;
  case EF_SERIES_PAIRS:
    ef__page_move(page, x - half + 4.0, y);
    ef__page_line(page, x + half - 3.0, y);
    ef__page_paint(page, style);
    ef__mark(page, s->look, x - half + 4.0, y, MARK_PX, true);
    ef__mark(page, s->look, x + half - 3.0, y, 0.6 * MARK_PX, false);
    return;
  case EF_SERIES_INTERVALS:
    ef__page_move(page, x, y - 7.0);
    ef__page_line(page, x, y + 7.0);
    ef__page_paint(page, (ef__style){.stroke = ink_of(s),
                                     .width_px = 1.4,
                                     .fill = EF__INK_NONE});
    break;
  case EF_SERIES_SPANS:
    ef__page_move(page, x - half, y);
    ef__page_line(page, x + half, y);
    ef__page_paint(page, (ef__style){.stroke = ink_of(s),
                                     .width_px = 1.4,
                                     .fill = EF__INK_NONE});
    break;
  case EF_SERIES_MARKS:
    break;
  }
  ef__mark(page, s->look, x, y, MARK_PX, false);
}
