/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "isolate_frames.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "folder.h"
#include "isolate.h"
#include "message.h"

/* ---- From the options -------------------------------------------------- */

static const char *const frame_options[] = {"frames",
                                            "waveform",
                                            "cycles-per-degree",
                                            "hole-deg",
                                            "edge-deg",
                                            "sigma-deg",
                                            "orientation-deg",
                                            "phase-deg",
                                            "drift-hz",
                                            "centre-deg",
                                            "frame-size",
                                            "distance-mm",
                                            "pixels-per-mm",
                                            "time-course",
                                            "hz",
                                            "time-phase-deg",
                                            "duty",
                                            "duration",
                                            "ramp",
                                            "frame-rate",
                                            "dither",
                                            "most-gb"};

bool isolate_shows(const command_options *options) {
  const size_t n = sizeof frame_options / sizeof frame_options[0];
  for (size_t i = 0; i < options->given.n; ++i) {
    for (size_t k = 0; k < n; ++k) {
      if (strcmp(options->given.name[i], frame_options[k]) == 0)
        return true;
    }
  }
  return false;
}

/* A Gabor is cut where its Gaussian is down to 1 %. */
static const double sigmas_across = 6.0;

double isolate_size_deg(const command_options *options) {
  const double usual_deg = 2.0;
  if (!isnan(options->size_deg))
    return options->size_deg;
  if (options->pattern == EF_PATTERN_GABOR && !isnan(options->sigma_deg))
    return sigmas_across * options->sigma_deg;
  return usual_deg;
}

static void set_number(double *field, double given) {
  if (!isnan(given))
    *field = given;
}

/* "A<mark>B". */
static bool read_pair(const char *words, char mark, double pair[2]) {
  const char *at = strchr(words, mark);
  return at != NULL &&
         ef_number_parse(words, (size_t)(at - words), '.', &pair[0]) &&
         ef_number_parse(at + 1, strlen(at + 1), '.', &pair[1]);
}

static ef_status set_places(const command_options *o, ef_frame_settings *f,
                            ef_error *error) {
  const double most_pixels = 32768.0;
  double pair[2];
  if (o->frame_size != NULL) {
    if (!read_pair(o->frame_size, 'x', pair) ||
        !(pair[0] >= 1.0 && pair[0] <= most_pixels) ||
        !(pair[1] >= 1.0 && pair[1] <= most_pixels) ||
        pair[0] != floor(pair[0]) || pair[1] != floor(pair[1])) {
      return message_fail(error, EF_UNKNOWN_NAME,
                          "--frame-size is WIDTHxHEIGHT, whole numbers of 1 to "
                          "32768 pixels such as 1920x1080, not \"%.100s\"",
                          o->frame_size);
    }
    f->width_px = (size_t)pair[0];
    f->height_px = (size_t)pair[1];
  }
  if (o->centre == NULL)
    return EF_OK;
  if (!read_pair(o->centre, ',', pair)) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--centre-deg is two numbers such as 5,0, not "
                        "\"%.100s\"",
                        o->centre);
  }
  f->centre_x_deg = pair[0];
  f->centre_y_deg = pair[1];
  return EF_OK;
}

static void set_form(const command_options *o, double size_deg,
                     ef_frame_settings *f) {
  const double usual_edge_deg = 0.2;
  if (o->pattern >= 0)
    f->pattern = (ef_pattern)o->pattern;
  f->size_deg = size_deg;
  f->edge_deg = size_deg > 0.0 ? fmin(usual_edge_deg, size_deg / 10.0) : 0.0;
  f->hole_deg = size_deg / 2.0;
  f->sigma_deg = size_deg > 0.0 ? size_deg / sigmas_across : f->sigma_deg;
  set_number(&f->edge_deg, o->edge_deg);
  set_number(&f->hole_deg, o->hole_deg);
  set_number(&f->sigma_deg, o->sigma_deg);
  set_number(&f->cycles_per_deg, o->cycles_per_deg);
  set_number(&f->orientation_deg, o->orientation_deg);
  set_number(&f->phase_deg, o->phase_deg);
  set_number(&f->drift_hz, o->drift_hz);
}

static void set_time(const command_options *o, ef_frame_settings *f) {
  const double usual_s = 1.0;
  ef_waveform *w = &f->waveform;
  const bool moves = !isnan(o->frequency_hz) || !isnan(o->drift_hz);
  if (!isnan(o->frequency_hz))
    w->kind = EF_WAVEFORM_SINUSOID;
  if (o->time_course >= 0)
    w->kind = (ef_waveform_kind)o->time_course;
  if (moves || w->kind != EF_WAVEFORM_STEADY)
    w->duration_s = usual_s;
  set_number(&w->frequency_hz, o->frequency_hz);
  set_number(&w->phase_deg, o->time_phase_deg);
  set_number(&w->duty, o->duty);
  set_number(&w->duration_s, o->duration_s);
  set_number(&w->ramp_s, o->ramp_s);
}

