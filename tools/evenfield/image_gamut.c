/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "image_gamut.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/image.h>
#include <evenfield/match.h>

#include "message.h"
#include "record.h"
#include "text.h"
#include "words.h"

typedef struct work {
  const command_options *options;
  const char *path, *map_path; /* NULL: no map */
  measure measure;
  ef_profile *assumed;
  display display;
  ef_observer *observer;
  ef_setup *setup;
  ef_picture_settings settings;
  ef_picture_colours colours;
  size_t width, height;
  int bits;
  ef_distinct *distinct;
  size_t n_colours, n_pixels;
  float *units; /* miss of each colour in JND, 0: in gamut */
  float *L_star;
  size_t n_out, n_noticed, n_beyond, in_class[EF_MAP_CLASSES];
  double mean_out, worst;
  size_t worst_x, worst_y;
} work;

static ef_picture *open_picture(work *w, const ef_notes *notes,
                                ef_error *error) {
  w->settings = ef_picture_settings_default();
  w->settings.assumed = w->assumed;
  w->settings.png.notes = notes;
  ef_picture *picture = ef_picture_open(w->path, &w->settings, error);
  if (picture == NULL && error->status == EF_NO_ANSWER && w->assumed == NULL) {
    const size_t length = strlen(error->message);
    snprintf(error->message + length, sizeof error->message - length,
             "; --assume srgb, or a profile, says what they are");
    error->status = EF_MALFORMED;
  }
  return picture;
}

static ef_status load(work *w, const ef_notes *notes, ef_error *error) {
  const command_options *o = w->options;
  ef_status status = measure_load(&w->measure, o, error);
  if (status == EF_OK && isnan(w->measure.jnd))
    return message_fail(error, EF_UNKNOWN_NAME,
                        "no JND is published for %s: give one with --jnd",
                        ef_metric_title(w->measure.metric));
  if (status == EF_OK && o->assume != NULL) {
    w->assumed = profile_file_load(o->assume, "assume", error);
    if (w->assumed == NULL)
      return error->status;
  }
  if (status == EF_OK)
    status = display_load(o, w->measure.metric, notes, &w->display, error);
  if (status != EF_OK)
    return status;
  if (ef_device_n_drives(w->display.device) != 3) {
    message_fail(error, EF_MALFORMED,
                 "has %zu primaries; a picture is judged for three",
                 ef_device_n_drives(w->display.device));
    return message_place(error, w->display.source);
  }
  w->observer = ef_observer_new("cie-1931", error);
  if (w->observer != NULL)
    w->setup = ef_setup_new(w->display.device, w->observer, NULL, notes, error);
  return w->setup != NULL ? EF_OK : error->status;
}

static ef_status count_colours(work *w, ef_picture *picture, ef_error *error) {
  const ef_png_head *head = ef_picture_get_head(picture);
  w->colours = *ef_picture_get_colours(picture);
  w->width = head->width;
  w->height = head->height;
  w->bits = head->bits;
  w->distinct = ef_distinct_of(picture, 0, error);
  if (w->distinct == NULL)
    return error->status;
  w->n_colours = ef_distinct_count(w->distinct);
  w->n_pixels = ef_distinct_pixels(w->distinct);
  w->units = calloc(w->n_colours, sizeof *w->units);
  w->L_star = calloc(w->n_colours, sizeof *w->L_star);
  return w->units != NULL && w->L_star != NULL
             ? EF_OK
             : message_fail(error, EF_NO_MEMORY, "out of memory for colours");
}

/* Colours of the connection space, white D50, to the display's white by
 * Bradford, which took them there: the picture's white comes out as it. */
static ef_status set_adaptation(const work *w, double matrix[9],
                                ef_error *error) {
  return ef_adaptation_matrix(EF_ADAPT_BRADFORD, (ef_xyz){96.42, 100.0, 82.49},
                              ef_setup_white(w->setup), matrix, error);
}

/* Shares of the white that the colour of a pixel is known to: profiles keep
 * theirs in steps of 1.5e-5 (s15Fixed16Number, ICC.1), of which a pixel gets the
 * sum of three, and tables of 16 bits are as near as a setup on one takes them
 * to be (ef_setup_resolution). */
static const double picture_resolution = 1e-4;

