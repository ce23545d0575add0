/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Frames as device codes, row by row. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "stimulus/stimulus_private.h"

enum {
  N = EF_MAX_DRIVES,
  MOST_PIXELS = 32768,
  SEARCHED_BITS = 10, /* up to here codes are searched for */
  LEVELS = 4097,      /* odd, so that the background is one */
  MOST_PLACES = 2000  /* of the search for one level */
};

struct ef_frames {
  const ef_stimulator *stimulator;
  ef_isolation isolation;
  ef_frame_settings settings;
  size_t count;
  ef__view view;
  ef__codes *codes;
  ef__thresholds thresholds;
  uint32_t *table; /* LEVELS x n; NULL where codes are not searched for */
  ef_frame_area area;
};

ef_frame_settings ef_frame_settings_default(void) {
  return (ef_frame_settings){.width_px = 1920,
                             .height_px = 1080,
                             .distance_mm = 700,
                             .pixels_per_mm = 4,
                             .pattern = EF_PATTERN_DISC,
                             .size_deg = 2,
                             .hole_deg = 1,
                             .edge_deg = 0.2,
                             .sigma_deg = 0.5,
                             .cycles_per_deg = 2,
                             .waveform = ef_waveform_default(),
                             .frame_rate_hz = 60,
                             .bits = 8,
                             .dither = EF_DITHER_NONE,
                             .seed = 1,
                             .most_bytes = 4e9};
}

/* ---- Checks -------------------------------------------------------------- */

static ef_status check_screen(const ef_frame_settings *s, ef_error *error) {
  if (s->width_px < 1 || s->width_px > MOST_PIXELS || s->height_px < 1 ||
      s->height_px > MOST_PIXELS) {
    return ef__error_set(error, EF_INVALID,
                         "frames of %zu x %zu pixels; expected 1 to %d on each "
                         "side",
                         s->width_px, s->height_px, (int)MOST_PIXELS);
  }
  if (!(s->distance_mm > 0) || !isfinite(s->distance_mm)) {
    return ef__error_set(error, EF_INVALID,
                         "a viewing distance of %g mm; expected more than 0",
                         s->distance_mm);
  }
  if (!(s->pixels_per_mm > 0) || !isfinite(s->pixels_per_mm)) {
    return ef__error_set(error, EF_INVALID,
                         "%g pixels per mm; expected more than 0",
                         s->pixels_per_mm);
  }
  if (s->bits != 8 && s->bits != 10 && s->bits != 16) {
    return ef__error_set(error, EF_INVALID,
                         "frames of %d bits; expected 8, 10 or 16", s->bits);
  }
  return EF_OK;
}

static ef_status check_window(const ef_frame_settings *s, ef_error *error) {
  const bool is_cut =
      s->pattern == EF_PATTERN_DISC || s->pattern == EF_PATTERN_ANNULUS;
  if (!(s->size_deg >= 0 && s->size_deg < 180) ||
      (is_cut && !(s->size_deg > 0))) {
    return ef__error_set(error, EF_INVALID,
                         "a %s of %g degrees; expected more than 0 and less "
                         "than 180",
                         ef_pattern_name(s->pattern), s->size_deg);
  }
  if (!(s->edge_deg >= 0) || (s->size_deg > 0 && s->edge_deg > s->size_deg)) {
    return ef__error_set(error, EF_INVALID,
                         "edges of %g degrees on a %s of %g; expected 0 up to "
                         "its size",
                         s->edge_deg, ef_pattern_name(s->pattern), s->size_deg);
  }
  if (s->pattern == EF_PATTERN_ANNULUS &&
      !(s->hole_deg > 0 && s->hole_deg + s->edge_deg <= s->size_deg)) {
    return ef__error_set(error, EF_INVALID,
                         "a hole of %g degrees in an annulus of %g with edges "
                         "of %g; expected more than 0, and a ring between the "
                         "edges",
                         s->hole_deg, s->size_deg, s->edge_deg);
  }
  if (!(fabs(s->centre_x_deg) < 90 && fabs(s->centre_y_deg) < 90)) {
    return ef__error_set(error, EF_INVALID,
                         "a centre at %g, %g degrees; expected less than 90 to "
                         "each side",
                         s->centre_x_deg, s->centre_y_deg);
  }
  return EF_OK;
}