static ef_status frame_settings(const command_options *o, double size_deg,
                                ef_frame_settings *f, ef_error *error) {
  *f = ef_frame_settings_default();
  f->bits = o->bits;
  f->dither = (ef_dither)o->dither;
  if (!isnan(o->seed))
    f->seed = (uint64_t)o->seed;
  if (!isnan(o->most_gb))
    f->most_bytes = 1e9 * o->most_gb;
  set_number(&f->distance_mm, o->distance_mm);
  set_number(&f->pixels_per_mm, o->pixels_per_mm);
  set_number(&f->frame_rate_hz, o->frame_rate_hz);
  set_form(o, size_deg, f);
  set_time(o, f);
  if (f->bits != 8 && f->bits != 10 && f->bits != 16) {
    return message_fail(error, EF_UNKNOWN_NAME,
                        "--bits of frames is 8, 10 or 16, not %d", f->bits);
  }
  return set_places(o, f, error);
}

/* ---- Preparing --------------------------------------------------------- */

ef_status isolate_show_new(isolate_show *show, const isolate_scene *s,
                           const ef_isolation *way, const ef_notes *notes,
                           ef_error *error) {
  *show = (isolate_show){.frames = NULL};
  if (!isolate_shows(s->options))
    return EF_OK;
  ef_status status =
      frame_settings(s->options, s->size_deg, &show->settings, error);
  if (status != EF_OK)
    return status;
  show->frames =
      ef_frames_new(s->stimulator, way, &show->settings, notes, error);
  if (show->frames == NULL)
    return error->status;
  show->area = ef_frames_area(show->frames);
  status = ef_frames_flash(show->frames, &show->flash, error);
  if (status == EF_OK)
    status = ef_frames_stripes(show->frames, &show->stripes, error);
  show->has_dither = show->settings.dither != EF_DITHER_NONE;
  if (status == EF_OK && show->has_dither) {
    status = ef_isolation_dither(s->stimulator, way, show->settings.bits,
                                 show->settings.seed, &show->dither, error);
  }
  return status;
}

void isolate_show_free(isolate_show *show) {
  ef_frames_free(show->frames);
  free(show->picture);
  *show = (isolate_show){.frames = NULL};
}

/* ---- Pictures ---------------------------------------------------------- */

/* ISO 3309, as PNG uses it; `crc` starts as 0. */
static uint32_t crc_add(uint32_t crc, unsigned char byte) {
  const uint32_t polynomial = 0xEDB88320u;
  uint32_t c = (crc ^ byte) & 0xFFu;
  for (int k = 0; k < 8; ++k)
    c = c & 1u ? polynomial ^ (c >> 1) : c >> 1;
  return c ^ (crc >> 8);
}

/* Rows of one picture while they are written. */
typedef struct painter {
  const ef_frames *frames;
  size_t frame, n, width, first;
  int bits;
  uint16_t *code; /* of a row, width x n */
  uint32_t table[256], crc;
} painter;

static void painter_start(painter *p) {
  for (uint32_t i = 0; i < 256; ++i)
    p->table[i] = crc_add(0, (unsigned char)i);
}

static void crc_sample(painter *p, uint16_t sample) {
  const unsigned bytes[2] = {sample >> 8, sample & 0xFFu};
  for (int k = 0; k < 2; ++k)
    p->crc = p->table[(p->crc ^ bytes[k]) & 0xFFu] ^ (p->crc >> 8);
}

static void paint(void *cookie, size_t y, uint16_t *sample) {
  painter *p = cookie;
  ef_frames_row(p->frames, p->frame, y, p->code);
  for (size_t x = 0; x < p->width; ++x) {
    for (size_t c = 0; c < 3; ++c) {
      const size_t i = p->first + c;
      const uint32_t code = i < p->n ? p->code[x * p->n + i] : 0;
      sample[3 * x + c] = ef_code_to_sample(p->bits, code);
      crc_sample(p, sample[3 * x + c]);
    }
  }
}

