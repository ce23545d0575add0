/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pages as PDF and PNG by cairo. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "picture/cairo_private.h"
#include "picture/drawing.h"

/* Points of a PDF and pixels of a PNG for one px of the page. */
#define PDF_SCALE 0.75
#define PNG_SCALE 2.0

/* What is drawn with. */
typedef struct brush {
  ef__cairo calls;
  cairo_surface_t *surface;
  cairo_t *context;
  bool has_text;
} brush;

/* ---- Drawing ----------------------------------------------------------- */

static void set_ink(const brush *b, int ink, double opacity) {
  const uint32_t colour = ef__ink_at(ink)->light;
  b->calls.cairo_set_source_rgba(b->context, (colour >> 16 & 255u) / 255.0,
                                 (colour >> 8 & 255u) / 255.0,
                                 (colour & 255u) / 255.0, opacity);
}

static void set_dash(const brush *b, const ef__style *style) {
  const double *length;
  double scaled[EF__DASH_LENGTHS];
  const size_t n = ef__dash_at(style->dash, &length);
  for (size_t i = 0; i < n; ++i)
    scaled[i] = length[i] * style->width_px;
  b->calls.cairo_set_dash(b->context, scaled, (int)n, 0.0);
}

static void make_path(const brush *b, const ef__page *page,
                      const ef__act *act) {
  const ef__cairo *c = &b->calls;
  const ef__point *p = page->point + act->first_point;
  c->cairo_new_path(b->context);
  for (size_t i = 0; i < act->n_steps; ++i) {
    switch (page->step[act->first_step + i]) {
    case 'M':
      c->cairo_move_to(b->context, p->x, p->y);
      ++p;
      break;
    case 'L':
      c->cairo_line_to(b->context, p->x, p->y);
      ++p;
      break;
    case 'C':
      c->cairo_curve_to(b->context, p[0].x, p[0].y, p[1].x, p[1].y, p[2].x,
                        p[2].y);
      p += 3;
      break;
    default:
      c->cairo_close_path(b->context);
    }
  }
}

static void draw_path(const brush *b, const ef__page *page,
                      const ef__act *act) {
  const ef__style *style = &act->style;
  make_path(b, page, act);
  if (style->fill != EF__INK_NONE) {
    set_ink(b, style->fill, style->opacity);
    b->calls.cairo_fill_preserve(b->context);
  }
  if (style->stroke != EF__INK_NONE) {
    set_ink(b, style->stroke, 1.0);
    set_dash(b, style);
    b->calls.cairo_set_line_width(b->context, style->width_px);
    b->calls.cairo_stroke(b->context);
  }
}

static void draw_text(const brush *b, const ef__page *page,
                      const ef__act *act) {
  const ef__cairo *c = &b->calls;
  const char *text = page->text + act->text;
  c->cairo_select_font_face(b->context, "sans-serif", CAIRO_FONT_SLANT_NORMAL,
                            act->lettering.bold ? CAIRO_FONT_WEIGHT_BOLD
                                                : CAIRO_FONT_WEIGHT_NORMAL);
  c->cairo_set_font_size(b->context, act->lettering.size_px);
  cairo_text_extents_t extents = {0};
  c->cairo_text_extents(b->context, text, &extents);
  const double share = act->lettering.anchor == EF__ANCHOR_LEFT     ? 0.0
                       : act->lettering.anchor == EF__ANCHOR_MIDDLE ? 0.5
                                                                    : 1.0;
  const double x = act->at.x - share * extents.x_advance;
  c->cairo_new_path(b->context);
  c->cairo_move_to(b->context, x, act->at.y);
  if (act->lettering.has_edge) {
    set_ink(b, EF__INK_PAPER, 1.0);
    c->cairo_set_line_width(b->context, EF__TEXT_EDGE_PX);
    c->cairo_set_dash(b->context, NULL, 0, 0.0);
    c->cairo_text_path(b->context, text);
    c->cairo_stroke(b->context);
    c->cairo_move_to(b->context, x, act->at.y);
  }
  set_ink(b, act->lettering.ink, 1.0);
  c->cairo_show_text(b->context, text);
}

