/* SPDX-License-Identifier: GPL-3.0-or-later */
/* --inks: a halftone print, from the table that characterises it. */
#include "device.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "match.h"
#include "message.h"
#include "residuals.h"
#include "rows.h"
#include "source.h"
#include "words.h"

static const char demo[] = "demo:leaflet-press";

typedef struct inks {
  ef_content content;
  size_t n_rows;
  double black;        /* drive of the fourth ink; NaN: there is none */
  residuals fit, test; /* rows that the fit rests on, and all others */
} inks;

/* ---- Loading ----------------------------------------------------------- */

static ef_status check_head(const ef_reader_head *head, ef_error *error) {
  if (head->n_device == 0 || strcmp(head->device_name[0], "cyan") != 0) {
    return message_fail(error, EF_MALFORMED,
                        "a print needs ink values C,M,Y in each row, beside "
                        "X,Y,Z, x,y,Y, L,a,b or a spectrum; %s",
                        head->n_device == 0 ? "there are none"
                                            : "R,G,B belong to a display");
  }
  if (head->content == EF_CONTENT_DEVICE) {
    return message_fail(error, EF_MALFORMED,
                        "ink values alone do not tell what they print; X,Y,Z, "
                        "x,y,Y, L,a,b or a spectrum is needed in each row");
  }
  if (head->content == EF_CONTENT_SPECTRA && head->kind != EF_SURFACE) {
    return message_fail(error, EF_MALFORMED,
                        "a print reflects, and these spectra are of lights; "
                        "say `# quantity: reflectance` in the file if they "
                        "are not");
  }
  if (head->content != EF_CONTENT_SPECTRA && head->absolute) {
    return message_fail(error, EF_MALFORMED,
                        "a print has Y = 100 for the perfect diffuser, and "
                        "these X,Y,Z are in cd/m2");
  }
  return EF_OK;
}

/* L,a,b and x,y,Y become X,Y,Z, in place. */
static ef_status to_xyz(rows *r, const ef_reader_head *head,
                        const device_basis *b, ef_error *error) {
  ef_observer *standard = ef_observer_new("cie-1931", error);
  if (standard == NULL)
    return error->status;
  colour_basis light;
  colours c = {0};
  ef_status status = colour_basis_init(&light, standard, b->illuminant, error);
  if (status == EF_OK) {
    /* The ink values are used, so no note says that they are not. */
    status = colours_init(&c, &light, head, NULL, error);
  }
  if (status == EF_OK)
    status = colours_xyz(&c, r->n, r->value, 1, r->value, error);
  colours_free(&c);
  ef_observer_free(standard);
  return status;
}

/* Rows of the fit first, then those of the test: two runs of `out`. */
static size_t part(size_t n, const ef_print_residual *from, bool is_test,
                   ef_residual *out) {
  size_t n_part = 0;
  for (size_t i = 0; i < n; ++i) {
    if (from[i].is_test != is_test)
      continue;
    out[n_part++] = (ef_residual){.row = from[i].row,
                                  .measured = from[i].measured,
                                  .predicted = from[i].predicted,
                                  .white = from[i].white};
  }
  return n_part;
}