static ef_status check_grating(const ef_frame_settings *s, ef_error *error) {
  if (s->pattern != EF_PATTERN_GRATING && s->pattern != EF_PATTERN_GABOR)
    return EF_OK;
  /* Pixels per degree are fewest in the middle. */
  const double finest =
      0.5 * s->distance_mm * s->pixels_per_mm * 3.14159265358979323846 / 180;
  if (!(s->cycles_per_deg > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "a grating of %g cycles per degree; expected more "
                         "than 0",
                         s->cycles_per_deg);
  }
  if (s->cycles_per_deg > finest) {
    return ef__error_set(error, EF_INVALID,
                         "%g cycles per degree cannot be shown with two pixels "
                         "a cycle; expected at most %.4g",
                         s->cycles_per_deg, finest);
  }
  if (!(fabs(s->drift_hz) <= s->frame_rate_hz / 2)) {
    return ef__error_set(error, EF_INVALID,
                         "a drift of %g Hz cannot be shown with %g frames a "
                         "second; expected at most %g Hz",
                         s->drift_hz, s->frame_rate_hz, s->frame_rate_hz / 2);
  }
  if (!isfinite(s->phase_deg) || !isfinite(s->orientation_deg)) {
    return ef__error_set(error, EF_INVALID,
                         "phase %g and orientation %g degrees; expected finite "
                         "numbers",
                         s->phase_deg, s->orientation_deg);
  }
  if (s->pattern == EF_PATTERN_GABOR && !(s->sigma_deg > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "a Gaussian of %g degrees; expected more than 0",
                         s->sigma_deg);
  }
  return EF_OK;
}

static double bytes_of(size_t count, size_t n_primaries,
                       const ef_frame_settings *s) {
  const size_t n_pictures = (n_primaries + 2) / 3;
  return (double)count * (double)s->width_px * (double)s->height_px *
         (double)(3 * n_pictures) * (s->bits > 8 ? 2 : 1);
}

static ef_status check_bytes(size_t n_primaries, const ef_frame_settings *s,
                             ef_error *error) {
  const size_t count = ef_waveform_frames(&s->waveform, s->frame_rate_hz);
  const double bytes = bytes_of(count, n_primaries, s);
  if (bytes <= s->most_bytes)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "%zu frames of %zu x %zu pixels are %.3g bytes; at most "
                       "%.3g are allowed",
                       count, s->width_px, s->height_px, bytes, s->most_bytes);
}

static ef_status check(const ef_stimulator *stimulator,
                       const ef_isolation *isolation,
                       const ef_frame_settings *s, const ef_notes *notes,
                       ef_error *error) {
  ef_status status = ef__isolation_check(stimulator, isolation, error);
  if (status == EF_OK)
    status = check_screen(s, error);
  if (status == EF_OK)
    status = check_window(s, error);
  if (status == EF_OK)
    status = ef_waveform_check(&s->waveform, s->frame_rate_hz, notes, error);
  if (status == EF_OK)
    status = check_grating(s, error);
  if (status == EF_OK)
    status = check_bytes(stimulator->n, s, error);
  return status;
}

/* ---- Notes --------------------------------------------------------------- */

/* A disc around the centre that reaches beyond the nearest side. */
static void tell_size(const ef_frame_settings *s, const ef_notes *notes) {
  if (s->pattern == EF_PATTERN_UNIFORM || !(s->size_deg > 0))
    return;
  const double reach = (s->size_deg + s->edge_deg) / 2;
  const double half_width = ef_pixels_to_degrees(
      (double)s->width_px / 2, s->distance_mm, s->pixels_per_mm);
  const double half_height = ef_pixels_to_degrees(
      (double)s->height_px / 2, s->distance_mm, s->pixels_per_mm);
  if (fabs(s->centre_x_deg) + reach <= half_width &&
      fabs(s->centre_y_deg) + reach <= half_height)
    return;
  ef__note(notes,
           "the %s of %g degrees does not fit into the frame of %.4g x %.4g "
           "degrees and is cut",
           ef_pattern_name(s->pattern), s->size_deg, 2 * half_width,
           2 * half_height);
}

