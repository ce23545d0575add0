/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_isolate.h"

#include <math.h>

#include "words.h"

/* Without the last digits of what was computed: 1.8, not 1.7999999999999998. */
static void add_figure(text *t, double value) {
  const double scale = 1e9;
  char number[EF_NUMBER_TEXT];
  ef_number_format(round(value * scale) / scale, number);
  text_add(t, number);
}

static void add_form(text *out, const isolate_show *show) {
  const ef_frame_settings *f = &show->settings;
  text t = {0};
  text_add(&t, ef_pattern_name(f->pattern));
  if (f->pattern == EF_PATTERN_UNIFORM) {
    text_add(&t, ", the whole frame");
  } else if (f->size_deg > 0.0) {
    text_add(&t, " of ");
    add_figure(&t, f->size_deg);
    text_add(&t, " degrees (");
    char pixels[EF_NUMBER_TEXT];
    ef_number_format_fixed(2.0 * ef_degrees_to_pixels(f->size_deg / 2.0,
                                                      f->distance_mm,
                                                      f->pixels_per_mm),
                           1, pixels);
    text_format(&t, "%s pixels) with edges of ", pixels);
    add_figure(&t, f->edge_deg);
  } else {
    text_add(&t, " over the whole frame");
  }
  if (f->pattern == EF_PATTERN_ANNULUS) {
    text_add(&t, ", hole of ");
    add_figure(&t, f->hole_deg);
  }
  if (f->pattern == EF_PATTERN_GABOR) {
    char sigma[EF_NUMBER_TEXT];
    ef_number_format_fixed(f->sigma_deg, words_decimals(f->sigma_deg, 3),
                           sigma);
    text_format(&t, ", Gaussian with a standard deviation of %s", sigma);
  }
  if (f->pattern == EF_PATTERN_GRATING || f->pattern == EF_PATTERN_GABOR) {
    text_add(&t, "; ");
    add_figure(&t, f->cycles_per_deg);
    text_add(&t, " cycles per degree along ");
    add_figure(&t, f->orientation_deg);
    text_add(&t, " degrees, phase ");
    add_figure(&t, f->phase_deg);
    if (f->drift_hz != 0.0) {
      text_add(&t, ", drifting at ");
      add_figure(&t, f->drift_hz);
      text_add(&t, " Hz");
    }
  }
  text_label(out, "Form", &t);
}

static void add_time(text *out, const isolate_show *show) {
  const ef_frame_settings *f = &show->settings;
  const ef_waveform *w = &f->waveform;
  text t = {0};
  const size_t n = ef_frames_count(show->frames);
  if (!(w->duration_s > 0.0)) {
    text_add(&t, "a single frame that stands");
    text_label(out, "In time", &t);
    return;
  }
  text_add(&t, ef_waveform_name(w->kind));
  if (w->kind != EF_WAVEFORM_STEADY) {
    text_add(&t, " of ");
    add_figure(&t, w->frequency_hz);
    text_add(&t, " Hz");
  }
  text_format(&t, ", %zu frames at ", n);
  add_figure(&t, f->frame_rate_hz);
  text_add(&t, " Hz");
  if (w->ramp_s > 0.0) {
    text_add(&t, ", rising and falling over ");
    add_figure(&t, w->ramp_s);
    text_add(&t, " s");
  }
  text_label(out, "In time", &t);
}

static void add_screen(text *out, const isolate_show *show) {
  const ef_frame_settings *f = &show->settings;
  text t = {0};
  char width[EF_NUMBER_TEXT], height[EF_NUMBER_TEXT], share[EF_NUMBER_TEXT];
  ef_number_format_fixed(2.0 * ef_pixels_to_degrees((double)f->width_px / 2.0,
                                                    f->distance_mm,
                                                    f->pixels_per_mm),
                         1, width);
  ef_number_format_fixed(2.0 * ef_pixels_to_degrees((double)f->height_px / 2.0,
                                                    f->distance_mm,
                                                    f->pixels_per_mm),
                         1, height);
  const double percent = 100.0 * show->area.share_of_frame;
  ef_number_format_fixed(percent, words_decimals(percent, 3), share);
  text_format(&t, "%zu x %zu pixels, ", f->width_px, f->height_px);
  add_figure(&t, f->pixels_per_mm);
  text_add(&t, " a mm, seen from ");
  add_figure(&t, f->distance_mm);
  text_format(&t, " mm: %s x %s degrees, of which %s %% change", width, height,
              share);
  text_label(out, "Frame", &t);
}

static void add_dither(text *out, const isolate_show *show,
                       const ef_isolation *way) {
  if (!show->has_dither)
    return;
  text t = {0};
  text_format(&t,
              "ordered, seed %llu; averaged over 8 x 8 pixels and 16 "
              "frames, silent receptors get at most ",
              (unsigned long long)show->settings.seed);
  isolate_add_size(&t, show->dither.residual);
  text_add(&t, " (");
  isolate_add_size(&t, show->dither.rounded_residual);
  text_add(&t, " with rounded codes); a pixel's contrast scatters by ");
  size_t n = 0;
  for (size_t k = 0; k < EF_N_RECEPTORS; ++k) {
    if (way->role[k] == EF_RECEPTOR_IGNORED)
      continue;
    isolate_add_size(&t, show->dither.noise[k]);
    text_format(&t, " in %s, ", isolate_receptor_words(k));
    ++n;
  }
  text_add(&t, "one standard deviation");
  text_label(out, "Dithering", &t);
}

static void add_files(text *out, const isolate_scene *s,
                      const isolate_show *show) {
  if (s->options->frames == NULL)
    return;
  text t = {0};
  const size_t n = ef_device_n_drives(s->display.device);
  char count[WORDS_ROOM];
  words_count(ef_frames_count(show->frames), "frame", "frames", count);
  text_format(&t, "%s in %s as PNG of %d bits", count, s->options->frames,
              show->settings.bits);
  if (show->settings.bits == 10)
    text_add(&t, " in 16 (the upper ten)");
  if (n > 3) {
    text_format(&t,
                ", each frame as %zu pictures of three primaries (-a, -b "
                "...)",
                (n + 2) / 3);
  }
  text_add(&t, "; beside them inverse-tone.csv (from light to codes) and "
               "stimulus.json (everything that was asked for, the display's "
               "data, this answer; `evenfield isolate --replay` makes the same "
               "frames from it)");
  text_label(out, "Files", &t);
  text_add(&t, "none on purpose: the values are codes for this display, and "
               "nothing may convert them. Show them pixel by pixel, with "
               "colour management, scaling, night modes and dithering of the "
               "system off");
  text_label(out, "Colour tags", &t);
}

void render_isolate_frames(text *out, const isolate_scene *s,
                           const isolate_result *r) {
  text_add(out, "\nFrames:\n");
  add_form(out, &r->show);
  add_time(out, &r->show);
  add_screen(out, &r->show);
  add_dither(out, &r->show, &r->way);
  add_files(out, s, &r->show);
}
