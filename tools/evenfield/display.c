/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "display.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "rows.h"
#include "source.h"
#include "tone.h"

const char *display_origin_text(display_origin origin) {
  switch (origin) {
  case DISPLAY_PRIMARIES:
    return "spectra of its primaries";
  case DISPLAY_MEASUREMENTS:
    return "measured rows";
  case DISPLAY_ENCODING:
    return "published encoding";
  }
  return "";
}

/* ---- Measured rows ----------------------------------------------------- */

/* Chromaticities and luminances become tristimulus values, in place. */
static void to_xyz(rows *r) {
  for (size_t i = 0; i < r->n; ++i) {
    double *v = r->value + i * r->width;
    const ef_xyz xyz = ef_xyy_to_xyz((ef_xyy){v[0], v[1], v[2]});
    v[0] = xyz.X;
    v[1] = xyz.Y;
    v[2] = xyz.Z;
  }
}

static ef_status check_measured(const ef_reader_head *head, ef_error *error) {
  if (head->content == EF_CONTENT_LAB || head->content == EF_CONTENT_DEVICE) {
    return message_fail(error, EF_MALFORMED,
                        "a measured display needs X,Y,Z, "
                        "x,y,Y or a spectrum beside the device values, not %s",
                        ef_content_text(head->content));
  }
  if (strcmp(head->device_name[0], "cyan") == 0) {
    return message_fail(error, EF_MALFORMED,
                        "device values C,M,Y belong to a "
                        "print; a display has R,G,B");
  }
  return EF_OK;
}

static ef_status from_measurements(rows *r, const ef_reader_head *head,
                                   const char *name,
                                   const ef_display_settings *settings,
                                   const ef_metric *metric, display *out,
                                   ef_error *error) {
  ef_status status = check_measured(head, error);
  if (status != EF_OK)
    return status;
  if (head->content == EF_CONTENT_XYY)
    to_xyz(r);
  const bool spectral = head->content == EF_CONTENT_SPECTRA;
  const ef_measurements measurements = {.n_rows = r->n,
                                        .n_drives = r->n_device,
                                        .drive = r->device,
                                        .xyz = spectral ? NULL : r->value,
                                        .spectrum = spectral ? r->value : NULL,
                                        .grid = head->grid,
                                        .absolute = head->absolute,
                                        .line = r->line,
                                        .drive_name = head->device_name};
  ef_residual *residual = calloc(r->n, sizeof *residual);
  if (residual == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for residuals");
  size_t n = 0;
  out->device = ef_display_from_measurements(name, &measurements, settings,
                                             residual, &n, error);
  status = out->device == NULL
               ? error->status
               : residuals_of(&out->residuals, metric, n, residual, r, error);
  free(residual);
  return status;
}

/* ---- Files and encodings ----------------------------------------------- */

static ef_status from_primaries(const rows *r, const ef_reader_head *head,
                                const char *name,
                                const ef_display_settings *settings,
                                display *out, ef_error *error) {
  if (head->content != EF_CONTENT_SPECTRA) {
    return message_fail(error, EF_MALFORMED,
                        "a display needs spectra of its "
                        "primaries, or device values R,G,B in each row; there "
                        "is only %s",
                        ef_content_text(head->content));
  }
  ef_spectra *spectra = rows_spectra(r, head, error);
  if (spectra == NULL)
    return error->status;
  out->device = ef_display_from_spectra(name, spectra, settings, error);
  ef_spectra_free(spectra);
  return out->device != NULL ? EF_OK : error->status;
}

static ef_status from_file(const command_options *options,
                           const ef_display_settings *settings,
                           const ef_metric *metric, const ef_notes *notes,
                           display *out, ef_error *error) {
  ef_reader *reader =
      source_reader(options, out->source, EF_KIND_LIGHT, notes, error);
  if (reader == NULL)
    return error->status;
  const ef_reader_head *head = ef_reader_get_head(reader);
  const char *name = head->title[0] != '\0' ? head->title : head->file;
  rows r = {0};
  ef_status status = rows_read(reader, &r, error);
  if (status == EF_OK && head->n_device > 0) {
    out->origin = DISPLAY_MEASUREMENTS;
    status = from_measurements(&r, head, name, settings, metric, out, error);
  } else if (status == EF_OK) {
    out->origin = DISPLAY_PRIMARIES;
    status = from_primaries(&r, head, name, settings, out, error);
  }
  rows_free(&r);
  ef_reader_free(reader);
  /* A file that makes no display is bad input, also where the library says
   * that there is no answer (dependent primaries, a row that is missing). */
  if (status == EF_NO_ANSWER)
    error->status = status = EF_MALFORMED;
  if (status != EF_OK)
    message_place(error, out->source);
  return status;
}

static ef_status from_encoding(const ef_display_settings *settings,
                               display *out, ef_error *error) {
  out->origin = DISPLAY_ENCODING;
  out->encoding = ef_encoding_find(out->source, error);
  if (out->encoding == NULL)
    return message_option(error, "display", "; and there is no such file");
  out->device = ef_display_from_encoding(out->source, settings, error);
  return out->device != NULL ? EF_OK : error->status;
}

static ef_status set_ambient(const command_options *options,
                             const ef_notes *notes,
                             ef_display_settings *settings,
                             ef_illuminant **light, ef_error *error) {
  if (isnan(options->ambient_lux))
    return EF_OK;
  const char *name =
      options->ambient_illuminant != NULL ? options->ambient_illuminant : "D65";
  *light = source_illuminant(options, "ambient-illuminant", name, notes, error);
  if (*light == NULL)
    return error->status;
  settings->ambient_lux = options->ambient_lux;
  settings->screen_reflectance = options->reflectance;
  settings->ambient_illuminant = *light;
  return EF_OK;
}

static ef_status measure_additivity(const ef_metric *metric, display *out,
                                    ef_error *error) {
  out->additivity_difference = (double)NAN;
  const ef_status status =
      ef_display_additivity(out->device, &out->additivity, error);
  if (status == EF_OK && out->additivity.known) {
    const ef_additivity *a = &out->additivity;
    out->additivity_difference =
        residuals_difference(metric, a->measured, a->measured, a->summed);
  }
  return status;
}

ef_status display_load(const command_options *options, const ef_metric *metric,
                       const ef_notes *notes, display *out, ef_error *error) {
  *out = (display){.source = options->display};
  ef_display_settings settings = ef_display_settings_default();
  settings.notes = notes;
  tone_curves tone = {0};
  ef_illuminant *light = NULL;
  ef_status status = set_ambient(options, notes, &settings, &light, error);
  if (status == EF_OK)
    status = tone_load(options, notes, &tone, error);
  if (status == EF_OK) {
    const ef_tone_curve *curve[EF_MAX_DRIVES];
    for (size_t i = 0; i < tone.n; ++i)
      curve[i] = tone.curve[i];
    settings.n_curves = tone.n;
    settings.curve = curve;
    status = source_is_file(options, out->source)
                 ? from_file(options, &settings, metric, notes, out, error)
                 : from_encoding(&settings, out, error);
  }
  if (status == EF_OK)
    status = measure_additivity(metric, out, error);
  tone_free(&tone);
  ef_illuminant_free(light);
  return status;
}

void display_free(display *d) {
  ef_device_free(d->device);
  d->device = NULL;
}