static void tell_codes(const ef_frame_settings *s, const ef_notes *notes) {
  if (s->dither == EF_DITHER_NONE && s->bits > SEARCHED_BITS) {
    ef__note(notes,
             "with %d bits each primary's code is rounded for itself; up to %d "
             "bits codes are chosen together",
             s->bits, (int)SEARCHED_BITS);
  }
}

/* ---- Areas ---------------------------------------------------------------
 */

/* The solid angle that changes, and how it lies in blocks of the frame. */
enum { BLOCKS = 48 };
typedef struct blocks {
  size_t n_x, n_y;
  double sr[BLOCKS * BLOCKS];         /* that changes in each */
  double towards[BLOCKS * BLOCKS][3]; /* unit vectors to their middles */
  double half_deg;                    /* half of the largest block's diagonal */
} blocks;

/* The most within any circle of 10 degrees around a block; a block counts when
 * any of it may lie within. */
static double most_in_ten_deg(const blocks *b) {
  const double radius_deg = 5, deg = 3.14159265358979323846 / 180;
  const double least_cosine = cos((radius_deg + b->half_deg) * deg);
  const double circle_sr =
      2 * 3.14159265358979323846 * (1 - cos(radius_deg * deg));
  const size_t n = b->n_x * b->n_y;
  double most = 0;
  for (size_t i = 0; i < n; ++i) {
    const double *const u = b->towards[i];
    double sum = 0;
    for (size_t k = 0; k < n; ++k) {
      const double *const v = b->towards[k];
      if (u[0] * v[0] + u[1] * v[1] + u[2] * v[2] >= least_cosine)
        sum += b->sr[k];
    }
    most = fmax(most, sum);
  }
  return fmin(most, circle_sr);
}

static void set_blocks(const ef_frames *frames, blocks *b) {
  const ef_frame_settings *const s = &frames->settings;
  const double pixel_mm = 1 / s->pixels_per_mm;
  const double deg = 3.14159265358979323846 / 180;
  *b = (blocks){.n_x = s->width_px < BLOCKS ? s->width_px : BLOCKS,
                .n_y = s->height_px < BLOCKS ? s->height_px : BLOCKS};
  const double wide_mm = (double)s->width_px / (double)b->n_x * pixel_mm;
  const double high_mm = (double)s->height_px / (double)b->n_y * pixel_mm;
  for (size_t y = 0; y < b->n_y; ++y) {
    for (size_t x = 0; x < b->n_x; ++x) {
      double *const v = b->towards[y * b->n_x + x];
      v[0] = ((double)x + 0.5 - (double)b->n_x / 2) * wide_mm;
      v[1] = ((double)y + 0.5 - (double)b->n_y / 2) * high_mm;
      v[2] = s->distance_mm;
      const double length = sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2]);
      for (int k = 0; k < 3; ++k)
        v[k] /= length;
    }
  }
  b->half_deg = atan(hypot(wide_mm, high_mm) / 2 / s->distance_mm) / deg;
}

static ef_frame_area measure_area(const ef_frames *frames) {
  const ef_frame_settings *const s = &frames->settings;
  const double n_pixels = (double)s->width_px * (double)s->height_px;
  size_t n_changing = 0;
  blocks b;
  set_blocks(frames, &b);
  ef_frame_area out = {0};
  for (size_t y = 0; y < s->height_px; ++y) {
    for (size_t x = 0; x < s->width_px; ++x) {
      const double sr = ef__pixel_sr(&frames->view, x, y);
      out.frame_solid_angle_sr += sr;
      if (ef__pattern_window(s, &frames->view, x, y) < 0.5)
        continue;
      out.solid_angle_sr += sr;
      b.sr[y * b.n_y / s->height_px * b.n_x + x * b.n_x / s->width_px] += sr;
      ++n_changing;
    }
  }
  out.share_of_frame = (double)n_changing / n_pixels;
  out.in_ten_deg_sr = fmin(most_in_ten_deg(&b), out.solid_angle_sr);
  return out;
}

