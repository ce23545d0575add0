/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "isolate_chart.h"

#include "isolate_contrast.h"
#include "render_isolate.h"
#include "report.h"

static ef_status add_contrasts(const isolate_scene *s, const isolate_result *r,
                               const report *page, contrast_plane plane,
                               const char *title, const char *about,
                               ef_error *error) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = title;
  settings.description = about;
  ef_chart *chart = NULL;
  const ef_status status =
      isolate_contrast_draw(s, r, plane, settings, &chart, error);
  if (status == EF_OK)
    ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  return status;
}

static ef_status add_spectra(const isolate_scene *s, const isolate_result *r,
                             const report *page, ef_error *error) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = REPORT_CHART_PX;
  settings.title = "Spectra";
  settings.description = "What the eye is shown, as the codes show it: the "
                         "background and the ends of the modulation.";
  ef_chart *chart = NULL;
  const ef_status status = isolate_spectra_draw(s, r, settings, &chart, error);
  if (status == EF_OK)
    ef_report_chart(page->page, chart);
  ef_chart_free(chart);
  return status;
}

static ef_status add_charts(const isolate_scene *s, const isolate_result *r,
                            const report *page, ef_error *error) {
  ef_report_front(page->page, "The modulation");
  ef_status status = add_contrasts(
      s, r, page, CONTRAST_LM, "Cone contrasts",
      "Contrasts of the L and M cones along the modulation, in all that the "
      "display could do about this background.",
      error);
  if (status == EF_OK) {
    status = add_contrasts(
        s, r, page, CONTRAST_OPPONENT, "Isoluminant plane",
        "The same as red-green and tritan mechanisms get it (Derrington, "
        "Krauskopf & Lennie 1984): the contrast of L minus that of M, and the "
        "contrast of S minus that of luminance.",
        error);
  }
  return status == EF_OK ? add_spectra(s, r, page, error) : status;
}

ef_status isolate_report_write(const isolate_scene *s, const isolate_result *r,
                               const ef_notes *notes, ef_error *error) {
  report page;
  ef_status status =
      report_begin(&page, s->options, notes,
                   "Evenfield: light that changes chosen receptors", error);
  if (status == EF_OK) {
    text out = report_text(&page);
    report_input(&page, s->display.source);
    page.has_seed = s->people.population != NULL;
    page.seed = (double)s->people.settings.seed;
    isolate_text_add(&out, s, r);
    status = text_flush(&out, error);
    text_free(&out);
  }
  if (status == EF_OK)
    status = add_charts(s, r, &page, error);
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
