/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pages as SVG 1.1 (W3C Recommendation, second edition): text stays text, so
 * that it can be read, searched and restyled. */
#include "picture/drawing.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/base_private.h"

/* Thousandths of a unit: a millionth of what an axis spans. */
enum { DECIMALS = 3 };

/* What is written to; the first failure is kept by the output. */
typedef struct writer {
  ef_output *output;
  ef_error *error;
  ef_status status;
  const char *id; /* NULL: a document of its own */
  size_t n_clips;
} writer;

static void put(writer *w, const char *text) {
  if (w->status == EF_OK)
    w->status = ef_output_text(w->output, text, w->error);
}

static void put_number(writer *w, double value) {
  char text[EF_NUMBER_TEXT];
  size_t length = ef_number_format_fixed(value, DECIMALS, text);
  if (strchr(text, '.') != NULL && strpbrk(text, "eni") == NULL) {
    while (text[length - 1] == '0')
      text[--length] = '\0';
    if (text[length - 1] == '.')
      text[--length] = '\0';
  }
  put(w, text);
}

/* ` name="value"` */
static void put_attribute(writer *w, const char *name, double value) {
  put(w, " ");
  put(w, name);
  put(w, "=\"");
  put_number(w, value);
  put(w, "\"");
}

static void put_escaped(writer *w, const char *text) {
  while (*text != '\0' && w->status == EF_OK) {
    const size_t plain = strcspn(text, "&<>\"");
    w->status = ef_output_write(w->output, text, plain, w->error);
    text += plain;
    switch (*text) {
    case '&':
      put(w, "&amp;");
      break;
    case '<':
      put(w, "&lt;");
      break;
    case '>':
      put(w, "&gt;");
      break;
    case '"':
      put(w, "&quot;");
      break;
    default:
      return;
    }
    ++text;
  }
}

/* ` fill="..."`: a colour, or in an HTML page a variable of its stylesheet. */
static void put_ink(writer *w, const char *what, int ink) {
  char text[80];
  if (ink == EF__INK_NONE) {
    snprintf(text, sizeof text, " %s=\"none\"", what);
  } else if (w->id == NULL) {
    snprintf(text, sizeof text, " %s=\"#%06x\"", what,
             (unsigned)ef__ink_at(ink)->light);
  } else {
    snprintf(text, sizeof text, " style=\"%s:var(--%s)\"", what,
             ef__ink_at(ink)->name);
  }
  put(w, text);
}

/* Both inks of a path; an element has one style. */
static void put_inks(writer *w, const ef__style *style) {
  if (w->id == NULL || style->fill == EF__INK_NONE ||
      style->stroke == EF__INK_NONE) {
    put_ink(w, "fill", style->fill);
    if (style->stroke != EF__INK_NONE)
      put_ink(w, "stroke", style->stroke);
    return;
  }
  char text[120];
  snprintf(text, sizeof text, " style=\"fill:var(--%s);stroke:var(--%s)\"",
           ef__ink_at(style->fill)->name, ef__ink_at(style->stroke)->name);
  put(w, text);
}

static void put_dash(writer *w, const ef__style *style) {
  const double *length;
  const size_t n = ef__dash_at(style->dash, &length);
  if (n == 0)
    return;
  put(w, " stroke-dasharray=\"");
  for (size_t i = 0; i < n; ++i) {
    if (i > 0)
      put(w, " ");
    put_number(w, length[i] * style->width_px);
  }
  put(w, "\"");
}

static void put_steps(writer *w, const ef__page *page, const ef__act *act) {
  static const char *const letter[] = {"M", "L", "C", "Z"};
  const ef__point *p = page->point + act->first_point;
  for (size_t i = 0; i < act->n_steps; ++i) {
    const char step = page->step[act->first_step + i];
    const size_t which = (size_t)(strchr("MLCZ", step) - "MLCZ");
    const size_t n = step == 'Z' ? 0 : step == 'C' ? 3 : 1;
    put(w, letter[which]);
    for (size_t k = 0; k < n; ++k) {
      if (k > 0)
        put(w, " ");
      put_number(w, p[k].x);
      put(w, " ");
      put_number(w, p[k].y);
    }
    p += n;
  }
}

static void put_path(writer *w, const ef__page *page, const ef__act *act) {
  put(w, "<path");
  put_inks(w, &act->style);
  if (act->style.fill != EF__INK_NONE && act->style.opacity < 1.0)
    put_attribute(w, "fill-opacity", act->style.opacity);
  if (act->style.stroke != EF__INK_NONE) {
    put_attribute(w, "stroke-width", act->style.width_px);
    put_dash(w, &act->style);
  }
  put(w, " d=\"");
  put_steps(w, page, act);
  put(w, "\"/>\n");
}

