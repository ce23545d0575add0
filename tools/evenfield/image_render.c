/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "image_render.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

#include "message.h"
#include "record.h"
#include "result.h"
#include "source.h"
#include "text.h"
#include "words.h"

typedef enum form { FORM_PICTURE, FORM_CUBE, FORM_TABLE, FORM_UNKNOWN } form;

typedef struct work {
  const command_options *options;
  const char *path, *out_path;
  form form;
  const ef_encoding *encoding; /* of a picture */
  ef_channel_role role;
  ef_adaptation adaptation;
  ef_cube *cube;
  const ef_cube_head *head;
  ef_kind kind;
  ef_observer *observer;
  ef_illuminant *illuminant; /* of surfaces */
  ef_render_settings settings;
  ef_render_info info;
  double white_level; /* Y that is the picture's white */
  bool level_is_largest;
  ef_clipped clipped;
} work;

/* ---- What is asked for --------------------------------------------------- */

static bool ends_in(const char *path, const char *end) {
  const size_t n = strlen(path), m = strlen(end);
  return n > m && strcmp(path + n - m, end) == 0;
}

static form form_of(const char *path) {
  if (ends_in(path, ".png"))
    return FORM_PICTURE;
  if (ends_in(path, ".hdr"))
    return FORM_CUBE;
  return ends_in(path, ".csv") ? FORM_TABLE : FORM_UNKNOWN;
}

static bool is_values(const char *to) {
  return strcmp(to, "xyz") == 0 || strcmp(to, "lms") == 0;
}

exit_code image_render_check(const command_options *o) {
  if (o->n_files < 3)
    return message_usage("image render needs the header of a spectral image "
                         "and what to write, as in `evenfield image render "
                         "CUBE.hdr picture.png`");
  const form as = form_of(o->files[2]);
  if (as == FORM_UNKNOWN)
    return message_usage("image render writes FILE.png (a picture), FILE.hdr "
                         "(values as a spectral image of floats) or FILE.csv, "
                         "not \"%.200s\"",
                         o->files[2]);
  if (o->to != NULL && is_values(o->to) && as == FORM_PICTURE)
    return message_usage("--to %s is written to FILE.hdr or FILE.csv, not to a "
                         "picture",
                         o->to);
  if (o->to != NULL && !is_values(o->to) && as != FORM_PICTURE)
    return message_usage("--to of FILE.hdr and FILE.csv is xyz or lms, not "
                         "\"%.100s\"",
                         o->to);
  return result_check_usage(o, 3);
}

static ef_status load_aim(work *w, ef_error *error) {
  const command_options *o = w->options;
  w->role = o->to != NULL && strcmp(o->to, "lms") == 0 ? EF_CONES
                                                       : EF_TRISTIMULUS;
  ef_status status = EF_OK;
  if (w->form == FORM_PICTURE) {
    w->encoding = ef_encoding_find(o->to != NULL ? o->to : "srgb", error);
    if (w->encoding == NULL)
      return message_option(error, "to", "");
  }
  w->adaptation = EF_ADAPT_CAT16;
  if (o->adaptation != NULL)
    status = ef_adaptation_find(o->adaptation, &w->adaptation, error);
  return status == EF_OK ? EF_OK : message_option(error, "adaptation", "");
}

