/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_display.h"

#include <math.h>
#include <string.h>

#include "words.h"

static void add_name(text *out, const render_display *r) {
  const display *d = r->display;
  text t = {0};
  text_format(&t, "%s", ef_device_name(d->device));
  if (d->origin == DISPLAY_ENCODING) {
    text_format(&t, ", a published encoding (%s)", d->encoding->standard);
  } else {
    text_format(&t, " (%s), known from %s", d->source,
                display_origin_text(d->origin));
  }
  if (!isnan(r->luminance_cd_m2)) {
    char number[EF_NUMBER_TEXT];
    ef_number_format_fixed(r->luminance_cd_m2, 1, number);
    text_format(&t, "; white %s cd/m2", number);
  }
  if (!isnan(r->options->ambient_lux)) {
    char lux[EF_NUMBER_TEXT], reflectance[EF_NUMBER_TEXT];
    ef_number_format(r->options->ambient_lux, lux);
    ef_number_format(r->options->reflectance, reflectance);
    text_format(&t, ", with %s lux on a screen of reflectance %s", lux,
                reflectance);
  }
  text_label(out, "Display", &t);
}

static void add_tone(text *out, const ef_device *device) {
  const size_t n = ef_device_n_drives(device);
  const char *first = ef_device_curve_about(device, 0);
  bool alike = true;
  for (size_t i = 1; i < n; ++i) {
    alike = alike && strcmp(ef_device_curve_about(device, i), first) == 0;
  }
  text t = {0};
  if (alike)
    text_format(&t, "%s", first);
  for (size_t i = 0; i < n && !alike; ++i) {
    text_format(&t, "%s%s: %s", i == 0 ? "" : "; ",
                ef_device_drive_name(device, i),
                ef_device_curve_about(device, i));
  }
  text_label(out, "Tone curve", &t);
}

static void add_residuals(text *out, const render_display *d) {
  const residuals *r = &d->display->residuals;
  if (r->n == 0)
    return;
  text t = {0};
  text_format(&t, "%zu measured mixtures differ from the sum of the primaries ",
              r->n);
  residuals_add(&t, r, d->metric);
  text_label(out, "Additivity", &t);
}

static void add_white(text *out, const render_display *d) {
  const ef_additivity *a = &d->display->additivity;
  if (!a->known)
    return;
  char ratio[EF_NUMBER_TEXT], gap[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * a->luminance_ratio, 1, ratio);
  words_amount(d->display->additivity_difference, gap);
  text t = {0};
  text_format(&t,
              "the measured white has %s %% of the luminance of the "
              "primaries together, and differs from their sum by %s %s",
              ratio, gap, ef_metric_symbol(d->metric));
  text_label(out, d->display->residuals.n > 0 ? "" : "Additivity", &t);
}

void render_display_basis(text *out, const render_display *r) {
  add_name(out, r);
  add_tone(out, r->display->device);
  add_residuals(out, r);
  add_white(out, r);
}
