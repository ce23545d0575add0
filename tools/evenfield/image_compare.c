/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "image_compare.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <evenfield/picture.h>

#include "compare_kept.h"
#include "jnd.h"
#include "message.h"
#include "profile_fit.h"
#include "record.h"
#include "result.h"
#include "text.h"
#include "words.h"

typedef struct work {
  const command_options *options;
  const char *path[2], *map_path; /* NULL: no map */
  measure measure;
  jnd jnd;
  ef_profile *assumed;
  ef_picture_settings settings[2];
  ef_picture *picture[2];
  ef_picture_colours colours[2];
  size_t width, height;
  int bits[2];
  ef_comparison *comparison;
  size_t in_class[EF_DIFFERENCE_CLASSES];
  ef_difference_map_report map;
  ef_comparison_totals totals;
  double median, p95;
  double share_mean, share_worst; /* of observers */
} work;

exit_code image_compare_check(const command_options *o) {
  if (o->n_files < 3)
    return message_usage("image compare needs two PNG pictures of one size, "
                         "and takes a third name for the map of where they "
                         "differ");
  return result_check_usage(o, 4);
}

/* ---- Loading ------------------------------------------------------------- */

/* The record that predictions start from, at the JND that pixels are counted
 * by. */
static ef_status load_jnd(work *w, const ef_notes *notes, ef_error *error) {
  command_options asked = *w->options;
  char number[EF_NUMBER_TEXT];
  if (w->measure.own_jnd) {
    ef_number_format(w->measure.jnd, number);
    asked.jnd_text = number;
  }
  return jnd_load(&asked, w->measure.metric, notes, &w->jnd, error);
}

static ef_status load(work *w, const ef_notes *notes, ef_error *error) {
  const command_options *o = w->options;
  ef_status status = measure_load(&w->measure, o, error);
  if (status == EF_OK && isnan(w->measure.jnd))
    return message_fail(error, EF_UNKNOWN_NAME,
                        "no JND is published for %s: give one with --jnd",
                        ef_metric_title(w->measure.metric));
  if (status == EF_OK)
    status = load_jnd(w, notes, error);
  if (status == EF_OK && o->assume != NULL) {
    w->assumed = profile_file_load(o->assume, "assume", error);
    if (w->assumed == NULL)
      return error->status;
  }
  return status;
}

/* By its own tags; --assume stands in where it has none. */
static ef_status open_picture(work *w, int i, const ef_notes *notes,
                              ef_error *error) {
  w->settings[i] = ef_picture_settings_default();
  w->settings[i].png.notes = notes;
  w->picture[i] = ef_picture_open(w->path[i], &w->settings[i], error);
  if (w->picture[i] == NULL && error->status == EF_NO_ANSWER) {
    if (w->assumed == NULL) {
      const size_t length = strlen(error->message);
      snprintf(error->message + length, sizeof error->message - length,
               "; --assume srgb, or a profile, says what they are");
      return error->status = EF_MALFORMED;
    }
    *error = (ef_error){0};
    w->settings[i].assumed = w->assumed;
    w->picture[i] = ef_picture_open(w->path[i], &w->settings[i], error);
  }
  if (w->picture[i] == NULL)
    return error->status;
  w->colours[i] = *ef_picture_get_colours(w->picture[i]);
  w->bits[i] = ef_picture_get_head(w->picture[i])->bits;
  return EF_OK;
}

static ef_status open_both(work *w, const ef_notes *notes, ef_error *error) {
  ef_status status = open_picture(w, 0, notes, error);
  if (status == EF_OK)
    status = open_picture(w, 1, notes, error);
  if (status != EF_OK)
    return status;
  ef_comparison_settings how =
      ef_comparison_settings_default(w->measure.metric, w->measure.jnd);
  how.tolerance = w->measure.tolerance;
  how.jobs = w->options->jobs;
  w->comparison =
      ef_comparison_new(w->picture[0], w->picture[1], &how, error);
  if (w->comparison == NULL)
    return error->status;
  w->width = ef_picture_get_head(w->picture[0])->width;
  w->height = ef_picture_get_head(w->picture[0])->height;
  return EF_OK;
}

/* ---- All pixels ---------------------------------------------------------- */

static ef_status give_row(void *cookie, size_t y, const double **value,
                          ef_error *error) {
  work *const w = cookie;
  (void)y; /* each once, from the top */
  const ef_status status = ef_comparison_next_row(w->comparison, value, error);
  for (size_t x = 0; status == EF_OK && *value != NULL && x < w->width; ++x) {
    if (!isnan((*value)[x]))
      ++w->in_class[ef_difference_class((*value)[x] / w->measure.jnd)];
  }
  return status;
}