static ef_status load(work *w, const ef_notes *notes, ef_error *error) {
  const command_options *o = w->options;
  ef_cube_settings how = ef_cube_settings_default();
  how.data = o->data;
  how.notes = notes;
  ef_status status = load_aim(w, error);
  if (status != EF_OK)
    return status;
  w->observer = source_observer(o, notes, error);
  if (w->observer == NULL)
    return error->status;
  if (w->form == FORM_PICTURE && ef_observer_dimensions(w->observer) != 3)
    return message_fail(error, EF_NO_ANSWER,
                        "pictures are for eyes with three kinds of cones, and "
                        "the colours of observer %.100s have two dimensions",
                        ef_observer_name(w->observer));
  w->cube = ef_cube_open(w->path, &how, error);
  if (w->cube == NULL) {
    const size_t length = strlen(error->message);
    if (strstr(error->message, "its values") != NULL)
      snprintf(error->message + length, sizeof error->message - length,
               "; --data names it");
    return error->status;
  }
  w->head = ef_cube_get_head(w->cube);
  status = ef_cube_find_kind(w->cube, source_kind(o), notes, &w->kind, error);
  if (status != EF_OK)
    return status;
  if (w->kind == EF_SURFACE) {
    w->illuminant = source_illuminant(
        o, "illuminant", o->illuminant != NULL ? o->illuminant : "D65", notes,
        error);
    if (w->illuminant == NULL)
      return error->status;
  } else if (o->illuminant != NULL || o->adaptation != NULL) {
    message_note(notes, "--%s is not used: the image holds lights",
                 o->illuminant != NULL ? "illuminant" : "adaptation");
  }
  w->settings = ef_render_settings_default(w->illuminant);
  w->settings.role = w->role;
  w->settings.jobs = o->jobs;
  w->settings.notes = notes;
  return EF_OK;
}

/* ---- Pixels -------------------------------------------------------------- */

static ef_status each_block(work *w, void (*take)(void *, size_t, const double *),
                            void *cookie, ef_error *error) {
  ef_render *r = ef_render_new(w->cube, w->observer, &w->settings, error);
  if (r == NULL)
    return error->status;
  w->settings.notes = NULL; /* said once */
  message_progress progress = message_progress_start(w->options->quiet);
  progress.unit = "pixels";
  size_t n = 0, n_done = 0;
  const double *value;
  ef_status status = ef_render_next(r, &n, &value, error);
  while (status == EF_OK && n > 0) {
    take(cookie, n, value);
    message_progress_show(&progress, n_done += n);
    status = ef_render_next(r, &n, &value, error);
  }
  message_progress_end(&progress);
  w->info = ef_render_get_info(r);
  ef_render_free(r);
  return status;
}

static void find_largest(void *cookie, size_t n, const double *value) {
  double *const largest = cookie;
  for (size_t i = 0; i < n; ++i)
    *largest = fmax(*largest, value[3 * i + 1]); /* NaN is passed over */
}

static ef_status find_white(work *w, ef_xyz *white, ef_error *error) {
  double xyz[3];
  w->white_level = w->kind == EF_SURFACE ? 100.0 : 0.0;
  if (!isnan(w->options->white_level)) {
    w->white_level = w->options->white_level;
  } else if (w->kind == EF_LIGHT) {
    w->level_is_largest = true;
    const ef_status status =
        each_block(w, find_largest, &w->white_level, error);
    if (status != EF_OK)
      return status;
    if (!(w->white_level > 0.0)) {
      message_fail(error, EF_NO_ANSWER,
                   "has no pixel brighter than black to be the picture's "
                   "white; --white-level says which Y is");
      return message_place(error, w->path);
    }
  }
  if (w->kind == EF_LIGHT) {
    const ef_xy own = w->encoding->white;
    *white = ef_xyy_to_xyz((ef_xyy){own.x, own.y, w->white_level});
    w->adaptation = EF_ADAPT_NONE;
    return EF_OK;
  }
  const ef_status status = ef_observer_white(
      w->observer, EF_TRISTIMULUS, w->illuminant, NULL, xyz, error);
  const double scale = w->white_level / 100.0;
  *white = (ef_xyz){scale * xyz[0], scale * xyz[1], scale * xyz[2]};
  return status;
}

