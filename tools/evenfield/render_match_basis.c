/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_match.h"

#include <math.h>
#include <string.h>

#include "viewing.h"
#include "words.h"

/* ---- What it rests on -------------------------------------------------- */

static void add_display(text *out, const match_scene *s) {
  const display *d = &s->display;
  text t = {0};
  text_format(&t, "%s", ef_device_name(d->device));
  if (d->origin == DISPLAY_ENCODING) {
    text_format(&t, ", a published encoding (%s)", d->encoding->standard);
  } else {
    text_format(&t, " (%s), known from %s", d->source,
                display_origin_text(d->origin));
  }
  if (!isnan(s->luminance_cd_m2)) {
    char number[EF_NUMBER_TEXT];
    ef_number_format_fixed(s->luminance_cd_m2, 1, number);
    text_format(&t, "; white %s cd/m2", number);
  }
  if (!isnan(s->options->ambient_lux)) {
    char lux[EF_NUMBER_TEXT], reflectance[EF_NUMBER_TEXT];
    ef_number_format(s->options->ambient_lux, lux);
    ef_number_format(s->options->reflectance, reflectance);
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

static void add_residuals(text *out, const match_scene *s) {
  const display_residuals *r = &s->display.residuals;
  const char *symbol = ef_metric_symbol(s->metric);
  if (r->n == 0)
    return;
  char mean[EF_NUMBER_TEXT], p95[EF_NUMBER_TEXT], worst[EF_NUMBER_TEXT];
  words_amount(r->mean, mean);
  words_amount(r->p95, p95);
  words_amount(r->worst, worst);
  text t = {0};
  text_format(&t,
              "%zu measured mixtures differ from the sum of the primaries "
              "by %s %s on average, 95 %% of them by less than %s, at worst by "
              "%s (line %zu, drive",
              r->n, mean, symbol, p95, worst, r->worst_line);
  for (size_t i = 0; i < ef_device_n_drives(s->display.device); ++i) {
    char drive[EF_NUMBER_TEXT];
    ef_number_format_fixed(100.0 * r->worst_drive[i], 0, drive);
    text_format(&t, "%s %s %%", i == 0 ? "" : ",", drive);
  }
  text_add(&t, ")");
  text_label(out, "Additivity", &t);
}

static void add_white(text *out, const match_scene *s) {
  const ef_additivity *a = &s->display.additivity;
  if (!a->known)
    return;
  char ratio[EF_NUMBER_TEXT], gap[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * a->luminance_ratio, 1, ratio);
  words_amount(s->display.additivity_difference, gap);
  text t = {0};
  text_format(&t,
              "the measured white has %s %% of the luminance of the "
              "primaries together, and differs from their sum by %s %s",
              ratio, gap, ef_metric_symbol(s->metric));
  text_label(out, s->display.residuals.n > 0 ? "" : "Additivity", &t);
}

static void add_targets(text *out, const match_scene *s) {
  text t = {0};
  text_format(&t, "%s (%s)", s->targets.about, s->target_source);
  switch (s->targets.adaptation) {
  case EF_ADAPT_NONE:
    text_add(&t, "; taken as they are, without adaptation to the display's "
                 "white");
    break;
  case EF_ADAPT_BRADFORD:
  case EF_ADAPT_CAT16:
    text_format(&t,
                "; adapted from the white of %s to the display's white by "
                "%s",
                ef_illuminant_name(s->illuminant),
                s->companion.observer != NULL
                    ? "von Kries, each of the two kinds of cones by itself"
                : s->targets.adaptation == EF_ADAPT_CAT16 ? "CAT16"
                                                          : "Bradford");
    break;
  }
  text_label(out, "Targets", &t);
}

static void add_observer(text *out, const match_scene *s) {
  text t = {0};
  text_format(&t, "%s: %s", ef_observer_name(s->observer),
              ef_observer_about(s->observer));
  text_label(out, "Observer", &t);
  if (s->companion.observer == NULL)
    return;
  text_format(&t,
              "%s; many amounts match, and those given come nearest to a match "
              "for %s, the same eyes with all cones",
              words_two_dimensions, ef_observer_name(s->companion.observer));
  text_label(out, "", &t);
}

static void add_people(text *out, const match_scene *s) {
  if (s->seen.people.population == NULL)
    return;
  text t = {0};
  people_add(&t, &s->seen.people);
  if (s->seen.people.n_chosen > 0) {
    text_format(&t,
                "; by %zu of them, medoids of their cone fundamentals, each "
                "with the share it stands for",
                s->seen.people.n_chosen);
  }
  text_add(&t,
           "; their eyes vary in ocular media, macular pigment, density and "
           "peak of the cone pigments (Asano, Fairchild & Blonde 2016; their "
           "standard deviations from memory and a second source), each judges "
           "against the whites as they see them");
  if (!isnan(s->jnd.value))
    text_add(&t, " and tells apart what differs by more than one JND");
  else
    text_add(&t, "; without a JND nobody can be said to tell apart anything "
                 "(--jnd gives one)");
  text_label(out, "People", &t);
}

static void add_metric(text *out, const match_scene *s) {
  const char *symbol = ef_metric_symbol(s->metric);
  text t = {0};
  text_format(&t, "%s (%s)", ef_metric_title(s->metric),
              ef_metric_source(s->metric));
  if (!isnan(s->jnd.value)) {
    char value[EF_NUMBER_TEXT];
    ef_number_format(s->jnd.value, value);
    text_format(&t, "; one JND is %s %s", value, symbol);
    if (s->own_jnd) {
      text_add(&t, ", as given with --jnd");
    } else {
      text_format(&t, ": %s (%s)", s->jnd.criterion, s->jnd.source);
    }
  }
  if (viewing_matters(s->metric))
    text_add(&t, "; for a white of 318 cd/m2 (1000 lx on a perfect diffuser), "
                 "a background of 20 % of it and an average surround");
  text_label(out, "Difference", &t);
  if (s->settings.bits == 0)
    return;
  text_format(&t,
              "%d bits for each primary; those of the least difference, "
              "which are not always the rounded ones",
              s->settings.bits);
  text_label(out, "Codes", &t);
}

static void add_basis(text *out, const match_scene *s) {
  text_add(out, "\nWhat this rests on:\n");
  add_display(out, s);
  add_tone(out, s->display.device);
  add_residuals(out, s);
  add_white(out, s);
  add_targets(out, s);
  add_observer(out, s);
  add_people(out, s);
  add_metric(out, s);
}

/* ---- The gamut --------------------------------------------------------- */

static void add_chromaticity(text *t, const char *name, ef_xy xy) {
  char x[EF_NUMBER_TEXT], y[EF_NUMBER_TEXT];
  ef_number_format_fixed(xy.x, 4, x);
  ef_number_format_fixed(xy.y, 4, y);
  text_format(t, "%s %s, %s", name, x, y);
}

static void add_area(text *t, double area, double share, const char *plane) {
  char number[EF_NUMBER_TEXT], percent[EF_NUMBER_TEXT];
  ef_number_format_fixed(area, 4, number);
  ef_number_format_fixed(100.0 * share, 1, percent);
  text_format(t, "%s in %s (%s %% of the spectrum locus)", number, plane,
              percent);
}

/* Of each primary at full drive, of white and of black; in cd/m2 where that is
 * known, else in per cent of the white. */
static void add_luminances(text *t, const match_scene *s) {
  const ef_device *device = s->display.device;
  const size_t n = ef_device_n_drives(device);
  const bool absolute = !isnan(s->luminance_cd_m2);
  const double unit = absolute ? s->luminance_cd_m2 / 100.0 : 1.0;
  char number[EF_NUMBER_TEXT];
  for (size_t i = 0; i < n; ++i) {
    double amount[EF_MAX_DRIVES] = {0.0};
    amount[i] = 1.0;
    words_amount(unit * ef_setup_xyz(s->setup, amount, NULL).Y, number);
    text_format(t, "%s %s, ", ef_device_drive_name(device, i), number);
  }
  words_amount(unit * ef_setup_white(s->setup).Y, number);
  text_format(t, "white %s, ", number);
  words_amount(unit * ef_setup_black(s->setup).Y, number);
  text_format(t, "black %s %s", number, absolute ? "cd/m2" : "% of white");
}

static void add_sizes(text *out, const match_scene *s) {
  const ef_gamut *g = &s->gamut;
  char number[EF_NUMBER_TEXT], share[EF_NUMBER_TEXT];
  text t = {0};
  if (ef_observer_dimensions(s->observer) < 3) {
    text_add(&t, "none, and no volume: colours of two dimensions lie on a line "
                 "in x, y and on a surface in CIELAB");
    text_label(out, "Area", &t);
    return;
  }
  add_area(&t, g->area_xy, g->locus_share_xy, "x, y");
  text_add(&t, "; ");
  add_area(&t, g->area_uv, g->locus_share_uv, "u', v'");
  text_label(out, "Area", &t);
  /* It is known to 0.1 %. */
  const bool is_large = g->volume_lab >= 1e5;
  ef_number_format_fixed(g->volume_lab / (is_large ? 1e3 : 1.0), 0, number);
  ef_number_format_fixed(100.0 * g->solid_share, 1, share);
  text_format(&t,
              "%s%s cubic units of CIELAB; it holds %s %% of all surface "
              "colours possible under %s",
              number, is_large ? " thousand" : "", share,
              ef_illuminant_name(s->illuminant));
  text_label(out, "Volume", &t);
}

static void add_gamut(text *out, const match_scene *s,
                      const match_summary *sum) {
  const ef_gamut *g = &s->gamut;
  const size_t n = ef_device_n_drives(s->display.device);
  char number[EF_NUMBER_TEXT], share[EF_NUMBER_TEXT];
  text t = {0};
  text_add(out, "\nThis display's gamut:\n");
  for (size_t i = 0; i < n; ++i) {
    add_chromaticity(&t, ef_device_drive_name(s->display.device, i),
                     g->primary[i]);
    text_add(&t, "; ");
  }
  add_chromaticity(&t, "white", g->white);
  text_label(out, "x, y", &t);
  add_luminances(&t, s);
  text_label(out, "Luminance", &t);
  add_sizes(out, s);
  if (isinf(g->contrast)) {
    text_add(&t, "not known: the black is taken as no light at all");
  } else {
    ef_number_format_fixed(g->contrast, 0, number);
    text_format(&t, "white has %s times the luminance of black", number);
  }
  text_label(out, "Contrast", &t);
  ef_number_format_fixed(100.0 * (double)sum->n_in_gamut / (double)sum->n, 1,
                         share);
  text_format(&t, "%s %% of the targets", share);
  text_label(out, "Covers", &t);
}

void render_match_basis(text *out, const match_scene *s,
                        const match_summary *sum) {
  add_basis(out, s);
  add_gamut(out, s, sum);
}