static ef_status draw_map(work *w, const ef_notes *notes, ef_error *error) {
  const ef_difference_map map = {.width = w->width,
                                 .height = w->height,
                                 .jnd = w->measure.jnd,
                                 .symbol = ef_metric_symbol(w->measure.metric),
                                 .give = give_row,
                                 .cookie = w};
  const ef_status status = ef_difference_map_write(
      w->map_path, w->options->force, &map, &w->map, error);
  if (status == EF_EXISTS) {
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file");
    message_place(error, w->map_path);
  }
  if (status == EF_OK && !w->map.is_labelled)
    message_note(notes, "%s has no text in its key: that needs libcairo.so.2 "
                        "and a font, and one of them is missing",
                 w->map_path);
  return status;
}

static ef_status go_through(work *w, const ef_notes *notes, ef_error *error) {
  if (w->map_path != NULL)
    return draw_map(w, notes, error);
  ef_status status = EF_OK;
  const double *row = NULL;
  message_progress progress = message_progress_start(w->options->quiet);
  size_t y = 0;
  do {
    status = give_row(w, y++, &row, error);
    message_progress_show(&progress, y);
  } while (status == EF_OK && row != NULL);
  message_progress_end(&progress);
  return status;
}

/* ---- Who would tell ------------------------------------------------------ */

enum { BLOCK = 4096 };

typedef struct room {
  double difference[BLOCK];
  size_t n_pixels[BLOCK];
  ef_told_apart told[BLOCK];
} room;

static ef_status tell(const work *w, size_t n, room *r, ef_error *error) {
  ef_told_apart_settings how = ef_told_apart_settings_default();
  how.propagation = EF_PROPAGATE_FIRST_ORDER;
  ef_jnd_record bare = w->jnd.record;
  bare.low = bare.high = (double)NAN; /* shares, without an interval */
  const ef_judged asked = {.difference = r->difference, .n_observers = 1};
  return ef_told_apart_batch(&bare, n, &asked, &how, w->options->jobs,
                             r->told, error);
}