static ef_status write_picture(work *w, ef_error *error) {
  ef_xyz white;
  const ef_status found = find_white(w, &white, error);
  if (found != EF_OK)
    return found;
  ef_encoder *encoder = ef_encoder_new(w->encoding, white, w->adaptation,
                                       w->options->swatch_bits, error);
  if (encoder == NULL)
    return error->status;
  ef_render *r = ef_render_new(w->cube, w->observer, &w->settings, error);
  ef_status status = r != NULL ? EF_OK : error->status;
  if (status == EF_OK) {
    status = ef_render_write_png(r, encoder, w->out_path, w->options->force,
                                 &w->clipped, error);
    w->info = ef_render_get_info(r);
  }
  ef_render_free(r);
  ef_encoder_free(encoder);
  return status;
}

static ef_status write_cube(work *w, ef_error *error) {
  text about = {0};
  text_format(&about, "%s of %.100s by observer %.100s",
              w->role == EF_CONES ? "Cone excitations L M S"
                                  : "Tristimulus values X Y Z",
              w->path, ef_observer_name(w->observer));
  if (w->illuminant != NULL)
    text_format(&about, " under %.100s", ef_illuminant_name(w->illuminant));
  if (about.failed)
    return message_fail(error, EF_NO_MEMORY, "out of memory for a header");
  ef_render *r = ef_render_new(w->cube, w->observer, &w->settings, error);
  ef_status status = r != NULL ? EF_OK : error->status;
  if (status == EF_OK) {
    status = ef_render_write_cube(r, w->out_path, w->options->force,
                                  about.bytes, error);
    w->info = ef_render_get_info(r);
  }
  ef_render_free(r);
  text_free(&about);
  return status;
}

typedef struct tabulation {
  ef_csv *csv;
  size_t width, n;
} tabulation;

static void tabulate(void *cookie, size_t n, const double *value) {
  tabulation *const t = cookie;
  for (size_t i = 0; i < n; ++i, ++t->n) {
    ef_csv_number(t->csv, (double)(t->n % t->width));
    ef_csv_number(t->csv, (double)(t->n / t->width));
    for (size_t c = 0; c < 3; ++c)
      ef_csv_number(t->csv, value[3 * i + c]);
    ef_csv_end_row(t->csv);
  }
}

static ef_status write_table(work *w, ef_error *error) {
  static const char *const names[2][3] = {{"X", "Y", "Z"}, {"L", "M", "S"}};
  ef_output *output = result_open_at(w->out_path, w->options->force, error);
  if (output == NULL)
    return error->status;
  tabulation t = {ef_csv_new(output, error), w->head->width, 0};
  ef_status status = t.csv != NULL ? EF_OK : error->status;
  if (status == EF_OK) {
    ef_csv_text(t.csv, "column");
    ef_csv_text(t.csv, "line");
    for (size_t c = 0; c < 3; ++c)
      ef_csv_text(t.csv, names[w->role == EF_CONES][c]);
    ef_csv_end_row(t.csv);
    status = each_block(w, tabulate, &t, error);
    ef_error late = {0};
    const ef_status finished =
        ef_csv_finish(t.csv, status == EF_OK ? error : &late);
    status = status == EF_OK ? finished : status;
  }
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}

static bool is_same_file(const char *a, const char *b) {
  struct stat p, q;
  return stat(a, &p) == 0 && stat(b, &q) == 0 && p.st_dev == q.st_dev &&
         p.st_ino == q.st_ino;
}

/* An image is not to be lost to what is made of it, whatever may be
 * overwritten. */
static ef_status check_place(const work *w, ef_error *error) {
  text values = {0};
  const int stem = (int)strlen(w->out_path) - 4;
  text_format(&values, "%.*s.bip", stem, w->out_path);
  const bool is_own =
      w->form == FORM_CUBE &&
      (is_same_file(w->out_path, w->path) ||
       (!values.failed && is_same_file(values.bytes, w->head->data_file)));
  text_free(&values);
  if (!is_own)
    return EF_OK;
  message_fail(error, EF_EXISTS,
               "would replace the spectral image that is read; name another "
               "file");
  return message_place(error, w->out_path);
}