/* ---- The object ---------------------------------------------------------- */

static double level_at(const ef_frames *frames, size_t k) {
  const double share = (double)k / (LEVELS - 1);
  return frames->isolation.modulation_kind == EF_PULSE ? share : 2 * share - 1;
}

typedef struct filling {
  ef_frames *frames;
  ef__fit fit;
} filling;

static void fill_levels(void *context, size_t begin, size_t end) {
  const filling *const f = context;
  ef_frames *const frames = f->frames;
  for (size_t k = begin; k < end; ++k) {
    ef__fit_codes(&f->fit, frames->codes, &frames->isolation,
                  level_at(frames, k), MOST_PLACES,
                  frames->table + k * frames->stimulator->n);
  }
}

/* The best codes of every level. */
static ef_status fill_table(ef_frames *frames, ef_error *error) {
  enum { CHUNK = 64 };
  const size_t n = frames->stimulator->n;
  uint32_t background[N];
  filling f = {.frames = frames};
  frames->table = ef__allocate(LEVELS, n * sizeof *frames->table);
  if (frames->table == NULL)
    return ef__error_memory(error, "the codes of frames");
  for (size_t i = 0; i < n; ++i)
    background[i] =
        ef__codes_round(frames->codes, i, frames->isolation.background[i]);
  ef__fit_set(&f.fit, frames->stimulator, &frames->isolation, frames->codes,
              background, ef_codes_settings_default().quiet_weight);
  ef__parallel_for(LEVELS, CHUNK, 0, fill_levels, &f);
  return EF_OK;
}

ef_frames *ef_frames_new(const ef_stimulator *stimulator,
                         const ef_isolation *isolation,
                         const ef_frame_settings *settings,
                         const ef_notes *notes, ef_error *error) {
  if (check(stimulator, isolation, settings, notes, error) != EF_OK)
    return NULL;
  ef_frames *const frames = ef__allocate_zeroed(1, sizeof *frames);
  if (frames == NULL) {
    ef__error_memory(error, "frames");
    return NULL;
  }
  frames->stimulator = stimulator;
  frames->isolation = *isolation;
  frames->settings = *settings;
  frames->count =
      ef_waveform_frames(&settings->waveform, settings->frame_rate_hz);
  frames->view = ef__view_of(settings);
  frames->thresholds = ef__thresholds_of(stimulator->n, settings->seed);
  ef_status status =
      ef__codes_new(stimulator->device, settings->bits, &frames->codes, error);
  if (status == EF_OK && settings->dither == EF_DITHER_NONE &&
      settings->bits <= SEARCHED_BITS)
    status = fill_table(frames, error);
  if (status != EF_OK) {
    ef_frames_free(frames);
    return NULL;
  }
  frames->area = measure_area(frames);
  tell_size(settings, notes);
  tell_codes(settings, notes);
  return frames;
}

void ef_frames_free(ef_frames *frames) {
  if (frames == NULL)
    return;
  free(frames->table);
  free(frames->codes);
  free(frames);
}

size_t ef_frames_count(const ef_frames *frames) {
  return frames->count;
}

const ef_frame_settings *ef_frames_settings(const ef_frames *frames) {
  return &frames->settings;
}

double ef_frames_bytes(const ef_frames *frames) {
  return bytes_of(frames->count, frames->stimulator->n, &frames->settings);
}

/* ---- Rows ---------------------------------------------------------------- */

static double time_of(const ef_frames *frames, size_t frame) {
  return ((double)frame + 0.5) / frames->settings.frame_rate_hz;
}

/* Pixels begin to end - 1 of a row. */
static void fill_piece(const ef_frames *frames, size_t frame, size_t y,
                       size_t begin, size_t end, double *level) {
  const ef_frame_settings *const s = &frames->settings;
  const bool stands = !(s->waveform.duration_s > 0);
  const double time_s = stands ? 0 : time_of(frames, frame);
  const double wave = stands ? 1 : ef_waveform_at(&s->waveform, time_s);
  const double ramp = ef_waveform_ramp(&s->waveform, time_s);
  for (size_t x = begin; x < end; ++x) {
    const double window = ramp * ef__pattern_window(s, &frames->view, x, y);
    double w = wave;
    if (window > 0)
      w *= ef__pattern_carrier(s, &frames->view, x, y, time_s);
    if (frames->isolation.modulation_kind == EF_PULSE)
      w = (1 + w) / 2;
    level[x - begin] = window * w;
  }
}

