/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_match.h"

#include <math.h>
#include <string.h>

#include "viewing.h"
#include "words.h"

/* ---- What it rests on -------------------------------------------------- */

static void add_targets(text *out, const match_scene *s) {
  text t = {0};
  text_format(&t, "%s (%s)", s->targets.about, s->target_source);
  switch (s->targets.adaptation) {
  case EF_ADAPT_NONE:
    if (!ef_device_reflects(s->device.device))
      text_format(&t,
                  "; taken as they are, without adaptation to the %s's white",
                  s->device.kind->words.noun);
    break;
  case EF_ADAPT_BRADFORD:
  case EF_ADAPT_CAT16:
    text_format(&t, "; adapted from the white of %s to the %s's white by %s",
                ef_illuminant_name(s->illuminant), s->device.kind->words.noun,
                s->companion.observer != NULL
                    ? "von Kries, each of the two kinds of cones by itself"
                : s->targets.adaptation == EF_ADAPT_CAT16 ? "CAT16"
                                                          : "Bradford");
    break;
  }
  text_label(out, "Targets", &t);
}

/* Why no other lights are told of, where they could have been. */
static void add_other_lights(text *out, const match_scene *s) {
  if (s->has_views || s->lights.n < 2)
    return;
  text t = {0};
  text_format(&t, "%s only: what others do follows from spectra, and ",
              ef_illuminant_name(s->illuminant));
  if (ef_device_has_spectra(s->device.device)) {
    const ef_reader_head *head = ef_reader_get_head(s->reader);
    text_format(&t, "the targets are %s", ef_content_text(head->content));
  } else {
    text_format(&t, "this %s is known without", s->device.kind->words.noun);
  }
  text_label(out, "Lights", &t);
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
  if (!device_is_quantised(&s->device))
    return;
  const char *channel = s->device.kind->words.channel;
  if (s->device.bits > 0)
    text_format(&t, "%d bits for each %s", s->device.bits, channel);
  else
    text_format(&t, "%s of each %s", s->device.step, channel);
  text_add(&t, "; those of the least difference, which are not always the "
               "rounded ones");
  text_label(out, s->device.bits > 0 ? "Codes" : "Steps", &t);
}

static void add_basis(text *out, const match_scene *s) {
  text_add(out, "\nWhat this rests on:\n");
  s->device.kind->describe(out, s);
  add_targets(out, s);
  add_other_lights(out, s);
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

/* Name and colour of drive `i` at full, the others at zero; behind the drives
 * that of none and of all. */
static const char *corner(const match_scene *s, size_t i, ef_xyz *xyz) {
  const ef_device *device = s->device.device;
  const size_t n = ef_device_n_drives(device);
  double amount[EF_MAX_DRIVES] = {0.0};
  for (size_t k = 0; k < n; ++k)
    amount[k] = i == k || i == n + 1 ? 1.0 : 0.0;
  *xyz = ef_setup_xyz(s->setup, amount, NULL);
  return i < n    ? ef_device_drive_name(device, i)
         : i == n ? s->device.kind->words.none
                  : s->device.kind->words.all;
}

/* Of each corner, lightest and darkest; in cd/m2 where that is known, else in
 * per cent of the white. */
static void add_luminances(text *t, const match_scene *s) {
  const size_t n = ef_device_n_drives(s->device.device);
  const bool absolute = !isnan(s->luminance_cd_m2);
  const double unit = absolute ? s->luminance_cd_m2 / 100.0 : 1.0;
  char number[EF_NUMBER_TEXT];
  ef_xyz xyz;
  const bool has_all = s->device.kind->words.all != NULL;
  for (size_t i = 0; i < n; ++i) {
    const char *name = corner(s, i, &xyz);
    words_amount(unit * xyz.Y, number);
    text_format(t, "%s %s, ", name, number);
  }
  for (size_t k = 0; k < (has_all ? 2 : 1); ++k) {
    const bool all = (k == 0) != s->device.is_subtractive;
    const char *name = corner(s, all ? n + 1 : n, &xyz);
    words_amount(unit * xyz.Y, number);
    text_format(t, "%s %s%s", name, number, k == 0 && has_all ? ", " : "");
  }
  text_add(t, absolute ? " cd/m2"
              : ef_device_reflects(s->device.device)
                  ? " % of a perfect diffuser"
                  : " % of white");
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
  const device_words *words = &s->device.kind->words;
  const size_t n = ef_device_n_drives(s->device.device);
  char number[EF_NUMBER_TEXT], share[EF_NUMBER_TEXT];
  text t = {0};
  ef_xyz lightest;
  text_format(out, "\nThis %s's gamut:\n", words->noun);
  for (size_t i = 0; i < n; ++i) {
    add_chromaticity(&t, ef_device_drive_name(s->device.device, i),
                     g->primary[i]);
    text_add(&t, "; ");
  }
  const char *name = corner(s, s->device.is_subtractive ? n : n + 1, &lightest);
  const ef_xyy at = ef_xyz_to_xyy(lightest);
  add_chromaticity(&t, name, (ef_xy){at.x, at.y});
  text_label(out, "x, y", &t);
  add_luminances(&t, s);
  text_label(out, "Luminance", &t);
  add_sizes(out, s);
  if (isinf(g->contrast)) {
    text_add(&t, "not known: the black is taken as no light at all");
  } else {
    ef_number_format_fixed(g->contrast, g->contrast < 100 ? 1 : 0, number);
    if (words->all == NULL)
      text_format(&t,
                  "the lightest of these has %s times the luminance of the "
                  "darkest",
                  number);
    else
      text_format(&t, "%s has %s times the luminance of %s",
                  s->device.is_subtractive ? words->none : words->all, number,
                  s->device.is_subtractive ? words->all : words->none);
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