static ef_status write_out(work *w, ef_error *error) {
  ef_status status = check_place(w, error);
  if (status != EF_OK)
    return status;
  switch (w->form) {
  case FORM_PICTURE:
    status = write_picture(w, error);
    break;
  case FORM_CUBE:
    status = write_cube(w, error);
    break;
  default:
    return write_table(w, error);
  }
  if (status == EF_EXISTS)
    message_fail(error, EF_EXISTS,
                 "%.200s is there already, or the file with its values; "
                 "--force overwrites it, or name another file",
                 w->out_path);
  return status;
}

/* ---- Notes --------------------------------------------------------------- */

static void tell_of_pixels(const work *w, const ef_notes *notes) {
  const ef_render_info *i = &w->info;
  const char *as = w->form == FORM_PICTURE  ? "black"
                   : w->form == FORM_CUBE ? "NaN"
                                          : "empty";
  char ignored[EF_NUMBER_TEXT];
  if (i->n_ignored > 0) {
    ef_number_format(w->head->ignored, ignored);
    message_note(notes, "%s: %zu of %zu pixels hold the value to be ignored "
                        "(%s); they are %s in %s",
                 w->path, i->n_ignored, i->n_pixels, ignored, as, w->out_path);
  }
  if (i->n_not_numbers > 0)
    message_note(notes, "%s: %zu of %zu pixels hold what is no finite number; "
                        "they are %s in %s",
                 w->path, i->n_not_numbers, i->n_pixels, as, w->out_path);
  if (w->kind == EF_SURFACE && 2 * w->clipped.n_bright > i->n_pixels)
    message_note(notes, "%s: most of its pixels are brighter than white; does "
                        "its header lack the reflectance scale factor, or does "
                        "it hold lights (--kind light)?",
                 w->path);
}

/* ---- The report ---------------------------------------------------------- */

static double share(const work *w, size_t n) {
  return (double)n / (double)w->info.n_pixels;
}

static void add_answer(const work *w, text *out) {
  text t = {0};
  text_format(&t, "Wrote %.300s: %zu x %zu pixels", w->out_path, w->head->width,
              w->head->height);
  if (w->form == FORM_PICTURE) {
    text_format(&t, " in %s, %d bits; ", w->encoding->name,
                w->options->swatch_bits);
    if (w->clipped.n == 0)
      text_add(&t, "all of their colours lie inside it.");
    else
      text_format(&t, "%.2f %% of them (%zu) lie outside it and are clipped",
                  100.0 * share(w, w->clipped.n), w->clipped.n);
    if (w->clipped.n_bright > 0)
      text_format(&t, ", %.2f %% as they are brighter than it can show",
                  100.0 * share(w, w->clipped.n_bright));
    text_add(&t, w->clipped.n > 0 ? "." : "");
  } else {
    text_format(&t, ", %s%s.",
                w->role == EF_CONES ? "cone excitations L, M, S"
                                    : "tristimulus values X, Y, Z",
                w->form == FORM_CUBE
                    ? " as 32-bit floating-point numbers, interleaved by pixel"
                    : "");
  }
  text_paragraph(out, &t, 0);
}

