/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/drawing.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* Room for one more of `*block`, whose entries are `size` bytes. */
static bool grow(ef__page *page, void **block, size_t n, size_t *room,
                 size_t more, size_t size) {
  if (page->failed)
    return false;
  if (more <= *room - n)
    return true;
  const size_t wanted = 2 * *room + more + 64;
  void *grown = ef__reallocate(*block, wanted, size);
  if (grown == NULL) {
    page->failed = true;
    return false;
  }
  *block = grown;
  *room = wanted;
  return true;
}

void ef__page_free(ef__page *page) {
  free(page->act);
  free(page->step);
  free(page->point);
  free(page->text);
  *page = (ef__page){0};
}

static ef__act *add_act(ef__page *page, ef__act_kind kind) {
  static ef__act nowhere;
  void *block = page->act;
  const bool has_room =
      grow(page, &block, page->n_acts, &page->act_room, 1, sizeof *page->act);
  page->act = block;
  ef__act *act = has_room ? &page->act[page->n_acts++] : &nowhere;
  *act = (ef__act){.kind = kind};
  return act;
}

/* ---- Paths ------------------------------------------------------------- */

static void add_step(ef__page *page, char step, size_t n,
                     const ef__point *point) {
  void *steps = page->step, *points = page->point;
  const bool has_room =
      grow(page, &steps, page->n_steps, &page->step_room, 1, 1) &&
      grow(page, &points, page->n_points, &page->point_room, 3,
           sizeof *page->point);
  page->step = steps;
  page->point = points;
  if (!has_room)
    return;
  page->step[page->n_steps++] = step;
  for (size_t i = 0; i < n; ++i)
    page->point[page->n_points++] = point[i];
}

void ef__page_move(ef__page *page, double x, double y) {
  add_step(page, 'M', 1, &(ef__point){x, y});
}

void ef__page_line(ef__page *page, double x, double y) {
  add_step(page, 'L', 1, &(ef__point){x, y});
}

void ef__page_curve(ef__page *page, ef__point a, ef__point b, ef__point to) {
  const ef__point point[3] = {a, b, to};
  add_step(page, 'C', 3, point);
}

void ef__page_close(ef__page *page) {
  add_step(page, 'Z', 0, NULL);
}

static ef__point turned(ef__point center, ef__point major, ef__point minor,
                        double c, double s) {
  return (ef__point){center.x + c * major.x + s * minor.x,
                     center.y + c * major.y + s * minor.y};
}

void ef__page_ellipse(ef__page *page, ef__point center, ef__point major,
                      ef__point minor) {
  enum { PIECES = 8 };
  const double turn = 2.0 * acos(-1.0) / PIECES;
  const double reach = 4.0 / 3.0 * tan(turn / 4.0);
  ef__page_move(page, center.x + major.x, center.y + major.y);
  for (size_t i = 0; i < PIECES; ++i) {
    const double a = turn * (double)i, b = turn * (double)(i + 1);
    const double ca = cos(a), sa = sin(a), cb = cos(b), sb = sin(b);
    ef__page_curve(
        page, turned(center, major, minor, ca - reach * sa, sa + reach * ca),
        turned(center, major, minor, cb + reach * sb, sb - reach * cb),
        turned(center, major, minor, cb, sb));
  }
  ef__page_close(page);
}

void ef__page_rectangle(ef__page *page, ef__area area) {
  ef__page_move(page, area.left, area.top);
  ef__page_line(page, area.right, area.top);
  ef__page_line(page, area.right, area.bottom);
  ef__page_line(page, area.left, area.bottom);
  ef__page_close(page);
}

void ef__page_paint(ef__page *page, ef__style style) {
  ef__act *act = add_act(page, EF__ACT_PATH);
  act->style = style;
  act->first_step = page->path_step;
  act->first_point = page->path_point;
  act->n_steps = page->n_steps - page->path_step;
  page->path_step = page->n_steps;
  page->path_point = page->n_points;
}

/* ---- Text, clips, groups ----------------------------------------------- */

static size_t add_text(ef__page *page, const char *text) {
  void *block = page->text;
  const size_t length = strlen(text) + 1;
  const bool has_room =
      grow(page, &block, page->n_text, &page->text_room, length, 1);
  page->text = block;
  if (!has_room)
    return 0;
  memcpy(page->text + page->n_text, text, length);
  page->n_text += length;
  return page->n_text - length;
}

void ef__page_text(ef__page *page, double x, double y, ef__lettering lettering,
                   const char *text) {
  const size_t place = add_text(page, text);
  ef__act *act = add_act(page, EF__ACT_TEXT);
  act->lettering = lettering;
  act->at = (ef__point){x, y};
  act->text = place;
}

void ef__page_clip(ef__page *page, ef__area area) {
  add_act(page, EF__ACT_CLIP)->area = area;
}

void ef__page_unclip(ef__page *page) {
  add_act(page, EF__ACT_UNCLIP);
}

void ef__page_group(ef__page *page, const char *name) {
  const size_t place = add_text(page, name);
  add_act(page, EF__ACT_GROUP)->text = place;
}

void ef__page_ungroup(ef__page *page) {
  add_act(page, EF__ACT_UNGROUP);
}
