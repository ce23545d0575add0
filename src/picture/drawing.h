/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The drawing layer: what is on a page, as paths and lines of text in px from
 * the upper left corner, and the writers that put it into a file. Charts know
 * nothing of files, writers nothing of charts. */
#ifndef EVENFIELD_PICTURE_DRAWING_H
#define EVENFIELD_PICTURE_DRAWING_H

#include <evenfield/exchange.h>
#include <evenfield/picture.h>

#include "exchange/exchange_private.h"

typedef struct ef__point {
  double x, y;
} ef__point;

typedef struct ef__area {
  double left, top, right, bottom;
} ef__area;

/* ---- Inks (ink.c) ------------------------------------------------------ */

/** What things are drawn with, by meaning; the writers know the colours. */
enum {
  EF__INK_NONE = -1,
  EF__INK_PAPER,
  EF__INK_TEXT,
  EF__INK_SOFT,  /**< axes, frames, second thoughts */
  EF__INK_FAINT, /**< what helps the eye and says nothing */
  EF__INK_LOOK,  /**< the first of EF_LOOKS */
  EF__INKS = EF__INK_LOOK + EF_LOOKS
};

/** Names of stylesheet classes and variables ("paper", "look-1" ...), and the
 * colours on light and on dark paper as 0xRRGGBB. */
typedef struct ef__ink {
  const char *name;
  uint32_t light, dark;
} ef__ink;
const ef__ink *ef__ink_at(int ink);

/** Lengths of stroke and gap in widths of the line; 0 0: drawn through. */
enum { EF__DASHES = 4, EF__DASH_LENGTHS = 4 };
/** Returns how many lengths `dash` has. */
size_t ef__dash_at(int dash, const double **length);

/* ---- Text (lettering.c) ------------------------------------------------ */

/** Copies `text`, which is at most as long, and puts a question mark for bytes
 * that are no UTF-8 or no character of XML, and a blank for control
 * characters. */
void ef__text_clean(char *to, const char *text);
/** Width in px that UTF-8 text of this size takes at most in the usual
 * sans-serif faces. Fixed figures, no font: what is laid out by them is laid
 * out alike everywhere. */
double ef__text_width(const char *text, double size_px, bool bold);
/** Length of the longest beginning of `text` that fits in one line, broken at
 * a blank where there is one; all of it when it fits. At least one
 * character. */
size_t ef__text_line(const char *text, double size_px, bool bold,
                     double width_px);

/* ---- Pages (drawing.c) ------------------------------------------------- */

typedef struct ef__style {
  int stroke; /**< an ink */
  double width_px;
  int dash;
  int fill; /**< an ink */
  double opacity; /**< of the fill */
} ef__style;

typedef enum ef__anchor {
  EF__ANCHOR_LEFT,
  EF__ANCHOR_MIDDLE,
  EF__ANCHOR_RIGHT
} ef__anchor;

typedef struct ef__lettering {
  int ink;
  double size_px;
  bool bold;
  ef__anchor anchor;
  bool has_edge; /**< of paper, so that it can be read over what lies below */
} ef__lettering;

/** Width of the line drawn round letters with an edge. */
#define EF__TEXT_EDGE_PX 3.0

typedef enum ef__act_kind {
  EF__ACT_PATH,
  EF__ACT_TEXT,
  EF__ACT_CLIP,   /**< what follows is cut at `area`, until EF__ACT_UNCLIP */
  EF__ACT_UNCLIP,
  EF__ACT_GROUP,  /**< what follows belongs to the name `text`, until
                       EF__ACT_UNGROUP */
  EF__ACT_UNGROUP
} ef__act_kind;

/** One act of drawing. `step` of a path: M (one point), L (one), C (three: a
 * cubic Bezier), Z (none). */
typedef struct ef__act {
  ef__act_kind kind;
  ef__style style;
  size_t first_step, n_steps, first_point;
  ef__lettering lettering;
  ef__point at;
  size_t text; /**< place in the page's texts */
  ef__area area;
} ef__act;

/** Grows as it is drawn on; without memory it remembers that it failed. */
typedef struct ef__page {
  double width_px, height_px;
  const char *title, *description; /**< borrowed; "" when there is none */
  size_t n_acts, act_room;
  ef__act *act;
  size_t n_steps, step_room;
  char *step;
  size_t n_points, point_room;
  ef__point *point;
  size_t n_text, text_room;
  char *text;
  bool failed;
  size_t path_step, path_point; /**< where the path not yet painted begins */
} ef__page;

void ef__page_free(ef__page *page);
void ef__page_move(ef__page *page, double x, double y);
void ef__page_line(ef__page *page, double x, double y);
void ef__page_curve(ef__page *page, ef__point a, ef__point b, ef__point to);
void ef__page_close(ef__page *page);
/** An ellipse as eight Bezier curves, which are off by less than 5e-6 of its
 * size; their ends lie on it. Axes are half ones, as vectors. */
void ef__page_ellipse(ef__page *page, ef__point center, ef__point major,
                      ef__point minor);
void ef__page_rectangle(ef__page *page, ef__area area);
/** Paints the path so far and begins a new one. */
void ef__page_paint(ef__page *page, ef__style style);
/** `text` is clean; y is its base line. */
void ef__page_text(ef__page *page, double x, double y, ef__lettering lettering,
                   const char *text);
void ef__page_clip(ef__page *page, ef__area area);
void ef__page_unclip(ef__page *page);
void ef__page_group(ef__page *page, const char *name);
void ef__page_ungroup(ef__page *page);

/* ---- Writers ----------------------------------------------------------- */

/** As a document of its own, on light paper; or, where `inline_id` is not NULL,
 * as an element for an HTML page whose stylesheet gives the inks, with ids that
 * begin with it. */
ef_status ef__page_svg(const ef__page *page, const char *inline_id,
                       ef_output *output, ef_error *error);
/** *has_text is false when no font was found. */
ef_status ef__page_pdf(const ef__page *page, ef_output *output, bool *has_text,
                       ef_error *error);
ef_status ef__page_png(const ef__page *page, const char *path, bool overwrite,
                       bool *has_text, ef_error *error);

/* ---- Few colours (palette.c) ------------------------------------------- */

/** Colours that stand for n pixels of 0xRRGGBB (what lies above is passed
 * over), and the place of each pixel's in `index`: exactly where there are no
 * more than the palette holds, else the commonest ones exactly and the others by
 * one next to them. False where there are too many to count, or no memory. */
bool ef__palette_of(size_t n, const uint32_t *pixel, ef__png_palette *palette,
                    unsigned char *index);

#endif