/* A picture made for this display must not be said to leave its gamut. */
static bool is_shown(const work *w, const ef_match *match) {
  const double setup = ef_setup_resolution(w->setup);
  const double least =
      100.0 * (setup > picture_resolution ? setup : picture_resolution);
  const ef_xyz a = match->target, b = match->nearest.xyz;
  return match->in_gamut ||
         (fabs(a.X - b.X) <= least && fabs(a.Y - b.Y) <= least &&
          fabs(a.Z - b.Z) <= least);
}

static void add_up(work *w, size_t i, const ef_match *match) {
  double sample[3];
  size_t n, x, y;
  ef_distinct_at(w->distinct, i, sample, &n, &x, &y);
  const bool shown = is_shown(w, match);
  const double miss = shown ? 0.0 : match->nearest.difference;
  w->units[i] = (float)(miss / w->measure.jnd);
  w->n_out += shown ? 0 : n;
  w->mean_out += miss * (double)n;
  w->n_noticed += miss > w->measure.jnd ? n : 0;
  w->n_beyond += miss > w->measure.tolerance ? n : 0;
  if (!(miss > w->worst))
    return;
  w->worst = miss;
  w->worst_x = x;
  w->worst_y = y;
}

enum { BLOCK = 4096 };

typedef struct room {
  double in[3 * BLOCK], xyz[3 * BLOCK];
  ef_match match[BLOCK];
} room;

static ef_status judge_block(work *w, const ef_transform *to_xyz, size_t begin,
                             size_t n, const double adapt[9], room *r,
                             ef_error *error) {
  const size_t n_in = ef_transform_inputs(to_xyz);
  const ef_match_settings settings = {.metric = w->measure.metric,
                                      .jnd = w->measure.jnd};
  for (size_t i = 0; i < n; ++i) {
    double sample[3];
    size_t count, x, y;
    ef_distinct_at(w->distinct, begin + i, sample, &count, &x, &y);
    memcpy(r->in + n_in * i, sample, n_in * sizeof *sample);
  }
  ef_status status =
      ef_transform_apply(to_xyz, n, r->in, w->options->jobs, r->xyz, error);
  for (size_t i = 0; status == EF_OK && i < n; ++i) {
    double *v = r->xyz + 3 * i;
    const ef_xyz d50 = {v[0], v[1], v[2]};
    const ef_xyz white = {96.42, 100.0, 82.49};
    w->L_star[begin + i] = (float)ef_xyz_to_lab(d50, white).L_star;
    const ef_xyz at = ef_xyz_transform(adapt, d50);
    v[0] = at.X;
    v[1] = at.Y;
    v[2] = at.Z;
  }
  if (status == EF_OK)
    status = ef_match_batch(w->setup, n, r->xyz, &settings, w->options->jobs,
                            r->match, error);
  for (size_t i = 0; status == EF_OK && i < n; ++i)
    add_up(w, begin + i, &r->match[i]);
  return status;
}

static ef_status judge(work *w, const ef_profile *profile, ef_error *error) {
  const ef_transform_settings how = {.intent = EF_INTENT_RELATIVE};
  double adapt[9];
  ef_transform *to_xyz = ef_transform_new(profile, NULL, &how, error);
  if (to_xyz == NULL)
    return error->status;
  room *r = malloc(sizeof *r);
  ef_status status =
      r == NULL ? message_fail(error, EF_NO_MEMORY, "out of memory for colours")
                : set_adaptation(w, adapt, error);
  message_progress progress = message_progress_start(w->options->quiet);
  for (size_t i = 0; status == EF_OK && i < w->n_colours; i += BLOCK) {
    const size_t left = w->n_colours - i;
    status = judge_block(w, to_xyz, i, left < BLOCK ? left : BLOCK, adapt, r,
                         error);
    message_progress_show(&progress, i);
  }
  message_progress_end(&progress);
  w->mean_out = w->n_out > 0 ? w->mean_out / (double)w->n_out : 0.0;
  free(r);
  ef_transform_free(to_xyz);
  return status;
}

