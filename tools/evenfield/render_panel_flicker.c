/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdio.h>

#include "message.h"
#include "panel_flicker.h"
#include "panel_words.h"
#include "record.h"
#include "text.h"
#include "words.h"

enum { WEIGHTS_ROOM = 64 };

const char *panel_flicker_name(const panel_flicker *p, size_t who) {
  return p->has_names ? p->people.name[who] : "the observer";
}

/* As --luminance-weights takes them: shares of L and M, all digits. */
static void weights_text(const flicker_person *f, char out[WEIGHTS_ROOM]) {
  char l[EF_NUMBER_TEXT], m[EF_NUMBER_TEXT];
  ef_number_format_fixed(f->weights.l_share.value, 4, l);
  ef_number_format_fixed(1.0 - f->weights.l_share.value, 4, m);
  snprintf(out, WEIGHTS_ROOM, "%s:%s", l, m);
}

static void add_person(text *out, const panel_flicker *p, size_t who) {
  const flicker_person *f = &p->each[who];
  char weights[WEIGHTS_ROOM];
  text line = {0};
  if (f->status != EF_OK) {
    text_format(&line, "%s: no luminance weights: %s.",
                panel_flicker_name(p, who), f->reason);
    text_paragraph(out, &line, 0);
    return;
  }
  weights_text(f, weights);
  text_format(&line, "For %s luminance counts L to M as ",
              panel_flicker_name(p, who));
  panel_add_estimate(&line, f->weights.ratio, "");
  text_format(&line, ": evenfield isolate --luminance-weights %s.", weights);
  text_paragraph(out, &line, 0);
}

/* Few people one by one; many by their range, with the weights in the table. */
static void add_answer(text *out, const panel_flicker *p) {
  enum { MOST_LINES = 3 };
  const flicker_person *least = NULL, *most = NULL;
  for (size_t i = 0; i < p->people.n; ++i) {
    const flicker_person *f = &p->each[i];
    if (f->status != EF_OK || p->people.n <= MOST_LINES) {
      if (p->people.n <= MOST_LINES)
        add_person(out, p, i);
      continue;
    }
    if (least == NULL || f->weights.ratio.value < least->weights.ratio.value)
      least = f;
    if (most == NULL || f->weights.ratio.value > most->weights.ratio.value)
      most = f;
  }
  if (least == NULL)
    return;
  char low[EF_NUMBER_TEXT], high[EF_NUMBER_TEXT];
  text line = {0};
  ef_number_format_fixed(least->weights.ratio.value, 2, low);
  ef_number_format_fixed(most->weights.ratio.value, 2, high);
  text_format(
      &line,
      "In luminance L cones count from %s (%s) to %s times (%s) as much "
      "as M cones among %zu observers; their weights for `evenfield "
      "isolate` stand below.",
      low, panel_flicker_name(p, (size_t)(least - p->each)), high,
      panel_flicker_name(p, (size_t)(most - p->each)), p->people.n);
  text_paragraph(out, &line, 0);
  for (size_t i = 0; i < p->people.n; ++i) {
    if (p->each[i].status != EF_OK)
      add_person(out, p, i);
  }
}

