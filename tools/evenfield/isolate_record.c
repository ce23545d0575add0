/* SPDX-License-Identifier: GPL-3.0-or-later */
/* stimulus.json: complete, so that the frames can be made again from it
 * alone. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "isolate.h"
#include "isolate_frames.h"
#include "message.h"
#include "render_isolate.h"

/* Where the answer goes and how is no part of the stimulus. */
static bool belongs(const char *option) {
  static const char *const others[] = {"frames", "format", "output",
                                       "force",  "quiet",  "jobs",
                                       "chart",  "plane",  "report"};
  for (size_t i = 0; i < sizeof others / sizeof others[0]; ++i) {
    if (strcmp(option, others[i]) == 0)
      return false;
  }
  return true;
}

/* "--name=value", as they were given. */
static void write_arguments(ef_json *json, const given_options *given) {
  ef_json_begin_array(json, "arguments");
  for (size_t i = 0; i < given->n; ++i) {
    if (!belongs(given->name[i]))
      continue;
    text argument = {0};
    text_add(&argument, "--");
    text_add(&argument, given->name[i]);
    if (given->value[i] != NULL) {
      text_add(&argument, "=");
      text_add(&argument, given->value[i]);
    }
    ef_json_text(json, NULL, argument.failed ? NULL : argument.bytes);
    text_free(&argument);
  }
  ef_json_end_array(json);
}

static void write_files(ef_json *json, const kept_files *kept) {
  ef_json_begin_array(json, "files");
  for (size_t i = 0; kept != NULL && i < kept->n; ++i) {
    ef_json_begin_object(json, NULL);
    ef_json_text(json, "name", kept->file[i].name);
    ef_json_text(json, "text", kept->file[i].text);
    ef_json_end_object(json);
  }
  ef_json_end_array(json);
}