static void add_basis(const work *w, text *out) {
  const ef_cube_head *h = w->head;
  text t = {0};
  text_add(out, "\nWhat this rests on:\n");
  text_format(&t, "%s, values in %s: %zu bands of %s, %s", w->path,
              h->data_file, h->n_bands, ef_sample_type_text(h->type),
              ef_interleave_text(h->interleave));
  text_label(out, "Image", &t);
  text_format(&t, "%zu, from %g to %g nm", w->info.n_bands,
              w->info.shortest_nm, w->info.longest_nm);
  text_label(out, "Bands", &t);
  if (w->kind == EF_SURFACE)
    text_format(&t, "surfaces under %s; Y is 100 for the perfect reflecting "
                    "diffuser",
                ef_illuminant_name(w->illuminant));
  else
    text_add(&t, "lights; Y is the sum of y_bar times power times step, in the "
                 "unit of the image (times K_m where that is W sr^-1 m^-2 "
                 "nm^-1)");
  text_label(out, "Values", &t);
  text_format(&t, "%s", ef_observer_about(w->observer));
  if (w->role == EF_CONES && ef_observer_cones_borrowed(w->observer))
    text_format(&t, "; its cones are the CIE 2006 ones of %g degrees",
                ef_observer_field_deg(w->observer));
  text_label(out, "Observer", &t);
  if (w->form != FORM_PICTURE)
    return;
  text_format(&t, "%s (%s), in the picture's tags", w->encoding->name,
              w->encoding->standard);
  text_label(out, "Encoding", &t);
  char level[EF_NUMBER_TEXT];
  ef_number_format(w->white_level, level);
  if (w->kind == EF_SURFACE)
    text_format(&t, "the white of %s at Y = %s goes to the encoding's (%s)",
                ef_illuminant_name(w->illuminant), level,
                ef_adaptation_name(w->adaptation));
  else
    text_format(&t, "Y = %.6g, %s, is the encoding's white; colours are shown "
                    "as they are, nobody is taken to adapt to them",
                w->white_level,
                w->level_is_largest ? "the largest of all pixels" : "as asked");
  text_label(out, "White", &t);
  text_add(&t, "what a viewer adapts to, and how bright the picture is shown; "
               "what lies outside the encoding is clipped channel by channel, "
               "which may shift its hue");
  text_label(out, "Not known", &t);
}

static void write_record(record *r, const work *w) {
  const double none = (double)NAN;
  const bool is_picture = w->form == FORM_PICTURE;
  record_begin(r, NULL);
  record_text(r, "image", w->path);
  record_text(r, "values", w->head->data_file);
  record_text(r, "written", w->out_path);
  record_number(r, "width", (double)w->head->width);
  record_number(r, "height", (double)w->head->height);
  record_number(r, "bands_used", (double)w->info.n_bands);
  record_number(r, "shortest_nm", w->info.shortest_nm);
  record_number(r, "longest_nm", w->info.longest_nm);
  record_text(r, "kind", w->kind == EF_SURFACE ? "surface" : "light");
  record_text(r, "illuminant",
              w->illuminant != NULL ? ef_illuminant_name(w->illuminant) : NULL);
  record_text(r, "observer", ef_observer_name(w->observer));
  record_text(r, "to", is_picture             ? w->encoding->name
                       : w->role == EF_CONES ? "lms"
                                             : "xyz");
  record_number(r, "white_level", is_picture ? w->white_level : none);
  record_number(r, "pixels_ignored", (double)w->info.n_ignored);
  record_number(r, "pixels_not_numbers", (double)w->info.n_not_numbers);
  record_number(r, "share_clipped",
                is_picture ? share(w, w->clipped.n) : none);
  record_number(r, "share_too_bright",
                is_picture ? share(w, w->clipped.n_bright) : none);
  record_end(r);
}

static ef_status report(const work *w, ef_output *output, ef_error *error) {
  if (w->options->format == FORMAT_TEXT) {
    text out = {0};
    add_answer(w, &out);
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

ef_status image_render(const command_options *options, ef_output *output,
                       const ef_notes *notes, ef_error *error) {
  work w = {.options = options,
            .path = options->files[1],
            .out_path = options->files[2],
            .form = form_of(options->files[2])};
  ef_status status = load(&w, notes, error);
  if (status == EF_OK)
    status = write_out(&w, error);
  if (status == EF_OK) {
    tell_of_pixels(&w, notes);
    status = report(&w, output, error);
  }
  ef_illuminant_free(w.illuminant);
  ef_observer_free(w.observer);
  ef_cube_free(w.cube);
  return status;
}
