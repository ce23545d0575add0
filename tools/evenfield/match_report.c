/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "match_report.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "match_chart.h"
#include "message.h"
#include "other_eyes.h"
#include "render_match.h"
#include "report.h"


struct match_report {
  const ef_notes *notes;
  match_text *text;   /* keeps the rows */
  match_chart *chart; /* keeps the colours */
  other_eyes eyes;
};

match_report *match_report_new(const ef_notes *notes) {
  match_report *r = calloc(1, sizeof *r);
  if (r == NULL)
    return NULL;
  r->notes = notes;
  r->text = match_text_new(NULL);
  r->chart = match_chart_new(NULL, notes);
  if (r->text != NULL && r->chart != NULL)
    return r;
  match_report_free(r);
  return NULL;
}

void match_report_free(match_report *r) {
  if (r == NULL)
    return;
  match_text_free(r->text);
  match_chart_free(r->chart);
  other_eyes_free(&r->eyes);
  free(r);
}

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  (void)self;
  (void)s;
  (void)error;
  return EF_OK;
}

static ef_status collect(void *self, const match_scene *s,
                         const match_rows *rows, ef_error *error) {
  match_report *r = self;
  const match_sink to_text = match_text_sink(r->text);
  const match_sink to_chart = match_chart_sink(r->chart);
  ef_status status = to_text.rows(to_text.self, s, rows, error);
  if (status == EF_OK)
    status = to_chart.rows(to_chart.self, s, rows, error);
  if (status == EF_OK)
    status = other_eyes_look(&r->eyes, s, rows, error);
  return status;
}

/* ---- Pictures ---------------------------------------------------------- */

