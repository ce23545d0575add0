/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "picture/picture_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "base/base_private.h"

/* Neutral ground of a sheet, a middling grey on which black text reads well;
 * common practice, no source. */
#define GROUND_Y 30.0

ef_swatch_settings ef_swatch_settings_default(void) {
  /* White of D65, CIE 1931, Y = 100 (x 0.3127, y 0.3290: ITU-R BT.2020-2). */
  const ef_xyz d65 = ef_xyy_to_xyz((ef_xyy){0.3127, 0.3290, 100.0});
  return (ef_swatch_settings){
      .white = d65, .bits = 8, .width = 512, .difference_symbol = ""};
}

/* What a picture is drawn with. */
typedef struct brushes {
  ef__encoder encoder;
  ef__pixel dark, light, ground;
} brushes;

static ef_status check(const ef_swatch_settings *settings, ef_error *error) {
  if (settings->bits != 8 && settings->bits != 16) {
    return ef__error_set(error, EF_INVALID,
                         "a picture has 8 or 16 bits per channel, not %d",
                         settings->bits);
  }
  if (settings->width < 64 || settings->width > 4096) {
    return ef__error_set(error, EF_INVALID,
                         "a pair is 64 to 4096 pixels wide, not %zu",
                         settings->width);
  }
  return EF_OK;
}

static ef_xyz grey(ef_xyz white, double Y) {
  const double share = Y / 100.0;
  return (ef_xyz){white.X * share, white.Y * share, white.Z * share};
}

static ef_status brushes_init(brushes *brush,
                              const ef_swatch_settings *settings,
                              ef_error *error) {
  ef_status status = check(settings, error);
  if (status != EF_OK)
    return status;
  status = ef__encoder_init(&brush->encoder, settings->white, error);
  if (status != EF_OK)
    return status;
  bool clipped = false;
  const ef_xyz white = settings->white;
  brush->dark = ef__encode(&brush->encoder, grey(white, 0.0), &clipped);
  brush->light = ef__encode(&brush->encoder, grey(white, 100.0), &clipped);
  brush->ground = ef__encode(&brush->encoder, grey(white, GROUND_Y), &clipped);
  return EF_OK;
}

/* One half; counts it when its colour lies outside the encoding. */
static void draw_half(const brushes *brush, ef__raster *raster, ef__box box,
                      ef_xyz xyz, ef_swatch_report *report) {
  bool clipped = false;
  ef__raster_fill(raster, box, ef__encode(&brush->encoder, xyz, &clipped));
  if (clipped)
    ++report->n_clipped;
}

static void draw_pair(const brushes *brush, ef__raster *raster, ef__box box,
                      const ef_swatch *swatch, ef_swatch_report *report) {
  const size_t left = box.width / 2;
  const ef__box target = {box.x, box.y, left, box.height};
  const ef__box match = {box.x + left, box.y, box.width - left, box.height};
  draw_half(brush, raster, target, swatch->target, report);
  draw_half(brush, raster, match, swatch->match, report);
  if (!swatch->shown) {
    ef__raster_mark(raster, match, brush->dark, brush->light);
  }
}

static bool is_finite(ef_xyz xyz) {
  return isfinite(xyz.X) && isfinite(xyz.Y) && isfinite(xyz.Z);
}

static ef_status check_swatch(const ef_swatch *swatch, ef_error *error) {
  if (is_finite(swatch->target) && is_finite(swatch->match))
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the pair %s has a tristimulus value that is not finite",
                       swatch->name != NULL ? swatch->name : "without a name");
}

/* Its raster, drawn; sample is released with free(). */
static ef_status draw_swatch(const ef_swatch *swatch,
                             const ef_swatch_settings *settings,
                             ef__raster *raster, ef_swatch_report *report,
                             ef_error *error) {
  *report = (ef_swatch_report){0};
  brushes brush;
  ef_status status = brushes_init(&brush, settings, error);
  if (status == EF_OK)
    status = check_swatch(swatch, error);
  if (status != EF_OK)
    return status;
  const size_t width = settings->width, height = width / 2;
  status = ef__raster_init(raster, width, height, brush.ground, error);
  if (status == EF_OK)
    draw_pair(&brush, raster, (ef__box){0, 0, width, height}, swatch, report);
  return status;
}

ef_status ef_swatch_write(const char *path, const ef_swatch *swatch,
                          const ef_swatch_settings *settings,
                          ef_swatch_report *report, ef_error *error) {
  ef__raster raster = {.sample = NULL};
  ef_status status = draw_swatch(swatch, settings, &raster, report, error);
  if (status == EF_OK) {
    status = ef__raster_write(&raster, path, settings->overwrite,
                              settings->bits, error);
  }
  free(raster.sample);
  return status;
}

ef_status ef__swatch_write_to(ef_output *output, const ef_swatch *swatch,
                              const ef_swatch_settings *settings,
                              ef_swatch_report *report, ef_error *error) {
  ef__raster raster = {.sample = NULL};
  ef_status status = draw_swatch(swatch, settings, &raster, report, error);
  if (status == EF_OK)
    status = ef__raster_write_to(&raster, output, settings->bits, error);
  free(raster.sample);
  return status;
}

/* ---- Sheets ------------------------------------------------------------ */

/* A sheet while it is drawn; measures in pixels. */
typedef struct sheet {
  brushes brush;
  ef__pen *pen; /* NULL: no labels */
  ef__raster raster;
  size_t columns, rows;
  size_t pair_width, pair_height;
  size_t gap;
  size_t line; /* of text; two stand below a pair */
  size_t foot; /* lines of explanation */
  size_t width, height;
} sheet;

