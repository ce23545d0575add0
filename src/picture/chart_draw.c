/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The page of a chart, from the top: title, subtitle, title of the y axis,
 * field with its axes, title of the x axis, legend, what could not be shown. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "picture/chart_private.h"

/* Sizes of text and distances, px. */
#define TITLE_PX 17.0
#define BODY_PX 13.0
#define TICK_PX 12.0
#define LABEL_PX 12.0
#define PAD 16.0
#define LEADING 1.35 /* from line to line, in sizes */
#define TICK_LENGTH 5.0
/* Least distance of ticks. */
#define X_TICKS_PX 64.0
#define Y_TICKS_PX 32.0
/* Rows with names: their distance, and the most that names take of the page. */
#define ROW_PX 22.0
#define MOST_NAME 0.38
#define ROW_TEXT 512
/* Height of the field over its width where scales differ, and its bounds where
 * they are equal. */
#define ASPECT 0.62
#define LOWEST 0.35
#define HIGHEST 1.25

static const ef__lettering title_text = {EF__INK_TEXT, TITLE_PX, true,
                                         EF__ANCHOR_LEFT, false};
static const ef__lettering body_text = {EF__INK_TEXT, BODY_PX, false,
                                        EF__ANCHOR_LEFT, false};
static const ef__lettering soft_text = {EF__INK_SOFT, BODY_PX, false,
                                        EF__ANCHOR_LEFT, false};
static const ef__lettering axis_text = {EF__INK_TEXT, BODY_PX, true,
                                        EF__ANCHOR_LEFT, false};

ef__point ef__sheet_scale(const ef__sheet *s) {
  return (ef__point){(s->field.right - s->field.left) / (s->x.to - s->x.from),
                     -(s->field.bottom - s->field.top) / (s->y.to - s->y.from)};
}

ef__point ef__sheet_at(const ef__sheet *s, double x, double y) {
  const ef__point scale = ef__sheet_scale(s);
  return (ef__point){s->field.left + (x - s->x.from) * scale.x,
                     s->field.bottom + (y - s->y.from) * scale.y};
}

/* ---- Text -------------------------------------------------------------- */

/* Writes a paragraph below *y, in lines `width` wide at most, and moves *y
 * below it. Without a page it only measures. */
static void write_lines(ef__page *page, double x, double *y, double width,
                        ef__lettering lettering, const char *text) {
  while (text != NULL && *text != '\0') {
    const size_t length =
        ef__text_line(text, lettering.size_px, lettering.bold, width);
    char line[512];
    const size_t kept = length < sizeof line ? length : sizeof line - 1;
    memcpy(line, text, kept);
    line[kept] = '\0';
    *y += lettering.size_px * LEADING;
    ef__page_text(page, x, *y - 0.3 * lettering.size_px, lettering, line);
    text += length;
    while (*text == ' ')
      ++text;
  }
}

/* ---- Frame ------------------------------------------------------------- */

static double widest_tick(const ef__axis *axis) {
  double widest = 0.0;
  for (size_t i = 0; i < axis->n; ++i) {
    char text[EF__TICK_TEXT];
    ef__axis_tick(axis, i, text);
    widest = fmax(widest, ef__text_width(text, TICK_PX, false));
  }
  return widest;
}

static size_t row_count(const ef__sheet *s) {
  return s->chart->settings.n_rows;
}

/* Name of a row, cut to what it may take. */
static void row_text(const ef__sheet *s, size_t i, char text[ROW_TEXT]) {
  static const char more[] = "\xE2\x80\xA6";
  const char *name = s->chart->settings.row[i];
  const double room = MOST_NAME * s->page->width_px;
  text[0] = '\0';
  if (name == NULL)
    return;
  size_t kept = strlen(name);
  if (ef__text_width(name, TICK_PX, false) > room || kept >= ROW_TEXT) {
    kept = ef__text_line(name, TICK_PX, false, room - TICK_PX);
    if (kept > ROW_TEXT - sizeof more)
      kept = ROW_TEXT - sizeof more;
    while (kept > 0 && ((unsigned char)name[kept] & 0xC0u) == 0x80u)
      --kept;
  }
  memcpy(text, name, kept);
  strcpy(text + kept, name[kept] == '\0' ? "" : more);
}

