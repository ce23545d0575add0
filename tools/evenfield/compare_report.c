/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare_chart.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "report.h"

enum { NAME_ROOM = 256 };

/* ---- Pictures ---------------------------------------------------------- */

/* A pair in the light in which it differs most, as it would look beside the
 * white of the first one. */
static ef_status set_swatch(const compare_scene *s, const kept_pair *k,
                            char name[NAME_ROOM], ef_swatch *out,
                            ef_error *error) {
  const compared *c = &k->pair;
  const outcome *o = &c->outcome[c->worst];
  const look *at = compare_look_of(s, c->worst);
  double matrix[9];
  const ef_status status =
      ef_adaptation_matrix(EF_ADAPT_CAT16, at->basis.white,
                           s->looks.at[0].basis.white, matrix, error);
  if (status != EF_OK)
    return status;
  snprintf(name, NAME_ROOM, "%.160s, %.80s", c->sample,
           ef_illuminant_name(at->illuminant));
  *out = (ef_swatch){.name = name,
                     .target = ef_xyz_transform(matrix, o->standard),
                     .match = ef_xyz_transform(matrix, o->sample),
                     .shown = !c->beyond,
                     .difference = o->difference};
  return EF_OK;
}

static ef_status add_swatches(const compare_text *t, const compare_scene *s,
                              const report *page, ef_error *error) {
  const size_t n =
      t->n_rows < REPORT_MOST_SWATCHES ? t->n_rows : REPORT_MOST_SWATCHES;
  ef_swatch *swatch = malloc((n + 1) * sizeof *swatch);
  char(*name)[NAME_ROOM] = malloc((n + 1) * sizeof *name);
  ef_status status = EF_OK;
  if (swatch == NULL || name == NULL)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the report");
  for (size_t i = 0; i < n && status == EF_OK; ++i)
    status = set_swatch(s, &t->row[i], name[i], &swatch[i], error);
  if (status == EF_OK) {
    ef_swatch_settings settings = ef_swatch_settings_default();
    settings.white = s->looks.at[0].basis.white;
    settings.width = REPORT_SWATCH_PX;
    settings.difference_symbol = ef_metric_symbol(s->metric);
    ef_report_front(page->page, "Side by side");
    ef_report_paragraph(
        page->page,
        "Each pair in the light in which it differs most: the standard stands "
        "left, the sample right; a striped corner marks a pair beyond the "
        "tolerance. Colours are carried to the first light by CAT16, and the "
        "pictures carry colour tags: they are as good as the screen that shows "
        "them and its profile.");
    const ef_report_halves halves = {"standard", "sample",
                                     "beyond the tolerance"};
    report_swatches(page, n, t->n_rows, swatch, &settings, &halves);
  }
  free(swatch);
  free(name);
  return status;
}

static ef_status add_chart(const compare_text *t, const compare_scene *s,
                           const report *page, diagram_plane plane,
                           const char *title, const char *about,
                           ef_error *error) {
  ef_chart_settings settings = diagram_settings(plane);
  settings.width_px = REPORT_CHART_PX;
  settings.title = title;
  settings.description = about;
  diagram d = {0};
  const ef_status status = compare_chart_draw(t, s, settings, plane, &d, error);
  if (status == EF_OK)
    ef_report_chart(page->page, d.chart);
  diagram_free(&d);
  return status;
}

/* ---- The page ---------------------------------------------------------- */

static ef_status put_all(compare_text *t, const compare_scene *s,
                         const compare_count *count, const report *page,
                         ef_error *error) {
  text out = report_text(page);
  compare_text_add(t, &out, s, count);
  ef_status status = text_flush(&out, error);
  if (status == EF_OK)
    status = add_swatches(t, s, page, error);
  if (status == EF_OK) {
    text about = {0};
    text_add(&about,
             "Each mark is a sample in one light, as it differs from its "
             "standard in the middle: right is redder, left greener, up "
             "yellower, down bluer. A sample whose marks lie far apart from "
             "light to light is metameric to the standard. Its name stands "
             "where it differs most. ");
    if (s->clouds != NULL)
      compare_chart_people_words(&about, s);
    ef_report_front(page->page, "How the samples differ");
    status = add_chart(t, s, page, PLANE_AB, "Colour, lightness apart",
                       about.bytes, error);
    text_free(&about);
  }
  if (status == EF_OK) {
    status = add_chart(t, s, page, PLANE_LC, "Chroma and lightness",
                       "The same pairs: right is more vivid, left duller, up "
                       "lighter, down darker.",
                       error);
  }
  text_free(&out);
  return status;
}

ef_status compare_report_write(compare_text *t, const compare_scene *s,
                               const compare_count *count, ef_error *error) {
  report page;
  ef_status status =
      report_begin(&page, s->options, s->notes,
                   "Evenfield: who will tell these finishes apart?", error);
  if (status == EF_OK) {
    report_input(&page, s->standard_source);
    report_input(&page, s->batch_source);
    page.has_seed = true;
    page.seed = (double)s->told.seed;
    status = put_all(t, s, count, &page, error);
  }
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