static void put_text(writer *w, const ef__page *page, const ef__act *act) {
  static const char *const anchor[] = {"", " text-anchor=\"middle\"",
                                       " text-anchor=\"end\""};
  put(w, "<text");
  put_attribute(w, "x", act->at.x);
  put_attribute(w, "y", act->at.y);
  put_attribute(w, "font-size", act->lettering.size_px);
  if (act->lettering.bold)
    put(w, " font-weight=\"bold\"");
  put(w, anchor[act->lettering.anchor]);
  if (act->lettering.has_edge) {
    put_inks(w, &(ef__style){.fill = act->lettering.ink,
                             .stroke = EF__INK_PAPER});
    put_attribute(w, "stroke-width", EF__TEXT_EDGE_PX);
    put(w, " paint-order=\"stroke\"");
  } else {
    put_ink(w, "fill", act->lettering.ink);
  }
  put(w, ">");
  put_escaped(w, page->text + act->text);
  put(w, "</text>\n");
}

/* Ids are unique in a page that holds several drawings. */
static void put_id(writer *w, const char *what, size_t number) {
  char text[40];
  put(w, w->id != NULL ? w->id : "evenfield");
  snprintf(text, sizeof text, "-%s%zu", what, number);
  put(w, text);
}

static void put_clip(writer *w, const ef__area *area) {
  ++w->n_clips;
  put(w, "<clipPath id=\"");
  put_id(w, "clip", w->n_clips);
  put(w, "\"><rect");
  put_attribute(w, "x", area->left);
  put_attribute(w, "y", area->top);
  put_attribute(w, "width", area->right - area->left);
  put_attribute(w, "height", area->bottom - area->top);
  put(w, "/></clipPath>\n<g clip-path=\"url(#");
  put_id(w, "clip", w->n_clips);
  put(w, ")\">\n");
}

static void put_act(writer *w, const ef__page *page, const ef__act *act) {
  switch (act->kind) {
  case EF__ACT_PATH:
    put_path(w, page, act);
    break;
  case EF__ACT_TEXT:
    put_text(w, page, act);
    break;
  case EF__ACT_CLIP:
    put_clip(w, &act->area);
    break;
  case EF__ACT_GROUP:
    put(w, "<g><title>");
    put_escaped(w, page->text + act->text);
    put(w, "</title>\n");
    break;
  case EF__ACT_UNCLIP:
  case EF__ACT_UNGROUP:
    put(w, "</g>\n");
    break;
  }
}

static void put_size(writer *w, const ef__page *page) {
  put(w, " viewBox=\"0 0 ");
  put_number(w, page->width_px);
  put(w, " ");
  put_number(w, page->height_px);
  put(w, "\" role=\"img\" style=\"font-family:sans-serif;"
         "stroke-linecap:round;stroke-linejoin:round\"");
}

static void put_head(writer *w, const ef__page *page) {
  put(w, "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
         "<svg xmlns=\"http://www.w3.org/2000/svg\" version=\"1.1\"");
  put_attribute(w, "width", page->width_px);
  put_attribute(w, "height", page->height_px);
  put_size(w, page);
  put(w, " aria-labelledby=\"evenfield-title evenfield-about\">\n"
         "<title id=\"evenfield-title\">");
  put_escaped(w, page->title);
  put(w, "</title>\n<desc id=\"evenfield-about\">");
  put_escaped(w, page->description);
  put(w, "</desc>\n");
}

/* The description stands beside it in the page. */
static void put_inline_head(writer *w, const ef__page *page) {
  put(w, "<svg xmlns=\"http://www.w3.org/2000/svg\"");
  put_size(w, page);
  put(w, " aria-label=\"");
  put_escaped(w, page->title);
  put(w, "\">\n");
}

ef_status ef__page_svg(const ef__page *page, const char *inline_id,
                       ef_output *output, ef_error *error) {
  if (page->failed)
    return ef__error_memory(error, "a drawing");
  writer w = {.output = output, .error = error, .id = inline_id};
  if (inline_id == NULL)
    put_head(&w, page);
  else
    put_inline_head(&w, page);
  for (size_t i = 0; i < page->n_acts; ++i)
    put_act(&w, page, &page->act[i]);
  put(&w, "</svg>\n");
  return w.status;
}
