/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Labels drawn by cairo's toy text calls into an 8-bit mask. */
#include "picture/picture_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "picture/cairo_private.h"
#include "picture/drawing.h"

struct ef__pen {
  ef__cairo cairo;
  double size_px;
  double ascent_px, line_px;
  cairo_surface_t *surface; /* one pixel, to measure with */
  cairo_t *context;
};

/* A context that draws sans-serif text on a mask of the size given. */
static cairo_t *start(const ef__pen *pen, int width, int height,
                      cairo_surface_t **surface) {
  const ef__cairo *cairo = &pen->cairo;
  *surface = cairo->cairo_image_surface_create(CAIRO_FORMAT_A8, width, height);
  cairo_t *context = cairo->cairo_create(*surface);
  cairo->cairo_select_font_face(context, "sans-serif", CAIRO_FONT_SLANT_NORMAL,
                                CAIRO_FONT_WEIGHT_NORMAL);
  cairo->cairo_set_font_size(context, pen->size_px);
  return context;
}

ef__pen *ef__pen_new(double size_px) {
  ef__pen *pen = ef__allocate_zeroed(1, sizeof *pen);
  if (pen == NULL)
    return NULL;
  if (!ef__cairo_load(&pen->cairo)) {
    free(pen);
    return NULL;
  }
  pen->size_px = size_px;
  pen->context = start(pen, 1, 1, &pen->surface);
  cairo_font_extents_t font = {0};
  pen->cairo.cairo_font_extents(pen->context, &font);
  pen->ascent_px = font.ascent;
  pen->line_px = font.ascent + font.descent;
  /* Without any font the measures come back empty. */
  const bool usable =
      pen->cairo.cairo_status(pen->context) == CAIRO_STATUS_SUCCESS &&
      pen->line_px > 0.0 && ef__pen_width(pen, "A") > 0.0;
  if (!usable) {
    ef__pen_free(pen);
    return NULL;
  }
  return pen;
}

void ef__pen_free(ef__pen *pen) {
  if (pen == NULL)
    return;
  pen->cairo.cairo_destroy(pen->context);
  pen->cairo.cairo_surface_destroy(pen->surface);
  free(pen);
}

size_t ef__pen_line_height(const ef__pen *pen) {
  return (size_t)ceil(pen->line_px);
}

double ef__pen_width(const ef__pen *pen, const char *text) {
  cairo_text_extents_t extents = {0};
  pen->cairo.cairo_text_extents(pen->context, text, &extents);
  return extents.x_advance;
}

/* Shortens `text`, which has room for an ellipsis, until it fits. */
static void fit(const ef__pen *pen, char *text, double width_px) {
  static const char ellipsis[] = "\xE2\x80\xA6";
  size_t length = strlen(text);
  while (length > 0 && ef__pen_width(pen, text) > width_px) {
    do {
      --length;
    } while (length > 0 && ((unsigned char)text[length] & 0xC0u) == 0x80u);
    memcpy(text + length, ellipsis, sizeof ellipsis);
  }
}

static bool draw_clean(const ef__pen *pen, ef__raster *raster, ef__box box,
                       const char *text, ef__pixel ink) {
  const ef__cairo *cairo = &pen->cairo;
  cairo_surface_t *surface;
  cairo_t *context = start(pen, (int)box.width, (int)box.height, &surface);
  cairo->cairo_move_to(context, 0.0, ceil(pen->ascent_px));
  cairo->cairo_show_text(context, text);
  const bool drawn = cairo->cairo_status(context) == CAIRO_STATUS_SUCCESS;
  cairo->cairo_destroy(context);
  if (drawn) {
    cairo->cairo_surface_flush(surface);
    ef__raster_blend(raster, box, cairo->cairo_image_surface_get_data(surface),
                     (size_t)cairo->cairo_image_surface_get_stride(surface),
                     ink);
  }
  cairo->cairo_surface_destroy(surface);
  return drawn;
}

bool ef__pen_draw(const ef__pen *pen, ef__raster *raster, ef__box box,
                  const char *text, ef__pixel ink) {
  char *line = ef__allocate(strlen(text) + 4, 1);
  if (line == NULL)
    return false;
  ef__text_clean(line, text);
  fit(pen, line, (double)box.width);
  const bool drawn = draw_clean(pen, raster, box, line, ink);
  free(line);
  return drawn;
}