static ef_status write_pictures(isolate_show *show, painter *p, const folder *f,
                                bool quiet, ef_error *error) {
  const ef_frame_settings *settings = &show->settings;
  message_progress progress = message_progress_start(quiet);
  progress.unit = "pictures";
  ef_status status = EF_OK;
  for (size_t k = 0; k < show->n_pictures && status == EF_OK; ++k) {
    isolate_picture *picture = &show->picture[k];
    const ef_png_rows rows = {.fill = paint, .cookie = p};
    char path[FOLDER_PATH_ROOM];
    const size_t per_frame = (p->n + 2) / 3;
    p->frame = k / per_frame;
    picture->first = p->first = 3 * (k % per_frame);
    p->crc = 0xFFFFFFFFu;
    snprintf(picture->file, sizeof picture->file, "frame-%05zu", p->frame + 1);
    const size_t length = strlen(picture->file);
    if (per_frame > 1) {
      snprintf(picture->file + length, sizeof picture->file - length, "-%c.png",
               (char)('a' + (int)(k % per_frame)));
    } else {
      snprintf(picture->file + length, sizeof picture->file - length, ".png");
    }
    status = folder_file(f, picture->file, path, error);
    if (status == EF_OK) {
      status = ef_png_write_rows(
          path, false, settings->width_px, settings->height_px,
          settings->bits == 8 ? 8 : 16, &rows, NULL, error);
    }
    picture->crc = p->crc ^ 0xFFFFFFFFu;
    message_progress_show(&progress, k + 1);
  }
  message_progress_end(&progress);
  return status;
}

static ef_status paint_all(isolate_show *show, const isolate_scene *s,
                           const folder *f, ef_error *error) {
  painter p = {.frames = show->frames,
               .n = ef_device_n_drives(s->display.device),
               .width = show->settings.width_px,
               .bits = show->settings.bits};
  painter_start(&p);
  show->n_pictures = ef_frames_count(show->frames) * ((p.n + 2) / 3);
  show->picture = calloc(show->n_pictures, sizeof *show->picture);
  p.code = malloc(p.width * p.n * sizeof *p.code);
  ef_status status =
      show->picture == NULL || p.code == NULL
          ? message_fail(error, EF_NO_MEMORY, "out of memory for the frames")
          : write_pictures(show, &p, f, s->options->quiet, error);
  free(p.code);
  return status;
}

/* ---- The inverse tone table -------------------------------------------- */

/* For each amount of light, the drive and the code of every primary. */
static void fill_tones(ef_csv *csv, const isolate_scene *s, int bits) {
  const ef_device *device = s->display.device;
  const size_t n = ef_device_n_drives(device);
  const double most = ldexp(1.0, bits) - 1.0;
  ef_csv_comment(csv, "title: inverse tone table: for an amount of each "
                      "primary's light, the drive and the code that give it");
  ef_csv_text(csv, "amount");
  for (size_t i = 0; i < n; ++i) {
    char name[128];
    snprintf(name, sizeof name, "%.100s_drive",
             ef_device_drive_name(device, i));
    ef_csv_text(csv, name);
    snprintf(name, sizeof name, "%.100s_code", ef_device_drive_name(device, i));
    ef_csv_text(csv, name);
  }
  ef_csv_end_row(csv);
  for (double k = 0.0; k <= most; k += 1.0) {
    ef_csv_number(csv, k / most);
    for (size_t i = 0; i < n; ++i) {
      const double drive = ef_device_drive(device, i, k / most);
      ef_csv_number(csv, drive);
      ef_csv_number(csv, round(most * drive));
    }
    ef_csv_end_row(csv);
  }
}

static ef_status write_tones(const isolate_scene *s, int bits, const char *path,
                             ef_error *error) {
  ef_output *output = ef_output_open(path, false, error);
  if (output == NULL)
    return error->status;
  ef_csv *csv = ef_csv_new(output, error);
  ef_status status = csv != NULL ? EF_OK : error->status;
  if (csv != NULL) {
    fill_tones(csv, s, bits);
    status = ef_csv_finish(csv, error);
  }
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}

/* ---- The folder -------------------------------------------------------- */

static bool is_ours(const char *name) {
  const size_t length = strlen(name);
  return strcmp(name, "stimulus.json") == 0 ||
         strcmp(name, "inverse-tone.csv") == 0 ||
         (strncmp(name, "frame-", 6) == 0 && length > 10 &&
          strcmp(name + length - 4, ".png") == 0);
}

ef_status isolate_show_write(isolate_show *show, const isolate_scene *s,
                             const isolate_result *r, const char *place,
                             ef_error *error) {
  folder f;
  char path[FOLDER_PATH_ROOM];
  ef_status status = folder_begin(&f, place, s->options->force,
                                  ef_frames_bytes(show->frames), error);
  if (status != EF_OK)
    return status;
  status = paint_all(show, s, &f, error);
  if (status == EF_OK)
    status = folder_file(&f, "inverse-tone.csv", path, error);
  if (status == EF_OK)
    status = write_tones(s, show->settings.bits, path, error);
  if (status == EF_OK)
    status = folder_file(&f, "stimulus.json", path, error);
  if (status == EF_OK)
    status = isolate_record_write(show, s, r, path, error);
  if (status == EF_OK)
    return folder_commit(&f, is_ours, error);
  folder_discard(&f);
  return status;
}
