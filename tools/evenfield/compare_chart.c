/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare_chart.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"

/* Sample minus standard in the plane. */
static ef_xy shift(diagram_plane plane, const outcome *o, ef_xyz white) {
  const ef_xy a = diagram_point(plane, o->standard, white);
  const ef_xy b = diagram_point(plane, o->sample, white);
  return (ef_xy){b.x - a.x, b.y - a.y};
}

/* What a legend calls a look. */
static void look_name(const compare_scene *s, const look *at, char *name,
                      size_t size) {
  const char *light = ef_illuminant_name(at->illuminant);
  if (s->looks.n_observers > 1)
    snprintf(name, size, "%.80s, %.80s", light, ef_observer_name(at->observer));
  else
    snprintf(name, size, "%.160s", light);
}

/* Room for a point of each angle of each pair. */
static size_t count_points(const compare_text *t) {
  size_t n = 0;
  for (size_t k = 0; k < t->n_rows; ++k)
    n += t->row[k].pair.n_angles;
  return n;
}

/* Each sample is named once: where it differs most. */
static ef_status add_look(diagram *d, const compare_text *t,
                          const compare_scene *s, size_t which, double *x,
                          double *y, const char **label, ef_error *error) {
  const look *at = &s->looks.at[which];
  size_t n = 0;
  for (size_t k = 0; k < t->n_rows; ++k) {
    const compared *c = &t->row[k].pair;
    for (size_t a = 0; a < c->n_angles; ++a) {
      const size_t i = a * s->looks.n + which;
      const ef_xy p = shift(d->plane, &c->outcome[i], at->basis.white);
      x[n] = p.x;
      y[n] = p.y;
      label[n++] = i == c->worst ? c->sample : NULL;
    }
  }
  char name[200];
  look_name(s, at, name, sizeof name);
  ef_series marks = ef_series_default(EF_SERIES_MARKS);
  marks.look = (int)which;
  marks.name = name;
  marks.n = n;
  marks.x = x;
  marks.y = y;
  marks.label = label;
  return ef_chart_add(d->chart, &marks, error);
}

/* The colours just within the tolerance that are as light as the standard, in
 * the first light; where there is one standard. */
static ef_status add_tolerance(diagram *d, const compare_text *t,
                               const compare_scene *s, ef_error *error) {
  if (d->plane != PLANE_AB || s->pairing != PAIR_ONE || t->n_rows == 0 ||
      isnan(s->tolerance) || t->row[0].pair.n_angles != 1)
    return EF_OK;
  ef_frame frame;
  ef_ellipse e;
  if (ef_frame_set(EF_SPACE_LAB, NULL, &frame, NULL) != EF_OK ||
      ef_metric_ellipse(s->metric, t->row[0].pair.outcome[0].standard,
                        &s->looks.at[0].conditions, &frame, EF_ELLIPSE_SECTION,
                        s->tolerance, &e, NULL) != EF_OK)
    return EF_OK;
  char words[EF_NUMBER_TEXT], name[240];
  compare_tolerance_words(s, words);
  snprintf(name, sizeof name, "the tolerance of %s %s in %.100s", words,
           ef_metric_symbol(s->metric),
           ef_illuminant_name(s->looks.at[0].illuminant));
  const double middle = 0.0;
  ef_series ellipse = ef_series_default(EF_SERIES_ELLIPSES);
  ellipse.look = EF_LOOK_FRAME;
  ellipse.name = name;
  ellipse.n = 1;
  ellipse.x = ellipse.y = &middle;
  ellipse.semi_major = &e.semi_major;
  ellipse.semi_minor = &e.semi_minor;
  ellipse.angle_deg = &e.angle_deg;
  return ef_chart_add(d->chart, &ellipse, error);
}

/* More clouds than these hide each other; their looks are those that few lights
 * have. */
enum { MOST_CLOUDS = 3, FIRST_LOOK = EF_LOOKS - MOST_CLOUDS };

static ef_status add_people(diagram *d, const compare_scene *s,
                            ef_error *error) {
  if (s->clouds == NULL || s->clouds->n_pairs == 0 || d->plane != PLANE_AB)
    return EF_OK;
  clouds_sort(s->clouds);
  for (size_t i = 0; i < s->clouds->n_pairs; ++i)
    s->clouds->pair[i].look = FIRST_LOOK + (int)(i % MOST_CLOUDS);
  return clouds_add_gaps(d, s->clouds, MOST_CLOUDS, false, error);
}

ef_status compare_chart_draw(const compare_text *t, const compare_scene *s,
                             ef_chart_settings settings, diagram_plane plane,
                             diagram *out, ef_error *error) {
  diagram_set_differences(&settings, plane);
  ef_status status =
      diagram_init(out, &settings, plane, s->looks.at[0].basis.white, error);
  const size_t n = count_points(t) + 1;
  double *x = malloc(2 * n * sizeof *x);
  const char **label = malloc(n * sizeof *label);
  if (status == EF_OK && (x == NULL || label == NULL))
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  if (status == EF_OK)
    status = add_tolerance(out, t, s, error);
  if (status == EF_OK)
    status = add_people(out, s, error);
  if (status == EF_OK)
    status = diagram_add_origin(out, "standard", error);
  for (size_t i = 0; i < s->looks.n && i < EF_LOOKS && status == EF_OK; ++i)
    status = add_look(out, t, s, i, x, x + n, label, error);
  free(x);
  free(label);
  return status;
}

void compare_chart_people_words(text *about, const compare_scene *s) {
  const size_t n = s->clouds->n_pairs;
  text_add(about, "The dots and dashes are ");
  people_add_who(about, &s->people);
  if (s->clouds->n_people < s->clouds->n_all)
    text_format(about, ", the first %zu of them", s->clouds->n_people);
  text_format(about,
              ", one by one: what each sees of %s, in the light in which they "
              "see most of it.",
              n > MOST_CLOUDS ? "the 3 samples that differ most for them"
                              : "a sample");
}

static void describe(text *about, const compare_text *t,
                     const compare_scene *s, diagram_plane plane) {
  text_format(about, "Each mark is a sample, as it differs from its standard "
                     "(in the middle) in one light; its name stands where it "
                     "differs most.");
  if (plane == PLANE_AB && s->clouds != NULL) {
    text_add(about, " ");
    compare_chart_people_words(about, s);
  }
  if (s->looks.n > EF_LOOKS)
    text_format(about, " Of %zu lights and observers the first %d are drawn.",
                s->looks.n, EF_LOOKS);
  if (t->worst_only)
    text_format(about, " Of %zu pairs the %zu most different are drawn.",
                t->n_seen, t->n_rows);
}

ef_status compare_chart_write(const compare_text *t, const compare_scene *s,
                              ef_error *error) {
  const diagram_plane plane = s->options->plane == 1 ? PLANE_LC : PLANE_AB;
  ef_chart_settings settings = diagram_settings(plane);
  text subtitle = {0};
  describe(&subtitle, t, s, plane);
  settings.title = "Samples against their standard";
  settings.subtitle = subtitle.bytes;
  settings.overwrite = s->options->force;
  diagram d = {0};
  ef_status status = compare_chart_draw(t, s, settings, plane, &d, error);
  if (status == EF_OK)
    status = diagram_write(&d, s->options->chart, s->notes, error);
  diagram_free(&d);
  text_free(&subtitle);
  return status;
}
