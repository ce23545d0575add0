/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_swatch.h"

#include <stdio.h>

#include "dichromat.h"
#include "record.h"
#include "text.h"
#include "words.h"

static void record_pair(record *r, const swatch_scene *s, bool is_seen_by,
                        const picture_pair *pair) {
  record_begin(r, NULL);
  record_text(r, "name", pair->name);
  record_text(r, "picture", pair->file);
  record_boolean(r, s->key, pair->shown);
  record_begin(r, "difference");
  record_text(r, "metric", ef_metric_name(s->metric));
  record_number(r, "value", pair->difference);
  if (is_seen_by)
    record_number(r, "as_drawn", pair->drawn.difference);
  record_end(r);
  if (is_seen_by)
    record_boolean(r, "alike_as_drawn", pair->drawn.shown);
  record_end(r);
}

static ef_status write_csv(const swatch_scene *s,
                           const command_options *options, ef_output *output,
                           ef_error *error) {
  const bool is_seen_by = options->seen_by >= 0;
  const pictures *p = s->pictures;
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record header = record_of_csv(csv, true);
  record_pair(&header, s, is_seen_by, &p->pair[0]);
  for (size_t i = 0; i < p->n; ++i) {
    record row = record_of_csv(csv, false);
    record_pair(&row, s, is_seen_by, &p->pair[i]);
  }
  return ef_csv_finish(csv, error);
}

static ef_status write_json(const swatch_scene *s,
                            const command_options *options, ef_output *output,
                            ef_error *error) {
  const pictures *p = s->pictures;
  ef_json *json = ef_json_new(output, error);
  if (json == NULL)
    return error->status;
  const bool is_seen_by = options->seen_by >= 0;
  ef_json_begin_object(json, NULL);
  ef_json_boolean(json, "demo", s->is_demo);
  if (is_seen_by)
    ef_json_text(json, "seen_by", dichromat_name(options->seen_by));
  ef_json_text(json, "sheet", p->sheet);
  ef_json_boolean(json, "sheet_has_labels", p->labelled);
  ef_json_integer(json, "bits", options->swatch_bits);
  ef_json_integer(json, "clipped_halves", (int64_t)p->n_clipped);
  ef_json_begin_array(json, "pictures");
  for (size_t i = 0; i < p->n; ++i) {
    record row = record_of_json(json);
    record_pair(&row, s, is_seen_by, &p->pair[i]);
  }
  ef_json_end_array(json);
  ef_json_end_object(json);
  return ef_json_finish(json, error);
}

/* ---- Text -------------------------------------------------------------- */

static void add_answer(text *out, const swatch_scene *s,
                       const command_options *options) {
  const pictures *p = s->pictures;
  const bool is_seen_by = options->seen_by >= 0;
  char count[WORDS_ROOM];
  size_t n_marked = 0;
  for (size_t i = 0; i < p->n; ++i)
    n_marked += !p->pair[i].drawn.shown;
  words_count(p->n, "picture", "pictures", count);
  text_format(out, "%s and a sheet are in %.900s", count, p->folder);
  if (is_seen_by) {
    text_format(out, ", as a %s is taken to see them",
                dichromat_name(options->seen_by));
  }
  const char *none =
      is_seen_by ? "no two halves then differ by more than one JND" : s->none;
  const char *some =
      is_seen_by ? "pairs of halves then differ by more than one JND" : s->some;
  if (n_marked == 0) {
    text_format(out, "; %s.\n", none);
  } else {
    text_format(out, "; %zu of %zu %s: the striped corner.\n", n_marked, p->n,
                some);
  }
  if (s->is_demo) {
    text_format(out,
                "No files were named, so this is the built-in demo "
                "(demo:livery on %s).\n",
                s->display);
  }
}

static void add_table(text *out, const swatch_scene *s,
                      const command_options *options) {
  const pictures *p = s->pictures;
  const bool is_seen_by = options->seen_by >= 0;
  char off_by[100];
  snprintf(off_by, sizeof off_by, "Off by, %s", ef_metric_symbol(s->metric));
  text_table t = table_new();
  table_column(&t, "Pair", "", true);
  table_column(&t, s->head[0], s->head[1], true);
  if (is_seen_by) {
    table_column(&t, off_by, "observer", false);
    table_column(&t, NULL, "as drawn", false);
  } else {
    table_column(&t, "Off by", ef_metric_symbol(s->metric), false);
  }
  table_column(&t, "Picture", "", true);
  for (size_t i = 0; i < p->n; ++i) {
    table_cell(&t, p->pair[i].name);
    table_cell(&t, p->pair[i].shown ? "yes" : "no");
    table_number(&t, p->pair[i].difference, 2);
    if (is_seen_by)
      table_number(&t, p->pair[i].drawn.difference, 2);
    table_cell(&t, p->pair[i].file);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

static void add_eyes(text *out, const swatch_scene *s,
                     const command_options *options) {
  text line = {0};
  if (options->seen_by < 0)
    return;
  text_format(&line,
              "a %s, by the projection of Brettel, Vienot & Mollon (1997) on "
              "the cones of observer %s%s: what such eyes take for one colour "
              "is drawn as one. It is a picture of a model and tells nothing "
              "about the eyes of any one person",
              dichromat_name(options->seen_by), s->observer,
              s->cones_borrowed ? ", a fit of the CIE 2006 fundamentals" : "");
  text_label(out, "Seen by", &line);
}

static ef_status write_text(const swatch_scene *s,
                            const command_options *options, ef_output *output,
                            ef_error *error) {
  text out = {0};
  text line = {0};
  add_answer(&out, s, options);
  add_table(&out, s, options);
  text_add(&out, "\nAbout these pictures:\n");
  text_add(&line, s->halves);
  text_label(&out, "Halves", &line);
  add_eyes(&out, s, options);
  text_format(&line,
              "%d bits per channel, BT.2020 primaries with the curve of "
              "IEC 61966-2-1, tagged by cICP 9/13/0/1 and by an ICC profile "
              "that says the same",
              options->swatch_bits);
  text_label(&out, "Colour", &line);
  text_add(&line, s->pictures->sheet);
  text_label(&out, "Sheet", &line);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

ef_status render_swatch(const swatch_scene *s, const command_options *options,
                        ef_output *output, ef_error *error) {
  switch (options->format) {
  case FORMAT_CSV:
    return write_csv(s, options, output, error);
  case FORMAT_JSON:
    return write_json(s, options, output, error);
  default:
    return write_text(s, options, output, error);
  }
}
