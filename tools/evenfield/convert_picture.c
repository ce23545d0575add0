/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "convert_picture.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/image.h>

#include "message.h"
#include "record.h"
#include "text.h"
#include "words.h"

typedef struct work {
  const command_options *options;
  const char *from_path, *to_path;
  measure measure;
  ef_profile_settings settings;
  ef_profile *assumed, *to;
  unsigned char *bytes; /* of the profile `to` */
  size_t length;
  ef_picture_settings picture;
  ef_picture_colours colours;
  size_t width, height;
  int bits;
  const char *layout;
  /* What comes out against what was asked for, over all pixels. */
  bool is_judged;
  size_t n_colours, n_pixels, n_noticed, n_beyond;
  int bits_used;
  double mean, worst;
  size_t worst_x, worst_y;
} work;

bool convert_is_picture(const char *path) {
  const size_t n = strlen(path);
  return n > 4 && (strcmp(path + n - 4, ".png") == 0 ||
                   strcmp(path + n - 4, ".PNG") == 0);
}

/* ---- Loading ------------------------------------------------------------- */

static ef_status load_profiles(work *w, ef_error *error) {
  const command_options *o = w->options;
  if (o->from != NULL) {
    w->assumed = profile_file_load(o->from, "from", error);
    if (w->assumed == NULL)
      return error->status;
  }
  const ef_status status =
      profile_file_bytes(o->to, "to", &w->bytes, &w->length, error);
  if (status != EF_OK)
    return status;
  w->to = ef_profile_new(o->to, w->bytes, w->length, error);
  return w->to != NULL ? EF_OK : error->status;
}

static ef_picture *open_picture(work *w, const ef_notes *notes,
                                ef_error *error) {
  w->picture = ef_picture_settings_default();
  w->picture.assumed = w->assumed;
  w->picture.png.notes = notes;
  ef_picture *picture = ef_picture_open(w->from_path, &w->picture, error);
  if (picture == NULL && error->status == EF_NO_ANSWER && w->assumed == NULL) {
    const size_t length = strlen(error->message);
    snprintf(error->message + length, sizeof error->message - length,
             "; --from srgb, or a profile, says what they are");
    error->status = EF_MALFORMED;
  }
  return picture;
}

/* ---- The judgement ------------------------------------------------------- */

typedef struct judge {
  size_t n;
  double *in, *out, *asked, *given;
} judge;

static ef_transform *between(const work *w, const ef_profile *from,
                             const ef_profile *to, ef_error *error) {
  const ef_transform_settings how = {
      .intent = w->settings.intent,
      .black_point_compensation = w->settings.black_point_compensation};
  return ef_transform_new(from, to, &how, error);
}

static ef_status through(const work *w, const ef_profile *from,
                         const ef_profile *to, size_t n, const double *in,
                         double *out, ef_error *error) {
  ef_transform *t = between(w, from, to, error);
  if (t == NULL)
    return error->status;
  const ef_status status =
      ef_transform_apply(t, n, in, w->options->jobs, out, error);
  ef_transform_free(t);
  return status;
}

static void weigh(work *w, const ef_distinct *d, const judge *j) {
  const ef_conditions conditions =
      ef_conditions_default((ef_xyz){96.42, 100.0, 82.49});
  const ef_metric *metric = w->measure.metric;
  double sum = 0.0;
  for (size_t i = 0; i < j->n; ++i) {
    double sample[3], p[3], q[3];
    size_t n, x, y;
    const double *a = j->asked + 3 * i, *b = j->given + 3 * i;
    ef_distinct_at(d, i, sample, &n, &x, &y);
    ef_metric_coordinates(metric, (ef_xyz){a[0], a[1], a[2]}, &conditions, p);
    ef_metric_coordinates(metric, (ef_xyz){b[0], b[1], b[2]}, &conditions, q);
    const double off = ef_metric_difference(metric, p, q);
    sum += off * (double)n;
    w->n_noticed += off > w->measure.jnd ? n : 0;
    w->n_beyond += off > w->measure.tolerance ? n : 0;
    if (i > 0 && !(off > w->worst))
      continue;
    w->worst = off;
    w->worst_x = x;
    w->worst_y = y;
  }
  w->n_pixels = ef_distinct_pixels(d);
  w->mean = sum / (double)w->n_pixels;
}