static ef_status add_swatches(const match_report *r, const match_scene *s,
                              const report *page, ef_error *error) {
  const kept_row *row;
  const size_t n_rows = match_text_rows(r->text, &row);
  const size_t n = n_rows < REPORT_MOST_SWATCHES ? n_rows : REPORT_MOST_SWATCHES;
  ef_swatch *swatch = malloc((n + 1) * sizeof *swatch);
  if (swatch == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the report");
  for (size_t i = 0; i < n; ++i) {
    const ef_match *m = &row[i].match;
    const ef_shown *shown = match_achieved(s, m);
    swatch[i] = (ef_swatch){.name = row[i].name,
                            .target = m->target,
                            .match = shown->xyz,
                            .shown = m->in_gamut,
                            .difference = shown->difference};
  }
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.white = ef_setup_white(s->setup);
  settings.width = REPORT_SWATCH_PX;
  settings.difference_symbol = ef_metric_symbol(s->metric);
  ef_report_section(page->page, "Side by side");
  char words[400];
  snprintf(words, sizeof words,
           "In each picture the target stands left and what is %s stands "
           "right; a striped corner marks a target without an exact match. The "
           "pictures carry colour tags: they are as good as the screen that "
           "shows them and its profile.",
           s->device.kind->words.shown);
  ef_report_paragraph(page->page, words);
  char right[60];
  snprintf(right, sizeof right, "what is %s", s->device.kind->words.shown);
  const ef_report_halves halves = {"target", right, "no exact match"};
  report_swatches(page, n, n_rows, swatch, &settings, &halves);
  free(swatch);
  return EF_OK;
}

static ef_chart_settings chart_settings(diagram_plane plane, const char *title,
                                        const char *about) {
  ef_chart_settings settings = diagram_settings(plane);
  settings.width_px = REPORT_CHART_PX;
  settings.title = title;
  settings.description = about;
  return settings;
}

static ef_status add_chart(const match_report *r, const match_scene *s,
                           const report *page, match_view view,
                           const char *title, const char *about,
                           ef_error *error) {
  const ef_chart_settings settings = chart_settings(view.plane, title, about);
  diagram d = {0};
  const ef_status status =
      match_chart_draw(r->chart, s, &settings, view, &d, error);
  if (status == EF_OK)
    ef_report_chart(page->page, d.chart);
  diagram_free(&d);
  return status;
}

static match_view all_in(diagram_plane plane) {
  return (match_view){plane, (double)NAN, false};
}

/* The gamut where it fails most. */
static ef_status add_section(const match_report *r, const match_scene *s,
                             const match_summary *sum, const report *page,
                             ef_error *error) {
  if (sum->n_in_gamut == sum->n)
    return EF_OK;
  const double L_star =
      ef_xyz_to_lab(sum->worst_miss_target, ef_setup_white(s->setup)).L_star;
  char lightness[EF_NUMBER_TEXT], title[200], about[400];
  ef_number_format_fixed(L_star, 1, lightness);
  snprintf(title, sizeof title, "At the lightness of %.100s",
           sum->worst_miss_name);
  snprintf(about, sizeof about,
           "The gamut cut at L* %s, and the targets within 5 of that "
           "lightness: what lies outside is out of gamut at its own lightness, "
           "whatever other lightnesses could show.",
           lightness);
  return add_chart(r, s, page, (match_view){PLANE_AB, L_star, false}, title,
                   about, error);
}

static ef_status add_people(const match_report *r, const match_scene *s,
                            const report *page, ef_error *error) {
  if (s->seen.people.population == NULL)
    return EF_OK;
  text about = {0};
  match_chart_people_words(&about);
  const ef_chart_settings settings = chart_settings(
      PLANE_PEOPLE, "Shown minus target, person by person", about.bytes);
  diagram d = {0};
  ef_status status =
      match_chart_draw_people(r->chart, s, &settings, &d, error);
  if (status == EF_OK)
    ef_report_chart(page->page, d.chart);
  diagram_free(&d);
  text_free(&about);
  return status;
}

static ef_status add_charts(const match_report *r, const match_scene *s,
                            const match_summary *sum, const report *page,
                            ef_error *error) {
  ef_report_section(page->page, "Where the targets lie");
  text thinned = {0};
  match_chart_thinned_words(&thinned, r->chart);
  if (thinned.bytes != NULL) {
    text_add(&thinned, ".");
    thinned.bytes[0] = 'O'; /* the sentence begins with "of" */
    ef_report_paragraph(page->page, thinned.bytes);
  }
  text_free(&thinned);
  ef_status status = add_chart(
      r, s, page, all_in(PLANE_UV),
      "Chromaticity u\xE2\x80\xB2, v\xE2\x80\xB2",
      "Each target (open mark), joined to the colour shown for it (filled "
      "mark), with the gamut of this setup inside the spectrum locus. Equal "
      "distances are about equally visible, apart from lightness.",
      error);
  if (status == EF_OK) {
    status = add_chart(
        r, s, page, all_in(PLANE_AB), "CIELAB a*, b*",
        "The same in CIELAB as seen beside this setup's white: distance from "
        "the middle is chroma, direction is hue. The outline is the most "
        "chroma the setup has at each hue, at whatever lightness it has it; a "
        "target inside may still be out of gamut at its own lightness.",
        error);
  }
  if (status == EF_OK)
    status = add_section(r, s, sum, page, error);
  if (status == EF_OK) {
    status = add_chart(r, s, page, all_in(PLANE_LC), "CIELAB C*, L*",
                       "Chroma and lightness of the same colours, whatever "
                       "their hue.",
                       error);
  }
  if (status == EF_OK)
    status = add_people(r, s, page, error);
  return status;
}

/* ---- The page ---------------------------------------------------------- */

static ef_status put_all(match_report *r, const match_scene *s,
                         const match_summary *sum, report *page,
                         ef_error *error) {
  text t = report_text(page);
  match_text_answer(r->text, &t, s, sum);
  ef_status status = text_flush(&t, error);
  if (status == EF_OK && ef_observer_dimensions(s->observer) == 3) {
    status = add_swatches(r, s, page, error);
    if (status == EF_OK)
      status = add_charts(r, s, sum, page, error);
  }
  if (status == EF_OK) {
    other_eyes_report(&r->eyes, s, page);
    match_text_rest(r->text, &t, s, sum);
    status = text_flush(&t, error);
  }
  text_free(&t);
  return status;
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  match_report *r = self;
  report page;
  char title[120];
  snprintf(title, sizeof title, "Evenfield: can this %s %s these colours?",
           s->device.kind->words.noun, s->device.kind->words.shows);
  ef_status status = report_begin(&page, s->options, r->notes, title, error);
  if (status == EF_OK) {
    report_input(&page, s->device.source);
    report_input(&page, s->target_source);
    page.has_seed = s->seen.people.population != NULL;
    page.seed = (double)s->seen.people.settings.seed;
    status = put_all(r, s, sum, &page, error);
  }
  if (status == EF_OK)
    status = report_end(&page, error);
  report_free(&page);
  return status;
}

match_sink match_report_sink(match_report *r) {
  return (match_sink){.self = r, .begin = begin, .rows = collect, .end = end};
}