static void plan_rows(ef__sheet *s, double top, const double from[2],
                      const double to[2]) {
  double widest = 0.0;
  for (size_t i = 0; i < row_count(s); ++i) {
    char text[ROW_TEXT];
    row_text(s, i, text);
    widest = fmax(widest, ef__text_width(text, TICK_PX, false));
  }
  const double left = PAD + widest + TICK_LENGTH + 5.0;
  const double right = s->page->width_px - PAD - 8.0;
  const double height = ROW_PX * (double)row_count(s);
  s->field = (ef__area){left, top, right, top + height};
  s->x = ef__axis_of(from[0], to[0], right - left, X_TICKS_PX);
  s->y = (ef__axis){.from = from[1], .to = to[1], .n = row_count(s)};
}

/* Chooses field and axes below `top`; the y axis first, since the room that
 * its ticks take decides how wide the field is. */
static void plan_field(ef__sheet *s, double top, double from[2], double to[2]) {
  if (row_count(s) > 0) {
    plan_rows(s, top, from, to);
    return;
  }
  const double right = s->page->width_px - PAD - 8.0;
  double left = PAD + 40.0;
  for (int round = 0; round < 2; ++round) {
    const double width = right - left;
    double height = ASPECT * width;
    if (s->chart->settings.equal_scales) {
      const double wanted = (to[1] - from[1]) / (to[0] - from[0]);
      const double kept = fmin(fmax(wanted, LOWEST), HIGHEST);
      height = kept * width;
      /* Room is given to the axis that is too short for it. */
      const size_t k = wanted < kept ? 1 : 0;
      const double span =
          k == 1 ? kept * (to[0] - from[0]) : (to[1] - from[1]) / kept;
      const double more = 0.5 * (span - (to[k] - from[k]));
      from[k] -= more;
      to[k] += more;
    }
    s->field = (ef__area){left, top, right, top + height};
    s->x = ef__axis_of(from[0], to[0], width, X_TICKS_PX);
    s->y = ef__axis_of(from[1], to[1], height, Y_TICKS_PX);
    left = PAD + widest_tick(&s->y) + TICK_LENGTH + 5.0;
  }
}

/* Value and text of a tick of the y axis: a number, or the name of a row. */
static double y_tick(const ef__sheet *s, size_t i, char text[ROW_TEXT]) {
  if (row_count(s) == 0)
    return ef__axis_tick(&s->y, i, text);
  row_text(s, i, text);
  return (double)i;
}

/* A small cross where ticks meet: the eye can follow them, and nothing is
 * ruled over the points. */
static void draw_crosses(ef__sheet *s) {
  const double arm = 2.5;
  char text[ROW_TEXT];
  ef__page_group(s->page, "");
  for (size_t i = 0; i < s->x.n; ++i) {
    for (size_t j = 0; j < s->y.n; ++j) {
      const ef__point at = ef__sheet_at(s, ef__axis_tick(&s->x, i, text),
                                        y_tick(s, j, text));
      ef__page_move(s->page, at.x - arm, at.y);
      ef__page_line(s->page, at.x + arm, at.y);
      ef__page_move(s->page, at.x, at.y - arm);
      ef__page_line(s->page, at.x, at.y + arm);
    }
  }
  ef__page_paint(s->page, (ef__style){.stroke = EF__INK_FAINT,
                                      .width_px = 1.0,
                                      .fill = EF__INK_NONE});
  ef__page_ungroup(s->page);
}

static const ef__style axis_style = {
    .stroke = EF__INK_SOFT, .width_px = 1.0, .fill = EF__INK_NONE};

static void draw_x_axis(const ef__sheet *s) {
  const ef__lettering lettering = {EF__INK_TEXT, TICK_PX, false,
                                   EF__ANCHOR_MIDDLE, false};
  const double y = s->field.bottom;
  ef__page_group(s->page, "x axis");
  ef__page_move(s->page, s->field.left, y);
  ef__page_line(s->page, s->field.right, y);
  ef__page_paint(s->page, axis_style);
  for (size_t i = 0; i < s->x.n; ++i) {
    char text[EF__TICK_TEXT];
    const double x = ef__sheet_at(s, ef__axis_tick(&s->x, i, text), 0.0).x;
    ef__page_move(s->page, x, y);
    ef__page_line(s->page, x, y + TICK_LENGTH);
    ef__page_paint(s->page, axis_style);
    ef__page_text(s->page, x, y + TICK_LENGTH + TICK_PX + 1.0, lettering, text);
  }
  ef__page_ungroup(s->page);
}