static void add_table(text *out, const panel_flicker *p) {
  text_table t = table_new();
  table_column(&t, "Observer", "", true);
  table_column(&t, "Settings", "", false);
  table_column(&t, "L : M", "", false);
  table_column(&t, "95 %", "from", false);
  table_column(&t, NULL, "to", false);
  table_column(&t, "Scatter of", "a setting, %", false);
  table_column(&t, "--luminance-weights", "", true);
  for (size_t i = 0; i < p->people.n; ++i) {
    const ef_flicker *w = &p->each[i].weights;
    char weights[WEIGHTS_ROOM];
    if (p->each[i].status != EF_OK)
      continue;
    table_cell(&t, panel_flicker_name(p, i));
    table_format(&t, "%zu", w->n);
    table_number(&t, w->ratio.value, 2);
    table_number(&t, w->ratio.low, 2);
    panel_limit_cell(&t, w->ratio.high, 2);
    table_number(&t, 100.0 * w->residual, 1);
    weights_text(&p->each[i], weights);
    table_cell(&t, weights);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

void panel_flicker_add(text *out, const panel_flicker *p) {
  text line = {0};
  add_answer(out, p);
  if (p->is_demo) {
    text_wrap(
        out,
        "No file was named, so this is the built-in demo: six of the crew "
        "turned a green lamp until it flickered least against a red one "
        "(demo:flicker-settings, demo:lab-display).",
        0);
  }
  add_table(out, p);
  text_add(out, "\nWhat this rests on:\n");
  text_format(&line,
              "%s: two lights that alternate look equally bright where they "
              "flicker least; amounts are shares of full drive",
              p->settings_path);
  text_label(out, "Settings", &line);
  text_format(&line, "%s%s", p->lights_path,
              p->has_stray ? "; its column black is stray light, which is in "
                             "every other column and is there all the time"
                           : "");
  text_label(out, "Lights", &line);
  text_format(&line,
              "cone fundamentals of observer %s: L : M holds for these, and "
              "for --observer %s of isolate; S cones have no part in flicker",
              ef_observer_name(p->observer), ef_observer_name(p->observer));
  text_label(out, "Cones", &line);
  text_add(&line, "95 %, Student's t, from the scatter of the settings");
  text_label(out, "Intervals", &line);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out,
            "Flicker can cause seizures in people who are sensitive to it: ask "
            "before, let observers stop at any time, and follow the rules of "
            "your ethics board and local safety codes.",
            0);
}

static ef_status write_text(const panel_flicker *p, ef_output *output,
                            ef_error *error) {
  text out = {0};
  panel_flicker_add(&out, p);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

static void record_estimate(record *r, const char *key, ef_estimate e) {
  record_begin(r, key);
  record_number(r, "value", e.value);
  record_number(r, "se", e.se);
  record_number(r, "low", e.low);
  record_number(r, "high", e.high);
  record_end(r);
}

static void record_person(record *r, const panel_flicker *p, size_t who) {
  const ef_estimate none = {(double)NAN, (double)NAN, (double)NAN, (double)NAN};
  const flicker_person *f = &p->each[who];
  const bool found = f->status == EF_OK;
  char weights[WEIGHTS_ROOM] = "";
  if (found)
    weights_text(f, weights);
  record_begin(r, NULL);
  record_text(r, "observer", p->people.name[who]);
  record_number(r, "n", found ? (double)f->weights.n : (double)NAN);
  record_text(r, "luminance_weights", weights);
  record_estimate(r, "ratio", found ? f->weights.ratio : none);
  record_estimate(r, "l_share", found ? f->weights.l_share : none);
  record_number(r, "residual", found ? f->weights.residual : (double)NAN);
  record_text(r, "reason", f->reason);
  record_end(r);
}

static ef_status write_csv(const panel_flicker *p, ef_output *output,
                           ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record head = record_of_csv(csv, true);
  record_person(&head, p, 0);
  for (size_t i = 0; i < p->people.n; ++i) {
    record r = record_of_csv(csv, false);
    record_person(&r, p, i);
  }
  return ef_csv_finish(csv, error);
}

static ef_status write_json(const panel_flicker *p, ef_output *output,
                            ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "file", p->settings_path);
  ef_json_text(j, "lights", p->lights_path);
  ef_json_text(j, "observer", ef_observer_name(p->observer));
  ef_json_begin_array(j, "people");
  for (size_t i = 0; i < p->people.n; ++i) {
    record r = record_of_json(j);
    record_person(&r, p, i);
  }
  ef_json_end_array(j);
  ef_json_end_object(j);
  return ef_json_finish(j, error);
}

ef_status render_panel_flicker(const panel_flicker *p, ef_output *output,
                               ef_error *error) {
  switch (p->options->format) {
  case FORMAT_CSV:
    return write_csv(p, output, error);
  case FORMAT_JSON:
    return write_json(p, output, error);
  default:
    return write_text(p, output, error);
  }
}
