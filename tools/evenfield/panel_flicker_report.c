/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>

#include "message.h"
#include "panel_flicker.h"
#include "panel_rows.h"
#include "report.h"

static ef_status add_people(const panel_flicker *p, const report *page,
                            ef_error *error) {
  const double none = (double)NAN;
  panel_rows r;
  if (!panel_rows_new(&r, p->people.n)) {
    panel_rows_free(&r);
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  }
  for (size_t i = 0; i < p->people.n; ++i) {
    const bool found = p->each[i].status == EF_OK;
    r.name[i] = panel_flicker_name(p, i);
    r.value[i] = found ? p->each[i].weights.ratio
                       : (ef_estimate){none, none, none, none};
  }
  r.title = "How luminance counts the cones";
  r.x_title = "L : M";
  r.about = "Ratio of L to M in each observer's luminance, with its 95 % "
            "interval.";
  r.whole.value = none;
  const ef_status status = panel_rows_report(&r, page, error);
  panel_rows_free(&r);
  return status;
}

ef_status panel_flicker_report_write(const panel_flicker *p,
                                     const ef_notes *notes, ef_error *error) {
  report page;
  ef_status status =
      report_begin(&page, p->options, notes,
                   "Evenfield: what is luminance to each observer?", error);
  if (status == EF_OK) {
    text out = report_text(&page);
    report_input(&page, p->settings_path);
    report_input(&page, p->lights_path);
    panel_flicker_add(&out, p);
    status = text_flush(&out, error);
    text_free(&out);
  }
  if (status == EF_OK) {
    ef_report_front(page.page, "People");
    status = add_people(p, &page, error);
  }
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}