static void draw_clip(const brush *b, const ef__area *area) {
  const ef__cairo *c = &b->calls;
  c->cairo_save(b->context);
  c->cairo_new_path(b->context);
  c->cairo_rectangle(b->context, area->left, area->top,
                     area->right - area->left, area->bottom - area->top);
  c->cairo_clip(b->context);
}

static void draw_page(brush *b, const ef__page *page, double scale) {
  const ef__cairo *c = &b->calls;
  b->context = c->cairo_create(b->surface);
  c->cairo_scale(b->context, scale, scale);
  c->cairo_set_line_cap(b->context, CAIRO_LINE_CAP_ROUND);
  c->cairo_set_line_join(b->context, CAIRO_LINE_JOIN_ROUND);
  cairo_font_extents_t font = {0};
  c->cairo_font_extents(b->context, &font);
  cairo_text_extents_t letter = {0};
  c->cairo_text_extents(b->context, "A", &letter);
  /* Without any font the measures come back empty. */
  b->has_text = c->cairo_status(b->context) == CAIRO_STATUS_SUCCESS &&
                font.ascent > 0.0 && letter.x_advance > 0.0;
  for (size_t i = 0; i < page->n_acts; ++i) {
    const ef__act *act = &page->act[i];
    if (act->kind == EF__ACT_PATH)
      draw_path(b, page, act);
    else if (act->kind == EF__ACT_TEXT && b->has_text)
      draw_text(b, page, act);
    else if (act->kind == EF__ACT_CLIP)
      draw_clip(b, &act->area);
    else if (act->kind == EF__ACT_UNCLIP)
      c->cairo_restore(b->context);
  }
}

/* ---- Beginning and end ------------------------------------------------- */

static ef_status begin(brush *b, const ef__page *page, ef_error *error) {
  if (page->failed)
    return ef__error_memory(error, "a drawing");
  if (!ef__cairo_load(&b->calls)) {
    return ef__error_set(error, EF_UNWRITABLE,
                         "PDF and PNG are drawn by libcairo.so.2, which is not "
                         "there; install it (Debian: libcairo2) or ask for "
                         "SVG");
  }
  return EF_OK;
}

/* EF_OK when all was drawn. */
static ef_status end(brush *b, ef_error *error) {
  const ef__cairo *c = &b->calls;
  const bool drawn =
      b->context != NULL && c->cairo_status(b->context) == CAIRO_STATUS_SUCCESS;
  if (b->context != NULL)
    c->cairo_destroy(b->context);
  c->cairo_surface_finish(b->surface);
  const bool finished =
      c->cairo_surface_status(b->surface) == CAIRO_STATUS_SUCCESS;
  c->cairo_surface_destroy(b->surface);
  if (drawn && finished)
    return EF_OK;
  return ef__error_set(error, EF_UNWRITABLE, "cairo could not draw it");
}

/* ---- PDF --------------------------------------------------------------- */

typedef struct stream {
  ef_output *output;
  ef_error *error;
  ef_status status;
} stream;

static cairo_status_t write_stream(void *closure, const unsigned char *bytes,
                                   unsigned int length) {
  stream *s = closure;
  if (s->status == EF_OK)
    s->status = ef_output_write(s->output, bytes, length, s->error);
  return s->status == EF_OK ? CAIRO_STATUS_SUCCESS : CAIRO_STATUS_WRITE_ERROR;
}