/* Profiles without a way back leave the conversion without a judgement. */
static ef_status judge_colours(work *w, const ef_profile *from,
                               const ef_distinct *d, ef_error *error) {
  judge j = {.n = ef_distinct_count(d)};
  const size_t n_in = ef_profile_get_info(from).n_channels;
  ef_error late;
  j.in = malloc(j.n * 3 * sizeof *j.in);
  j.out = malloc(j.n * 3 * sizeof *j.out);
  j.asked = malloc(j.n * 3 * sizeof *j.asked);
  j.given = malloc(j.n * 3 * sizeof *j.given);
  ef_status status =
      j.in == NULL || j.out == NULL || j.asked == NULL || j.given == NULL
          ? message_fail(error, EF_NO_MEMORY, "out of memory for colours")
          : EF_OK;
  for (size_t i = 0; status == EF_OK && i < j.n; ++i) {
    double sample[3];
    size_t n, x, y;
    ef_distinct_at(d, i, sample, &n, &x, &y);
    memcpy(j.in + n_in * i, sample, n_in * sizeof *sample);
  }
  if (status == EF_OK)
    status = through(w, from, w->to, j.n, j.in, j.out, error);
  w->is_judged =
      status == EF_OK &&
      through(w, from, NULL, j.n, j.in, j.asked, &late) == EF_OK &&
      through(w, w->to, NULL, j.n, j.out, j.given, &late) == EF_OK;
  if (w->is_judged)
    weigh(w, d, &j);
  free(j.in);
  free(j.out);
  free(j.asked);
  free(j.given);
  return status;
}

static ef_status judge_picture(work *w, const ef_notes *notes,
                               ef_error *error) {
  ef_picture *picture = open_picture(w, notes, error);
  if (picture == NULL)
    return error->status;
  const ef_png_head *head = ef_picture_get_head(picture);
  w->colours = *ef_picture_get_colours(picture);
  w->width = head->width;
  w->height = head->height;
  w->bits = head->bits;
  w->layout = head->layout;
  if (w->assumed != NULL && w->colours.source != EF_PNG_UNTAGGED)
    message_note(notes, "%s: has colour tags of its own; --from is taken in "
                        "their place",
                 w->from_path);
  ef_distinct *d = ef_distinct_of(picture, 0, error);
  ef_status status = d != NULL ? EF_OK : error->status;
  if (status == EF_OK) {
    w->n_colours = ef_distinct_count(d);
    w->bits_used = ef_distinct_bits(d);
    status = judge_colours(w, ef_picture_get_profile(picture), d, error);
  }
  ef_distinct_free(d);
  ef_picture_free(picture);
  return status;
}

/* ---- The picture --------------------------------------------------------- */

static ef_status write_picture(work *w, ef_error *error) {
  const ef_picture_conversion how = {
      .intent = w->settings.intent,
      .black_point_compensation = w->settings.black_point_compensation,
      .jobs = w->options->jobs,
      .overwrite = w->options->force,
      .profile_name = "profile",
      .profile = w->bytes,
      .profile_length = w->length};
  ef_picture *picture = open_picture(w, NULL, error); /* notes were given */
  if (picture == NULL)
    return error->status;
  const ef_status status =
      ef_picture_convert(picture, w->to, w->to_path, &how, error);
  ef_picture_free(picture);
  if (status == EF_EXISTS) {
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file");
    message_place(error, w->to_path);
  }
  return status;
}

/* ---- The report ---------------------------------------------------------- */

static void add_answer(const work *w, text *out) {
  const char *symbol = ef_metric_symbol(w->measure.metric);
  char mean[EF_NUMBER_TEXT], worst[EF_NUMBER_TEXT];
  text t = {0};
  text_format(&t, "Wrote %.300s: %zu x %zu pixels converted to %.200s",
              w->to_path, w->width, w->height, w->options->to);
  if (w->is_judged) {
    words_amount(w->mean, mean);
    words_amount(w->worst, worst);
    text_format(&t, "; %.2f %% of them are more than one JND off what was "
                    "asked for; off by %s %s on average, at worst by %s (pixel "
                    "%zu of row %zu)",
                100.0 * (double)w->n_noticed / (double)w->n_pixels, mean,
                symbol, worst, w->worst_x + 1, w->worst_y + 1);
  }
  text_add(&t, ".");
  text_paragraph(out, &t, 0);
  if (w->options->check && w->is_judged) {
    text_format(&t, "The check %s: %zu of %zu pixels are off by more than the "
                    "tolerance.",
                w->n_beyond > 0 ? "fails" : "holds", w->n_beyond, w->n_pixels);
    text_paragraph(out, &t, 0);
  }
}