void ef_frames_levels(const ef_frames *frames, size_t frame, size_t y,
                      double *level) {
  fill_piece(frames, frame, y, 0, frames->settings.width_px, level);
}

const ef_device *ef__frames_device(const ef_frames *frames) {
  return frames->stimulator->device;
}

const ef_stimulator *ef__frames_stimulator(const ef_frames *frames) {
  return frames->stimulator;
}

void ef__frames_extremes(const ef_frames *frames, double *high, double *low) {
  const ef_isolation *const way = &frames->isolation;
  for (size_t i = 0; i < way->n_primaries; ++i) {
    high[i] = way->background[i] + way->modulation[i];
    low[i] = way->modulation_kind == EF_PULSE
                 ? way->background[i]
                 : way->background[i] - way->modulation[i];
  }
}

void ef__frames_peak(const ef_frames *frames, size_t frame, double *amount) {
  const ef_frame_settings *const s = &frames->settings;
  const bool stands = !(s->waveform.duration_s > 0);
  const double time_s = stands ? 0 : time_of(frames, frame);
  double w = stands ? 1 : ef_waveform_at(&s->waveform, time_s);
  if (s->pattern == EF_PATTERN_GRATING || s->pattern == EF_PATTERN_GABOR)
    w *= cos(2 * 3.14159265358979323846 * s->drift_hz * time_s);
  if (frames->isolation.modulation_kind == EF_PULSE)
    w = (1 + w) / 2;
  const double level = w * ef_waveform_ramp(&s->waveform, time_s);
  for (size_t i = 0; i < frames->stimulator->n; ++i) {
    amount[i] = frames->isolation.background[i] +
                level * frames->isolation.modulation[i];
  }
}

/* Codes of one place. */
static void code_level(const ef_frames *frames, double level, size_t x,
                       size_t y, size_t frame, uint16_t *code) {
  const size_t n = frames->stimulator->n;
  const ef_isolation *const isolation = &frames->isolation;
  if (frames->table != NULL) {
    const bool one_sided = isolation->modulation_kind == EF_PULSE;
    const double share = one_sided ? level : (level + 1) / 2;
    const long k = lround(share * (LEVELS - 1));
    const uint32_t *const row = frames->table + (size_t)k * n;
    for (size_t i = 0; i < n; ++i)
      code[i] = (uint16_t)row[i];
    return;
  }
  for (size_t i = 0; i < n; ++i) {
    const double amount =
        isolation->background[i] + level * isolation->modulation[i];
    const bool dithers = frames->settings.dither == EF_DITHER_ORDERED;
    const uint32_t one =
        dithers ? ef__dither_code(&frames->thresholds, frames->codes, i, amount,
                                  x, y, frame)
                : ef__codes_round(frames->codes, i, amount);
    code[i] = (uint16_t)one;
  }
}

void ef_frames_row(const ef_frames *frames, size_t frame, size_t y,
                   uint16_t *code) {
  enum { PIECE = 256 };
  const size_t width = frames->settings.width_px, n = frames->stimulator->n;
  double level[PIECE];
  for (size_t begin = 0; begin < width; begin += PIECE) {
    const size_t end = begin + PIECE < width ? begin + PIECE : width;
    fill_piece(frames, frame, y, begin, end, level);
    for (size_t x = begin; x < end; ++x)
      code_level(frames, level[x - begin], x, y, frame, code + x * n);
  }
}

uint16_t ef_code_to_sample(int bits, uint32_t code) {
  if (bits == 8)
    return (uint16_t)(code * 257);
  if (bits == 10)
    return (uint16_t)(code << 6 | code >> 4);
  return (uint16_t)code;
}

ef_frame_area ef_frames_area(const ef_frames *frames) {
  return frames->area;
}
