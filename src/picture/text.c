/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Labels drawn by cairo's toy text calls into an 8-bit mask. The library is
 * loaded at the first label, not linked: linking it would double the time the
 * command needs to start, and most runs draw nothing. */
#include "picture/picture_private.h"

#include <dlfcn.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <cairo.h>

#include "base/base_private.h"

/* A function of the loaded library under its own type and name. */
#define LOADED(name) __typeof__(&(name)) name

typedef struct calls {
  LOADED(cairo_image_surface_create);
  LOADED(cairo_image_surface_get_data);
  LOADED(cairo_image_surface_get_stride);
  LOADED(cairo_surface_flush);
  LOADED(cairo_surface_destroy);
  LOADED(cairo_create);
  LOADED(cairo_destroy);
  LOADED(cairo_status);
  LOADED(cairo_select_font_face);
  LOADED(cairo_set_font_size);
  LOADED(cairo_font_extents);
  LOADED(cairo_text_extents);
  LOADED(cairo_move_to);
  LOADED(cairo_show_text);
} calls;

struct ef__pen {
  calls cairo;
  double size_px;
  double ascent_px, line_px;
  cairo_surface_t *surface; /* one pixel, to measure with */
  cairo_t *context;
};

/* The library stays loaded once it was opened: it and its font libraries keep
 * process-wide caches that do not survive unloading. */
static bool load(calls *cairo) {
  void *library = dlopen("libcairo.so.2", RTLD_LAZY | RTLD_LOCAL);
  if (library == NULL)
    return false;
  bool complete = true;
#define LOAD(name)                                                             \
  do {                                                                         \
    void *found = dlsym(library, #name);                                       \
    complete = complete && found != NULL;                                      \
    /* ISO C has no cast from an object to a function pointer; POSIX           \
     * promises that they have one representation. */                          \
    memcpy(&cairo->name, &found, sizeof found);                                \
  } while (false)
  LOAD(cairo_image_surface_create);
  LOAD(cairo_image_surface_get_data);
  LOAD(cairo_image_surface_get_stride);
  LOAD(cairo_surface_flush);
  LOAD(cairo_surface_destroy);
  LOAD(cairo_create);
  LOAD(cairo_destroy);
  LOAD(cairo_status);
  LOAD(cairo_select_font_face);
  LOAD(cairo_set_font_size);
  LOAD(cairo_font_extents);
  LOAD(cairo_text_extents);
  LOAD(cairo_move_to);
  LOAD(cairo_show_text);
#undef LOAD
  return complete;
}

/* A context that draws sans-serif text on a mask of the size given. */
static cairo_t *start(const ef__pen *pen, int width, int height,
                      cairo_surface_t **surface) {
  const calls *cairo = &pen->cairo;
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
  if (!load(&pen->cairo)) {
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

/* Length of the character at `text` in a UTF-8 string; 0 where the bytes are no
 * character. */
static size_t character_length(const char *text) {
  const unsigned char lead = (unsigned char)text[0];
  const size_t length = lead < 0x80u   ? 1
                        : lead < 0xC2u ? 0
                        : lead < 0xE0u ? 2
                        : lead < 0xF0u ? 3
                        : lead < 0xF5u ? 4
                                       : 0;
  for (size_t i = 1; i < length; ++i) {
    if (((unsigned char)text[i] & 0xC0u) != 0x80u)
      return 0;
  }
  return length;
}

/* Copies `text` and puts a question mark for bytes that are no UTF-8, at which
 * cairo would refuse the whole line, and for control characters. */
static void copy_clean(char *to, const char *text) {
  while (*text != '\0') {
    const size_t length = character_length(text);
    if (length == 0 || (unsigned char)text[0] < 0x20u) {
      *to++ = '?';
      ++text;
    } else {
      memcpy(to, text, length);
      to += length;
      text += length;
    }
  }
  *to = '\0';
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
  const calls *cairo = &pen->cairo;
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
  copy_clean(line, text);
  fit(pen, line, (double)box.width);
  const bool drawn = draw_clean(pen, raster, box, line, ink);
  free(line);
  return drawn;
}