static void draw_y_axis(const ef__sheet *s) {
  const ef__lettering lettering = {EF__INK_TEXT, TICK_PX, false,
                                   EF__ANCHOR_RIGHT, false};
  const double x = s->field.left;
  ef__page_group(s->page, "y axis");
  ef__page_move(s->page, x, s->field.top);
  ef__page_line(s->page, x, s->field.bottom);
  ef__page_paint(s->page, axis_style);
  for (size_t i = 0; i < s->y.n; ++i) {
    char text[ROW_TEXT];
    const double y = ef__sheet_at(s, 0.0, y_tick(s, i, text)).y;
    ef__page_move(s->page, x, y);
    ef__page_line(s->page, x - TICK_LENGTH, y);
    ef__page_paint(s->page, axis_style);
    ef__page_text(s->page, x - TICK_LENGTH - 3.0, y + 0.36 * TICK_PX, lettering,
                  text);
  }
  ef__page_ungroup(s->page);
}

/* ---- Labels ------------------------------------------------------------ */

static double between(double value, double low, double high) {
  return fmin(fmax(value, low), high);
}

static void draw_leader(const ef__sheet *s, const ef__chart_label *label) {
  const ef__point to = {
      between(label->at.x, label->box.left + 2.0, label->box.right - 2.0),
      between(label->at.y, label->box.top + 2.0, label->box.bottom - 2.0)};
  const double dx = to.x - label->at.x, dy = to.y - label->at.y;
  const double length = hypot(dx, dy);
  if (length <= label->gap_px)
    return;
  const double start = label->gap_px / length;
  ef__page_move(s->page, label->at.x + start * dx, label->at.y + start * dy);
  ef__page_line(s->page, to.x, to.y);
  ef__page_paint(s->page, (ef__style){.stroke = EF__INK_SOFT,
                                      .width_px = 0.7,
                                      .fill = EF__INK_NONE});
}

static int frame_last(const void *a, const void *b) {
  const ef__chart_label *left = a, *right = b;
  if (left->ink != right->ink)
    return left->ink == EF__INK_SOFT ? 1 : -1;
  return 0;
}

/* What the data are comes before what they are set in; stable. */
static void sort_labels(ef__sheet *s) {
  for (size_t i = 1; i < s->n_labels; ++i) {
    const ef__chart_label label = s->label[i];
    size_t k = i;
    for (; k > 0 && frame_last(&s->label[k - 1], &label) > 0; --k)
      s->label[k] = s->label[k - 1];
    s->label[k] = label;
  }
}

static void draw_labels(ef__sheet *s) {
  const double height = LABEL_PX * 1.15;
  sort_labels(s);
  ef__place(s->n_labels, s->label, height, s->field, s->n_blocks, s->block,
            s->n_segments, s->segment);
  ef__page_group(s->page, "labels");
  for (size_t i = 0; i < s->n_labels; ++i) {
    const ef__chart_label *label = &s->label[i];
    if (!label->placed)
      continue;
    ++s->report->n_labelled;
    if (label->needs_leader)
      draw_leader(s, label);
    const double x = 0.5 * (label->box.left + label->box.right);
    const double y = label->box.bottom - 0.28 * LABEL_PX;
    ef__page_text(
        s->page, x, y,
        (ef__lettering){label->ink, LABEL_PX, false, EF__ANCHOR_MIDDLE, true},
        label->text);
  }
  ef__page_ungroup(s->page);
}

/* ---- Legend and notes -------------------------------------------------- */

static void legend_text(const ef_series *s, char *text, size_t size) {
  if (s->kind == EF_SERIES_ELLIPSES && s->magnification != 1.0) {
    char times[EF_NUMBER_TEXT];
    ef_number_format(s->magnification, times);
    snprintf(text, size, "%.400s, drawn %s times as large", s->name, times);
  } else {
    snprintf(text, size, "%.400s", s->name);
  }
}