/* What the foot explains; on one line, or on as many as there are pieces. */
static const char *const explanation[] = {
    "left half: target", "right half: match", "striped corner: no exact match"};
enum { N_EXPLANATIONS = sizeof explanation / sizeof explanation[0] };

/* Columns that make the sheet about half as wide again as high and fill the
 * last row as well as may be. */
static size_t count_columns(size_t n, size_t cell_width, size_t cell_height) {
  const double wanted =
      ceil(sqrt(1.5 * (double)n * (double)cell_height / (double)cell_width));
  const size_t most = wanted < (double)n ? (size_t)wanted : n;
  const size_t rows = (n + most - 1) / most;
  return (n + rows - 1) / rows;
}

static size_t text_size(size_t pair_width) {
  const size_t size = pair_width / 18;
  return size < 9 ? 9 : size > 28 ? 28 : size;
}

static size_t explanation_step(const sheet *s, size_t i) {
  return (size_t)ceil(ef__pen_width(s->pen, explanation[i])) + 2 * s->line;
}

static size_t foot_lines(const sheet *s) {
  if (s->pen == NULL)
    return 0;
  size_t all = 0;
  for (size_t i = 0; i < N_EXPLANATIONS; ++i) {
    all += explanation_step(s, i);
  }
  return all + 2 * s->gap <= s->width ? 1 : N_EXPLANATIONS;
}

static void plan(sheet *s, size_t n, size_t pair_width) {
  s->pair_width = pair_width;
  s->pair_height = pair_width / 2;
  s->gap = pair_width / 16;
  s->line = s->pen != NULL ? ef__pen_line_height(s->pen) : 0;
  const size_t cell_width = pair_width + s->gap;
  const size_t cell_height = s->pair_height + 2 * s->line + s->gap;
  s->columns = count_columns(n, cell_width, cell_height);
  s->rows = (n + s->columns - 1) / s->columns;
  s->width = s->columns * cell_width + s->gap;
  s->foot = foot_lines(s);
  s->height = s->rows * cell_height + s->gap;
  if (s->foot > 0)
    s->height += s->foot * s->line + s->gap;
}

static bool write_line(sheet *s, size_t x, size_t y, size_t width,
                       const char *text) {
  return ef__pen_draw(s->pen, &s->raster, (ef__box){x, y, width, s->line}, text,
                      s->brush.dark);
}

static bool write_caption(sheet *s, ef__box pair, const ef_swatch *swatch,
                          const char *symbol) {
  const size_t y = pair.y + pair.height;
  const char *name = swatch->name != NULL ? swatch->name : "";
  if (!write_line(s, pair.x, y, pair.width, name))
    return false;
  if (isnan(swatch->difference))
    return true;
  char number[EF_NUMBER_TEXT], caption[128];
  ef_number_format_fixed(swatch->difference, 2, number);
  snprintf(caption, sizeof caption, "%s %s", number, symbol);
  return write_line(s, pair.x, y + s->line, pair.width, caption);
}

static bool write_foot(sheet *s) {
  size_t x = s->gap;
  size_t y = s->height - s->gap - s->foot * s->line;
  for (size_t i = 0; i < N_EXPLANATIONS; ++i) {
    const size_t width = s->width - s->gap - x;
    if (!write_line(s, x, y, width, explanation[i]))
      return false;
    if (s->foot > 1) {
      y += s->line;
    } else {
      x += explanation_step(s, i);
    }
  }
  return true;
}

/* True when every label could be drawn. */
static bool draw_sheet(sheet *s, size_t n, const ef_swatch *swatches,
                       const char *symbol, ef_swatch_report *report) {
  const size_t step_x = s->pair_width + s->gap;
  const size_t step_y = s->pair_height + 2 * s->line + s->gap;
  bool labelled = s->pen != NULL;
  for (size_t i = 0; i < n; ++i) {
    const ef__box pair = {s->gap + i % s->columns * step_x,
                          s->gap + i / s->columns * step_y, s->pair_width,
                          s->pair_height};
    draw_pair(&s->brush, &s->raster, pair, &swatches[i], report);
    labelled = labelled && write_caption(s, pair, &swatches[i], symbol);
  }
  return labelled && write_foot(s);
}

ef_status ef_swatch_write_sheet(const char *path, size_t n,
                                const ef_swatch *swatches,
                                const ef_swatch_settings *settings,
                                ef_swatch_report *report, ef_error *error) {
  *report = (ef_swatch_report){0};
  if (n == 0) {
    return ef__error_set(error, EF_INVALID, "a sheet needs at least one pair");
  }
  sheet page = {0};
  ef_status status = brushes_init(&page.brush, settings, error);
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    status = check_swatch(&swatches[i], error);
  }
  if (status != EF_OK)
    return status;
  page.pen = ef__pen_new((double)text_size(settings->width));
  plan(&page, n, settings->width);
  status = ef__raster_init(&page.raster, page.width, page.height,
                           page.brush.ground, error);
  if (status == EF_OK) {
    const char *symbol = settings->difference_symbol;
    report->labelled =
        draw_sheet(&page, n, swatches, symbol != NULL ? symbol : "", report);
    status = ef__raster_write(&page.raster, path, settings->overwrite,
                              settings->bits, error);
  }
  free(page.raster.sample);
  ef__pen_free(page.pen);
  return status;
}
