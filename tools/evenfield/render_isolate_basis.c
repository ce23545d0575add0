/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_isolate.h"

#include <math.h>

#include "render_display.h"
#include "words.h"

static double white_cd_m2(const isolate_scene *s) {
  double full[EF_MAX_DRIVES];
  for (size_t i = 0; i < EF_MAX_DRIVES; ++i)
    full[i] = 1.0;
  return ef_stimulator_luminance_cd_m2(s->stimulator, full);
}

static void add_direction(text *out, const isolate_scene *s) {
  text t = {0};
  text_format(&t, "%s; ", s->direction_text);
  switch (s->direction.kind) {
  case EF_DIRECTION_CONTRAST:
    text_add(&t, "contrast of a receptor is the change of its excitation over "
                 "its excitation by the background, the display's black and "
                 "the room light in both");
    break;
  case EF_DIRECTION_ISOLUMINANT:
    text_add(&t,
             "an angle in the isoluminant plane of DKL coordinates "
             "(Derrington, Krauskopf & Lennie 1984): 0 degrees red-green "
             "with L up, 90 degrees tritan with S up; one unit of each axis "
             "is a pooled cone contrast of 1 (as in Brainard 1996)");
    break;
  case EF_DIRECTION_DKL:
    text_add(&t, "DKL coordinates (Derrington, Krauskopf & Lennie 1984): "
                 "achromatic, red-green, tritan; one unit of each axis is the "
                 "stimulus only its own mechanism sees, with a pooled cone "
                 "contrast of 1 (as in Brainard 1996)");
    break;
  case EF_DIRECTION_MB:
    text_add(&t, "steps of the MacLeod-Boynton chromaticity l, s at constant "
                 "luminance, with the factors of CIE 170-2:2015");
    break;
  }
  text_label(out, "Direction", &t);
}

static void add_background(text *out, const isolate_scene *s,
                           const isolate_result *r) {
  text t = {0};
  char share[EF_NUMBER_TEXT];
  switch (s->settings.background_rule) {
  case EF_BACKGROUND_GIVEN:
    text_add(&t, s->options->background != NULL
                     ? "as asked for"
                     : "half of each primary's light, unless --background says "
                       "otherwise");
    break;
  case EF_BACKGROUND_SAME_CONES:
    text_add(&t, "of all lights with the same L, M and S the one that leaves "
                 "room for the largest contrast");
    break;
  case EF_BACKGROUND_FREE:
    ef_number_format_fixed(100.0 * s->settings.least_share, 1, share);
    text_format(&t,
                "chosen for the largest contrast among those with at least "
                "%s %% of full drive in luminance and in what changes",
                share);
    break;
  }
  text_add(&t, r->way.modulation_kind == EF_SYMMETRIC
                   ? "; modulated to both sides"
                   : "; a pulse to one side");
  text_label(out, "Background", &t);
}

static void add_observer(text *out, const isolate_scene *s) {
  text t = {0};
  text_format(&t, "%s: %s", ef_observer_name(s->observer),
              ef_observer_about(s->observer));
  if (ef_observer_cones_borrowed(s->observer)) {
    text_add(&t, "; its cones are the CIE 2006 fundamentals of the nearest "
                 "field, as it has none of its own");
  }
  text_add(&t, "; rods CIE 1951, melanopsin CIE S 026");
  text_label(out, "Observer", &t);
  const double *weight = ef_stimulator_luminance_weights(s->stimulator);
  char w[3][EF_NUMBER_TEXT];
  for (size_t i = 0; i < 3; ++i)
    ef_number_format_fixed(weight[i], 4, w[i]);
  text_format(&t, "L, M and S count %s : %s : %s, %s", w[0], w[1], w[2],
              s->own_weights ? "this person's own weights"
                             : "the weights of CIE 170-2:2015");
  text_label(out, "Luminance", &t);
}

static void add_people(text *out, const isolate_scene *s) {
  text t = {0};
  if (s->people.population == NULL) {
    text_add(&t, "not asked: the silence is that of the observer above, and "
                 "other eyes get something (--population shows how much)");
    text_label(out, "People", &t);
    return;
  }
  people_add(&t, &s->people);
  text_add(&t, "; their eyes vary in ocular media, macular pigment, density "
               "and peak of the cone pigments (Asano, Fairchild & Blonde 2016; "
               "their standard deviations from memory and a second source), "
               "each against the background as they get it");
  if (s->options->robust) {
    text_add(&t, "; the modulation has the least mean of the silent "
                 "receptors' summed squares over them, at the wanted contrast "
                 "for the observer above");
  }
  text_label(out, "People", &t);
}

static void add_codes(text *out, const isolate_scene *s) {
  text t = {0};
  text_format(&t,
              "%d bits for each primary; searched for the least error of "
              "contrast, silent receptors counting ten times",
              s->options->bits);
  text_label(out, "Codes", &t);
}

static void add_pupil(text *out, const isolate_scene *s,
                      const isolate_result *r) {
  if (!r->has_eye)
    return;
  text t = {0};
  if (s->pupil.formula == EF_PUPIL_GIVEN) {
    text_add(&t, "as given");
  } else {
    text_format(&t, "%s; the adapting field is the %s",
                ef_pupil_source(s->pupil.formula),
                r->show.frames != NULL ? "frame" : "disc");
  }
  if (s->pupil.formula == EF_PUPIL_WATSON_YELLOTT) {
    char age[EF_NUMBER_TEXT];
    ef_number_format(s->pupil.age_years, age);
    text_format(&t, ", %s years, both eyes", age);
  }
  text_label(out, "Pupil", &t);
  char exposure[EF_NUMBER_TEXT];
  ef_number_format(s->exposure_s, exposure);
  text_format(
      &t,
      "%s s a day at the brighter extreme, for the blue-light hazard "
      "(IEC 62471:2006, ICNIRP 2013; its weights from memory, supported "
      "by one published worked value)",
      exposure);
  text_label(out, "Exposure", &t);
}

void render_isolate_basis(text *out, const isolate_scene *s,
                          const isolate_result *r) {
  text_add(out, "\nWhat this rests on:\n");
  const render_display of_display = {s->options, &s->display, s->metric,
                                     white_cd_m2(s)};
  add_direction(out, s);
  add_background(out, s, r);
  render_display_basis(out, &of_display);
  add_observer(out, s);
  add_people(out, s);
  add_codes(out, s);
  add_pupil(out, s, r);
}
