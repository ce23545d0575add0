/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "ellipse_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "report.h"
#include "text.h"

/* Half of the largest axis, as a share of what the centres span, that can be
 * seen well and leaves room for the others. */
#define EASY_SHARE 0.1
/* What the spectrum locus spans. */
#define LOCUS_SPAN 0.7

/* ---- Planes ------------------------------------------------------------ */

static void set_plane(const ellipse_scene *s, ef_chart_settings *settings) {
  switch (s->frame.space) {
  case EF_SPACE_XY:
    *settings = diagram_settings(PLANE_XY);
    break;
  case EF_SPACE_UV:
    *settings = diagram_settings(PLANE_UV);
    break;
  case EF_SPACE_LAB:
    *settings = diagram_settings(PLANE_AB);
    break;
  case EF_SPACE_MB:
    settings->x_title = "l (MacLeod-Boynton)";
    settings->y_title = "s (MacLeod-Boynton)";
    break;
  case EF_SPACE_CONE:
    settings->x_title = "contrast of L";
    settings->y_title = "contrast of S";
    break;
  case EF_SPACE_CONE_LM:
    settings->x_title = "contrast of L";
    settings->y_title = "contrast of M";
    break;
  }
}

static bool has_locus(const ellipse_scene *s, const ellipse_text *t) {
  const ellipse_row *row;
  size_t n_found = 0;
  for (size_t i = 0; i < ellipse_text_rows(t, &row); ++i)
    n_found += row[i].found;
  return n_found > 1 &&
         (s->frame.space == EF_SPACE_XY || s->frame.space == EF_SPACE_UV);
}

/* ---- Ellipses ---------------------------------------------------------- */

/* Everything a series needs, in one block. */
typedef struct columns {
  size_t n;
  double *x, *y, *major, *minor, *angle;
  const char **label;
} columns;

static bool fill(columns *c, const ellipse_text *t) {
  const ellipse_row *row;
  const size_t n = ellipse_text_rows(t, &row);
  double *block = malloc(5 * (n + 1) * sizeof *block);
  c->label = malloc((n + 1) * sizeof *c->label);
  c->x = block;
  c->n = 0;
  if (block == NULL || c->label == NULL)
    return false;
  c->y = block + n;
  c->major = block + 2 * n;
  c->minor = block + 3 * n;
  c->angle = block + 4 * n;
  for (size_t i = 0; i < n; ++i) {
    if (!row[i].found)
      continue;
    const ef_ellipse *e = &row[i].ellipse;
    c->x[c->n] = e->center[0];
    c->y[c->n] = e->center[1];
    c->major[c->n] = e->semi_major;
    c->minor[c->n] = e->semi_minor;
    c->angle[c->n] = e->angle_deg;
    c->label[c->n++] = row[i].name;
  }
  return true;
}

static void release(columns *c) {
  free(c->x);
  free(c->label);
}

static double span(size_t n, const double *value) {
  double low = value[0], high = value[0];
  for (size_t i = 1; i < n; ++i) {
    low = fmin(low, value[i]);
    high = fmax(high, value[i]);
  }
  return high - low;
}

/* The largest of 1, 2, 5, 10 ... times that leaves them easy to see. */
static double choose_magnification(const columns *c, double least_span) {
  double largest = 0.0;
  for (size_t i = 0; i < c->n; ++i)
    largest = fmax(largest, c->major[i]);
  const double whole =
      fmax(least_span, fmax(span(c->n, c->x), span(c->n, c->y)));
  const double wanted = EASY_SHARE * whole / largest;
  static const double steps[] = {2.0, 2.5, 2.0};
  double times = 1.0;
  for (size_t i = 0; times * steps[i % 3] <= wanted; ++i)
    times *= steps[i % 3];
  return times;
}

static ef_status add_ellipses(diagram *d, const ellipse_scene *s,
                              const columns *c, double least_span,
                              const char *name, ef_error *error) {
  const double asked = s->options->magnification;
  ef_series series = ef_series_default(EF_SERIES_ELLIPSES);
  series.look = 0;
  series.name = name;
  series.n = c->n;
  series.x = c->x;
  series.y = c->y;
  series.semi_major = c->major;
  series.semi_minor = c->minor;
  series.angle_deg = c->angle;
  series.label = c->label;
  series.magnification = !isnan(asked) ? asked
                         : c->n == 1   ? 1.0
                                       : choose_magnification(c, least_span);
  return ef_chart_add(d->chart, &series, error);
}