static void draw_legend(ef__sheet *s, double *y) {
  const double sample = 30.0, gap = 18.0;
  const double right = s->page->width_px - PAD;
  double x = PAD;
  bool is_first = true;
  for (size_t i = 0; i < s->chart->n; ++i) {
    const ef_series *series = &s->chart->series[i];
    if (series->name == NULL || series->n == 0)
      continue;
    char text[480];
    legend_text(series, text, sizeof text);
    const double width = sample + ef__text_width(text, BODY_PX, false);
    if (is_first || x + width > right) {
      *y += is_first ? 12.0 : BODY_PX * 1.5;
      x = PAD;
      is_first = false;
    }
    ef__series_sample(s->page, series, x + sample / 2.0 - 2.0, *y + 7.0);
    double below = *y - 3.0;
    write_lines(s->page, x + sample, &below, right - x - sample, body_text,
                text);
    /* What takes more than a line has it to itself. */
    if (x + width > right) {
      *y = below - BODY_PX * LEADING + 3.0;
      x = right;
    } else {
      x += width + gap;
    }
  }
  if (!is_first)
    *y += BODY_PX * 1.5;
}

static void draw_notes(ef__sheet *s, double *y) {
  const ef_chart_report *r = s->report;
  char text[200];
  const double width = s->page->width_px - 2.0 * PAD;
  if (r->n_drawn < r->n_points) {
    snprintf(text, sizeof text,
             "Drawn: %zu of %zu points; the others lie on or beside these, or "
             "outside the axes.",
             r->n_drawn, r->n_points);
    write_lines(s->page, PAD, y, width, soft_text, text);
  }
  if (r->n_labelled < r->n_labels) {
    snprintf(text, sizeof text, "%zu of %zu names found no room.",
             r->n_labels - r->n_labelled, r->n_labels);
    write_lines(s->page, PAD, y, width, soft_text, text);
  }
}

/* ---- The page ---------------------------------------------------------- */

static void draw_field(ef__sheet *s, bool *complete) {
  draw_crosses(s);
  ef__page_clip(s->page, s->field);
  for (size_t i = 0; i < s->chart->n && *complete; ++i)
    *complete = ef__series_draw(s, &s->chart->series[i]);
  draw_labels(s);
  ef__page_unclip(s->page);
  draw_x_axis(s);
  draw_y_axis(s);
}

static bool draw_all(ef__sheet *s, double from[2], double to[2]) {
  const ef_chart_settings *settings = &s->chart->settings;
  ef__page *page = s->page;
  const double width = page->width_px - 2.0 * PAD;
  double y = PAD - 6.0;
  bool complete = true;
  ef__page_rectangle(page, (ef__area){0, 0, page->width_px, 0});
  const size_t paper = page->n_points; /* its height is known at the end */
  ef__page_paint(page, (ef__style){.stroke = EF__INK_NONE,
                                   .fill = EF__INK_PAPER,
                                   .opacity = 1.0});
  write_lines(page, PAD, &y, width, title_text, settings->title);
  write_lines(page, PAD, &y, width, soft_text, settings->subtitle);
  y += 6.0;
  write_lines(page, PAD, &y, width, axis_text, settings->y_title);
  plan_field(s, y + 6.0, from, to);
  draw_field(s, &complete);
  y = s->field.bottom + TICK_LENGTH + TICK_PX + 4.0;
  ef__lettering x_title = axis_text;
  x_title.anchor = EF__ANCHOR_RIGHT;
  write_lines(page, s->field.right, &y, width, x_title, settings->x_title);
  draw_legend(s, &y);
  draw_notes(s, &y);
  page->height_px = ceil(y + PAD - 4.0);
  if (!page->failed) {
    page->point[paper - 1].y = page->height_px;
    page->point[paper - 2].y = page->height_px;
  }
  return complete && !page->failed;
}

ef_status ef__chart_draw(const ef_chart *chart, ef__page *page,
                         ef_chart_report *report, ef_error *error) {
  const ef_chart_settings *settings = &chart->settings;
  const char *about = settings->description != NULL ? settings->description
                      : settings->subtitle != NULL  ? settings->subtitle
                                                    : "";
  *page = (ef__page){.width_px = (double)settings->width_px,
                     .title = settings->title != NULL ? settings->title : "",
                     .description = about};
  *report = (ef_chart_report){.has_text = true};
  double from[2], to[2];
  const ef_status status = ef__chart_range(chart, from, to, error);
  if (status != EF_OK)
    return status;
  ef__sheet sheet = {.chart = chart, .page = page, .report = report};
  const bool complete = draw_all(&sheet, from, to);
  free(sheet.label);
  free(sheet.block);
  free(sheet.segment);
  return complete ? EF_OK : ef__error_memory(error, "a chart");
}
