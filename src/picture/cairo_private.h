/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * cairo, which is loaded at the first use and not linked: linking it would
 * double the time the command needs to start, and most runs draw nothing. */
#ifndef EVENFIELD_PICTURE_CAIRO_PRIVATE_H
#define EVENFIELD_PICTURE_CAIRO_PRIVATE_H

#include <stdbool.h>

#include <cairo-pdf.h>
#include <cairo.h>

/** The calls we use, by their own types and names. */
#define EF__CAIRO_CALLS(CALL)                                                  \
  CALL(cairo_clip)                                                             \
  CALL(cairo_close_path)                                                       \
  CALL(cairo_create)                                                           \
  CALL(cairo_curve_to)                                                         \
  CALL(cairo_destroy)                                                          \
  CALL(cairo_fill_preserve)                                                    \
  CALL(cairo_font_extents)                                                     \
  CALL(cairo_image_surface_create)                                             \
  CALL(cairo_image_surface_get_data)                                           \
  CALL(cairo_image_surface_get_stride)                                         \
  CALL(cairo_line_to)                                                          \
  CALL(cairo_move_to)                                                          \
  CALL(cairo_new_path)                                                         \
  CALL(cairo_paint)                                                            \
  CALL(cairo_pdf_surface_create_for_stream)                                    \
  CALL(cairo_pdf_surface_set_metadata)                                         \
  CALL(cairo_rectangle)                                                        \
  CALL(cairo_restore)                                                          \
  CALL(cairo_save)                                                             \
  CALL(cairo_scale)                                                            \
  CALL(cairo_select_font_face)                                                 \
  CALL(cairo_set_dash)                                                         \
  CALL(cairo_set_font_size)                                                    \
  CALL(cairo_set_line_cap)                                                     \
  CALL(cairo_set_line_join)                                                    \
  CALL(cairo_set_line_width)                                                   \
  CALL(cairo_set_source_rgba)                                                  \
  CALL(cairo_show_text)                                                        \
  CALL(cairo_status)                                                           \
  CALL(cairo_stroke)                                                           \
  CALL(cairo_surface_destroy)                                                  \
  CALL(cairo_surface_finish)                                                   \
  CALL(cairo_surface_flush)                                                    \
  CALL(cairo_surface_status)                                                   \
  CALL(cairo_text_extents)                                                     \
  CALL(cairo_text_path)

typedef struct ef__cairo {
#define EF__CAIRO_FIELD(name) __typeof__(&(name)) name;
  EF__CAIRO_CALLS(EF__CAIRO_FIELD)
#undef EF__CAIRO_FIELD
} ef__cairo;

/** False when libcairo.so.2 is missing or lacks a call. The library stays
 * loaded once it was opened: it and its font libraries keep process-wide caches
 * that do not survive unloading. */
bool ef__cairo_load(ef__cairo *cairo);

#endif