static ef_status draw(const ellipse_text *t, const ellipse_scene *s,
                      const ef_chart_settings *settings, diagram *out,
                      ef_error *error) {
  const diagram_plane plane =
      s->frame.space == EF_SPACE_UV ? PLANE_UV : PLANE_XY;
  char size[ELLIPSE_SIZE_ROOM], name[ELLIPSE_SIZE_ROOM + 20];
  ellipse_size_words(s, size);
  snprintf(name, sizeof name, "ellipses of %s", size);
  columns c = {0};
  ef_status status = diagram_init(out, settings, plane, s->basis.white, error);
  if (status == EF_OK && !fill(&c, t))
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK && has_locus(s, t))
    status = diagram_add_locus(out, s->observer, error);
  if (status == EF_OK)
    status = add_ellipses(out, s, &c, has_locus(s, t) ? LOCUS_SPAN : 0.0, name,
                          error);
  release(&c);
  return status;
}

/* ---- Files ------------------------------------------------------------- */

ef_status ellipse_chart_write(const ellipse_text *t, const ellipse_scene *s,
                              const ellipse_count *n, const ef_notes *notes,
                              ef_error *error) {
  const ellipse_row *row;
  const size_t n_rows = ellipse_text_rows(t, &row);
  ef_chart_settings settings = ef_chart_settings_default();
  set_plane(s, &settings);
  char size[ELLIPSE_SIZE_ROOM], title[ELLIPSE_SIZE_ROOM + 20];
  ellipse_size_words(s, size);
  snprintf(title, sizeof title, "Ellipses of %s", size);
  text subtitle = {0};
  if (s->from == BASIS_FORMULA)
    text_format(&subtitle, "%s; %s; observer %s, white %s",
                ef_metric_title(s->metric), ellipse_figure_words(s),
                ef_observer_name(s->observer),
                ef_illuminant_name(s->illuminant));
  else
    text_format(&subtitle, "%s", ellipse_source_words(s));
  if (n->n > n_rows)
    text_format(&subtitle, "; the first %zu of %zu colours", n_rows, n->n);
  settings.title = title;
  settings.subtitle = subtitle.bytes;
  settings.overwrite = s->options->force;
  diagram d = {0};
  ef_status status = draw(t, s, &settings, &d, error);
  if (status == EF_OK)
    status = diagram_write(&d, s->options->chart, notes, error);
  diagram_free(&d);
  text_free(&subtitle);
  return status;
}

static ef_status put_all(ellipse_text *t, const ellipse_scene *s,
                         const ellipse_count *n, const report *page,
                         ef_error *error) {
  text out = report_text(page);
  ellipse_text_add(t, &out, s, n);
  ef_status status = text_flush(&out, error);
  if (status == EF_OK) {
    ef_chart_settings settings = ef_chart_settings_default();
    set_plane(s, &settings);
    settings.width_px = REPORT_CHART_PX;
    settings.title = "Ellipses about their centres";
    settings.description =
        "Each ellipse holds the colours that differ from its centre by less "
        "than the size told; the legend says how many times as large they are "
        "drawn.";
    diagram d = {0};
    status = draw(t, s, &settings, &d, error);
    if (status == EF_OK) {
      ef_report_front(page->page, "Where they lie");
      ef_report_chart(page->page, d.chart);
    }
    diagram_free(&d);
  }
  text_free(&out);
  return status;
}

ef_status ellipse_report_write(ellipse_text *t, const ellipse_scene *s,
                               const ellipse_count *n, const ef_notes *notes,
                               ef_error *error) {
  report page;
  ef_status status =
      report_begin(&page, s->options, notes,
                   "Evenfield: how far is just noticeable?", error);
  if (status == EF_OK)
    status = put_all(t, s, n, &page, error);
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