static void count_classes(work *w) {
  memset(w->in_class, 0, sizeof w->in_class);
  for (size_t i = 0; i < w->n_colours; ++i) {
    double sample[3];
    size_t n, x, y;
    ef_distinct_at(w->distinct, i, sample, &n, &x, &y);
    w->in_class[ef_map_class((double)w->units[i])] += n;
  }
}

/* ---- The map ------------------------------------------------------------- */

typedef struct painter {
  const work *w;
  ef_picture *picture;
} painter;

static ef_status paint(void *cookie, size_t y, uint16_t *sample,
                       ef_error *error) {
  painter *p = cookie;
  bool has_row;
  const ef_status status =
      ef_picture_next_row(p->picture, sample, &has_row, error);
  for (size_t x = 0; status == EF_OK && x < p->w->width; ++x) {
    const size_t i = ef_distinct_find(p->w->distinct, sample + 3 * x);
    const uint16_t grey = ef_map_sample(
        ef_map_class((double)p->w->units[i]), (double)p->w->L_star[i], x, y);
    sample[3 * x] = sample[3 * x + 1] = sample[3 * x + 2] = grey;
  }
  return status;
}

static ef_status write_map(work *w, ef_error *error) {
  if (w->map_path == NULL)
    return EF_OK;
  painter p = {w, open_picture(w, NULL, error)};
  if (p.picture == NULL)
    return error->status;
  const ef_png_rows painted = {.give = paint, .cookie = &p};
  const ef_png_tags tags = {.primaries = 1, .transfer = 13};
  const ef_status status =
      ef_png_write_rows(w->map_path, w->options->force, w->width, w->height, 8,
                        &painted, &tags, error);
  ef_picture_free(p.picture);
  if (status == EF_EXISTS) {
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file");
    message_place(error, w->map_path);
  }
  return status;
}

/* ---- The report ---------------------------------------------------------- */

static double share(const work *w, size_t n) {
  return 100.0 * (double)n / (double)w->n_pixels;
}

static void add_answer(const work *w, text *out) {
  const char *symbol = ef_metric_symbol(w->measure.metric);
  char mean[EF_NUMBER_TEXT], worst[EF_NUMBER_TEXT];
  text t = {0};
  if (w->n_out == 0) {
    text_format(&t, "This display can show every pixel of %.300s.", w->path);
  } else {
    words_amount(w->mean_out, mean);
    words_amount(w->worst, worst);
    text_format(&t, "This display cannot show %.2f %% of the pixels of %.300s; "
                    "its nearest colours are off by %s %s on average of those, "
                    "at worst by %s (%.1f JND, pixel %zu of row %zu). By more "
                    "than one JND it misses %.2f %% of all pixels.",
                share(w, w->n_out), w->path, mean, symbol, worst,
                w->worst / w->measure.jnd, w->worst_x + 1, w->worst_y + 1,
                share(w, w->n_noticed));
  }
  text_paragraph(out, &t, 0);
  if (!w->options->check)
    return;
  char tolerance[EF_NUMBER_TEXT];
  ef_number_format(w->measure.tolerance, tolerance);
  text_format(&t, "The check %s: %.2f %% of the pixels are off by more than the "
                  "tolerance of %s %s.",
              w->n_beyond > 0 ? "fails" : "holds", share(w, w->n_beyond),
              tolerance, symbol);
  text_paragraph(out, &t, 0);
}

static void add_classes(const work *w, text *out) {
  static const char *const ranges[EF_MAP_CLASSES] = {
      "shown, or off by up to 1 JND", "1 to 3 JND", "3 to 6 JND",
      "more than 6 JND"};
  text_table t = table_new();
  table_column(&t, "Nearest colour", "off by", true);
  table_column(&t, "Pixels", "%", false);
  if (w->map_path != NULL)
    table_column(&t, "On the map", "", true);
  for (int k = 0; k < EF_MAP_CLASSES; ++k) {
    table_cell(&t, ranges[k]);
    table_number(&t, share(w, w->in_class[k]), 2);
    if (w->map_path != NULL)
      table_cell(&t, ef_map_class_text(k));
  }
  text_add(out, "\n");
  table_finish(&t, out);
  if (w->map_path == NULL)
    return;
  text m = {0};
  text_format(&m, "The map is %.300s: the picture in pale grey, its lightness "
                  "kept, black lines over what the display misses.",
              w->map_path);
  text_add(out, "\n");
  text_paragraph(out, &m, 0);
}