/* The spectra as they were used: for readers who will not run it again. */
static ef_status write_display(ef_json *json, const isolate_scene *s,
                               ef_error *error) {
  const ef_device *device = s->display.device;
  const ef_grid *grid = ef_device_grid(device);
  const size_t n = ef_device_n_drives(device);
  double *spectrum = malloc(grid->count * sizeof *spectrum);
  if (spectrum == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the record");
  ef_status status = EF_OK;
  ef_json_begin_object(json, "display");
  ef_json_text(json, "name", ef_device_name(device));
  ef_json_boolean(json, "absolute", ef_device_absolute(device));
  ef_json_begin_array(json, "wavelength_nm");
  for (size_t k = 0; k < grid->count; ++k)
    ef_json_number(json, NULL, ef_grid_wavelength(grid, k));
  ef_json_end_array(json);
  ef_json_begin_array(json, "states");
  for (size_t i = 0; i <= n && status == EF_OK; ++i) {
    double drive[EF_MAX_DRIVES] = {0};
    if (i < n)
      drive[i] = 1.0;
    status = ef_device_spectrum(device, drive, spectrum, NULL, error);
    ef_json_begin_object(json, NULL);
    ef_json_text(json, "name",
                 i < n ? ef_device_drive_name(device, i) : "all at zero");
    ef_json_text(json, "tone_curve",
                 i < n ? ef_device_curve_about(device, i) : NULL);
    ef_json_begin_array(json, "radiance");
    for (size_t k = 0; k < grid->count && status == EF_OK; ++k)
      ef_json_number(json, NULL, spectrum[k]);
    ef_json_end_array(json);
    ef_json_end_object(json);
  }
  ef_json_end_array(json);
  ef_json_end_object(json);
  free(spectrum);
  return status;
}

static void write_frame_settings(ef_json *json, const isolate_show *show) {
  static const char *const dithers[] = {"none", "ordered"};
  const ef_frame_settings *f = &show->settings;
  const ef_waveform *w = &f->waveform;
  ef_json_begin_object(json, "frames");
  ef_json_integer(json, "count", (int64_t)ef_frames_count(show->frames));
  ef_json_integer(json, "width_px", (int64_t)f->width_px);
  ef_json_integer(json, "height_px", (int64_t)f->height_px);
  ef_json_integer(json, "bits", f->bits);
  ef_json_number(json, "distance_mm", f->distance_mm);
  ef_json_number(json, "pixels_per_mm", f->pixels_per_mm);
  ef_json_text(json, "waveform", ef_pattern_name(f->pattern));
  ef_json_number(json, "size_deg", f->size_deg);
  ef_json_number(json, "hole_deg", f->hole_deg);
  ef_json_number(json, "edge_deg", f->edge_deg);
  ef_json_number(json, "sigma_deg", f->sigma_deg);
  ef_json_number(json, "cycles_per_degree", f->cycles_per_deg);
  ef_json_number(json, "orientation_deg", f->orientation_deg);
  ef_json_number(json, "phase_deg", f->phase_deg);
  ef_json_number(json, "drift_hz", f->drift_hz);
  ef_json_number(json, "centre_x_deg", f->centre_x_deg);
  ef_json_number(json, "centre_y_deg", f->centre_y_deg);
  ef_json_text(json, "time_course", ef_waveform_name(w->kind));
  ef_json_number(json, "frequency_hz", w->frequency_hz);
  ef_json_number(json, "time_phase_deg", w->phase_deg);
  ef_json_number(json, "duty", w->duty);
  ef_json_number(json, "duration_s", w->duration_s);
  ef_json_number(json, "ramp_s", w->ramp_s);
  ef_json_number(json, "frame_rate_hz", f->frame_rate_hz);
  ef_json_text(json, "dither", dithers[f->dither]);
  ef_json_integer(json, "seed", (int64_t)f->seed);
  ef_json_end_object(json);
}

static void write_pictures(ef_json *json, const isolate_show *show,
                           const ef_device *device) {
  const size_t n = ef_device_n_drives(device);
  ef_json_begin_array(json, "pictures");
  for (size_t k = 0; k < show->n_pictures; ++k) {
    const isolate_picture *picture = &show->picture[k];
    char crc[16];
    snprintf(crc, sizeof crc, "%08lx", (unsigned long)picture->crc);
    ef_json_begin_object(json, NULL);
    ef_json_text(json, "file", picture->file);
    ef_json_begin_array(json, "channels");
    for (size_t i = picture->first; i < n && i < picture->first + 3; ++i)
      ef_json_text(json, NULL, ef_device_drive_name(device, i));
    ef_json_end_array(json);
    ef_json_text(json, "crc32_of_samples", crc);
    ef_json_end_object(json);
  }
  ef_json_end_array(json);
}

static ef_status write_all(ef_json *json, const isolate_show *show,
                           const isolate_scene *s, const isolate_result *r,
                           ef_error *error) {
  ef_json_begin_object(json, NULL);
  ef_json_text(json, "record", "evenfield stimulus");
  ef_json_text(json, "version", ef_version());
  ef_json_text(json, "again",
               "evenfield isolate --replay FILE makes the same frames from "
               "this file alone");
  write_arguments(json, &s->options->given);
  write_frame_settings(json, show);
  record out = record_of_json(json);
  record_begin(&out, "answer");
  isolate_record(&out, s, r);
  record_end(&out);
  write_pictures(json, show, s->display.device);
  const ef_status status = write_display(json, s, error);
  write_files(json, s->options->kept);
  ef_json_end_object(json);
  return status;
}

ef_status isolate_record_write(const isolate_show *show, const isolate_scene *s,
                               const isolate_result *r, const char *path,
                               ef_error *error) {
  ef_output *output = ef_output_open(path, false, error);
  if (output == NULL)
    return error->status;
  ef_json *json = ef_json_new(output, error);
  ef_status status = json != NULL ? EF_OK : error->status;
  if (json != NULL) {
    status = write_all(json, show, s, r, error);
    ef_error of_json;
    const ef_status finished = ef_json_finish(json, &of_json);
    if (status == EF_OK && finished != EF_OK) {
      status = finished;
      *error = of_json;
    }
  }
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}