ef_status ef__page_pdf(const ef__page *page, ef_output *output, bool *has_text,
                       ef_error *error) {
  brush b = {.context = NULL};
  ef_status status = begin(&b, page, error);
  if (status != EF_OK)
    return status;
  stream to = {.output = output, .error = error, .status = EF_OK};
  b.surface = b.calls.cairo_pdf_surface_create_for_stream(
      write_stream, &to, page->width_px * PDF_SCALE,
      page->height_px * PDF_SCALE);
  const ef__cairo *c = &b.calls;
  c->cairo_pdf_surface_set_metadata(b.surface, CAIRO_PDF_METADATA_TITLE,
                                    page->title);
  c->cairo_pdf_surface_set_metadata(b.surface, CAIRO_PDF_METADATA_SUBJECT,
                                    page->description);
  /* What is no date is left out: with one, no two files would be equal. */
  c->cairo_pdf_surface_set_metadata(b.surface, CAIRO_PDF_METADATA_CREATE_DATE,
                                    "none");
  draw_page(&b, page, PDF_SCALE);
  *has_text = b.has_text;
  status = end(&b, error);
  return to.status != EF_OK ? to.status : status;
}

/* ---- PNG --------------------------------------------------------------- */

typedef struct pixels {
  const unsigned char *data;
  size_t stride, width;
} pixels;

/* cairo's 32-bit words hold red, green and blue below an unused byte. */
static void fill_row(void *cookie, size_t y, uint16_t *sample) {
  const pixels *p = cookie;
  for (size_t x = 0; x < p->width; ++x) {
    uint32_t word;
    memcpy(&word, p->data + y * p->stride + 4 * x, sizeof word);
    for (unsigned c = 0; c < 3; ++c)
      sample[3 * x + c] = (uint16_t)((word >> (16 - 8 * c) & 255u) * 257u);
  }
}

/* Code points of ITU-T H.273: primaries of IEC 61966-2-1 (those of BT.709), and
 * its curve. */
enum { PRIMARIES_CODE = 1, TRANSFER_CODE = 13 };

/* With a palette, a fourth of the size; whole colours where that fails. */
static ef_status write_pixels(pixels *p, size_t height, const char *path,
                              bool overwrite, ef_error *error) {
  const ef_png_tags tags = {.primaries = PRIMARIES_CODE,
                            .transfer = TRANSFER_CODE};
  const size_t n = p->width * height;
  ef__png_palette palette;
  unsigned char *index = ef__allocate(n, 1);
  ef_status status;
  if (index != NULL && p->stride == 4 * p->width &&
      ef__palette_of(n, (const uint32_t *)(const void *)p->data, &palette,
                     index)) {
    status = ef__png_write_indexed(path, overwrite, p->width, height, index,
                                   &palette, &tags, error);
  } else {
    const ef_png_rows rows = {.fill = fill_row, .cookie = p};
    status = ef_png_write_rows(path, overwrite, p->width, height, 8, &rows,
                               &tags, error);
  }
  free(index);
  return status;
}

ef_status ef__page_png(const ef__page *page, const char *path, bool overwrite,
                       bool *has_text, ef_error *error) {
  brush b = {.context = NULL};
  ef_status status = begin(&b, page, error);
  if (status != EF_OK)
    return status;
  const double width = ceil(page->width_px * PNG_SCALE);
  const double height = ceil(page->height_px * PNG_SCALE);
  const ef__cairo *c = &b.calls;
  b.surface = c->cairo_image_surface_create(CAIRO_FORMAT_RGB24, (int)width,
                                            (int)height);
  draw_page(&b, page, PNG_SCALE);
  *has_text = b.has_text;
  c->cairo_surface_flush(b.surface);
  pixels p = {.data = c->cairo_image_surface_get_data(b.surface),
              .stride = (size_t)c->cairo_image_surface_get_stride(b.surface),
              .width = (size_t)width};
  if (p.data != NULL && c->cairo_status(b.context) == CAIRO_STATUS_SUCCESS) {
    status = write_pixels(&p, (size_t)height, path, overwrite, error);
  }
  const ef_status drawn = end(&b, status == EF_OK ? error : NULL);
  return status != EF_OK ? status : drawn;
}