static void add_basis(const work *w, text *out) {
  const ef_profile_info info = ef_profile_get_info(w->to);
  text_add(out, "\nWhat this rests on:\n");
  text t = {0};
  text_format(&t, "%s, %s of %d bits; colours from %s", w->from_path, w->layout,
              w->bits, w->colours.about);
  text_label(out, "Picture", &t);
  text_format(&t, "%s, \"%s\": ", w->options->to, info.description);
  profile_file_words(&info, &t);
  text_add(&t, "; in the iCCP chunk of the picture written");
  text_label(out, "To", &t);
  profile_intent_words(w->settings.intent, w->settings.black_point_compensation,
                       &t);
  text_label(out, "Intent", &t);
  if (!w->is_judged)
    return;
  text_format(&t, "%zu distinct colours%s, the colour that each stands for in "
                  "the picture written, by the profile's own way back and "
                  "before it is rounded to codes, against the colour asked for",
              w->n_colours,
              w->bits_used < w->bits ? " (of the leading bits of each sample)"
                                     : "");
  text_label(out, "Off by", &t);
  measure_label(&w->measure, out);
}

static void write_record(record *r, const work *w) {
  record_begin(r, NULL);
  record_text(r, "picture", w->from_path);
  record_text(r, "written", w->to_path);
  record_number(r, "width", (double)w->width);
  record_number(r, "height", (double)w->height);
  record_text(r, "colours_from", w->colours.about);
  record_text(r, "to", w->options->to);
  record_text(r, "intent", ef_intent_name(w->settings.intent));
  record_boolean(r, "scales_black", w->settings.black_point_compensation);
  record_text(r, "metric", ef_metric_name(w->measure.metric));
  record_number(r, "distinct_colours", (double)w->n_colours);
  const double none = (double)NAN;
  const double n = (double)w->n_pixels;
  record_number(r, "share_above_one_jnd",
                w->is_judged ? (double)w->n_noticed / n : none);
  record_number(r, "mean_difference", w->is_judged ? w->mean : none);
  record_number(r, "worst_difference", w->is_judged ? w->worst : none);
  record_number(r, "beyond_tolerance",
                w->is_judged ? (double)w->n_beyond : none);
  record_end(r);
}

static ef_status report_csv(const work *w, ef_output *output,
                            ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record header = record_of_csv(csv, true), r = record_of_csv(csv, false);
  write_record(&header, w);
  write_record(&r, w);
  return ef_csv_finish(csv, error);
}

static ef_status report_json(const work *w, ef_output *output,
                             ef_error *error) {
  ef_json *json = ef_json_new(output, error);
  if (json == NULL)
    return error->status;
  record r = record_of_json(json);
  write_record(&r, w);
  return ef_json_finish(json, error);
}

static ef_status report(const work *w, ef_output *output, ef_error *error) {
  if (w->options->format == FORMAT_CSV)
    return report_csv(w, output, error);
  if (w->options->format == FORMAT_JSON)
    return report_json(w, output, error);
  text out = {0};
  add_answer(w, &out);
  add_basis(w, &out);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

ef_status convert_picture(const command_options *options, ef_output *output,
                          const ef_notes *notes, size_t *n_beyond,
                          ef_error *error) {
  work w = {.options = options,
            .from_path = options->files[1],
            .to_path = options->files[2]};
  ef_status status = measure_load(&w.measure, options, error);
  if (status == EF_OK)
    status = profile_settings_load(options->intent, options->scale_black,
                                   &w.settings, error);
  if (status == EF_OK)
    status = load_profiles(&w, error);
  if (status == EF_OK)
    status = judge_picture(&w, notes, error);
  if (status == EF_OK)
    status = write_picture(&w, error);
  if (status == EF_OK)
    status = report(&w, output, error);
  *n_beyond = w.n_beyond;
  ef_profile_free(w.assumed);
  ef_profile_free(w.to);
  free(w.bytes);
  measure_free(&w.measure);
  return status;
}