static ef_status summarise(inks *own, size_t n,
                           const ef_print_residual *residual,
                           const ef_metric *metric, const rows *r,
                           ef_error *error) {
  ef_residual *some = malloc((n + 1) * sizeof *some);
  if (some == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for residuals");
  size_t n_some = part(n, residual, false, some);
  ef_status status = residuals_of(&own->fit, metric, n_some, some, r, error);
  n_some = part(n, residual, true, some);
  if (status == EF_OK)
    status = residuals_of(&own->test, metric, n_some, some, r, error);
  free(some);
  return status;
}

static ef_status fit(const device_basis *b, const rows *r,
                     const ef_reader_head *head, chosen_device *out,
                     ef_error *error) {
  inks *own = out->own;
  const command_options *o = b->options;
  const bool spectral = head->content == EF_CONTENT_SPECTRA;
  const ef_measurements measurements = {.n_rows = r->n,
                                        .n_drives = r->n_device,
                                        .drive = r->device,
                                        .xyz = spectral ? NULL : r->value,
                                        .spectrum = spectral ? r->value : NULL,
                                        .grid = head->grid,
                                        .line = r->line,
                                        .drive_name = head->device_name};
  ef_halftone_settings settings = ef_halftone_settings_default();
  settings.n = isnan(o->yule_nielsen) ? 0.0 : o->yule_nielsen;
  settings.black = isnan(o->black_percent) ? 0.0 : o->black_percent / 100.0;
  settings.illuminant = b->illuminant;
  settings.notes = b->notes;
  own->black = r->n_device > 3 ? settings.black : (double)NAN;
  ef_print_residual *residual = calloc(r->n, sizeof *residual);
  if (residual == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for residuals");
  size_t n = 0;
  const char *name = head->title[0] != '\0' ? head->title : head->file;
  out->device = ef_halftone_from_measurements(name, &measurements, &settings,
                                              residual, &n, error);
  const ef_status status =
      out->device == NULL ? error->status
                          : summarise(own, n, residual, b->metric, r, error);
  free(residual);
  return status;
}

static ef_status load_rows(const device_basis *b, const ef_reader_head *head,
                           rows *r, chosen_device *out, ef_error *error) {
  inks *own = out->own;
  own->content = head->content;
  own->n_rows = r->n;
  out->has_black = head->n_device == 4;
  out->black_percent =
      isnan(b->options->black_percent) ? 0.0 : b->options->black_percent;
  if (head->content != EF_CONTENT_SPECTRA) {
    message_note(b->notes,
                 "%s: its %s are taken as of the observer cie-1931 and under "
                 "%s, the light of --illuminant",
                 head->file, ef_content_text(head->content),
                 ef_illuminant_name(b->illuminant));
    colours_note_basis(head, b->observer, b->illuminant, b->notes);
  }
  ef_status status = EF_OK;
  if (head->content != EF_CONTENT_SPECTRA && head->content != EF_CONTENT_XYZ)
    status = to_xyz(r, head, b, error);
  return status == EF_OK ? fit(b, r, head, out, error) : status;
}

static void set_steps(const command_options *o, chosen_device *out) {
  const double step = isnan(o->step_percent) ? 1.0 : o->step_percent;
  char number[EF_NUMBER_TEXT];
  ef_number_format(step, number);
  out->bits = o->match_bits >= 0 ? o->match_bits : 0;
  out->n_steps = o->match_bits >= 0 ? 0 : (int)round(100.0 / step);
  if (out->n_steps > 0)
    snprintf(out->step, sizeof out->step, "%.16s %%", number);
}

static ef_status load(const device_basis *b, chosen_device *out,
                      ef_error *error) {
  if (out->is_demo)
    out->source = demo;
  out->is_subtractive = true;
  set_steps(b->options, out);
  out->own = calloc(1, sizeof(inks));
  if (out->own == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for a print");
  ef_reader *reader =
      source_reader(b->options, out->source, EF_KIND_AUTO, b->notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  rows r = {0};
  ef_status status = check_head(head, error);
  if (status == EF_OK)
    status = rows_read(reader, &r, error);
  if (status == EF_OK)
    status = load_rows(b, head, &r, out, error);
  rows_free(&r);
  ef_reader_free(reader);
  return status;
}

static void free_own(chosen_device *d) {
  free(d->own);
}

/* ---- What it rests on -------------------------------------------------- */

static const char *known_from(const inks *own) {
  return own->content == EF_CONTENT_SPECTRA ? "spectra"
                                            : ef_content_text(own->content);
}

static void add_model(text *out, const match_scene *s) {
  const inks *own = s->device.own;
  char number[EF_NUMBER_TEXT];
  text t = {0};
  ef_number_format_fixed(ef_halftone_n(s->device.device), 3, number);
  text_format(&t,
              "Neugebauer primaries as measured, shares of their areas after "
              "Demichel, Yule-Nielsen factor %s, %s",
              number,
              isnan(s->options->yule_nielsen) ? "fitted to the ramps"
                                              : "as given");
  if (!isnan(own->black)) {
    ef_number_format(100.0 * own->black, number);
    text_format(&t, "; black stays at %s %%", number);
  }
  text_label(out, "Model", &t);
}

static void add_curves(text *out, const ef_device *device) {
  text t = {0};
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    char number[EF_NUMBER_TEXT];
    ef_number_format_fixed(100.0 * ef_device_amount(device, i, 0.5, NULL), 1,
                           number);
    text_format(&t, "%s%s %s %%", i == 0 ? "" : ", ",
                ef_device_drive_name(device, i), number);
  }
  text_add(&t, " of area at 50 %: from each ink's ramp, the spread of the dot "
               "on the paper");
  text_label(out, "Ink curves", &t);
}

static void add_quality(text *out, const match_scene *s) {
  const inks *own = s->device.own;
  text t = {0};
  text_format(&t, "%zu rows of solids and ramps differ ", own->fit.n);
  residuals_add(&t, &own->fit, s->metric);
  text_label(out, "Fit", &t);
  if (own->test.n == 0) {
    text_add(&t, "no mixture of inks beside the primaries was measured, so "
                 "nothing tests the model");
  } else {
    char count[WORDS_ROOM];
    words_count(own->test.n, "mixture", "mixtures", count);
    text_format(&t, "%s that had no part in the fit %s ", count,
                own->test.n == 1 ? "differs" : "differ");
    residuals_add(&t, &own->test, s->metric);
  }
  text_label(out, "Test", &t);
}

static void describe(text *out, const match_scene *s) {
  const inks *own = s->device.own;
  text t = {0};
  text_format(&t, "%s (%s), known from %s of %zu rows",
              ef_device_name(s->device.device), s->device.source,
              known_from(own), own->n_rows);
  if (own->content != EF_CONTENT_SPECTRA)
    text_format(&t, " under %s", ef_illuminant_name(s->illuminant));
  text_label(out, "Press", &t);
  add_model(out, s);
  add_curves(out, s->device.device);
  add_quality(out, s);
}

/* ---- As data ----------------------------------------------------------- */

static void write_colour(ef_json *j, ef_xyz xyz, ef_xyz white) {
  const ef_lab lab = ef_xyz_to_lab(xyz, white);
  ef_json_number(j, "X", xyz.X);
  ef_json_number(j, "Y", xyz.Y);
  ef_json_number(j, "Z", xyz.Z);
  ef_json_number(j, "L_star", lab.L_star);
  ef_json_number(j, "a_star", lab.a_star);
  ef_json_number(j, "b_star", lab.b_star);
}

static void write_primaries(ef_json *j, const match_scene *s) {
  const size_t n = ef_device_n_drives(s->device.device);
  ef_json_begin_array(j, "primaries");
  for (size_t k = 0; k < (size_t)1 << n; ++k) {
    double amount[EF_MAX_DRIVES];
    ef_json_begin_object(j, NULL);
    ef_json_begin_array(j, "solid");
    for (size_t i = 0; i < n; ++i) {
      amount[i] = (double)(k >> i & 1u);
      if (amount[i] > 0.0)
        ef_json_text(j, NULL, ef_device_drive_name(s->device.device, i));
    }
    ef_json_end_array(j);
    write_colour(j, ef_setup_xyz(s->setup, amount, NULL),
                 ef_setup_white(s->setup));
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
}

static void write(ef_json *j, const match_scene *s) {
  const inks *own = s->device.own;
  const ef_device *device = s->device.device;
  ef_json_text(j, "known_from", known_from(own));
  ef_json_integer(j, "rows", (int64_t)own->n_rows);
  ef_json_number(j, "yule_nielsen", ef_halftone_n(device));
  if (!isnan(own->black))
    ef_json_number(j, "black", own->black);
  ef_json_begin_array(j, "inks");
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    ef_json_begin_object(j, NULL);
    ef_json_text(j, "name", ef_device_drive_name(device, i));
    ef_json_text(j, "tone_curve", ef_device_curve_about(device, i));
    ef_json_number(j, "area_at_half", ef_device_amount(device, i, 0.5, NULL));
    ef_json_end_object(j);
  }
  ef_json_end_array(j);
  write_primaries(j, s);
  residuals_write(j, "fit", &own->fit);
  residuals_write(j, "test", &own->test);
}

const device_kind device_inks = {
    .key = "press",
    .option = "inks",
    .illuminant = "D50",
    .demo_story = "on the leaflet press",
    .demo_device = "the demo's leaflet press",
    .words = {.noun = "press",
              .title = "Press",
              .shows = "print",
              .shown = "printed",
              .amounts = "Ink to print, %",
              .channel = "ink",
              .channels = "inks",
              .spectra = "the spectra of its patches",
              .none = "paper",
              .all = "three-ink black"},
    .load = load,
    .free = free_own,
    .describe = describe,
    .write = write};