static ef_status ask_observers(work *w, ef_error *error) {
  room *r = malloc(sizeof *r);
  if (r == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for answers");
  size_t cursor = 0, n = 0;
  bool is_more = true;
  ef_status status = EF_OK;
  double sum = 0.0;
  while (status == EF_OK && is_more) {
    is_more = ef_comparison_next_cell(w->comparison, &cursor,
                                      &r->difference[n], &r->n_pixels[n]);
    n += is_more;
    if (n < BLOCK && is_more)
      continue;
    status = tell(w, n, r, error);
    for (size_t i = 0; i < n && status == EF_OK; ++i)
      sum += r->told[i].share_of_observers.value * (double)r->n_pixels[i];
    n = 0;
  }
  w->share_mean = sum / (double)w->totals.n_pixels;
  r->difference[0] = w->totals.largest;
  if (status == EF_OK)
    status = tell(w, 1, r, error);
  if (status == EF_OK)
    w->share_worst = r->told[0].share_of_observers.value;
  free(r);
  return status;
}

static ef_status judge(work *w, const ef_notes *notes, ef_error *error) {
  ef_status status = go_through(w, notes, error);
  if (status != EF_OK)
    return status;
  w->totals = ef_comparison_get_totals(w->comparison);
  w->median = ef_comparison_quantile(w->comparison, 0.5);
  w->p95 = ef_comparison_quantile(w->comparison, 0.95);
  if (w->totals.n_pixels == 0) {
    message_fail(error, EF_NO_ANSWER,
                 "no pixel has a difference: the colours lie where %s is not "
                 "defined",
                 ef_metric_title(w->measure.metric));
    return message_place(error, w->path[1]);
  }
  if (w->totals.n_undefined > 0)
    message_note(notes, "%s is not defined for %zu of %zu pixels; they count "
                        "nowhere",
                 ef_metric_title(w->measure.metric), w->totals.n_undefined,
                 w->totals.n_undefined + w->totals.n_pixels);
  return ask_observers(w, error);
}

/* ---- The report ---------------------------------------------------------- */

static double share(const work *w, size_t n) {
  return (double)n / (double)w->totals.n_pixels;
}

/* "one JND", and how far the pixels are off. */
static void add_figures(const work *w, text *t) {
  const ef_comparison_totals *a = &w->totals;
  char mean[EF_NUMBER_TEXT], median[EF_NUMBER_TEXT], p95[EF_NUMBER_TEXT];
  char worst[EF_NUMBER_TEXT];
  words_amount(a->mean, mean);
  words_amount(w->median, median);
  words_amount(w->p95, p95);
  words_amount(a->largest, worst);
  text_format(t, " They differ by %s %s on average (median %s, 95 %% of the "
                 "pixels by no more than %s), at worst by %s (%.1f JND, pixel "
                 "%zu of row %zu), where ",
              mean, ef_metric_symbol(w->measure.metric), median, p95, worst,
              a->largest / w->measure.jnd, a->largest_x + 1, a->largest_y + 1);
  compare_add_share(t, w->share_worst, "", " observers");
  text_add(t, " would tell them apart; on average over the pixels ");
  compare_add_share(t, w->share_mean, "", " observers");
  text_add(t, " would.");
}

static void add_answer(const work *w, text *out) {
  const ef_comparison_totals *a = &w->totals;
  text t = {0};
  if (!(a->largest > 0.0)) {
    text_format(&t, "%.300s shows the same colours as %.300s in every pixel.",
                w->path[1], w->path[0]);
  } else if (a->n_above_jnd == 0) {
    text_format(&t, "Pixel by pixel, %.300s is not told from %.300s by most "
                    "observers: no pixel differs by more than one JND.",
                w->path[1], w->path[0]);
    add_figures(w, &t);
  } else {
    text_format(&t, "Pixel by pixel, %.300s can be told from %.300s: %.2f %% "
                    "of the pixels differ by more than one JND.",
                w->path[1], w->path[0], 100.0 * share(w, a->n_above_jnd));
    add_figures(w, &t);
  }
  text_paragraph(out, &t, 0);
  if (!w->options->check)
    return;
  char tolerance[EF_NUMBER_TEXT];
  ef_number_format(a->tolerance, tolerance);
  text_format(&t, "The check %s: %.2f %% of the pixels differ by more than the "
                  "tolerance of %s %s.",
              a->n_above_tolerance > 0 ? "fails" : "holds",
              100.0 * share(w, a->n_above_tolerance), tolerance,
              ef_metric_symbol(w->measure.metric));
  text_paragraph(out, &t, 0);
}

static void add_range(text_table *t, double low, double high, double unit) {
  char from[EF_NUMBER_TEXT], to[EF_NUMBER_TEXT];
  snprintf(from, sizeof from, "%.3g", low * unit);
  snprintf(to, sizeof to, "%.3g", high * unit);
  if (isinf(high))
    table_format(t, "above %s", from);
  else
    table_format(t, "%s to %s", from, to);
}

static void add_classes(const work *w, text *out) {
  static const char *const shades[EF_DIFFERENCE_CLASSES] = {
      "nearly white", "second shade", "third shade",
      "fourth shade", "fifth shade",  "darkest"};
  text_table t = table_new();
  table_column(&t, "Difference", ef_metric_symbol(w->measure.metric), false);
  table_column(&t, "", "JND", false);
  table_column(&t, "Pixels", "%", false);
  if (w->map_path != NULL)
    table_column(&t, "On the map", "", true);
  for (int k = 0; k < EF_DIFFERENCE_CLASSES; ++k) {
    const double low = k > 0 ? ef_difference_class_end(k - 1) : 0.0;
    const double high = ef_difference_class_end(k);
    add_range(&t, low, high, w->measure.jnd);
    add_range(&t, low, high, 1.0);
    table_number(&t, 100.0 * share(w, w->in_class[k]), 2);
    if (w->map_path != NULL)
      table_cell(&t, shades[k]);
  }
  text_add(out, "\n");
  table_finish(&t, out);
  if (w->map_path == NULL)
    return;
  text m = {0};
  text_format(&m, "The map is %.300s: the larger the difference, the darker the "
                  "pixel",
              w->map_path);
  if (w->map.factor > 1)
    text_format(&m, "; each is drawn %zu by %zu large", w->map.factor,
                w->map.factor);
  text_add(&m, ".");
  text_add(out, "\n");
  text_paragraph(out, &m, 0);
}

static void add_basis(const work *w, text *out) {
  text t = {0};
  text_add(out, "\nWhat this rests on:\n");
  for (int i = 0; i < 2; ++i) {
    text_format(&t, "%s, %zu x %zu pixels of %d bits; colours from %s",
                w->path[i], w->width, w->height, w->bits[i],
                w->colours[i].about);
    text_label(out, i == 0 ? "Reference" : "Sample", &t);
  }
  text_add(&t, "each picture's white is taken as what the eye is adapted to "
               "(D50 of the connection space, intent relative, observer CIE "
               "1931)");
  text_label(out, "White", &t);
  text_format(&t, "%s (%s); ", ef_metric_title(w->measure.metric),
              ef_metric_source(w->measure.metric));
  jnd_add(&t, &w->jnd, w->measure.metric);
  text_label(out, "Difference", &t);
  text_format(&t, "their JNDs are taken to differ by a factor of %.2f (one "
                  "standard deviation)%s",
              exp(w->jnd.record.observer_log_sd),
              isnan(w->options->spread) ? "; --spread says otherwise" : "");
  text_label(out, "Observers", &t);
  text_add(&t, "how large a pixel is to the eye: the JND is one of fields side "
               "by side. Fine patterns far away differ less than their pixels "
               "do, and edges and large areas may be told apart by less");
  text_label(out, "Not known", &t);
}

static void write_record(record *r, const work *w) {
  static const char *const names[EF_DIFFERENCE_CLASSES] = {
      "to_half_jnd", "to_1_jnd", "to_2_jnd",
      "to_4_jnd",    "to_8_jnd", "above_8_jnd"};
  double shares[EF_DIFFERENCE_CLASSES];
  for (int k = 0; k < EF_DIFFERENCE_CLASSES; ++k)
    shares[k] = share(w, w->in_class[k]);
  record_begin(r, NULL);
  record_text(r, "reference", w->path[0]);
  record_text(r, "sample", w->path[1]);
  record_number(r, "width", (double)w->width);
  record_number(r, "height", (double)w->height);
  record_text(r, "reference_colours_from", w->colours[0].about);
  record_text(r, "sample_colours_from", w->colours[1].about);
  record_text(r, "metric", ef_metric_name(w->measure.metric));
  record_number(r, "jnd", w->measure.jnd);
  record_number(r, "mean", w->totals.mean);
  record_number(r, "median", w->median);
  record_number(r, "p95", w->p95);
  record_number(r, "worst", w->totals.largest);
  record_number(r, "worst_x", (double)w->totals.largest_x);
  record_number(r, "worst_y", (double)w->totals.largest_y);
  record_number(r, "share_above_one_jnd", share(w, w->totals.n_above_jnd));
  record_number(r, "share_beyond_tolerance",
                share(w, w->totals.n_above_tolerance));
  record_number(r, "share_of_observers_mean", w->share_mean);
  record_number(r, "share_of_observers_worst", w->share_worst);
  record_numbers(r, "share", EF_DIFFERENCE_CLASSES, names, shares);
  record_end(r);
}

static ef_status report(const work *w, ef_output *output, ef_error *error) {
  if (w->options->format == FORMAT_TEXT) {
    text out = {0};
    add_answer(w, &out);
    add_classes(w, &out);
    add_basis(w, &out);
    const ef_status status = text_write(&out, output, error);
    text_free(&out);
    return status;
  }
  if (w->options->format == FORMAT_JSON) {
    ef_json *json = ef_json_new(output, error);
    if (json == NULL)
      return error->status;
    record r = record_of_json(json);
    write_record(&r, w);
    return ef_json_finish(json, error);
  }
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  record header = record_of_csv(csv, true), r = record_of_csv(csv, false);
  write_record(&header, w);
  write_record(&r, w);
  return ef_csv_finish(csv, error);
}

ef_status image_compare(const command_options *options, ef_output *output,
                        const ef_notes *notes, bool *fails, ef_error *error) {
  work w = {.options = options,
            .path = {options->files[1], options->files[2]},
            .map_path = options->n_files > 3 ? options->files[3] : NULL};
  ef_status status = load(&w, notes, error);
  if (status == EF_OK)
    status = open_both(&w, notes, error);
  if (status == EF_OK)
    status = judge(&w, notes, error);
  if (status == EF_OK)
    status = report(&w, output, error);
  *fails = options->check && w.totals.n_above_tolerance > 0;
  ef_comparison_free(w.comparison);
  ef_picture_free(w.picture[0]);
  ef_picture_free(w.picture[1]);
  ef_profile_free(w.assumed);
  measure_free(&w.measure);
  return status;
}