static void add_basis(const work *w, text *out) {
  text t = {0};
  text_add(out, "\nWhat this rests on:\n");
  text_format(&t, "%s, %zu x %zu pixels, %zu distinct colours%s; colours from "
                  "%s",
              w->path, w->width, w->height, w->n_colours,
              ef_distinct_bits(w->distinct) < w->bits
                  ? " (of the leading bits of each sample)"
                  : "",
              w->colours.about);
  text_label(out, "Picture", &t);
  text_format(&t, "%s (%s), known from %s", ef_device_name(w->display.device),
              w->display.source, display_origin_text(w->display.origin));
  text_label(out, "Display", &t);
  text_add(&t, "the picture's white goes to the display's by linear Bradford; "
               "intent relative, observer CIE 1931");
  text_label(out, "White", &t);
  measure_label(&w->measure, out);
  text_add(&t, "each pixel is judged by itself: how large and how near each "
               "other they are, and what stands around, is not asked");
  text_label(out, "Not known", &t);
}

static void write_record(record *r, const work *w) {
  static const char *const names[EF_MAP_CLASSES] = {"to_1_jnd", "to_3_jnd",
                                                    "to_6_jnd", "above_6_jnd"};
  double shares[EF_MAP_CLASSES];
  for (int k = 0; k < EF_MAP_CLASSES; ++k)
    shares[k] = share(w, w->in_class[k]) / 100.0;
  record_begin(r, NULL);
  record_text(r, "picture", w->path);
  record_number(r, "width", (double)w->width);
  record_number(r, "height", (double)w->height);
  record_text(r, "colours_from", w->colours.about);
  record_text(r, "display", w->display.source);
  record_text(r, "metric", ef_metric_name(w->measure.metric));
  record_number(r, "jnd", w->measure.jnd);
  record_number(r, "distinct_colours", (double)w->n_colours);
  record_number(r, "share_out_of_gamut", share(w, w->n_out) / 100.0);
  record_number(r, "share_above_one_jnd", share(w, w->n_noticed) / 100.0);
  record_number(r, "mean_miss_out_of_gamut", w->mean_out);
  record_number(r, "worst_miss", w->worst);
  record_number(r, "worst_x", (double)w->worst_x);
  record_number(r, "worst_y", (double)w->worst_y);
  record_number(r, "share_beyond_tolerance", share(w, w->n_beyond) / 100.0);
  record_numbers(r, "share", EF_MAP_CLASSES, names, shares);
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

static ef_status report(const work *w, ef_output *output, ef_error *error) {
  if (w->options->format == FORMAT_CSV)
    return report_csv(w, output, error);
  if (w->options->format == FORMAT_JSON) {
    ef_json *json = ef_json_new(output, error);
    if (json == NULL)
      return error->status;
    record r = record_of_json(json);
    write_record(&r, w);
    return ef_json_finish(json, error);
  }
  text out = {0};
  add_answer(w, &out);
  add_classes(w, &out);
  add_basis(w, &out);
  const ef_status status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

ef_status image_gamut(const command_options *options, ef_output *output,
                      const ef_notes *notes, bool *fails, ef_error *error) {
  work w = {.options = options,
            .path = options->files[1],
            .map_path = options->n_files > 2 ? options->files[2] : NULL};
  ef_picture *picture = NULL;
  ef_status status = load(&w, notes, error);
  if (status == EF_OK) {
    picture = open_picture(&w, notes, error);
    status = picture != NULL ? count_colours(&w, picture, error)
                             : error->status;
  }
  if (status == EF_OK)
    status = judge(&w, ef_picture_get_profile(picture), error);
  if (status == EF_OK) {
    count_classes(&w);
    status = write_map(&w, error);
  }
  if (status == EF_OK)
    status = report(&w, output, error);
  *fails = options->check && w.n_beyond > 0;
  ef_picture_free(picture);
  ef_distinct_free(w.distinct);
  free(w.units);
  free(w.L_star);
  ef_setup_free(w.setup);
  ef_observer_free(w.observer);
  display_free(&w.display);
  ef_profile_free(w.assumed);
  measure_free(&w.measure);
  return status;
}
