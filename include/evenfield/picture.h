/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Swatches, target beside match, as tagged PNG; and charts as SVG, PDF or
 * PNG. */
#ifndef EVENFIELD_PICTURE_H
#define EVENFIELD_PICTURE_H

#include <evenfield/base.h>
#include <evenfield/colour.h>

#ifdef __cplusplus
extern "C" {
#endif

/** Two colours side by side on one white. */
typedef struct ef_swatch {
  const char *name;  /**< UTF-8 */
  ef_xyz target;     /**< left half */
  ef_xyz match;      /**< right half */
  bool shown;        /**< the match shows the target; false: marked */
  double difference; /**< printed on the sheet, NaN: not printed */
} ef_swatch;

typedef struct ef_swatch_settings {
  ef_xyz white; /**< what both halves are seen against; becomes the
                     picture's white (CAT16) */
  int bits;     /**< 8 or 16 */
  size_t width; /**< pixels of one pair, 64 to 4096 */
  const char *difference_symbol; /**< beside the figure on the sheet */
  bool overwrite;
} ef_swatch_settings;
/** White of D65 with Y = 100, 8 bits, 512 pixels. */
EF_API ef_swatch_settings ef_swatch_settings_default(void);

/** What the writer could not do. */
typedef struct ef_swatch_report {
  size_t n_clipped; /**< halves outside the picture's own encoding */
  bool labelled;    /**< a sheet has its labels: false when no text could be
                         drawn (libcairo.so.2 or a font is missing), and for
                         single pictures, which have none */
} ef_swatch_report;

/** One picture: left half target, right half match, touching (the dividing
 * line is the eye's), twice as wide as high, no frame. A pair that is not
 * `shown` has stripes, dark and light by turns, across the lower outer corner
 * of the match, visible without colour vision.
 * Pixels are ITU-R BT.2020 primaries with the IEC 61966-2-1 curve, tagged by
 * cICP 9/13/0/1 and by an equal ICC profile for viewers without cICP. */
EF_API ef_status ef_swatch_write(const char *path, const ef_swatch *swatch,
                                 const ef_swatch_settings *settings,
                                 ef_swatch_report *report, ef_error *error);
/** All pairs on one sheet with a neutral grey ground (Y = 30), each with its
 * name and difference below and a line that explains the picture at the foot.
 * Text is drawn by libcairo.so.2, which is loaded here and stays loaded; where
 * that fails the sheet has no labels and the report says so. EF_INVALID for
 * more than 2^26 pixels: make `width` smaller. */
EF_API ef_status ef_swatch_write_sheet(const char *path, size_t n,
                                       const ef_swatch *swatches,
                                       const ef_swatch_settings *settings,
                                       ef_swatch_report *report,
                                       ef_error *error);

/* ---- Charts ------------------------------------------------------------ */

/** What the points of a series are. */
typedef enum ef_series_kind {
  EF_SERIES_LINE,      /**< joined in their order; a point that is not finite
                            is a gap */
  EF_SERIES_REGION,    /**< the corners of an area, filled lightly */
  EF_SERIES_MARKS,     /**< a mark at each */
  EF_SERIES_PAIRS,     /**< an open mark, joined to a filled one at to_x, to_y */
  EF_SERIES_ELLIPSES,  /**< centres, see below */
  EF_SERIES_INTERVALS, /**< a mark with a bar from `low` to `high` in y */
  EF_SERIES_SPANS,     /**< the same in x; where a limit is infinite the bar
                            runs to the end of the field, without a cap */
  EF_SERIES_CLOUD      /**< many small dots without labels */
} ef_series_kind;

/** Looks of series: each has a colour, a shape of mark and a pattern of line of
 * its own, so that they differ without colour vision too. */
enum {
  EF_LOOK_FRAME = -1, /**< neutral and plain: what the rest is set in */
  EF_LOOKS = 8
};

/** One series of plain coordinates in the units of the axes. What a kind does
 * not need may be NULL. Points that are not finite are not drawn. */
typedef struct ef_series {
  ef_series_kind kind;
  int look;          /**< 0 to EF_LOOKS - 1, or EF_LOOK_FRAME */
  const char *name;  /**< for the legend; NULL: not there. UTF-8 */
  size_t n;
  const double *x, *y;
  const double *to_x, *to_y; /**< of pairs */
  const double *low, *high;  /**< of intervals and spans */
  /** Of ellipses: half axes in units of the axes (x and y alike), the angle of
   * the major one from x, and how many times as large they are drawn, which the
   * legend says. */
  const double *semi_major, *semi_minor, *angle_deg;
  double magnification;
  /** n labels, NULL for none; an entry may be NULL. At most 200 are placed, all
   * of them where they hide no mark and no other label. */
  const char *const *label;
} ef_series;

/** 1 times as large, no labels, nothing else. */
EF_API ef_series ef_series_default(ef_series_kind kind);

typedef struct ef_chart_settings {
  const char *title;    /**< the question or the answer, NULL: none */
  const char *subtitle; /**< conditions, NULL: none */
  const char *x_title, *y_title; /**< of the axes, with their units */
  const char *description; /**< what the chart shows, for those who do not see
                                it; NULL: the subtitle */
  bool equal_scales;    /**< one unit is as long in x as in y */
  double x_from, x_to;  /**< ends of the axes; NaN: what the series need */
  double y_from, y_to;
  size_t width_px;      /**< 240 to 4000; the height follows */
  /** Names in the place of a scale in y: row i from the top is at y = i, and
   * y_from, y_to and equal_scales do not count. 0: a scale. */
  size_t n_rows;
  const char *const *row;
  bool overwrite;
} ef_chart_settings;
/** 720 wide, own scales, ends by the series. */
EF_API ef_chart_settings ef_chart_settings_default(void);

/** What a drawn chart could not show; it says so itself at its foot. */
typedef struct ef_chart_report {
  size_t n_points, n_drawn;  /**< of clouds, marks, pairs, intervals, spans (frames
                                  apart): the rest is thinned where points lie
                                  on top of each other */
  size_t n_labels, n_labelled;
  bool has_text; /**< false when no text could be drawn: PNG and PDF need
                      libcairo.so.2 with a font, SVG has its text always */
} ef_chart_report;

/** A chart that is put together series by series, the first one lowest. Copies
 * all it is given; free with ef_chart_free. Picture never computes colour: the
 * coordinates are the caller's. */
typedef struct ef_chart ef_chart;
EF_API ef_chart *ef_chart_new(const ef_chart_settings *settings,
                              ef_error *error);
EF_API void ef_chart_free(ef_chart *chart);
/** EF_INVALID for an array that the kind needs and is missing, or a look that
 * there is not. */
EF_API ef_status ef_chart_add(ef_chart *chart, const ef_series *series,
                              ef_error *error);
/** True for names that ef_chart_write knows: *.svg, *.pdf, *.png. */
EF_API bool ef_chart_knows(const char *path);
/** Draws it, whole or not at all. The same chart makes the same bytes (PDF and
 * PNG: with the same cairo and fonts). SVG is written by Evenfield itself with
 * text as text; PDF (3/4 point a unit) and PNG (twice the pixels, tagged as
 * IEC 61966-2-1) by libcairo.so.2, which is loaded here and stays loaded:
 * EF_UNWRITABLE where it is missing. EF_INVALID for another ending, or when no
 * point is finite. `report` may be NULL. */
EF_API ef_status ef_chart_write(const ef_chart *chart, const char *path,
                                ef_chart_report *report, ef_error *error);

/* ---- Reports ----------------------------------------------------------- */

/** One self-contained HTML file: no scripts, nothing fetched. Readable on a
 * telephone, on paper, in dark surroundings and by a screen reader. Parts are
 * written in the order they are given; the file appears whole, at
 * ef_report_close, or not at all. Errors are kept and told there. Texts are
 * plain: markup in them is escaped. */
typedef struct ef_report ef_report;

/** `title` of the document: what was asked. Free with ef_report_close or
 * ef_report_discard. */
EF_API ef_report *ef_report_open(const char *path, const char *title,
                                 bool overwrite, ef_error *error);
/** The heading of the page: one sentence, wherever among the parts it is
 * given. */
EF_API void ef_report_answer(ef_report *report, const char *text);
/** Begins the next section. */
EF_API void ef_report_section(ef_report *report, const char *title);
/** Begins a section that stands before those of ef_report_section, whenever it
 * is given: pictures, mostly. */
EF_API void ef_report_front(ef_report *report, const char *title);
EF_API void ef_report_paragraph(ef_report *report, const char *text);
/** Something to be careful about, set apart. */
EF_API void ef_report_caution(ef_report *report, const char *text);
/** "what it is: this"; those that follow each other make one list. An empty
 * term goes on with the one before. */
EF_API void ef_report_term(ef_report *report, const char *term,
                           const char *text);
/** The same with text that is to be copied: a command, a digest. */
EF_API void ef_report_term_code(ef_report *report, const char *term,
                                const char *text);

/** A column: two lines of head, of which the first may be NULL where that of
 * the column before stands over this one too. */
typedef struct ef_report_column {
  const char *head, *unit;
  bool is_text;
} ef_report_column;

/** `cell` row by row, n_rows x n_columns. `caption` is what the table shows. A
 * first column of text names its rows. Wide tables scroll by themselves. */
EF_API void ef_report_table(ef_report *report, const char *caption,
                            size_t n_columns, const ef_report_column *column,
                            size_t n_rows, const char *const *cell);
/** As SVG with its text as text; title and description of the chart are its
 * text alternative. Draw them some 400 px wide. */
EF_API void ef_report_chart(ef_report *report, const ef_chart *chart);
/** What the halves of a swatch are, and what its striped corner says. */
typedef struct ef_report_halves {
  const char *left, *right, *mark;
} ef_report_halves;

/** One figure for each pair with its name and difference, as tagged PNG. Colours
 * outside the pictures' encoding are counted in `n_clipped` (may be NULL). */
EF_API void ef_report_swatches(ef_report *report, size_t n,
                               const ef_swatch *swatch,
                               const ef_swatch_settings *settings,
                               const ef_report_halves *halves,
                               size_t *n_clipped);
/** Finishes and frees; on failure nothing is left behind. */
EF_API ef_status ef_report_close(ef_report *report, ef_error *error);
/** Drops what was written and frees; NULL is fine. */
EF_API void ef_report_discard(ef_report *report);

/* ---- Maps of differences ------------------------------------------------- */

/** How far a pixel differs, in classes by multiples of a JND: up to a half, 1, 2,
 * 4, 8, and above; the larger the darker, in one hue. */
enum { EF_DIFFERENCE_CLASSES = 6 };
EF_API int ef_difference_class(double jnds);
/** Upper end of a class in JND; infinite for the last. */
EF_API double ef_difference_class_end(int difference_class);

/** Differences to be drawn, row by row. */
typedef struct ef_difference_map {
  size_t width, height;
  double jnd;         /**< one JND, in the unit of the differences */
  const char *symbol; /**< of that unit, for the key */
  /** Gives the differences of row y, borrowed until the next call; rows come
   * from the top, each once. NaN is drawn as no difference. */
  ef_status (*give)(void *cookie, size_t y, const double **value,
                    ef_error *error);
  void *cookie;
} ef_difference_map;

typedef struct ef_difference_map_report {
  size_t factor;    /**< pixels of the map, along a side, for one of the picture:
                         small ones are enlarged */
  bool is_labelled; /**< false: no text could be drawn in the key */
} ef_difference_map_report;

/** The map with its key as PNG in the encoding of IEC 61966-2-1, there whole or
 * not at all. Holds one row at a time. */
EF_API ef_status ef_difference_map_write(const char *path, bool overwrite,
                                         const ef_difference_map *map,
                                         ef_difference_map_report *report,
                                         ef_error *error);

#ifdef __cplusplus
}
#endif

#endif
